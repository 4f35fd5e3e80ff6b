from __future__ import annotations

import dataclasses
import math
import subprocess
import sys

import numpy as np
import pytest
from scipy import stats

from strikeenergy.errors import InputError, UnknownName
from strikeenergy.lightning.distributions import (
    Correlation,
    JointLaw,
    LogNormal,
    Mixture,
    StrokeNumber,
    TwoSlopeLogNormal,
)
from strikeenergy.lightning.populations import (
    QUANTITIES,
    Population,
    population,
    population_names,
    rarity,
)
from strikeenergy.sources import Standing

COLUMNS = ("peak", "charge", "specific_energy", "short_charge")
ARRAYS = (*COLUMNS, "polarity", "strokes", "continuing", "continuing_duration", "continuing_peak")


@pytest.fixture(scope="module")
def drawn():
    return population().sample(300_000, 11)


# -- the laws ------------------------------------------------------------------------------------------------


def test_lognormal_agrees_with_scipy():
    law, x, p = LogNormal.from_log10(33.9e3, 0.527), np.geomspace(10, 1e7, 50), np.linspace(0.001, 0.999, 50)
    other = stats.lognorm(s=0.527 * math.log(10), scale=33.9e3)
    assert law.cdf(x) == pytest.approx(other.cdf(x), rel=1e-12)
    assert law.exceedance(x) == pytest.approx(other.sf(x), rel=1e-12)
    assert law.quantile(p) == pytest.approx(other.ppf(p), rel=1e-12)


def test_the_constructors_do_not_confuse_the_logarithms():
    assert LogNormal.from_log10(2.0, 0.5).sigma == pytest.approx(0.5 * math.log(10))
    assert LogNormal.from_ln(2.0, 0.5).sigma == 0.5
    assert LogNormal.from_ln(2.0, 0.5).sigma_log10 == pytest.approx(0.5 / math.log(10))
    three = LogNormal.from_95_5(4.6, 250)
    assert three.exceedance([4.6, 250]) == pytest.approx([0.95, 0.05], abs=2e-5)


def test_values_that_cannot_occur_have_no_probability():
    law = LogNormal.from_ln(1.0, 1.0)
    assert law.cdf([-1, 0, np.inf]).tolist() == [0, 0, 1]
    assert law.exceedance([-1, 0, np.inf]).tolist() == [1, 1, 0]
    assert math.isnan(law.cdf(math.nan))
    assert law.quantile([0, 1]).tolist() == [0, math.inf]


def test_far_tails_keep_their_digits():
    assert float(LogNormal.from_ln(1.0, 1.0).exceedance(math.exp(12))) == pytest.approx(
        1.7764821e-33, rel=1e-6
    )


@pytest.mark.parametrize("p", [-0.1, 1.1, math.nan])
def test_a_probability_beyond_its_range_is_refused(p):
    with pytest.raises(InputError, match="0 to 1"):
        LogNormal.from_ln(1.0, 1.0).quantile(p)


def test_both_wrong_parameters_of_a_law_are_named():
    with pytest.raises(InputError) as caught:
        LogNormal(-1.0, math.nan)
    assert len(caught.value.problems) == 2


def test_columns_the_wrong_way_round_are_refused():
    with pytest.raises(InputError, match="larger one"):
        LogNormal.from_95_5(250, 4.6)


def test_two_slopes_that_do_not_meet_are_refused():
    with pytest.raises(InputError, match="at the knee"):
        TwoSlopeLogNormal(LogNormal.from_log10(61.1, 0.576), LogNormal.from_log10(40, 0.263), 20)
    with pytest.raises(InputError, match="the knee is"):
        TwoSlopeLogNormal(LogNormal(1, 1), LogNormal(1, 1), 0)


