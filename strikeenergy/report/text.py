"""Results for people: verdict first, then why, then what is left out. At most 80 columns."""

from __future__ import annotations

import textwrap
from collections.abc import Iterable

from strikeenergy.formatting import format_number, format_quantity
from strikeenergy.lightning.flash import Flash
from strikeenergy.note import Note, show_symbol
from strikeenergy.results import Estimate, FindingResult, ObjectResult, Verdict
from strikeenergy.sources import Constant

__all__ = ["WIDTH", "estimate_text", "notes_text", "wrap"]

WIDTH = 80
_MARKS = {"meets": "✔", "conditional": "?", "falls short": "✖", "not covered": "–", "no verdict": "–"}


def wrap(text: str, indent: str = "", first: str | None = None) -> list[str]:
    """Fold a text to the width."""
    return textwrap.wrap(
        text,
        WIDTH,
        initial_indent=indent if first is None else first,
        subsequent_indent=indent,
        break_on_hyphens=False,
    ) or [""]


def estimate_text(estimate: Estimate) -> str:
    """Write the whole result."""
    lines = [estimate.title, "=" * min(len(estimate.title), WIDTH)]
    lines += wrap(f"{estimate.sentence()}. Judged by {estimate.standard}.")
    lines += wrap(_flash_text(estimate.flash), "       ", "Flash: ")
    for text in estimate.flash.remarks:
        lines += wrap(text, "       ")
    lines.append("")
    width = max(len(result.name) for result in estimate.objects)
    for result in estimate.objects:
        governing = result.governing
        margin = (
            f"  margin {margin_text(governing.margin)}" if governing and governing.margin is not None else ""
        )
        line = f"{_MARKS[result.outcome]} {result.name:<{min(width, 34)}}  {result.outcome:<11}"
        lines += wrap(f"{line}{f'  {governing.check}' if governing else ''}{margin}", " " * 6, "")
    for result in estimate.objects:
        lines += ["", *_object_lines(result)]
    if estimate.ledger is not None:
        lines += ["", *estimate.ledger.lines()]
    lines += ["", *_left_out(estimate)]
    if estimate.skipped:
        lines += ["", "LEFT OUT"]
        for text in estimate.skipped:
            lines += wrap(text, "    ", "  ! ")
    if estimate.failures:
        lines += ["", "FAILED PLUGINS"]
        for failure in estimate.failures:
            lines += wrap(str(failure), "    ", "  ! ")
    lines += ["", "Cautions"]
    for text in estimate.cautions:
        lines += wrap(text, "  ", "- ")
    return "\n".join(line.rstrip() for line in lines) + "\n"


def _flash_text(flash: Flash) -> str:
    values = []
    data = flash.to_dict()
    for name, word in (("peak", "peak"), ("charge", "charge"), ("specific_energy", "W/R")):
        value = data[name]["value"]
        if isinstance(value, list):
            values.append(f"{word} {len(value)} values")
        elif value is not None:
            values.append(f"{word} {format_quantity(value, data[name]['unit'])}")
    source = f" ({flash.source}; {flash.standing})" if flash.source else ""
    strokes = f"{len(flash.strokes)} stroke" + ("s" if len(flash.strokes) > 1 else "")
    return f"{flash.name or 'as given'}: {', '.join([*values, strokes])}{source}"


def _object_lines(result: ObjectResult) -> list[str]:
    described = [result.kind]
    for name in ("material", "use"):
        value = getattr(result.thing, name, None)
        if isinstance(value, str):
            described.append(value)
    title = f"{result.name} ({', '.join(described)})"
    lines = [title, "-" * min(len(title), WIDTH)]
    for sort, heading in (("size", "Sizes"), ("effect", "Effects"), ("reserve", "Reserve of the table")):
        verdicts = [v for v in result.verdicts if v.sort == sort and (v.counts or sort != "size")]
        if verdicts:
            lines.append(heading)
            for verdict in verdicts:
                lines += _verdict_lines(verdict, result.governing)
    others = [v for v in result.verdicts if not v.counts and v.sort == "size"]
    if others:
        lines.append("For comparison (does not decide)")
        for verdict in others:
            lines += _verdict_lines(verdict, None, brief=True)
    if result.findings:
        lines.append("Findings")
    for found in result.findings.values():
        lines += _finding_lines(found)
    reasons: dict[str, list[str]] = {}
    for found in result.findings.values():
        if found.value is None:
            reasons.setdefault(found.why_not or "not known", []).append(found.name.replace("_", " "))
    for why, names in reasons.items():
        several = f" and {len(names) - 1} more" if len(names) > 2 else ""
        lines += wrap(
            f"not given: {names[0] if several else ' and '.join(names)}{several} ({why})", "    ", "  "
        )
    if result.remarks:
        lines.append("Remarks")
        for text in result.remarks:
            lines += wrap(text, "    ", "  - ")
    for failure in result.failures:
        lines += wrap(f"FAILED: {failure}", "    ", "  ! ")
    return lines


