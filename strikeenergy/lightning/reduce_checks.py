"""What is looked at in a record before its numbers are believed."""

from __future__ import annotations

from typing import NamedTuple

import numpy as np

from strikeenergy.formatting import format_quantity
from strikeenergy.lightning.record import Record
from strikeenergy.lightning.reduce_baseline import FEWEST
from strikeenergy.lightning.reduce_integrals import Tail
from strikeenergy.lightning.reduce_signal import Baseline, Signal

__all__ = ["Check", "check_record", "flat_top"]

FEWEST_IN_FRONT = 10
"""Samples in T1 for a front time within some 2 %."""
_TAIL = 0.005
_REVERSAL = 0.05


class Check(NamedTuple):
    """One check."""

    name: str
    outcome: str
    """``"ok"`` or ``"flag"``."""
    text: str


def check_record(
    record: Record,
    signal: Signal,
    top: int,
    level: Baseline,
    peak: float,
    front_count: int,
    front_time: float,
    falls: bool,
    charge: float,
    energy: float,
    tail: Tail | None,
    reversal: float,
) -> tuple[Check, ...]:
    """Look at a record; arguments are what the reduction found (SI)."""

    def check(name: str, good: bool, text: str) -> Check:
        return Check(name, "ok" if good else "flag", text)

    flat = flat_top(record, signal, top)
    checks = [
        check("saturation", not flat, f"{flat} samples at the top are equal: recorder or sensor may have been at its limit, and peak, charge and W/R are lower bounds" if flat else "the top is not flat"),
        check("pre-trigger", level.window is not None, f"{level.samples} samples without current" if level.window else f"fewer than {FEWEST} samples before the stroke: no offset was removed, and the uncertainties do not contain it"),
        check("offset", level.error <= 1e-3 * peak and abs(level.offset) <= 0.1 * peak, f"{format_quantity(level.offset, 'A')} removed, standard error {format_quantity(level.error, 'A', digits=2)}"),
    ]  # fmt: skip
    inside = 0 < top < signal.size - 1
    text = (
        "within the record"
        if inside
        else "the highest sample is at an end of the record: the peak is a lower bound"
    )
    checks.append(check("peak", inside, text))
    enough = front_count >= FEWEST_IN_FRONT * 0.8  # T1 is 1.25 times the time in which they are counted
    if front_time:
        text = f"{front_count} samples between 10 % and 90 %"
        checks.append(check("front samples", enough, text if enough else text + ": T1 comes out too long"))
    else:
        checks.append(check("front samples", False, "the record does not hold the front"))
    checks.append(
        check(
            "half value", falls, "reached" if falls else "the current does not fall to half within the record"
        )
    )
    checks.append(_check_tail(tail, charge, energy, peak))
    text = f"{100 * reversal:.2g} % of the peak"
    if reversal > _REVERSAL:
        text += "; it counts against the charge. Where the sensor is AC coupled, give its time constant"
    checks.append(check("reversal", reversal <= _REVERSAL, text))
    checks.append(check("gaps", not record.remarks, "; ".join(record.remarks) or "none"))
    return tuple(checks)


def _check_tail(tail: Tail | None, charge: float, energy: float, peak: float) -> Check:
    if tail is None:
        return Check("tail", "ok", "the current ends within the record")
    if tail.charge is None or tail.specific_energy is None:
        small = tail.current < _TAIL * peak
        text = (
            f"{format_quantity(tail.current, 'A')} flow at the end of the record, and no exponential fits it"
        )
        return Check("tail", "ok" if small else "flag", text)
    small = tail.charge < _TAIL * abs(charge) and tail.specific_energy < _TAIL * energy
    text = (
        f"beyond the end lie about {format_quantity(tail.charge, 'C', digits=3)} and "
        f"{format_quantity(tail.specific_energy, 'J/ohm', digits=3)}, if it goes on with a time constant of "
        f"{format_quantity(tail.time_constant or 0.0, 's', digits=3)}; not added"
    )
    return Check("tail", "ok" if small else "flag", text)


def flat_top(record: Record, signal: Signal, top: int) -> int:
    """Return how many samples at the top are equal, if that is no mere rounding to the steps of the recorder; else 0.

    A smooth top that is rounded to steps falls by three to eight of them within half the length of its flat part. A top
    that was cut falls by more, because it is cut from where the current was steep.
    """
    raw = record.i
    value = raw[top]
    reach = 4096
    while True:
        start, stop = max(top - reach, 0), min(top + reach, raw.size)
        equal = np.flatnonzero(raw[start:stop] == value)
        first, last = start + int(equal[0]), start + int(equal[-1])
        if (start == 0 or first > start + reach // 4) and (stop == raw.size or last < stop - reach // 4):
            break
        reach *= 4
    length = last - first + 1
    if equal.size < 4 or equal.size < 0.8 * length:
        return 0
    around = raw[max(first - 3 * length, 0) : last + 3 * length + 1]
    steps = np.diff(np.unique(around))
    if not steps.size:
        return int(equal.size)
    half = max(length // 2, 1)
    sides = [abs(float(raw[k] - value)) for k in (first - half, last + half) if 0 <= k < raw.size]
    return int(equal.size) if max(sides, default=0.0) > 12 * float(steps.min()) else 0
