"""What a record gives, in words: values with their uncertainty, checks, and the tolerances of a test."""

from __future__ import annotations

import csv
import io
from collections.abc import Sequence
from typing import Any

from strikeenergy.formatting import format_quantity
from strikeenergy.lightning.record import Record
from strikeenergy.lightning.reduction import Measured, Reduction
from strikeenergy.lightning.tolerances import ToleranceResult
from strikeenergy.report.text import wrap

__all__ = ["record_csv", "record_data", "record_text"]

_WORDS = {
    "peak": "peak",
    "front_time": "front time T1 (10/90)",
    "half_value_time": "time to half value T2",
    "charge": "charge",
    "specific_energy": "specific energy W/R",
    "duration": "duration",
    "reversal": "reversal",
}
_MARKS = {"pass": "✔", "fail": "✖", "not measured": "–", "ok": "✔", "flag": "!"}


def record_data(record: Record, reduction: Reduction, held: Sequence[ToleranceResult]) -> dict[str, Any]:
    """Return it for JSON, in SI."""
    out = {
        "schema_version": 1,
        "record": record.name,
        "understood": dict(record.understood),
        **reduction.to_dict(),
    }
    if held:
        out["tolerances"] = [result.to_dict() for result in held]
    return out


def record_csv(reduction: Reduction, held: Sequence[ToleranceResult]) -> str:
    """Write one quantity a line, in SI."""
    out = io.StringIO()
    columns = ("quantity", "value", "unit", "uncertainty", "outcome", "nominal", "low", "high", "remark")
    writer = csv.DictWriter(out, columns, restval="", lineterminator="\n")
    writer.writeheader()
    for name in _WORDS:
        value: Measured = getattr(reduction, name)
        writer.writerow({"quantity": name, **{k: v for k, v in value.to_dict().items() if v is not None}})
    for result in held:
        row = {k: v for k, v in result.to_dict().items() if k in columns and v is not None}
        writer.writerow(row)
    for check in reduction.checks:
        writer.writerow({"quantity": f"check {check.name}", "outcome": check.outcome, "remark": check.text})
    return out.getvalue()


def record_text(record: Record, reduction: Reduction, held: Sequence[ToleranceResult], spec: str = "") -> str:
    """Write it for people, at most 80 columns."""
    title = f"Record {record.name}"
    lines = [title, "=" * min(len(title), 80)]
    lines += wrap("Understood as: " + ", ".join(f"{k} {v}" for k, v in record.understood.items()), "  ", "")
    lines += ["", "Values, with one standard uncertainty"]
    for name, word in _WORDS.items():
        lines += wrap(f"  {word:<24} {_value(getattr(reduction, name))}", " " * 27, "")
    tail = reduction.tail
    if tail is not None and tail.charge is not None and tail.specific_energy is not None:
        lines += wrap(
            f"  cut tail, not added: a fitted exponential would add {format_quantity(tail.charge, 'C')} and "
            f"{format_quantity(tail.specific_energy, 'J/ohm')}",
            "    ",
            "",
        )
    lines += wrap(
        f"  offset {format_quantity(reduction.offset.offset, 'A')} removed; noise bias "
        f"{format_quantity(reduction.noise_bias, 'J/ohm')} taken off W/R; polarity "
        f"{'positive' if reduction.polarity > 0 else 'negative'}",
        "    ",
        "",
    )
    lines += ["", "Checks"]
    for check in reduction.checks:
        lines += wrap(f"{check.name}: {check.text}", "    ", f"  {_MARKS[check.outcome]} ")
    for text in record.remarks:
        lines += wrap(text, "    ", "  - ")
    if held:
        failed = sum(result.outcome == "fail" for result in held)
        lines += ["", f"Against {spec}: {f'{failed} of {len(held)} fail' if failed else 'none fails'}"]
        for result in held:
            lines += _held(result)
    return "\n".join(line.rstrip() for line in lines) + "\n"


def _value(measured: Measured) -> str:
    if measured.value is None:
        return "not given by this record"
    text = format_quantity(measured.value, measured.unit)
    if measured.uncertainty is None:
        return text
    return f"{text} ± {format_quantity(measured.uncertainty, measured.unit, None, 2)}"


def _held(result: ToleranceResult) -> list[str]:
    ends = [None if end is None else format_quantity(end, result.unit) for end in (result.low, result.high)]
    between = (
        " to ".join(end for end in ends if end)
        if all(ends)
        else f"at most {ends[1]}"
        if ends[1]
        else f"at least {ends[0]}"
    )
    value = "not measured" if result.value is None else format_quantity(result.value, result.unit)
    chosen = f" ({result.tolerance})" if result.tolerance else ""
    first = f"  {_MARKS[result.outcome]} "
    lines = wrap(
        f"{result.outcome}: {_WORDS.get(result.quantity, result.quantity)} {value}, allowed {between}{chosen}",
        "      ",
        first,
    )
    lines += wrap(f"{result.source}; {result.standing}", "        ", "      ")
    return lines + (wrap(result.remark, "      ") if result.remark else [])
