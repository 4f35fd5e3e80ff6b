"""Waveforms by name: the shapes of a case file, and designations such as "10/350"."""

from __future__ import annotations

import re

from strikeenergy.errors import InputError, Problem, UnknownName, close_matches
from strikeenergy.lightning.parameters import Given
from strikeenergy.lightning.piecewise_shapes import ConcaveFront, LinearFront, Rectangle, Trapezoid, Triangle
from strikeenergy.lightning.pulse import Pulse
from strikeenergy.lightning.smooth_shapes import DoubleExponential, Heidler, PowerExponential

__all__ = ["SHAPES", "designation", "from_shape"]

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