def test_two_slope_branches_and_median():
    law = population().laws["peak"]["first negative"].law
    assert law.median == pytest.approx(33.3e3)
    x = np.array([3e3, 19e3, 21e3, 200e3])
    expected = [law.below.cdf(3e3), law.below.cdf(19e3), law.above.cdf(21e3), law.above.cdf(200e3)]
    assert law.cdf(x) == pytest.approx(expected)
    assert law.quantile(law.cdf(x)) == pytest.approx(x)
    assert law.score(law.knee) == pytest.approx(law.below.score(law.knee))


def test_a_convex_knee_works_too():
    law = TwoSlopeLogNormal(LogNormal.from_ln(1.0, 0.5), LogNormal.from_ln(1.0, 2.0), 1.0)
    p = np.array([0.1, 0.4, 0.6, 0.9])
    assert law.cdf(law.quantile(p)) == pytest.approx(p)


def test_mixture_quantile_inverts_its_cdf():
    law = population().law("peak")
    p = np.array([0.0, 1e-6, 0.01, 0.5, 0.99, 1 - 1e-9, 1.0])
    found = law.quantile(p)
    assert law.cdf(found[1:-1]) == pytest.approx(p[1:-1], rel=1e-9)
    assert (found[0], found[-1]) == (0.0, math.inf)


def test_a_mixture_with_an_empty_part_is_the_other():
    law = Mixture((LogNormal(1.0, 1.0), LogNormal(5.0, 1.0)), (1.0, 0.0))
    assert float(law.quantile(0.5)) == pytest.approx(1.0)


@pytest.mark.parametrize(
    ("laws", "shares", "text"),
    [
        ((), (), "0 laws"),
        ((LogNormal(1, 1),), (0.5, 0.5), "1 laws"),
        ((LogNormal(1, 1), LogNormal(2, 1)), (0.5, 0.6), "add up"),
        ((LogNormal(1, 1), LogNormal(2, 1)), (-0.5, 1.5), "share 1"),
    ],
)
def test_impossible_mixtures_are_refused(laws, shares, text):
    with pytest.raises(InputError, match=text):
        Mixture(laws, shares)


@pytest.mark.parametrize(
    ("single", "mean"), [(0.2, 4.0), (1 / 3, 3.67), (0.81, 1.2), (0.0, 2.5), (0.5, 1.5), (1, 1)]
)
def test_stroke_numbers_have_the_two_published_figures(single, mean):
    law, n = StrokeNumber(single, mean), np.arange(400)
    p = law.probability(n)
    assert p.sum() == pytest.approx(1)
    assert (p[1], (n * p).sum()) == pytest.approx((single, mean))
    drawn = law.draw(np.random.default_rng(4), 100_000)
    assert np.mean(drawn == 1) == pytest.approx(single, abs=0.006)
    assert np.mean(drawn == 3) == pytest.approx(p[3], abs=0.006)
    assert drawn.mean() == pytest.approx(mean, rel=0.02)


@pytest.mark.parametrize(("single", "mean"), [(1.2, 3), (0.2, 1.5), (1, 2), (0.2, math.inf)])
def test_impossible_stroke_numbers_are_refused(single, mean):
    with pytest.raises(InputError):
        StrokeNumber(single, mean)


# -- correlation and the joint law -----------------------------------------------------------------------------


def test_assumed_correlation_of_the_table_and_of_the_class_agree():
    assert population().correlation == Correlation() == Correlation(0.60, 0.85, 0.75, 0.80)


def test_a_correlation_that_cannot_be_is_refused():
    with pytest.raises(InputError, match="eigenvalue"):
        Correlation(peak_charge=0.9, peak_energy=0.9, charge_energy=-0.5)
    with pytest.raises(InputError) as caught:
        Correlation(peak_charge=1.0, charges=math.nan)
    assert len(caught.value.problems) == 2


