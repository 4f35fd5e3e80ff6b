"""The [flash] of a case: a named threat, strokes by what is known of them or by their shape, or a record."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import replace
from functools import partial
from pathlib import Path
from typing import Annotated, Any, TypeVar

from pydantic import Field

from strikeenergy.declared import validate
from strikeenergy.errors import InputError, Problem
from strikeenergy.formatting import format_quantity
from strikeenergy.inputs import Part, Unit
from strikeenergy.lightning.fitting import fit
from strikeenergy.lightning.flash import Flash, Stroke
from strikeenergy.lightning.record import read_record
from strikeenergy.lightning.reduction import Reduction, corrected, reduce
from strikeenergy.lightning.threats import threat
from strikeenergy.lightning.waveform import SHAPES, Sampled, Waveform, from_shape
from strikeenergy.units import Quantity

__all__ = ["FlashSection", "RecordEntry", "StrokeEntry", "build_flash"]

FITTED = "fitted"
_T = TypeVar("_T")
_KNOWN = ("peak", "charge", "specific_energy", "duration")
_TARGETS = ("peak", "charge", "specific_energy", "front_time", "half_value_time")
_POLARITIES = {"positive": 1, "negative": -1, "+": 1, "-": -1, 1: 1, -1: -1, "+1": 1, "-1": -1, "1": 1}


def _time(example: str) -> Unit:
    return Unit("s", gt=0, typical=(1e-7, 1), example=example)


class StrokeEntry(Part):
    """One [[flash.stroke]]: whatever is known of it, or its shape with the parameters of the shape."""

    name: str = ""
    """What the stroke is called in the report."""
    threat: str | None = None
    """A named current instead of values, such as "component A" or "LPL I subsequent impulse"."""
    peak: Annotated[Quantity, Unit("kA", gt=0, typical=(5, 200), example="100 kA")] | None = None
    """Peak current."""
    charge: Annotated[Quantity, Unit("C", gt=0, typical=(1, 300), example="50 C")] | None = None
    """Charge, the time integral of the current."""
    specific_energy: (
        Annotated[Quantity, Unit("J/ohm", gt=0, typical=(1e4, 1e7), example="2.5 MJ/ohm")] | None
    ) = None
    """Specific energy W/R, the time integral of the current squared."""
    duration: Annotated[Quantity, _time("0.5 s")] | None = None
    """Duration. More than 2 ms makes it a long stroke."""
    polarity: str | int | None = None
    """positive or negative: the sign of the charge brought to earth."""
    start: Annotated[Quantity, Unit("s", ge=0, typical=(0, 1), example="40 ms")] | None = None
    """When it begins, counted from the first stroke. What strokes with a shape and a start overlap is counted."""
    shape: str | None = None
    """Shape of the current: "10/350", "heidler", "rectangle", ..., or "fitted" to the values given."""
    current: Annotated[Quantity, Unit("A", gt=0, typical=(50, 1000), example="400 A")] | None = None
    """Current of a rectangle."""
    front_time: Annotated[Quantity, _time("10 us")] | None = None
    """Front time T1 (10 % to 90 %) that a fitted waveform is to have."""
    half_value_time: Annotated[Quantity, _time("350 us")] | None = None
    """Time to half value T2 that a fitted waveform, or a concave front, is to have."""
    tau1: Annotated[Quantity, _time("19 us")] | None = None
    """Front time constant of a Heidler function."""
    tau2: Annotated[Quantity, _time("485 us")] | None = None
    """Decay time constant of a Heidler function."""
    n: Annotated[Quantity, Unit("", gt=0, le=200, typical=(2, 10), example="10")] | None = None
    """Exponent of a Heidler function, 10 unless given."""
    k: Annotated[Quantity, Unit("", gt=0, le=1, typical=(0.9, 1), example="0.93")] | None = None
    """Peak correction of a Heidler function, with normalise = "standard"."""
    normalise: str | None = None
    """"exact": the peak is that of the curve; "standard": the peak is divided by the customary factor."""
    alpha: Annotated[Quantity, Unit("1/s", gt=0, typical=(1e3, 1e5), example="11354 1/s")] | None = None
    """Slower rate of a double exponential."""
    beta: Annotated[Quantity, Unit("1/s", gt=0, typical=(1e5, 1e7), example="647265 1/s")] | None = None
    """Faster rate of a double exponential."""
    p: Annotated[Quantity, Unit("", gt=0, le=100, typical=(1, 5), example="2.93")] | None = None
    """Exponent of a power exponential."""
    tau: Annotated[Quantity, _time("3.98 us")] | None = None
    """Time constant of a power exponential."""
    front: Annotated[Quantity, Unit("s", ge=0, typical=(1e-7, 1e-4), example="10 us")] | None = None
    """Front of a linear front, a trapezoid or a concave front."""
    tail: Annotated[Quantity, _time("500 us")] | None = None
    """Decay time constant behind a linear front."""
    rise: Annotated[Quantity, Unit("s", ge=0, typical=(1e-7, 1e-3), example="10 us")] | None = None
    """Rise of a triangle."""
    fall: Annotated[Quantity, Unit("s", ge=0, typical=(1e-7, 1e-3), example="10 us")] | None = None
    """Fall of a trapezoid."""
    max_steepness: Annotated[Quantity, Unit("kA/us", gt=0, typical=(1, 200), example="24.3 kA/us")] | None = (
        None
    )
    """Largest steepness of a concave front."""


class RecordEntry(Part):
    """[flash.record]: an oscillogram and how to read it, where its heading does not say."""

    file: str
    """The file, relative to the case file."""
    channel: str | None = None
    """Name or number of the column, where there are several."""
    time_unit: str | None = None
    """Unit of the times, such as "us"."""
    current_unit: str | None = None
    """Unit of the current, such as "kA"."""
    scale: str | None = None
    """What one unit of the column stands for, such as "10 kA/V" or "0.25 mohm" (a shunt)."""
    time_step: str | None = None
    """Time between samples, where the file holds none."""
    sensor_time_constant: str | None = None
    """Time constant of a sensor without d.c. response: its droop is repaired."""


class FlashSection(Part):
    """The [flash] of a case: a named threat, the strokes, or a record."""

    threat: str | None = None
    """A named threat, such as "LPL I"; 'strikeenergy describe threats' lists them."""
    record: str | RecordEntry | None = None
    """An oscillogram, such as "shot-12.csv"; as a table [flash.record] where units or scale have to be said."""
    stroke: Annotated[tuple[StrokeEntry, ...], Field(strict=False)] = ()
    """The strokes in time order: [[flash.stroke]] entries."""


def build_flash(data: Any, threat_name: str | None, folder: Path, problems: list[Problem]) -> Flash | None:
    """Make the flash of what the case says; add every problem to the list.

    Args:
        data: the [flash] table.
        threat_name: a threat from the command line, which takes its place.
        folder: where a record's name starts from.
        problems: takes what is wrong.
    """
    write = 'write [flash] and threat = "LPL I" below it, or [[flash.stroke]] entries'
    if threat_name is not None:
        return _collected(lambda: threat(threat_name), ("--threat",), problems)
    if data is None:
        problems.append(Problem("the flash is missing", write))
        return None
    if not isinstance(data, Mapping):
        problems.append(Problem("a table is due here", write, ("flash",)))
        return None
    section = validate(FlashSection, data, ("flash",), {}, problems)
    if section is None:
        return None
    ways = [name for name in ("threat", "record", "stroke") if getattr(section, name)]
    if len(ways) > 1:
        said = " and ".join("strokes" if way == "stroke" else way for way in ways)
        both = "both " if len(ways) == 2 else "all "
        problems.append(Problem(f"{said} are {both}given", "give one of them", ("flash", ways[0])))
        return None
    if section.threat is not None:
        named = section.threat
        return _collected(lambda: threat(named), ("flash", "threat"), problems)
    if section.record is not None:
        entry = RecordEntry(file=section.record) if isinstance(section.record, str) else section.record
        return _collected(lambda: _from_record(entry, folder), ("flash", "record"), problems)
    if not section.stroke:
        problems.append(Problem("the flash is empty", write, ("flash",)))
        return None
    return _strokes(section.stroke, problems)


def _collected(make: Callable[[], _T], path: tuple[str | int, ...], problems: list[Problem]) -> _T | None:
    try:
        return make()
    except InputError as error:
        for p in error.problems:  # a record's own line stays with what is said of it
            what = f"{p.place}: {p.what}" if p.place else p.what
            problems.append(replace(p, what=what, place="", path=(*path, *p.path)))
        return None


def _strokes(entries: tuple[StrokeEntry, ...], problems: list[Problem]) -> Flash | None:
    strokes: list[Stroke] = []
    remarks: list[str] = []
    for number, entry in enumerate(entries):
        path = ("flash", "stroke", number)
        found = len(problems)
        polarity = _polarity(entry.polarity, (*path, "polarity"), problems)
        if len(problems) == found:
            stroke = _collected(partial(_stroke, entry, polarity, remarks), path, problems)
            if stroke is not None:
                strokes.append(stroke)
    starts = [float(s.start) for s in strokes if s.start is not None]
    if starts != sorted(starts):
        problems.append(
            Problem(
                "the strokes are not in time order",
                "write them in the order of their starts",
                ("flash", "stroke"),
            )
        )
    apart = [str(n) for n, s in enumerate(strokes, 1) if s.start is None and s.waveform is not None]
    if apart and starts:
        remarks.append(
            f"no start is given of stroke {', '.join(apart)}: nothing of it overlaps the other strokes (give start = ...)"
        )
    return Flash(tuple(strokes), remarks=tuple(remarks)) if strokes else None


def _polarity(value: str | int | None, path: tuple[str | int, ...], problems: list[Problem]) -> int | None:
    if value is None or value in _POLARITIES:
        return None if value is None else _POLARITIES[value]
    problems.append(Problem(f"unknown polarity {value!r}", "write 'positive' or 'negative'", path))
    return None


def _stroke(entry: StrokeEntry, polarity: int | None, remarks: list[str]) -> Stroke:
    given = {
        name: value
        for name, value in entry
        if value is not None and name not in ("name", "polarity", "start")
    }
    if entry.threat is not None:
        others = [name for name in given if name != "threat"]
        if others:
            raise InputError(
                [Problem("a named threat brings its own values", "leave this out", (others[0],))]
            )
        return _named(entry, polarity)
    if entry.shape is None:
        return _plain_stroke(entry, polarity, given)
    if entry.shape == FITTED:
        waveform, shape = _fitted(given, remarks)
    else:
        waveform, shape = _shaped(entry.shape, given), entry.shape
    values: dict[str, Any] = {name: given.get(name) for name in _KNOWN}
    return Stroke(
        **values, polarity=polarity, start=entry.start, name=entry.name, waveform=waveform, shape=shape
    )


def _named(entry: StrokeEntry, polarity: int | None) -> Stroke:
    try:
        flash = threat(str(entry.threat))
    except InputError as error:
        raise InputError([replace(p, path=("threat",)) for p in error.problems]) from None
    if len(flash.strokes) != 1:
        write = f"name one of its components, such as '{flash.name} first positive impulse'"
        raise InputError([Problem(f"{flash.name!r} is a whole flash, not one stroke", write, ("threat",))])
    stroke = flash.strokes[0]
    return replace(
        stroke, start=entry.start, polarity=polarity or stroke.polarity, name=entry.name or flash.name
    )


def _plain_stroke(entry: StrokeEntry, polarity: int | None, given: Mapping[str, Any]) -> Stroke:
    loose = [name for name in given if name not in _KNOWN]
    if loose:
        write = f"say the shape as well, such as shape = {_shape_with(loose[0])!r}"
        raise InputError([Problem(f"{loose[0]} is a parameter of a shape", write, (loose[0],))])
    if not any(name in given for name in ("peak", "charge", "specific_energy")):
        raise InputError(
            [Problem("the stroke has no peak, charge or specific energy", "give at least one of them")]
        )
    return Stroke(**given, polarity=polarity, start=entry.start, name=entry.name)


def _shape_with(parameter: str) -> str:
    return next((name for name, shape in SHAPES.items() if parameter in shape.UNITS), FITTED)


def _shaped(shape: str, given: Mapping[str, Any]) -> Waveform:
    """Make the waveform of a shape. Charge and W/R beside it stay what was given."""
    taken = SHAPES[shape].UNITS if shape in SHAPES else {"peak": "A"}
    beside = [name for name in _KNOWN if name not in taken]
    parameters = {name: v for name, v in given.items() if name not in (*beside, "shape")}
    try:
        return from_shape(shape, **parameters)
    except InputError as error:
        known = {name for p in error.problems for name in p.path}
        if not known and "shape" in str(error):
            raise InputError([replace(p, path=("shape",)) for p in error.problems]) from None
        raise


def _fitted(given: Mapping[str, Any], remarks: list[str]) -> tuple[Waveform, str]:
    """Fit a waveform to the values given; say what it is and what it misses."""
    loose = [name for name in given if name not in (*_TARGETS, "duration", "shape")]
    if loose:
        raise InputError([Problem("a fitted waveform takes no such value", f"give some of {', '.join(_TARGETS)}", (loose[0],))])  # fmt: skip
    targets = {name: given[name] for name in (*_TARGETS, "duration") if name in given}
    result = fit(**targets)
    remarks.append(f"waveform fitted to {', '.join(targets)}: {result.method}")
    if result.assumed:
        remarks.append(f"assumed in the fit: {result.assumed}")
    for name in result.unmet:
        remarks.append(f"the fitted waveform misses {name} by {100 * float(result.residuals[name]):+.2g} %")
    return result.waveform, f"fitted ({result.method})"


def _from_record(entry: RecordEntry, folder: Path) -> Flash:
    options = {
        name: getattr(entry, name)
        for name in ("channel", "time_unit", "current_unit", "scale", "time_step")
        if getattr(entry, name) is not None
    }
    record = read_record(folder / entry.file, **options)
    reduction = reduce(record, sensor_time_constant=entry.sensor_time_constant)
    stroke = replace(
        reduction.stroke(), waveform=Sampled(*corrected(record, reduction)), shape="record", name=entry.file
    )
    return Flash((stroke,), name=f"record {entry.file}", remarks=_record_remarks(reduction))


def _record_remarks(reduction: Reduction) -> tuple[str, ...]:
    """Say with what uncertainty the record gives its values, and what is wrong with it."""
    said = []
    for name, word in (("peak", "peak"), ("charge", "charge"), ("specific_energy", "W/R")):
        value = getattr(reduction, name)
        if value.value is not None and value.uncertainty is not None:
            said.append(f"{word} {format_quantity(value.value, value.unit)} ± {format_quantity(value.uncertainty, value.unit, None, 2)}")  # fmt: skip
    flagged = [f"record: {check.text}" for check in reduction.flags]
    return (f"from the record (standard uncertainty): {', '.join(said)}", *flagged)
