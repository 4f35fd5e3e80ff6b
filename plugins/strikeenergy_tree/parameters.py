"""The parameters of the trunk model, each a band of low, middle and high, and the species table."""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass
from functools import lru_cache
from typing import Any

from strikeenergy.api import Constant, Given, Note, Standing, constant, read_table

__all__ = [
    "Band",
    "Species",
    "band",
    "find_species",
    "own_band",
    "parameter_names",
    "species",
    "species_names",
]

_PACKAGE = "strikeenergy_tree"
_SI = {"degC": "K", "MPa": "Pa", "%": "", "cm": "m"}
"""What a unit of the tables becomes inside."""


@dataclass(frozen=True)
class Band:
    """A parameter: its middle value and, where it has one, its range. All in SI."""

    value: Constant | Given
    low: Constant | Given
    high: Constant | Given

    @property
    def mid(self) -> Any:
        """The middle value, as a plain number or array."""
        return self.value.value

    @property
    def ends(self) -> tuple[Any, Any]:
        """Low and high, as plain numbers or arrays."""
        return self.low.value, self.high.value

    @property
    def three(self) -> tuple[Any, Any, Any]:
        """Low, middle, high, as plain numbers or arrays."""
        return self.low.value, self.value.value, self.high.value

    def noted(self, note: Note) -> Band:
        """Write it down as an assumption if it is one, and as a constant if it stands firmer."""
        if isinstance(self.value, Constant):
            if self.value.standing is Standing.ASSUMED:
                note.assume(self.value)
            else:
                note.constant(self.value.meaning, self.value)
        return self


@lru_cache(maxsize=1)
def _parameters() -> dict[str, Band]:
    raw = read_table(_PACKAGE, "data", "parameters.toml")
    defaults = raw.pop("defaults")
    return {name: _band(row, defaults) for name, row in raw.items()}


def _band(row: Mapping[str, Any], defaults: Mapping[str, Any]) -> Band:
    unit, meaning = row["unit"], row["meaning"]

    def made(key: str, text: str) -> Constant:
        return constant({**row, "value": row[key]}, unit, meaning=text, defaults=defaults)

    if "low" not in row:
        value = made("value", meaning)
        return Band(value, value, value)
    low, high = made("low", f"{meaning}, low end"), made("high", f"{meaning}, high end")
    return Band(made("value", f"{meaning} ({row['low']} to {row['high']})"), low, high)


def parameter_names() -> list[str]:
    """Return the name of every parameter."""
    return list(_parameters())


def band(name: str) -> Band:
    """Return a parameter by its name in the table."""
    return _parameters()[name]


def own_band(value: Any, like: Band) -> Band:
    """Return the band of a value that the user gave: it has no width."""
    unit = like.value.unit
    given = Given(value, unit, like.value.meaning.split(" (")[0], Standing.GIVEN)
    return Band(given, given, given)


@dataclass(frozen=True)
class Species:
    """One row of the species table; a column that the table lacks is not in ``values``."""

    name: str
    wood: str
    values: Mapping[str, Constant]

    def get(self, column: str) -> Constant | None:
        """Return the value of a column, or None where the table lacks it."""
        return self.values.get(column)


@lru_cache(maxsize=1)
def _species() -> tuple[dict[str, Species], dict[str, str]]:
    """Return the rows by name, and the names by folded name or alias."""
    raw = read_table(_PACKAGE, "data", "species.toml")
    rows: dict[str, Species] = {}
    names: dict[str, str] = {}
    for name, row in raw["species"].items():
        values = {}
        for key, column in raw["column"].items():
            if row.get(key, "missing") == "missing":
                continue
            entry = {**column, "value": f"{row[key]} {column['unit']}".strip()}
            if key.startswith("moisture_") and "moisture_standing" in row:
                entry["standing"] = row["moisture_standing"]
            unit = _SI.get(column["unit"], column["unit"])
            values[key] = constant(entry, unit, meaning=f"{key.replace('_', ' ')} of {name}")
        rows[name] = Species(name, row["wood"], values)
        for alias in (name, *row["aliases"]):
            names[fold(alias)] = name
    return rows, names


def species() -> Mapping[str, Species]:
    """Return every species by its name."""
    return _species()[0]


def species_names() -> list[str]:
    """Return the name of every species."""
    return list(_species()[0])


def find_species(text: str) -> Species | None:
    """Return the species of this name or alias (``"white oak"``, ``"Oak, white"``), or None."""
    rows, names = _species()
    name = names.get(fold(text))
    return rows[name] if name is not None else None


def nearest_species(text: str) -> list[str]:
    """Return the names that come near, for messages: by spelling, and those that share a word (``"oak"``)."""
    from difflib import get_close_matches

    _, names = _species()
    wanted = fold(text)
    near = [names[match] for match in get_close_matches(wanted, list(names), n=3, cutoff=0.6)]
    words = set(wanted.split())
    near += [name for folded, name in names.items() if words & set(folded.replace(",", " ").split())]
    return list(dict.fromkeys(near))[:6]


def fold(text: str) -> str:
    """Fold a name for comparison."""
    return " ".join(text.replace("-", " ").casefold().split())


def probability_weights() -> tuple[float, float, float]:
    """Return the weights of the low, middle and high value of a band; they sum to one."""
    end = float(band("weight_end").mid)
    weights = (end, 1 - 2 * end, end)
    assert math.isclose(sum(weights), 1)
    return weights