@pytest.mark.parametrize("component", ["positive", "first negative"])
def test_unconditioned_marginals_and_correlations(component):
    law = population().joint(component)
    values = law.transform(np.random.default_rng(1).standard_normal((100_000, 4)))
    for k, name in enumerate(COLUMNS):
        published = population().laws[name][component].law
        if isinstance(published, LogNormal):
            cdf = stats.lognorm(s=published.sigma, scale=published.median).cdf
        else:
            z = [(math.log(61.1e3), math.log(10) * 0.576), (math.log(33.3e3), math.log(10) * 0.263)]

            def cdf(x, z=z):
                return stats.norm.cdf(
                    (np.log(x) - np.where(x < 20e3, z[0][0], z[1][0])) / np.where(x < 20e3, z[0][1], z[1][1])
                )

        assert stats.kstest(values[:, k], cdf).pvalue > 1e-3, name
    scores = np.stack(
        [population().laws[n][component].law.score(values[:, k]) for k, n in enumerate(COLUMNS)]
    )
    assert np.corrcoef(scores) == pytest.approx(Correlation().matrix(), abs=0.01)


@pytest.mark.parametrize("bound", ["flash", "short"])
@pytest.mark.parametrize("component", ["positive", "first negative"])
def test_drawing_keeps_what_rejection_would_keep(component, bound):
    law = population(bound=bound).joint(component)
    drawn, proposals = law.draw(np.random.default_rng(2), 60_000)
    values = law.transform(np.random.default_rng(3).standard_normal((80_000, 4)))
    charge = values[:, 1] if bound == "flash" else values[:, 3]
    kept = values[values[:, 2] <= values[:, 0] * charge]
    columns = (0, 1, 2) if bound == "flash" else (0, 3, 2)
    for k in columns:
        assert stats.ks_2samp(drawn[k], kept[:, k]).pvalue > 1e-3
    assert 60_000 / proposals == pytest.approx(1 - law.infeasible_share(), abs=0.006)


@pytest.mark.parametrize("bound", ["flash", "short"])
def test_the_other_charge_follows_its_cut_conditional_law(bound):
    law = population(bound=bound).joint("first negative")
    peak, charge, energy, short = law.draw(np.random.default_rng(5), 60_000)[0]
    z = np.stack([law.peak.score(peak), law.charge.score(charge), law.specific_energy.score(energy)])
    matrix, last = Correlation().matrix(), law.short_charge.score(short)
    order = [0, 1, 2, 3] if bound == "flash" else [0, 3, 2, 1]
    if bound == "short":
        z[1], last = law.short_charge.score(short), law.charge.score(charge)
    matrix = matrix[np.ix_(order, order)]
    weights = np.linalg.solve(matrix[:3, :3], matrix[:3, 3])
    spread = math.sqrt(matrix[3, 3] - weights @ matrix[:3, 3])
    mean = weights @ z
    limit = law.short_charge.score(charge) if bound == "flash" else law.charge.score(short)
    sign = 1 if bound == "flash" else -1
    rank = stats.norm.cdf(sign * (last - mean) / spread) / stats.norm.cdf(sign * (limit - mean) / spread)
    assert stats.kstest(rank, "uniform").pvalue > 1e-3


def test_the_cut_works_far_out_in_the_tail():
    tight = Correlation(0.0, 0.0, 0.0, 0.99)
    law = JointLaw(LogNormal(1e9, 0.1), LogNormal(1.0, 1.0), LogNormal(1.0, 0.1), LogNormal(1e3, 1.0), tight)
    _, charge, _, short = law.draw(np.random.default_rng(0), 1000)[0]
    assert np.all(np.isfinite(short) & (short > 0) & (short <= charge))


def test_feasible_says_the_same_as_the_two_conditions():
    law = population().joint("positive")
    values = law.transform(np.random.default_rng(6).standard_normal((1000, 4)))
    expected = (values[:, 2] <= values[:, 0] * values[:, 1]) & (values[:, 3] <= values[:, 1])
    assert law.feasible(values).tolist() == expected.tolist()
    assert law.feasible([200e3, 300, 10e6, 100])
    assert not law.feasible([35e3, 16, 650e3, 10])


