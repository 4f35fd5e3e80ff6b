"""Named threats: protection levels with each of their components, aerospace components, classes of connector tests.

``"LPL I"`` is the flash of the level: the first positive impulse followed by the long stroke, with the totals that the
table prints. ``"LPL I first positive impulse"``, ``"... first negative impulse"`` (for calculation only),
``"... subsequent impulse"`` and ``"... long stroke"`` are its components. ``"component A"`` to ``"component H"`` are those of the
aircraft environment, ``"class H"`` and ``"class N"`` the test currents of connection components.

Where a standard gives both a table of values and a waveform, the table counts and what the waveform integrates to is kept
beside it: IEC 62305-1's own function carries 2.75 % more specific energy than its table.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from functools import lru_cache
from typing import Any

from strikeenergy.errors import UnknownName
from strikeenergy.lightning.flash import Flash, Stroke
from strikeenergy.lightning.waveform import DoubleExponential, Heidler, Rectangle, Waveform, designation
from strikeenergy.sources import Constant, Standing, weakest
from strikeenergy.tables import constant, read_table
from strikeenergy.units import read

__all__ = [
    "COMPONENTS",
    "Component",
    "component_names",
    "levels",
    "single_components",
    "threat",
    "threat_names",
]

COMPONENTS = ("first positive impulse", "first negative impulse", "subsequent impulse", "long stroke")
_UNITS = {"peak": "A", "charge": "C", "specific_energy": "J/ohm", "duration": "s"}
_POLARITY = {"first positive impulse": 1, "first negative impulse": -1, "subsequent impulse": -1}


@dataclass(frozen=True)
class Component:
    """One line of a threat: its values with their standing, and its waveform."""

    name: str
    values: Mapping[str, Constant]
    shape: str = ""
    waveform: Waveform | None = None
    say: str = ""

    def stroke(self) -> Stroke:
        """Return it as a stroke."""
        first = next(iter(self.values.values()))
        return Stroke(
            **{name: value.value for name, value in self.values.items()},
            polarity=_POLARITY.get(self.name),
            name=self.name,
            source=first.source,
            standing=weakest(value.standing for value in self.values.values()),
            waveform=self.waveform,
            shape=self.shape,
        )


@lru_cache(maxsize=1)
def _raw() -> dict[str, Any]:
    return read_table("strikeenergy", "data", "threats.toml")


def _values(name: str, row: Mapping[str, Any], defaults: Mapping[str, Any]) -> dict[str, Constant]:
    own = {"standing": row["standing"]} if "standing" in row else {}
    return {
        key: constant(row[key], unit, meaning=f"{key} of the {name}", defaults={**defaults, **own})
        for key, unit in _UNITS.items()
        if key in row
    }


@lru_cache(maxsize=1)
def levels() -> dict[str, dict[str, Component]]:
    """Return every protection level with its components, and the flash totals as a component called ``flash``."""
    return {
        level: {key.replace("_", " "): _component(key, row) for key, row in entry.items() if key != "aliases"}
        for level, entry in _raw()["level"].items()
    }


def _component(key: str, row: Mapping[str, Any]) -> Component:
    name = key.replace("_", " ")
    values = _values(name, row, _raw()["defaults"])
    shaped = _raw()["waveform"].get(key)
    if shaped is not None:
        heidler = Heidler(
            values["peak"].value, shaped["tau1"], shaped["tau2"], normalise="standard", k=shaped["k"]
        )
        return Component(name, values, f"Heidler function {row['shape']} µs of Annex B", heidler)
    if name == "long stroke":
        charge, duration = values["charge"].value, values["duration"].value
        return Component(name, values, "rectangle", Rectangle(charge / duration, duration))
    return Component(name, values)


@lru_cache(maxsize=1)
def single_components() -> dict[str, Component]:
    """Return the threats that are one current: the aerospace components and the classes of connector tests."""
    found = {}
    for group in ("aerospace", "connectors"):
        defaults = _raw()[group]
        for name, row in defaults.items():
            if isinstance(row, Mapping):
                values = _values(name, row, defaults)
                found[name] = Component(name, values, *_waveform(row), row["say"])
    return found


def _waveform(row: Mapping[str, Any]) -> tuple[str, Waveform]:
    if "current" in row:
        return "rectangle", Rectangle(row["current"], row["duration"])
    if "i0" in row:
        i0, alpha, beta = (
            float(read(row[n], u)) for n, u in (("i0", "A"), ("alpha", "1/s"), ("beta", "1/s"))
        )
        return "double exponential", DoubleExponential.from_amplitude(i0, alpha, beta)
    return "10/350 µs", designation("10/350", row["peak"])


def component_names() -> list[str]:
    """Return the names of the threats that are one current."""
    return list(single_components())


@lru_cache(maxsize=1)
def _aliases() -> dict[str, str]:
    return {
        alias.casefold(): level for level, e in _raw()["level"].items() for alias in (level, *e["aliases"])
    }


def threat_names() -> list[str]:
    """Return the name of every threat."""
    names = [name for level in levels() for name in (level, *(f"{level} {part}" for part in COMPONENTS))]
    return names + component_names()


def threat(name: str) -> Flash:
    """Return the flash of a named threat.

    Raises:
        UnknownName: no such threat, with the nearest names.
    """
    folded = " ".join(name.split()).casefold()
    single = next((n for n in single_components() if n.casefold() == folded), None)
    if single is not None:
        component = single_components()[single]
        stroke = component.stroke()
        return Flash((stroke,), single, {}, stroke.source, stroke.standing, (component.say, *_beside(stroke)))
    part = next((p for p in COMPONENTS if folded.endswith(" " + p)), "")
    level = _aliases().get(folded.removesuffix(part).strip())
    if level is None:
        raise UnknownName("threat", name, threat_names())
    components = levels()[level]
    if part:
        stroke = components[part].stroke()
        remarks = _beside(stroke)
        if "negative" in part:
            remarks = ("the first negative impulse is for calculation only, not for tests", *remarks)
        return Flash((stroke,), f"{level} {part}", {}, stroke.source, stroke.standing, remarks)
    return _level(level, components)


def _level(level: str, components: Mapping[str, Component]) -> Flash:
    first, long = components["first positive impulse"], components["long stroke"]
    totals = {
        "peak": first.values["peak"].value,
        "charge": components["flash"].values["charge"].value,
        "specific_energy": first.values["specific_energy"].value,
    }
    # The table gives W/R of the impulse and none of the long stroke; as a rectangle it would add Q²/T.
    added = long.values["charge"].value ** 2 / long.values["duration"].value
    strokes = (first.stroke(), long.stroke())
    remarks = (
        f"W/R is that of the first impulse, as in the table; the long stroke as a rectangle would add "
        f"{100 * added / totals['specific_energy']:.1f} %",
        *_beside(strokes[0]),
    )
    standing: Standing = weakest(stroke.standing for stroke in strokes)
    return Flash(strokes, level, totals, strokes[0].source, standing, remarks)


def _beside(stroke: Stroke) -> tuple[str, ...]:
    """Say by how much the waveform's own values differ from those given, and what follows from the waveform alone."""
    differ, follow = [], []
    words = {"peak": "peak", "charge": "charge", "specific_energy": "W/R"}
    for name, value in stroke.integrated.items():
        given = getattr(stroke, name)
        if given is None:
            follow.append(words[name])
        elif abs(value / given - 1) > 1e-3:
            differ.append(f"{words[name]} {100 * (value / given - 1):+.2f} %")
    remarks = []
    if differ:
        remarks.append(
            f"the waveform ({stroke.shape}) against the values given, which count: {', '.join(differ)}"
        )
    if follow:
        remarks.append(f"{' and '.join(follow)} integrated from the waveform ({stroke.shape})")
    return tuple(remarks)
