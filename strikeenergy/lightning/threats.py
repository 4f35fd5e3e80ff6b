"""Named threats: the protection levels of IEC 62305-1 with each of their components.

``"LPL I"`` is the flash of the level: the first positive impulse followed by the long stroke, with the totals that the
table prints. ``"LPL I first positive impulse"``, ``"... first negative impulse"`` (for calculation only),
``"... subsequent impulse"`` and ``"... long stroke"`` are its components.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import lru_cache
from typing import Any

from strikeenergy.errors import UnknownName
from strikeenergy.lightning.flash import Flash, Stroke
from strikeenergy.sources import Constant, Standing, weakest
from strikeenergy.tables import constant, read_table

__all__ = ["COMPONENTS", "Component", "levels", "threat", "threat_names"]

COMPONENTS = ("first positive impulse", "first negative impulse", "subsequent impulse", "long stroke")
_UNITS = {"peak": "A", "charge": "C", "specific_energy": "J/ohm", "duration": "s"}
_POLARITY = {"first positive impulse": 1, "first negative impulse": -1, "subsequent impulse": -1}


@dataclass(frozen=True)
class Component:
    """One line of a protection level: its values with their standing, and the shape 10/350, 1/200 or 0.25/100."""

    name: str
    values: dict[str, Constant]
    shape: str

    def stroke(self) -> Stroke:
        """Return it as a stroke."""
        numbers = {name: value.value for name, value in self.values.items()}
        first = next(iter(self.values.values()))
        return Stroke(
            **numbers,
            polarity=_POLARITY.get(self.name),
            name=self.name,
            source=first.source,
            standing=weakest(value.standing for value in self.values.values()),
        )


@lru_cache(maxsize=1)
def levels() -> dict[str, dict[str, Component]]:
    """Return every protection level with its components, and the flash totals as a component called ``flash``."""
    raw = read_table("strikeenergy", "data", "threats.toml")
    return {
        level: {
            key.replace("_", " "): _component(key, row, raw["defaults"])
            for key, row in entry.items()
            if key != "aliases"
        }
        for level, entry in raw["level"].items()
    }


def _component(key: str, row: dict[str, Any], defaults: dict[str, Any]) -> Component:
    standing = {"standing": row["standing"]} if "standing" in row else {}
    values = {
        name: constant(
            row[name],
            unit,
            meaning=f"{name} of the {key.replace('_', ' ')}",
            defaults={**defaults, **standing},
        )
        for name, unit in _UNITS.items()
        if name in row
    }
    return Component(key.replace("_", " "), values, row.get("shape", ""))


@lru_cache(maxsize=1)
def _aliases() -> dict[str, str]:
    raw = read_table("strikeenergy", "data", "threats.toml")["level"]
    return {alias.casefold(): level for level, entry in raw.items() for alias in (level, *entry["aliases"])}


def threat_names() -> list[str]:
    """Return the name of every threat."""
    return [name for level in levels() for name in (level, *(f"{level} {part}" for part in COMPONENTS))]


def threat(name: str) -> Flash:
    """Return the flash of a named threat.

    Raises:
        UnknownName: no such threat, with the nearest names.
    """
    folded = " ".join(name.split()).casefold()
    part = next((p for p in COMPONENTS if folded.endswith(" " + p)), "")
    level = _aliases().get(folded.removesuffix(part).strip())
    if level is None:
        raise UnknownName("threat", name, threat_names())
    components = levels()[level]
    if part:
        stroke = components[part].stroke()
        remark = (
            ("the first negative impulse is for calculation only, not for tests",)
            if "negative" in part
            else ()
        )
        return Flash((stroke,), f"{level} {part}", {}, stroke.source, stroke.standing, remark)
    first, long = components["first positive impulse"], components["long stroke"]
    totals = {
        "peak": first.values["peak"].value,
        "charge": components["flash"].values["charge"].value,
        "specific_energy": first.values["specific_energy"].value,
    }
    # The table gives W/R of the impulse and none of the long stroke; as a rectangle it would add Q²/T.
    added = long.values["charge"].value ** 2 / long.values["duration"].value
    remarks = (
        f"W/R is that of the first impulse, as in the table; the long stroke as a rectangle would add "
        f"{100 * added / totals['specific_energy']:.1f} %",
    )
    strokes = (first.stroke(), long.stroke())
    standing: Standing = weakest(stroke.standing for stroke in strokes)
    return Flash(strokes, level, totals, strokes[0].source, standing, remarks)
