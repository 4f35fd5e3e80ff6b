"""What comes out: findings, verdicts, failures, and the estimate that holds them."""

from __future__ import annotations

import html
from collections.abc import Iterable, Iterator
from dataclasses import dataclass, field
from typing import Any

import numpy as np

from strikeenergy.errors import ExitCode, PluginError, close_matches
from strikeenergy.formatting import engineering, format_number, format_quantity, pretty
from strikeenergy.inputs import StruckObject
from strikeenergy.lightning.flash import Flash
from strikeenergy.lightning.ledger import Ledger
from strikeenergy.note import Note
from strikeenergy.plugin import Words
from strikeenergy.units import convert, quantity

__all__ = ["CAUTIONS", "OUTCOMES", "Estimate", "FindingResult", "ObjectResult", "Verdict"]

OUTCOMES = ("falls short", "conditional", "not covered", "meets")
"""From the one that matters most."""

CAUTIONS = (
    "An estimate, not a design approval: local codes and the authority having jurisdiction come first, and design and "
    "inspection of lightning protection belong to licensed people.",
    "Heating, melting and force are some requirements among several: bonding, separation distance, earthing, joints and "
    "corrosion are not checked.",
    "Any design level is exceeded with some probability.",
    "Do not enter, touch or test a struck structure or tree before it is declared safe. Preserve evidence before "
    "destructive tests. Nothing here says that it is safe to stay outdoors.",
)


@dataclass(frozen=True)
class FindingResult:
    """One finding of one object: the value in SI, and what it rests on.

    ``value`` is a number, an array, a word, a truth value, or None with ``why_not``. ``low`` and ``high`` are the ends of a
    model bracket, where there is one.
    """

    name: str
    value: Any
    unit: str | None
    meaning: str
    effect: str
    standing: str
    sources: tuple[str, ...]
    low: Any = None
    high: Any = None
    show: str | None = None
    bound: str = ""
    why_not: str = ""

    @property
    def quantity(self) -> Any:
        """The value as a pint quantity (a word or truth value as it is; None where there is no value)."""
        if self.value is None or self.unit is None:
            return self.value
        return (
            quantity(self.value, self.unit or None).to(self.show)
            if self.show
            else quantity(self.value, self.unit or None)
        )

    def text(self) -> str:
        """The value for people."""
        if self.value is None:
            return "—"
        if isinstance(self.value, bool):
            return "yes" if self.value else "no"
        if isinstance(self.value, str):
            return self.value
        if isinstance(self.value, Words) or np.ndim(self.value):
            return f"{np.size(self.value.codes if isinstance(self.value, Words) else self.value)} values"
        return format_quantity(float(self.value), self.unit, self.show)

    def range_text(self) -> str:
        """The bracket for people, or nothing."""
        if self.low is None or np.ndim(self.low):
            return ""
        shown = self.show or engineering(float(self.high), self.unit or "")
        ends = [
            format_number(float(convert(end, shown)) if shown else float(end))
            for end in (self.low, self.high)
        ]
        return f"{ends[0]} to {ends[1]} {pretty(shown)}".strip()

    def to_dict(self) -> dict[str, Any]:
        """Return it for JSON, in SI."""
        out: dict[str, Any] = {
            "value": plain(self.value),
            "unit": (self.unit or "1") if self.unit is not None else None,
            "effect": self.effect,
            "standing": self.standing,
            "sources": list(self.sources),
        }
        if self.low is not None:
            out |= {"low": plain(self.low), "high": plain(self.high)}
        if self.bound:
            out["bound"] = self.bound
        if self.value is None and self.why_not:
            out["why_not"] = self.why_not
        return out

    def __repr__(self) -> str:
        return f"<{self.name} = {self.text()}>"


def plain(value: Any) -> Any:
    """Turn a value into what JSON knows; what is not finite becomes null."""
    if isinstance(value, Words):
        return [value.names[code] for code in value.codes.ravel().tolist()]
    if isinstance(value, np.ndarray) and value.ndim:
        return [plain(item) for item in value.tolist()]
    if isinstance(value, list):
        return [plain(item) for item in value]
    if isinstance(value, (np.generic, np.ndarray)):
        value = value.item()
    if isinstance(value, float) and not np.isfinite(value):
        return None
    return value


