"""What a plugin is: struck objects, effects, findings, and the hooks that list them.

A plugin is a module (found by the entry-point group ``strikeenergy.plugins``) with ``STRIKEENERGY_API = 1`` and up to
three hooks that take no arguments and only *list* things. The engine does the calling.
"""

from __future__ import annotations

import dataclasses
from collections.abc import Callable, Iterable, Mapping, Sequence
from dataclasses import dataclass, field
from typing import Any, get_args, get_type_hints

import numpy as np
import pluggy

from strikeenergy.inputs import StruckObject
from strikeenergy.lightning.flash import Flash
from strikeenergy.note import Note
from strikeenergy.sources import Source
from strikeenergy.units import Quantity

__all__ = [
    "API_VERSION",
    "Bracket",
    "Criterion",
    "Effect",
    "Finding",
    "Findings",
    "HookSpecs",
    "Later",
    "Validity",
    "Value",
    "Words",
    "effect",
    "findings_of",
    "hookimpl",
]

API_VERSION = 1
"""Raised when a plugin written for the old one could break."""

hookspec = pluggy.HookspecMarker("strikeenergy")
hookimpl = pluggy.HookimplMarker("strikeenergy")


class HookSpecs:
    """The hooks. Each lists things, is called once per load, and must be cheap."""

    @hookspec
    def strikeenergy_kinds(self) -> Iterable[type[StruckObject]]:
        """List the kinds of struck object that this plugin brings."""
        raise AssertionError("a specification is never called")

    @hookspec
    def strikeenergy_effects(self) -> Iterable[Effect]:
        """List the effects that this plugin brings, on its own kinds or on those of others."""
        raise AssertionError("a specification is never called")

    @hookspec
    def strikeenergy_tables(self) -> Iterable[Mapping[str, Any]]:
        """List the limit tables that this plugin brings, each as the content of a table file."""
        raise AssertionError("a specification is never called")


# -- findings ----------------------------------------------------------------------------------------------


@dataclass(frozen=True)
class Finding:
    """The declaration of one finding: SI unit (None for a word or truth value), meaning, unit to show, and bound.

    Args:
        unit: coherent SI unit; ``""`` for a plain number, None for a word or a truth value.
        meaning: what it is, in one line.
        show: unit to show it in.
        bound: ``"upper"`` or ``"lower"`` where it is a bound and not an estimate.
        ledger: ``"ohmic"``, ``"arc root"`` or ``"channel"`` where it is the energy that goes into the object.
        along: the input (a length) by which an energy per length is multiplied for the ledger.
    """

    unit: str | None
    meaning: str
    show: str | None = None
    bound: str = ""
    ledger: str = ""
    along: str = ""


@dataclass(frozen=True)
class Bracket:
    """A value between the low and the high end of a model bracket."""

    value: Quantity
    low: Quantity
    high: Quantity


@dataclass(frozen=True)
class Words:
    """Many words at once: codes into a tuple of names."""

    codes: np.ndarray[Any, np.dtype[np.int8]]
    names: tuple[str, ...]


@dataclass(frozen=True)
class Later:
    """A value that is computed when somebody first asks for it: what follows from large arrays, and is rarely wanted."""

    compute: Callable[[], Any]


Value = Quantity | Bracket | Words | Later | bool | str | None
"""What a finding may be. None: it does not apply or cannot be given; the note says why."""


class Findings:
    """Base of results classes: frozen dataclasses whose every field is ``Annotated[Value, Finding(...)]``.

    A field may be given as :class:`Later`; whoever reads it sees the value.
    """

    def __getattribute__(self, name: str) -> Any:
        value = object.__getattribute__(self, name)
        if isinstance(value, Later):
            value = value.compute()
            object.__setattr__(self, name, value)
        return value


