"""Metals with properties that change with temperature: the set "temperature-dependent", from its table to the laws.

The table gives every property in pieces, each with unit, source, locator and standing; this module turns them into the
phases that :mod:`strikeenergy.physics.specific_action` works with. Like every set, this one is not mixed with others.
What it lacks stands under ``gaps`` and is not guessed.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace
from functools import lru_cache
from itertools import pairwise
from typing import Any, Literal

import numpy as np
from numpy.typing import NDArray

from strikeenergy.errors import DataError, InputError, MissingInput, UnknownName
from strikeenergy.physics.specific_action import Heating, Metal, Phase, heating_table
from strikeenergy.sources import Constant, Source, Standing, weakest
from strikeenergy.tables import constant, read_table, standing
from strikeenergy.units import read

__all__ = ["SET", "Coated", "Curve", "MetalData", "Piece", "coated", "heating", "metal_data", "metals"]

SET = "temperature-dependent"
"""The name of the set."""

Array = NDArray[np.float64]

CURVES = {
    "heat_capacity": ("J/(kg*K)", "specific heat"),
    "resistivity": ("ohm*m", "resistivity"),
    "liquid_heat_capacity": ("J/(kg*K)", "specific heat of the liquid"),
    "liquid_resistivity": ("ohm*m", "resistivity of the liquid"),
}
CONSTANTS = {
    "molar_mass": ("kg/mol", "molar mass"),
    "density": ("kg/m**3", "density"),
    "melting_temperature": ("degC", "melting temperature"),
    "latent_heat": ("J/kg", "latent heat of melting"),
    "boiling_temperature": ("degC", "boiling temperature"),
    "vaporisation_heat": ("J/kg", "heat of vaporisation"),
    "emissivity": ("", "emissivity"),
    "expansion": ("1/K", "coefficient of linear thermal expansion"),
    "elastic_modulus": ("Pa", "modulus of elasticity"),
    "yield_strength": ("Pa", "yield strength"),
    "softening_temperature": ("degC", "softening temperature"),
}


@dataclass(frozen=True)
class Piece:
    """A stretch of a curve that one place in one publication gives: temperatures (K) and values (SI) of its nodes."""

    temperature: Array
    value: Array
    source: Source
    standing: Standing


@dataclass(frozen=True)
class Curve:
    """A property over temperature: straight lines between the nodes of its pieces.

    A temperature may stand twice, at a change of phase: the property jumps there.
    """

    name: str
    unit: str
    pieces: tuple[Piece, ...]

    @property
    def temperature(self) -> Array:
        """All node temperatures (K)."""
        return np.concatenate([p.temperature for p in self.pieces])

    @property
    def value(self) -> Array:
        """The values (SI) there."""
        return np.concatenate([p.value for p in self.pieces])

    @property
    def standing(self) -> Standing:
        """The weakest standing among the pieces."""
        return weakest(p.standing for p in self.pieces)

    @property
    def sources(self) -> tuple[Source, ...]:
        """The sources of the pieces, each once."""
        return tuple(dict.fromkeys(p.source for p in self.pieces))

    def between(self, low: float, high: float) -> tuple[Array, Array]:
        """Return the nodes from ``low`` to ``high`` (K), with the values that hold inside of this interval.

        Raises:
            DataError: the curve does not cover it.
        """
        t, v = self.temperature, self.value
        if t[0] > low or t[-1] < high:
            raise DataError(
                f"{self.name} runs from {t[0]:g} K to {t[-1]:g} K, not from {low:g} K to {high:g} K"
            )
        # Of two nodes at one temperature the second holds above it, the first below it.
        first, last = np.searchsorted(t, low, "right"), np.searchsorted(t, high, "left")
        inside = slice(first, last)
        nodes = np.concatenate([[low], t[inside], [high]])
        left = (
            v[first - 1]
            if t[first - 1] == low
            else np.interp(low, t[first - 1 : first + 1], v[first - 1 : first + 1])
        )
        right = (
            v[last] if t[last] == high else np.interp(high, t[last - 1 : last + 1], v[last - 1 : last + 1])
        )
        values = np.concatenate([[left], v[inside], [right]])
        keep = np.append(np.diff(nodes) > 0, True)
        return nodes[keep], values[keep]


@dataclass(frozen=True)
class MetalData:
    """What the set knows of one metal.

    Attributes:
        name: of the metal.
        note: what it stands for.
        constants: by property name, each with value (SI), source and standing.
        curves: by property name (heat_capacity, resistivity, and these of the liquid).
        transitions: temperature (K) and latent heat (J/kg) of changes within the solid.
        gaps: what no source at hand gives.
    """

    name: str
    note: str
    constants: Mapping[str, Constant]
    curves: Mapping[str, Curve]
    transitions: tuple[tuple[Constant, Constant], ...]
    gaps: tuple[str, ...]

    def __getitem__(self, name: str) -> Constant:
        """Return a constant.

        Raises:
            MissingInput: the set does not have it.
        """
        if name in self.constants:
            return self.constants[name]
        meaning = CONSTANTS[name][1] if name in CONSTANTS else name
        raise MissingInput(
            f"the set {SET!r} has no {meaning} ({name}) of {self.name}",
            'give it in an own material: [materials."..."]',
        )

    @property
    def standing(self) -> Standing:
        """The weakest standing among everything that the specific action to melting rests on."""
        used = ("density", "melting_temperature", "latent_heat")
        return weakest(
            [
                *(self[n].standing for n in used),
                *(self.curves[n].standing for n in ("heat_capacity", "resistivity")),
            ]
        )

    def capacity(self, temperature: Any) -> Any:
        """Return the heat capacity per volume (J/(m³·K)) at a temperature (K), without latent heats.

        For cooling. Outside of the data the value at their end serves.
        """
        names = [n for n in ("heat_capacity", "liquid_heat_capacity") if n in self.curves]
        t, c = (
            np.concatenate([getattr(self.curves[n], what) for n in names])
            for what in ("temperature", "value")
        )
        return self["density"].value * np.interp(temperature, t, c)

    def metal(self) -> Metal:
        """Return the phases, per volume, for the laws.

        Where the liquid is missing the data end when all is molten; the plateau then keeps the solid's resistivity.
        """
        density, melting = self["density"].value, self["melting_temperature"].value
        solid = (self.curves["heat_capacity"], self.curves["resistivity"])
        bounds = [max(c.temperature[0] for c in solid), *(t.value for t, _ in self.transitions), melting]
        phases = [self._phase(solid, a, b) for a, b in pairwise(bounds)]
        changes: list[tuple[Literal["transition", "melting", "vaporisation"], float]] = [
            ("transition", heat.value * density) for _, heat in self.transitions
        ]
        fusion = self["latent_heat"].value * density
        if "liquid_heat_capacity" not in self.curves or "liquid_resistivity" not in self.curves:
            return Metal(tuple(phases), tuple(changes), ("melting", fusion))
        liquid = (self.curves["liquid_heat_capacity"], self.curves["liquid_resistivity"])
        phases.append(self._phase(liquid, melting, self["boiling_temperature"].value))
        changes.append(("melting", fusion))
        return Metal(
            tuple(phases), tuple(changes), ("vaporisation", self["vaporisation_heat"].value * density)
        )

    def _phase(self, curves: tuple[Curve, Curve], low: float, high: float) -> Phase:
        (t_heat, heat), (t_rho, rho) = (c.between(low, high) for c in curves)
        nodes = np.union1d(t_heat, t_rho)
        return Phase(
            nodes, self["density"].value * np.interp(nodes, t_heat, heat), np.interp(nodes, t_rho, rho)
        )


@dataclass(frozen=True)
class Coated:
    """A core with a coating, as layers in parallel; ``coating_share`` is the coating's part of the whole section."""

    name: str
    core: str
    coating: str
    coating_share: Constant


