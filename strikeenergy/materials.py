"""Materials: named constant sets that are never mixed silently, and the user's own.

A *set* is what one publication says of several materials ("IEC 62305-1 Annex D", "IEC 60949", "IEEE 80"). A calculation
takes all its constants of a material from one set. What a set lacks is named, never guessed.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass, field, replace
from functools import lru_cache
from importlib.resources import files
from typing import Any

from strikeenergy.errors import MissingInput, UnknownName
from strikeenergy.sources import Constant, Source, Standing
from strikeenergy.tables import constant, read_table
from strikeenergy.units import read

__all__ = ["DEFAULT_SET", "PROPERTIES", "Material", "Materials", "material_names", "sets"]

DEFAULT_SET = "IEC 62305-1 Annex D"

PROPERTIES: dict[str, tuple[str, str]] = {
    "density": ("kg/m**3", "density"),
    "heat_capacity": ("J/(kg*K)", "specific heat"),
    "volumetric_heat_capacity": ("J/(m**3*K)", "heat capacity per volume"),
    "thermal_conductivity": ("W/(m*K)", "thermal conductivity"),
    "resistivity": ("ohm*m", "resistivity at the reference temperature"),
    "temperature_coefficient": (
        "1/K",
        "temperature coefficient of the resistivity, at the reference temperature",
    ),
    "inverse_coefficient": ("K", "reciprocal of the temperature coefficient of the resistivity at 0 °C"),
    "reference_temperature": ("degC", "temperature that resistivity and coefficient refer to"),
    "melting_temperature": ("degC", "melting (or fusing) temperature"),
    "latent_heat": ("J/kg", "latent heat of melting"),
    "boiling_temperature": ("degC", "boiling temperature"),
    "vaporisation_heat": ("J/kg", "heat of vaporisation"),
    "emissivity": ("", "emissivity"),
    "expansion": ("1/K", "coefficient of linear thermal expansion"),
    "elastic_modulus": ("Pa", "modulus of elasticity"),
    "yield_strength": ("Pa", "yield strength"),
    "softening_temperature": ("degC", "softening temperature"),
}
"""Name, SI unit (``degC``: a temperature, held in kelvin) and meaning of every property a set may have."""


@dataclass(frozen=True)
class Material:
    """The constants of one material from one set.

    Attributes:
        name: as the case calls it.
        constants: name of the set.
        row: the row of the set that serves, where it is called otherwise there.
        properties: by name, each with value (SI), unit, source and standing.
        valid_to: highest temperature (K) that the set is meant for, if it says so.
        remarks: what the reader of a result must know (a layer left out, another row used).
    """

    name: str
    constants: str
    row: str
    properties: Mapping[str, Constant]
    valid_to: float | None = None
    remarks: tuple[str, ...] = ()

    def __getitem__(self, name: str) -> Constant:
        """Return a property.

        Raises:
            MissingInput: the set does not have it, or no set has the material; says what to do.
        """
        if name in self.properties:
            return self.properties[name]
        meaning = PROPERTIES[name][1]
        if not self.properties:
            others = [
                s for s, known in sets().items() if self.name in known.materials or self.name in known.rows
            ]
            other = f"choose constants = {others[0]!r}, or " if others else ""
            raise MissingInput(
                f"the set {self.constants!r} has no {self.name}",
                f'{other}give its constants in [materials."..."]',
            )
        raise MissingInput(
            f"the set {self.constants!r} has no {meaning} ({name}) of {self.row}",
            'give it in an own material: [materials."..."]',
        )

    def has(self, *names: str) -> bool:
        """Whether the set has all of these."""
        return all(name in self.properties for name in names)


@dataclass(frozen=True)
class ConstantSet:
    """What one publication says of several materials."""

    name: str
    note: str
    materials: Mapping[str, Mapping[str, Constant]]
    rows: Mapping[str, str] = field(default_factory=dict)
    """Plain name to the row that is used for it."""
    valid_to: float | None = None


def _read_set(file: str) -> ConstantSet:
    raw = read_table("strikeenergy", "data", "materials", file)
    defaults = {k: raw["defaults"][k] for k in ("source", "locator", "standing")}
    reference = constant(
        raw["defaults"]["reference_temperature"],
        "degC",
        meaning=PROPERTIES["reference_temperature"][1],
        defaults=defaults,
    )
    materials = {}
    for name, row in raw["material"].items():
        found = {
            key: constant(
                entry, PROPERTIES[key][0], meaning=f"{PROPERTIES[key][1]} of {name}", defaults=defaults
            )
            for key, entry in row.items()
        }
        materials[name] = _complete({"reference_temperature": reference, **found}, name)
    valid_to = float(read(raw["valid_to"], "degC")) if "valid_to" in raw else None
    return ConstantSet(raw["name"], raw["note"], materials, raw.get("rows", {}), valid_to)


def _complete(found: dict[str, Constant], name: str) -> dict[str, Constant]:
    """Derive what follows exactly from what is there: the coefficient of its reciprocal, γ·c of γ and c."""
    inverse = found.get("inverse_coefficient")
    if inverse is not None and "temperature_coefficient" not in found:
        # K0 is the reciprocal at 0 °C, so the coefficient at the reference temperature T is 1/(K0 + T in °C).
        celsius = found["reference_temperature"].value - 273.15
        found["temperature_coefficient"] = replace(
            inverse,
            value=1 / (inverse.value + celsius),
            unit="1/K",
            meaning=f"{PROPERTIES['temperature_coefficient'][1]} of {name}, 1/(K0 + θ)",
        )
    return found


@lru_cache(maxsize=1)
def sets() -> dict[str, ConstantSet]:
    """Return the built-in constant sets by name, the default first."""
    folder = files("strikeenergy") / "data" / "materials"
    names = sorted(f.name for f in folder.iterdir() if f.name.endswith(".toml") and f.name != "names.toml")
    found = {known.name: known for known in map(_read_set, names)}
    return {DEFAULT_SET: found.pop(DEFAULT_SET), **found}


@lru_cache(maxsize=1)
def _names() -> dict[str, dict[str, Any]]:
    return read_table("strikeenergy", "data", "materials", "names.toml")


@lru_cache(maxsize=1)
def _aliases() -> dict[str, str]:
    table = {}
    for name, entry in _names().items():
        for alias in (name, *entry.get("aliases", ())):
            table[alias.casefold()] = name
    for known in sets().values():
        for row in known.materials:
            table.setdefault(row.casefold(), row)
    return table


def material_names() -> list[str]:
    """Return every name that a case may use without bringing the material itself."""
    return list(dict.fromkeys(_aliases().values()))


@dataclass(frozen=True)
class Materials:
    """The materials that a case may use: the built-in ones and its own."""

    own: Mapping[str, Mapping[str, Constant]] = field(default_factory=dict)
    families: Mapping[str, str] = field(default_factory=dict)
    """Own material to the material whose rows of the limit tables apply to it."""

    def canonical(self, name: str) -> str:
        """Return the name that the tables use.

        Raises:
            UnknownName: no such material, with the nearest names.
        """
        if name in self.own:
            return name
        found = _aliases().get(name.strip().casefold())
        if found is None:
            raise UnknownName("material", name, [*self.own, *_names(), *_aliases()])
        return found

    def family(self, name: str) -> str | None:
        """Return the material whose rows of the limit tables apply."""
        if name in self.own:
            return self.families.get(name)
        entry = _names().get(name)
        return (
            str(entry["family"])
            if entry
            else next((p for s in sets().values() for p, r in s.rows.items() if r == name), None)
        )

    def get(self, name: str, constants: str = DEFAULT_SET) -> Material:
        """Return the constants of a material from one set (which may lack it: then its properties are empty).

        Raises:
            UnknownName: no such material or set.
        """
        if name in self.own:
            own = self.own[name]
            replaces = f"the case's own {name} takes the place of the built-in one"
            unused = f"the constants of {name} are the case's own; the set {constants!r} is not used"
            return Material(
                name,
                "own material of the case",
                name,
                own,
                remarks=(
                    *((replaces,) if name in material_names() else ()),
                    *(() if constants == DEFAULT_SET else (unused,)),
                ),
            )
        if constants not in sets():
            raise UnknownName("constant set", constants, sets())
        chosen = sets()[constants]
        entry = _names().get(name, {})
        if name in chosen.materials:
            return Material(name, constants, name, chosen.materials[name], chosen.valid_to)
        if name in chosen.rows:
            row = chosen.rows[name]
            remark = f"the row {row!r} of {constants} serves for {name}"
            return Material(name, constants, row, chosen.materials[row], chosen.valid_to, (remark,))
        stand_in = entry.get("constants_of", "")
        if stand_in in chosen.materials or stand_in in chosen.rows:
            found = self.get(stand_in, constants)
            return replace(found, name=name, remarks=(entry["remark"], *found.remarks))
        return Material(name, constants, name, {})


def own_material(name: str, entries: Mapping[str, tuple[Any, Source, Standing]]) -> dict[str, Constant]:
    """Make the constants of a user's own material; the reference temperature is 20 °C unless given.

    Args:
        name: of the material.
        entries: property to (text or value, source, standing).

    Raises:
        QuantityError: a value is not what its property needs.
    """
    found: dict[str, Constant] = {}
    for key, (value, given, stands) in entries.items():
        unit, meaning = PROPERTIES[key]
        number = read(value, unit, example=f"1 {unit}".strip())
        found[key] = Constant(
            float(number), "K" if unit == "degC" else unit, given, stands, f"{meaning} of {name}"
        )
    if "reference_temperature" not in found:
        found["reference_temperature"] = Constant(
            293.15,
            "K",
            Source("engineering", "Engineering choice of this program"),
            Standing.ASSUMED,
            PROPERTIES["reference_temperature"][1],
        )
    return _complete(found, name)


def all_property_names() -> Iterable[str]:
    """Return the names that an own material may give."""
    return PROPERTIES
