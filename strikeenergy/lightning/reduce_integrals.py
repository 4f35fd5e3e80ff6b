"""Charge and specific energy of a record, their cumulative curves, and the tail that a record cut short leaves out."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from strikeenergy.lightning.reduce_signal import Signal

__all__ = ["Curves", "Integrals", "Tail", "curve_points", "fit_tail", "integrate"]

_Floats = NDArray[np.float64]
_BINS = 48


@dataclass(frozen=True, eq=False)
class Curves:
    """Current and running integrals at selected samples, dense at the front; exact there, not interpolated.

    Attributes (arrays of one length):
        t: time (s), counted as in the record.
        i: current, offset and droop removed, the stroke positive (A).
        charge: since the start of the integration (C).
        specific_energy: the same for ∫ i² dt, noise bias removed (J/ohm).
    """

    t: _Floats
    i: _Floats
    charge: _Floats
    specific_energy: _Floats


@dataclass(frozen=True)
class Integrals:
    """Integrals by the trapezoid rule over all samples of a span, and what their uncertainty is made of.

    Attributes:
        charge: ∫ i dt (C).
        square: ∫ i² dt, noise bias not removed (J/ohm).
        charge_step, square_step: what the step width may have added: a third of the difference to every second sample.
        step_squares: sum of the squared steps (s²).
        weighted_squares: sum of i² times the squared steps (A² s²).
        span: length (s).
        lowest: lowest sample after the peak (A).
        curves: at the selected samples.
    """

    charge: float
    square: float
    charge_step: float
    square_step: float
    step_squares: float
    weighted_squares: float
    span: float
    lowest: float
    curves: Curves


def curve_points(
    t: _Floats, origin: float, front: float, half_value: float, most: int = 3000
) -> NDArray[np.intp]:
    """Choose the samples at which curves are kept: the front closely, then ever wider steps, and an even raster."""
    even = np.linspace(0, t.size - 1, min(most // 3, t.size))
    rest = max(float(t[-1]) - origin, front)
    near = np.linspace(origin - front, origin + 4 * front, most // 6)
    body = np.linspace(origin, origin + 4 * half_value, most // 6)
    wide = origin + np.geomspace(front, rest, most // 3)
    index = np.searchsorted(t, np.concatenate((near, body, wide)))
    return np.unique(np.concatenate((even.astype(np.intp), np.minimum(index, t.size - 1))))


def integrate(signal: Signal, start: int, peak: int, noise: float, points: NDArray[np.intp]) -> Integrals:
    """Integrate from a sample to the end of the record.

    Args:
        signal: the current.
        start: index of the first sample.
        peak: index of the peak.
        noise: standard deviation of a sample (A); sigma² times the running time is taken off the curve of ∫ i² dt.
        points: indices of the samples of the curves.
    """
    charge = square = charge2 = square2 = steps = weighted = 0.0
    lowest = math.inf
    q_curve, w_curve, i_curve = np.zeros(points.size), np.zeros(points.size), np.zeros(points.size)
    before = points < start
    for index in np.flatnonzero(before).tolist():
        i_curve[index] = signal.part(int(points[index]), int(points[index]) + 1)[0]
    for first, times, current in signal.blocks(start):
        dt = np.diff(times)
        squared = current * current
        q_parts = 0.5 * dt * (current[1:] + current[:-1])
        w_parts = 0.5 * dt * (squared[1:] + squared[:-1])
        here = slice(*np.searchsorted(points, (first, first + times.size)).tolist())
        local = points[here] - first
        i_curve[here] = current[local]
        q_curve[here] = charge + np.concatenate(([0.0], np.cumsum(q_parts)))[local]
        w_curve[here] = square + np.concatenate(([0.0], np.cumsum(w_parts)))[local]
        charge += float(q_parts.sum())
        square += float(w_parts.sum())
        steps += float(dt @ dt)
        weighted += float(squared[1:] @ (dt * dt))
        every = np.arange(0, times.size, 2)
        if every[-1] != times.size - 1:
            every = np.append(every, times.size - 1)
        charge2 += float(np.trapezoid(current[every], times[every]))
        square2 += float(np.trapezoid(squared[every], times[every]))
        if first + times.size > peak:
            lowest = min(lowest, float(current[max(peak - first, 0) :].min()))
    begin = float(signal.t[start])
    w_curve -= noise * noise * np.maximum(signal.t[points] - begin, 0.0)
    curves = Curves(signal.t[points], i_curve, q_curve, w_curve)
    span = float(signal.t[-1]) - begin
    return Integrals(
        charge,
        square,
        abs(charge2 - charge) / 3,
        abs(square2 - square) / 3,
        steps,
        weighted,
        span,
        lowest,
        curves,
    )


@dataclass(frozen=True)
class Tail:
    """What lies beyond the end of the record, if the current goes on as the exponential that fits its last part.

    It is reported beside the results and never added to them.

    Attributes:
        current: at the end of the record (A).
        time_constant: of the exponential (s); None where the current does not fall.
        charge: beyond the end (C); None likewise.
        specific_energy: beyond the end (J/ohm); None likewise.
        charge_uncertainty, specific_energy_uncertainty: standard uncertainties of the two.
    """

    current: float
    time_constant: float | None
    charge: float | None
    specific_energy: float | None
    charge_uncertainty: float | None
    specific_energy_uncertainty: float | None


def fit_tail(signal: Signal, peak: int, noise: float, offset_error: float) -> Tail | None:
    """Fit A exp(-t/tau) to the last half of the time after the peak.

    The samples are averaged in bins, and the logarithms of the means are fitted with the weights that they deserve.
    Returns None where the current has fallen into the noise before the end: then nothing to speak of is cut off.

    Args:
        signal: the current.
        peak: index of its peak.
        noise: of a sample (A).
        offset_error: standard error of the offset (A).
    """
    end = float(signal.t[-1])
    begin = 0.5 * (float(signal.t[peak]) + end)
    start = int(np.searchsorted(signal.t, begin))
    bins = min(_BINS, (signal.size - start) // 2)
    if bins < 4:
        return None
    edges = np.linspace(begin, end * (1 + 1e-12) if end > 0 else end, bins + 1)
    counts, sums, times = np.zeros(bins), np.zeros(bins), np.zeros(bins)
    for first, t, i in signal.blocks(start):
        share = slice(
            0, t.size if first + t.size >= signal.size else t.size - 1
        )  # pieces share their end samples
        where = np.clip(np.searchsorted(edges, t[share], side="right") - 1, 0, bins - 1)
        counts += np.bincount(where, minlength=bins)
        sums += np.bincount(where, i[share], minlength=bins)
        times += np.bincount(where, t[share] - end, minlength=bins)
    held = counts > 0
    means, moments, counts = sums[held] / counts[held], times[held] / counts[held], counts[held]
    errors = np.hypot(noise / np.sqrt(counts), offset_error)
    seen = means > 4 * errors
    if not seen[-1] or means[-1] <= 0:
        return None
    run = (
        int(np.argmin(seen[::-1])) if not seen.all() else seen.size
    )  # the last bins that stand out of the noise
    means, moments, errors = means[-run:], moments[-run:], errors[-run:]
    if run < 4:
        return Tail(float(means[-1]), None, None, None, None, None)
    relative = np.maximum(errors / means, 1e-6)
    matrix = np.column_stack((np.ones(run), moments)) / relative[:, None]
    solution, _, _, _ = np.linalg.lstsq(matrix, np.log(means) / relative, rcond=None)
    rest = np.log(means) / relative - matrix @ solution
    spread = max(float(rest @ rest) / max(run - 2, 1), 1.0)
    covariance = np.linalg.inv(matrix.T @ matrix) * spread
    rate = -float(solution[1])
    if rate * (end - begin) < 0.05 or rate < 3 * covariance[1, 1] ** 0.5:
        return Tail(float(means[-1]), None, None, None, None, None)
    half_bin = 0.5 * rate * (end - begin) / bins
    current = (
        math.exp(float(solution[0])) * half_bin / math.sinh(half_bin)
    )  # a bin's mean lies above its middle
    tau = 1 / rate
    # charge = exp(a)/rate and W/R = exp(2 a)/(2 rate), with a and rate correlated: gradients (1, tau) and (2, tau)
    # against the parameters (a, -rate) of the fit.
    sizes = (current * tau, current * current * tau / 2)
    gradients = (np.array([1.0, tau]), np.array([2.0, tau]))
    q_error, w_error = (
        size * float(g @ covariance @ g) ** 0.5 for size, g in zip(sizes, gradients, strict=True)
    )
    return Tail(current, tau, sizes[0], sizes[1], q_error, w_error)
