"""The current of a stroke as a function of time, with everything that follows from it.

A waveform takes SI numbers or arrays (one waveform per element; they broadcast), or texts with a unit ("200 kA"), and
gives back SI. ``w.current(t)`` broadcasts the times against the parameters: for an array of waveforms give the times
a first axis of their own, ``w.current(t[:, None])``.

``peak`` is the true peak of the curve. For ``Heidler(..., normalise="standard")`` and ``ConcaveFront`` it differs from
the nominal one that was given, which stays in ``nominal``.
"""

from __future__ import annotations

import math
import re
from abc import ABC, abstractmethod
from collections.abc import Callable, Iterable, Mapping
from dataclasses import dataclass, fields
from functools import cached_property
from typing import Any, ClassVar, NamedTuple, Self, cast

import numpy as np
from numpy.typing import NDArray

from strikeenergy.errors import InputError, Problem, QuantityError, UnknownName, close_matches
from strikeenergy.formatting import format_number
from strikeenergy.physics import cigre, pulses
from strikeenergy.units import Quantity, dimension_name, read

__all__ = [
    "DEFINITIONS",
    "SHAPES",
    "ConcaveFront",
    "DoubleExponential",
    "Heidler",
    "LinearFront",
    "PowerExponential",
    "Pulse",
    "Rectangle",
    "Sampled",
    "Sum",
    "Trapezoid",
    "Triangle",
    "Waveform",
    "designation",
    "from_shape",
    "lower_point",
    "read_parameter",
]

Given = Any
"""What a constructor accepts: an SI number, an array of them, a text with a unit, or a pint quantity."""

DEFINITIONS = {"10/90": 0.1, "30/90": 0.3}
"""Ways to define front time and virtual origin by two points of the front, and the lower of the two.

"10/90" for currents (IEC 62305-1, IEC 60060-1): T1 = 1.25·(t90 − t10); "30/90" for voltages: T1 = (t90 − t30)/0.6. The
virtual origin is where the straight line through the two points cuts the axis; T2 runs from there to half the peak.
"""

# A parameter whose name is also that of a derived figure is kept under another one.
_FIELD = {
    "peak": "nominal",
    "current": "nominal",
    "duration": "length",
    "rise": "front",
    "max_steepness": "nominal_steepness",
    "half_value_time": "nominal_half_value_time",
}
_PIECE = 1000  # elements of an array of waveforms that are searched on a grid at once


def read_parameter(value: Given, unit: str, zero: bool = False, signed: bool = False) -> Quantity:
    """Read one parameter: finite and, unless told otherwise, above zero; raise QuantityError."""
    if value is None:
        raise QuantityError("it is missing", f"give {dimension_name(unit)} in {unit}")
    if isinstance(value, (bool, str)) or hasattr(value, "magnitude"):
        value = read(value, unit)
    try:
        array = np.array(value, dtype=float)
    except (TypeError, ValueError, OverflowError):
        raise QuantityError(
            f"{type(value).__name__} found where {dimension_name(unit)} is due", "give a number"
        ) from None
    if not array.size:
        raise QuantityError("the array is empty", "give at least one value")
    for bad, what in (
        (~np.isfinite(array), "not finite"),
        ((array < 0) & (zero and not signed), "below zero"),
        ((array <= 0) & (not zero and not signed), "not above zero"),
    ):
        if bad.any():
            first = format_number(float(array[bad][0])) if np.isfinite(array[bad][0]) else str(array[bad][0])
            of = f" ({int(bad.sum())} of {array.size} values)" if array.ndim else ""
            raise QuantityError(f"{first} is {what}{of}", "")
    array.flags.writeable = False
    return array if array.ndim else float(array)


def _plain(value: Any) -> Quantity:
    return value if np.ndim(value) else float(value)


Rule = tuple[tuple[str, ...], Callable[..., Any], str, str]
"""Parameters concerned, what must hold, what is wrong if it does not, what to write."""


