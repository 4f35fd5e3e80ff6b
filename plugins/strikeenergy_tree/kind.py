"""The tree: what may be said of it."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from typing import Annotated, Any, ClassVar, Literal

import numpy as np
from pydantic import Field

from strikeenergy.api import Constant, Given, Note, Part, Problem, Quantity, StruckObject, Unit
from strikeenergy.physics import trunk
from strikeenergy_tree.parameters import (
    Band,
    Species,
    band,
    find_species,
    nearest_species,
    own_band,
    species_names,
)

__all__ = ["Assume", "Tree"]

Wood = Literal["conifer", "hardwood"]


def _name_species(schema: dict[str, Any]) -> None:
    """List the species in the schema, when it is asked for."""
    schema |= {"examples": ["white oak"], "x-names": species_names()}


class Assume(Part):
    """Own values in place of the assumed parameters of the model. A value given here has no band."""

    bark_resistivity: (
        Annotated[Quantity, Unit("ohm*m", gt=0, typical=(1e2, 1e6), example="1e5 ohm*m")] | None
    ) = None
    """Resistivity of the outer bark."""
    phloem_resistivity: (
        Annotated[Quantity, Unit("ohm*m", gt=0, typical=(10, 50), example="25 ohm*m")] | None
    ) = None
    """Resistivity of phloem and cambium along the grain."""
    sapwood_resistivity: (
        Annotated[Quantity, Unit("ohm*m", gt=0, typical=(50, 400), example="150 ohm*m")] | None
    ) = None
    """Resistivity of the sapwood along the grain, at 20 degC."""
    heartwood_resistivity: (
        Annotated[Quantity, Unit("ohm*m", gt=0, typical=(100, 5000), example="500 ohm*m")] | None
    ) = None
    """Resistivity of the heartwood along the grain, at 20 degC."""
    field_surface: (
        Annotated[Quantity, Unit("kV/m", gt=0, le=3000, typical=(100, 500), example="450 kV/m")] | None
    ) = None
    """Breakdown field along the bark."""
    field_inside: (
        Annotated[Quantity, Unit("kV/m", gt=0, le=3000, typical=(100, 500), example="350 kV/m")] | None
    ) = None
    """Breakdown field inside the trunk."""
    deep_share: Annotated[Quantity, Unit("", ge=0, le=1, typical=(0.05, 0.5), example="0.1")] | None = None
    """Share of the internal arcs that run deep in the wood; the rest run under the bark."""
    channel_field_under_bark: (
        Annotated[Quantity, Unit("kV/m", gt=0, typical=(2, 15), example="5 kV/m")] | None
    ) = None
    """Field of the channel under the bark."""
    channel_field_deep: Annotated[Quantity, Unit("kV/m", gt=0, typical=(5, 50), example="15 kV/m")] | None = (
        None
    )
    """Field of the channel deep in the wood."""
    channel_resistance_under_bark: Annotated[Quantity, Unit("ohm/m", ge=0, typical=(0.03, 0.3), example="0.1 ohm/m")] | None = None  # fmt: skip
    """Resistance of the channel under the bark."""
    channel_resistance_deep: (
        Annotated[Quantity, Unit("ohm/m", ge=0, typical=(0.1, 1), example="0.3 ohm/m")] | None
    ) = None
    """Resistance of the channel deep in the wood."""
    mechanical_yield: (
        Annotated[Quantity, Unit("", ge=0, le=0.15, typical=(0.005, 0.05), example="0.02")] | None
    ) = None
    """Share of the channel energy that becomes mechanical. More than 15 % is more than flashing steam can give."""
    fracture_energy: (
        Annotated[Quantity, Unit("J/m**2", gt=0, typical=(100, 600), example="300 J/m**2")] | None
    ) = None
    """Energy to tear wood and bark, per area."""
    bark_density: (
        Annotated[Quantity, Unit("kg/m**3", gt=0, typical=(300, 700), example="450 kg/m**3")] | None
    ) = None
    """Density of the bark."""


class Tree(StruckObject):
    """A living tree that the stroke hits: its trunk, with bark, phloem, sapwood and heartwood."""

    kind: Literal["tree"] = "tree"
    species: Annotated[str, Field(json_schema_extra=_name_species)] | None = None
    """Species, such as "white oak". Gives wood, bark thickness, density and moisture. Else say which wood."""
    wood: Wood | None = None
    """Conifer or hardwood, where the species is not known or not in the table."""
    diameter: Annotated[Quantity, Unit("m", gt=0, le=20, typical=(0.3, 1.5), example="0.6 m")]
    """Diameter over bark at breast height."""
    height: Annotated[Quantity, Unit("m", gt=0, le=150, typical=(5, 50), example="20 m")] | None = None
    """Height of the tree."""
    bark: Literal["dry", "wet"] = "dry"
    """Dry, or soaked by rain."""
    bark_thickness: Annotated[Quantity, Unit("mm", gt=0, typical=(5, 40), example="25 mm")] | None = None
    """Thickness of the outer bark, one side, in place of the value that follows from species and diameter."""
    phloem_thickness: Annotated[Quantity, Unit("mm", gt=0, typical=(2, 8), example="4 mm")] | None = None
    """Thickness of phloem and cambium together."""
    sapwood_thickness: Annotated[Quantity, Unit("mm", gt=0, typical=(15, 60), example="40 mm")] | None = None
    """Thickness of the sapwood, one side."""
    condition: Literal["sound", "crack", "rot", "old scar"] = "sound"
    """What weakens the trunk: nothing, a crack, a rotten core, or the scar of an earlier stroke."""
    assume: Assume | None = None
    """Own values in place of the assumed parameters of the model: [object.assume]."""

    summary: ClassVar[str] = "a living tree: whether and where the trunk takes damage"
    example_fields: ClassVar[Mapping[str, Any]] = {
        "species": "white oak",
        "diameter": "0.5 m",
        "height": "20 m",
        "bark": "dry",
        "condition": "sound",
    }

    @classmethod
    def missing_or_extra(cls, given: Iterable[str]) -> Iterable[Problem]:
        """Hold: the wood is known one way or the other."""
        if not {"species", "wood"} & set(given):
            yield Problem(
                "the wood is not known", "give a species, or wood = 'conifer' or 'hardwood'", ("species",)
            )

    def check(self) -> Iterable[Problem]:
        """Hold the species against the table, and the layers against the diameter."""
        if self.species is not None and self.row is None:
            near = nearest_species(self.species)
            names = " or ".join(repr(name) for name in near)
            write = f"did you mean {names}?" if near else "take a species of the table, or say wood = 'conifer' or 'hardwood' instead"  # fmt: skip
            yield Problem(f"unknown species {self.species!r}", write, ("species",))
            return
        if self.row is not None and self.wood is not None and self.wood != self.row.wood:
            yield Problem(f"{self.row.name} is a {self.row.wood}, not a {self.wood}", "leave wood out, the species says it", ("wood",))  # fmt: skip
        if self.row is None and self.wood is None:
            return
        _, under, cambium, _ = self.radii(Note(quiet=True))
        if np.any(np.asarray(under) <= 0):
            yield Problem(
                "the diameter is not more than twice the bark",
                "give the diameter over bark, and the bark thickness of one side",
                ("bark_thickness" if self.bark_thickness is not None else "diameter",),
            )
            return
        if np.any(np.asarray(cambium) <= 0):
            yield Problem(
                "the diameter is not more than twice the bark and phloem together: no wood is left",
                "give a larger diameter, or the thicknesses of bark and phloem of one side",
                ("phloem_thickness" if self.phloem_thickness is not None else "diameter",),
            )
            return
        if self.sapwood_thickness is not None and np.any(
            np.asarray(self.sapwood_thickness) > cambium * (1 + 1e-12)
        ):
            yield Problem("the sapwood is thicker than the wood has radius", "give the sapwood of one side", ("sapwood_thickness",))  # fmt: skip

    @property
    def is_array(self) -> bool:
        """Whether a field, or an own value of the model, is an array."""
        return super().is_array or (self.assume is not None and any(np.ndim(value) > 0 for _, value in self.assume if value is not None))  # fmt: skip

    @property
    def row(self) -> Species | None:
        """The row of the species table, if the species is known."""
        return find_species(self.species) if self.species is not None else None

    @property
    def timber(self) -> str:
        """``conifer`` or ``hardwood``."""
        row = self.row
        return row.wood if row is not None else str(self.wood)

    def band(self, role: str) -> Band:
        """Return the parameter that serves this tree in a role: the user's own value, or that of the table."""
        suffix = {
            "bark_resistivity": self.bark,
            "sapwood_resistivity": self.timber,
            "heartwood_resistivity": "rot" if self.condition == "rot" else self.timber,
            "phloem_thickness": self.timber,
            "sapwood_thickness": self.timber,
            "gravity": self.timber,
            "moisture_sap": self.timber,
            "moisture_heart": self.timber,
            "field_surface": self.bark,
            "field_inside": "sound" if self.condition == "sound" else "defect",
            "deep_share": self._deep,
            "bark_density": self.timber,
        }.get(role)
        found = band(f"{role}_{suffix}" if suffix else role)
        own = getattr(self.assume, role, None)
        return found if own is None else own_band(own, found)

    @property
    def _deep(self) -> str:
        if self.condition != "sound":
            return "defect"
        row = self.row
        heart, sap = (row.get("moisture_heart"), row.get("moisture_sap")) if row is not None else (None, None)
        return "wet_heart" if heart is not None and sap is not None and heart.value > sap.value else "sound"

    def of_species(self, column: str, role: str, note: Note) -> Constant | Given:
        """Return a value of the species table, or where it has none the one assumed for the wood."""
        row = self.row
        value = row.get(column) if row is not None else None
        return value if value is not None else self.band(role).noted(note).value

    def write_bark(self, note: Note) -> Given:
        """Return the bark thickness (m) and write down how it follows."""
        meaning = "bark thickness, one side"
        if self.bark_thickness is not None:
            return Given(self.bark_thickness, "m", meaning)
        row = self.row
        intercept = row.get("bark_intercept") if row is not None else None
        k_b = self.of_species("bark_factor", "bark_factor", note)
        d = Given(self.diameter, "m", "diameter over bark")
        if intercept is None:
            thickness = note.formula("t_b", "k_b*D", "m", meaning=meaning, show="mm", k_b=k_b, D=d)
        else:
            thickness = note.formula("t_b", trunk.BARK_THICKNESS, "m", meaning=meaning, show="mm", t_0=intercept, k_b=k_b, D=d)  # fmt: skip
        return Given(thickness, "m", meaning)

    def radii(self, note: Note) -> tuple[Any, Any, Any, Any]:
        """Return the radii (m) over bark, under bark, of the cambium and of the heartwood; write down how they follow."""
        t_b = self.write_bark(note)
        over: Any = np.asarray(self.diameter) / 2 if np.ndim(self.diameter) else self.diameter / 2
        phloem = self._thickness("phloem_thickness", self.phloem_thickness, note)
        sapwood = self._thickness("sapwood_thickness", self.sapwood_thickness, note)
        r0 = Given(over, "m", "radius over bark")
        under = note.formula("r_1", "r_0 - t_b", "m", meaning="radius under bark", show="mm", r_0=r0, t_b=t_b)
        r1 = Given(under, "m", "radius under bark")
        cambium = note.formula(
            "r_2", "r_1 - t_p", "m", meaning="radius of the cambium", show="mm", r_1=r1, t_p=phloem
        )
        r2 = Given(cambium, "m", "radius of the cambium")
        heart = note.formula("r_3", "maximum(r_2 - t_s, 0)", "m", meaning="radius of the heartwood", show="mm", r_2=r2, t_s=sapwood)  # fmt: skip
        if self.sapwood_thickness is None and np.any(np.asarray(heart) == 0):
            note.remark("the stem is so slender that all its wood is taken as sapwood")
        return over, under, cambium, heart

    def _thickness(self, role: str, own: Any, note: Note) -> Constant | Given:
        if own is not None:
            return Given(own, "m", role.replace("_", " "))
        return self.band(role).noted(note).value
