"""A record with its offset and droop taken away, read piece by piece, and what is found by walking along it.

Currents here are normalised: the stroke is positive. Nothing holds a second copy of the record.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

__all__ = [
    "BLOCK",
    "Baseline",
    "Crossing",
    "Peak",
    "Signal",
    "baseline",
    "crossing_down",
    "crossing_up",
    "find_peak",
    "walk",
]

BLOCK = 1 << 17
"""Samples that are worked on at a time."""

_PLATEAU = 200_000  # most samples of a local fit

_Floats = NDArray[np.float64]


@dataclass(frozen=True)
class Baseline:
    """The level and the noise of the record without current.

    Attributes:
        offset: mean over the window (A, in the sign of the record); 0 where there is no window.
        error: its standard error (A); 0 where there is no window.
        noise: standard deviation of a sample (A); 0 where it is not known.
        window: first and last time (s), or None.
        samples: in the window.
    """

    offset: float = 0.0
    error: float = 0.0
    noise: float = 0.0
    window: tuple[float, float] | None = None
    samples: int = 0


def baseline(t: _Floats, i: _Floats, start: int, stop: int) -> Baseline:
    """Mean, its standard error and the noise over samples start to stop.

    The standard error is sigma/sqrt(N) for noise without memory. Where the means of sixteen parts of the window scatter
    more than that (drift, hum), their scatter is taken.
    """
    part = i[start:stop]
    mean = float(np.mean(part))
    # Piece by piece: numpy would make a copy of the whole window.
    squares = sum(float(np.sum(np.square(part[k : k + BLOCK] - mean))) for k in range(0, part.size, BLOCK))
    noise = (squares / (part.size - 1)) ** 0.5
    error = noise / part.size**0.5
    parts = 16
    if part.size >= 8 * parts:
        means = part[: part.size // parts * parts].reshape(parts, -1).mean(axis=1)
        scatter = float(np.std(means, ddof=1)) / parts**0.5
        if scatter > 1.6 * error:  # beyond what sixteen means scatter by chance
            error = scatter
    return Baseline(mean, error, noise, (float(t[start]), float(t[stop - 1])), int(part.size))


class Signal:
    """The current of a record (A): sign * (i_m - offset), and the droop of the sensor repaired.

    A sensor with high-pass time constant t_d shows i_m with di_m/dt + i_m/t_d = di/dt; so i = i_m + (1/t_d) ∫ i_m dt,
    which is exact. The integral is a trapezoid sum, exact for straight lines between the samples.
    """

    def __init__(self, t: _Floats, i: _Floats, offset: float, sign: int, droop: float | None = None) -> None:
        self.t, self.raw, self.offset, self.sign, self.droop = t, i, offset, sign, droop
        self.size = t.size
        self._charge_at: list[float] = []
        if droop is not None:
            total = 0.0
            for start in range(0, self.size, BLOCK):
                self._charge_at.append(total)
                stop = min(start + BLOCK + 1, self.size)
                total += float(np.trapezoid(self._measured(start, stop), t[start:stop]))

    def _measured(self, start: int, stop: int) -> _Floats:
        part: _Floats = self.raw[start:stop] - self.offset
        if self.sign < 0:
            np.negative(part, out=part)
        return part

    def part(self, start: int, stop: int) -> _Floats:
        """Return the current of the samples from start up to stop (A)."""
        start, stop = max(start, 0), min(stop, self.size)
        if self.droop is None:
            return self._measured(start, stop)
        out = np.empty(max(stop - start, 0))
        for block in range(start // BLOCK, -(-stop // BLOCK)):
            first, last = block * BLOCK, min((block + 1) * BLOCK, stop)
            part = self._measured(first, last)
            charge = np.full(part.size, self._charge_at[block])
            charge[1:] += np.cumsum(0.5 * np.diff(self.t[first:last]) * (part[1:] + part[:-1]))
            part += charge / self.droop
            begin = max(start, first)
            out[begin - start : last - start] = part[begin - first :]
        return out

    def blocks(self, start: int = 0, stop: int | None = None) -> Iterator[tuple[int, _Floats, _Floats]]:
        """Yield first index, times and currents of pieces that share their end samples."""
        end = self.size if stop is None else stop
        while start < end - 1:
            # Pieces end on the grid of blocks, so that a drooped piece need not be summed twice.
            last = min((start // BLOCK + 1) * BLOCK, end - 1)
            yield start, self.t[start : last + 1], self.part(start, last + 1)
            start = last

    def argmax(self) -> int:
        """Return the index of the largest sample."""
        best, where = -np.inf, 0
        for first, _, part in self.blocks():
            k = int(np.argmax(part))
            if part[k] > best:
                best, where = float(part[k]), first + k
        return where


class Peak(NamedTuple):
    """The peak of a local fit."""

    value: float
    """(A)"""
    time: float
    """(s)"""
    noise: float
    """Standard uncertainty from noise (A)."""
    fit: float
    """What fits of lower degree differ by (A)."""
    samples: int


def find_peak(signal: Signal, at: int, noise: float) -> Peak:
    """Fit the top of the current: the highest sample of a noisy record is too high, by two or three sigma.

    A polynomial of fourth degree through the samples around the highest that lie within eight times the noise of it;
    with few samples a parabola through the highest and its neighbours. On Heidler currents with a noise of 0.2 % of the
    peak the shape of the polynomial costs less than 0.04 %.

    Args:
        signal: the current.
        at: index of the highest sample.
        noise: of a sample (A).
    """
    top = float(signal.part(at, at + 1)[0])
    level = top - min(max(8 * noise, 1e-4 * top), 0.3 * top)
    start, stop = walk(signal, at, level, -1) + 1, walk(signal, at, level, +1)
    if stop - start > _PLATEAU:  # every further sample of a plateau adds nothing
        start = min(max(at - _PLATEAU // 2, start), stop - _PLATEAU)
        stop = start + _PLATEAU
    if stop - start < 6:
        start, stop = max(at - 1, 0), min(at + 2, signal.size)
        if stop - start < 3:  # at an end of the record
            return Peak(top, float(signal.t[at]), noise, 0.0, 1)
        value, time, error, _ = _top_of_fit(signal, start, stop, 2, noise)
        if value - top > 0.02 * top:  # a corner, over which a parabola shoots out
            return Peak(top, float(signal.t[at]), noise, 0.01 * top, 1)
        return Peak(value, time, error, abs(value - top), 3)
    degree = 4 if stop - start >= 8 else 3
    value, time, error, near = _top_of_fit(signal, start, stop, degree, noise)
    if (
        level < 0.975 * top and near[1] - near[0] >= 8
    ):  # so much noise that the first fit spans more than the top
        start, stop = near
        value, time, error, _ = _top_of_fit(signal, start, stop, degree, noise)
    lower, lowest = (_top_of_fit(signal, start, stop, degree - less, noise)[0] for less in (1, 2))
    return Peak(value, time, error, max(abs(value - lower), 0.25 * abs(value - lowest)), stop - start)


def _top_of_fit(
    signal: Signal, start: int, stop: int, degree: int, noise: float
) -> tuple[float, float, float, tuple[int, int]]:
    """Return peak, its time and standard error of a polynomial fit, and the samples where it is within 2.5 % of its top."""
    times = signal.t[start:stop]
    middle, half = 0.5 * float(times[0] + times[-1]), 0.5 * float(times[-1] - times[0])
    matrix = np.vander((times - middle) / half, degree + 1, increasing=True)
    fitted = np.linalg.lstsq(matrix, signal.part(start, stop), rcond=None)[0]
    grid = np.linspace(-1, 1, 2001)
    fine = np.vander(grid, degree + 1, increasing=True)
    values = fine @ fitted
    k = int(np.argmax(values))
    spread = np.linalg.solve(matrix.T @ matrix, fine[k])
    high = middle + half * grid[values > 0.975 * values[k]]
    near = (int(np.searchsorted(signal.t, high[0])), int(np.searchsorted(signal.t, high[-1], side="right")))
    return float(values[k]), float(middle + half * grid[k]), noise * float(fine[k] @ spread) ** 0.5, near


def walk(signal: Signal, at: int, level: float, way: int) -> int:
    """Return the index of the first sample below the level, walking from ``at``; -1 or size where there is none."""
    step = 1024
    position = at
    while 0 <= position < signal.size:
        start, stop = (position - step, position) if way < 0 else (position, position + step)
        start, stop = max(start, 0), min(stop, signal.size)
        below = np.flatnonzero(signal.part(start, stop) < level)
        if below.size:
            return start + int(below[-1 if way < 0 else 0])
        position, step = (start if start > 0 else -1) if way < 0 else stop, min(step * 2, BLOCK)
    return position


class Crossing(NamedTuple):
    """Where the current crosses a level."""

    time: float
    """(s)"""
    slope: float
    """(A/s)"""
    noise: float
    """Standard uncertainty of the time from noise (s)."""
    before: int
    """Index of the sample before it."""


def crossing_up(
    signal: Signal, before: int, level: float, width: float, noise: float, after: int = -1
) -> Crossing | None:
    """Find the first crossing after the last sample below the level, before an index. None if there is no such sample.

    Args:
        signal: the current.
        before: index of the peak.
        level: (A).
        width: half the width of the local fit (s); 0 for straight interpolation.
        noise: of a sample (A).
        after: look for the first crossing after this index, instead of the last one before the peak.
    """
    if after < 0:
        k = walk(signal, before, level, -1)
        return None if k < 0 else _refine(signal, k, level, width, noise)
    for start, _, part in signal.blocks(after, before + 1):
        above = np.flatnonzero(part >= level)
        if above.size:
            return _refine(signal, max(start + int(above[0]) - 1, 0), level, width, noise)
    return None


def crossing_down(signal: Signal, after: int, level: float, width: float, noise: float) -> Crossing | None:
    """Find the first crossing that lasts: below it the mean of the next 5 % of the time since the peak stays."""
    k = after
    while True:
        k = walk(signal, k, level, +1)
        if k >= signal.size:
            return None
        passed = float(signal.t[k] - signal.t[after])
        stop = max(int(np.searchsorted(signal.t, signal.t[k] + 0.05 * passed)), k + 1)
        if signal.part(k, stop).mean() < level:
            break
        k += max((stop - k) // 8, 1)
    if signal.part(k - 1, k)[0] >= level:
        return _refine(signal, k - 1, level, width, noise)
    # Amid noise: the samples beside it say nothing of the slope.
    slope = -level / passed
    return _refine(
        signal, k - 1, level, width, noise, Crossing(float(signal.t[k]), slope, noise / abs(slope), k - 1)
    )


def _refine(
    signal: Signal, k: int, level: float, width: float, noise: float, rough: Crossing | None = None
) -> Crossing:
    """Interpolate between samples k and k + 1; in noise fit a parabola to what lies around, if that is eight samples."""
    straight = rough or _between(signal, k, level, noise)
    if width <= 0 or noise <= 0:
        return straight
    before, behind = signal.part(k, k + 2)
    if abs(behind - before) > 8 * noise:
        return (
            straight  # steep: the two samples tell it better than a curve through what lies around a corner
        )
    time = straight.time
    for _ in range(12):  # the crossing of a noisy sample may lie well beside that of the current
        start, stop = (int(n) for n in np.searchsorted(signal.t, (time - width, time + width)))
        stop = min(stop, start + _PLATEAU)
        if stop - start < 8:
            return straight
        x = (signal.t[start:stop] - time) / width
        rest, gradient, curve = (
            float(c) for c in np.polynomial.polynomial.polyfit(x, signal.part(start, stop), 2)
        )
        rest -= level
        root = gradient * gradient - 4 * curve * rest
        if root <= 0 or gradient == 0:
            return straight
        shift = -2 * rest / (gradient + np.copysign(root**0.5, gradient))
        time += width * min(max(shift, -1.0), 1.0)
        if abs(shift) < 0.1:
            break
    else:
        return straight
    # The middle of a parabola through n even samples scatters by 1.5 sigma/sqrt(n).
    slope = float(np.copysign(root**0.5, gradient)) / width
    index = int(np.clip(np.searchsorted(signal.t, time) - 1, 0, signal.size - 2))
    return Crossing(time, slope, 1.5 * noise / (stop - start) ** 0.5 / abs(slope), index)


def _between(signal: Signal, k: int, level: float, noise: float) -> Crossing:
    t0, t1 = float(signal.t[k]), float(signal.t[k + 1])
    i0, i1 = (float(i) for i in signal.part(k, k + 2))
    slope = (i1 - i0) / (t1 - t0)
    return Crossing(t0 + (level - i0) / slope, slope, noise / abs(slope), k)
