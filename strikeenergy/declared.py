"""Holding a table of a case against a declaration: pydantic does the work, the words are ours."""

from __future__ import annotations

import re
from collections.abc import Mapping, Sequence
from difflib import get_close_matches
from typing import Any, TypeVar

from pydantic import ValidationError

from strikeenergy.errors import Problem, close_matches, spell_path
from strikeenergy.inputs import Part, unit_of

__all__ = ["validate"]

_P = TypeVar("_P", bound=Part)


def validate(
    model: type[_P],
    table: Mapping[str, Any],
    path: tuple[str | int, ...],
    context: dict[str, Any],
    problems: list[Problem],
) -> _P | None:
    """Validate a table of the case; add every problem to the list.

    Args:
        model: the declaration.
        table: what the user wrote.
        path: where it stands.
        context: handed to the validators (the materials of the case).
        problems: takes what is wrong.
    """
    try:
        return model.model_validate(_tuples(table), context=context)
    except ValidationError as error:
        found = [_problem(dict(item), path, model) for item in error.errors(include_url=False)]
        # a field that may be of two types fails twice: told once
        problems += list({(p.path, p.what): p for p in found}.values())
        return None


def _tuples(value: Any) -> Any:
    """TOML has lists; the declarations have tuples."""
    if isinstance(value, list):
        return tuple(_tuples(item) for item in value)
    if isinstance(value, Mapping):
        return {key: _tuples(item) for key, item in value.items()}
    return value


def _problem(item: dict[str, Any], path: tuple[str | int, ...], model: type[Part]) -> Problem:
    """Turn one of pydantic's errors into one of ours."""
    where = (*path, *(part for part in item["loc"] if part not in ("str", "int")))
    context = item.get("ctx", {})
    sort = item["type"]
    if sort == "strikeenergy":
        return Problem(context["what"], context["write"], where)
    if sort == "extra_forbidden":
        return Problem(
            "unknown key", close_matches(str(item["loc"][-1]), _fields_at(model, item["loc"][:-1])), where
        )
    if sort == "missing":
        return Problem("it is missing", _example(model, item["loc"]), where)
    if sort == "literal_error":
        near = get_close_matches(str(item["input"]), re.findall(r"'([^']*)'", context["expected"]), n=1)
        hint = f"did you mean {near[0]!r}?" if near else f"write {context['expected']}"
        return Problem(f"{item['input']!r} is not one of them", hint, where)
    if sort in ("tuple_type", "model_type", "model_attributes_type"):
        several = sort == "tuple_type" or isinstance(item["loc"][-1], int)
        name = spell_path([p for p in where if not isinstance(p, int)])
        return Problem(
            "a list of tables is due here" if several else "a table is due here",
            f"write {'[[' if several else '['}{name}{']]' if several else ']'}",
            where,
        )
    if sort in ("string_type", "int_type"):
        return Problem(
            f"{item['input']!r} is of the wrong type",
            "write a text in quotes, or a whole number where one is due",
            where,
        )
    return Problem(str(item["msg"]), "", where)


def _fields_at(model: type[Part], loc: Sequence[str | int]) -> list[str]:
    current: Any = model
    for part in loc:
        if isinstance(part, str) and part in current.model_fields:
            current = _model_in(current.model_fields[part].annotation) or current
    return list(current.model_fields)


def _model_in(annotation: Any) -> type[Part] | None:
    if isinstance(annotation, type) and issubclass(annotation, Part):
        return annotation
    return next((m for a in getattr(annotation, "__args__", ()) if (m := _model_in(a))), None)


def _example(model: type[Part], loc: Sequence[str | int]) -> str:
    """Say what to write for a field that is missing."""
    owner: Any = model
    for part in loc[:-1]:
        if isinstance(part, str) and part in owner.model_fields:
            owner = _model_in(owner.model_fields[part].annotation) or owner
    name = str(loc[-1])
    mark = unit_of(owner, name)
    text = mark.text if mark is not None else {"material": "copper"}.get(name, "")
    return f"give {name}" + (f", such as {name} = {text!r}" if text else "")