# -- samples ---------------------------------------------------------------------------------------------------


def test_every_sampled_flash_is_possible(drawn):
    assert np.all(drawn.specific_energy <= drawn.peak * drawn.charge)
    assert np.all(drawn.short_charge <= drawn.charge)
    for name in COLUMNS:
        assert np.all(np.isfinite(getattr(drawn, name)) & (getattr(drawn, name) > 0))


def test_short_bound_is_stricter():
    drawn = population(bound="short").sample(50_000, 1)
    assert np.all(drawn.specific_energy <= drawn.peak * drawn.short_charge)
    assert np.all(drawn.short_charge <= drawn.charge)
    assert drawn.acceptance["positive"] == pytest.approx(0.483, abs=0.02)


def test_a_sample_is_random_in_order_and_keeps_the_polarity_shares(drawn):
    positive = drawn.polarity == 1
    assert set(np.unique(drawn.polarity)) == {-1, 1}
    assert positive.mean() == pytest.approx(0.1, abs=4 * math.sqrt(0.09 / len(drawn)))
    assert positive[:3000].mean() == pytest.approx(0.1, abs=0.03)


def test_acceptance_is_reported(drawn):
    law = population()
    for component, n in (("positive", 3e4), ("first negative", 2.7e5)):
        expected = 1 - law.joint(component).infeasible_share()
        assert drawn.acceptance[component] == pytest.approx(expected, abs=4 * math.sqrt(0.04 / n))
    assert 0.95 < drawn.acceptance["all"] < 0.97
    alone = law.sample(1, 0)
    assert math.isnan(alone.acceptance["positive"]) != math.isnan(alone.acceptance["first negative"])


def test_seeds():
    law = population()
    one, again, other = law.sample(70_000, 5), law.sample(70_000, 5), law.sample(70_000, 6)
    for name in ARRAYS:
        assert np.array_equal(getattr(one, name), getattr(again, name))
    assert not np.array_equal(one.peak, other.peak)
    assert (one.seed, one.population, one.correlation, len(one)) == (5, "IEC 62305-1", Correlation(), 70_000)


def test_samples_are_read_only(drawn):
    for name in ARRAYS:
        assert getattr(drawn, name).shape == (len(drawn),)
        with pytest.raises(ValueError, match="read-only"):
            getattr(drawn, name)[0] = 0
    with pytest.raises(dataclasses.FrozenInstanceError):
        drawn.peak = drawn.charge


def test_stroke_numbers_of_the_sample(drawn):
    for sign, single, mean in ((-1, 0.2, 4.0), (1, 0.81, 1.2)):
        strokes = drawn.strokes[drawn.polarity == sign]
        assert (np.mean(strokes == 1), strokes.mean()) == pytest.approx((single, mean), rel=0.02)


@pytest.mark.parametrize(
    ("name", "negative", "positive"), [("LS1989", 0.20, 0.90), ("Saba 2010", 0.30, 0.75)]
)
def test_continuing_current_shares_survive_the_joint_law(name, negative, positive):
    drawn = population(continuing=name).sample(100_000, 2)
    assert drawn.continuing[drawn.polarity < 0].mean() == pytest.approx(negative, abs=0.006)
    assert drawn.continuing[drawn.polarity > 0].mean() == pytest.approx(positive, abs=0.015)


def test_no_long_continuing_current_follows_a_strong_negative_stroke(drawn):
    negative = drawn.continuing & (drawn.polarity < 0)
    assert drawn.continuing_peak[negative].max() <= 20e3
    single = negative & (drawn.strokes == 1)
    assert single.any()
    assert np.array_equal(drawn.continuing_peak[single], drawn.peak[single])
    # strong first strokes do occur in flashes with continuing current, which then follows a later stroke
    assert (drawn.peak[negative] > 20e3).mean() > 0.7
    positive = drawn.continuing & (drawn.polarity > 0)
    assert (drawn.continuing_peak[positive] > 20e3).mean() > 0.5


