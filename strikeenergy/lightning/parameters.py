"""Parameters of a waveform: how they are read, and what every object made of them has.

A parameter is an SI number or an array of them, or a text with a unit ("200 kA"). Arrays broadcast against each other:
one object per element.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable, Mapping
from dataclasses import dataclass, fields
from typing import Any, ClassVar, Self

import numpy as np

from strikeenergy.errors import InputError, Problem, QuantityError
from strikeenergy.formatting import format_number
from strikeenergy.units import Quantity, dimension_name, read

__all__ = ["Given", "Parametric", "Rule", "plain", "read_parameter", "read_parameters"]

Given = Any
"""What a constructor accepts: an SI number, an array of them, a text with a unit, or a pint quantity."""

# A parameter whose name is also that of a derived figure is kept under another one.
_FIELD = {
    "peak": "nominal",
    "current": "nominal",
    "duration": "length",
    "rise": "front",
    "max_steepness": "nominal_steepness",
    "half_value_time": "nominal_half_value_time",
}


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


def read_parameters(
    given: Mapping[str, Given], units: Mapping[str, str], zero: Iterable[str] = ()
) -> tuple[dict[str, Quantity], list[Problem]]:
    """Read several parameters, each in its unit; return those that can be read, and what is wrong with the others.

    Those named in ``zero`` may be zero.
    """
    values: dict[str, Quantity] = {}
    problems = []
    for name, value in given.items():
        try:
            values[name] = read_parameter(value, units[name], zero=name in zero)
        except QuantityError as error:
            problems.append(Problem(error.what, error.write, (name,)))
    return values, problems


def plain(value: Any) -> Quantity:
    """Return a plain number for an array without axes."""
    return value if np.ndim(value) else float(value)


Rule = tuple[tuple[str, ...], Callable[..., Any], str, str]
"""Parameters concerned, what must hold, what is wrong if it does not, what to write."""


@dataclass(frozen=True, init=False, eq=False, repr=False)
class Parametric:
    """An object, or an array of objects, made from named parameters; it never changes."""

    UNITS: ClassVar[Mapping[str, str]] = {}
    """Unit of each parameter, by its name."""
    OPTIONAL: ClassVar[frozenset[str]] = frozenset()
    """Parameters that need not be given."""

    __array_ufunc__ = None  # so that numpy_number * waveform comes to __rmul__

    def _accept(
        self, given: Mapping[str, Given], rules: Iterable[Rule] = (), zero: Iterable[str] = ()
    ) -> None:
        values, problems = read_parameters(given, self.UNITS, zero)
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
            picked = value if isinstance(value, str) else plain(pick(np.broadcast_to(value, shape)))
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
