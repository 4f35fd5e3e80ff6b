"""Where a number comes from, and how firmly it stands."""

from __future__ import annotations

import tomllib
from collections.abc import Iterable
from dataclasses import dataclass
from enum import Enum
from functools import lru_cache
from importlib.resources import files

from strikeenergy.errors import DataError, UnknownName

__all__ = ["Constant", "Source", "Standing", "source", "sources", "weakest"]


class Standing(Enum):
    """How firmly a number stands, from the firmest to the weakest."""

    PUBLISHED = "published"
    """Read in the source."""
    DERIVED = "derived"
    """Follows by calculation from numbers that stand in the source."""
    GIVEN = "given"
    """Given by the user of the program."""
    MEMORY_HIGH = "from memory (high confidence)"
    """Recalled from the named publication; a surprise if it were wrong. Often confirmed by recomputing what rests on it."""
    MEMORY_MEDIUM = "from memory (medium confidence)"
    MEMORY_LOW = "from memory (low confidence)"
    CONFLICT = "sources in conflict"
    """Two readings of the same table cell differ: check against the document."""
    PRACTICE = "common practice, no source"
    ASSUMED = "assumed"
    """An engineering choice, to be overridden by whoever knows better."""

    @property
    def rank(self) -> int:
        """0 for the firmest."""
        return list(Standing).index(self)

    def __str__(self) -> str:
        return self.value


def weakest(standings: Iterable[Standing], default: Standing = Standing.DERIVED) -> Standing:
    """Return the weakest of several: a result stands no firmer than what it rests on."""
    return max(standings, key=lambda standing: standing.rank, default=default)


@dataclass(frozen=True)
class Source:
    """A publication, or an equation or table of it."""

    key: str
    citation: str
    locator: str = ""

    def at(self, locator: str) -> Source:
        """Name the table, equation or clause."""
        return Source(self.key, self.citation, locator)

    def __str__(self) -> str:
        return f"{self.citation}, {self.locator}" if self.locator else self.citation


@dataclass(frozen=True)
class Constant:
    """A number that somebody published, recalled, derived or assumed. The value is in SI."""

    value: float
    unit: str
    source: Source
    standing: Standing
    meaning: str = ""

    def __post_init__(self) -> None:
        if not self.source.citation:
            raise DataError(f"the constant {self.meaning!r} has no source")


@lru_cache(maxsize=1)
def sources() -> dict[str, Source]:
    """Return every publication that the built-in tables cite, by key."""
    text = (files("strikeenergy") / "data" / "sources.toml").read_text(encoding="utf-8")
    return {key: Source(key, str(citation)) for key, citation in tomllib.loads(text).items()}


def source(key: str, locator: str = "") -> Source:
    """Return the publication with this key, at a table or equation.

    Raises:
        UnknownName: no such key.
    """
    if key not in sources():
        raise UnknownName("source", key, sources())
    return sources()[key].at(locator)
