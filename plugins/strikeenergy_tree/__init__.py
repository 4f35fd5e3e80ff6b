"""Trees: what a stroke does to a trunk, with the internal field capped by flashover."""

from __future__ import annotations

from collections.abc import Iterable

from strikeenergy.api import Effect, StruckObject, hookimpl
from strikeenergy_tree.channel import channel
from strikeenergy_tree.kind import Tree

STRIKEENERGY_API = 1


@hookimpl
def strikeenergy_kinds() -> Iterable[type[StruckObject]]:
    """List the kinds."""
    return [Tree]


@hookimpl
def strikeenergy_effects() -> Iterable[Effect]:
    """List the effects."""
    return [channel]
