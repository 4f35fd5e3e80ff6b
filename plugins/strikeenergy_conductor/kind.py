"""The conductor: what may be said of it."""

from __future__ import annotations

import math
from collections.abc import Iterable, Mapping
from typing import Annotated, Any, ClassVar, Literal

import numpy as np

from strikeenergy.api import (
    Given,
    Note,
    OfMaterial,
    Part,
    Problem,
    Quantity,
    QuantityError,
    Unit,
    awg_number,
)

Form = Literal["solid round", "solid tape", "stranded", "rod", "pipe"]

_SIZES = (
    ("section",),
    ("diameter",),
    ("width", "thickness"),
    ("outer_diameter", "wall"),
    ("awg",),
    ("kcmil",),
)


class Neighbour(Part):
    """A parallel conductor nearby that carries part of the flash current as well."""

    spacing: Annotated[Quantity, Unit("m", gt=0, typical=(0.05, 2), example="0.1 m")]
    """Distance between the axes."""
    length: Annotated[Quantity, Unit("m", gt=0, typical=(0.5, 20), example="5 m")] | None = None
    """Length over which the two run side by side; without it the force is per metre of an infinite pair."""
    share: Annotated[Quantity, Unit("", gt=0, le=1, typical=(0.1, 1), example="0.5")] | None = None
    """Fraction of the flash current in the neighbour; by default that of the conductor itself."""
    direction: Literal["same", "opposite"] = "same"
    """Whether its current runs the same way (attraction) or the opposite way (repulsion)."""


class Bend(Part):
    """A right-angle bend of the conductor."""

    leg: Annotated[Quantity, Unit("m", gt=0, typical=(0.2, 20), example="0.5 m")]
    """Length of the other leg, whose field acts on this one."""
    span: Annotated[Quantity, Unit("m", gt=0, typical=(0.2, 5), example="0.5 m")]
    """Length of the leg on which the force is wanted, counted from the corner."""


