"""A pulse: a current that starts at 0, rises once, falls once and is never negative, by the kernels of its shape."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import Any, ClassVar, NamedTuple, cast

import numpy as np
from numpy.typing import NDArray

from strikeenergy.lightning.sums import Waveform
from strikeenergy.physics import pulses
from strikeenergy.units import Quantity

__all__ = ["TAIL", "Law", "Pulse", "panels"]

TAIL = 44.0
"""An exponential tail is followed for so many time constants, in 11 panels."""


class Law(NamedTuple):
    """The kernels of a shape: functions of the time (but for the specific energy) and of the constants of the shape."""

    current: Callable[..., Any]
    slope: Callable[..., Any]
    specific_energy: Callable[..., Any]
    charge_until: Callable[..., Any] | None = None
    """None: there is no closed form, integrate."""


@dataclass(frozen=True, init=False, eq=False, repr=False)
class Pulse(Waveform):
    """A shape that starts at 0, rises once and falls once; never negative."""

    NEVER_NEGATIVE = True
    LAW: ClassVar[Law]

    nominal: Quantity
    """The peak as it was given (A)."""

    @property
    def _constants(self) -> tuple[Any, ...]:
        return tuple(self.parameters.values())

    def _full(self, value: Any) -> Any:
        return np.broadcast_to(value, self.shape)[()]

    def current(self, t: Quantity) -> Quantity:
        """Current at the time t (A)."""
        return cast(Quantity, self.LAW.current(t, *self._constants))

    def slope(self, t: Quantity) -> Quantity:
        """Derivative of the current at the time t (A/s)."""
        return cast(Quantity, self.LAW.slope(t, *self._constants))

    def charge_until(self, t: Quantity) -> Quantity:
        """Charge up to the time t (C)."""
        law = self.LAW.charge_until
        return super().charge_until(t) if law is None else cast(Quantity, law(t, *self._constants))

    @property
    def charge(self) -> Quantity:
        """∫ i dt (C)."""
        return self.charge_until(np.inf)

    @property
    def specific_energy(self) -> Quantity:
        """∫ i² dt = W/R (J/ohm)."""
        return cast(Quantity, self.LAW.specific_energy(*self._constants))

    @property
    def peak(self) -> Quantity:
        """True peak (A)."""
        return cast(Quantity, self._full(self.nominal))

    @property
    def steepest_time(self) -> Quantity:
        """Time at which the current rises fastest (s)."""
        return np.zeros(self.shape)[()]

    def absolute_charge_until(self, t: Quantity) -> Quantity:
        """∫ |i| dt up to the time t (C): the charge, since the current does not reverse."""
        return self.charge_until(t)

    def _rise(self, level: float) -> Quantity:
        peak, crest = self.peak, self.peak_time
        return pulses.find_root(lambda t: self.current(t) - level * peak, np.zeros(self.shape), crest)

    def _fall(self, level: float) -> Quantity:
        peak, crest = self.peak, self.peak_time
        return pulses.find_root(lambda t: self.current(t) - level * peak, crest, self.support[1])


def panels(*pieces: tuple[Quantity, Quantity, int]) -> NDArray[np.float64]:
    """Join panel limits: (from, to, number of panels) each."""
    rows = [low + (high - low) * i / number for low, high, number in pieces for i in range(number + 1)]
    return np.sort(np.stack(np.broadcast_arrays(*rows)), axis=0)
