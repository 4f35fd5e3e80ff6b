from __future__ import annotations

import math

import numpy as np
import pytest
from hypothesis import assume, given, settings
from hypothesis import strategies as st

from strikeenergy.errors import InputError
from strikeenergy.lightning.distributions import Correlation, JointLaw, LogNormal, Mixture, TwoSlopeLogNormal
from strikeenergy.lightning.populations import COMPONENTS, population, population_names

medians = st.floats(1e-6, 1e9)
sigmas = st.floats(0.05, 3.0)
shares = st.floats(0.0, 1.0)
scores = st.floats(-5.0, 5.0)
names = st.sampled_from(population_names())
lognormals = st.builds(LogNormal, medians, sigmas)

LPL = {  # IEC 62305-1:2010, Table 3: levels I to IV
    "peak": (200e3, 150e3, 100e3, 100e3),
    "charge": (300.0, 225.0, 150.0, 150.0),
    "short_charge": (100.0, 75.0, 50.0, 50.0),
    "specific_energy": (10e6, 5.6e6, 2.5e6, 2.5e6),
}


@st.composite
def two_slopes(draw):
    knee, z = draw(st.floats(1e-3, 1e6)), draw(st.floats(-3, 3))
    parts = [LogNormal(knee * math.exp(-s * z), s) for s in (draw(sigmas), draw(sigmas))]
    return TwoSlopeLogNormal(*parts, knee)


@st.composite
def mixtures(draw):
    share = draw(shares)
    return Mixture((draw(st.one_of(lognormals, two_slopes())), draw(lognormals)), (share, 1 - share))


laws = st.one_of(lognormals, two_slopes(), mixtures())
correlations = st.builds(lambda *r: r, *[st.floats(-0.95, 0.95)] * 4)


@given(laws, st.lists(st.floats(1e-12, 1e12), min_size=2, max_size=8))
def test_cdf_rises_and_complements_the_exceedance(law, values):
    x = np.sort(values)
    p = law.cdf(x)
    assert np.all((p >= 0) & (p <= 1))
    assert np.all(np.diff(p) >= -1e-12)
    assert p + law.exceedance(x) == pytest.approx(np.ones(len(x)), abs=1e-12)


@given(laws, st.floats(1e-6, 1 - 1e-6))
def test_quantile_inverts_the_cdf(law, p):
    assert float(law.cdf(law.quantile(p))) == pytest.approx(p, rel=1e-8, abs=1e-9)


@given(laws, st.lists(shares, min_size=2, max_size=6))
def test_quantiles_rise(law, p):
    x = law.quantile(np.sort(p))
    assert np.all(x[1:] >= x[:-1] * (1 - 1e-12))


@given(medians, sigmas, scores, st.floats(1e-3, 1e3))
def test_a_change_of_unit_changes_no_probability(median, sigma, z, factor):
    x = median * math.exp(sigma * z)
    here, there = LogNormal(median, sigma), LogNormal(median * factor, sigma)
    assert float(there.exceedance(x * factor)) == pytest.approx(float(here.exceedance(x)), rel=1e-9)


@given(medians, sigmas)
def test_log10_and_ln_constructors_are_the_same_law_in_other_words(median, sigma):
    assert LogNormal.from_log10(median, sigma / math.log(10)).sigma == pytest.approx(sigma)
    law = LogNormal.from_ln(median, sigma)
    again = LogNormal.from_95_5(*(median * math.exp(z * 1.645 * sigma) for z in (-1, 1)))
    assert (again.median, again.sigma) == pytest.approx((law.median, law.sigma))


@given(two_slopes())
def test_two_slopes_are_continuous_at_the_knee(law):
    left = float(law.cdf(law.knee * (1 - 1e-9)))
    assert left == pytest.approx(float(law.cdf(law.knee)), abs=1e-6)


@given(mixtures(), st.floats(1e-9, 1e12))
def test_a_mixture_lies_between_its_parts(law, x):
    parts = [float(part.exceedance(x)) for part in law.laws]
    assert min(parts) - 1e-12 <= float(law.exceedance(x)) <= max(parts) + 1e-12


@given(names, st.sampled_from(sorted(LPL)), st.sampled_from([*COMPONENTS, "all"]))
def test_a_stricter_level_is_exceeded_less_often(name, quantity, component):
    assume((quantity, component) != ("charge", "subsequent"))
    p = population(name).exceedance(quantity, np.array(LPL[quantity]), component)
    assert np.all(np.diff(p) >= 0)
    assert p[0] <= p[3]


@given(correlations)
def test_a_correlation_is_accepted_exactly_when_its_matrix_is_positive_definite(r):
    a, b, c, k = r
    matrix = np.array([[1, a, b, a], [a, 1, c, k], [b, c, 1, c], [a, k, c, 1]])
    least = np.linalg.eigvalsh(matrix).min()
    assume(abs(least) > 1e-8)
    if least > 0:
        assert np.all(np.linalg.eigvalsh(Correlation(*r).matrix()) > 0)
    else:
        with pytest.raises(InputError):
            Correlation(*r)


@settings(deadline=None, max_examples=60)
@given(correlations, names, st.sampled_from(["flash", "short"]), shares, st.integers(0, 2**32))
def test_whatever_is_drawn_is_possible(r, name, bound, share, seed):
    try:
        law = population(name, positive_share=share, correlation=Correlation(*r), bound=bound)
    except InputError:
        assume(False)
    drawn = law.sample(500, seed)
    charge = drawn.charge if bound == "flash" else drawn.short_charge
    assert np.all(drawn.specific_energy <= drawn.peak * charge)
    assert np.all(drawn.short_charge <= drawn.charge)
    assert np.all((drawn.short_charge > 0) & np.isfinite(drawn.charge))
    assert np.all(drawn.strokes >= 1)
    strong = drawn.continuing & (drawn.polarity < 0) & (drawn.continuing_peak > 20e3)
    assert not strong.any()
    again = law.sample(500, seed)
    assert np.array_equal(drawn.peak, again.peak)


@given(st.floats(0.1, 10.0), st.floats(0.1, 10.0))
def test_impossible_share_depends_only_on_the_ratio_of_the_medians(i, q):
    # W/R <= I·Q is dimensionless: scaling I, Q and W/R by i, q and i·q changes nothing.
    base = population().joint("positive")
    parts = [LogNormal(law.median * f, law.sigma) for law, f in zip(
        (base.peak, base.charge, base.specific_energy, base.short_charge), (i, q, i * q, q), strict=True)]  # fmt: skip
    assert JointLaw(*parts).infeasible_share() == pytest.approx(base.infeasible_share(), rel=1e-6)