@dataclass(frozen=True, init=False, eq=False, repr=False)
class Waveform(ABC):
    """What every shape offers. Figures by closed form where there is one; else from a grid that resolves the shape."""

    UNITS: ClassVar[Mapping[str, str]] = {}
    """Unit of each parameter, by its name."""
    OPTIONAL: ClassVar[frozenset[str]] = frozenset()
    """Parameters that need not be given."""

    __array_ufunc__ = None  # so that numpy_number * waveform comes to __rmul__

    def _accept(
        self, given: Mapping[str, Given], rules: Iterable[Rule] = (), zero: Iterable[str] = ()
    ) -> None:
        values: dict[str, Quantity] = {}
        problems = []
        for name, value in given.items():
            try:
                values[name] = read_parameter(value, self.UNITS[name], zero=name in zero)
            except QuantityError as error:
                problems.append(Problem(error.what, error.write, (name,)))
        try:
            np.broadcast_shapes(*(np.shape(v) for v in values.values()))
            for names, holds, what, write in rules:
                if values.keys() >= set(names) and not np.all(holds(*(values[name] for name in names))):
                    problems.append(Problem(what, write, names[-1:]))
        except ValueError:
            shapes = ", ".join(f"{name} {np.shape(v)}" for name, v in values.items())
            problems.append(
                Problem(f"the shapes do not fit together: {shapes}", "give arrays that broadcast")
            )
        if problems:
            raise InputError(problems)
        self._set(**{_FIELD.get(name, name): value for name, value in values.items()})

    def _set(self, **values: Any) -> None:
        for name, value in values.items():
            object.__setattr__(self, name, value)

    @property
    def parameters(self) -> dict[str, Quantity]:
        """The parameters by their names in the constructor, in SI."""
        return {name: getattr(self, _FIELD.get(name, name)) for name in self.UNITS}

    @property
    def shape(self) -> tuple[int, ...]:
        """Shape of the array of waveforms; ``()`` for one."""
        return np.broadcast_shapes(*(np.shape(v) for v in self.parameters.values()))

    def _select(self, pick: Callable[[Any], Any], shape: tuple[int, ...]) -> Self:
        new = object.__new__(type(self))
        for field in fields(self):
            value = getattr(self, field.name)
            picked = value if isinstance(value, str) else _plain(pick(np.broadcast_to(value, shape)))
            new._set(**{field.name: picked})
        return new

    def __getitem__(self, index: Any) -> Self:
        """Pick elements of an array of waveforms."""
        return self._select(lambda values: values[index], self.shape)

    def __repr__(self) -> str:
        return f"{type(self).__name__}({', '.join(f'{k}={v!r}' for k, v in self.parameters.items())})"

    def __eq__(self, other: object) -> bool:
        mine = tuple(getattr(self, field.name) for field in fields(self))
        return type(self) is type(other) and all(
            np.array_equal(a, getattr(other, field.name)) for a, field in zip(mine, fields(self), strict=True)
        )

    def __hash__(self) -> int:
        return hash((type(self), repr(self)))

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

    # -- sums

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


def lower_point(definition: str) -> float:
    """Lower of the two points of a definition of the front time, as a share of the peak."""
    if definition not in DEFINITIONS:
        raise UnknownName("definition of the front time", str(definition), DEFINITIONS)
    return DEFINITIONS[definition]


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


def _panels(*pieces: tuple[Quantity, Quantity, int]) -> NDArray[np.float64]:
    """Join panel limits: (from, to, number of panels) each."""
    rows = [low + (high - low) * i / number for low, high, number in pieces for i in range(number + 1)]
    return np.sort(np.stack(np.broadcast_arrays(*rows)), axis=0)


_TAIL = 44.0  # an exponential tail is followed for so many time constants, in 11 panels


