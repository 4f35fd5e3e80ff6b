"""Tables of minimum sizes: the rows, with their conditions, unit, source and standing."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from functools import lru_cache
from importlib.resources import files
from typing import Any

from strikeenergy.errors import DataError
from strikeenergy.sources import Constant
from strikeenergy.tables import constant, read_table

__all__ = [
    "DEFAULT_STANDARD",
    "SIZE_UNITS",
    "Check",
    "LimitTable",
    "Row",
    "Variant",
    "built_in_tables",
    "parse_table",
]

DEFAULT_STANDARD = "IEC 62305-3:2010"
SIZE_UNITS = {
    "section": ("m**2", "mm**2"),
    "diameter": ("m", "mm"),
    "thickness": ("m", "mm"),
    "side": ("m", "mm"),
}
"""The sizes that a table may ask for: SI unit, and the unit to show."""


@dataclass(frozen=True)
class Variant:
    """Another minimum that holds under a condition."""

    minimum: Constant
    quantity: str
    when: Mapping[str, Any]
    say: str
    also: Mapping[str, Constant] = field(default_factory=dict)
    """Minima of other sizes that hold with it."""


@dataclass(frozen=True)
class Row:
    """One row: what it is for, and the minimum."""

    materials: tuple[str, ...]
    forms: tuple[str, ...]
    uses: tuple[str, ...]
    minimum: Constant
    quantity: str
    say: str = ""
    variants: tuple[Variant, ...] = ()
    only_when: Mapping[str, Any] = field(default_factory=dict)
    only_when_say: str = ""


@dataclass(frozen=True)
class Check:
    """One check of a table: its rows, and when it applies at all."""

    name: str
    rows: tuple[Row, ...]
    say: str = ""
    applies_when: Mapping[str, Any] = field(default_factory=dict)
    ask: str = ""
    not_covered_when: Mapping[str, Any] = field(default_factory=dict)
    not_covered: str = ""


@dataclass(frozen=True)
class LimitTable:
    """A table of minimum sizes."""

    name: str
    standard: str
    clause: str
    title: str
    kind: str
    uses: tuple[str, ...]
    checks: tuple[Check, ...]
    perhaps: tuple[str, ...] = ()
    perhaps_say: str = ""
    remark: str = ""

    @property
    def full_clause(self) -> str:
        """Clause with its edition."""
        return f"{self.standard} {self.clause}"


def _names(value: Any) -> tuple[str, ...]:
    if value is None:
        return ()
    return (value,) if isinstance(value, str) else tuple(value)


def parse_table(raw: Mapping[str, Any]) -> LimitTable:
    """Make a limit table of the content of a table file.

    Raises:
        DataError: something is missing, has a wrong unit or no source.
    """
    try:
        defaults = raw["defaults"]
        quantity = str(raw["quantity"])

        def minimum(entry: Any, measured: str) -> Constant:
            return constant(entry, SIZE_UNITS[measured][0], meaning=f"minimum {measured}", defaults=defaults)

        def variant(entry: Mapping[str, Any], of: str) -> Variant:
            measured = entry.get("quantity", of)
            also = {name: minimum(value, name) for name, value in entry.get("also", {}).items()}
            return Variant(minimum(entry["minimum"], measured), measured, entry["when"], entry["say"], also)

        def row(entry: Mapping[str, Any]) -> Row:
            measured = entry.get("quantity", quantity)
            return Row(
                _names(entry["material"]),
                _names(entry.get("form")),
                _names(entry.get("use")),
                minimum(entry["minimum"], measured),
                measured,
                entry.get("say", ""),
                tuple(variant(v, measured) for v in entry.get("variant", ())),
                entry.get("only_when", {}),
                entry.get("only_when_say", ""),
            )

        checks = tuple(
            Check(
                check["name"],
                tuple(row(entry) for entry in check["row"]),
                check.get("say", ""),
                check.get("applies_when", {}),
                check.get("ask", ""),
                check.get("not_covered_when", {}),
                check.get("not_covered", ""),
            )
            for check in raw["check"]
        )
        return LimitTable(
            raw["name"],
            raw["standard"],
            raw["clause"],
            raw["title"],
            raw["kind"],
            _names(raw["use"]),
            checks,
            _names(raw.get("perhaps")),
            raw.get("perhaps_say", ""),
            raw.get("remark", ""),
        )
    except KeyError as error:
        raise DataError(
            f"limit table {raw.get('name', '(no name)')!r}: {error.args[0]!r} is missing"
        ) from None


@lru_cache(maxsize=1)
def built_in_tables() -> tuple[LimitTable, ...]:
    """Return the tables that ship with the program."""
    folder = files("strikeenergy") / "data" / "limits"
    names = sorted(f.name for f in folder.iterdir() if f.name.endswith(".toml"))
    return tuple(parse_table(read_table("strikeenergy", "data", "limits", name)) for name in names)
