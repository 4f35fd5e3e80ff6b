"""The figures of a current: peak, charge, specific energy, front time, half-value time, steepness.

A current says what it is at a time, how it slopes, and between which times it is smooth; everything else follows from
these by quadrature and search. Shapes that know a figure in closed form override it.
"""

from __future__ import annotations

import math
from abc import ABC, abstractmethod
from collections.abc import Callable
from dataclasses import dataclass
from functools import cached_property
from typing import Any, ClassVar, Self, cast

import numpy as np
from numpy.typing import NDArray

from strikeenergy.errors import UnknownName
from strikeenergy.lightning.parameters import Parametric
from strikeenergy.physics import pulses
from strikeenergy.units import Quantity

__all__ = ["DEFINITIONS", "Figures", "lower_point"]

DEFINITIONS = {"10/90": 0.1, "30/90": 0.3}
"""Ways to define front time and virtual origin by two points of the front, and the lower of the two.

"10/90" for currents (IEC 62305-1, IEC 60060-1): T1 = 1.25·(t90 − t10); "30/90" for voltages: T1 = (t90 − t30)/0.6. The
virtual origin is where the straight line through the two points cuts the axis; T2 runs from there to half the peak.
"""

_PIECE = 1000  # elements of an array of waveforms that are searched on a grid at once


def lower_point(definition: str) -> float:
    """Lower of the two points of a definition of the front time, as a share of the peak."""
    if definition not in DEFINITIONS:
        raise UnknownName("definition of the front time", str(definition), DEFINITIONS)
    return DEFINITIONS[definition]


