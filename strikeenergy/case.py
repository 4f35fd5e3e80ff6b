"""Case files: TOML in, a validated case out. All mistakes at once, each with its line.

A case has a title, a ``[flash]`` (a named threat or strokes), ``[[object]]`` entries, and its own ``[materials]``.
"""

from __future__ import annotations

import hashlib
import os
import tomllib
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass, field, replace
from pathlib import Path
from typing import Annotated, Any

import numpy as np

from strikeenergy.casetext import CaseError, locate, read_text, syntax_problem
from strikeenergy.declared import validate
from strikeenergy.errors import InputError, Problem, close_matches
from strikeenergy.flashcase import build_flash
from strikeenergy.inputs import Part, StruckObject, Unit
from strikeenergy.lightning.flash import Flash
from strikeenergy.limit_tables import DEFAULT_STANDARD
from strikeenergy.materials import PROPERTIES, Materials, material_names, own_material
from strikeenergy.registry import Registry, load
from strikeenergy.sources import Constant, Source, Standing
from strikeenergy.units import Quantity

__all__ = ["Case", "CaseError", "load_case", "make_case", "read_case"]


class LedgerEntry(Part):
    """[ledger]: the channel that the energy ledger holds the objects against."""

    height: Annotated[Quantity, Unit("m", gt=0, le=3e4, typical=(1e3, 1e4), example="3 km")] = 3e3
    """Height of the channel above the ground."""
    ruler: Annotated[Quantity, Unit("m", gt=0, typical=(1, 500), example="50 m")] = 50.0
    """Ruler with which the channel's length is measured: a shorter one sees more bends."""
    dimension: Annotated[Quantity, Unit("", ge=1, lt=2, typical=(1.05, 1.4), example="1.1")] = 1.1
    """Fractal dimension of the channel at that ruler; about 1.1 for the main channel, 1.34 for the branched pattern."""


@dataclass
class Case:
    """A validated case; SI inside.

    Attributes:
        title: what it is about.
        flash: the lightning current.
        objects: the struck objects, each with a name of its own.
        standard: the standard whose verdicts decide.
        sha256: of the text it was read from.
        path: the file, or ``<stdin>``, or nothing.
        registry: the plugins it was read with.
        ledger: what the energy ledger takes for the channel.
        materials: the built-in and own materials.
        skipped: objects that are left out because their kind's plugin failed to load.
    """

    title: str
    flash: Flash
    objects: list[StruckObject]
    standard: str
    sha256: str
    registry: Registry
    path: str = ""
    ledger: LedgerEntry = field(default_factory=lambda: LedgerEntry())
    materials: Materials = field(default_factory=Materials)
    skipped: tuple[str, ...] = ()

    def __repr__(self) -> str:
        return f"<Case {self.title!r}: {len(self.objects)} objects, {self.flash.name or 'given strokes'}>"


# -- reading -----------------------------------------------------------------------------------------------


def load_case(
    path: str | os.PathLike[str], *, threat: str | None = None, standard: str | None = None
) -> Case:
    """Read a case file (``"-"`` for standard input).

    Args:
        path: of a TOML file.
        threat: a named threat that takes the place of the case's flash.
        standard: a standard that takes the place of the case's.

    Raises:
        CaseError: with every problem found.
    """
    text, name = read_text(path)
    return read_case(text, name, threat=threat, standard=standard)


def read_case(
    text: str,
    name: str = "<text>",
    *,
    threat: str | None = None,
    standard: str | None = None,
    registry: Registry | None = None,
) -> Case:
    """Read a case from TOML text. See :func:`load_case`.

    Raises:
        CaseError: with every problem found.
    """
    try:
        data = tomllib.loads(text)
    except tomllib.TOMLDecodeError as error:
        raise CaseError([syntax_problem(text, name, error)]) from None
    except ValueError:
        raise CaseError(
            [Problem("a number has too many digits", "write it with an exponent, such as 1e6", place=name)]
        ) from None
    except RecursionError:
        raise CaseError([Problem("the brackets are nested too deeply for a case file", place=name)]) from None
    digest = hashlib.sha256(text.encode()).hexdigest()
    try:
        return _build(data, digest, name, threat, standard, registry)
    except CaseError as error:
        lines = {problem: _line(problem, text) for problem in error.problems}
        placed = [_placed(p, lines[p], name, data) for p in sorted(error.problems, key=lines.__getitem__)]
        raise CaseError(placed) from None


def make_case(data: Mapping[str, Any], *, registry: Registry | None = None) -> Case:
    """Make a case of a mapping with the same keys as a case file. Values may be texts or pint quantities (also arrays).

    Raises:
        CaseError: with every problem found.
    """
    digest = hashlib.sha256(repr(sorted(data.items(), key=str)).encode()).hexdigest()
    return _build(data, digest, "", None, None, registry)


# -- building ----------------------------------------------------------------------------------------------

_LONGEST_NAME = 120
_TOP = ("title", "standard", "flash", "object", "materials", "ledger")


