"""Conductors: wires, tapes, rods and tubes that carry the stroke current along their length."""

from __future__ import annotations

from collections.abc import Iterable

from strikeenergy.api import Effect, StruckObject, hookimpl
from strikeenergy_conductor.forces import forces
from strikeenergy_conductor.heating import heating
from strikeenergy_conductor.kind import Conductor

STRIKEENERGY_API = 1


@hookimpl
def strikeenergy_kinds() -> Iterable[type[StruckObject]]:
    """List the kinds."""
    return [Conductor]


@hookimpl
def strikeenergy_effects() -> Iterable[Effect]:
    """List the effects."""
    return [heating, forces]