@dataclass(frozen=True)
class Verdict:
    """One comparison: a size with a table, a finding with a criterion, or a table's minimum with what is needed.

    Attributes:
        check: what is compared.
        sort: ``size``, ``effect`` or ``reserve``.
        outcome: ``meets``, ``conditional``, ``falls short`` or ``not covered``.
        value, limit: in SI, with ``unit``; None where nothing could be compared.
        margin: value over limit or limit over value, so that more than 1 is good.
        clause: where the limit stands, with its edition.
        standard: the standard, so that verdicts of different ones are never merged.
        counts: whether it decides the exit code (a comparison with a second standard, or a reserve, does not).
        note: why, and what to tell where it depends.
        standing: how firmly the limit stands.
        sources: the publications.
    """

    check: str
    sort: str
    outcome: str
    value: float | None
    limit: float | None
    unit: str
    margin: float | None
    clause: str
    standard: str
    counts: bool
    note: str
    standing: str
    sources: tuple[str, ...]
    show: str | None = None
    rank: float | None = None
    """The margin as a ratio of sizes, where the check is of something else: what margins are compared by."""

    def numbers(self) -> str:
        """The value against the limit, for people."""
        if self.value is None or self.limit is None:
            return ""
        return f"{format_quantity(self.value, self.unit, self.show)} against {format_quantity(self.limit, self.unit, self.show)}"

    def to_dict(self) -> dict[str, Any]:
        """Return it for JSON, in SI."""
        return {
            "check": self.check,
            "sort": self.sort,
            "outcome": self.outcome,
            "value": {"value": plain(self.value), "unit": self.unit},
            "limit": {"value": plain(self.limit), "unit": self.unit},
            "margin": plain(self.margin),
            "clause": self.clause,
            "standard": self.standard,
            "counts": self.counts,
            "note": self.note,
            "standing": self.standing,
            "sources": list(self.sources),
        }


@dataclass
class ObjectResult:
    """What one object of the case comes to."""

    name: str
    kind: str
    thing: StruckObject
    findings: dict[str, FindingResult] = field(default_factory=dict)
    verdicts: list[Verdict] = field(default_factory=list)
    remarks: list[str] = field(default_factory=list)
    failures: list[PluginError] = field(default_factory=list)
    notes: dict[str, Note] = field(default_factory=dict)
    """The calculation note of each effect."""

    def __getitem__(self, finding: str) -> Any:
        """Return a finding as a quantity."""
        if finding not in self.findings:
            raise KeyError(f"no finding {finding!r}; {close_matches(finding, self.findings)}")
        return self.findings[finding].quantity

    @property
    def counting(self) -> list[Verdict]:
        """The verdicts that decide."""
        return [verdict for verdict in self.verdicts if verdict.counts]

    @property
    def outcome(self) -> str:
        """The outcome that matters most; ``no verdict`` where nothing was compared."""
        outcomes = {verdict.outcome for verdict in self.counting}
        return next((outcome for outcome in OUTCOMES if outcome in outcomes), "no verdict")

    @property
    def governing(self) -> Verdict | None:
        """The verdict that decides: of the worst outcome, the one with the least margin."""
        worst = [v for v in self.counting if v.outcome == self.outcome]
        return min(worst, key=_tightness, default=None)

    def to_dict(self) -> dict[str, Any]:
        """Return it for JSON, in SI."""
        return {
            "name": self.name,
            "kind": self.kind,
            "outcome": self.outcome,
            "governing": self.governing.check if self.governing else None,
            "findings": {name: found.to_dict() for name, found in self.findings.items()},
            "verdicts": [verdict.to_dict() for verdict in self.verdicts],
            "failures": [failure_dict(failure) for failure in self.failures],
            "remarks": list(self.remarks),
        }

    def __repr__(self) -> str:
        return f"<{self.name}: {self.outcome}{_by(self.governing)}>"


def _tightness(verdict: Verdict) -> float:
    """A margin in W/R goes with the square of the size: compare sizes with sizes."""
    margin = verdict.rank if verdict.rank is not None else verdict.margin
    return float("inf") if margin is None else margin


def _by(governing: Verdict | None) -> str:
    if governing is None:
        return ""
    margin = f", margin {format_number(governing.margin, 3)}" if governing.margin is not None else ""
    return f" ({governing.check}{margin})"