def _left_out(estimate: Estimate) -> list[str]:
    """What the models leave out, once per effect and not once per object."""
    by_effect: dict[str, list[str]] = {}
    for result in estimate.objects:
        for effect, note in result.notes.items():
            if note.left_out:
                by_effect.setdefault(f"{result.kind} {effect}", list(note.left_out))
    lines = ["What the models leave out"] if by_effect else []
    for effect, texts in by_effect.items():
        lines += wrap(f"{effect}: {'; '.join(texts)}.", "    ", "  ")
    return lines


def margin_text(margin: float) -> str:
    """Write a margin so that 1 stands out: 1.00, 0.45, 20.4."""
    return f"{margin:.2f}" if margin < 10 else format_number(margin, 4)


def _verdict_lines(verdict: Verdict, governing: Verdict | None, brief: bool = False) -> list[str]:
    margin = "" if verdict.margin is None else f", margin {margin_text(verdict.margin)}"
    numbers = f": {verdict.numbers()}" if verdict.numbers() else ""
    tag = "  (governs)" if verdict is governing else ""
    first = f"  {_MARKS[verdict.outcome]} "
    lines = wrap(f"{verdict.outcome}: {verdict.check}{numbers}{margin}{tag}", "      ", first)
    firm = "" if verdict.standing in ("published", "") else f" [limit {verdict.standing}]"
    lines += wrap(f"{verdict.clause}{firm}", "        ", "      ")
    if verdict.note and (not brief or verdict.outcome in ("conditional", "not covered")):
        lines += wrap(verdict.note, "      ")
    return lines


def _finding_lines(found: FindingResult) -> list[str]:
    if found.value is None:
        return []
    name = found.name.replace("_", " ")
    bound = f" ({found.bound})" if found.bound else ""
    bracket = f"  [{found.range_text()}]" if found.range_text() else ""
    return wrap(f"  {name:<30} {found.text()}{bound}{bracket}", " " * 33, "")


# -- the calculation note ------------------------------------------------------------------------------------


def notes_text(estimate: Estimate) -> str:
    """Write the calculation notes: every formula with symbols, with the values put in, and the source of each constant."""
    lines = ["CALCULATION NOTES", "=" * 17, *wrap("Values stand in SI units, as they were computed.")]
    for result in estimate.objects:
        for effect, note in result.notes.items():
            lines += [
                "",
                f"{result.name}: {effect}",
                "-" * min(len(f"{result.name}: {effect}"), WIDTH),
                *_note_lines(note),
            ]
    return "\n".join(line.rstrip() for line in lines) + "\n"


def _note_lines(note: Note) -> Iterable[str]:
    for number, step in enumerate(note.steps, 1):
        yield from wrap(f"{step.meaning or step.symbol}", "    ", f"{number:>2}. ")
        if step.formula is not None:
            yield from wrap(f"{step.symbol} = {step.formula_text()}", "          ", "      ")
            yield from wrap(f"{' ' * len(step.symbol)} = {step.substitution()}", "          ", "      ")
        yield from wrap(f"{' ' * len(step.symbol)} = {step.result_text()}", "          ", "      ")
        if step.source is not None:
            yield from wrap(f"[{step.source}]", "       ", "      ")
    if note.constants:
        yield "Constants"
        seen = set()
        for name, value in note.constants:
            if (name, value.value) in seen:
                continue
            seen.add((name, value.value))
            yield from _constant_lines(show_symbol(name), value)
    if note.assumptions:
        yield "Assumptions"
        for value in note.assumptions:
            yield from _constant_lines("", value)
    for heading, texts in (("Remarks", note.remarks), ("Left out", note.left_out)):
        if texts:
            yield heading
            for text in texts:
                yield from wrap(text, "    ", "  - ")
    if note.unknowns:
        yield "Not given"
        for name, why in note.unknowns.items():
            yield from wrap(f"{name}: {why}", "    ", "  - ")


def _constant_lines(symbol: str, value: Constant) -> Iterable[str]:
    shown = (
        "degC"
        if value.unit == "K" and "temperature" in value.meaning and "coefficient" not in value.meaning
        else None
    )
    named = f"{symbol} = " if symbol else ""
    yield from wrap(
        f"{named}{format_quantity(value.value, value.unit, shown, 6)}, {value.meaning}", "      ", "  "
    )
    yield from wrap(f"{value.source}; {value.standing}", "      ", "    ")