def _build(
    data: Mapping[str, Any],
    digest: str,
    name: str,
    threat_name: str | None,
    standard: str | None,
    registry: Registry | None,
) -> Case:
    registry = registry or load()
    problems: list[Problem] = []
    for key in data:
        if key not in _TOP:
            problems.append(Problem("unknown key", close_matches(key, _TOP), (key,)))
    title = data.get("title", "")
    if not isinstance(title, str):
        problems.append(Problem("the title is a text", 'write title = "..."', ("title",)))
        title = ""
    problems += [replace(p, path=("title",)) for p in _name_problems(title)]
    chosen = standard if standard is not None else data.get("standard", DEFAULT_STANDARD)
    try:
        chosen = registry.standard(str(chosen))
    except InputError as error:
        where = "--standard" if standard is not None else "standard"
        problems += [replace(p, path=(where,)) for p in error.problems]
    materials = _materials(data.get("materials", {}), problems)
    flash = build_flash(data.get("flash"), threat_name, Path(name).parent, problems)
    skipped: list[str] = []
    objects = _objects(data.get("object"), registry, materials, problems, skipped)
    if skipped and not objects and not problems:
        told = "; ".join(str(failure) for failure in registry.failures)
        problems += [Problem(text, f"mend the plugin: {told}", ("object",)) for text in skipped]
    ledger = (
        validate(LedgerEntry, data["ledger"], ("ledger",), {}, problems)
        if "ledger" in data
        else LedgerEntry()
    )
    if ledger is not None and np.any(np.asarray(ledger.ruler) > ledger.height):
        problems.append(
            Problem("the ruler is longer than the channel is high", "give a shorter one", ("ledger", "ruler"))
        )
    if problems or flash is None or ledger is None:
        raise CaseError(problems)
    return Case(
        title or Path(name).stem or "untitled",
        flash,
        objects,
        str(chosen),
        digest,
        registry,
        name,
        ledger,
        materials,
        tuple(skipped),
    )


def _table(
    value: Any, path: tuple[str | int, ...], problems: list[Problem], write: str
) -> Mapping[str, Any] | None:
    if isinstance(value, Mapping):
        return value
    problems.append(Problem("a table is due here", write, path))
    return None


def _materials(data: Any, problems: list[Problem]) -> Materials:
    own: dict[str, dict[str, Constant]] = {}
    families: dict[str, str] = {}
    table = _table(data, ("materials",), problems, 'write [materials."my alloy"]') or {}
    for name, entries in table.items():
        path = ("materials", name)
        if not name.strip():
            problems.append(Problem("the material has no name", 'write [materials."my alloy"]', path))
        row = _table(entries, path, problems, f'write [materials."{name}"] and its properties below')
        if row is None:
            continue
        found: dict[str, tuple[Any, Source, Standing]] = {}
        for key, entry in row.items():
            if key == "family":
                families[name] = str(entry)
                if entry not in material_names():
                    problems.append(
                        Problem(
                            f"unknown material {entry!r}",
                            close_matches(str(entry), material_names()),
                            (*path, key),
                        )
                    )
            elif key not in PROPERTIES:
                problems.append(
                    Problem("unknown property", close_matches(key, [*PROPERTIES, "family"]), (*path, key))
                )
            else:
                value, source = _own_value(entry, (*path, key), PROPERTIES[key][0], problems)
                if value is not None:
                    found[key] = (value, Source("own", source), Standing.GIVEN)
        usable = {}
        for key, item in found.items():
            try:
                own_material(name, {key: item})
            except InputError as error:
                problems += [replace(p, path=(*path, key)) for p in error.problems]
            else:
                usable[key] = item
        own[name] = own_material(name, usable)
        for key, constant in own[name].items():
            if constant.value < 0 or (constant.value == 0 and key != "temperature_coefficient"):
                problems.append(
                    Problem(
                        f"{PROPERTIES[key][1]} must {'not be below' if key == 'temperature_coefficient' else 'be above'} 0",
                        "check the value",
                        (*path, key),
                    )
                )
    return Materials(own, families)


def _own_value(
    entry: Any, path: tuple[str | int, ...], unit: str, problems: list[Problem]
) -> tuple[Any, str]:
    """Return value text and source of a property of an own material."""
    write = f'write {path[-1]} = {{ value = "1 {unit}", source = "where it comes from" }}'
    if not isinstance(entry, Mapping):
        problems.append(
            Problem(
                "value and source are due: a verdict never rests on a number without a source", write, path
            )
        )
        return None, ""
    for key in entry:
        if key not in ("value", "unit", "source"):
            problems.append(
                Problem("unknown key", close_matches(key, ("value", "unit", "source")), (*path, key))
            )
    source = entry.get("source")
    value = entry.get("value")
    if not isinstance(source, str) or not source.strip():
        problems.append(Problem("the source is missing", write, path))
        return None, ""
    if "unit" in entry and isinstance(value, (int, float, str)) and not isinstance(value, bool):
        value = f"{value} {entry['unit']}"
    if value is None:
        problems.append(Problem("the value is missing", write, path))
    return value, str(source or "")


