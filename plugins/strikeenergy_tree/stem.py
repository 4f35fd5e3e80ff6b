"""The stem of a tree in numbers: its layers as resistors in parallel, and the pieces that may fly off it."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np

from strikeenergy.api import Bracket, Constant, Given, Note, source
from strikeenergy.physics import trunk
from strikeenergy_tree.kind import Tree
from strikeenergy_tree.parameters import band

LAYERS = ("bark", "phloem", "sapwood", "heartwood")
RADIATA = source("radiata", "temperature dependence along the grain")
DENSITY = source("wood-handbook", "FPL-GTR-282 chapter 4, density of green wood")
MODEL = source("engineering", "layers of a trunk in parallel, with a capped field")


@dataclass(frozen=True)
class Stem:
    """What follows from the tree alone. SI; numbers or arrays."""

    radii: tuple[Any, Any, Any, Any]
    bark_thickness: Any
    areas: tuple[Any, Any, Any, Any]
    resistance: Bracket
    """Ohm per metre, over the band of the resistivities."""
    shares: tuple[Any, Any, Any, Any]
    """Fractions of the current in bark, phloem, sapwood and heartwood, before the flashover."""


def layers(tree: Tree, note: Note) -> Stem:
    """Compute the layers and their resistance, and write the working down."""
    radii = tree.radii(note)
    ends = (*radii, 0.0)
    areas = tuple(
        note.formula(f"A_{name[0]}", trunk.LAYER_AREA, "m**2", meaning=f"section of the {name}", show="cm**2", r_o=Given(ends[i], "m"), r_i=Given(ends[i + 1], "m"))
        for i, name in enumerate(LAYERS)
    )  # fmt: skip
    factor = _temperature(tree, note)
    bands = [tree.band(f"{name}_resistivity").noted(note) for name in LAYERS]

    def conductances(end: str, into: Note) -> tuple[Any, ...]:
        return tuple(
            into.formula(f"g_{name[0]}", trunk.CONDUCTANCE_OF, "S*m", meaning=f"conductance of a metre of {name}", A=Given(area, "m**2", f"section of the {name}"), rho=getattr(item, end), k=factor)
            for name, area, item in zip(LAYERS, areas, bands, strict=True)
        )  # fmt: skip

    def resistance(end: str, into: Note) -> tuple[tuple[Any, ...], Any]:
        parts = conductances(end, into)
        given: dict[str, Any] = {
            f"g_{name[0]}": Given(part, "S*m") for name, part in zip(LAYERS, parts, strict=True)
        }
        total = into.formula(
            "g", trunk.CONDUCTANCE, "S*m", meaning="conductance of a metre of trunk", **given
        )
        r = into.formula("r'", trunk.RESISTANCE, "ohm/m", meaning="resistance per metre of trunk", source=MODEL, finding="trunk_resistance_per_length", g=Given(total, "S*m"))  # fmt: skip
        return parts, r

    parts, mid = resistance("value", note)
    low, high = (resistance(end, Note(quiet=True))[1] for end in ("low", "high"))
    shares = tuple(
        note.formula(f"s_{name[0]}", trunk.SHARE, None, meaning=f"share of the current in the {name} before the flashover", g_k=Given(part, "S*m"), r=Given(mid, "ohm/m"))
        for name, part in zip(LAYERS, parts, strict=True)
    )  # fmt: skip
    return Stem(radii, radii[0] - radii[1], areas, Bracket(mid, low, high), shares)


def _temperature(tree: Tree, note: Note) -> Given:
    """Return the factor of every resistivity for the temperature of the tree."""
    lowest, highest = band("conductivity_lowest").noted(note), band("conductivity_highest")
    reference = band("resistivity_temperature").noted(note)
    start = np.asarray(tree.start)
    if np.any(start < lowest.mid):
        note.remark("the law of the resistivity ends at 0 °C: frozen wood conducts worse than this")
    if np.any(start > highest.mid):
        note.remark("the law of the resistivity ends at 90 °C: hotter wood is taken at that temperature")
    k = note.formula(
        "k",
        trunk.TEMPERATURE_FACTOR,
        None,
        meaning="resistivity at this temperature over that at 20 °C",
        source=RADIATA,
        alpha=band("conductivity_coefficient").value,
        T=Given(tree.start, "K", "temperature before the stroke"),
        T_r=reference.value,
        T_m=band("conductivity_reference").value,
        T_lo=lowest.value,
        T_hi=highest.value,
    )
    return Given(k, None, "temperature factor")


@dataclass(frozen=True)
class Pieces:
    """What may be torn off or thrown: mass (kg/m) and fracture area (m²/m) of each, and their onset energies."""

    strip_mass: Given
    strip_area: Given
    bark: Any
    """Mechanical energy per metre (J/m) that tears a bark strip off."""
    slab: Any
    """... that throws a slab of wood."""
    split: Any
    """... that splits the trunk from side to side."""
    trunk: Any
    """... that throws the whole trunk apart."""


def pieces(tree: Tree, stem: Stem, note: Note) -> Pieces:
    """Compute masses, fracture areas and the energies from which each piece goes, and write the working down.

    Strip and slab are no wider and no deeper than the stem allows.
    """
    over, under, _, _ = stem.radii
    rho_b = tree.band("bark_density").noted(note).value
    rho_s = _green(tree, "sap", note)
    t_b, g = Given(stem.bark_thickness, "m", "bark thickness"), tree.band("fracture_energy").noted(note).value
    r, r1 = Given(over, "m", "radius over bark"), Given(under, "m", "radius under bark")

    b = Given(note.formula("b", "minimum(b_0, pi*r)", "m", meaning="width of a bark strip", show="mm", b_0=band("strip_width").noted(note).value, r=r), "m")  # fmt: skip
    m_b = Given(note.formula("m_b", trunk.STRIP_MASS, "kg/m", meaning="mass of a bark strip", rho_b=rho_b, t_b=t_b, b=b), "kg/m")  # fmt: skip
    a_b = Given(
        note.formula("A'_b", "b + 2*t_b", "m", meaning="fracture area of a bark strip", b=b, t_b=t_b), "m"
    )
    bark = note.formula("u_b", trunk.EJECTION_ENERGY, "J/m", meaning="mechanical energy that tears it off", G=g, A=a_b, m=m_b, v=Given(0.0, "m/s"))  # fmt: skip

    width = Given(note.formula("b_s", "minimum(b_0, 2*r_1)", "m", meaning="width of a slab of wood", show="mm", b_0=band("slab_width").noted(note).value, r_1=r1), "m")  # fmt: skip
    depth = Given(note.formula("d", "minimum(d_0, r_1)", "m", meaning="depth of a slab of wood", show="mm", d_0=band("slab_depth").noted(note).value, r_1=r1), "m")  # fmt: skip
    m_s = note.formula("m_s", trunk.SLAB_MASS, "kg/m", meaning="mass of a slab with its bark", rho_s=rho_s, d=depth, rho_b=rho_b, t_b=t_b, b=width)  # fmt: skip
    a_s = note.formula("A'_s", "b + 2*d", "m", meaning="fracture area of a slab", b=width, d=depth)
    slab = note.formula("u_s", trunk.EJECTION_ENERGY, "J/m", meaning="mechanical energy that throws a slab", G=g, A=Given(a_s, "m"), m=Given(m_s, "kg/m"), v=band("slab_speed").noted(note).value)  # fmt: skip

    a_c = note.formula("A'_c", "f*r", "m", meaning="fracture area of a split", f=band("split_fracture").noted(note).value, r=r)  # fmt: skip
    split = note.formula(
        "u_c", "G*A", "J/m", meaning="mechanical energy that splits the trunk", G=g, A=Given(a_c, "m")
    )

    rho_h = _green(tree, "heart", note)
    named: dict[str, Any] = {
        f"A_{name[0]}": Given(area, "m**2") for name, area in zip(LAYERS, stem.areas, strict=True)
    }
    m_t = note.formula("m_t", trunk.TRUNK_MASS, "kg/m", meaning="mass of the trunk", rho_b=rho_b, rho_s=rho_s, rho_h=rho_h, **named)  # fmt: skip
    a_t = note.formula("A'_t", "f*r", "m", meaning="fracture area of a bursting trunk", f=band("trunk_fracture").noted(note).value, r=r)  # fmt: skip
    whole = note.formula("u_t", trunk.EJECTION_ENERGY, "J/m", meaning="mechanical energy that throws the trunk apart", G=g, A=Given(a_t, "m"), m=Given(m_t, "kg/m"), v=band("explosion_speed").noted(note).value)  # fmt: skip
    return Pieces(m_b, a_b, bark, slab, split, whole)


def _green(tree: Tree, part: str, note: Note) -> Given:
    """Return the density of green sapwood (``sap``) or heartwood (``heart``)."""
    gravity: Constant | Given = tree.of_species("gravity_green", "gravity", note)
    moisture = tree.of_species(f"moisture_{part}", f"moisture_{part}", note)
    meaning = f"density of green {part}wood"
    density = note.formula(f"ρ_{part[0]}", trunk.GREEN_DENSITY, "kg/m**3", meaning=meaning, source=DENSITY, rho_w=band("water_density").value, G_b=gravity, M=moisture)  # fmt: skip
    return Given(density, "kg/m**3", meaning)