@dataclass(frozen=True, init=False, eq=False, repr=False)
class Heidler(Pulse):
    """Heidler function of IEC 62305-1:2010 Annex B: (I/k)·x^n/(1 + x^n)·exp(−t/tau2), x = t/tau1.

    With ``normalise="exact"`` k is such that the peak is exactly ``peak``. With ``"standard"`` k is the given one (Annex B
    prints 0.93, 0.986, 0.993) or else the customary exp(−a·(n/a)^(1/n)), a = tau1/tau2, and the peak is slightly off.
    """

    UNITS: ClassVar[Mapping[str, str]] = {"peak": "A", "tau1": "s", "tau2": "s", "n": "1", "k": "1"}
    OPTIONAL: ClassVar[frozenset[str]] = frozenset({"n", "k"})
    LAW = Law(pulses.heidler_current, pulses.heidler_slope, pulses.heidler_specific_energy)

    tau1: Quantity
    tau2: Quantity
    n: Quantity
    k: Quantity
    normalise: str

    @property
    def _constants(self) -> tuple[Quantity, ...]:
        return self.nominal, self.tau1, self.tau2, self.n, self.k

    def __init__(
        self,
        peak: Given,
        tau1: Given,
        tau2: Given,
        n: Given = 10.0,
        normalise: str = "exact",
        k: Given = None,
    ) -> None:
        given = {"peak": peak, "tau1": tau1, "tau2": tau2, "n": n} | ({} if k is None else {"k": k})
        rules: list[Rule] = [
            (
                ("n",),
                lambda n: n >= 1,
                "below 1 the front starts with an infinite slope",
                "write n from 1 up",
            ),
            (
                ("tau1", "tau2", "n"),
                lambda tau1, tau2, n: tau1 <= n * tau2,
                "tau1 is above n·tau2: the decay sets in before the front has risen",
                "use the power exponential with p = n and tau = tau2",
            ),
            (
                ("k",),
                lambda _: normalise == "standard",
                "k is computed for normalise='exact'",
                "leave it out",
            ),
            (
                (),
                lambda: normalise in ("exact", "standard"),
                f"normalise={normalise!r}",
                "write 'exact' or 'standard'",
            ),
        ]
        self._accept(given, rules)
        if k is None:
            exact = normalise == "exact"
            correction = pulses.heidler_correction if exact else pulses.heidler_correction_customary
            self._set(k=correction(self.tau1, self.tau2, self.n))
        self._set(normalise=normalise)

    @property
    def parameters(self) -> dict[str, Quantity]:
        """The parameters by their names in the constructor, in SI; k only where it is not the exact one."""
        values = super().parameters
        return values if self.normalise == "standard" else {k: v for k, v in values.items() if k != "k"}

    @classmethod
    def from_times(
        cls,
        peak: Given,
        front_time: Given,
        half_value_time: Given,
        n: float = 10.0,
        definition: str = "10/90",
    ) -> Heidler:
        """Return the Heidler function with exactly these T1 and T2."""
        a, t1 = _solve(
            lambda a: cls(1.0, a, 1.0, n), (1e-7, n * (1 - 1e-9)), front_time, half_value_time, definition
        )
        return cls(peak, a * t1, t1, n)

    @cached_property
    def peak_time(self) -> Quantity:
        """Time of the peak (s)."""
        return cast(Quantity, self._full(pulses.heidler_peak_time(self.tau1, self.tau2, self.n)))

    @property
    def peak(self) -> Quantity:
        """True peak (A)."""
        return (
            cast(Quantity, self._full(self.nominal))
            if self.normalise == "exact"
            else self.current(self.peak_time)
        )

    @cached_property
    def _integrals(self) -> tuple[Quantity, Quantity]:
        first, second = pulses.heidler_integrals(self.tau1 / self.tau2, self.n)
        return self.nominal / self.k * self.tau1 * first, (self.nominal / self.k) ** 2 * self.tau1 * second

    @property
    def charge(self) -> Quantity:
        """∫ i dt (C)."""
        return self._integrals[0]

    @property
    def specific_energy(self) -> Quantity:
        """∫ i² dt = W/R (J/ohm)."""
        return self._integrals[1]

    @cached_property
    def steepest_time(self) -> Quantity:
        """Time of the largest di/dt (s)."""
        last = np.log(self.peak_time)
        time: Quantity = np.exp(pulses.maximise(lambda y: self.slope(np.exp(y)), last - 40.0, last))
        return time

    def _knots(self) -> NDArray[np.float64]:
        # The rise lives on ln t, in panels short against its poles at |arg t| = π/n; the decay lives on t.
        n, crest = np.asarray(self.n), np.log(self.peak_time / self.tau1)
        low, high = np.minimum(crest, 0) - 37 / (n + 1), np.minimum(37 / n, np.log(self._end / self.tau1))
        number = int(np.ceil(((high - low) / np.minimum(0.45, 4.6 / n)).max()))
        rise = self.tau1 * np.exp(_panels((low, high, number)))
        tail = _panels((self.peak_time, self._end, int(12 + 2 * np.sqrt(n.max()))))
        return np.sort(np.concatenate([np.zeros((1, *self.shape)), rise, tail]), axis=0)

    @property
    def _end(self) -> Quantity:
        end: Quantity = self.peak_time + self.tau2 * (_TAIL + np.sqrt(80 * np.asarray(self.n)))
        return end