def test_continuing_durations(drawn):
    assert drawn.continuing_duration[drawn.continuing].min() >= 0.040
    assert not drawn.continuing_duration[~drawn.continuing].any()
    assert not drawn.continuing_peak[~drawn.continuing].any()
    negative = drawn.continuing_duration[drawn.continuing & (drawn.polarity < 0)]
    assert negative.mean() == pytest.approx(0.140, rel=0.02)


@pytest.mark.parametrize(
    ("n", "seed"), [(0, 1), (-5, 1), (1.5, 1), (True, 1), (10, -1), (10, None), ("10", 1)]
)
def test_impossible_samples_are_refused(n, seed):
    with pytest.raises(InputError, match="whole number"):
        population().sample(n, seed)


def test_both_problems_of_a_sample_are_named():
    with pytest.raises(InputError) as caught:
        population().sample(0, -1)
    assert len(caught.value.problems) == 2


# -- named populations -------------------------------------------------------------------------------------------


def test_the_default_comes_first():
    assert population_names()[0] == population().name == "IEC 62305-1"


@pytest.mark.parametrize("name", population_names())
def test_every_population_draws_possible_flashes_and_describes_itself(name):
    law = population(name)
    drawn = law.sample(2000, 1)
    assert np.all(drawn.specific_energy <= drawn.peak * drawn.charge)
    lines = law.describe()
    assert len(lines) > 20
    for text, standing, where in lines:
        assert text
        assert isinstance(standing, Standing)
        assert where.citation
    assert any(standing is Standing.ASSUMED and "r(I,Q) = 0.6" in text for text, standing, _ in lines)
    for quantity, rows in law.laws.items():
        assert quantity in QUANTITIES
        for row in rows.values():
            assert row.source.citation


def test_other_names():
    assert population("upward") is population("Winter, Upward")
    assert population("tb 63").name == "CIGRE TB 63"


def test_cautions_of_the_alternatives_are_said():
    said = {name: " ".join(text for text, _, _ in population(name).describe()) for name in population_names()}
    assert "500 C" in said["winter, upward"]
    assert "no positive flashes" in said["CIGRE TB 63"]
    assert "1.5 times" in said["Brazil"]
    assert "18 kA" in said["Brazil"]
    assert all("Alps" in text for text in said.values())


def test_unknown_names_come_with_near_ones():
    with pytest.raises(UnknownName, match="'IEC 62305-1'"):
        population("IEC 62305")
    with pytest.raises(UnknownName, match="Poelman"):
        population(strokes="Poelmann 2021")
    with pytest.raises(UnknownName, match="LS1989"):
        population(continuing="LS89")
    with pytest.raises(UnknownName, match="'specific_energy'"):
        population().exceedance("specific energy", 1e6)
    with pytest.raises(UnknownName, match="'positive'"):
        population().exceedance("peak", 1e3, "positve")


def test_a_law_that_the_set_lacks_is_named():
    with pytest.raises(InputError, match=r"'subsequent'.*'first negative', 'positive'"):
        population().exceedance("charge", 10, "subsequent")
    with pytest.raises(InputError, match="no mixture for interval"):
        population().quantile("interval", 0.5)
    with pytest.raises(InputError, match="nothing"):
        population().quantile("front_10_90", 0.5, "subsequent")


def test_impossible_parameters_are_named_together():
    with pytest.raises(InputError) as caught:
        population(positive_share=1.5, bound="none")
    assert len(caught.value.problems) == 2


def test_laws_that_do_not_belong_together_are_refused():
    law = population()
    energy = dataclasses.replace(law.laws["specific_energy"]["positive"], law=LogNormal(1e12, 0.1))
    laws = {**law.laws, "specific_energy": {**law.laws["specific_energy"], "positive": energy}}
    with pytest.raises(InputError, match="impossible"):
        dataclasses.replace(law, laws=laws)


