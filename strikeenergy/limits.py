"""The comparison layer: sizes and findings against published limits.

Three sorts of check, kept apart: *size* (the part against a table's minimum), *effect* (a finding against a criterion that
its effect brings), *reserve* (a table's minimum against the smallest size that the effect's criterion needs). Verdicts of
different standards are never merged. Only the standard that the case names decides the exit code.

Where a row depends on something the user has not said, every possibility is looked at: if all come to the same outcome,
that is the outcome; otherwise it is ``conditional`` and the note says what to tell.
"""

from __future__ import annotations

import itertools
from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from typing import Any, cast

import numpy as np

from strikeenergy.formatting import format_quantity
from strikeenergy.inputs import StruckObject
from strikeenergy.lightning.flash import Flash
from strikeenergy.limit_tables import SIZE_UNITS, Check, LimitTable, Row
from strikeenergy.plugin import Criterion, Words
from strikeenergy.registry import Registry
from strikeenergy.results import FindingResult, Verdict
from strikeenergy.sources import Constant, weakest
from strikeenergy.units import read

__all__ = ["effect_verdict", "meets", "not_judged", "reserves", "size_verdicts"]

_TOLERANCE = 1e-9


def meets(value: float, limit: float, below: bool = False) -> bool:
    """Whether a value holds a limit. Exactly at the limit meets it (relative tolerance 1e-9)."""
    return value <= limit * (1 + _TOLERANCE) if below else value >= limit * (1 - _TOLERANCE)


# -- size --------------------------------------------------------------------------------------------------


@dataclass(frozen=True)
class _Possibility:
    """What it comes to if the open questions are answered in one way."""

    limit: Constant
    quantity: str
    value: float | None
    base: bool
    says: tuple[str, ...]
    asks: tuple[str, ...]
    also: tuple[tuple[float | None, float], ...] = ()
    """Other sizes that have to hold as well: value and minimum."""

    @property
    def outcome(self) -> str:
        if self.value is None or any(value is None for value, _ in self.also):
            return "not covered"
        if any(not meets(value, least) for value, least in self.also if value is not None):
            return "falls short"
        return "meets" if meets(self.value, self.limit.value) else "falls short"


def size_verdicts(thing: StruckObject, kind: str, registry: Registry, standard: str) -> list[Verdict]:
    """Hold the sizes of an object against every table that applies to it.

    The chosen standard's verdicts count. Of another edition of it, only what differs is returned.
    """
    if thing.is_array:
        return []
    tables = [table for table in registry.limit_tables if table.kind == kind]
    if not tables:
        return []
    if thing.use is None:
        known = [repr(use) for use in type(thing).uses]
        uses = known[0] if len(known) == 1 else "one of " + ", ".join(known)
        return [_not_covered("minimum size", standard, standard, f"say what it is for: use = {uses}")]
    found: dict[tuple[str, str, str], Verdict] = {}
    for table in tables:
        if thing.use in table.uses or thing.use in table.perhaps:
            for check in table.checks:
                verdict = _judge(thing, table, check, counts=table.standard == standard)
                if verdict is not None:
                    found[table.standard, table.clause, check.name] = verdict
    family = standard.split(":")[0]
    out = []
    for (of, clause, name), verdict in found.items():
        chosen = found.get((standard, clause, name))
        edition = of != standard and of.split(":")[0] == family and chosen is not None
        if (
            edition
            and chosen is not None
            and (chosen.limit, chosen.outcome) == (verdict.limit, verdict.outcome)
        ):
            continue
        out.append(verdict)
    if not any(verdict.counts for verdict in out):
        out.insert(
            0,
            _not_covered(
                "minimum size",
                standard,
                standard,
                f"no table of {standard} that the program holds covers the use {thing.use!r}",
            ),
        )
    return sorted(out, key=lambda verdict: not verdict.counts)


def _not_covered(check: str, clause: str, standard: str, note: str, counts: bool = True) -> Verdict:
    return Verdict(
        check, "size", "not covered", None, None, "1", None, clause, standard, counts, note, "", ()
    )


