"""Shapes put together from pieces of time: straight and concave fronts with their tails, trapezoid, triangle, rectangle."""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass
from functools import cached_property
from typing import Any, ClassVar, cast

import numpy as np
from numpy.typing import NDArray

from strikeenergy.lightning.parameters import Given, Rule
from strikeenergy.lightning.pulse import TAIL, Law, Pulse, panels
from strikeenergy.lightning.sums import Waveform
from strikeenergy.physics import cigre, pulses
from strikeenergy.units import Quantity

__all__ = ["ConcaveFront", "LinearFront", "Rectangle", "Trapezoid", "Triangle"]


@dataclass(frozen=True, init=False, eq=False, repr=False)
class _StraightFront(Pulse):
    """A pulse that rises along a straight line; a step where ``front`` is 0."""

    front: Quantity
    """Duration of the front (s)."""

    @property
    def peak_time(self) -> Quantity:
        """Time at which the peak is reached (s)."""
        return cast(Quantity, self._full(self.front))

    def _rise(self, level: float) -> Quantity:
        return level * self.peak_time


@dataclass(frozen=True, init=False, eq=False, repr=False)
class LinearFront(_StraightFront):
    """Straight front of duration ``front`` (0: a step), exponential tail with the time constant ``tail``."""

    UNITS: ClassVar[Mapping[str, str]] = {"peak": "A", "front": "s", "tail": "s"}
    LAW = Law(
        pulses.linear_front_current,
        pulses.linear_front_slope,
        pulses.linear_front_specific_energy,
        pulses.linear_front_charge_until,
    )

    tail: Quantity

    def __init__(self, peak: Given, front: Given, tail: Given) -> None:
        self._accept({"peak": peak, "front": front, "tail": tail}, zero=["front"])

    def _fall(self, level: float) -> Quantity:
        return self.peak_time - self.tail * math.log(level)

    def _knots(self) -> NDArray[np.float64]:
        return panels((0.0, self.peak_time, 1), (self.front, self.front + TAIL * self.tail, 11))


@dataclass(frozen=True, init=False, eq=False, repr=False)
class Trapezoid(_StraightFront):
    """Straight front, flat top, straight fall that ends at ``duration``; front and fall may be 0 (steps)."""

    UNITS: ClassVar[Mapping[str, str]] = {"peak": "A", "front": "s", "duration": "s", "fall": "s"}
    LAW = Law(
        pulses.trapezoid_current,
        pulses.trapezoid_slope,
        pulses.trapezoid_specific_energy,
        pulses.trapezoid_charge_until,
    )

    length: Quantity
    fall: Quantity

    def __init__(self, peak: Given, front: Given, duration: Given, fall: Given) -> None:
        rule: Rule = (
            ("front", "fall", "duration"),
            lambda front, fall, duration: front + fall <= duration * (1 + 1e-12),
            "front and fall together are longer than the duration",
            "write a longer duration",
        )
        self._accept(
            {"peak": peak, "front": front, "duration": duration, "fall": fall}, [rule], ["front", "fall"]
        )

    @property
    def _constants(self) -> tuple[Quantity, ...]:
        return self.nominal, self.front, self.length, self.fall

    def _fall(self, level: float) -> Quantity:
        return cast(Quantity, self._full(self.length - level * self.fall))

    def _knots(self) -> NDArray[np.float64]:
        return panels((0.0, self.peak_time, 1), (self.length - self.fall, self.length, 1))


@dataclass(frozen=True, init=False, eq=False, repr=False)
class Triangle(Trapezoid):
    """Straight rise to the peak, straight fall to zero at ``duration``."""

    UNITS: ClassVar[Mapping[str, str]] = {"peak": "A", "rise": "s", "duration": "s"}

    def __init__(self, peak: Given, rise: Given, duration: Given) -> None:
        order = "the rise is longer than the whole duration"
        rule: Rule = (
            ("rise", "duration"),
            lambda rise, duration: rise <= duration,
            order,
            "write a longer duration",
        )
        self._accept({"peak": peak, "rise": rise, "duration": duration}, [rule])
        self._set(fall=np.subtract(self.length, self.front)[()])


@dataclass(frozen=True, init=False, eq=False, repr=False)
class Rectangle(Trapezoid):
    """Constant current for a time: the long stroke (continuing current) of IEC 62305-1."""

    UNITS: ClassVar[Mapping[str, str]] = {"current": "A", "duration": "s"}

    def __init__(self, current: Given, duration: Given) -> None:
        self._accept({"current": current, "duration": duration})
        self._set(front=0.0, fall=0.0)

    def _overlap(self, other: Waveform, delay: Quantity) -> Any:
        """∫ other(t)·self(t − delay) dt, exact with every other current."""
        return self.peak * (other.charge_until(delay + self.length) - other.charge_until(delay))


@dataclass(frozen=True, init=False, eq=False, repr=False)
class ConcaveFront(Pulse):
    """Concave front of CIGRE TB 63 with its two-exponential tail. The true peak is slightly below the nominal one."""

    UNITS: ClassVar[Mapping[str, str]] = {
        "peak": "A",
        "front": "s",
        "max_steepness": "A/s",
        "half_value_time": "s",
    }
    LAW = Law(
        cigre.concave_current, cigre.concave_slope, cigre.concave_specific_energy, cigre.concave_charge_until
    )

    front: Quantity
    nominal_steepness: Quantity
    nominal_half_value_time: Quantity

    def __init__(self, peak: Given, front: Given, max_steepness: Given, half_value_time: Given) -> None:
        names = ("peak", "front", "max_steepness", "half_value_time")

        def long_enough(*values: Quantity) -> Any:
            if not np.all(values[2] * values[1] > values[0]):
                return True  # the other rule speaks
            c = cigre.concave(*values)
            return np.asarray(c.t1) > c.t2

        rules: list[Rule] = [
            (
                names[:3],
                lambda peak, front, steepness: steepness * front > peak,
                "the largest steepness is not above the mean one, peak/front: the front would not be concave",
                "write a larger steepness or a longer front, or use the linear front",
            ),
            (names, long_enough, "the time to half value is too short for this front", "write a longer one"),
        ]
        self._accept(dict(zip(names, (peak, front, max_steepness, half_value_time), strict=True)), rules)

    @cached_property
    def _constants(self) -> tuple[cigre.Concave]:
        return (cigre.concave(*self.parameters.values()),)

    @cached_property
    def peak_time(self) -> Quantity:
        """Time of the true peak (s)."""
        return cast(Quantity, self._full(cigre.concave_peak_time(*self._constants)))

    @property
    def peak(self) -> Quantity:
        """True peak (A)."""
        return self.current(self.peak_time)

    @property
    def steepest_time(self) -> Quantity:
        """Time of the largest di/dt (s)."""
        return cast(Quantity, self._full(self._constants[0].steepest))

    def _knots(self) -> NDArray[np.float64]:
        c = self._constants[0]
        tail = c.steepest + TAIL * np.asarray(c.t2)
        return panels((0.0, c.steepest, 8), (c.steepest, tail, 11), (tail, self.peak_time + TAIL * c.t1, 11))