def _objects(
    data: Any, registry: Registry, materials: Materials, problems: list[Problem], skipped: list[str]
) -> list[StruckObject]:
    kinds = ", ".join(registry.kinds)
    write = f"write [[object]] and kind = one of {kinds}"
    if data is None or data == []:
        problems.append(Problem("no object is given", write))
        return []
    if isinstance(data, Mapping) or not isinstance(data, Sequence) or isinstance(data, str):
        problems.append(Problem("objects are a list", "write [[object]] with two brackets", ("object",)))
        return []
    out: list[StruckObject] = []
    seen: dict[str, int] = {}
    for number, entry in enumerate(data):
        path: tuple[str | int, ...] = ("object", number)
        table = _table(entry, path, problems, "write [[object]]")
        if table is None:
            continue
        name = table.get("name")
        called = _default_name(table, number)
        if isinstance(name, str):
            problems += [replace(p, path=(*path, "name")) for p in _name_problems(name)]
        if called.casefold() in seen:
            other = seen[called.casefold()] + 1
            problems.append(
                Problem(
                    f"the name {called!r} is that of object {other} as well",
                    "give each object a name of its own",
                    (*path, "name"),
                )
            )
        seen.setdefault(called.casefold(), number)
        thing = _object(table, number, path, registry, materials, problems, skipped)
        if thing is not None:
            out.append(thing)
    return out


def _default_name(table: Mapping[str, Any], number: int) -> str:
    name = table.get("name")
    return (
        name.strip()
        if isinstance(name, str) and name.strip()
        else f"{table.get('kind', 'object')} {number + 1}"
    )


def _name_problems(name: str) -> Iterable[Problem]:
    """Hold a name or title: it is printed in one line, and must not carry control characters to a terminal."""
    if not name.isprintable() or any("\u202a" <= c <= "\u202e" or "\u2066" <= c <= "\u2069" for c in name):
        yield Problem(
            "it holds characters that cannot be printed", "write it in one line, without control characters"
        )
    if len(name) > _LONGEST_NAME:
        yield Problem(f"it is {len(name)} characters long", f"use at most {_LONGEST_NAME}")


def _object(
    table: Mapping[str, Any],
    number: int,
    path: tuple[str | int, ...],
    registry: Registry,
    materials: Materials,
    problems: list[Problem],
    skipped: list[str],
) -> StruckObject | None:
    if "kind" not in table:
        problems.append(
            Problem(
                "the kind is missing", f"write kind = one of {', '.join(map(repr, registry.kinds))}", path
            )
        )
        return None
    try:
        kind = registry.kind(str(table["kind"]))
    except InputError as error:
        if registry.failures:  # its plugin may be the one that failed: the rest stands
            skipped.append(
                f"{_default_name(table, number)}: there is no kind {table['kind']!r}, and a plugin failed to load"
            )
        else:
            problems += [replace(p, path=(*path, "kind")) for p in error.problems]
        return None
    named = (
        {**table, "name": _default_name(table, number)}
        if isinstance(table.get("name", ""), str)
        else dict(table)
    )
    context = {"materials": materials, "collect": True}
    found: list[Problem] = []
    thing = validate(kind, named, path, context, found)
    problems += found
    sizes = list(kind.missing_or_extra(table.keys()))
    problems += [replace(p, path=(*path, *p.path)) for p in sizes]
    if not sizes:
        # What is wrong with the values taken together is told as well where only other fields are wrong.
        wrong = {p.path[len(path)] for p in found if len(p.path) > len(path)}
        sound = {key: value for key, value in named.items() if key not in wrong}
        checked = thing if thing is not None else validate(kind, sound, path, context, [])
        if checked is not None and not list(kind.missing_or_extra(sound.keys())):
            problems += [replace(p, path=(*path, *p.path)) for p in checked.check()]
    return thing


# -- lines -------------------------------------------------------------------------------------------------


def _line(problem: Problem, text: str) -> int:
    """Return the line of a problem; 0 for one of the command line."""
    from_command = problem.path and str(problem.path[0]).startswith("--")
    return 0 if from_command else locate(text, problem.path)


def _placed(problem: Problem, line: int, name: str, data: Mapping[str, Any]) -> Problem:
    return replace(problem, place=f"{name}:{line}" if line else "", path=_with_name(problem.path, data))


def _with_name(path: tuple[Any, ...], data: Mapping[str, Any]) -> tuple[str | int, ...]:
    """Put the object's name beside its number: ``object 2 (ridge sheet).thickness``."""
    if len(path) < 2 or path[0] != "object" or not isinstance(path[1], int):
        return path
    entry = data["object"][path[1]]
    name = entry.get("name") if isinstance(entry, Mapping) else None
    first = f"object {path[1] + 1}" + (f" ({name})" if isinstance(name, str) and name else "")
    return (first, *path[2:])