class _Reader:
    """Reads the table with its own list of publications."""

    def __init__(self, raw: Mapping[str, Any]) -> None:
        self.sources: Mapping[str, str] = raw["sources"]
        self.defaults: Mapping[str, Any] = raw["defaults"]

    def _cited(self, entry: Mapping[str, Any]) -> tuple[Source, Standing]:
        key = str(entry.get("source", self.defaults["source"]))
        if key not in self.sources:
            raise UnknownName("source", key, self.sources)
        # A locator belongs to its source: that of the defaults does not describe another publication.
        fallback = self.defaults["locator"] if key == self.defaults["source"] else ""
        cited = Source(key, str(self.sources[key]), str(entry.get("locator", fallback)))
        return cited, standing(str(entry.get("standing", self.defaults["standing"])))

    def constant(self, entry: Any, unit: str, meaning: str, molar_mass: Constant | None = None) -> Constant:
        full = dict(entry) if isinstance(entry, Mapping) else {"value": entry}
        cited, _ = self._cited(full)
        full.setdefault("standing", self.defaults["standing"])
        molar = str(full["value"]).endswith("/mol") and unit == "J/kg"
        found = constant(full, "J/mol" if molar else unit, meaning=meaning, own_source=cited)
        return replace(found, value=found.value / _mass(molar_mass, meaning), unit=unit) if molar else found

    def curve(self, name: str, entries: Sequence[Mapping[str, Any]], molar_mass: Constant | None) -> Curve:
        unit, meaning = CURVES[name]
        pieces = []
        for entry in entries:
            given = str(entry["unit"])
            if given.endswith("/(mol*K)"):
                factor = float(read(f"1 {given}", "J/(mol*K)")) / _mass(molar_mass, meaning)
            else:
                factor = float(read(f"1 {given}", unit))
            t, v = _nodes(entry)
            pieces.append(Piece(t, v * factor, *self._cited(entry)))
        found = Curve(name, unit, tuple(pieces))
        if np.any(np.diff(found.temperature) < 0) or np.any(found.value <= 0):
            raise DataError(f"the nodes of {meaning} must rise in temperature and be positive")
        return found

    def metal(self, name: str, row: Mapping[str, Any]) -> MetalData:
        mass = self.constant(row["molar_mass"], *CONSTANTS["molar_mass"]) if "molar_mass" in row else None
        constants = {
            key: self.constant(row[key], unit, f"{meaning} of {name}", mass)
            for key, (unit, meaning) in CONSTANTS.items()
            if key in row
        }
        curves = {key: self.curve(key, row[key], mass) for key in CURVES if key in row}
        transitions = tuple(
            (
                self.constant({**t, "value": t["temperature"]}, "degC", f"transition temperature of {name}"),
                self.constant({**t, "value": t["heat"]}, "J/kg", f"heat of transition of {name}", mass),
            )
            for t in row.get("transitions", ())
        )
        unknown = set(row) - set(CONSTANTS) - set(CURVES) - {"note", "gaps", "transitions"}
        if unknown:
            raise DataError(f"{name}: unknown keys {sorted(unknown)}")
        return MetalData(name, row["note"], constants, curves, transitions, tuple(row.get("gaps", ())))


