"""Adiabatic heating of a conductor by the specific energy of the flash, up to and through melting."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Annotated, Any

import numpy as np

from strikeenergy.api import (
    Criterion,
    Finding,
    Findings,
    Flash,
    Given,
    Later,
    Material,
    Note,
    OutsideValidity,
    Standing,
    Value,
    Words,
    effect,
    source,
)
from strikeenergy.physics import adiabatic
from strikeenergy_conductor.kind import Conductor

ANNEX_D = source("iec62305-1:2010", "Annex D.4")
DERIVED = source("iec62305-1:2010", "follows from Annex D.4")
STATES = ("solid", "melting", "molten")

_COLDEST = 223.15
_ROUNDING = 1e-12
"""A conductor at exactly the onset of melting has not begun to melt; this much is rounding."""


@dataclass(frozen=True)
class Heating(Findings):
    """What the stroke current does to the temperature of a conductor."""

    temperature_rise: Annotated[Value, Finding("K", "temperature rise at the end of the flash")]
    end_temperature: Annotated[Value, Finding("K", "temperature at the end of the flash", "degC")]
    state: Annotated[Value, Finding(None, "solid, melting or molten at the end of the flash")]
    melted_fraction: Annotated[Value, Finding("", "fraction of the section that is molten")]
    specific_energy_to_melt: Annotated[Value, Finding("J/ohm", "specific energy at which melting begins")]
    specific_energy_to_melt_fully: Annotated[
        Value, Finding("J/ohm", "specific energy at which all is molten")
    ]
    melt_margin: Annotated[Value, Finding("", "specific energy at the onset of melting over the one applied")]
    section_to_melt: Annotated[Value, Finding("m**2", "section at which melting is just reached", "mm**2")]
    resistance: Annotated[Value, Finding("ohm", "resistance before the stroke")]
    dissipated_energy: Annotated[Value, Finding("J", "heat that the conductor takes up", ledger="ohmic")]


@effect(
    Conductor,
    sources=[ANNEX_D],
    rises_with=["flash.specific_energy"],
    falls_with=["section"],
    validity=[
        "solid metal below its melting point, filled by the current",
        "flashes so short that no heat leaves the conductor",
    ],
    criteria=[
        Criterion(
            check="melting",
            value="flash.specific_energy",
            limit="specific_energy_to_melt",
            unit="J/ohm",
            clause="IEC 62305-1:2010 Annex D.4",
            source=ANNEX_D,
            size="section",
            smallest="section_to_melt",
        )
    ],
    leaves_out=[
        "heat loss to the surroundings, and cooling between strokes",
        "skin effect: on fast fronts the surface of a thick conductor runs hotter than this",
        "joints and clamps, which may heat more than the conductor",
    ],
)
def heating(conductor: Conductor, flash: Flash, note: Note) -> Heating:
    """Temperature, state and energy after an adiabatic flash, with the resistivity linear in temperature."""
    metal = conductor.substance
    for remark in metal.remarks:
        note.remark(remark)
    w = _specific_energy(conductor, flash, note)
    q = Given(conductor.write_area(note), "m**2", "metal cross-section")
    rho0, alpha, heat_capacity = _at_start(conductor, metal, note)
    flat = float(alpha.value) == 0.0

    shared = {"w": w, "q": q, "rho0": rho0, "C": heat_capacity} | ({} if flat else {"alpha": alpha})
    law = adiabatic.RISE_CONSTANT if flat else adiabatic.RISE
    melting = metal.properties.get("melting_temperature")
    if melting is None:
        return _without_melting(conductor, metal, note, law, shared)

    start = Given(conductor.start, "K", "temperature before the stroke")
    to_melt = note.formula(
        "Δθ_m", "T_m - T_0", "K", meaning="rise to the melting point", T_m=melting, T_0=start
    )
    if np.any(np.asarray(to_melt) <= 0):
        raise OutsideValidity("the conductor is at or above its melting point before the stroke")
    action = note.formula(
        "s",
        adiabatic.ACTION_TO_CONSTANT if flat else adiabatic.ACTION_TO,
        "A**2*s/m**4",
        meaning="specific action W/q² to the melting point",
        source=DERIVED,
        C=heat_capacity,
        rho0=rho0,
        rise=Given(to_melt, "K"),
        **({} if flat else {"alpha": alpha}),
    )
    s = Given(action, "A**2*s/m**4")
    onset = note.formula(
        "W_on",
        adiabatic.ENERGY_ONSET,
        "J/ohm",
        meaning="specific energy at the onset of melting",
        source=DERIVED,
        finding=("specific_energy_to_melt", "melt_margin"),
        s=s,
        q=q,
    )
    molten = np.asarray(w.value) > np.asarray(onset) * (1 + _ROUNDING)
    full, fraction = _melting(
        metal, note, w, q, Given(onset, "J/ohm"), rho0, alpha, to_melt, bool(molten.any())
    )

    rise: Any = np.full(molten.shape, np.nan) if molten.ndim and molten.all() else None
    if not molten.all():
        # Beyond the onset the closed form runs away (10^60 K and more): it is computed and thrown away for arrays.
        with np.errstate(over="ignore"):
            rise = note.formula(
                "Δθ",
                law,
                "K",
                meaning="temperature rise",
                source=ANNEX_D,
                finding=("temperature_rise", "end_temperature"),
                **shared,
            )
    state = _state(molten, fraction)
    if molten.ndim:
        if molten.any():
            rise = np.where(molten, np.nan, rise)
    elif molten:
        for name in ("temperature_rise", "end_temperature"):
            note.unknown(name, f"the conductor is {state}: the closed form ends at the melting point")
    resistance, energy = _energies(
        conductor, metal, note, q, rho0, heat_capacity, rise, fraction, to_melt, molten
    )
    return Heating(
        temperature_rise=rise,
        end_temperature=_end(conductor.start, rise),
        state=state,
        melted_fraction=fraction,
        specific_energy_to_melt=onset,
        specific_energy_to_melt_fully=full,
        melt_margin=_margin(onset, w.value, note),
        section_to_melt=_section(w, s, note),
        resistance=resistance,
        dissipated_energy=energy,
    )


def _specific_energy(conductor: Conductor, flash: Flash, note: Note) -> Given:
    """Return W/R in the conductor; write down the share, and that strokes add without cooling between them."""
    if flash.whole is not None and np.ndim(conductor.share) == 0 and conductor.share != 1:
        whole = Given(flash.whole.specific_energy, "J/ohm", "specific energy of the whole flash")
        k = Given(conductor.share, None, "share of the current")
        w = note.formula(
            "W",
            "k**2*W_flash",
            "J/ohm",
            meaning="specific energy in the conductor",
            finding="temperature_rise",
            k=k,
            W_flash=whole,
        )
    else:
        w = flash.specific_energy
    if len(flash.strokes) > 1 and not flash.totals:
        note.remark(f"{len(flash.strokes)} strokes heat one after another, without cooling between them")
    if not flash.totals and any(s.value("specific_energy") is None for s in flash.strokes):
        note.remark("a long stroke without W/R counts as a rectangle, Q²/T, the least it can be")
    return Given(w, "J/ohm", "specific energy W/R", flash.standing)


def _at_start(conductor: Conductor, metal: Material, note: Note) -> tuple[Any, Any, Any]:
    """Return resistivity, coefficient and heat capacity per volume, referred to the starting temperature."""
    rho, alpha, reference = (
        metal["resistivity"],
        metal["temperature_coefficient"],
        metal["reference_temperature"],
    )
    if reference.standing is Standing.ASSUMED:
        note.assume(reference)
    at_start: dict[str, Any] = {
        "rho_r": rho,
        "alpha_r": alpha,
        "T": Given(conductor.start, "K", "temperature before the stroke"),
        "T_r": reference,
    }
    if np.any(1 + alpha.value * (np.asarray(conductor.start) - reference.value) <= 0):
        raise OutsideValidity("at this temperature the straight line of the resistivity has fallen to zero")
    if np.any(np.asarray(conductor.start) < _COLDEST):
        note.remark("the conductor is so cold that the straight line of the resistivity is doubtful")
    rho0: Any = rho
    alpha0: Any = alpha
    if np.any(np.asarray(conductor.start) != reference.value):
        rho0 = Given(
            note.formula(
                "ρ0", adiabatic.RESISTIVITY_AT, "ohm*m", meaning="resistivity at the start", **at_start
            ),
            "ohm*m",
        )
        del at_start["rho_r"]
        alpha0 = Given(
            note.formula(
                "α",
                adiabatic.COEFFICIENT_AT,
                "1/K",
                meaning="temperature coefficient referred to the start",
                **at_start,
            ),
            "1/K",
        )
    if metal.has("volumetric_heat_capacity"):
        return rho0, alpha0, metal["volumetric_heat_capacity"]
    c = note.formula(
        "C",
        adiabatic.HEAT_PER_VOLUME,
        "J/(m**3*K)",
        meaning="heat capacity per volume",
        gamma=metal["density"],
        c=metal["heat_capacity"],
    )
    return rho0, alpha0, Given(c, "J/(m**3*K)")


def _melting(
    metal: Material,
    note: Note,
    w: Given,
    q: Given,
    onset: Given,
    rho0: Any,
    alpha: Any,
    to_melt: Any,
    any_molten: bool,
) -> tuple[Any, Any]:
    """Return the specific energy to the end of melting and the melted fraction, where the set has a latent heat."""
    if not metal.has("latent_heat", "density"):
        lacks = "latent heat" if not metal.has("latent_heat") else "density"
        for name in ("specific_energy_to_melt_fully", "melted_fraction"):
            note.unknown(name, f"the set {metal.constants!r} has no {lacks} of {metal.row}")
        if any_molten:
            note.remark(
                f"melting or molten: without the {lacks} of {metal.row} the two cannot be told apart; the state says melting"
            )
        else:
            note.unknowns.pop("melted_fraction", None)
        return None, None if any_molten else 0.0
    rho_m = note.formula(
        "ρ_m",
        "rho0*(1 + alpha*rise)",
        "ohm*m",
        meaning="resistivity of the solid at its melting point",
        rho0=rho0,
        alpha=alpha,
        rise=Given(to_melt, "K"),
    )
    full = note.formula(
        "W_full",
        adiabatic.ENERGY_FULL,
        "J/ohm",
        meaning="specific energy at the end of melting",
        source=DERIVED,
        finding="specific_energy_to_melt_fully",
        W_on=onset,
        q=q,
        gamma=metal["density"],
        L=metal["latent_heat"],
        rho_m=Given(rho_m, "ohm*m"),
    )
    if not any_molten:
        return full, 0.0
    fraction = note.formula(
        "f",
        adiabatic.MELTED_FRACTION,
        None,
        meaning="melted fraction",
        source=DERIVED,
        finding=("melted_fraction", "state"),
        w=w,
        W_on=onset,
        W_full=Given(full, "J/ohm"),
    )
    return full, fraction


def _state(molten: Any, fraction: Any) -> Value:
    if not molten.ndim:
        if not molten:
            return "solid"
        return "molten" if fraction is not None and float(fraction) >= 1 else "melting"
    codes = molten.view(np.int8)
    if fraction is not None and np.ndim(fraction):
        codes[np.asarray(fraction) >= 1] = 2
    return Words(codes, STATES)


def _end(start: Any, rise: Any) -> Any:
    """Return the end temperature; for many strokes only when it is asked for."""
    if rise is None:
        return None
    return Later(lambda: start + rise) if np.ndim(rise) else start + rise


def _section(w: Given, s: Given, note: Note) -> Any:
    """Return the section that just reaches melting; for many strokes only when it is asked for."""

    def compute() -> Any:
        return note.formula(
            "q_m",
            adiabatic.SECTION_FOR,
            "m**2",
            meaning="section that just reaches melting",
            source=DERIVED,
            finding="section_to_melt",
            show="mm**2",
            w=w,
            s=s,
        )

    return Later(compute) if np.ndim(w.value) else compute()


def _margin(onset: Any, applied: Any, note: Note) -> Any:
    """Return the onset of melting over what is applied; for many strokes only when it is asked for."""
    if np.ndim(applied) == 0:
        if applied == 0:
            note.unknown("melt_margin", "there is no current")
            return None
        return onset / applied

    def compute() -> Any:
        with np.errstate(divide="ignore"):
            return onset / applied

    return Later(compute)


def _without_melting(
    conductor: Conductor, metal: Material, note: Note, law: Any, shared: dict[str, Any]
) -> Heating:
    """Return the rise where the set has no melting temperature: as far as the set is meant to go, and no state."""
    with np.errstate(over="ignore"):
        rise = note.formula(
            "Δθ",
            law,
            "K",
            meaning="temperature rise",
            source=ANNEX_D,
            finding=("temperature_rise", "end_temperature"),
            **shared,
        )
    end: Any = conductor.start + rise
    why = f"the set {metal.constants!r} has no melting temperature of {metal.row}"
    for name in (
        "state",
        "melted_fraction",
        "specific_energy_to_melt",
        "specific_energy_to_melt_fully",
        "melt_margin",
        "section_to_melt",
    ):
        note.unknown(name, why)
    note.remark(why + ": the result is not held against melting")
    if metal.valid_to is not None:
        beyond = np.asarray(end) > metal.valid_to
        if beyond.ndim:
            rise, end = np.where(beyond, np.nan, rise), np.where(beyond, np.nan, end)
        elif beyond:
            rise = end = None
            for name in ("temperature_rise", "end_temperature"):
                note.unknown(
                    name,
                    f"it would pass {metal.valid_to - 273.15:.0f} °C, where the set {metal.constants!r} ends",
                )
    resistance, energy = _energies(
        conductor, metal, note, shared["q"], shared["rho0"], shared["C"], rise, 0.0, None, np.asarray(False)
    )
    return Heating(rise, end, None, None, None, None, None, None, resistance, energy)


def _energies(
    conductor: Conductor,
    metal: Material,
    note: Note,
    q: Given,
    rho0: Any,
    heat_capacity: Any,
    rise: Any,
    fraction: Any,
    to_melt: Any,
    molten: Any,
) -> tuple[Any, Any]:
    """Return resistance and heat taken up, for a conductor whose length is known."""
    if conductor.length is None:
        for name in ("resistance", "dissipated_energy"):
            note.unknown(name, "give a length")
        return None, None
    length = Given(conductor.length, "m", "length")
    resistance = note.formula(
        "R",
        adiabatic.RESISTANCE,
        "ohm",
        meaning="resistance before the stroke",
        finding="resistance",
        rho0=rho0,
        l=length,
        q=q,
    )
    if rise is None and to_melt is None:
        note.unknown("dissipated_energy", note.unknowns.get("temperature_rise", "the rise is not known"))
        return resistance, None
    sensible = rise if rise is not None else to_melt
    if molten.ndim and molten.any():
        sensible = np.where(molten, to_melt, rise)
    if not molten.any():
        energy = note.formula(
            "E",
            adiabatic.HEAT_STORED_SOLID,
            "J",
            meaning="heat taken up",
            source=DERIVED,
            finding="dissipated_energy",
            q=q,
            l=length,
            C=heat_capacity,
            rise=Given(sensible, "K"),
        )
        return resistance, energy
    if fraction is None:
        note.unknown("dissipated_energy", f"the set {metal.constants!r} has no latent heat of {metal.row}")
        return resistance, None
    energy = note.formula(
        "E",
        adiabatic.HEAT_STORED,
        "J",
        meaning="heat taken up",
        source=DERIVED,
        finding="dissipated_energy",
        q=q,
        l=length,
        C=heat_capacity,
        rise=Given(sensible, "K"),
        f=Given(fraction),
        gamma=metal["density"],
        L=metal["latent_heat"],
    )
    if np.any(np.asarray(fraction) >= 1):
        note.remark(
            "all is molten: the heat that the liquid takes up after that is not counted, so the energy is a lower bound"
        )
    return resistance, energy
