"""What offset, noise, a cut tail, droop and coarse sampling do to the parameters of a current record.

Where the numbers come from:

* The currents are the Heidler functions of IEC 62305-1:2010 Annex B (first positive and first negative impulse, with
  the correction factor k as printed), recalled from the print and confirmed by recomputation.
* T1 by the 10 % and 90 % points follows IEC 60060-1 and IEC 62475; the formulas below follow from the definitions.
* No number below is printed in these documents. All were computed from the functions outside of this program, by
  closed forms and quadrature; those of the sampling by the definition of T1 with straight lines between samples.
"""

import math

import numpy as np
import pytest

from strikeenergy.lightning.record import Record
from strikeenergy.lightning.reduction import reduce

FIRST_POSITIVE = (200e3, 0.93, 19e-6, 485e-6)
FIRST_NEGATIVE = (100e3, 0.986, 1.82e-6, 285e-6)
SUBSEQUENT = (50e3, 0.993, 0.454e-6, 143e-6)
CHARGE = {FIRST_POSITIVE: 100.231410, FIRST_NEGATIVE: 28.717638, SUBSEQUENT: 7.177201}  # C
ENERGY = {FIRST_POSITIVE: 10275.3266e3, FIRST_NEGATIVE: 1444.9712e3, SUBSEQUENT: 179.9965e3}  # J/ohm


def heidler(t, peak, k, tau1, tau2, n=10):
    late = np.maximum(t, 1e-12)
    return np.where(t > 0, peak / k / (1 + (late / tau1) ** -n) * np.exp(-late / tau2), 0.0)


# -- offset and noise ------------------------------------------------------------------------------------------


def test_offset_of_300_a_over_20_ms():
    """An offset d adds d·T to the charge and 2·d·Q + d²·T to W/R: 6.06 C and 62.0 kJ/ohm of 100 C and 10.3 MJ/ohm."""
    t = np.arange(-2e-3, 20.2e-3, 1e-7)
    clean = heidler(t, *FIRST_POSITIVE)
    late = t >= 0
    charge = np.trapezoid((clean + 300)[late], t[late]) - CHARGE[FIRST_POSITIVE]
    energy = np.trapezoid((clean + 300)[late] ** 2, t[late]) - ENERGY[FIRST_POSITIVE]
    assert charge == pytest.approx(300 * 20.2e-3, rel=1e-4)
    assert charge == pytest.approx(6.06, abs=0.005)
    assert energy == pytest.approx(2 * 300 * CHARGE[FIRST_POSITIVE] + 300**2 * 20.2e-3, rel=1e-3)
    assert energy == pytest.approx(61.96e3, rel=1e-3)
    reduction = reduce(Record.from_arrays(t, clean + 300))
    assert reduction.offset.offset == pytest.approx(300, abs=1e-6)
    assert reduction.charge.value == pytest.approx(CHARGE[FIRST_POSITIVE], rel=1e-7)
    assert reduction.specific_energy.value == pytest.approx(ENERGY[FIRST_POSITIVE], rel=1e-7)


def test_noise_of_400_a_over_20_ms():
    """White noise adds sigma²·T = 3.2 kJ/ohm to W/R, and lifts the highest sample by less than sigma·sqrt(2 ln N)."""
    t = np.arange(-2e-3, 20.2e-3, 1e-7)
    clean = heidler(t, *FIRST_POSITIVE)
    top = clean.max()
    near = np.count_nonzero(clean > top - 400)  # samples that compete for the maximum
    lifts, charges, energies, biases = [], [], [], []
    for seed in range(12):
        noisy = clean + 400 * np.random.default_rng(seed).normal(size=t.size)
        reduction = reduce(Record.from_arrays(t, noisy))
        lifts.append(noisy.max() - top)
        charges.append(reduction.charge.value - CHARGE[FIRST_POSITIVE])
        energies.append(reduction.specific_energy.value - ENERGY[FIRST_POSITIVE])
        biases.append(reduction.noise_bias)
    np.testing.assert_allclose(biases, 3.232e3, rtol=0.03)
    # The root of 2 ln N is the bound of large numbers; the highest of some fifty samples reaches two thirds of it.
    assert 0.5 < np.mean(lifts) / (400 * math.sqrt(2 * math.log(near))) < 1
    # The baseline of 2 ms has 2e4 samples: its standard error times 20.2 ms is all but the whole uncertainty of the charge.
    expected = math.hypot(400 / math.sqrt(20_000) * 20.2e-3, 400 * math.sqrt(20.2e-3 * 1e-7))
    assert reduction.charge.uncertainty == pytest.approx(expected, rel=0.05)
    assert np.std(charges) < 1.6 * expected
    assert abs(np.mean(energies)) < 3 * reduction.specific_energy.uncertainty / math.sqrt(12)


