"""Joule heat of the current that spreads from the root through the sheet."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Annotated, Any

import numpy as np

from strikeenergy.api import Finding, Findings, Flash, Given, Note, OutsideValidity, Value, effect, source
from strikeenergy.physics import adiabatic, arcroot
from strikeenergy_sheet.kind import Sheet

ANNEX_D = source("iec62305-1:2010", "Annex D.4")
RADIAL = source(
    "jackson", "radial current density of a sheet, with the adiabatic law of IEC 62305-1:2010 Annex D.4"
)


@dataclass(frozen=True)
class Spreading(Findings):
    """What the spreading current melts by itself."""

    spread_melt_radius: Annotated[
        Value, Finding("m", "radius melted by the Joule heat of the spreading current", "mm")
    ]


@effect(
    Sheet,
    sources=[ANNEX_D, RADIAL],
    rises_with=["flash.specific_energy"],
    falls_with=["thickness"],
    validity=["thin sheets that the current fills; for thick ones the skin effect makes the radius larger"],
    leaves_out=["the heat of the arc root itself", "skin effect in the sheet", "heat conduction"],
)
def spreading(sheet: Sheet, flash: Flash, note: Note) -> Spreading:
    """Radius within which the spreading current melts the sheet, without the heat of the arc root."""
    metal = sheet.substance
    for remark in metal.remarks:
        note.remark(remark)
    rise = metal["melting_temperature"].value - sheet.start
    if np.any(np.asarray(rise) <= 0):
        raise OutsideValidity("the sheet is at or above its melting point before the stroke")
    start: dict[str, Any] = {
        "T": Given(sheet.start, "K", "temperature before the stroke"),
        "T_r": metal["reference_temperature"],
    }
    alpha_r = metal["temperature_coefficient"]
    rho0 = Given(
        note.formula(
            "ρ0",
            adiabatic.RESISTIVITY_AT,
            "ohm*m",
            meaning="resistivity at the start",
            rho_r=metal["resistivity"],
            alpha_r=alpha_r,
            **start,
        ),
        "ohm*m",
    )
    volume_heat: Any = metal.properties.get("volumetric_heat_capacity")
    if volume_heat is None:
        volume_heat = Given(
            note.formula(
                "C",
                adiabatic.HEAT_PER_VOLUME,
                "J/(m**3*K)",
                meaning="heat capacity per volume",
                gamma=metal["density"],
                c=metal["heat_capacity"],
            ),
            "J/(m**3*K)",
        )
    heat: dict[str, Any] = {
        "C": volume_heat,
        "rho0": rho0,
        "rise": Given(rise, "K", "rise to the melting point"),
    }
    law = adiabatic.ACTION_TO_CONSTANT
    if alpha_r.value != 0:
        law = adiabatic.ACTION_TO
        heat["alpha"] = Given(
            note.formula(
                "α",
                adiabatic.COEFFICIENT_AT,
                "1/K",
                meaning="temperature coefficient referred to the start",
                alpha_r=alpha_r,
                **start,
            ),
            "1/K",
        )
    action = note.formula(
        "s", law, "A**2*s/m**4", meaning="specific action to the melting point", source=ANNEX_D, **heat
    )
    radius = note.formula(
        "r",
        arcroot.SPREAD_MELT_RADIUS,
        "m",
        meaning="radius melted by Joule heat alone",
        source=RADIAL,
        finding="spread_melt_radius",
        show="mm",
        w=Given(flash.specific_energy, "J/ohm", "specific energy W/R", flash.standing),
        d=Given(sheet.thickness, "m", "thickness"),
        s=Given(action, "A**2*s/m**4"),
    )
    return Spreading(radius)
