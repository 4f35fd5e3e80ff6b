"""Putting text on the terminal: colour where the terminal has it and the user wants it, plain text everywhere else."""

from __future__ import annotations

import re
import sys

__all__ = ["show"]

_STYLES = (
    (re.compile(r"^(\s*✔.*)$"), "blue"),
    (re.compile(r"^(\s*✖.*)$"), "bold red"),
    (re.compile(r"^(\s*\? .*)$"), "yellow"),
    (re.compile(r"^(\s*!.*|FAILED.*)$"), "bold red"),
)


def show(text: str) -> None:
    """Write text; with colour only on a terminal, and not where NO_COLOR is set. The words and marks say it all without."""
    if not sys.stdout.isatty():
        sys.stdout.write(text)
        return
    from rich.console import Console
    from rich.text import Text

    console = Console(highlight=False, soft_wrap=True)
    for line in text.splitlines():
        style = next((style for pattern, style in _STYLES if pattern.match(line)), "")
        if set(line) in ({"="}, {"-"}):
            style = "dim"
        console.print(Text(line, style=style))