def _judge(thing: StruckObject, table: LimitTable, check: Check, counts: bool) -> Verdict | None:
    applies = _holds(check.applies_when, thing) if check.applies_when else True
    if applies is False:
        return None
    form, material = thing.facet("form"), thing.family
    rows = [
        row
        for row in check.rows
        if material in row.materials
        and (
            not row.forms
            or (form in row.forms if form else set(row.forms) & set(thing.facet("forms") or row.forms))
        )
        and (not row.uses or thing.use in row.uses)
    ]
    if not rows:
        known = dict.fromkeys(name for row in check.rows for name in row.materials)
        of = f"{material or 'the material'}" + (f" as {form}" if form and material in known else "")
        hint = "" if material in known else f" (rows: {', '.join(known)})"
        return _not_covered(
            check.name, table.full_clause, table.standard, f"the table has no row for {of}{hint}", counts
        )
    possible = [p for row in rows for p in _possibilities(row, thing, form)]
    verdict = _combine(thing, possible, table, check, counts)
    if verdict.outcome == "meets" and _holds(check.not_covered_when, thing):
        return _with(verdict, "not covered", check.not_covered)
    if applies is None and verdict.outcome == "falls short":
        return _with(verdict, "conditional", check.ask)
    if thing.use in table.perhaps and verdict.outcome == "falls short":
        return _with(verdict, "conditional", table.perhaps_say)
    return verdict


def _with(verdict: Verdict, outcome: str, note: str) -> Verdict:
    return Verdict(
        **{**verdict.__dict__, "outcome": outcome, "note": "; ".join(n for n in (note, verdict.note) if n)}
    )


def _possibilities(row: Row, thing: StruckObject, form: str | None) -> Iterable[_Possibility]:
    """Yield what the row comes to for every way of answering what the user has not said."""
    asks = []
    if form is None and row.forms:
        asks.append(f"form = {' or '.join(repr(f) for f in row.forms)}")
    only = _holds(row.only_when, thing) if row.only_when else True
    if only is False:
        yield _Possibility(row.minimum, row.quantity, None, True, (row.only_when_say,), tuple(asks))
        return
    says = tuple(text for text in (row.say, row.only_when_say) if text)
    if only is None:
        yield _Possibility(row.minimum, row.quantity, None, True, says, (*asks, *row.only_when))
    states = [_holds(variant.when, thing) for variant in row.variants]
    for answer in itertools.product(*((True, False) if state is None else (state,) for state in states)):
        limit, quantity, base, said = row.minimum, row.quantity, True, says
        also: dict[str, Constant] = {}
        asked = list(asks)
        for variant, state, holds in zip(row.variants, states, answer, strict=True):
            if holds:
                limit, quantity, base = variant.minimum, variant.quantity, False
                said, also = (*says, variant.say), dict(variant.also)
            if state is None:
                asked += [
                    f"{name} (now not said)"
                    for name in variant.when
                    if _holds({name: variant.when[name]}, thing) is None
                ]
        if only is None:
            asked.append(", ".join(row.only_when))
        size = thing.sizes().get(quantity)
        others = tuple(
            (None if (found := thing.sizes().get(name)) is None else float(found), least.value)
            for name, least in also.items()
        )
        yield _Possibility(
            limit, quantity, None if size is None else float(size), base, said, tuple(asked), others
        )


def _holds(when: Mapping[str, Any], thing: StruckObject) -> bool | None:
    """Whether a condition holds for an object; None where the object does not say. No condition: does not hold."""
    if not when:
        return False
    states: list[bool | None] = []
    for name, wanted in when.items():
        value = thing.facet(name)
        if value is None:
            states.append(None)
        elif isinstance(wanted, str) and wanted.startswith("<="):
            states.append(
                bool(
                    np.all(np.asarray(value) <= cast(float, read(wanted[2:].strip(), "m")) * (1 + _TOLERANCE))
                )
            )
        else:
            states.append(value in ((wanted,) if isinstance(wanted, str) else tuple(wanted)))
    if False in states:
        return False
    return None if None in states else True


