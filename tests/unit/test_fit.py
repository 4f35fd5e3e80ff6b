"""Fits: the figures asked for are met, or said not to be; what no current can have is refused."""

from itertools import pairwise

import numpy as np
import pytest
from scipy.integrate import quad
from scipy.optimize import least_squares

from strikeenergy.errors import InputError
from strikeenergy.lightning.fitting import fit
from strikeenergy.lightning.waveform import Heidler, LinearFront, Sum, Trapezoid

US = 1e-6


def has(result, **targets):
    """The waveform itself has the targets, and the residuals say so."""
    w = result.waveform
    for name, value in targets.items():
        found = getattr(w, name)() if name.endswith("time") else getattr(w, name)
        np.testing.assert_allclose(found, value, rtol=1e-7)
    assert result.unmet == ()
    assert result.residuals.keys() == targets.keys()


@pytest.mark.parametrize(
    "targets",
    [
        {"peak": 200e3, "front_time": 10e-6, "half_value_time": 350e-6},
        {"peak": 200e3, "charge": 100.0, "front_time": 10e-6},
        {"peak": 200e3, "charge": 100.0, "half_value_time": 350e-6},
        {"peak": 200e3, "specific_energy": 10e6, "front_time": 10e-6},
        {"charge": 100.0, "specific_energy": 10e6, "front_time": 10e-6},
        {"charge": 100.0, "front_time": 10e-6, "half_value_time": 350e-6},
        {"specific_energy": 10e6, "front_time": 10e-6, "half_value_time": 350e-6},
        {"peak": 11.8e3, "charge": 0.95, "specific_energy": 6e3},
        {"peak": 30e3, "front_time": 8e-6, "half_value_time": 20e-6},
    ],
)
def test_three_targets_are_met_with_n_10(targets):
    result = fit(**targets)
    has(result, **targets)
    assert isinstance(result.waveform, Heidler)
    assert result.waveform.n == 10
    assert result.method == "Heidler"
    assert result.assumed == ()


def test_peak_charge_and_front_time():
    w = fit(peak=200e3, charge=100.0, front_time=10e-6).waveform
    assert w.tau1 == pytest.approx(19.03993e-6, rel=3e-7)
    assert w.tau2 == pytest.approx(484.4561e-6, rel=1e-7)
    assert w.specific_energy == pytest.approx(10.239e6, rel=5e-5)
    assert w.half_value_time() == pytest.approx(356.23e-6, rel=2e-5)
    for n, tau1, tau2 in ((5, 9.61525, 480.9562), (3, 5.80812, 475.7951)):
        w = fit(peak=200e3, charge=100.0, front_time=10e-6, n=n).waveform
        assert (w.tau1 / US, w.tau2 / US) == pytest.approx((tau1, tau2), rel=1e-6)


@pytest.mark.parametrize(
    ("targets", "tau1", "tau2", "n"),
    [
        ((200e3, 100.0, 10.28e6, 10e-6), 11.97334, 482.39786, 6.24710),
        ((12e3, 0.95, 6e3, 1.1e-6), 0.305433, 74.455576, 1.528544),
    ],
)
def test_four_targets_are_met_with_free_n(targets, tau1, tau2, n):
    names = ("peak", "charge", "specific_energy", "front_time")
    result = fit(**dict(zip(names, targets, strict=True)))
    has(result, **dict(zip(names, targets, strict=True)))
    w = result.waveform
    assert result.method == "Heidler with free n"
    assert (w.tau1 / US, w.tau2 / US, w.n) == pytest.approx((tau1, tau2, n), rel=3e-6)
    # the charge by a quadrature that shares nothing with the program
    x = np.concatenate([[0], np.geomspace(1e-4, 1, 30), np.geomspace(1.2, 40 * w.tau2 / w.tau1, 60)])
    shape = [
        quad(lambda s: s**w.n / (1 + s**w.n) * np.exp(-s * w.tau1 / w.tau2), a, b, epsabs=0, epsrel=1e-12)[0]
        for a, b in pairwise(x)
    ]
    assert sum(shape) * w.peak * w.tau1 / w.k == pytest.approx(targets[1], rel=1e-8)


def test_two_targets_take_the_shape_of_10_350():
    result = fit(peak="200 kA", charge="98.2 C")
    has(result, peak=200e3, charge=98.2)
    assert result.assumed == ("the shape of 10/350",)
    w = result.waveform
    assert w.half_value_time() / w.front_time() == pytest.approx(35, rel=1e-9)


def test_impulse_plus_tail_by_hand():
    result = fit(peak=250e3, charge=150.0, specific_energy=15e6)
    has(result, peak=250e3, charge=150.0, specific_energy=15e6)
    assert result.method == "impulse plus tail"
    fast, slow = result.waveform.parts
    assert (fast.tail, slow.tail) == pytest.approx((360e-6, 1560e-6), rel=1e-12)
    assert slow.nominal / 250e3 == pytest.approx(0.2)


