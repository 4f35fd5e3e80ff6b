"""What must hold for every current, whatever its shape."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from strikeenergy.lightning.fitting import fit
from strikeenergy.lightning.waveform import (
    ConcaveFront,
    DoubleExponential,
    Heidler,
    LinearFront,
    PowerExponential,
    Rectangle,
    Sampled,
    Trapezoid,
    Triangle,
)


def between(low, high):
    return st.floats(np.log(low), np.log(high)).map(lambda x: float(np.exp(x)))


@st.composite
def recipes(draw):
    """Draw a function of a factor for the current and one for the time."""
    peak, time = draw(between(1e2, 3e5)), draw(between(1e-6, 1e-3))
    a, b = draw(st.floats(0.01, 0.9)), draw(st.floats(1.1, 8.0))
    n, kind = draw(st.floats(1.0, 60.0)), draw(st.integers(0, 8))

    def make(c=1.0, s=1.0):
        current, t = c * peak, s * time
        return (
            lambda: Heidler(current, a * t, t, n),
            lambda: Heidler(current, a * t, t, n, normalise="standard", k=0.9),
            lambda: DoubleExponential(current, 1 / t, 20 * b / t),
            lambda: PowerExponential(current, b, t),
            lambda: LinearFront(current, a * t, t),
            lambda: Trapezoid(current, a * t, b * t, 0.1 * t),
            lambda: Triangle(current, a * t, t),
            lambda: Rectangle(current, t),
            lambda: ConcaveFront(current, t, b * current / t, 40 * t),
        )[kind]()

    return make


def figures(w):
    return np.array([w.charge, w.specific_energy, w.peak, w.peak_time, w.front_time(), w.half_value_time()])


@given(recipes(), between(0.01, 100))
def test_current_scales(make, c):
    one, many = make(), make(c=c)
    np.testing.assert_allclose(figures(many), figures(one) * [c, c * c, c, 1, 1, 1], rtol=1e-9, atol=0)
    np.testing.assert_allclose(figures(one * c), figures(one) * [c, c * c, c, 1, 1, 1], rtol=1e-9, atol=0)


@given(recipes(), between(0.01, 100))
def test_time_scales(make, s):
    one, slow = make(), make(s=s)
    np.testing.assert_allclose(figures(slow), figures(one) * [s, s, 1, s, s, s], rtol=1e-9, atol=0)
    if np.isfinite(one.max_steepness):
        assert slow.max_steepness == pytest.approx(one.max_steepness / s, rel=1e-7)


@given(recipes(), st.floats(-0.01, 0.01))
def test_time_shift_changes_nothing_but_the_times(make, delay):
    w = make()
    later = w.delayed(delay)
    assert later.peak == pytest.approx(w.peak, rel=1e-9)
    assert later.peak_time == pytest.approx(w.peak_time + delay, rel=1e-12, abs=1e-18)
    assert (later.charge, later.specific_energy) == (w.charge, w.specific_energy)
    assert later.front_time() == pytest.approx(w.front_time(), rel=1e-6, abs=1e-17)
    assert later.half_value_time() == pytest.approx(w.half_value_time(), rel=1e-6)


@given(recipes(), recipes())
def test_polarity(first, second):
    w = first() + second().delayed(2e-5)
    assert (-w).charge == pytest.approx(-w.charge)
    assert (-w).peak == pytest.approx(-w.peak)
    assert (-w).specific_energy == pytest.approx(w.specific_energy)
    assert (-w).absolute_charge == pytest.approx(w.charge)
    assert (-w).front_time() == pytest.approx(w.front_time())
    assert (w - w).specific_energy == pytest.approx(0, abs=1e-9 * w.specific_energy)


@given(recipes())
def test_bounds(make):
    w = make()
    assert w.specific_energy <= w.peak * w.charge * (1 + 1e-12)
    assert w.charge**2 / w.duration <= w.specific_energy * (1 + 1e-12)
    assert w.charge <= w.peak * w.duration * (1 + 1e-12)
    assert w.max_steepness >= 0.999 * w.peak / max(w.peak_time, 1e-300) or w.peak_time == 0


@given(recipes(), recipes(), st.floats(0, 1e-3))
def test_sums_of_currents_of_one_sign(first, second, delay):
    a, b = first(), second()
    w = a + b.delayed(delay)
    assert w.charge == pytest.approx(a.charge + b.charge)
    assert w.specific_energy >= (a.specific_energy + b.specific_energy) * (1 - 1e-12)
    # the product by closed form, against the square of the whole by quadrature
    assert w.specific_energy == pytest.approx(w.specific_energy_until(w.support[1]), rel=1e-9)
    assert w.specific_energy == pytest.approx((b.delayed(delay) + a).specific_energy, rel=1e-12)
    assert max(a.peak, b.peak) * (1 - 1e-9) <= w.peak <= (a.peak + b.peak) * (1 + 1e-9)


@given(recipes(), recipes())
def test_separate_strokes_add(first, second):
    a, b = first(), second()
    gap = 2 * a.duration
    w = a + b.delayed(gap)
    assert w.specific_energy == pytest.approx(a.specific_energy + b.specific_energy, rel=1e-12)
    assert w.peak == pytest.approx(max(a.peak, b.peak), rel=1e-9)
    swapped = b + a.delayed(2 * b.duration)
    assert swapped.specific_energy == pytest.approx(w.specific_energy, rel=1e-12)


@given(recipes())
def test_the_peak_is_the_peak(make):
    w = make()
    assert w.current(w.peak_time) == pytest.approx(w.peak, rel=1e-12)
    t = np.linspace(0, w.duration, 5001)
    assert w.current(t).max() <= w.peak * (1 + 1e-12)
    assert w.current(-1e-6) == 0
    assert w.current(w.support[1] * 1.01) < 1e-12 * w.peak


@given(recipes(), st.floats(0, 1), st.floats(0, 1))
def test_charge_grows_with_time(make, x, y):
    w = make()
    early, late = sorted((x, y))
    end = w.support[1]
    assert w.charge_until(early * end) <= w.charge_until(late * end) * (1 + 1e-12)
    assert w.charge_until(end) == pytest.approx(w.charge, rel=1e-11)
    # by panels, against the closed form
    assert w.specific_energy_until(end) == pytest.approx(w.specific_energy, rel=1e-10)


@given(st.lists(st.tuples(st.floats(1e-6, 1), st.floats(-1e5, 1e5)), min_size=2, max_size=30))
def test_bounds_of_records(points):
    t, i = np.cumsum([p[0] for p in points]), np.array([p[1] for p in points])
    w = Sampled(t, i)
    scale = np.abs(i).max()
    assert w.specific_energy <= scale * w.absolute_charge * (1 + 1e-9)
    assert w.absolute_charge**2 <= w.specific_energy * w.duration * (1 + 1e-9) + 1e-300
    assert abs(w.charge) <= w.absolute_charge * (1 + 1e-9) + 1e-12
    assert w.absolute_charge == pytest.approx(w.absolute_charge_until(t[-1]), rel=1e-9, abs=1e-12)
    assert abs(w.peak) == scale


@given(between(1e3, 3e5), between(1e-7, 2e-5), st.floats(4, 300), st.floats(2, 30))
def test_fit_finds_what_a_heidler_function_has(peak, front, ratio, n):
    w = Heidler.from_times(peak, front, ratio * front, n)
    found = fit(peak=w.peak, charge=w.charge, specific_energy=w.specific_energy, front_time=front)
    if not found.unmet:
        assert found.waveform.charge == pytest.approx(w.charge, rel=1e-6)
        assert found.waveform.specific_energy == pytest.approx(w.specific_energy, rel=1e-6)
        assert found.waveform.front_time() == pytest.approx(front, rel=1e-6)
    assert max(abs(v) for v in found.residuals.values()) < 1e-3
    again = fit(peak=w.peak, front_time=front, half_value_time=ratio * front, n=n).waveform
    assert again.tau1 == pytest.approx(w.tau1, rel=1e-8)
    assert again.tau2 == pytest.approx(w.tau2, rel=1e-8)


@given(between(1e2, 3e5), between(1e-4, 1e2), st.floats(0.12, 1.0))
def test_fit_meets_every_possible_triple(peak, charge, rho):
    found = fit(peak=peak, charge=charge, specific_energy=rho * peak * charge)
    w = found.waveform
    assert found.unmet == ()
    assert w.peak == pytest.approx(peak, rel=1e-7)
    assert w.charge == pytest.approx(charge, rel=1e-7)
    assert w.specific_energy == pytest.approx(rho * peak * charge, rel=1e-7)
