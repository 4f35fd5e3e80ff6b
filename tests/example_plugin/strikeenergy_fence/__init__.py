"""Wire fences: the voltage along a fence that carries part of a flash."""

from dataclasses import dataclass
from typing import Annotated, Literal

from strikeenergy.api import (
    Finding,
    Findings,
    Flash,
    Formula,
    Given,
    Note,
    Quantity,
    Source,
    StruckObject,
    Unit,
    Value,
    effect,
    hookimpl,
)

STRIKEENERGY_API = 1

OHM = Source("ohm", "Ohm's law and Joule's law")
DROP = Formula("I*r*l")
HEAT = Formula("w*r*l")


class Fence(StruckObject):
    """A wire fence that carries part of the flash along its length."""

    kind: Literal["fence"] = "fence"
    length: Annotated[Quantity, Unit("m", gt=0, typical=(10, 500), example="50 m")]
    """Length between the strike and the first earthed post."""
    resistance: Annotated[Quantity, Unit("ohm/m", gt=0, typical=(1e-3, 1), example="0.05 ohm/m")] = 0.05
    """Resistance per length of the wires together."""

    example_fields = {"length": "50 m", "share": 0.1}


@dataclass(frozen=True)
class Along(Findings):
    """What the current does along the fence."""

    voltage_along: Annotated[Value, Finding("V", "resistive voltage along the fence at the peak", "kV")]
    heat: Annotated[Value, Finding("J", "heat in the wires")]


@effect(
    Fence,
    sources=[OHM],
    rises_with=["flash.peak", "length", "resistance"],
    validity=["cold wires, and the resistive part of the voltage"],
    leaves_out=["the inductive part of the voltage, which is larger on fast fronts"],
)
def along(fence: Fence, flash: Flash, note: Note) -> Along:
    """Voltage and heat of the current that runs along the fence."""
    wire = {
        "r": Given(fence.resistance, "ohm/m", "resistance per length"),
        "l": Given(fence.length, "m", "length"),
    }
    peak = Given(flash.peak, "A", "peak current in the fence")
    energy = Given(flash.specific_energy, "J/ohm", "specific energy in the fence")
    return Along(
        voltage_along=note.formula(
            "U", DROP, "V", meaning="voltage", source=OHM, finding="voltage_along", I=peak, **wire
        ),
        heat=note.formula("E", HEAT, "J", meaning="heat", source=OHM, finding="heat", w=energy, **wire),
    )


@hookimpl
def strikeenergy_kinds():
    """List the kinds."""
    return [Fence]


@hookimpl
def strikeenergy_effects():
    """List the effects."""
    return [along]
