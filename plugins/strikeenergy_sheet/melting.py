"""Melting under the arc root: the energy balance, which is an upper bound."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Annotated, Any

import numpy as np

from strikeenergy.api import (
    Bracket,
    Constant,
    Finding,
    Findings,
    Flash,
    Given,
    Note,
    OutsideValidity,
    Standing,
    Value,
    effect,
    source,
)
from strikeenergy.physics import arcroot
from strikeenergy_sheet.kind import Sheet

ANNEX_D = source("iec62305-1:2010", "Annex D.4.1.2")
CHOICE = source(
    "engineering", "box of the equivalent root voltage, held against published perforations of 0.5 mm sheets"
)
DROP = {
    "low": Constant(8.0, "V", CHOICE, Standing.ASSUMED, "anode or cathode drop, low end"),
    "middle": Constant(12.0, "V", CHOICE, Standing.ASSUMED, "anode or cathode drop"),
    "high": Constant(16.0, "V", CHOICE, Standing.ASSUMED, "anode or cathode drop, high end"),
}


@dataclass(frozen=True)
class Melting(Findings):
    """What the charge of the flash melts at most."""

    melted_volume_bound: Annotated[
        Value,
        Finding("m**3", "melted volume at most: all energy of the drop goes into melting", "mm**3", "upper"),
    ]
    root_energy: Annotated[
        Value, Finding("J", "energy that the drop brings to the arc root", ledger="arc root")
    ]


@effect(
    Sheet,
    sources=[ANNEX_D],
    rises_with=["flash.charge"],
    validity=["an upper bound for any sheet; it is no estimate of a hole"],
    leaves_out=[
        "conduction of heat into the sheet, which takes most of the energy: for 4 mm steel the bound is about seven times "
        "what a solution with heat conduction melts",
        "evaporation, splashing and the motion of the arc root",
        "the hot spot on the rear face, and whether it ignites anything",
    ],
)
def melting(sheet: Sheet, flash: Flash, note: Note) -> Melting:
    """Upper bound of the melted volume by the energy balance of IEC 62305-1 Annex D."""
    metal = sheet.substance
    for remark in metal.remarks:
        note.remark(remark)
    start = Given(sheet.start, "K", "temperature before the stroke")
    constants: dict[str, Any] = {
        "gamma": metal["density"],
        "c": metal["heat_capacity"],
        "L": metal["latent_heat"],
        "T_m": metal["melting_temperature"],
        "T_0": start,
    }
    if np.any(np.asarray(sheet.start) >= metal["melting_temperature"].value):
        raise OutsideValidity("the sheet is at or above its melting point before the stroke")
    charge = Given(flash.charge, "C", "charge of the flash", flash.standing)
    if sheet.drop is not None:
        drop = Given(sheet.drop, "V", "anode or cathode drop")
        volume, energy = _bound(note, drop, charge, constants)
        return Melting(volume, energy)
    ends = {}
    for end in ("low", "high", "middle"):
        note.assume(DROP[end])
        quiet = note if end == "middle" else Note(quiet=True)
        ends[end] = _bound(quiet, DROP[end], charge, constants)
    note.remark("the drop is assumed: 12 V, with 8 V to 16 V as its range; give drop = '...' to fix it")
    volumes, energies = ({end: value[i] for end, value in ends.items()} for i in (0, 1))
    return Melting(
        Bracket(volumes["middle"], volumes["low"], volumes["high"]),
        Bracket(energies["middle"], energies["low"], energies["high"]),
    )


def _bound(note: Note, drop: Given | Constant, charge: Given, constants: dict[str, Any]) -> tuple[Any, Any]:
    energy = note.formula(
        "E",
        arcroot.ROOT_ENERGY,
        "J",
        meaning="energy at the root",
        source=ANNEX_D,
        finding="root_energy",
        u=drop,
        Q=charge,
    )
    volume = note.formula(
        "V",
        arcroot.MELTED_VOLUME_BOUND,
        "m**3",
        meaning="melted volume at most (upper bound)",
        source=ANNEX_D,
        finding="melted_volume_bound",
        show="mm**3",
        u=drop,
        Q=charge,
        **constants,
    )
    return volume, energy
