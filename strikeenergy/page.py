"""A titled list of entries: what descriptions are made of, for people and as JSON."""

from __future__ import annotations

import textwrap
from dataclasses import dataclass, field
from typing import Any

from strikeenergy.formatting import format_quantity
from strikeenergy.sources import Constant

__all__ = ["Page", "constant_text"]

_WIDTH = 80


@dataclass
class Page:
    """A titled list of entries; each entry has a name and what is to be said of it."""

    title: str
    entries: list[tuple[str, str]] = field(default_factory=list)
    intro: str = ""

    def text(self) -> str:
        """Return it for people."""
        lines = [self.title, "-" * min(len(self.title), _WIDTH)]
        lines += textwrap.wrap(self.intro, _WIDTH) if self.intro else []
        width = min(max((len(name) for name, _ in self.entries), default=0), 28)
        for name, said in self.entries:
            first = f"  {name:<{width}}  "
            rest = " " * (width + 4)
            if len(name) > width:
                lines.append(f"  {name}")
                first = rest
            lines += textwrap.wrap(
                said, _WIDTH, initial_indent=first, subsequent_indent=rest, break_on_hyphens=False
            ) or [first.rstrip()]
        return "\n".join(lines) + "\n"

    def to_dict(self) -> dict[str, Any]:
        """Return it for JSON."""
        return {
            "title": self.title,
            "intro": self.intro,
            "entries": [{"name": n, "text": t} for n, t in self.entries],
        }


def constant_text(value: Constant) -> str:
    """Write a constant with its source and standing."""
    shown = "degC" if value.unit == "K" and value.value > 200 else None
    return f"{format_quantity(value.value, value.unit, shown)}  ({value.source.locator or value.source.citation}; {value.standing})"