@dataclass(frozen=True, init=False, eq=False, repr=False)
class DoubleExponential(Pulse):
    """Difference of two exponentials, I0·(e^(−alpha·t) − e^(−beta·t)); ``peak`` is the peak, ``amplitude`` is I0."""

    UNITS: ClassVar[Mapping[str, str]] = {"peak": "A", "alpha": "1/s", "beta": "1/s"}
    LAW = Law(
        pulses.double_exponential_current,
        pulses.double_exponential_slope,
        pulses.double_exponential_specific_energy,
        pulses.double_exponential_charge_until,
    )

    alpha: Quantity
    beta: Quantity

    def __init__(self, peak: Given, alpha: Given, beta: Given) -> None:
        order = "beta is the rate of the front and must be above alpha, that of the tail"
        rule: Rule = (("alpha", "beta"), lambda alpha, beta: beta > alpha, order, "exchange them")
        self._accept({"peak": peak, "alpha": alpha, "beta": beta}, [rule])

    @classmethod
    def from_amplitude(cls, amplitude: Given, alpha: Given, beta: Given) -> DoubleExponential:
        """Take I0 in place of the peak, as SAE ARP5412 and EUROCAE ED-84 print it."""
        unit = cls(1.0, alpha, beta)
        return cls(read_parameter(amplitude, "A") / unit.amplitude, unit.alpha, unit.beta)

    @classmethod
    def from_times(
        cls, peak: Given, front_time: Given, half_value_time: Given, definition: str = "10/90"
    ) -> DoubleExponential:
        """Return the double exponential with exactly these T1 and T2; refused below T2/T1 = 3.8047 (10/90)."""
        s, t1 = _solve(lambda s: cls(1.0, 1.0, 1 + s), (1e8, 1e-6), front_time, half_value_time, definition)
        return cls(peak, 1 / t1, (1 + s) / t1)

    @property
    def _constants(self) -> tuple[Quantity, ...]:
        return self.amplitude, self.alpha, self.beta

    @property
    def amplitude(self) -> Quantity:
        """I0 (A)."""
        return self.nominal / pulses.double_exponential_current(self.peak_time, 1.0, self.alpha, self.beta)

    @cached_property
    def peak_time(self) -> Quantity:
        """Time of the peak (s)."""
        return cast(Quantity, self._full(pulses.double_exponential_peak_time(self.alpha, self.beta)))

    @property
    def charge(self) -> Quantity:
        """∫ i dt (C)."""
        return self.amplitude * (self.beta - self.alpha) / (self.alpha * self.beta)

    def _knots(self) -> NDArray[np.float64]:
        return _panels(
            (0.0, _TAIL / self.beta, 11), (_TAIL / self.beta, _TAIL / self.alpha + self.peak_time, 12)
        )


@dataclass(frozen=True, init=False, eq=False, repr=False)
class PowerExponential(Pulse):
    """Power times exponential, I·(t/(p·tau))^p·e^(p − t/tau): 8/20, 4/10 and other short-tailed test currents."""

    UNITS: ClassVar[Mapping[str, str]] = {"peak": "A", "p": "1", "tau": "s"}
    LAW = Law(
        pulses.power_exponential_current,
        pulses.power_exponential_slope,
        pulses.power_exponential_specific_energy,
        pulses.power_exponential_charge_until,
    )

    p: Quantity
    tau: Quantity

    def __init__(self, peak: Given, p: Given, tau: Given) -> None:
        steep = "below 1 the front starts with an infinite slope"
        rule: Rule = (("p",), lambda p: p >= 1, steep, "write p from 1 up, or use the Heidler function")
        self._accept({"peak": peak, "p": p, "tau": tau}, [rule])

    @classmethod
    def from_times(
        cls, peak: Given, front_time: Given, half_value_time: Given, definition: str = "10/90"
    ) -> PowerExponential:
        """Return the power exponential with exactly these T1 and T2; T2/T1 from 1.7 to 3.8 (10/90)."""
        p, t1 = _solve(
            lambda p: cls(1.0, np.maximum(p, 1), 1.0), (1.0, 1e4), front_time, half_value_time, definition
        )
        return cls(peak, p, t1)

    @property
    def peak_time(self) -> Quantity:
        """Time of the peak (s)."""
        return cast(Quantity, self._full(self.p * self.tau))

    @property
    def steepest_time(self) -> Quantity:
        """Time of the largest di/dt (s)."""
        return cast(Quantity, self._full(self.tau * (self.p - np.sqrt(self.p))))

    def _knots(self) -> NDArray[np.float64]:
        crest, spread = self.peak_time, self.tau * (np.sqrt(80 * np.asarray(self.p)) + 50)
        front = np.log(crest)
        rise = np.exp(_panels((front - 14, front, 40)))
        return np.concatenate([np.zeros((1, *self.shape)), rise, _panels((crest, crest + spread, 16))[1:]])