def test_more_continuing_current_than_the_joint_law_permits_is_refused():
    law = population()
    high = dataclasses.replace(law.continuing.share["first negative"], value=0.9)
    with pytest.raises(InputError, match="joint law"):
        dataclasses.replace(
            law,
            continuing=dataclasses.replace(
                law.continuing, share={**law.continuing.share, "first negative": high}
            ),
        )


def test_subsequent_strokes_too_strong_for_the_joint_law_are_refused():
    law = population()
    strong = dataclasses.replace(law.laws["peak"]["subsequent"], law=LogNormal(1e6, 0.1))
    laws = {**law.laws, "peak": {**law.laws["peak"], "subsequent": strong}}
    with pytest.raises(InputError, match="hardly any subsequent"):
        dataclasses.replace(law, laws=laws)


def test_ones_own_choices_say_so():
    law = population(positive_share=0.3, correlation=Correlation(0.5, 0.8, 0.7))
    given = [text for text, standing, _ in law.describe() if standing is Standing.GIVEN]
    assert len(given) == 2
    assert isinstance(law, Population)


# -- rarity --------------------------------------------------------------------------------------------------------


def test_rarity_of_protection_level_one():
    found = {
        r.quantity: r
        for r in rarity({"peak": 200e3, "charge": 300, "short_charge": 100, "specific_energy": 10e6})
    }
    assert found["peak"].unit == "A"
    assert found["peak"].exceedance["positive"] == pytest.approx(0.0718, abs=1e-4)
    assert found["peak"].exceedance["all"] == pytest.approx(0.0086, abs=1e-4)
    assert found["specific_energy"].exceedance["all"] == pytest.approx(0.1 * 0.0753 + 0.9 * 8.5e-5, abs=1e-5)
    assert set(found["charge"].exceedance) == {"positive", "first negative", "all"}
    assert found["peak"].standing is Standing.MEMORY_HIGH


def test_rarity_in_another_population():
    (one,) = rarity({"charge": 300}, "winter, upward")
    assert one.exceedance["positive"] == pytest.approx(0.37, abs=0.005)
    (only,) = rarity({"interval": 0.1})
    assert set(only.exceedance) == {"subsequent"}


def test_rarity_refuses_what_is_no_value():
    with pytest.raises(InputError) as caught:
        rarity({"peak": -1.0, "charge": math.nan})
    assert len(caught.value.problems) == 2
    with pytest.raises(UnknownName, match="'peak'"):
        rarity({"peek": 1.0})


# -- start-up ------------------------------------------------------------------------------------------------------


def test_importing_does_not_load_scipy():
    code = "import sys, strikeenergy.lightning.populations; print('scipy' in sys.modules)"
    assert (
        subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True).stdout
        == "False\n"
    )


def test_draw_gives_one_quantity_alone_by_its_published_law() -> None:
    # IEC 62305-1 Table A.1: intervals between negative strokes 7, 33 and 150 ms (95, 50 and 5 %).
    intervals = population().draw("interval", 200_000, seed=5, component="subsequent")
    assert intervals.shape == (200_000,)
    assert np.median(intervals) == pytest.approx(32.4e-3, rel=0.02)
    assert np.mean(intervals > 7e-3) == pytest.approx(0.95, abs=0.005)
    assert np.mean(intervals > 150e-3) == pytest.approx(0.05, abs=0.005)
    assert np.array_equal(intervals, population().draw("interval", 200_000, seed=5, component="subsequent"))
    peaks = population().draw("peak", 1000, seed=1)
    assert np.all(np.isfinite(peaks))
    assert np.all(peaks > 0)


@pytest.mark.parametrize(("n", "seed"), [(0, 1), (2.5, 1), (True, 1), (5, -1)])
def test_draw_refuses_what_is_no_whole_number(n: object, seed: object) -> None:
    with pytest.raises(InputError, match="whole number"):
        population().draw("peak", n, seed)  # type: ignore[arg-type]