def findings_of(results: type[Findings]) -> dict[str, Finding]:
    """Return the declaration of each field of a results class.

    Raises:
        TypeError: a field has no declaration.
    """
    if not dataclasses.is_dataclass(results):
        raise TypeError(f"{results.__name__} is not a dataclass")
    hints = get_type_hints(results, include_extras=True)
    found = {}
    for item in dataclasses.fields(results):
        marks = [mark for mark in get_args(hints[item.name])[1:] if isinstance(mark, Finding)]
        if len(marks) != 1:
            raise TypeError(
                f"{results.__name__}.{item.name} is not declared as Annotated[Value, Finding(...)]"
            )
        found[item.name] = marks[0]
    return found


@dataclass(frozen=True)
class Criterion:
    """When a finding is good enough: the comparison that an effect brings with it.

    Args:
        check: what is checked, such as ``"melting"``.
        value: what is compared: a finding, or ``"flash.peak"``, ``"flash.charge"``, ``"flash.specific_energy"``.
        limit: the finding that it is compared with.
        unit: SI unit of both.
        clause: where the criterion stands.
        source: the publication.
        below: whether the value must stay below the limit (else above).
        size: the size that a table's minimum is given for, and ...
        smallest: ... the finding that is the smallest such size for which the criterion just holds (for the reserve).
    """

    check: str
    value: str
    limit: str
    unit: str
    clause: str
    source: Source
    below: bool = True
    size: str = ""
    smallest: str = ""


@dataclass(frozen=True)
class Validity:
    """What a model covers, in words."""

    text: str


@dataclass(frozen=True)
class Effect:
    """What a stroke does to a kind of object: a function with its data sheet.

    Attributes:
        name: such as ``"heating"``.
        kind: the struck object it applies to.
        function: (object, flash, note) -> results. The flash is the part that flows through the object.
        results: the class of its findings.
        sources, rises_with, falls_with, validity, criteria, leaves_out: see :func:`effect`.
    """

    name: str
    kind: type[StruckObject]
    function: Callable[[Any, Flash, Note], Findings]
    results: type[Findings]
    findings: Mapping[str, Finding]
    sources: tuple[Source, ...] = ()
    rises_with: tuple[str, ...] = ()
    falls_with: tuple[str, ...] = ()
    validity: tuple[Validity, ...] = ()
    criteria: tuple[Criterion, ...] = ()
    leaves_out: tuple[str, ...] = ()
    summary: str = field(default="", compare=False)

    def __call__(self, thing: Any, flash: Flash, note: Note | None = None) -> Findings:
        """Compute. Without a note the working is not kept."""
        return self.function(thing, flash, note if note is not None else Note(quiet=True))


def effect(
    kind: type[StruckObject],
    *,
    name: str = "",
    sources: Sequence[Source] = (),
    rises_with: Sequence[str] = (),
    falls_with: Sequence[str] = (),
    validity: Sequence[str] = (),
    criteria: Sequence[Criterion] = (),
    leaves_out: Sequence[str] = (),
) -> Callable[[Callable[[Any, Flash, Note], Findings]], Effect]:
    """Declare a function (object, flash, note) -> results as an effect on a kind of object.

    Args:
        kind: the struck object.
        name: by default the name of the function.
        sources: what the model rests on.
        rises_with, falls_with: inputs (``"flash.specific_energy"``, ``"section"``) with which the first finding strictly
            rises or falls; state them only where that is strictly true.
        validity: what the model covers.
        criteria: the comparisons it brings with it.
        leaves_out: what the model leaves out; printed with every result.

    Raises:
        TypeError: the function does not say that it returns a results class, or a finding is not declared.
    """

    def declare(function: Callable[[Any, Flash, Note], Findings]) -> Effect:
        results = get_type_hints(function).get("return")
        if not (isinstance(results, type) and issubclass(results, Findings)):
            raise TypeError(f"{function.__name__} must be annotated to return a subclass of Findings")
        return Effect(
            name=name or function.__name__,
            kind=kind,
            function=function,
            results=results,
            findings=findings_of(results),
            sources=tuple(sources),
            rises_with=tuple(rises_with),
            falls_with=tuple(falls_with),
            validity=tuple(Validity(text) for text in validity),
            criteria=tuple(criteria),
            leaves_out=tuple(leaves_out),
            summary=(function.__doc__ or "").strip().split("\n")[0],
        )

    return declare
