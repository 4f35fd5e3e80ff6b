"""From a measured current to its parameters: peak, front time, half-value time, charge, specific energy.

The procedure is that of impulse-current practice (IEC 60060-1, IEC 62475; IEC 62305-1 for T1 and T2): the baseline is
the mean before the stroke; T1 is 1.25 times the time from 10 % to 90 % of the peak; the virtual origin lies 0.1 T1
before the 10 % instant; T2 runs from there to the fall to 50 %. Charge and specific energy are trapezoid sums to the
end of the record.

What the errors of a record do to the result (T length of the integral, N samples of the baseline, step Δt):

* an offset d adds d·T to the charge and 2·d·Q + d²·T to W/R; its standard error after removal is σ/√N;
* white noise σ adds σ²·T to W/R, which is taken off; it scatters the charge by σ·√(T·Δt) and raises the highest sample;
* a sensor with high-pass time constant t_d loses charge; i = i_m + (1/t_d)·∫ i_m dt brings it back;
* straight lines between samples lengthen a front by about 1.2·T1·(Δt/T1)².

Left out: the uncertainty of the scale factor of sensor and recorder, and bandwidth. Add them to what is given here.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any, NamedTuple, cast

import numpy as np
from numpy.typing import NDArray

from strikeenergy.errors import InputError, Problem
from strikeenergy.lightning.flash import Stroke
from strikeenergy.lightning.record import Record
from strikeenergy.lightning.reduce_baseline import find_baseline, noise_of_differences, resolution
from strikeenergy.lightning.reduce_checks import Check, check_record
from strikeenergy.lightning.reduce_integrals import Curves, Integrals, Tail, curve_points, fit_tail, integrate
from strikeenergy.lightning.reduce_signal import (
    Baseline,
    Crossing,
    Peak,
    Signal,
    crossing_down,
    crossing_up,
    find_peak,
)
from strikeenergy.units import read

__all__ = ["Check", "Measured", "Reduction", "corrected", "reduce"]

_NAMES = {"peak": "A", "front_time": "s", "half_value_time": "s", "charge": "C", "specific_energy": "J/ohm"}


class Measured(NamedTuple):
    """One quantity of a record, in SI. ``value`` is None where the record does not give it."""

    value: float | None
    unit: str
    uncertainty: float | None
    """Standard uncertainty (one sigma), the root of the sum of the squares of ``parts``."""
    parts: dict[str, float]
    """What it is made of: offset, noise, sampling, fit, tail."""

    def to_dict(self) -> dict[str, Any]:
        """Return value, unit and uncertainty for JSON."""
        return {"value": self.value, "unit": self.unit, "uncertainty": self.uncertainty}


@dataclass(frozen=True, eq=False)
class Reduction:
    """What a record says of its stroke. The stroke is positive here; ``polarity`` is the sign that it had.

    Attributes:
        peak: highest current, of a local fit (A).
        front_time: T1 by the 10 % and 90 % points (s).
        half_value_time: T2 from the virtual origin to 50 % on the tail (s).
        charge: ∫ i dt to the end of the record (C); a reversal counts against it. Without the tail.
        specific_energy: ∫ i² dt to the end of the record (J/ohm), noise bias removed. Without the tail.
        duration: from 10 % on the rise to 10 % on the fall (s), which is the definition for long strokes.
        reversal: highest current of the other sign after the peak, over the peak (1).
        polarity: +1 or -1.
        offset: what was taken off, from where, and the noise there.
        noise_bias: what was taken off ∫ i² dt (J/ohm).
        sensor_time_constant: by which the droop was repaired (s), or None.
        tail: what the end of the record cuts off, never added; None where the current has ended.
        origin: the virtual origin, on the time axis of the record (s); None where there is no front.
        curves: current, charge and W/R over time, at selected samples.
        checks: what was looked at, each ``ok`` or ``flag``.
        record: name of the record.
    """

    peak: Measured
    front_time: Measured
    half_value_time: Measured
    charge: Measured
    specific_energy: Measured
    duration: Measured
    reversal: Measured
    polarity: int
    offset: Baseline
    noise_bias: float
    sensor_time_constant: float | None
    tail: Tail | None
    origin: float | None
    curves: Curves
    checks: tuple[Check, ...]
    record: str = ""

    @property
    def flags(self) -> tuple[Check, ...]:
        """The checks that did not pass."""
        return tuple(check for check in self.checks if check.outcome == "flag")

    def until(self, time: float) -> tuple[float, float]:
        """Return charge (C) and W/R (J/ohm) up to a time after the virtual origin (s)."""
        at = time + (self.origin if self.origin is not None else float(self.curves.t[0]))
        q, w = (np.interp(at, self.curves.t, c) for c in (self.curves.charge, self.curves.specific_energy))
        return float(q), float(w)

    def stroke(self) -> Stroke:
        """Return it as a stroke with what lies in the record; the tail is not in it."""
        return Stroke(
            peak=self.peak.value,
            charge=None if self.charge.value is None else max(self.charge.value, 0.0),
            specific_energy=self.specific_energy.value,
            polarity=self.polarity,
            name=self.record,
        )

    def to_dict(self) -> dict[str, Any]:
        """Return it for JSON, in SI. What the record does not give is null. The curves are left out."""
        measured = {name: getattr(self, name) for name in (*_NAMES, "duration", "reversal")}
        out: dict[str, Any] = {name: value.to_dict() for name, value in measured.items()}
        out["uncertainty_parts"] = {name: dict(value.parts) for name, value in measured.items()}
        out["checks"] = [check._asdict() for check in self.checks]
        out["polarity"] = self.polarity
        base = self.offset
        out["offset"] = {
            "value": base.offset,
            "unit": "A",
            "uncertainty": base.error,
            "samples": base.samples,
        }
        out["offset"]["window"] = list(base.window) if base.window else None
        out["noise"] = {"value": base.noise, "unit": "A"}
        out["noise_bias"] = {"value": self.noise_bias, "unit": "J/ohm"}
        out["sensor_time_constant"] = {"value": self.sensor_time_constant, "unit": "s"}
        out["origin"] = {"value": self.origin, "unit": "s"}
        tail = self.tail
        out["tail"] = tail and {
            "current": {"value": tail.current, "unit": "A"},
            "time_constant": {"value": tail.time_constant, "unit": "s"},
            "charge": {"value": tail.charge, "unit": "C", "uncertainty": tail.charge_uncertainty},
            "specific_energy": {
                "value": tail.specific_energy,
                "unit": "J/ohm",
                "uncertainty": tail.specific_energy_uncertainty,
            },
        }
        out["record"] = self.record
        return out


def reduce(
    record: Record,
    *,
    sensor_time_constant: Any = None,
    polarity: int | None = None,
    baseline: tuple[Any, Any] | None = None,
    smooth: Any = None,
) -> Reduction:
    """Reduce a record to the parameters of its stroke.

    Args:
        record: as read, offset and all.
        sensor_time_constant: high-pass time constant of an AC-coupled sensor (s, or a text such as ``"10 ms"``); the
            droop is then repaired.
        polarity: +1 or -1 where the sign of the largest excursion is not that of the stroke.
        baseline: first and last time without current (s, or texts), on the time axis of the record. By default what
            lies one front time before the first sign of the stroke.
        smooth: width (s, or a text) of the local fits that find the 10, 90 and 50 % points in a noisy record. By
            default 16 % of T1 and 10 % of T2; 0 for straight lines between samples. Charge and W/R are never smoothed.

    Raises:
        InputError: nothing but noise, or an argument that cannot be.
    """
    droop = _seconds(sensor_time_constant, "sensor_time_constant", "10 ms")
    width = _seconds(smooth, "smooth", "0.5 us", zero=True)
    if polarity not in (None, 1, -1):
        raise InputError([Problem(f"polarity: {polarity!r} is no polarity", "write 1 or -1")])
    window = None
    if baseline is not None:
        window = cast(
            "tuple[float, float]", tuple(_seconds(x, "baseline", "-10 us", signed=True) for x in baseline)
        )
    level, begin, found = find_baseline(record, window)
    sign = polarity or found
    signal = Signal(record.t, record.i, level.offset, sign, droop)
    top = signal.argmax()
    # The steps of the recorder act as noise of their own where the samples have none.
    noise = float(np.hypot(level.noise or noise_of_differences(record), resolution(record, top) / 12**0.5))
    # The highest of n samples of mere noise is about sigma*sqrt(2 ln n).
    if not float(signal.part(top, top + 1)[0]) > noise * (1.5 + (2 * np.log(len(record))) ** 0.5):
        what = f"there is no current of {'this' if polarity else 'either'} polarity above the noise"
        raise InputError([Problem(what, "check channel, scale and polarity", place=record.name)])
    peak = find_peak(signal, top, noise)
    front = _front(signal, top, peak, level, noise, width)
    half_value, fall = _half_value(signal, top, peak, front, noise, width)
    origin = front.origin
    t1 = front.time.value or 0.0
    points = curve_points(
        record.t,
        float(record.t[0]) if origin is None else origin,
        t1 or float(record.t[1] - record.t[0]),
        half_value.value or float(record.t[-1] - record.t[0]) / 4,
    )
    sums = integrate(signal, begin, top, level.noise, points)
    tail = fit_tail(signal, top, noise, level.error)
    bias = level.noise**2 * sums.span
    charge, energy = _integrals(sums, level, bias, droop, tail)
    reversal = -sums.lowest / peak.value if sums.lowest < -6 * noise else 0.0
    checks = check_record(
        record,
        signal,
        top,
        level,
        peak.value,
        front.samples,
        t1,
        fall is not None,
        sums.charge,
        energy.value or 0.0,
        tail,
        reversal,
    )
    return Reduction(
        peak=_measured(peak.value, "A", {"noise": peak.noise, "fit": peak.fit, "offset": level.error}),
        front_time=front.time,
        half_value_time=half_value,
        charge=charge,
        specific_energy=energy,
        duration=_duration(signal, top, peak, front.t10, noise),
        reversal=_measured(reversal, "1", {"noise": noise / peak.value}),
        polarity=sign,
        offset=level,
        noise_bias=bias,
        sensor_time_constant=droop,
        tail=tail,
        origin=origin,
        curves=sums.curves,
        checks=checks,
        record=record.name,
    )


def corrected(record: Record, reduction: Reduction) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Return times (s) and the whole current (A) as it was reduced: offset off, droop repaired, the stroke positive."""
    signal = Signal(
        record.t, record.i, reduction.offset.offset, reduction.polarity, reduction.sensor_time_constant
    )
    return record.t, signal.part(0, signal.size)


