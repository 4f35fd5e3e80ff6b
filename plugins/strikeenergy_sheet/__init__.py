"""Metal sheets: roofs, walls and cladding on which the arc of the flash has its root."""

from __future__ import annotations

from collections.abc import Iterable

from strikeenergy.api import Effect, StruckObject, hookimpl
from strikeenergy_sheet.kind import Sheet
from strikeenergy_sheet.melting import melting
from strikeenergy_sheet.spreading import spreading

STRIKEENERGY_API = 1


@hookimpl
def strikeenergy_kinds() -> Iterable[type[StruckObject]]:
    """List the kinds."""
    return [Sheet]


@hookimpl
def strikeenergy_effects() -> Iterable[Effect]:
    """List the effects."""
    return [melting, spreading]