@dataclass(frozen=True, init=False, eq=False, repr=False)
class LinearFront(Pulse):
    """Straight front of duration ``front`` (0: a step), exponential tail with the time constant ``tail``."""

    UNITS: ClassVar[Mapping[str, str]] = {"peak": "A", "front": "s", "tail": "s"}
    LAW = Law(
        pulses.linear_front_current,
        pulses.linear_front_slope,
        pulses.linear_front_specific_energy,
        pulses.linear_front_charge_until,
    )

    front: Quantity
    tail: Quantity

    def __init__(self, peak: Given, front: Given, tail: Given) -> None:
        self._accept({"peak": peak, "front": front, "tail": tail}, zero=["front"])

    @property
    def peak_time(self) -> Quantity:
        """Time of the peak (s)."""
        return cast(Quantity, self._full(self.front))

    def _rise(self, level: float) -> Quantity:
        return level * self.peak_time

    def _fall(self, level: float) -> Quantity:
        return self.peak_time - self.tail * math.log(level)

    def _knots(self) -> NDArray[np.float64]:
        return _panels((0.0, self.peak_time, 1), (self.front, self.front + _TAIL * self.tail, 11))


@dataclass(frozen=True, init=False, eq=False, repr=False)
class Trapezoid(Pulse):
    """Straight front, flat top, straight fall that ends at ``duration``; front and fall may be 0 (steps)."""

    UNITS: ClassVar[Mapping[str, str]] = {"peak": "A", "front": "s", "duration": "s", "fall": "s"}
    LAW = Law(
        pulses.trapezoid_current,
        pulses.trapezoid_slope,
        pulses.trapezoid_specific_energy,
        pulses.trapezoid_charge_until,
    )

    front: Quantity
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

    @property
    def peak_time(self) -> Quantity:
        """Time at which the top is reached (s)."""
        return cast(Quantity, self._full(self.front))

    def _rise(self, level: float) -> Quantity:
        return level * self.peak_time

    def _fall(self, level: float) -> Quantity:
        return cast(Quantity, self._full(self.length - level * self.fall))

    def _knots(self) -> NDArray[np.float64]:
        return _panels((0.0, self.peak_time, 1), (self.length - self.fall, self.length, 1))


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
        tail = c.steepest + _TAIL * np.asarray(c.t2)
        return _panels(
            (0.0, c.steepest, 8), (c.steepest, tail, 11), (tail, self.peak_time + _TAIL * c.t1, 11)
        )


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
            [_plain(pick(np.broadcast_to(v, shape))) for v in row] for row in (self.offsets, self.factors)
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
        if all(isinstance(part, Pulse) for part in self.parts) and (signs == signs[0]).all():
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
    """∫ a(t)·b(t − delay) dt: exact with a rectangle and for exponentials, else by Gauss points to 1e-11."""
    if isinstance(b, Rectangle):
        return b.peak * (a.charge_until(delay + b.length) - a.charge_until(delay))
    if isinstance(a, Rectangle):
        return _cross_energy(b, a, -np.asarray(delay))
    if isinstance(a, DoubleExponential) and isinstance(b, DoubleExponential):
        late, early = np.maximum(delay, 0.0), np.minimum(delay, 0.0)

        def product(p: Quantity, q: Quantity) -> Any:
            return np.exp(-p * late + q * early) / (p + q)

        slow = product(a.alpha, b.alpha) - product(a.alpha, b.beta)
        return a.amplitude * b.amplitude * (slow - product(a.beta, b.alpha) + product(a.beta, b.beta))
    shape = np.broadcast_shapes(a.shape, b.shape, np.shape(delay))
    knots = np.concatenate([_spread(a._knots(), shape), _spread(b._knots(), shape) + delay])
    return pulses.integrate(lambda t: a.current(t) * b.current(t - delay), np.sort(knots, axis=0))


# -- by name -----------------------------------------------------------------------------------------------