def _seconds(
    value: Any, name: str, example: str, *, zero: bool = False, signed: bool = False
) -> float | None:
    if value is None:
        return None
    try:
        number = (
            float(value)
            if isinstance(value, (int, float))
            else float(cast(float, read(value, "s", example=example)))
        )
    except InputError as error:
        raise InputError([Problem(f"{name}: {p.what}", p.write) for p in error.problems]) from None
    if not np.isfinite(number) or (not signed and (number < 0 or (number == 0 and not zero))):
        raise InputError(
            [Problem(f"{name}: {value!r} is no time that can be meant", f"write a time such as {example!r}")]
        )
    return number


def _measured(value: float | None, unit: str, parts: dict[str, float]) -> Measured:
    if value is None:
        return Measured(None, unit, None, {})
    total = float(np.sqrt(sum(part * part for part in parts.values())))
    return Measured(float(value), unit, total, {name: float(part) for name, part in parts.items()})


class _Front(NamedTuple):
    time: Measured
    origin: float | None
    t10: Crossing | None
    samples: int
    """Samples between the 10 % and the 90 % point."""
    origin_error: float


def _front(
    signal: Signal, top: int, peak: Peak, level: Baseline, noise: float, width: float | None
) -> _Front:
    """Find T1 and the virtual origin, first with straight lines and then with local fits of a width that T1 suggests."""
    reach, t10, t90, t1, step = 0.0, None, None, 0.0, 0.0
    for _ in range(2):
        t10 = crossing_up(signal, top, 0.1 * peak.value, reach, noise)
        t90 = t10 and crossing_up(signal, top, 0.9 * peak.value, reach, noise, t10.before)
        if t10 is None or t90 is None or t90.time <= t10.time:
            return _Front(_measured(None, "s", {}), None, None, 0, 0.0)
        t1 = 1.25 * (t90.time - t10.time)
        step = float(signal.t[t90.before + 1] - signal.t[t10.before]) / (t90.before + 1 - t10.before)
        reach = 0.08 * t1 if width is None else width / 2
        if width is None and noise > 0.003 * peak.value:
            # Enough samples, and enough rise among them, to tell the crossing from the noise.
            reach = min(max(reach, 5 * step, 10 * noise / peak.value * t1), 0.2 * t1)
    assert t10 is not None
    assert t90 is not None
    sampling = 1.2 * t1 * min(step / t1, 1.0) ** 2
    top_error = float(np.hypot(peak.noise, peak.fit))
    parts = {
        "noise": 1.25 * float(np.hypot(t10.noise, t90.noise)),
        "fit": 1.25 * top_error * abs(0.9 / t90.slope - 0.1 / t10.slope),
        "offset": 1.25 * level.error * abs(0.9 / t10.slope - 0.1 / t90.slope),
        "sampling": sampling,
    }
    error = float(np.sqrt((1.125 * t10.noise) ** 2 + (0.125 * t90.noise) ** 2 + sampling**2))
    return _Front(_measured(t1, "s", parts), t10.time - 0.1 * t1, t10, t90.before - t10.before, error)


