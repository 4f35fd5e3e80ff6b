"""Where a record has no current: its offset and noise, and the sign of the stroke."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from strikeenergy.errors import InputError, Problem
from strikeenergy.lightning.record import Record
from strikeenergy.lightning.reduce_signal import BLOCK, Baseline, Signal, baseline, walk

__all__ = ["FEWEST", "find_baseline", "noise_of_differences", "resolution"]

FEWEST = 8
"""Fewest samples of a baseline."""

_Floats = NDArray[np.float64]


def find_baseline(record: Record, window: tuple[float, float] | None = None) -> tuple[Baseline, int, int]:
    """Find the level before the stroke.

    Args:
        record: as read.
        window: first and last time without current (s). By default all that lies one front time before the first
            sample that leaves the noise (six sigma, or 2 % of the peak) or before the 10 % point, whichever is earlier.

    Returns:
        the baseline (with no window where fewer than ``FEWEST`` samples are quiet), the index from which to integrate,
        and the sign of the largest excursion.

    Raises:
        InputError: the window holds fewer than two samples.
    """
    t, i = record.t, record.i
    if window is not None:
        start, stop = (int(n) for n in np.searchsorted(t, window))
        stop += int(stop < t.size and t[stop] <= window[1])
        if stop - start < 2:
            what = (
                f"baseline: there are {max(stop - start, 0)} samples from {window[0]:g} s to {window[1]:g} s"
            )
            raise InputError(
                [Problem(what, f"give a window within {t[0]:g} s to {t[-1]:g} s", place=record.name)]
            )
        found = baseline(t, i, start, stop)
        sign, top, _ = _excursion(i, found.offset)
        return found, stop - 1 if stop <= top and start == 0 else 0, sign
    count = min(max(32, t.size // 200), 20_000, t.size)
    middle = float(np.median(i[:count]))
    noise = 1.4826 * float(np.median(np.abs(i[:count] - middle)))
    found, stop = Baseline(), 0
    for _ in range(3):  # the window depends on the level, and the level on the window
        stop = _quiet_until(t, i, middle, noise)
        if stop < FEWEST:
            break
        found = baseline(t, i, 0, stop)
        middle, noise = found.offset, found.noise
    if stop < FEWEST:
        return Baseline(), 0, _excursion(i, 0.0)[0]
    return found, stop - 1, _excursion(i, found.offset)[0]


def _excursion(i: _Floats, level: float) -> tuple[int, int, float]:
    """Return sign, index and size of the largest excursion from a level."""
    high, low = int(np.argmax(i)), int(np.argmin(i))
    up, down = float(i[high]) - level, level - float(i[low])
    return (1, high, up) if up >= down else (-1, low, down)


def _quiet_until(t: _Floats, i: _Floats, level: float, noise: float) -> int:
    sign, top, size = _excursion(i, level)
    signal = Signal(t, i, level, sign)
    low, high = walk(signal, top, 0.1 * size, -1), walk(signal, top, 0.9 * size, -1)
    if low < 0 or high < 0:
        return 0
    threshold = max(6 * noise, 0.02 * size)
    first = low
    for start in range(0, low, BLOCK):
        away = np.flatnonzero(np.abs(i[start : min(start + BLOCK, low)] - level) > threshold)
        if away.size:
            first = start + int(away[0])
            break
    front = 1.25 * float(t[high + 1] - t[low])
    return int(np.searchsorted(t, float(t[first]) - front))


def noise_of_differences(record: Record) -> float:
    """Noise of a sample (A) from the second differences at the end of the record, where there is no baseline.

    Straight parts of the current drop out of second differences, whose variance is six times that of the noise. For
    even steps; a curved current is taken for noise, so this is an upper bound.
    """
    part = record.i[-1000:]
    if part.size < 16:
        return 0.0
    return float(np.median(np.abs(np.diff(part, 2)))) * 1.4826 / 6**0.5


def resolution(record: Record, top: int) -> float:
    """Step of the recorder or of the print (A): the smallest difference between samples around the peak."""
    around = np.unique(record.i[max(top - 2048, 0) : top + 2048])
    return float(np.diff(around).min()) if around.size > 1 else 0.0