SHAPES: dict[str, type[Pulse]] = {
    "heidler": Heidler,
    "double exponential": DoubleExponential,
    "power exponential": PowerExponential,
    "linear front": LinearFront,
    "trapezoid": Trapezoid,
    "triangle": Triangle,
    "rectangle": Rectangle,
    "concave front": ConcaveFront,
}
"""The shapes by their names in a case file; ``UNITS`` and ``OPTIONAL`` of each say what it takes."""


def _solve(
    make: Callable[[Any], Pulse], ends: tuple[float, float], front: Given, half: Given, definition: str
) -> tuple[Any, Any]:
    """Find the shape parameter that gives T2/T1, from ``ends`` (long tail first), and the unit of time it then has."""
    problems, times = [], []
    for name, value in (("front_time", front), ("half_value_time", half)):
        try:
            times.append(np.asarray(read_parameter(value, "s")))
        except QuantityError as error:
            problems.append(Problem(error.what, error.write, (name,)))
    if problems:
        raise InputError(problems)
    ratio = times[1] / times[0]

    def found(log: Any) -> Any:
        pulse = make(np.exp(log))
        return np.log(pulse.half_value_time(definition) / pulse.front_time(definition))

    low, high = np.log(ends)
    limits = np.exp(found(high)), np.exp(found(low))
    if not ((ratio >= limits[0]) & (ratio <= limits[1])).all():
        name = type(make(ends[1])).__name__
        worst = ratio.ravel()[int(np.abs(np.log(ratio / math.sqrt(limits[0] * limits[1]))).argmax())]
        short = "PowerExponential, or Heidler with n = 3 or more" if worst > 1.7 else "Trapezoid"
        use = f"use {'Heidler' if worst > limits[1] else short}"
        reach = f"{name} reaches T2/T1 from {limits[0]:.5g} to {limits[1]:.5g} ({definition})"
        raise InputError(
            [Problem(f"T2/T1 = {worst:.5g} is out of reach: {reach}", use, ("half_value_time",))]
        )
    log = pulses.find_root(
        lambda x: found(x) - np.log(ratio), np.full(ratio.shape, low), np.full(ratio.shape, high)
    )
    return np.exp(log), times[0] / make(np.exp(log)).front_time(definition)


_DESIGNATION = re.compile(
    r"\s*([0-9]+(?:\.[0-9]*)?|\.[0-9]+)\s*/\s*([0-9]+(?:\.[0-9]*)?|\.[0-9]+)\s*([uµμ]s)?\s*"
)


def designation(text: str, peak: Given, definition: str = "10/90") -> Pulse:
    """Return the waveform with exactly the T1/T2 (µs) of a designation such as "10/350" or "8/20".

    A Heidler function with n = 10; below T2/T1 = 3.8 (8/20, 4/10, 30/80), where no double exponential exists, the
    power exponential.
    """
    match = _DESIGNATION.fullmatch(text)
    if match is None or not float(match[1]) or not float(match[2]):
        raise InputError(
            [Problem(f"{text!r} is not a designation", "write T1/T2 in microseconds, such as '10/350'")]
        )
    front, half = float(match[1]) / 1e6, float(match[2]) / 1e6
    limit = PowerExponential(1.0, 1.0, 1.0)
    short = half / front <= limit.half_value_time(definition) / limit.front_time(definition)
    family: type[Heidler] | type[PowerExponential] = PowerExponential if short else Heidler
    return family.from_times(peak, front, half, definition=definition)


def from_shape(shape: str, **parameters: Given) -> Pulse:
    """Make a waveform from the name of a shape, or a designation such as "10/350", and its parameters."""
    named = _DESIGNATION.fullmatch(shape)
    if not named and shape not in SHAPES:
        raise UnknownName("shape", shape, [*SHAPES, "10/350"])
    known = {"peak"} if named else {*SHAPES[shape].UNITS, *({"normalise"} if shape == "heidler" else ())}
    problems = [
        Problem(f"unknown parameter of the shape {shape!r}", close_matches(name, sorted(known)), (name,))
        for name in parameters
        if name not in known
    ]
    needed = (
        ["peak"] if named else [name for name in SHAPES[shape].UNITS if name not in SHAPES[shape].OPTIONAL]
    )
    problems += [Problem("it is missing", "give it", (name,)) for name in needed if name not in parameters]
    if problems:
        raise InputError(problems)
    return designation(shape, **parameters) if named else SHAPES[shape](**parameters)