@pytest.mark.parametrize(
    ("weight", "fast", "slow"),
    [(0.1, 96.50726, 578.38004), (0.2, 84.34755, 386.08245), (0.3, 73.24763, 311.40397)],
)
def test_impulse_plus_tail_of_a_median_negative_stroke(weight, fast, slow):
    # each by hand: (1 − w)·τa + w·τb = 144.69453 µs, and the integral of the square 56.86459 µs
    result = fit(peak=31.1e3, charge=4.5, specific_energy=55e3, weight=weight)
    has(result, peak=31.1e3, charge=4.5, specific_energy=55e3)
    assert [part.tail / US for part in result.waveform.parts] == pytest.approx([fast, slow], rel=1e-7)


def test_impulse_plus_tail_with_front_and_half_value_time():
    targets = {"peak": 31.1e3, "charge": 4.5, "specific_energy": 55e3, "front_time": 3.83e-6}
    has(fit(**targets), **targets)
    targets["half_value_time"] = 77.5e-6
    result = fit(**targets)
    has(result, **targets)
    assert isinstance(result.waveform, Sum)


def test_boundary_of_the_single_term():
    # 200 kA, 100 C, 10 MJ/ohm is exactly 0.5·I·Q: a step and one exponential
    result = fit(peak=200e3, charge=100.0, specific_energy=10e6)
    has(result, peak=200e3, charge=100.0, specific_energy=10e6)
    assert [part.tail for part in result.waveform.parts] == pytest.approx([500e-6, 500e-6], rel=1e-6)
    level_2 = {"peak": 150e3, "charge": 75.0, "specific_energy": 5.6e6, "front_time": 10e-6}
    has(fit(**level_2), **level_2)


def test_flat_top():
    long_stroke = {"peak": 400.0, "charge": 200.0, "specific_energy": 80e3}
    result = fit(**long_stroke)
    has(result, **long_stroke)
    assert result.method == "flat top"
    assert (result.waveform.front, result.waveform.length) == pytest.approx((0, 0.5))
    rounded = long_stroke | {"specific_energy": 75e3, "front_time": 1e-3}
    result = fit(**rounded)
    has(result, **rounded)
    assert isinstance(result.waveform, Trapezoid)


def test_what_cannot_be_met_is_said():
    result = fit(peak=30e3, front_time=1.2e-6, half_value_time=50e-6, charge=5.0)
    assert set(result.unmet) >= {"charge"}
    w = result.waveform
    assert result.residuals["charge"] == pytest.approx(w.charge / 5.0 - 1, rel=1e-9)
    assert result.residuals["half_value_time"] == pytest.approx(w.half_value_time() / 50e-6 - 1, rel=1e-6)


def test_five_targets_of_one_function():
    w = Heidler(50e3, 2e-6, 120e-6, 6.5)
    targets = {"peak": w.peak, "charge": w.charge, "specific_energy": w.specific_energy}
    targets |= {"front_time": w.front_time(), "half_value_time": w.half_value_time()}
    result = fit(**targets)
    has(result, **targets)
    assert result.waveform.n == pytest.approx(6.5, rel=1e-6)


def test_definition_of_the_front():
    result = fit(peak=1.0, front_time=1.2e-6, half_value_time=50e-6, definition="30/90")
    assert result.waveform.front_time("30/90") == pytest.approx(1.2e-6, rel=1e-9)


def test_arrays_of_mixed_kinds():
    peak, charge = np.array([200e3, 250e3, 400.0, 200e3]), np.array([100, 150, 200, 100.0])
    energy = np.array([10.28e6, 15e6, 80e3, 10.5e6])
    result = fit(peak=peak, charge=charge, specific_energy=energy)
    has(result, peak=peak, charge=charge, specific_energy=energy)
    assert list(result.method) == ["Heidler", "impulse plus tail", "flat top", "Heidler"]
    w = result.waveform
    assert w.shape == (4,)
    for k in range(4):
        one = fit(peak=peak[k], charge=charge[k], specific_energy=energy[k]).waveform
        assert type(w[k]) is type(one)
        for name in ("peak", "charge", "specific_energy", "peak_time", "max_steepness", "absolute_charge"):
            assert getattr(w, name)[k] == pytest.approx(getattr(one, name), rel=1e-7, abs=1e-12)
        assert w.half_value_time()[k] == pytest.approx(one.half_value_time(), rel=1e-7)
        assert w.front_time()[k] == pytest.approx(one.front_time(), rel=1e-7, abs=1e-15)
        assert w.charge_until(1e-4)[k] == pytest.approx(one.charge_until(1e-4), rel=1e-7)
        assert w.specific_energy_until(1e-4)[k] == pytest.approx(one.specific_energy_until(1e-4), rel=1e-7)
        t = np.array([1e-6, 1e-4])
        np.testing.assert_allclose(w.current(t[:, None])[:, k], one.current(t), rtol=1e-6)
        np.testing.assert_allclose(w.slope(t[:, None])[:, k], one.slope(t), rtol=1e-5, atol=1.0)
    assert w[[2, 0]].charge == pytest.approx([200, 100])
    assert w[1:3].specific_energy == pytest.approx([15e6, 80e3])
    doubled = w * 2
    np.testing.assert_allclose(doubled.specific_energy, 4 * energy, rtol=1e-7)
    later = w + w.delayed(1.0)
    np.testing.assert_allclose(later.specific_energy, 2 * energy, rtol=1e-7)
    assert w == fit(peak=peak, charge=charge, specific_energy=energy).waveform
    assert "flat" not in repr(w)
    assert "Trapezoid" in repr(w)


