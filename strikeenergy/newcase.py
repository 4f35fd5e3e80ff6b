"""A commented case to start from, and the JSON schema of case files. Both come from the declarations."""

from __future__ import annotations

import textwrap
from collections.abc import Sequence
from typing import Any

from strikeenergy.case import LedgerEntry
from strikeenergy.flashcase import FlashSection, StrokeEntry
from strikeenergy.inputs import Part, parts_of, summary_of, unit_of, words_of
from strikeenergy.lightning.threats import threat_names
from strikeenergy.materials import PROPERTIES, material_names, sets
from strikeenergy.registry import Registry

__all__ = ["case_schema", "new_case"]

_STROKE_KEYS = ("peak", "charge", "specific_energy", "duration", "polarity", "start", "shape")


def new_case(registry: Registry, name: str) -> str:
    """Write a commented case with one object of a kind. It runs as it stands.

    Raises:
        UnknownName: no such kind.
    """
    kind = registry.kind(name)
    lines = [
        "#:schema ./strikeenergy-case.schema.json",
        "# Lines that begin with '# ' and a key are what else may be said; take the '# ' away to use one.",
        'title = "My case"',
        "# standard = " + " | ".join(f'"{s}"' for s in registry.standards),
        "",
        "[flash]",
        'threat = "LPL I"        # or the strokes themselves:',
        "# [[flash.stroke]]",
        *(f"# {line}" for line in _example_lines(StrokeEntry, {}, True, _STROKE_KEYS)),
        "",
        "# The channel that the energy ledger holds the objects against.",
        "# [ledger]",
        *(f"# {line}" for line in _example_lines(LedgerEntry, {}, True)),
        "",
        "[[object]]",
        f'kind = "{name}"',
        f'name = "my {name}"',
    ]
    lines += _example_lines(kind, dict(kind.example_fields), False)
    for part, model in parts_of(kind):
        several = "tuple" in str(kind.model_fields[part].annotation)
        lines += [
            "",
            *textwrap.wrap(
                (kind.model_fields[part].description or "").strip(),
                78,
                initial_indent="# ",
                subsequent_indent="# ",
            ),
        ]
        lines.append(f"# [[object.{part}]]" if several else f"# [object.{part}]")
        lines += [f"# {line}" for line in _example_lines(model, {}, True)]
    return "\n".join(lines) + "\n"


def _example_lines(
    model: type[Part], set_fields: dict[str, Any], inside_comment: bool, only: Sequence[str] = ()
) -> list[str]:
    lines = []
    for name, info in model.model_fields.items():
        if (only and name not in only) or name in ("kind", "name") or name in dict(parts_of(model)):
            continue
        mark, words = unit_of(model, name), words_of(info.annotation)
        said = (info.description or "").strip().split("\n")[0]
        if name in set_fields:
            value = set_fields[name]
            lines.append(f"{name} = {_toml(value)}{_padded(said)}")
            continue
        if mark is not None:
            value = _toml(mark.text if mark.unit else float(mark.text))
        elif words:
            value = " | ".join(f'"{word}"' for word in words)
        elif name == "constants":
            value = " | ".join(f'"{s}"' for s in sets())
        elif name == "awg":
            value = '6 | "2/0"'
        elif name == "shape":
            value = '"10/350" | "heidler" | "rectangle"'
        elif name == "polarity":
            value = '"positive" | "negative"'
        else:
            value = '"..."'
        lines.append(f"{'' if inside_comment else '# '}{name} = {value}{_padded(said)}")
    return lines


def _toml(value: Any) -> str:
    return f'"{value}"' if isinstance(value, str) else f"{value:g}"


def _padded(said: str) -> str:
    return f"    # {said}" if said else ""


def case_schema(registry: Registry) -> dict[str, Any]:
    """Return the JSON schema of case files with the kinds that are installed."""
    definitions: dict[str, Any] = {}
    branches = []
    for name, kind in registry.kinds.items():
        own = kind.model_json_schema(ref_template="#/$defs/{model}")
        definitions |= own.pop("$defs", {})
        own["required"] = sorted({"kind", *own.get("required", [])})
        own["properties"]["kind"] = {"const": name, "description": summary_of(kind)}
        if kind.uses:
            own["properties"]["use"] = {"enum": list(kind.uses), "description": "What the part is for."}
        definitions[name] = own
        branches.append({"$ref": f"#/$defs/{name}"})
    flash = FlashSection.model_json_schema(ref_template="#/$defs/{model}")
    definitions |= flash.pop("$defs", {})
    flash["properties"]["threat"] = {"enum": threat_names(), "description": "A named threat."}
    value = {
        "type": "object",
        "required": ["value", "source"],
        "additionalProperties": False,
        "properties": {"value": {}, "unit": {"type": "string"}, "source": {"type": "string"}},
    }
    properties = {
        key: {**value, "description": f"{meaning} [{unit or '1'}]"}
        for key, (unit, meaning) in PROPERTIES.items()
    }
    own_materials = {
        "type": "object",
        "additionalProperties": {
            "type": "object",
            "additionalProperties": False,
            "properties": {**properties, "family": {"enum": material_names()}},
        },
    }
    return {
        "$schema": "https://json-schema.org/draft/2020-12/schema",
        "title": "strikeenergy case",
        "type": "object",
        "additionalProperties": False,
        "required": ["flash", "object"],
        "properties": {
            "title": {"type": "string", "description": "What the case is about."},
            "standard": {"enum": registry.standards, "description": "The standard that decides."},
            "flash": flash,
            "object": {"type": "array", "minItems": 1, "items": {"oneOf": branches}},
            "materials": own_materials,
            "ledger": LedgerEntry.model_json_schema(),
        },
        "$defs": definitions,
    }
