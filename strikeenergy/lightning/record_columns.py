"""Which columns of a table are the time and the current, and what turns their numbers into seconds and amperes."""

from __future__ import annotations

import re
from dataclasses import dataclass
from typing import Any, cast

from strikeenergy.errors import InputError, Problem, QuantityError, close_matches
from strikeenergy.formatting import format_number
from strikeenergy.lightning.record_layout import Layout, dimension, number
from strikeenergy.units import Scale
from strikeenergy.units import read as read_quantity
from strikeenergy.units import scale as unit_scale

__all__ = ["Columns", "choose_columns"]

_TIME_NAMES = re.compile(r"(t|time|zeit|temps|tiempo|tempo|tid|x|x-?axis|seconds?)\b.*", re.IGNORECASE)
_COUNTERS = re.compile(r"(sequence|sample|index|point|no|nr|n|#)s?\.?", re.IGNORECASE)


@dataclass(frozen=True)
class Columns:
    """The columns that are read.

    Attributes:
        time: index of the time column; None where a time step is given.
        step: the time step (s); None where a column has the times.
        time_scale: turns a number of the time column into seconds.
        current: index of the current column.
        current_scale: turns a number of the current column into the unit that ``factor`` expects.
        factor: what that is multiplied by to make amperes.
        channels: names of all columns that are not times.
        channel: name of the chosen one.
        understood: what was taken, and why, for people.
    """

    time: int | None
    step: float | None
    time_scale: Scale
    current: int
    current_scale: Scale
    factor: float
    channels: tuple[str, ...]
    channel: str
    understood: dict[str, str]


def choose_columns(
    layout: Layout,
    place: str,
    *,
    time_unit: str | None = None,
    current_unit: str | None = None,
    scale: float | str | None = None,
    channel: str | int | None = None,
    time_step: Any = None,
) -> Columns:
    """Choose the columns, and their units from the heading or from what is given.

    Raises:
        InputError: everything that is missing or cannot be told, each with what to give.
    """
    problems: list[Problem] = []
    understood: dict[str, str] = {}
    at = f"{place}:{max(layout.first_line - 1, 1)}"
    step = _step(time_step, problems)
    times = _time_columns(layout, step is not None or time_step is not None)
    rest = [n for n in range(layout.columns) if n not in times]
    counted = [n for n in rest if not (_COUNTERS.fullmatch(layout.names[n]) and not layout.units[n])]
    rest = counted or rest
    if not rest:
        problems.append(
            Problem("there is one column and no time", "give time_step, such as '0.1 us'", place=at)
        )
        raise InputError(problems)
    chosen = _channel(layout, rest, channel, current_unit is not None or scale is not None, at, problems)
    # Tables with a time column for each channel: the channel's own stands to its left.
    before = [n for n in times if n < (rest[0] if chosen is None else chosen)] or times[:1]
    time = before[-1] if before and step is None and time_step is None else None
    time_scale = unit_scale("s")
    if time is not None:
        time_scale = _time_scale(layout, time, time_unit, at, problems, understood)
    elif step is not None:
        understood["time"] = f"one sample every {format_number(step)} s (given)"
    current_scale, factor = unit_scale("A"), 1.0
    if chosen is not None:
        current_scale, factor = _current(layout, chosen, current_unit, scale, at, problems, understood)
    if problems or chosen is None:
        raise InputError(problems)
    names = tuple(layout.names[n] for n in rest)
    return Columns(
        time, step, time_scale, chosen, current_scale, factor, names, layout.names[chosen], understood
    )


def _step(given: Any, problems: list[Problem]) -> float | None:
    if given is None:
        return None
    try:
        step = (
            float(given)
            if isinstance(given, (int, float))
            else float(cast(float, read_quantity(given, "s", example="0.1 us")))
        )
        if not 0 < step < 1e6:
            raise QuantityError(f"{given!r} is no time step", "write a time above zero, such as '0.1 us'")
    except QuantityError as error:
        problems.extend(Problem(f"time_step: {p.what}", p.write) for p in error.problems)
        return None
    return step


def _time_columns(layout: Layout, step_given: bool) -> list[int]:
    by_unit = [n for n, unit in enumerate(layout.units) if unit and dimension(unit) == "time"]
    by_name = [
        n for n, name in enumerate(layout.names) if _TIME_NAMES.fullmatch(name) and not layout.units[n]
    ]
    found = by_unit or by_name
    if found or step_given:
        return found if len(found) < layout.columns else found[:-1]
    return [0]