def failure_dict(failure: PluginError) -> dict[str, str]:
    """Return a failure for JSON."""
    return {
        "plugin": failure.plugin,
        "distribution": failure.distribution,
        "stage": failure.stage,
        "reason": failure.reason,
    }


@dataclass
class Estimate:
    """What the whole case comes to."""

    title: str
    sha256: str
    flash: Flash
    objects: list[ObjectResult]
    failures: list[PluginError]
    software: dict[str, Any]
    standard: str
    skipped: tuple[str, ...] = ()
    """Objects that are left out because the plugin of their kind failed to load."""
    ledger: Ledger | None = None
    """The energy that goes into each object beside that of the whole flash; None where no object takes any."""
    cautions: tuple[str, ...] = CAUTIONS

    def __getitem__(self, name: str) -> ObjectResult:
        """Return the result of an object by its name."""
        for result in self.objects:
            if result.name == name:
                return result
        raise KeyError(f"no object {name!r}; {close_matches(name, [r.name for r in self.objects])}")

    def __iter__(self) -> Iterator[ObjectResult]:
        return iter(self.objects)

    def __len__(self) -> int:
        return len(self.objects)

    @property
    def all_failures(self) -> list[PluginError]:
        """Failures of loading and of computing."""
        return [*self.failures, *(failure for result in self.objects for failure in result.failures)]

    @property
    def exit_code(self) -> ExitCode:
        """What the shell is told. A failed plugin comes before a shortfall: the result is not complete."""
        if self.all_failures:
            return ExitCode.PLUGIN
        if any(result.outcome == "falls short" for result in self.objects):
            return ExitCode.FALLS_SHORT
        given = [
            found for result in self.objects for found in result.findings.values() if found.value is not None
        ]
        compared = [v for result in self.objects for v in result.verdicts if v.outcome != "not covered"]
        return ExitCode.OK if given or compared else ExitCode.NO_RESULT

    def sentence(self) -> str:
        """The verdict in words: how many fall short, and which part governs."""
        counts = [
            (outcome, sum(r.outcome == outcome for r in self.objects))
            for outcome in (*OUTCOMES, "no verdict")
        ]
        said = ", ".join(f"{number} {_plural(outcome, number)}" for outcome, number in counts if number)
        return f"{len(self.objects)} object{'s' if len(self.objects) != 1 else ''}: {said}"

    def to_dict(self) -> dict[str, Any]:
        """Return it for JSON: SI units, no dates, so that the same input gives the same bytes."""
        return {
            "schema_version": 1,
            "case": {"title": self.title, "sha256": self.sha256, "standard": self.standard},
            "flash": self.flash.to_dict(),
            "objects": [result.to_dict() for result in self.objects],
            "failures": [failure_dict(failure) for failure in self.failures],
            "skipped": list(self.skipped),
            "ledger": self.ledger.to_dict() if self.ledger else None,
            "cautions": list(self.cautions),
            "software": self.software,
        }

    def __repr__(self) -> str:
        return f"<Estimate {self.title!r}, {self.flash.name or 'given strokes'}: {self.sentence()}>"

    def _repr_html_(self) -> str:
        return _table(self)


def _plural(outcome: str, number: int) -> str:
    if number == 1:
        return {"meets": "meets its checks"}.get(outcome, outcome)
    return {"falls short": "fall short", "meets": "meet their checks"}.get(outcome, outcome)


def _table(estimate: Estimate) -> str:
    def cells(values: Iterable[str], tag: str = "td") -> str:
        return "<tr>" + "".join(f"<{tag}>{html.escape(value)}</{tag}>" for value in values) + "</tr>"

    rows = [cells(("object", "outcome", "check", "value against limit", "margin", "clause"), "th")]
    for result in estimate.objects:
        for verdict in result.counting or [None]:  # type: ignore[list-item]
            if verdict is None:
                rows.append(cells((result.name, result.outcome, "", "", "", "")))
                continue
            margin = "" if verdict.margin is None else format_number(verdict.margin, 3)
            rows.append(
                cells(
                    (result.name, verdict.outcome, verdict.check, verdict.numbers(), margin, verdict.clause)
                )
            )
    title = html.escape(f"{estimate.title}: {estimate.sentence()}")
    caution = html.escape(estimate.cautions[0])
    return (
        f"<div class='strikeenergy'><p><b>{title}</b></p><table>{''.join(rows)}</table><p>{caution}</p></div>"
    )