def test_offset_and_noise_together():
    """300 A and 400 A over 20.2 ms: 6.06 C and 65.2 kJ/ohm too much, if nothing is taken off."""
    t = np.arange(0, 20.2e-3, 1e-7)
    spoilt = heidler(t, *FIRST_POSITIVE) + 300 + 400 * np.random.default_rng(4).normal(size=t.size)
    assert np.trapezoid(spoilt, t) - CHARGE[FIRST_POSITIVE] == pytest.approx(6.06, abs=0.06)
    assert np.trapezoid(spoilt**2, t) - ENERGY[FIRST_POSITIVE] == pytest.approx(65.2e3, rel=0.03)


# -- a record cut short ------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("shape", "end", "charge", "energy"),
    [
        (FIRST_POSITIVE, 0.5e-3, 62.88, 86.11),
        (FIRST_POSITIVE, 1e-3, 86.76, 98.23),
        (FIRST_POSITIVE, 2e-3, 98.32, 99.97),
        (FIRST_POSITIVE, 5e-3, 99.997, 100.0),
        (FIRST_NEGATIVE, 0.5e-3, 82.59, 96.96),
        (FIRST_NEGATIVE, 1e-3, 96.99, 99.91),
        (FIRST_NEGATIVE, 2e-3, 99.91, 100.0),
    ],
)
def test_share_of_a_record_that_ends_early(shape, end, charge, energy):
    t = np.arange(-0.1e-3, end + 1e-12, 5e-8 if shape is FIRST_POSITIVE else 1e-8)
    reduction = reduce(Record.from_arrays(t, heidler(t, *shape)))
    digits = 5e-4 if charge > 99.99 else 5e-3
    assert 100 * reduction.charge.value / CHARGE[shape] == pytest.approx(charge, abs=1.1 * digits)
    assert 100 * reduction.specific_energy.value / ENERGY[shape] == pytest.approx(energy, abs=6e-3)
    tail = reduction.tail
    assert tail.time_constant == pytest.approx(shape[3], rel=1e-5)
    assert reduction.charge.value + tail.charge == pytest.approx(CHARGE[shape], rel=1e-6)
    assert reduction.specific_energy.value + tail.specific_energy == pytest.approx(ENERGY[shape], rel=1e-6)
    flagged = any(check.name == "tail" for check in reduction.flags)
    assert flagged == (tail.charge > 0.005 * CHARGE[shape])
    assert abs(CHARGE[shape] - reduction.charge.value) <= 1.8 * reduction.charge.uncertainty


@pytest.mark.parametrize("end", [0.5e-3, 1e-3, 2e-3])
def test_cut_tail_in_noise(end):
    """The tail that is reported beside the result is right within four of its standard uncertainties."""
    t = np.arange(-0.2e-3, end, 5e-8)
    for seed in range(8):
        noise = 400 * np.random.default_rng(seed).normal(size=t.size)
        reduction = reduce(Record.from_arrays(t, heidler(t, *FIRST_POSITIVE) + 300 + noise))
        tail = reduction.tail
        missing = FIRST_POSITIVE[0] / FIRST_POSITIVE[1] * math.exp(-end / 485e-6) * 485e-6
        spread = math.hypot(tail.charge_uncertainty, reduction.offset.error * 485e-6)
        assert abs(tail.charge - missing) < 4 * spread + 1e-3 * missing
        missing = (FIRST_POSITIVE[0] / FIRST_POSITIVE[1] * math.exp(-end / 485e-6)) ** 2 * 485e-6 / 2
        assert abs(tail.specific_energy - missing) < 5 * tail.specific_energy_uncertainty + 2e-3 * missing


# -- droop ---------------------------------------------------------------------------------------------------------

TAU = 485e-6


def drooped(t, droop):
    """Return what a sensor with a high-pass time constant shows of exp(-t/TAU)."""
    late = np.maximum(t, 0)
    shown = (droop * np.exp(-late / TAU) - TAU * np.exp(-late / droop)) / (droop - TAU)
    return np.where(t >= 0, shown, 0.0)


@pytest.mark.parametrize(
    ("droop", "energy", "charge"), [(10e-3, 95.37, 63.74), (100e-3, 99.52, 95.58), (1.0, 99.95, 99.55)]
)
def test_what_droop_takes_away(droop, energy, charge):
    """W/R falls by 1/(1 + tau/t_d); the charge up to a time T falls more, and to nothing in the end."""
    assert 100 / (1 + TAU / droop) == pytest.approx(energy, abs=5e-3)
    t = np.concatenate((np.linspace(0, 5e-3, 400_001), np.linspace(5e-3, 12 * droop, 400_001)[1:]))
    shown = drooped(t, droop)
    assert np.trapezoid(shown**2, t) / (TAU / 2) == pytest.approx(1 / (1 + TAU / droop), rel=1e-6)
    assert abs(np.trapezoid(shown, t)) < 2e-5 * TAU
    early = t <= 5e-3
    assert 100 * np.trapezoid(shown[early], t[early]) / TAU == pytest.approx(charge, abs=6e-3)


