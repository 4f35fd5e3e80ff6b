"""What a fit is asked for: the target figures, how they are read, and the bounds that no current can pass."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Mapping
from typing import Any

import numpy as np
from numpy.typing import NDArray

from strikeenergy.errors import InputError, Problem
from strikeenergy.formatting import format_quantity
from strikeenergy.lightning.parameters import Given, read_parameters
from strikeenergy.lightning.sums import Waveform
from strikeenergy.units import Quantity

__all__ = ["DESIGN", "SLACK", "Array", "Fitted", "log_figures", "measured", "read_targets"]

Array = NDArray[np.float64]

# Each target in logarithms: its share of ln(peak) and of ln(time scale); the rest is a function of the shape.
DESIGN = {
    "peak": (1.0, 0.0),
    "charge": (1.0, 1.0),
    "specific_energy": (2.0, 1.0),
    "front_time": (0.0, 1.0),
    "half_value_time": (0.0, 1.0),
}
_UNITS = {
    "peak": "A",
    "charge": "C",
    "specific_energy": "J/ohm",
    "front_time": "s",
    "half_value_time": "s",
    "duration": "s",
}
SLACK = 1 + 1e-9
"""A bound is passed when it is exceeded by this factor."""

Fitted = tuple[Waveform, Array]
"""A waveform, and ln(found/asked) of each target."""


def log_figures(w: Waveform, names: Iterable[str], definition: str) -> Array:
    """Logarithms of the named figures of a waveform; last axis."""
    found = [getattr(w, n)(definition) if n.endswith("time") else getattr(w, n) for n in names]
    logs: Array = np.log(np.stack(found, axis=-1))
    return logs


def measured(w: Waveform, target: Array, names: tuple[str, ...], definition: str) -> Fitted:
    """Compare a waveform with the targets."""
    return w, log_figures(w, names, definition) - target


def read_targets(given: Mapping[str, Given], low: float) -> dict[str, Quantity]:
    """Read and check what was given; refuse what no current can have."""
    values, problems = read_parameters(
        {name: value for name, value in given.items() if value is not None}, _UNITS
    )
    try:
        np.broadcast_shapes(*(np.shape(v) for v in values.values()))
    except ValueError:
        problems.append(
            Problem("the shapes of the targets do not fit together", "give arrays that broadcast")
        )
    if not problems:
        problems += [
            Problem(
                f"no current can have this: {bound} does not hold{_where(broken, values)}", write, (names[0],)
            )
            for names, bound, holds, write in (*_BOUNDS, *_front_bounds(low))
            if values.keys() >= set(names)
            and (broken := ~np.asarray(holds(*(values[n] for n in names)))).any()
        ]
    if problems:
        raise InputError(problems)
    return values


Bound = tuple[tuple[str, ...], str, Callable[..., Any], str]
_BOUNDS: tuple[Bound, ...] = (
    (
        ("specific_energy", "peak", "charge"),
        "W/R <= I*Q",
        lambda w, i, q: w <= i * q * SLACK,
        "the current would have to exceed its peak; check that all three are of one stroke",
    ),
    (
        ("specific_energy", "charge", "duration"),
        "Q^2/T <= W/R",
        lambda w, q, t: q**2 <= w * t * SLACK,
        "a constant current has the least; write a longer duration or a larger specific energy",
    ),
    (
        ("charge", "peak", "duration"),
        "Q <= I*T",
        lambda q, i, t: q <= i * t * SLACK,
        "write a longer duration",
    ),
)


def _front_bounds(low: float) -> tuple[Bound, ...]:
    """From its lower point on, the front lasts (0.9 − low)·T1 and ends before the tail, and the current stays above ``low`` of the peak."""
    c1, c2 = low * (0.9 - low), low**2 * (0.9 - low)
    write = "write a shorter front time"
    return (
        (
            ("front_time", "peak", "charge"),
            f"{c1:.2g}*I*T1 <= Q",
            lambda t, i, q: c1 * i * t <= q * SLACK,
            write,
        ),
        (
            ("front_time", "peak", "specific_energy"),
            f"{c2:.2g}*I^2*T1 <= W/R",
            lambda t, i, w: c2 * i**2 * t <= w * SLACK,
            write,
        ),
        (
            ("front_time", "half_value_time"),
            "0.9*T1 <= T2",  # the tail passes its half after the front has passed 90 %, at 0.9·T1
            lambda t1, t2: 0.9 * t1 <= t2 * SLACK,
            write,
        ),
    )


def _where(broken: NDArray[np.bool_], values: Mapping[str, Quantity]) -> str:
    if broken.ndim:
        return f" for {int(broken.sum())} of {broken.size} elements"
    shown = (f"{name} {format_quantity(float(value), _UNITS[name])}" for name, value in values.items())
    return f" ({', '.join(shown)})"