class Conductor(OfMaterial):
    """A wire, tape, rod or tube that carries the stroke current along its length."""

    kind: Literal["conductor"] = "conductor"
    form: Form | None = None
    """Solid round, solid tape, stranded, rod or pipe. Selects the row of the limit tables."""
    section: (
        Annotated[Quantity, Unit("mm**2", gt=0, typical=(4, 200), example="50 mm**2", wire=True)] | None
    ) = None
    """Metal cross-section. Also "6 AWG" or "250 kcmil"."""
    diameter: Annotated[Quantity, Unit("mm", gt=0, typical=(2, 16), example="8 mm")] | None = None
    """Diameter of a round conductor, instead of the section."""
    width: Annotated[Quantity, Unit("mm", gt=0, typical=(10, 60), example="20 mm")] | None = None
    """Width of a tape, together with its thickness."""
    thickness: Annotated[Quantity, Unit("mm", gt=0, typical=(1.5, 10), example="2.5 mm")] | None = None
    """Thickness of a tape, together with its width."""
    outer_diameter: Annotated[Quantity, Unit("mm", gt=0, typical=(10, 100), example="18 mm")] | None = None
    """Outer diameter of a pipe, together with its wall."""
    wall: Annotated[Quantity, Unit("mm", gt=0, typical=(0.5, 4), example="1 mm")] | None = None
    """Wall thickness of a pipe, together with its outer diameter."""
    awg: str | int | None = None
    """American wire gauge of a solid wire (ASTM B258), such as 6 or "2/0", instead of the section."""
    kcmil: Annotated[Quantity, Unit("", gt=0, le=10000, typical=(16, 500), example="250")] | None = None
    """Section in thousands of circular mils, instead of the section."""
    length: Annotated[Quantity, Unit("m", gt=0, typical=(0.5, 50), example="12 m")] | None = None
    """Length, for resistance and energy."""
    mechanical: Literal["essential", "not essential"] | None = None
    """Whether mechanical strength (wind, snow, handling) is essential where it is used."""
    touching: Literal["nothing", "masonry", "concrete", "flammable material"] | None = None
    """What it touches or is embedded in."""
    neighbour: tuple[Neighbour, ...] = ()
    """Parallel conductors nearby: [[object.neighbour]] entries."""
    bend: Bend | None = None
    """A right-angle bend: [object.bend]."""

    summary: ClassVar[str] = "a wire, tape, rod or tube that carries the current along its length"
    uses: ClassVar[Mapping[str, str]] = {
        "air termination": "air-termination conductor or mesh",
        "air-termination rod": "air-termination rod",
        "down conductor": "down conductor",
        "earth lead-in rod": "rod that leads into the earth",
        "earth electrode": "earth electrode (rod, conductor, pipe)",
        "bonding conductor between bars": "joins bonding bars, or a bar and the earth-termination system",
        "bonding conductor of installations": "joins an internal metal installation to a bonding bar",
        "bonding conductor": "bonding, not said which of the two",
    }
    example_fields: ClassVar[Mapping[str, Any]] = {
        "use": "down conductor",
        "material": "copper",
        "section": "50 mm**2",
        "form": "solid round",
        "length": "12 m",
    }

    @classmethod
    def missing_or_extra(cls, given: Iterable[str]) -> Iterable[Problem]:
        """Hold: exactly one way of giving the size."""
        given = set(given)
        whole = [group for group in _SIZES if given.issuperset(group)]
        halves = [group for group in _SIZES if len(group) == 2 and len(given.intersection(group)) == 1]
        for group in halves:
            lacks = next(name for name in group if name not in given)
            yield Problem(f"{' and '.join(group)} belong together", f"give {lacks} as well", (lacks,))
        if len(whole) > 1:
            named = " and ".join("+".join(group) for group in whole)
            yield Problem(f"the size is given more than once ({named})", "give it once", (whole[1][0],))
        if not whole and not halves:
            yield Problem(
                "the size is missing",
                "give section, diameter, width and thickness, outer_diameter and wall, awg, or kcmil, "
                "such as section = '50 mm**2'",
                ("section",),
            )

    def check(self) -> Iterable[Problem]:
        """Hold the sizes against one another and the form."""
        if self.awg is not None:
            try:
                awg_number(self.awg)
            except QuantityError as error:
                yield Problem(error.what, error.write, ("awg",))
                return
        if (
            self.outer_diameter is not None
            and self.wall is not None
            and np.any(2 * np.asarray(self.wall) > self.outer_diameter)
        ):
            yield Problem(
                "the wall is thicker than the radius", "give a wall below half the outer diameter", ("wall",)
            )
            return
        fits = {
            "diameter": ("solid round", "rod"),
            "width": ("solid tape",),
            "outer_diameter": ("pipe",),
            "awg": ("solid round", "stranded"),
            "kcmil": ("solid round", "stranded"),
        }
        for name, forms in fits.items():
            if getattr(self, name) is not None and self.form is not None and self.form not in forms:
                hint = f"write one of {', '.join(forms)}"
                if name == "diameter" and self.form == "stranded":
                    hint = "give the metal section: a strand bundle holds less metal than its diameter"
                yield Problem(f"{name} does not go with form {self.form!r}", hint, ("form",))
                return
        radius = self.radius
        for number, other in enumerate(self.neighbour):
            if radius is not None and np.any(np.asarray(other.spacing) <= radius):
                yield Problem(
                    "the neighbour's axis lies inside the conductor",
                    "give the distance between the axes",
                    ("neighbour", number, "spacing"),
                )
        if self.bend is not None and radius is not None and np.any(np.asarray(self.bend.span) <= radius):
            yield Problem(
                "the span is not longer than the radius", "give the length of the leg", ("bend", "span")
            )

    @property
    def area(self) -> Quantity:
        """Metal cross-section (m²)."""
        return self.write_area(Note(quiet=True))

    def write_area(self, note: Note) -> Quantity:
        """Return the section (m²) and write down how it follows from what was given."""
        meaning = "metal cross-section"
        area: Quantity
        if self.section is not None:
            return self.section
        if self.diameter is not None:
            d = Given(self.diameter, "m", "diameter")
            area = note.formula("q", "pi/4*d**2", "m**2", meaning=meaning, show="mm**2", d=d)
        elif self.width is not None:
            b, h = Given(self.width, "m", "width"), Given(self.thickness, "m", "thickness")
            area = note.formula("q", "b*h", "m**2", meaning=meaning, show="mm**2", b=b, h=h)
        elif self.outer_diameter is not None:
            d, t = Given(self.outer_diameter, "m", "outer diameter"), Given(self.wall, "m", "wall thickness")
            area = note.formula("q", "pi*t*(d - t)", "m**2", meaning=meaning, show="mm**2", d=d, t=t)
        elif self.awg is not None:
            n = Given(awg_number(self.awg), None, "gauge number (ASTM B258; 1/0 is 0, 2/0 is -1, ...)")
            d = Given(
                note.formula(
                    "d", "0.127e-3*92**((36 - n)/39)", "m", meaning="diameter of the gauge", show="mm", n=n
                ),
                "m",
            )
            area = note.formula("q", "pi/4*d**2", "m**2", meaning=meaning, show="mm**2", d=d)
        else:
            size = Given(self.kcmil, None, "thousands of circular mils")
            area = note.formula(
                "q", "kcmil*1000*pi/4*25.4e-6**2", "m**2", meaning=meaning, show="mm**2", kcmil=size
            )
        return area

    @property
    def radius(self) -> Quantity | None:
        """Outer radius (m) of a round conductor or pipe (that of the metal section where only that is known)."""
        if self.outer_diameter is not None:
            return self.outer_diameter / 2
        if self.diameter is not None:
            return self.diameter / 2
        if self.facet("form") in ("solid tape", "pipe"):
            return None
        return np.sqrt(np.asarray(self.area) / math.pi)

    def sizes(self) -> Mapping[str, Quantity]:
        """Return the sizes that limit tables may ask for."""
        found: dict[str, Quantity] = {"section": self.area}
        if self.diameter is not None:
            found["diameter"] = self.diameter
        elif self.outer_diameter is not None:
            found["diameter"] = self.outer_diameter
        elif self.facet("form") in ("solid round", "rod", None):
            found["diameter"] = 2 * np.sqrt(np.asarray(self.area) / math.pi)
        if self.thickness is not None:
            found["thickness"] = self.thickness
        return found

    def facet(self, name: str) -> Any:
        """Return what tables select by: the form follows from the use, or from how the size is given.

        ``forms`` are those that are possible where the form is not known.
        """
        if name == "forms":
            return self._possible_forms()
        if name != "form":
            return super().facet(name)
        if self.use in ("air-termination rod", "earth lead-in rod") and self.form in (None, "solid round"):
            return "rod"
        if self.use == "down conductor" and self.form == "rod":
            return "solid round"
        if self.form is not None:
            return self.form
        possible = self._possible_forms()
        return possible[0] if len(possible) == 1 else None

    def _possible_forms(self) -> tuple[str, ...]:
        if self.width is not None:
            return ("solid tape",)
        if self.outer_diameter is not None:
            return ("pipe",)
        if self.diameter is not None:
            return ("solid round", "rod") if self.use in (None, "earth electrode") else ("solid round",)
        if self.awg is not None or self.kcmil is not None:
            return ("solid round", "stranded")
        return ("solid round", "solid tape", "stranded", "rod", "pipe")