@pytest.mark.parametrize("droop", [10e-3, 100e-3, 1.0])
def test_repair_is_exact(droop):
    """i = i_m + (1/t_d)·∫ i_m dt, with the integral of the closed form: no error is left but that of rounding."""
    t = np.linspace(0, 5e-3, 1001)
    integral = droop * TAU / (droop - TAU) * (np.exp(-t / droop) - np.exp(-t / TAU))
    np.testing.assert_allclose(drooped(t, droop) + integral / droop, np.exp(-t / TAU), rtol=1e-11)


@pytest.mark.parametrize("droop", [10e-3, 100e-3, 1.0])
def test_repair_of_a_record(droop):
    """A Heidler current through such a sensor, with offset: charge and W/R come back, and the reversal goes away."""
    t = np.arange(-1e-3, 12e-3, 1e-7)
    true = heidler(t, *FIRST_POSITIVE)
    # i_m = i - (1/t_d)·∫ i exp(-(t - s)/t_d) ds, stepwise and exact for straight lines to second order.
    weighted = true * np.exp(t / droop)
    inner = np.concatenate(([0.0], np.cumsum(0.5 * 1e-7 * (weighted[1:] + weighted[:-1]))))
    shown = true - inner * np.exp(-t / droop) / droop
    record = Record.from_arrays(t, shown + 120.0)
    raw, repaired = reduce(record), reduce(record, sensor_time_constant=f"{droop} s")
    assert repaired.charge.value == pytest.approx(CHARGE[FIRST_POSITIVE], rel=1e-6)
    assert repaired.specific_energy.value == pytest.approx(ENERGY[FIRST_POSITIVE], rel=1e-6)
    assert repaired.half_value_time.value == pytest.approx(356.5706e-6, rel=1e-5)
    assert raw.charge.value < repaired.charge.value * (1 - 4e-3 * min(1, 1e-2 / droop))
    assert repaired.reversal.value < 1e-5
    if droop < 0.1:
        assert raw.reversal.value > 0.02


def test_an_offset_grows_where_droop_is_repaired():
    """After the repair an offset d adds d·(T + T²/(2·t_d)) to the charge; the uncertainty says so."""
    t = np.arange(-2e-3, 20e-3, 1e-6)
    noisy = Record.from_arrays(
        t, heidler(t, *FIRST_POSITIVE) + 200 * np.random.default_rng(5).normal(size=t.size)
    )
    plain, repaired = reduce(noisy), reduce(noisy, sensor_time_constant=10e-3)
    factor = repaired.charge.parts["offset"] / plain.charge.parts["offset"]
    assert factor == pytest.approx(1 + 20e-3 / (2 * 10e-3), rel=1e-3)


# -- sampling ------------------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("shape", "step", "true", "found"),
    [
        (FIRST_NEGATIVE, 0.1, 0.99357, 1.007),
        (FIRST_NEGATIVE, 0.2, 0.99357, 1.036),
        (FIRST_NEGATIVE, 0.5, 0.99357, 1.219),
        (SUBSEQUENT, 0.05, 0.24933, 0.2597),
        (SUBSEQUENT, 0.1, 0.24933, 0.298),
    ],
)
def test_coarse_sampling_lengthens_the_front(shape, step, true, found):
    """T1 in microseconds with straight lines between samples, one of which lies at the start of the current.

    Between the phases of the sampling T1 varies as much as it is wrong; charge and W/R hardly change.
    """
    errors = []
    for phase in range(8):
        t = (np.arange(-20, 12e6 * shape[3] / step) + phase / 8) * step * 1e-6
        reduction = reduce(Record.from_arrays(t, heidler(t, *shape)))
        if phase == 0:
            assert reduction.front_time.value == pytest.approx(found * 1e-6, rel=6e-4)
        errors.append((reduction.front_time.value * 1e6 - true) / (reduction.front_time.uncertainty * 1e6))
        assert reduction.charge.value == pytest.approx(CHARGE[shape], rel=5e-3)
        assert reduction.specific_energy.value == pytest.approx(ENERGY[shape], rel=6e-3)
        assert any(check.name == "front samples" for check in reduction.flags) == (step > 0.12 * true)
    assert max(np.abs(errors)) < 2
    assert np.mean(errors) > 0


def test_ten_samples_in_the_front_are_needed_for_two_per_cent():
    """With ten steps in T1 every phase of the sampling is within 2 %; with five it is not."""
    for count, within in ((10, True), (5, False)):
        step = 0.99357e-6 / count
        worst = 0.0
        for phase in range(10):
            t = (np.arange(-20, 3000) + phase / 10) * step
            front = reduce(Record.from_arrays(t, heidler(t, *FIRST_NEGATIVE))).front_time.value
            worst = max(worst, abs(front / 0.99357e-6 - 1))
        assert (worst < 0.02) is within
