"""A current given by samples."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass
from functools import cached_property
from typing import Any, ClassVar, Self, cast

import numpy as np
from numpy.typing import NDArray

from strikeenergy.errors import InputError, Problem, QuantityError
from strikeenergy.lightning.parameters import Given, read_parameter
from strikeenergy.lightning.sums import Waveform
from strikeenergy.physics import pulses
from strikeenergy.units import Quantity

__all__ = ["Sampled"]


@dataclass(frozen=True, init=False, eq=False, repr=False)
class Sampled(Waveform):
    """Samples joined by straight lines, zero outside; one record, of either polarity. Integrals are exact."""

    UNITS: ClassVar[Mapping[str, str]] = {"t": "s", "i": "A"}

    t: NDArray[np.float64]
    i: NDArray[np.float64]

    def __init__(self, t: Given, i: Given) -> None:
        problems = []
        for name, value in (("t", t), ("i", i)):
            try:
                array = np.asarray(read_parameter(value, self.UNITS[name], signed=True))
                self._set(**{name: array})
                if array.ndim != 1 or array.size < 2:
                    problems.append(
                        Problem(f"shape {array.shape}", "give one row of at least two samples", (name,))
                    )
            except QuantityError as error:
                problems.append(Problem(error.what, error.write, (name,)))
        if not problems and self.t.shape != self.i.shape:
            problems.append(
                Problem(f"{self.t.size} times but {self.i.size} currents", "give one current for each time")
            )
        if not problems and not (np.diff(self.t) > 0).all():
            first = int((np.diff(self.t) <= 0).argmax()) + 1
            problems.append(
                Problem(
                    f"the times do not rise at sample {first}", "sort them and join repeated ones", ("t",)
                )
            )
        if problems:
            raise InputError(problems)

    @property
    def shape(self) -> tuple[int, ...]:
        """Always ``()``: one record."""
        return ()

    def _select(self, pick: Callable[[Any], Any], shape: tuple[int, ...]) -> Self:
        pick(np.broadcast_to(0.0, shape))  # refuses an index that does not fit
        return self

    def __repr__(self) -> str:
        return f"Sampled({self.t.size} samples from {self.t[0]!r} s to {self.t[-1]!r} s)"

    def current(self, t: Quantity) -> Quantity:
        """Current at the time t (A)."""
        return np.interp(t, self.t, self.i, left=0.0, right=0.0)

    def _cell(self, t: Quantity) -> Any:
        return np.clip(np.searchsorted(self.t, t, side="right") - 1, 0, self.t.size - 2)

    def slope(self, t: Quantity) -> Quantity:
        """Derivative of the current at the time t (A/s)."""
        cell = self._cell(t)
        slope = (self.i[cell + 1] - self.i[cell]) / (self.t[cell + 1] - self.t[cell])
        return np.where((np.asarray(t) < self.t[0]) | (np.asarray(t) > self.t[-1]), 0.0, slope)[()]

    def _knots(self) -> NDArray[np.float64]:
        return self.t

    _grid = _knots

    def _crest_time(self) -> Any:
        return self.t[np.abs(self.i).argmax()]

    def _steepest(self) -> Any:
        return self.t[(np.sign(self.peak) * np.diff(self.i) / np.diff(self.t)).argmax()]

    @cached_property
    def _cumulative(self) -> NDArray[np.float64]:
        return np.concatenate([[0.0], np.cumsum(pulses.sampled_charge(self.t, self.i))])

    def charge_until(self, t: Quantity) -> Quantity:
        """Charge up to the time t (C)."""
        late = np.clip(t, self.t[0], self.t[-1])
        cell = self._cell(late)
        partial: Quantity = (late - self.t[cell]) * (self.i[cell] + self.current(late)) / 2
        return partial + cast(Quantity, self._cumulative[cell])

    @cached_property
    def specific_energy(self) -> Quantity:
        """∫ i² dt = W/R (J/ohm)."""
        return float(pulses.sampled_specific_energy(self.t, self.i).sum())

    @cached_property
    def absolute_charge(self) -> Quantity:
        """∫ |i| dt (C)."""
        return float(pulses.sampled_absolute_charge(self.t, self.i).sum())
