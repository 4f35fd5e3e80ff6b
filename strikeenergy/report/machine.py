"""Results for other programs: JSON (one object, sorted keys, SI, no dates) and CSV (one record a line)."""

from __future__ import annotations

import csv
import io
import json
from typing import Any

from strikeenergy.results import Estimate, plain

__all__ = ["COLUMNS", "to_csv", "to_json"]

COLUMNS = (
    "object",
    "kind",
    "record",
    "name",
    "value",
    "unit",
    "low",
    "high",
    "outcome",
    "limit",
    "margin",
    "clause",
    "counts",
    "standing",
    "note",
)


def to_json(data: dict[str, Any]) -> str:
    """Write one JSON object, keys sorted, so that two runs can be compared line by line."""
    return json.dumps(data, sort_keys=True, indent=2, ensure_ascii=False, allow_nan=False) + "\n"


def to_csv(estimate: Estimate) -> str:
    """Write one record a line: findings, verdicts, remarks and failures, values in SI."""
    out = io.StringIO()
    writer = csv.DictWriter(out, COLUMNS, restval="", lineterminator="\n")
    writer.writeheader()
    for result in estimate.objects:
        common = {"object": result.name, "kind": result.kind}
        for name, found in result.findings.items():
            record = {
                "record": "finding",
                "name": name,
                "value": plain(found.value),
                "unit": found.unit,
                "low": plain(found.low),
                "high": plain(found.high),
                "standing": found.standing,
                "note": found.why_not or found.bound,
            }
            writer.writerow(_safe({**common, **record}))
        for verdict in result.verdicts:
            record = {
                "record": verdict.sort,
                "name": verdict.check,
                "value": verdict.value,
                "unit": verdict.unit,
                "outcome": verdict.outcome,
                "limit": verdict.limit,
                "margin": verdict.margin,
                "clause": verdict.clause,
                "counts": "yes" if verdict.counts else "no",
                "standing": verdict.standing,
                "note": verdict.note,
            }
            writer.writerow(_safe({**common, **record}))
        for text in result.remarks:
            writer.writerow(_safe({**common, "record": "remark", "note": text}))
        for failure in result.failures:
            writer.writerow(_safe({**common, "record": "failure", "note": str(failure)}))
    for failure in estimate.failures:
        writer.writerow(_safe({"record": "failure", "note": str(failure)}))
    for text in estimate.cautions:
        writer.writerow(_safe({"record": "caution", "note": text}))
    return out.getvalue()


def _safe(record: dict[str, Any]) -> dict[str, Any]:
    """Keep a text that begins like a formula from being one when a spreadsheet opens the file."""
    out = {}
    for key, value in record.items():
        if value is None:
            continue
        if isinstance(value, str) and value[:1] in ("=", "+", "-", "@"):
            value = "'" + value
        out[key] = value
    return out
