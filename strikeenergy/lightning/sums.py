"""Waveforms and their sums: currents added, subtracted, scaled and delayed, with the energy of what overlaps.

The operators of a waveform make sums, and a sum is a waveform again.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable
from dataclasses import dataclass
from functools import cached_property
from typing import Any, Self, cast

import numpy as np
from numpy.typing import NDArray

from strikeenergy.errors import InputError
from strikeenergy.lightning.figures import Figures
from strikeenergy.lightning.parameters import Given, plain, read_parameter
from strikeenergy.physics import pulses
from strikeenergy.units import Quantity

__all__ = ["Sum", "Waveform"]


@dataclass(frozen=True, init=False, eq=False, repr=False)
class Waveform(Figures):
    """A current that can be added to others, subtracted, scaled and delayed."""

    def delayed(self, by: Given) -> Sum:
        """Return the same current, later by a time (s, or text such as "30 ms")."""
        return Sum([self], [by])

    def __add__(self, other: Waveform) -> Sum:
        return Sum([self, other]) if isinstance(other, Waveform) else NotImplemented

    def __sub__(self, other: Waveform) -> Sum:
        return Sum([self, other], factors=[1.0, -1.0]) if isinstance(other, Waveform) else NotImplemented

    def __radd__(self, other: object) -> Waveform:
        return self if isinstance(other, int) and other == 0 else NotImplemented  # so that sum([...]) works

    def __mul__(self, factor: Given) -> Sum:
        return Sum([self], factors=[factor])

    __rmul__ = __mul__

    def __neg__(self) -> Sum:
        return self * -1.0

    def _overlap(self, other: Waveform, delay: Quantity) -> Any:
        """∫ other(t)·self(t − delay) dt in closed form; None if there is none."""
        return None


@dataclass(frozen=True, init=False, eq=False, repr=False)
class Sum(Waveform):
    """Currents that flow together: each with a factor and a start of its own (s)."""

    parts: tuple[Waveform, ...]
    offsets: tuple[Quantity, ...]
    factors: tuple[Quantity, ...]

    def __init__(
        self, parts: Iterable[Waveform], offsets: Iterable[Given] = (), factors: Iterable[Given] = ()
    ) -> None:
        parts = list(parts)
        shifts = [read_parameter(value, "s", signed=True) for value in offsets] or [0.0] * len(parts)
        scales = [read_parameter(value, "1", signed=True) for value in factors] or [1.0] * len(parts)
        if not parts or not len(parts) == len(shifts) == len(scales):
            raise InputError(
                f"{len(parts)} parts, {len(shifts)} offsets and {len(scales)} factors do not make a sum"
            )
        flat = []
        for part, shift, scale in zip(parts, shifts, scales, strict=True):
            if isinstance(part, Sum):
                inner = zip(part.parts, part.offsets, part.factors, strict=True)
                flat += [(p, shift + o, scale * f) for p, o, f in inner]
            else:
                flat.append((part, shift, scale))
        self._set(
            parts=tuple(f[0] for f in flat),
            offsets=tuple(f[1] for f in flat),
            factors=tuple(f[2] for f in flat),
        )
        try:
            _ = self.shape
        except ValueError:
            raise InputError("the arrays of parameters of the parts do not broadcast") from None

    @property
    def _terms(self) -> list[tuple[Waveform, Quantity, Quantity]]:
        return list(zip(self.parts, self.offsets, self.factors, strict=True))

    @property
    def shape(self) -> tuple[int, ...]:
        """Shape of the array of waveforms."""
        return np.broadcast_shapes(
            *(np.broadcast_shapes(p.shape, np.shape(o), np.shape(f)) for p, o, f in self._terms)
        )

    def _select(self, pick: Callable[[Any], Any], shape: tuple[int, ...]) -> Self:
        new = object.__new__(type(self))
        values = [
            [plain(pick(np.broadcast_to(v, shape))) for v in row] for row in (self.offsets, self.factors)
        ]
        parts = tuple(part._select(pick, shape) for part in self.parts)
        new._set(parts=parts, offsets=tuple(values[0]), factors=tuple(values[1]))
        return new

    def __repr__(self) -> str:
        return "Sum(" + " + ".join(f"{f!r}*{p!r} from {o!r} s" for p, o, f in self._terms) + ")"

    def __eq__(self, other: object) -> bool:
        if not isinstance(other, Sum) or len(self.parts) != len(other.parts):
            return False
        pairs = zip(self._terms, other._terms, strict=True)
        return all(
            a[0] == b[0] and np.array_equal(a[1], b[1]) and np.array_equal(a[2], b[2]) for a, b in pairs
        )

    __hash__ = Waveform.__hash__

    def _total(self, f: Callable[[Waveform, Quantity], Any]) -> Any:
        """Add up the parts; f(part, offset)."""
        return np.broadcast_to(sum(c * f(part, offset) for part, offset, c in self._terms), self.shape)[()]

    def current(self, t: Quantity) -> Quantity:
        """Current at the time t (A)."""
        return cast(Quantity, sum(f * part.current(t - o) for part, o, f in self._terms))

    def slope(self, t: Quantity) -> Quantity:
        """Derivative of the current at the time t (A/s)."""
        return cast(Quantity, sum(f * part.slope(t - o) for part, o, f in self._terms))

    @property
    def charge(self) -> Quantity:
        """∫ i dt (C)."""
        return cast(Quantity, self._total(lambda part, _: part.charge))

    def charge_until(self, t: Quantity) -> Quantity:
        """Charge up to the time t (C)."""
        return cast(Quantity, sum(f * part.charge_until(t - o) for part, o, f in self._terms))

    @cached_property
    def specific_energy(self) -> Quantity:
        """∫ i² dt = W/R (J/ohm): the parts, and twice the integral of each product where parts overlap."""
        terms, total = self._terms, np.zeros(self.shape)
        for j, (part, offset, factor) in enumerate(terms):
            total = total + factor**2 * part.specific_energy
            for other, start, scale in terms[:j]:
                total = total + 2 * factor * scale * _cross_energy(other, part, offset - start)
        return total[()]

    def absolute_charge_until(self, t: Quantity) -> Quantity:
        """∫ |i| dt up to the time t (C)."""
        signs = np.sign(np.stack(np.broadcast_arrays(*self.factors)))
        if all(part.NEVER_NEGATIVE for part in self.parts) and (signs == signs[0]).all():
            return np.abs(self.charge_until(t))
        return super().absolute_charge_until(t)

    def _knots(self) -> NDArray[np.float64]:
        knots = [_spread(part._knots(), self.shape) + o for part, o, _ in self._terms]
        return np.sort(np.concatenate(knots), axis=0)

    # Of one part alone, only shifted or scaled, everything is known exactly.

    def _crest_time(self) -> Any:
        if len(self.parts) > 1:
            return super()._crest_time()
        return np.broadcast_to(self.parts[0].peak_time + self.offsets[0], self.shape)[()]

    def _cross(self, level: float, side: int) -> Any:
        if len(self.parts) > 1:
            return super()._cross(level, side)
        part = self.parts[0]
        time = part._rise(level) if side < 0 else part._fall(level)
        return np.broadcast_to(time + self.offsets[0], self.shape)[()]

    def _steepest(self) -> Any:
        first = np.broadcast_to(self.parts[0].steepest_time + self.offsets[0], self.shape)[()]
        if len(self.parts) == 1:
            return first
        # Beside a step, the slope of the other parts is what one wants to know; of steps alone, that it is infinite.
        steps = np.all(
            [np.isinf(np.broadcast_to(part.max_steepness, self.shape)) for part in self.parts], axis=0
        )
        return first if steps.all() else np.where(steps, first, super()._steepest())[()]


def _spread(knots: NDArray[np.float64], shape: tuple[int, ...]) -> NDArray[np.float64]:
    """Broadcast all but the first axis."""
    own = knots.shape[1:]
    return np.broadcast_to(
        knots.reshape(len(knots), *(1,) * (len(shape) - len(own)), *own), (len(knots), *shape)
    )


def _cross_energy(a: Waveform, b: Waveform, delay: Quantity) -> Any:
    """∫ a(t)·b(t − delay) dt: in closed form where one of the two has one, else by Gauss points to 1e-11."""
    exact = b._overlap(a, delay)
    if exact is None:
        exact = a._overlap(b, -np.asarray(delay))
    if exact is not None:
        return exact
    shape = np.broadcast_shapes(a.shape, b.shape, np.shape(delay))
    knots = np.concatenate([_spread(a._knots(), shape), _spread(b._knots(), shape) + delay])
    return pulses.integrate(lambda t: a.current(t) * b.current(t - delay), np.sort(knots, axis=0))
