"""Charge, specific energy and fits of 100 000 Heidler functions, against the loops of scipy that one would write.

Each ratio is that of two CPU times of one run; the loop is timed on a sample and scaled.
"""

import time
from itertools import pairwise

import numpy as np
import pytest
from scipy.integrate import quad
from scipy.optimize import least_squares

from strikeenergy.lightning.fitting import fit
from strikeenergy.lightning.waveform import Heidler
from strikeenergy.physics import pulses

N = 100_000
RNG = np.random.default_rng(20_240_601)
PEAK, TAU1, TAU2 = RNG.uniform(5e3, 2e5, N), RNG.uniform(2e-7, 2e-5, N), RNG.uniform(5e-5, 5e-4, N)


def seconds(work, repeats=3):
    """Median CPU time."""
    times = []
    for _ in range(repeats):
        start = time.process_time()
        work()
        times.append(time.process_time() - start)
    return float(np.median(times))


@pytest.mark.benchmark
def test_integrals_against_a_quad_loop():
    sample = range(0, N, N // 40)

    def loop():
        out = []
        for j in sample:
            peak, tau1, tau2 = PEAK[j], TAU1[j], TAU2[j]
            k = float(pulses.heidler_correction(tau1, tau2, 10.0))

            def current(t, peak=peak, tau1=tau1, tau2=tau2, k=k):
                x = (t / tau1) ** 10
                return peak / k * x / (1 + x) * np.exp(-t / tau2)

            def square(t, current=current):
                return current(t) ** 2

            # in two pieces: unsplit, the adaptive rule misses the front
            ends = (0, 3 * tau1, 40 * tau2)
            out.append(
                [
                    sum(quad(f, a, b, epsabs=0, epsrel=1e-10, limit=200)[0] for a, b in pairwise(ends))
                    for f in (current, square)
                ]
            )
        return np.array(out)

    def ours():
        w = Heidler(PEAK, TAU1, TAU2)
        return w.charge, w.specific_energy

    per_loop, per_set = seconds(loop) / len(sample), seconds(ours) / N
    first, second = pulses.heidler_integrals_closed(TAU1 / TAU2, 10)
    k = pulses.heidler_correction(TAU1, TAU2, 10.0)
    charge, energy = ours()
    error = max(
        np.abs(charge / (PEAK * TAU1 / k * first) - 1).max(),
        np.abs(energy / ((PEAK / k) ** 2 * TAU1 * second) - 1).max(),
    )
    np.testing.assert_allclose(np.stack([charge, energy], axis=1)[list(sample)], loop(), rtol=1e-6)
    ratio = per_loop / per_set
    print(
        f"\ncharge and W/R: {per_set * 1e6:.2f} µs a set, {ratio:.0f} times a quad loop, worst error {error:.1e}"
    )
    assert error <= 1e-10
    assert ratio >= 300


def sampled_figures(p):
    """What one would write: the waveform on a grid, and its figures from the samples."""
    peak, tau1, tau2 = np.exp(p)
    t = np.geomspace(tau1 / 20, 40 * tau2, 2000)
    x = (t / tau1) ** 10
    i = x / (1 + x) * np.exp(-t / tau2)
    top = i.argmax()
    # a parabola through the three highest samples, in ln t
    a, b, c = i[top - 1 : top + 2]
    highest = b - (c - a) ** 2 / (8 * (a - 2 * b + c))
    i *= peak / highest
    low, high = np.interp(np.log([0.1 * peak, 0.9 * peak]), np.log(i[: top + 1]), np.log(t[: top + 1]))
    charge, energy = np.trapezoid(i * t, np.log(t)), np.trapezoid(i * i * t, np.log(t))
    return np.log([peak, charge, energy, 1.25 * (np.exp(high) - np.exp(low))])


@pytest.mark.benchmark
def test_fits_against_a_least_squares_loop():
    truth = Heidler(PEAK, TAU1, TAU2)
    # Four figures scattered apart by some 10 % each, for three parameters: no exact answer.
    scatter = np.exp(0.1 * np.clip(RNG.standard_normal((4, N)), -1.5, 1.5))
    asked = np.stack([truth.peak, truth.charge, truth.specific_energy, truth.front_time()]) * scatter
    sample = range(0, N, N // 40)

    def loop():
        out = []
        for j in sample:
            goal = np.log(asked[:, j])
            start = [goal[0], goal[3] + np.log(1.9), goal[1] - goal[0]]
            best = least_squares(
                lambda p, goal=goal: sampled_figures(p) - goal, start, xtol=1e-10, ftol=1e-12
            )
            out.append(np.exp(best.x))
        return np.array(out)

    def ours():
        return fit(peak=asked[0], charge=asked[1], specific_energy=asked[2], front_time=asked[3], n=10)

    possible = asked[2] <= asked[0] * asked[1]
    asked = asked[:, possible] if not possible.all() else asked
    number = asked.shape[1]
    sample = range(0, number, number // 40)
    ours()  # builds the tables, once a process
    per_loop, per_fit = seconds(loop, 1) / len(sample), seconds(ours) / number
    w = ours().waveform
    found = np.stack([w.peak, w.tau1, w.tau2], axis=1)[list(sample)]
    difference = np.abs(found / loop() - 1).max()
    ratio = per_loop / per_fit
    print(
        f"\nfits: {per_fit * 1e6:.1f} µs each, {ratio:.0f} times a least_squares loop, answers within {difference:.1e}"
    )
    assert difference <= 1e-3
    assert ratio >= 150


@pytest.mark.benchmark
def test_fits_of_consistent_figures():
    truth = Heidler(PEAK, TAU1, TAU2)
    asked = (truth.peak, truth.charge, truth.specific_energy, truth.front_time())

    def ours():
        return fit(peak=asked[0], charge=asked[1], specific_energy=asked[2], front_time=asked[3])

    def loop():
        for j in range(0, N, N // 20):
            goal = np.log([values[j] for values in asked])
            start = [goal[0], goal[3] + np.log(1.9), goal[1] - goal[0]]
            least_squares(lambda p, goal=goal: sampled_figures(p) - goal, start, xtol=1e-10, ftol=1e-12)

    result = ours()
    ratio = seconds(loop, 1) / 20 / (seconds(ours) / N)
    worst = max(np.abs(result.waveform.tau1 / TAU1 - 1).max(), np.abs(result.waveform.tau2 / TAU2 - 1).max())
    print(
        f"\nfits of consistent figures: {ratio:.0f} times a least_squares loop, parameters back to {worst:.1e}"
    )
    assert result.unmet == ()
    assert worst <= 1e-9
    assert ratio >= 150
