"""Strokes and flashes: peak, charge, specific energy, duration, polarity, as far as they are known.

A stroke carries what was *given*, and a waveform where one is known. Values given and values integrated from the waveform
stay apart: the given one counts, both are shown. What an effect needs and neither has is named (:class:`MissingInput`),
never guessed. Combinations that no current can have are refused. Every value may be an array: then the flash stands for many
flashes at once, and everything computed from it is an array as well.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable, Mapping
from dataclasses import dataclass, field, replace
from functools import cached_property
from typing import Any, cast

import numpy as np

from strikeenergy.errors import InputError, MissingInput, Problem
from strikeenergy.formatting import format_quantity
from strikeenergy.lightning.waveform import Sum, Waveform
from strikeenergy.sources import Source, Standing
from strikeenergy.units import Quantity, read

__all__ = ["LONG_STROKE", "Flash", "Stroke", "impossible"]

LONG_STROKE = 2e-3
"""A stroke that lasts longer than this (s) is a long stroke. IEC 62305-1:2010, definitions (from memory)."""

_TOLERANCE = 1e-9
_UNITS = {"peak": "A", "charge": "C", "specific_energy": "J/ohm", "duration": "s", "start": "s"}
_WORDS = {
    "peak": "peak current",
    "charge": "charge",
    "specific_energy": "specific energy W/R",
    "duration": "duration",
}


@dataclass(frozen=True)
class Stroke:
    """One stroke of a flash.

    Attributes (each a number in SI, an array, or None where it is not known; text with a unit and pint quantities
    are taken as well):
        peak: peak current (A).
        charge: ∫ |i| dt (C).
        specific_energy: W/R = ∫ i² dt (J/ohm).
        duration: (s). A stroke longer than 2 ms is a long stroke.
        polarity: +1 or -1, the sign of the charge brought to earth; None where it is not known.
        start: when it begins, counted from the first stroke (s). Strokes without a start follow one another; where two
            or more have a waveform and a start, what they overlap counts in W/R.
        waveform: the current over time, where it is known.
        shape: what the waveform is called in reports.
        name: what it is called in reports.
        standing: how firmly the values stand.
        source: where they come from.

    Raises:
        InputError: not finite, negative, or a combination that no current can have (W/R <= I·Q, Q² <= T·W/R, Q <= I·T).
    """

    peak: Quantity | None = None
    charge: Quantity | None = None
    specific_energy: Quantity | None = None
    duration: Quantity | None = None
    polarity: int | None = None
    start: Quantity | None = None
    name: str = ""
    standing: Standing = Standing.GIVEN
    source: Source | None = None
    waveform: Waveform | None = None
    shape: str = ""

    def __post_init__(self) -> None:
        problems: list[Problem] = []
        for name, unit in _UNITS.items():
            value = getattr(self, name)
            if value is None:
                continue
            try:
                number = read(value, unit) if isinstance(value, str) or hasattr(value, "units") else value
                array = np.asarray(number, dtype=float)
                if not np.isfinite(array).all() or (array < 0).any():
                    raise InputError([Problem("it must be finite and not negative")])
                object.__setattr__(self, name, array if array.ndim else float(array))
            except InputError as error:
                problems += [replace(p, path=(name,)) for p in error.problems]
        if self.polarity not in (None, 1, -1):
            problems.append(Problem(f"{self.polarity!r} is no polarity", "write 1 or -1", ("polarity",)))
        problems = problems or list(impossible(self))
        if problems:
            raise InputError(problems)

    @property
    def is_long(self) -> bool:
        """Whether it is a long stroke: by its duration, or because no current of this peak brings the charge sooner."""
        if self.duration is not None:
            return bool(np.all(np.asarray(self.duration) > LONG_STROKE))
        charge, peak = self.value("charge"), self.value("peak")
        if charge is not None and peak is not None:
            return bool(np.all(np.asarray(charge) > LONG_STROKE * np.asarray(peak)))
        return False

    @cached_property
    def integrated(self) -> Mapping[str, Quantity]:
        """What its waveform gives: ``peak``, ``charge`` and ``specific_energy``, in magnitude; empty without one."""
        if self.waveform is None:
            return {}
        found = {"peak": self.waveform.peak, "charge": self.waveform.charge}
        found["specific_energy"] = self.waveform.specific_energy
        return {name: _plain(np.abs(value)) for name, value in found.items()}

    def value(self, name: str) -> Quantity | None:
        """Return a value: the given one, else the one integrated from the waveform, else None."""
        given = getattr(self, name)
        return given if given is not None else self.integrated.get(name)

    def through(self, share: Quantity) -> Stroke:
        """Return the part of it that flows through an object with this share of the current."""

        def part(value: Quantity | None, factor: Quantity) -> Quantity | None:
            return None if value is None else value * factor

        return replace(
            self,
            peak=part(self.peak, share),
            charge=part(self.charge, share),
            specific_energy=part(self.specific_energy, share * share),
            waveform=None if self.waveform is None else self.waveform * share,
        )

    def to_dict(self) -> dict[str, Any]:
        """Return it for JSON, in SI; what is not known is null."""
        out: dict[str, Any] = {name: _number(getattr(self, name), unit) for name, unit in _UNITS.items()}
        out |= {"name": self.name, "polarity": self.polarity, "type": "long" if self.is_long else "impulse"}
        out["standing"] = str(self.standing)
        if self.waveform is not None:
            out["shape"] = self.shape or repr(self.waveform)
            out["integrated"] = {
                name: _number(value, _UNITS[name]) for name, value in self.integrated.items()
            }
        return out


def _plain(value: Any) -> Quantity:
    return cast(Quantity, value if np.ndim(value) else float(value))


def _number(value: Quantity | None, unit: str) -> dict[str, Any]:
    if value is None:
        return {"value": None, "unit": unit}
    return {"value": value.tolist() if isinstance(value, np.ndarray) else value, "unit": unit}


def impossible(stroke: Stroke) -> Iterable[Problem]:
    """Yield a problem for each bound that the values break. The bounds hold for every current of one sign.

    ``i <= I`` gives W/R <= I·Q and Q <= I·T; the Cauchy-Schwarz inequality gives Q² <= T·W/R.
    """
    i, q, w, t = stroke.peak, stroke.charge, stroke.specific_energy, stroke.duration
    if i is not None and q is not None and w is not None:
        yield from _bound("specific_energy", w, i * q, "W/R cannot exceed peak times charge", "J/ohm")
    if i is not None and q is not None and t is not None:
        yield from _bound("charge", q, i * t, "the charge cannot exceed peak times duration", "C")
    if q is not None and w is not None and t is not None:
        yield from _bound(
            "charge", q * q, w * t, "the charge squared cannot exceed W/R times duration", "C**2", root="C"
        )
    if i is not None and w is not None and t is not None:
        yield from _bound(
            "specific_energy", w, i * i * t, "W/R cannot exceed peak squared times duration", "J/ohm"
        )


def _bound(
    name: str, value: Quantity, most: Quantity, text: str, unit: str, root: str = ""
) -> Iterable[Problem]:
    over = np.asarray(value) > np.asarray(most) * (1 + _TOLERANCE)
    if not over.any():
        return
    many = f" (in {int(over.sum())} of {over.size})" if over.ndim else ""
    worst = np.broadcast_arrays(np.asarray(value), np.asarray(most))
    index = np.unravel_index(int(np.argmax(over)), over.shape)
    found, limit = float(worst[0][index]), float(worst[1][index])
    if root:
        found, limit, unit = found**0.5, limit**0.5, root
    shown = f"{format_quantity(found, unit)} against at most {format_quantity(limit, unit)}"
    yield Problem(
        f"no current can have this: {text}, {shown}{many}", "check the values and their units", (name,)
    )


@dataclass(frozen=True)
class Flash:
    """Strokes in time order, and the totals that a standard publishes for the whole flash.

    Attributes:
        strokes: in time order.
        name: what it is called in reports.
        totals: published totals (``peak``, ``charge``, ``specific_energy``) that stand in place of the sums.
        source: where strokes and totals come from.
        standing: how firmly they stand.
        remarks: what the reader of a result must know.
        share: fraction of the whole flash current that this is.
        whole: the whole flash, where this is a part of it.
    """

    strokes: tuple[Stroke, ...]
    name: str = ""
    totals: Mapping[str, Quantity] = field(default_factory=dict)
    source: Source | None = None
    standing: Standing = Standing.GIVEN
    remarks: tuple[str, ...] = ()
    share: Quantity = 1.0
    whole: Flash | None = None

    def __post_init__(self) -> None:
        if not self.strokes:
            raise InputError(
                [Problem("a flash has at least one stroke", "give [[flash.stroke]] or a threat")]
            )

    def through(self, share: Quantity) -> Flash:
        """Return the part of the flash that flows through an object. Currents scale with it, W/R with its square."""
        if np.ndim(share) == 0 and share == 1:
            return replace(self, whole=self.whole or self)
        scaled = {
            name: value * (share**2 if name == "specific_energy" else share)
            for name, value in self.totals.items()
        }
        return replace(
            self,
            strokes=tuple(stroke.through(share) for stroke in self.strokes),
            totals=scaled,
            share=self.share * share,
            whole=self.whole or self,
        )

    @property
    def is_array(self) -> bool:
        """Whether it stands for many flashes at once."""
        values = (getattr(stroke, name) for stroke in self.strokes for name in _UNITS)
        if any(np.ndim(value) > 0 for value in values if value is not None):
            return True
        return any(stroke.waveform is not None and stroke.waveform.shape for stroke in self.strokes)

    @cached_property
    def together(self) -> Sum | None:
        """The strokes that have a waveform and a start, as one current; None where they are fewer than two."""
        timed = [s for s in self.strokes if s.waveform is not None and s.start is not None]
        if len(timed) < 2:
            return None
        return Sum([_signed(s) for s in timed], [cast(Quantity, s.start) for s in timed])

    @property
    def overlap(self) -> Quantity:
        """What overlapping strokes add to the sum of their W/R (J/ohm): twice the integral of each product of currents.

        Negative where strokes of opposite polarity overlap.
        """
        if self.together is None:
            return 0.0
        alone = [
            s.waveform.specific_energy for s in self.strokes if s.waveform is not None and s.start is not None
        ]
        return _plain(self.together.specific_energy - _fold(np.add, alone))

    @property
    def peak(self) -> Quantity:
        """Highest peak current of the strokes (A). Long strokes without a peak are passed over.

        Raises:
            MissingInput: an impulse has no peak.
        """
        if "peak" in self.totals:
            return self.totals["peak"]
        values = [s.value("peak") for s in self.strokes]
        known = [value for value in values if value is not None]
        if not known or any(v is None and not s.is_long for v, s in zip(values, self.strokes, strict=True)):
            raise self._missing("peak")
        if self.together is not None:
            known.append(_plain(np.abs(self.together.peak)))
        return _fold(np.maximum, known)

    @property
    def charge(self) -> Quantity:
        """Charge of the whole flash (C).

        Raises:
            MissingInput: a stroke has no charge.
        """
        return self._sum("charge", self.strokes)

    @property
    def impulse_charge(self) -> Quantity:
        """Charge of the impulses (C), without the long strokes; zero where there are none."""
        impulses = tuple(s for s in self.strokes if not s.is_long)
        return self._add("charge", impulses) if impulses else 0.0

    @property
    def long_charge(self) -> Quantity:
        """Charge of the long strokes (C); zero where there are none."""
        long = tuple(s for s in self.strokes if s.is_long)
        return self._add("charge", long) if long else 0.0

    @property
    def specific_energy(self) -> Quantity:
        """Specific energy W/R of the whole flash (J/ohm): that of the strokes, and what they overlap.

        A long stroke with a charge and a duration but without W/R counts as a rectangle, Q²/T (the least it can be).

        Raises:
            MissingInput: an impulse has no specific energy.
        """
        total = self._sum("specific_energy", self.strokes)
        return total if "specific_energy" in self.totals else _plain(total + self.overlap)

    @property
    def polarity(self) -> int | None:
        """Polarity of the first stroke, where known."""
        return self.strokes[0].polarity

    def stroke_energies(self) -> list[Quantity]:
        """Return W/R of each stroke in turn (J/ohm).

        Raises:
            MissingInput: an impulse has no specific energy.
        """
        return [self._value("specific_energy", stroke) for stroke in self.strokes]

    def _sum(self, name: str, strokes: tuple[Stroke, ...]) -> Quantity:
        if name in self.totals:
            return self.totals[name]
        return self._add(name, strokes)

    def _add(self, name: str, strokes: tuple[Stroke, ...]) -> Quantity:
        return _fold(np.add, [self._value(name, stroke) for stroke in strokes])

    def _value(self, name: str, stroke: Stroke) -> Quantity:
        value = stroke.value(name)
        if value is not None:
            return value
        if (
            name == "specific_energy"
            and stroke.is_long
            and stroke.charge is not None
            and stroke.duration is not None
        ):
            return stroke.charge * stroke.charge / stroke.duration
        raise self._missing(name, stroke)

    def _missing(self, name: str, stroke: Stroke | None = None) -> MissingInput:
        if stroke is None:
            stroke = next((s for s in self.strokes if s.value(name) is None), self.strokes[0])
        lacking = [n for n, s in enumerate(self.strokes, 1) if s is stroke or _lacks(s, name)]
        if len(lacking) > 1:
            called = f"strokes {', '.join(map(str, lacking[:-1]))} and {lacking[-1]} have"
        else:
            called = f"stroke {lacking[0]}" + (f" ({stroke.name})" if stroke.name else "") + " has"
        example = {"peak": "100 kA", "charge": "50 C", "specific_energy": "2.5 MJ/ohm", "duration": "0.5 s"}[
            name
        ]
        most = _most_energy(stroke) if name == "specific_energy" else None
        if most is not None and most < 2.5e6:
            example = f"{most / 2:.3g} J/ohm"
        return MissingInput(f"{called} no {_WORDS[name]}", f"give it: {name} = {example!r}")

    def to_dict(self) -> dict[str, Any]:
        """Return it for JSON, in SI; what is not known is null."""
        out: dict[str, Any] = {}
        for name in ("peak", "charge", "specific_energy"):
            try:
                out[name] = _number(getattr(self, name), _UNITS[name])
            except MissingInput:
                out[name] = _number(None, _UNITS[name])
        out["name"] = self.name
        out["standing"] = str(self.standing)
        out["source"] = str(self.source) if self.source else None
        out["remarks"] = list(self.remarks)
        out["strokes"] = [stroke.to_dict() for stroke in self.strokes]
        return out

    def __repr__(self) -> str:
        parts = []
        for name in ("peak", "charge", "specific_energy"):
            try:
                value = getattr(self, name)
            except MissingInput:
                continue
            parts.append(
                f"{len(value)} values" if np.ndim(value) else format_quantity(float(value), _UNITS[name])
            )
        strokes = f"{len(self.strokes)} stroke{'s' if len(self.strokes) > 1 else ''}"
        return f"<Flash {self.name or 'given'}: {', '.join([*parts, strokes])}>"


def _fold(join: Callable[[Any, Any], Any], values: list[Quantity]) -> Quantity:
    total: Any = values[0]
    for value in values[1:]:
        total = join(total, value)
    return cast(Quantity, total if np.ndim(total) else float(total))


def _signed(stroke: Stroke) -> Waveform:
    """Return its waveform with the sign of its polarity, which a shape given in magnitudes does not carry."""
    wave = cast(Waveform, stroke.waveform)
    if stroke.polarity is None or np.all(np.sign(wave.peak) == stroke.polarity):
        return wave
    return wave * (np.sign(wave.peak) * stroke.polarity)


def _lacks(stroke: Stroke, name: str) -> bool:
    """Whether a value is neither given, nor integrated, nor (the W/R of a steady long stroke) to be computed."""
    steady = stroke.is_long and stroke.charge is not None and stroke.duration is not None
    return stroke.value(name) is None and not (name == "specific_energy" and steady)


def _most_energy(stroke: Stroke) -> float | None:
    """Return the bound I·Q of its W/R, with Q at most I·T where only the duration is known."""
    peak, charge, duration = stroke.value("peak"), stroke.value("charge"), stroke.duration
    if peak is None or np.ndim(peak) or (charge is None and duration is None):
        return None
    most: Any = charge if charge is not None else peak * cast(Quantity, duration)
    return None if np.ndim(most) else abs(float(peak * most))
