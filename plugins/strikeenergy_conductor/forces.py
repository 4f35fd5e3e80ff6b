"""Magnetic forces on a conductor: parallel neighbours, a right-angle bend, the pinch."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Annotated, Any

import numpy as np

from strikeenergy.api import (
    Bracket,
    Finding,
    Findings,
    Flash,
    Given,
    MissingInput,
    Note,
    Value,
    effect,
    source,
)
from strikeenergy.physics import magnetics
from strikeenergy_conductor.kind import Conductor, Neighbour

ANNEX_D = source("iec62305-1:2010", "Annex D.4.2")
FIELDS = source("jackson", "section 5, Biot-Savart law and forces between currents")
PINCH = source("knoepfel", "magnetic pressure of a cylindrical conductor")


@dataclass(frozen=True)
class Forces(Findings):
    """Peak forces, and their impulses over the flash."""

    pinch_pressure: Annotated[
        Value, Finding("Pa", "magnetic pressure at the peak current: surface to axis", "MPa")
    ]
    force_per_length: Annotated[
        Value, Finding("N/m", "peak force per length from parallel neighbours", "kN/m")
    ]
    force_impulse_per_length: Annotated[
        Value, Finding("N*s/m", "impulse per length from parallel neighbours")
    ]
    neighbour_force: Annotated[Value, Finding("N", "peak force from neighbours of known length")]
    neighbour_force_impulse: Annotated[Value, Finding("N*s", "impulse from neighbours of known length")]
    force_sense: Annotated[Value, Finding(None, "attraction or repulsion between the neighbours")]
    bend_force: Annotated[Value, Finding("N", "peak force on the leg of a right-angle bend")]
    bend_force_impulse: Annotated[Value, Finding("N*s", "impulse on the leg of a right-angle bend")]


@effect(
    Conductor,
    sources=[ANNEX_D, FIELDS, PINCH],
    rises_with=["flash.peak"],
    validity=["straight, rigid, fixed conductors; no steel nearby"],
    leaves_out=[
        "the motion of the conductor: a flexible span answers to the impulse, not to the peak force",
        "the strength of fixings, clamps and the conductor itself",
        "steel and other metal nearby",
    ],
)
def forces(conductor: Conductor, flash: Flash, note: Note) -> Forces:
    """Forces between parallel conductors, on a right-angle bend, and the pinch pressure."""
    peak, energy = _inputs(flash, note)
    pinch = _pinch(conductor, note, peak)
    side = [
        _neighbour(conductor, other, number, flash, note)
        for number, other in enumerate(conductor.neighbour, 1)
    ]
    bend, bend_impulse = _bend(conductor, note, peak, energy)
    if not side:
        for name in (
            "force_per_length",
            "force_impulse_per_length",
            "neighbour_force",
            "neighbour_force_impulse",
            "force_sense",
        ):
            note.unknown(name, "no [[object.neighbour]] is given")
    if len(side) > 1:
        note.remark(
            f"the forces of {len(side)} neighbours are added as if all pulled the same way: an upper bound"
        )
    for other in conductor.neighbour:
        together = conductor.share + (other.share if other.share is not None else conductor.share)
        if other.direction == "same" and np.any(np.asarray(together) > 1 + 1e-9):
            note.remark(
                "conductor and neighbour together are given more than the whole flash current: an upper bound"
            )
    if any(other.length is None for other in conductor.neighbour):
        for name in ("neighbour_force", "neighbour_force_impulse"):
            note.unknown(name, "give every neighbour a length")
    if conductor.neighbour and conductor.facet("form") == "solid tape":
        note.remark(
            "tapes are taken as line currents: for tapes face to face at small spacing the force is less"
        )
    radius = conductor.radius
    if radius is not None and any(np.any(np.asarray(o.spacing) < 2 * radius) for o in conductor.neighbour):
        note.remark(
            "a neighbour is nearer than one diameter: the currents crowd together or apart, which is left out"
        )
    senses = {other.direction for other in conductor.neighbour}
    return Forces(
        pinch_pressure=pinch,
        force_per_length=_total(side, 0),
        force_impulse_per_length=_total(side, 1),
        neighbour_force=_total(side, 2),
        neighbour_force_impulse=_total(side, 3),
        force_sense=(
            {"same": "attraction", "opposite": "repulsion"}[senses.pop()] if len(senses) == 1 else "both"
        )
        if side
        else None,
        bend_force=bend,
        bend_force_impulse=bend_impulse,
    )


def _inputs(flash: Flash, note: Note) -> tuple[Given | None, Given | None]:
    """Return peak current and specific energy in the conductor, each None where it is not known (but not both)."""
    found: list[Given | None] = []
    why = []
    for name, unit, meaning, needing in (
        (
            "peak",
            "A",
            "peak current in the conductor",
            ("pinch_pressure", "force_per_length", "neighbour_force", "bend_force"),
        ),
        (
            "specific_energy",
            "J/ohm",
            "specific energy in the conductor",
            ("force_impulse_per_length", "neighbour_force_impulse", "bend_force_impulse"),
        ),
    ):
        try:
            found.append(Given(getattr(flash, name), unit, meaning, flash.standing))
        except MissingInput as error:
            found.append(None)
            why.append(error)
            for finding in needing:
                note.unknown(finding, str(error))
    if not any(found):
        raise why[0]
    return found[0], found[1]


def _pinch(conductor: Conductor, note: Note, peak: Given | None) -> Value:
    radius = conductor.radius
    if radius is None:
        note.unknown("pinch_pressure", "the closed form is for round conductors and pipes")
        return None
    if peak is None:
        return None
    i2 = Given(peak.value**2, "A**2", "peak current squared")
    r = Given(radius, "m", "outer radius")
    surface = note.formula(
        "p_s",
        magnetics.PINCH_SURFACE,
        "Pa",
        meaning="pinch pressure, current at the surface",
        source=PINCH,
        finding="pinch_pressure",
        show="MPa",
        i2=i2,
        r=r,
    )
    if conductor.facet("form") == "pipe":
        return surface  # type: ignore[no-any-return]
    axis = note.formula(
        "p_a",
        magnetics.PINCH_AXIS,
        "Pa",
        meaning="pinch pressure on the axis, current spread evenly",
        source=PINCH,
        finding="pinch_pressure",
        show="MPa",
        i2=i2,
        r=r,
    )
    return Bracket(axis, surface, axis)


def _neighbour(
    conductor: Conductor, other: Neighbour, number: int, flash: Flash, note: Note
) -> tuple[Any, Any, Any, Any]:
    """Return force per length, impulse per length, force, impulse of one neighbour."""
    whole = flash.whole or flash
    shares = (
        Given(conductor.share, None, "share of the conductor"),
        Given(other.share if other.share is not None else conductor.share, None, "share of the neighbour"),
    )
    d = Given(other.spacing, "m", "spacing")
    out: list[Any] = []
    for quantity, unit, per_length, total, made in (
        ("peak", "A**2", "N/m", "N", "force"),
        ("specific_energy", "A**2*s", "N*s/m", "N*s", "impulse"),
    ):
        try:
            value = getattr(whole, quantity)
        except MissingInput:
            out += [None, None]
            continue
        squared = value**2 if quantity == "peak" else value
        symbol = "i²" if quantity == "peak" else "∫i²dt"
        meaning = (
            "peak current of the flash squared" if quantity == "peak" else "specific energy of the flash"
        )
        product = note.formula(
            "i1·i2" if quantity == "peak" else "∫i1·i2·dt",
            "k1*k2*i2",
            unit,
            meaning=f"product of the currents, neighbour {number}",
            k1=shares[0],
            k2=shares[1],
            i2=Given(squared, unit, meaning, symbol=symbol),
        )
        i2 = Given(
            product, unit, "product of the currents", symbol="i1·i2" if quantity == "peak" else "∫i1·i2·dt"
        )
        name = "force_per_length" if made == "force" else "force_impulse_per_length"
        infinite = note.formula(
            "F'" if made == "force" else "J'",
            magnetics.PARALLEL_PER_LENGTH,
            per_length,
            meaning=f"{made} per length, infinite pair",
            source=ANNEX_D,
            finding=name,
            i2=i2,
            d=d,
        )
        if other.length is None:
            out += [infinite, None]
            continue
        length = Given(other.length, "m", "length side by side")
        finite = note.formula(
            "F" if made == "force" else "J",
            magnetics.PARALLEL_FINITE,
            total,
            meaning=f"{made} over the finite length",
            source=FIELDS,
            finding=(name, "neighbour_force" if made == "force" else "neighbour_force_impulse"),
            i2=i2,
            d=d,
            l=length,
        )
        out += [finite / other.length, finite]
    if other.length is not None:
        note.remark("the force per length is the mean over the finite length given")
    return out[0], out[2], out[1], out[3]


def _total(side: list[tuple[Any, Any, Any, Any]], index: int) -> Any:
    """Add the neighbours up; None where one of them is not known, so that no part passes for the whole."""
    values = [entry[index] for entry in side]
    return sum(values[1:], values[0]) if values and all(value is not None for value in values) else None


def _bend(conductor: Conductor, note: Note, peak: Given | None, energy: Given | None) -> tuple[Value, Value]:
    if conductor.bend is None:
        for name in ("bend_force", "bend_force_impulse"):
            note.unknown(name, "no [object.bend] is given")
        return None, None
    radius = conductor.radius
    if radius is None:
        note.remark("the tape is taken as a round conductor of the same section at the corner")
        radius = np.sqrt(np.asarray(conductor.area) / np.pi)
    r = Given(radius, "m", "radius")
    uniform = Given(
        note.formula(
            "x1",
            magnetics.BEND_CUTOFF_UNIFORM,
            "m",
            meaning="where the force begins, current spread evenly",
            source=FIELDS,
            show="mm",
            r=r,
        ),
        "m",
    )
    out: list[Value] = []
    for given, squared, unit, finding in (
        (peak, "A**2", "N", "bend_force"),
        (energy, "A**2*s", "N*s", "bend_force_impulse"),
    ):
        if given is None:
            out.append(None)
            continue
        i2 = Given(
            given.value**2 if unit == "N" else given.value,
            squared,
            given.meaning,
            symbol="i²" if unit == "N" else "∫i²dt",
        )
        legs: dict[str, Any] = {
            "l": Given(conductor.bend.leg, "m", "the other leg"),
            "x2": Given(conductor.bend.span, "m", "span"),
        }
        ends = [
            note.formula(
                "F_b" if unit == "N" else "J_b",
                magnetics.BEND,
                unit,
                meaning=f"{'force' if unit == 'N' else 'impulse'} on the leg, current {where}",
                source=ANNEX_D,
                finding=finding,
                i2=i2,
                x1=x1,
                **legs,
            )
            for x1, where in ((r, "at the surface"), (uniform, "spread evenly"))
        ]
        out.append(Bracket(ends[1], ends[0], ends[1]))
    note.remark(
        "the bend is bracketed by the current at the surface (low) and spread evenly (high, the value shown)"
    )
    return out[0], out[1]