def _channel(
    layout: Layout, rest: list[int], wanted: str | int | None, told: bool, at: str, problems: list[Problem]
) -> int | None:
    names = [layout.names[n] for n in rest]
    listing = ", ".join(f"{k + 1} = {name!r}" for k, name in enumerate(names))
    if wanted is None:
        if len(rest) == 1:
            return rest[0]
        currents = [n for n in rest if layout.units[n] and dimension(layout.units[n]) == "current"]
        if len(currents) == 1 and not told:
            return currents[0]
        problems.append(
            Problem(f"there are {len(rest)} channels: {listing}", "give channel, by name or number", place=at)
        )
        return None
    text = str(wanted).strip()
    matches = [n for n, name in zip(rest, names, strict=True) if name == text]
    matches = matches or [
        n for n, name in zip(rest, names, strict=True) if name.casefold() == text.casefold()
    ]
    if len(matches) == 1 and not isinstance(wanted, int):
        return matches[0]
    if text.isascii() and text.isdigit() and 1 <= int(text) <= len(rest) and not matches:
        return rest[int(text) - 1]
    what = f"{len(matches)} channels are called {text!r}" if matches else f"there is no channel {text!r}"
    near = close_matches(text, names)
    write = f"the channels are {listing}" + (f"; {near}" if "mean" in near else "")
    problems.append(Problem(what, write, place=at))
    return None


def _time_scale(
    layout: Layout, time: int, given: str | None, at: str, problems: list[Problem], understood: dict[str, str]
) -> Scale:
    name, heading = layout.names[time], layout.units[time]
    unit, why = (given, "given") if given else (heading, "from the heading")
    if not unit:
        write = "give time_unit, such as 'us'; or time_step, if the column counts samples"
        problems.append(Problem(f"the time column {name!r} has no unit", write, place=at))
        return unit_scale("s")
    if dimension(unit) != "time":
        what = f"the unit {unit!r} of the time column {name!r} is no unit of time"
        problems.append(Problem(what, "give time_unit, such as 's', 'ms' or 'us'", place=at))
        return unit_scale("s")
    understood["time"] = f"column {time + 1} {name!r} in {unit} ({why})"
    return unit_scale(unit)


def _current(
    layout: Layout,
    chosen: int,
    given: str | None,
    scale: float | str | None,
    at: str,
    problems: list[Problem],
    understood: dict[str, str],
) -> tuple[Scale, float]:
    """Return the scale of the column's own unit and the factor to amperes.

    A plain number as scale multiplies the column, and its result is in the column's unit or the one given. ``"10 kA/V"``
    is the current for each volt; ``"0.25 mohm"`` is a shunt, by whose resistance the voltage is divided.
    """
    name, heading = layout.names[chosen], layout.units[chosen]
    unit, why = (given, "given") if given else (heading, "from the heading")
    factor, sort, per = _factor(scale, problems)
    if sort in ("per volt", "shunt") and not unit:
        unit, why = per or "", "as in the scale"
    if not unit:
        write = "give current_unit, such as 'kA', or a scale such as '10 kA/V'"
        problems.append(Problem(f"the channel {name!r} has no unit", write, place=at))
        return unit_scale("A"), factor
    found = dimension(unit)
    due = "voltage" if sort in ("per volt", "shunt") else "current"
    if found != due:
        what = f"the channel {name!r} is in {unit!r}, which is no unit of {due}"
        write = "give current_unit, such as 'A' or 'kA'"
        if found == "voltage":
            write = "give scale, such as '10 kA/V', or the resistance of the shunt, such as '0.25 mohm'"
        elif due == "voltage" and found == "current":
            write = f"the scale {scale!r} is for a voltage; leave it out, or give a plain number"
        problems.append(Problem(what, write, place=at))
        return unit_scale("A"), factor
    understood["current"] = f"column {chosen + 1} {name!r} in {unit} ({why})" + (
        f", scale {scale}" if scale is not None else ""
    )
    return unit_scale(unit), factor


def _factor(scale: float | str | None, problems: list[Problem]) -> tuple[float, str, str]:
    if scale is None:
        return 1.0, "", ""
    factor, sort, per = 0.0, "number", ""
    if isinstance(scale, (int, float)) or number(scale.strip()):
        factor = float(scale)
    else:
        for unit, kind in (("A/V", "per volt"), ("ohm", "shunt")):
            try:
                value = float(cast(float, read_quantity(scale, unit, example="10 kA/V")))
            except QuantityError:
                continue
            factor, sort = (value if kind == "per volt" else 1 / value if value else 0.0), kind
            per = scale.rpartition("/")[2].strip() if kind == "per volt" else ""
            per = per if per and dimension(per) == "voltage" else ""
    if factor == 0 or abs(factor) == float("inf") or factor != factor:
        what = f"scale: {scale!r} turns no number into a current"
        problems.append(
            Problem(what, "write a number, '10 kA/V', or the resistance of a shunt, such as '0.25 mohm'")
        )
        factor = 1.0
    return factor, sort, per