def test_arrays_keep_their_shape():
    peak = np.array([[1e4, 2e4, 5e4]]), np.array([[1.0], [2.0]])
    result = fit(peak=peak[0], charge=peak[1] * peak[0] * 1e-4, front_time=2e-6)
    assert result.waveform.shape == (2, 3)
    assert result.residuals["charge"].shape == (2, 3)
    assert isinstance(fit(peak=1e4, charge=1.0, front_time=2e-6).waveform.tau1, float)
    assert isinstance(fit(peak=1e4, charge=0.4, specific_energy=1500.0).waveform.parts[0], LinearFront)


def test_least_squares_of_scattered_targets():
    """With n fixed the answer is that of scipy's least squares on the logarithms of the same figures."""
    truth = Heidler(80e3, 3e-6, 200e-6)
    asked = np.array(
        [truth.peak * 1.1, truth.charge * 0.93, truth.specific_energy * 1.2, truth.front_time() * 0.9]
    )
    found = fit(peak=asked[0], charge=asked[1], specific_energy=asked[2], front_time=asked[3], n=10)

    def residual(p):
        w = Heidler(*np.exp(p))
        return np.log([w.peak, w.charge, w.specific_energy, w.front_time()]) - np.log(asked)

    start = np.log([50e3, 1e-6, 100e-6])
    best = least_squares(residual, start, xtol=1e-14, ftol=1e-14, gtol=1e-14)
    w = found.waveform
    np.testing.assert_allclose([w.peak, w.tau1, w.tau2], np.exp(best.x), rtol=1e-6)
    np.testing.assert_allclose(np.log1p(list(found.residuals.values())), best.fun, atol=1e-7)
    assert found.unmet == ("peak", "charge", "specific_energy", "front_time")


@pytest.mark.parametrize(
    ("given", "words"),
    [
        ({"peak": 35e3, "charge": 16.0, "specific_energy": 650e3}, ["W/R <= I*Q", "35 kA", "16 C"]),
        ({"peak": 4.6e3, "charge": 2.0, "specific_energy": 25e3}, ["W/R <= I*Q"]),
        ({"charge": 100.0, "specific_energy": 10e6, "duration": 0.9e-3}, ["Q^2/T <= W/R"]),
        ({"charge": 100.0, "peak": 10e3, "duration": "1 ms"}, ["Q <= I*T"]),
        ({"peak": [35e3, 3e4], "charge": 16.0, "specific_energy": 500e3}, ["1 of 2", "W/R <= I*Q"]),
        ({"front_time": 1e-6, "half_value_time": 5e-5}, ["front_time and half_value_time", "peak, charge"]),
        ({"peak": 1e5}, ["peak fixes no waveform"]),
        ({}, ["nothing fixes"]),
        (
            {"peak": -1.0, "charge": np.nan, "front_time": "3 kA"},
            ["peak: -1", "charge: nan", "front_time: '3 kA'"],
        ),
        ({"peak": [1.0, 2.0], "charge": [1.0, 2.0, 3.0]}, ["do not fit together"]),
        ({"peak": 1e5, "charge": 50.0, "weight": 1.5}, ["weight"]),
        ({"peak": 1e5, "charge": 50.0, "n": [5, 6]}, ["n between 1 and 120"]),
        ({"peak": 1e4, "charge": 1.0, "front_time": 1.0}, ["0.08*I*T1 <= Q", "10 kA"]),
        ({"peak": 1e4, "charge": 1.0, "front_time": 1.0, "definition": "30/90"}, ["0.18*I*T1 <= Q"]),
        ({"peak": 1e4, "specific_energy": 1.0, "front_time": 1.0}, ["0.008*I^2*T1 <= W/R"]),
        ({"peak": 1e5, "charge": []}, ["charge: the array is empty"]),
        ({"peak": 1e5, "charge": 50.0, "n": 0.5}, ["n between 1 and 120"]),
        ({"peak": 1e5, "charge": 50.0, "front_time": 1e-6, "definition": "20/80"}, ["20/80"]),
    ],
)
def test_refusals(given, words):
    with pytest.raises(InputError) as caught:
        fit(**given)
    for word in words:
        assert word in str(caught.value)