@dataclass(frozen=True, init=False, eq=False, repr=False)
class Figures(Parametric, ABC):
    """What every current offers. Figures by closed form where there is one; else from a grid that resolves the shape."""

    NEVER_NEGATIVE: ClassVar[bool] = False
    """Whether no current of this kind can be below zero."""

    # -- what a shape must say about itself

    @abstractmethod
    def current(self, t: Quantity) -> Quantity:
        """Current at the time t (A)."""

    @abstractmethod
    def slope(self, t: Quantity) -> Quantity:
        """Derivative of the current at the time t (A/s)."""

    @abstractmethod
    def _knots(self) -> NDArray[np.float64]:
        """Times, along the first axis, between which the current is smooth and easily integrated."""

    def _grid(self) -> NDArray[np.float64]:
        knots = self._knots()
        inside = np.arange(8).reshape(-1, *(1,) * np.ndim(knots)) / 8
        fine = np.swapaxes(knots[:-1] + inside * np.diff(knots, axis=0), 0, 1)
        return np.concatenate([fine.reshape(-1, *knots.shape[1:]), knots[-1:]])

    # -- what follows

    @property
    def support(self) -> tuple[Quantity, Quantity]:
        """Start and end (s) of the current. Endless tails end where less than 1e-16 of the peak is left."""
        knots = self._knots()
        return knots[0][()], knots[-1][()]

    @property
    def duration(self) -> Quantity:
        """Time from start to end of ``support`` (s)."""
        start, end = self.support
        return end - start

    @cached_property
    def charge(self) -> Quantity:
        """∫ i dt (C)."""
        return self.charge_until(self.support[1])

    def _clipped(self, t: Quantity) -> NDArray[np.float64]:
        knots = self._knots()
        extra = max(np.ndim(t) - (knots.ndim - 1), 0)
        return np.minimum(knots.reshape(knots.shape[0], *(1,) * extra, *knots.shape[1:]), t)

    def charge_until(self, t: Quantity) -> Quantity:
        """Charge up to the time t (C)."""
        return pulses.integrate(self.current, self._clipped(t))

    @cached_property
    def specific_energy(self) -> Quantity:
        """∫ i² dt = W/R (J/ohm)."""
        return self.specific_energy_until(self.support[1])

    def specific_energy_until(self, t: Quantity) -> Quantity:
        """Specific energy up to the time t (J/ohm)."""
        return pulses.integrate(lambda s: self.current(s) ** 2, self._clipped(t))

    def absolute_charge_until(self, t: Quantity) -> Quantity:
        """∫ |i| dt up to the time t (C)."""
        grid = np.minimum(self._grid(), t)
        low, high = grid[:-1], grid[1:]
        change = np.sign(self.current(low)) * np.sign(self.current(high)) < 0
        middle = np.where(change, pulses.find_root(self.current, low, np.where(change, high, low)), low)
        charge = [self.charge_until(s) for s in (low, middle, high)]
        total: Quantity = (np.abs(charge[1] - charge[0]) + np.abs(charge[2] - charge[1])).sum(axis=0)[()]
        return total

    @property
    def absolute_charge(self) -> Quantity:
        """∫ |i| dt (C). For a current that reverses, the bounds on W/R hold with it and not with the charge."""
        return self.absolute_charge_until(self.support[1])

    def mean_absolute(self, until: Quantity | None = None) -> Quantity:
        """Mean of |i| (A) from the start to the time ``until``, by default to the end of ``support``."""
        start, end = self.support
        until = end if until is None else until
        return self.absolute_charge_until(until) / (until - start)

    def _by_pieces(self, f: Callable[[Self], Any]) -> Any:
        size, shape = math.prod(self.shape), self.shape
        if size <= _PIECE:
            return f(self)

        def piece(start: int) -> Any:
            return f(self._select(lambda values: values.ravel()[start : start + _PIECE], shape))

        parts = [piece(start) for start in range(0, size, _PIECE)]
        return np.concatenate(parts).reshape(shape)

    def _largest(self, f: Callable[[Any], Any]) -> Any:
        """Time at which f is largest: the best point of the grid, refined between its neighbours."""
        grid = self._grid()
        best = f(grid).argmax(axis=0)[None]
        low, at, high = (
            np.take_along_axis(grid, np.clip(best + step, 0, len(grid) - 1), axis=0)[0] for step in (-1, 0, 1)
        )
        refined = pulses.maximise(f, low, high)
        return np.where(f(refined) > f(at), refined, at)[()]

    def _crest_time(self) -> Any:
        return self._largest(lambda t: np.abs(self.current(t)))

    @cached_property
    def peak_time(self) -> Quantity:
        """Time of the peak (s)."""
        return cast(Quantity, self._by_pieces(lambda w: w._crest_time()))

    @property
    def peak(self) -> Quantity:
        """Current of the largest magnitude, with its sign (A)."""
        return self.current(self.peak_time)

    def _cross(self, level: float, side: int) -> Any:
        """Time of the last rise above ``level`` of the peak before it (side −1) or the first fall below it after (+1)."""
        grid, crest, peak = self._grid(), np.asarray(self.peak_time), np.asarray(self.peak)

        def above(t: Any) -> Any:
            return self.current(t) * np.sign(peak) - level * np.abs(peak)

        below = (above(grid) < 0) & (side * (grid - crest) > 0)
        index = len(grid) - 1 - below[::-1].argmax(axis=0) if side < 0 else below.argmax(axis=0)
        found = np.take_along_axis(below, index[None], axis=0)[0]
        outer = np.take_along_axis(grid, index[None], axis=0)[0]
        inner = np.take_along_axis(grid, np.clip(index - side, 0, len(grid) - 1)[None], axis=0)[0]
        inner = np.maximum(inner, crest) if side > 0 else np.minimum(inner, crest)
        edge = grid[0] if side < 0 else grid[-1]
        return np.where(found, pulses.find_root(above, np.where(found, outer, inner), inner), edge)[()]

    def _rise(self, level: float) -> Quantity:
        return cast(Quantity, self._by_pieces(lambda w: w._cross(level, -1)))

    def _fall(self, level: float) -> Quantity:
        return cast(Quantity, self._by_pieces(lambda w: w._cross(level, 1)))

    def front_time(self, definition: str = "10/90") -> Quantity:
        """Front time T1 (s), by one of DEFINITIONS."""
        low = lower_point(definition)
        return (self._rise(0.9) - self._rise(low)) / (0.9 - low)

    def virtual_origin(self, definition: str = "10/90") -> Quantity:
        """Time (s) at which the straight line through the two points of the front cuts the axis."""
        low = lower_point(definition)
        early = self._rise(low)
        return early - low * (self._rise(0.9) - early) / (0.9 - low)

    def half_value_time(self, definition: str = "10/90") -> Quantity:
        """Time to half value T2 (s), from the virtual origin of one of DEFINITIONS; "50/50": the width at half peak."""
        return self._fall(0.5) - (
            self._rise(0.5) if definition == "50/50" else self.virtual_origin(definition)
        )

    def _steepest(self) -> Any:
        sign = np.sign(self.peak)

        def slope(t: Any) -> Any:
            value = sign * self.slope(t)
            return np.where(np.isfinite(value), value, -np.inf)

        return self._largest(slope)

    @cached_property
    def steepest_time(self) -> Quantity:
        """Time at which the current rises fastest towards the peak (s). Steps within a sum are left out."""
        return cast(Quantity, self._by_pieces(lambda w: w._steepest()))

    @property
    def max_steepness(self) -> Quantity:
        """Largest di/dt towards the peak (A/s); infinite for a shape that begins with a step."""
        return self.slope(self.steepest_time) * np.sign(self.peak)
