"""Reading data tables: every number has a unit and a source, or the table does not load.

A table is a TOML file that lies beside the code of whoever owns it. It is read at first use, checked and frozen.
``defaults`` at its top (source, locator, standing) hold for every number that does not say otherwise.
"""

from __future__ import annotations

import tomllib
from collections.abc import Mapping
from importlib.resources import files
from typing import Any, cast

from strikeenergy.errors import DataError, StrikeEnergyError
from strikeenergy.sources import Constant, Source, Standing, source
from strikeenergy.units import read

__all__ = ["constant", "data_file", "read_table", "standing"]


def data_file(package: str, *path: str) -> str:
    """Return the text of a data file that ships inside a package."""
    place = files(package)
    for part in path:
        place = place / part
    return place.read_text(encoding="utf-8")


def read_table(package: str, *path: str) -> dict[str, Any]:
    """Read a TOML table that ships inside a package.

    Raises:
        DataError: the file is not there or is not valid TOML.
    """
    try:
        return tomllib.loads(data_file(package, *path))
    except (OSError, UnicodeDecodeError, tomllib.TOMLDecodeError) as error:
        raise DataError(f"table {'/'.join(path)} of {package}: {error}") from error


def standing(text: str) -> Standing:
    """Return the standing of this name.

    Raises:
        DataError: no such standing.
    """
    for member in Standing:
        if text in (member.value, member.name):
            return member
    raise DataError(f"unknown standing {text!r}; known: {', '.join(m.value for m in Standing)}")


def constant(
    entry: Mapping[str, Any] | str,
    unit: str,
    *,
    meaning: str = "",
    defaults: Mapping[str, Any] | None = None,
    own_source: Source | None = None,
) -> Constant:
    """Make a constant of one table entry.

    Args:
        entry: ``"17.8e-9 ohm*m"``, or a table with ``value`` (and, where they differ from the defaults,
            ``source``, ``locator``, ``standing``).
        unit: the coherent SI unit that is due, or ``"degC"`` for a temperature (held in kelvin).
        meaning: what the number is.
        defaults: ``source``, ``locator`` and ``standing`` of the whole table.
        own_source: a source that is not among the built-in publications (a user's own).

    Raises:
        DataError: no value, a wrong unit, no source.
    """
    full: dict[str, Any] = {**(defaults or {}), **(entry if isinstance(entry, Mapping) else {"value": entry})}
    try:
        value = cast(float, read(full["value"], unit))
        given = own_source or source(str(full["source"]), str(full.get("locator", "")))
        stands = standing(str(full["standing"]))
    except KeyError as error:
        raise DataError(f"{meaning or 'a number'}: {error.args[0]!r} is missing") from None
    except StrikeEnergyError as error:
        raise DataError(f"{meaning or 'a number'}: {error}") from error
    return Constant(value, "K" if unit == "degC" else unit, given, stands, meaning)