def _mass(molar_mass: Constant | None, meaning: str) -> float:
    if molar_mass is None:
        raise DataError(f"{meaning}: a molar value needs molar_mass")
    return molar_mass.value


def _nodes(entry: Mapping[str, Any]) -> tuple[Array, Array]:
    """Return temperatures (K) and values (in the unit of the entry) of a piece; laws are tabulated finely."""
    if "nodes" in entry:
        t, v = np.array(entry["nodes"], dtype=float).T
        return t, v
    low, high, zero = float(entry["from"]), float(entry["to"]), 273.15 if entry["in"] == "degC" else 0.0
    if "polynomial" in entry:
        # Nodes every 10 K put the straight lines between them within 1e-4 of these smooth laws.
        t = np.linspace(low, high, int(np.ceil((high - low) / 10)) + 1)
        return t, np.polynomial.polynomial.polyval(t - zero, entry["polynomial"])
    a, b, pole = (float(x) for x in entry["pole"])
    # Nodes in equal ratios of the distance from the pole, which the law needs near it.
    t = np.geomspace(low - zero - pole, high - zero - pole, 100) + zero + pole
    t[0], t[-1] = low, high
    return t, a + b / (t - zero - pole)


@lru_cache(maxsize=1)
def _table() -> tuple[dict[str, MetalData], dict[str, Coated]]:
    raw = read_table("strikeenergy", "data", "temperature_dependent.toml")
    reader = _Reader(raw)
    known = {name: reader.metal(name, row) for name, row in raw["material"].items()}
    layered = {
        name: Coated(
            name,
            row["core"],
            row["coating"],
            reader.constant(row["coating_share"], "", f"share of the coating of {name}"),
        )
        for name, row in raw["coated"].items()
    }
    return known, layered


def metals() -> dict[str, MetalData]:
    """Return the metals of the set by name."""
    return _table()[0]


def coated() -> dict[str, Coated]:
    """Return the coated conductors of the set by name."""
    return _table()[1]


def metal_data(name: str) -> MetalData:
    """Return what the set knows of a metal.

    Raises:
        UnknownName: no such metal, with the nearest names.
    """
    if name not in metals():
        raise UnknownName("metal with temperature-dependent data", name, metals())
    return metals()[name]


@lru_cache(maxsize=64)
def heating(name: str, coating_share: float | None = None) -> Heating:
    """Return the table of T, H and G of a metal, or of a coated conductor (layer 0 is its core, layer 1 its coating).

    Args:
        name: of a metal or of a coated conductor.
        coating_share: the coating's share of the section, where it is not the usual one.

    Raises:
        UnknownName: the set has neither a metal nor a coated conductor of this name.
        InputError: the share is not between 0 and 1, or the metal has no coating.
    """
    if name not in coated():
        if name not in metals():
            raise UnknownName("metal with temperature-dependent data", name, [*metals(), *coated()])
        if coating_share is not None:
            raise InputError(f"{name} has no coating in the set {SET!r}: leave its share out")
        return heating_table(metals()[name].metal())
    layers = coated()[name]
    share = layers.coating_share.value if coating_share is None else coating_share
    if not 0 < share < 1:
        raise InputError(f"the coating's share of the section is {share:g}; it must lie between 0 and 1")
    return heating_table(
        [(1 - share, metals()[layers.core].metal()), (share, metals()[layers.coating].metal())]
    )
