"""Everything that can go wrong, and what the shell is told.

::

    StrikeEnergyError
    ├─ InputError        exit 3   the user can mend it; holds every problem found, each with place and cure
    │  ├─ QuantityError           a text or value is not the quantity that is due
    │  ├─ UnknownName             a material, kind, threat, table ... that does not exist; with close matches
    │  └─ MissingInput            an effect needs a value that was not given (recorded, the run goes on)
    ├─ OutsideValidity   exit 4   no model covers this (recorded, the run goes on)
    ├─ PluginError       exit 5   a plugin broke the contract; plugin, distribution and stage are attached
    └─ DataError         exit 70  a table that ships with the program is damaged: a fault of ours
"""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass, field
from difflib import get_close_matches
from enum import IntEnum

__all__ = [
    "DataError",
    "ExitCode",
    "InputError",
    "MissingInput",
    "OutsideValidity",
    "PluginError",
    "Problem",
    "QuantityError",
    "StrikeEnergyError",
    "UnknownName",
    "close_matches",
]


class ExitCode(IntEnum):
    """What the program tells the shell. One enum, used everywhere."""

    OK = 0
    """Ran, and nothing falls short."""
    FALLS_SHORT = 1
    """Ran, and at least one verdict that counts falls short."""
    MISUSE = 2
    """The command itself was misused (click's own code)."""
    INPUT = 3
    """A case, table or value was refused."""
    NO_RESULT = 4
    """Ran, but no model's validity covers anything that was asked."""
    PLUGIN = 5
    """A plugin failed; the results of the others stand."""
    FAULT = 70
    """A fault of the program itself."""


@dataclass(frozen=True)
class Problem:
    """One thing that is wrong: where it stands, what it is, and what to write instead."""

    what: str
    write: str = ""
    path: tuple[str | int, ...] = ()
    place: str = ""
    """``file:line`` once known."""

    def __str__(self) -> str:
        text = self.what if not self.write else f"{self.what}; {self.write}"
        where = spell_path(self.path)
        if where:
            text = f"{where}: {text}"
        return f"{self.place}: {text}" if self.place else text


def spell_path(path: Sequence[str | int]) -> str:
    """Spell a key path for people: ``("object", 1, "bend", "leg")`` is ``object 2.bend.leg``."""
    out = ""
    for part in path:
        if isinstance(part, int):
            out += f" {part + 1}"
        else:
            out += f".{part}" if out else part
    return out


class StrikeEnergyError(Exception):
    """Base of every error that this program raises on purpose."""

    exit_code: ExitCode = ExitCode.FAULT


class InputError(StrikeEnergyError):
    """What the user gave is refused. Holds all problems that were found, not only the first."""

    exit_code = ExitCode.INPUT

    def __init__(self, problems: Iterable[Problem] | str) -> None:
        self.problems = (Problem(problems),) if isinstance(problems, str) else tuple(problems)
        super().__init__(self.problems)

    def __str__(self) -> str:
        return "\n".join(str(problem) for problem in self.problems)


class QuantityError(InputError):
    """A text or a value is not the quantity that is due. Says what to write."""

    def __init__(self, what: str, write: str = "") -> None:
        super().__init__([Problem(what, write)])
        self.what, self.write = what, write

    def __reduce__(self) -> tuple[type[QuantityError], tuple[str, str]]:
        return type(self), (self.what, self.write)


class UnknownName(InputError):
    """A name that does not exist. Says the sort of thing and the nearest names that do."""

    def __init__(self, sort: str, name: str, known: Iterable[str]) -> None:
        self.sort, self.name, self.known = sort, name, tuple(known)
        super().__init__([Problem(f"unknown {sort} {name!r}", close_matches(name, self.known))])

    def __reduce__(self) -> tuple[type[UnknownName], tuple[str, str, tuple[str, ...]]]:
        return type(self), (self.sort, self.name, self.known)


class MissingInput(InputError):
    """An effect needs a value that the user did not give. The engine records it and goes on."""

    def __init__(self, what: str, write: str = "") -> None:
        super().__init__([Problem(what, write)])
        self.what, self.write = what, write

    def __reduce__(self) -> tuple[type[MissingInput], tuple[str, str]]:
        return type(self), (self.what, self.write)


class OutsideValidity(StrikeEnergyError):
    """The model does not cover these inputs. The engine records it and goes on."""

    exit_code = ExitCode.NO_RESULT


@dataclass
class PluginError(StrikeEnergyError):
    """A plugin broke the contract: which, from which distribution, at which stage, and why."""

    plugin: str
    distribution: str
    stage: str
    """import, register, list or compute."""
    reason: str
    exit_code: ExitCode = field(default=ExitCode.PLUGIN, repr=False)

    def __str__(self) -> str:
        return f"plugin {self.plugin} ({self.distribution}) failed to {self.stage}: {self.reason}"

    def __reduce__(self) -> tuple[type[PluginError], tuple[str, str, str, str]]:
        return type(self), (self.plugin, self.distribution, self.stage, self.reason)


class DataError(StrikeEnergyError):
    """A data table is damaged. For tables that ship with the program this is a fault of ours."""


def close_matches(name: str, known: Iterable[str]) -> str:
    """Say which known names are near, or list them where they are few."""
    names = list(dict.fromkeys(known))
    folded = {n.casefold(): n for n in names}
    near = [folded[m] for m in get_close_matches(name.casefold(), list(folded), n=3, cutoff=0.6)]
    if near:
        return "did you mean " + " or ".join(repr(n) for n in near) + "?"
    if names and len(names) <= 24:
        return "known: " + ", ".join(repr(n) for n in names)
    return f"{len(names)} names are known; 'strikeenergy describe' lists them" if names else ""