def _combine(
    thing: StruckObject, possible: list[_Possibility], table: LimitTable, check: Check, counts: bool
) -> Verdict:
    outcomes = {p.outcome for p in possible}
    if len(outcomes) > 1 and "not covered" in outcomes:
        outcomes = outcomes - {"not covered"} | {"conditional"}
    outcome = outcomes.pop() if len(outcomes) == 1 else "conditional"
    measured = [p for p in possible if p.value is not None] or possible
    # Show the strictest limit that is met; where one is missed, the row's own limit.
    if outcome == "meets":
        shown = min(measured, key=lambda p: cast(float, p.value) / p.limit.value)
    else:
        shown = next((p for p in measured if p.base), measured[0])
    notes = [*shown.says]
    if outcome == "conditional":
        for p in measured:
            unit, show = SIZE_UNITS[p.quantity]
            ending = f" ({'; '.join(p.says)})" if p.says and p.says != shown.says else ""
            notes.append(f"{p.outcome} {p.quantity} {format_quantity(p.limit.value, unit, show)}{ending}")
        asks = dict.fromkeys(a for p in possible for a in p.asks)
        notes.append("tell: " + "; ".join(asks))
    elif outcome == "not covered":
        size = SIZE_UNITS[shown.quantity][1]
        lacks = f"give the {shown.quantity}: the limit is {format_quantity(shown.limit.value, shown.limit.unit, size)}"
        notes.append(next(iter(shown.says), lacks))
    if shown.quantity == "section" and thing.facet("form") in ("solid tape", "pipe") and not shown.also:
        notes.append("the section is checked, the thickness is not")
    notes += [text for text in (check.say, table.remark) if text]
    unit, show = SIZE_UNITS[shown.quantity]
    value, limit = shown.value, shown.limit.value
    rows = {row.quantity for row in check.rows if row.quantity != shown.quantity}
    renamed = not shown.base and shown.quantity in ("diameter", "section") and bool(rows)
    return Verdict(
        check=f"minimum {shown.quantity}" if renamed else check.name,
        sort="size",
        outcome=outcome,
        value=value,
        limit=limit,
        unit=unit,
        margin=None if value is None else value / limit,
        clause=table.full_clause,
        standard=table.standard,
        counts=counts,
        note="; ".join(dict.fromkeys(notes)),
        standing=str(weakest(p.limit.standing for p in possible)),
        sources=(str(shown.limit.source),),
        show=show,
    )


# -- effect and reserve --------------------------------------------------------------------------------------


def effect_verdict(
    criterion: Criterion, findings: Mapping[str, FindingResult], flash: Flash
) -> Verdict | None:
    """Hold a finding against the criterion that its effect brings. None where either is not known, or is an array."""
    value, limit = _number(criterion.value, findings, flash), _number(criterion.limit, findings, flash)
    if value is None or limit is None:
        return None
    good, bad = (limit, value) if criterion.below else (value, limit)
    found = findings.get(criterion.limit) or findings.get(criterion.value)
    return Verdict(
        check=criterion.check,
        sort="effect",
        outcome="meets" if meets(value, limit, below=criterion.below) else "falls short",
        value=value,
        limit=limit,
        unit=criterion.unit,
        margin=good / bad if bad else None,
        clause=criterion.clause,
        standard=criterion.source.citation.split(",")[0],
        counts=True,
        note="",
        standing=found.standing if found else "",
        sources=(str(criterion.source),),
    )


def not_judged(criterion: Criterion, why: str, counts: bool) -> Verdict:
    """Say that a criterion could not be held: whoever reads verdicts alone must see it."""
    return Verdict(
        check=criterion.check,
        sort="effect",
        outcome="not covered",
        value=None,
        limit=None,
        unit=criterion.unit,
        margin=None,
        clause=criterion.clause,
        standard=criterion.source.citation.split(",")[0],
        counts=counts,
        note=why,
        standing="",
        sources=(str(criterion.source),),
    )


def _number(name: str, findings: Mapping[str, FindingResult], flash: Flash) -> float | None:
    value = getattr(flash, name.removeprefix("flash.")) if name.startswith("flash.") else findings[name].value
    if value is None or isinstance(value, (bool, str, Words)) or np.ndim(value):
        return None
    return float(value)


def reserves(
    criterion: Criterion, findings: Mapping[str, FindingResult], sizes: Iterable[Verdict]
) -> list[Verdict]:
    """Hold the minimum of each table row that decides against the smallest size for which the criterion just holds."""
    if not criterion.smallest or criterion.smallest not in findings:
        return []
    needed = findings[criterion.smallest].value
    if needed is None or np.ndim(needed) or not needed:
        return []
    unit, show = SIZE_UNITS[criterion.size]
    return [
        Verdict(
            check=f"reserve of the table's minimum to {criterion.check}",
            sort="reserve",
            outcome="meets" if meets(verdict.limit, float(needed)) else "falls short",
            value=verdict.limit,
            limit=float(needed),
            unit=unit,
            margin=verdict.limit / float(needed),
            clause=verdict.clause,
            standard=verdict.standard,
            counts=False,
            note=f"the table's minimum against the smallest {criterion.size} that just reaches {criterion.check}",
            standing=verdict.standing,
            sources=(*verdict.sources, str(criterion.source)),
            show=show,
        )
        for verdict in sizes
        if verdict.counts and verdict.limit is not None and verdict.unit == unit
    ]
