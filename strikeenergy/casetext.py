"""The text of a case file: reading it, syntax errors in plain words, and the line on which a key stands."""

from __future__ import annotations

import os
import re
import sys
import tomllib
from collections.abc import Mapping, Sequence
from difflib import get_close_matches
from functools import lru_cache
from pathlib import Path
from typing import Any

from strikeenergy.errors import InputError, Problem

__all__ = ["LARGEST", "CaseError", "locate", "read_text", "syntax_problem"]

LARGEST = 2_000_000
"""A case file is a few kB of text; beyond this many bytes it is refused unread."""

_MOST_SHOWN = 50


class CaseError(InputError):
    """A case is refused: every problem that was found, each with ``file:line`` and what to write."""

    def __str__(self) -> str:
        shown = [str(problem) for problem in self.problems[:_MOST_SHOWN]]
        if len(self.problems) > _MOST_SHOWN:
            shown.append(f"... and {len(self.problems) - _MOST_SHOWN} more problems")
        return "\n".join(shown)


def read_text(path: str | os.PathLike[str]) -> tuple[str, str]:
    """Return the text of a case file and the name to use in messages.

    Raises:
        CaseError: it is missing, a directory, too large, or not text.
    """
    name = os.fspath(path)
    if name == "-":
        return _decode(sys.stdin.buffer.read(LARGEST + 1), "<stdin>"), "<stdin>"
    file = Path(name)
    try:
        if file.is_dir():
            inside = sorted(p.name for p in file.glob("*.toml"))[:5]
            hint = (
                f"name a case file in it, such as {str(file / inside[0])!r}" if inside else "name a TOML file"
            )
            raise CaseError([Problem("this is a directory, not a case file", hint, place=name)])
        with file.open("rb") as stream:
            raw = stream.read(LARGEST + 1)
    except FileNotFoundError:
        here = [p.name for p in file.parent.glob("*.toml")] if file.parent.is_dir() else []
        near = get_close_matches(file.name, here, n=1, cutoff=0.5)
        hint = (
            f"did you mean {str(file.parent / near[0])!r}?"
            if near
            else "'strikeenergy new conductor' writes one to start from"
        )
        raise CaseError([Problem("there is no such file", hint, place=name)]) from None
    except OSError as error:
        raise CaseError(
            [Problem(f"the file cannot be read: {error.strerror or error}", place=name)]
        ) from None
    return _decode(raw, name), name


def _decode(raw: bytes, name: str) -> str:
    if len(raw) > LARGEST:
        raise CaseError(
            [
                Problem(
                    f"the file is larger than {LARGEST // 1_000_000} MB",
                    "a case file is a few kB of text; is it the right file?",
                    place=name,
                )
            ]
        )
    if raw[:2] in (b"\xff\xfe", b"\xfe\xff"):  # what some shells write when their output is redirected
        try:
            return raw.decode("utf-16").replace("\r\n", "\n")
        except UnicodeDecodeError:
            pass
    try:
        text = raw.decode("utf-8-sig").replace("\r\n", "\n")
    except UnicodeDecodeError as error:
        line = raw[: error.start].count(b"\n") + 1
        raise CaseError(
            [
                Problem(
                    "this is not UTF-8 text",
                    "save the case file as UTF-8; is it the right file?",
                    place=f"{name}:{line}",
                )
            ]
        ) from None
    if "\0" in text:
        raise CaseError(
            [Problem("this is a binary file, not a case file", "name a TOML text file", place=name)]
        )
    return text


def syntax_problem(text: str, name: str, error: tomllib.TOMLDecodeError) -> Problem:
    """Say what the parser found, on which line, and what was probably meant (a quantity without quotes)."""
    found = re.search(r"\(at line (\d+), column (\d+)\)", str(error))
    what = re.sub(r" \(at .*\)$", "", str(error))
    lines = text.split("\n")
    number = int(found[1]) if found else len(lines)
    line = lines[number - 1] if number <= len(lines) else ""
    hint = ""
    unquoted = re.match(r"\s*([\w-]+)\s*=\s*([-+]?[0-9][0-9.,eE+]*\s*[^\s0-9#\"'][^#]*?)\s*(#.*)?$", line)
    if unquoted:
        hint = f'quantities stand in quotes: write {unquoted[1]} = "{unquoted[2].strip()}"'
    elif "overwrite a value" in what:
        hint = f"{line.partition('=')[0].strip()} stands twice in one table: keep one of them"
    elif re.match(r"\s*[\w-]+\s*=\s*[A-Za-z]", line):
        key, _, value = line.partition("=")
        hint = f'text stands in quotes: write {key.strip()} = "{value.strip()}"'
    return Problem(f"not valid TOML: {what[0].lower() + what[1:]}", hint, place=f"{name}:{number}")


@lru_cache(maxsize=4)
def _parsed(text: str) -> dict[str, Any]:
    return tomllib.loads(text)


def locate(text: str, path: Sequence[str | int]) -> int:
    """Return the line (from 1) of the statement that first defines the longest existing prefix of a key path.

    The standard parser is its own oracle: the line is where the shortest parseable prefix of the text first contains
    the path, found by bisection. A missing key points at its table. In a long file only the object's own lines are
    searched, where they can be told by their headings.
    """
    if len(path) > 1 and path[0] == "object" and isinstance(path[1], int):
        span = _object_lines(text, path[1])
        if span is not None:
            begin, own = span
            return begin + _search(own, ("object", 0, *path[2:]))
    return _search(text, path)


def _object_lines(text: str, number: int) -> tuple[int, str] | None:
    """Return where an [[object]] begins (lines before it) and its lines; None where they do not parse to that object."""
    heads = _headings(text)
    objects = _parsed(text).get("object")
    if not isinstance(objects, list) or len(heads) != len(objects) or number >= len(heads):
        return None
    lines = text.split("\n")
    end = heads[number + 1] if number + 1 < len(heads) else len(lines)
    own = "\n".join(lines[heads[number] : end])
    try:
        found = tomllib.loads(own)["object"][0]
    except (tomllib.TOMLDecodeError, KeyError):
        return None
    return (heads[number], own) if found == objects[number] else None


@lru_cache(maxsize=4)
def _headings(text: str) -> tuple[int, ...]:
    pattern = re.compile(r"\s*\[\[\s*object\s*\]\]")
    return tuple(number for number, line in enumerate(text.split("\n")) if pattern.match(line))


def _search(text: str, path: Sequence[str | int]) -> int:
    lines = text.split("\n")

    def has(data: Any, keys: Sequence[Any]) -> bool:
        for key in keys:
            if (isinstance(data, Mapping) and key in data) or (
                isinstance(data, list) and isinstance(key, int) and key < len(data)
            ):
                data = data[key]
            else:
                return False
        return True

    def parse(count: int) -> dict[str, Any] | None:
        try:
            return tomllib.loads("\n".join(lines[:count]) + "\n")
        except tomllib.TOMLDecodeError:
            return None

    whole = _parsed(text)
    keys = list(path)
    while keys and not has(whole, keys):
        keys.pop()
    if not keys:
        return 1
    low, high = 0, len(lines)
    while high - low > 1:
        middle = (low + high) // 2
        count, data = middle, None
        while count > low and (data := parse(count)) is None:
            count -= 1
        if count == low:
            count = middle + 1
            while count < high and (data := parse(count)) is None:
                count += 1
            if count >= high:
                break
        if has(data, keys):
            high = count
        else:
            low = count
    line = low
    while line < len(lines) - 1 and (not lines[line].strip() or lines[line].lstrip().startswith("#")):
        line += 1
    return line + 1