def _half_value(
    signal: Signal, top: int, peak: Peak, front: _Front, noise: float, width: float | None
) -> tuple[Measured, Crossing | None]:
    fall = crossing_down(signal, top, 0.5 * peak.value, 0.0, noise)
    if fall is None or front.origin is None:
        return _measured(None, "s", {}), fall
    reach = 0.05 * (fall.time - front.origin) if width is None else width / 2
    fall = crossing_down(signal, top, 0.5 * peak.value, reach, noise) or fall
    parts = {
        "noise": fall.noise,
        "fit": 0.5 * float(np.hypot(peak.noise, peak.fit)) / abs(fall.slope),
        "sampling": front.origin_error,
    }
    return _measured(fall.time - front.origin, "s", parts), fall


def _duration(signal: Signal, top: int, peak: Peak, t10: Crossing | None, noise: float) -> Measured:
    end = crossing_down(signal, top, 0.1 * peak.value, 0.0, noise)
    if t10 is None or end is None:
        return _measured(None, "s", {})
    end = crossing_down(signal, top, 0.1 * peak.value, 0.05 * (end.time - t10.time), noise) or end
    return _measured(end.time - t10.time, "s", {"noise": float(np.hypot(t10.noise, end.noise))})


def _integrals(
    sums: Integrals, level: Baseline, bias: float, droop: float | None, tail: Tail | None
) -> tuple[Measured, Measured]:
    # An error of the offset grows with time where the droop is repaired: d becomes d·(1 + t/t_d).
    growth = 1 + sums.span / (2 * droop) if droop else 1.0
    late = 1 + sums.span / droop if droop else 1.0
    variance = level.noise**2
    # What the record cuts off counts as a correction that was not made: even odds between nothing and twice the tail.
    cut = (tail.charge or 0.0, tail.specific_energy or 0.0) if tail else (0.0, 0.0)
    energy = sums.square - bias
    charge_parts = {
        "offset": level.error * sums.span * growth,
        "noise": float(np.sqrt(variance * sums.step_squares)),
        "sampling": sums.charge_step,
        "tail": cut[0] / 3**0.5,
    }
    random = 4 * variance * sums.weighted_squares + 2 * variance**2 * sums.step_squares
    energy_parts = {
        "offset": 2 * level.error * abs(sums.charge) * late + (level.error * late) ** 2 * sums.span,
        "noise": float(np.sqrt(random + (bias * (2 / max(level.samples, 2)) ** 0.5) ** 2)),
        "sampling": sums.square_step,
        "tail": cut[1] / 3**0.5,
    }
    return _measured(sums.charge, "C", charge_parts), _measured(max(energy, 0.0), "J/ohm", energy_parts)
