"""What a text table of samples looks like: encoding, heading, delimiter, decimal sign, columns and their units.

Nothing is guessed that would change a number. What the first 64 KiB of the file do not say plainly is refused, with
what to write. Left out: text columns beside the numbers, thousands separators, headings longer than 64 KiB.
"""

from __future__ import annotations

import csv
import re
from collections.abc import Sequence
from dataclasses import dataclass

from strikeenergy.errors import InputError, Problem, QuantityError
from strikeenergy.units import scale as unit_scale

__all__ = ["DELIMITERS", "HEAD", "Layout", "dimension", "encoding_of", "find_layout", "number", "unit_in"]

HEAD = 1 << 16
"""Bytes at the start of a file that are looked at to find out how it is written."""

DELIMITERS = {"semicolon": ";", "tab": "\t", "comma": ",", "blank": " "}
_NUMBER = re.compile(
    r"[+-]?(?:\d+\.?\d*|\.\d+)(?:[eE][+-]?\d{1,3})?|[+-]?(?:nan|inf)", re.IGNORECASE | re.ASCII
)
_COMMENT = "#%!/* "
_SPELLINGS = {
    "s": "sec secs second seconds sekunde sekunden",
    "ms": "msec millisecond milliseconds",
    "us": "usec microsecond microseconds mus",
    "ns": "nsec nanosecond nanoseconds",
    "A": "amp amps ampere amperes",
    "kA": "kiloamp kiloamps kiloampere kiloamperes",
    "V": "volt volts",
    "mV": "millivolt millivolts",
}
_SPELT = {word: unit for unit, words in _SPELLINGS.items() for word in words.split()}
# A unit after a blank or an underscore is believed only where it cannot be the name of a channel, as "Channel A" is.
_PLAIN = {"s", "ms", "us", "µs", "μs", "ns", "kA", "MA"}
_CURRENT = re.compile(r"i|i?\(t\)|current|strom|courant|corriente|corrente", re.IGNORECASE)
_HEADING_UNIT = (
    re.compile(r"(?P<name>.*?)\s*[\[({<]\s*(?P<unit>[^\])}>]*?)\s*[\])}>]"),
    re.compile(r"(?P<name>.+?)\s*/\s*(?P<unit>\S+)"),
    re.compile(r"(?P<name>.+?)\s+in\s+(?P<unit>\S+)"),
    re.compile(r"(?P<name>.+?)\s*[,:]\s*(?P<unit>\S+)"),
)


@dataclass(frozen=True)
class Layout:
    """How a table of samples is written.

    Attributes:
        encoding: of the bytes, as Python names it.
        delimiter: ``";"``, ``"\\t"``, ``","`` or ``" "`` (any run of blanks and tabs).
        decimal: ``"."`` or ``","``, or ``""`` where no line in sight has either.
        first_line: number of the first line with samples, from 1.
        columns: numbers on each line.
        trailing: delimiters at the end of each line with nothing behind them.
        quoted: whether numbers stand in quotation marks.
        names: what the heading calls each column, or ``"column 1"``.
        units: the unit that the heading gives each column, or ``""``.
    """

    encoding: str
    delimiter: str
    decimal: str
    first_line: int
    columns: int
    trailing: int
    quoted: bool
    names: tuple[str, ...]
    units: tuple[str, ...]


def number(text: str) -> bool:
    """Whether a text is one plain number (nan and inf among them)."""
    return _NUMBER.fullmatch(text) is not None


def dimension(unit: str) -> str:
    """Return ``"time"``, ``"current"``, ``"voltage"``, ``"other"``, or ``""`` where the text is no unit."""
    try:
        found = unit_scale(unit).dimension
    except QuantityError:
        return ""
    return {unit_scale(u).dimension: n for n, u in (("time", "s"), ("current", "A"), ("voltage", "V"))}.get(
        found, "other"
    )


def unit_in(heading: str) -> tuple[str, str]:
    """Split a heading such as ``"I (kA)"``, ``"Time [us]"``, ``"current/kA"``, ``"t in µs"`` or ``"i_kA"``.

    Returns:
        the name, and the unit as written or ``""``.
    """
    text = heading.strip().strip('"').strip()
    for pattern in _HEADING_UNIT:
        if match := pattern.fullmatch(text):
            unit = _spell(match["unit"])
            if dimension(unit) or pattern is _HEADING_UNIT[0]:
                return match["name"] or text, unit
    parts = re.split(r"[\s_]+", text)
    if len(parts) > 1 and (
        _spell(parts[-1]) in _PLAIN or (parts[-1] == "A" and _CURRENT.fullmatch(parts[-2]))
    ):
        return text[: -len(parts[-1])].rstrip(" _"), _spell(parts[-1])
    if _spell(text) in _PLAIN or text.casefold() in _SPELT:
        return text, _spell(text)
    return text, ""


def _spell(unit: str) -> str:
    return _SPELT.get(unit.strip().casefold(), unit.strip())


def encoding_of(head: bytes, place: str) -> str:
    """Find the encoding of a text by its first bytes; refuse what is no text.

    Raises:
        InputError: binary data, naming well-known formats.
    """
    for mark, name in ((b"\xef\xbb\xbf", "utf-8-sig"), (b"\xff\xfe", "utf-16"), (b"\xfe\xff", "utf-16")):
        if head.startswith(mark):
            return name
    for mark, name in (
        (b"PK", "a zip archive or a spreadsheet"),
        (b"\x1f\x8b", "a gzip archive"),
        (b"\x89HDF", "an HDF5 file"),
    ):
        if head.startswith(mark):
            raise _binary(place, f"it is {name}")
    sample = head[:4096]
    if b"\0" in sample:
        for first, name in ((1, "utf-16-le"), (0, "utf-16-be")):
            # ASCII in UTF-16 has a zero in every second byte and none between.
            if sample[first::2].count(0) > 0.7 * len(sample) / 2 and not sample[1 - first :: 2].count(0):
                return name
        raise _binary(place, "it holds zero bytes")
    control = sum(byte < 32 and byte not in b"\t\n\r\f\x1a" for byte in sample)
    if control > 0.01 * len(sample):
        raise _binary(place, "it holds control characters")
    try:
        head.decode("utf-8")
    except UnicodeDecodeError as error:
        if error.start < len(head) - 3:  # not merely a character cut in two at the end of the look
            return "latin-1"
    return "utf-8"


def _binary(place: str, why: str) -> InputError:
    return InputError(
        [Problem(f"this is no text table: {why}", "export the record as CSV or text", place=place)]
    )


@dataclass(frozen=True)
class _Reading:
    """One way to read the lines: what it makes of them."""

    delimiter: str
    decimal: str
    counts: tuple[int, ...]
    """Numbers on each line; 0 for a line that is not all numbers, -1 for a blank one."""
    columns: int
    good: int
    width: int
    """Cells on a line of samples, with empty ones at its end."""

    @property
    def first(self) -> int:
        return self.counts.index(self.columns)


def _cells(line: str, delimiter: str) -> list[str]:
    line = line.replace('"', "")
    return line.split() if delimiter == " " else [cell.strip() for cell in line.split(delimiter)]


def _numbers(line: str, delimiter: str, decimal: str) -> int:
    if not line.strip():
        return -1
    cells = _cells(line, delimiter)
    while len(cells) > 1 and not cells[-1]:
        cells.pop()
    for cell in cells:
        if decimal == ",":
            if "." in cell:
                return 0
            cell = cell.replace(",", ".")
        if not number(cell):
            return 0
    return len(cells)


def _read_as(lines: Sequence[str], delimiter: str, decimal: str) -> _Reading:
    counts = tuple(_numbers(line, delimiter, decimal) for line in lines)
    sums: dict[int, int] = {}
    for count in counts:
        if count > 0:
            sums[count] = sums.get(count, 0) + 1
    columns = max(sums, key=lambda c: (sums[c], c), default=0)
    width = len(_cells(lines[counts.index(columns)], delimiter)) if columns else 0
    return _Reading(delimiter, decimal, counts, columns, sums.get(columns, 0), width)


def find_layout(
    text: str,
    encoding: str,
    place: str,
    *,
    delimiter: str | None = None,
    decimal: str | None = None,
    heading: int | None = None,
    one_column: bool = False,
) -> Layout:
    """Find out how a table is written, from its first lines.

    Args:
        text: the first lines, whole ones only.
        encoding: what they were decoded from.
        place: name of the file, for messages.
        delimiter: one of ``DELIMITERS`` (sign or name), where known.
        decimal: ``"."`` or ``","``, where known.
        heading: number of heading lines, where known.
        one_column: the caller gives a time step, so a single column makes sense.

    Raises:
        InputError: no numbers, or two ways to read them that differ.
    """
    if decimal not in (None, ".", ","):
        raise InputError([Problem(f"{decimal!r} is no decimal sign", "write decimal = '.' or decimal = ','")])
    if delimiter is not None and DELIMITERS.get(delimiter, delimiter) not in DELIMITERS.values():
        raise InputError(
            [Problem(f"{delimiter!r} is no delimiter", f"write one of: {', '.join(DELIMITERS)}")]
        )
    signs = [DELIMITERS.get(delimiter, delimiter)] if delimiter is not None else list(DELIMITERS.values())
    if decimal == "," and signs == [","]:
        what = "comma cannot be the delimiter and the decimal sign at once"
        raise InputError([Problem(what, "give one of delimiter and decimal", place=place)])
    lines = [line.rstrip("\r") for line in text.split("\n")]
    skipped = lines[:heading] if heading is not None else []
    looked_at = ["" for _ in skipped] + lines[len(skipped) :]
    readings = [
        _read_as(looked_at, sign, point)
        for sign in signs
        for point in ([decimal] if decimal else [".", ","])
        if not (sign == point == ",")
    ]
    best = max(readings, key=lambda r: (r.good, r.columns > 1), default=None)
    if best is None or not best.good:
        what = "there are no lines of numbers" + (f" separated by {delimiter!r}" if delimiter else "")
        write = (
            "give delimiter, decimal or the number of heading lines"
            if text.strip()
            else "all lines are blank"
        )
        raise InputError([Problem(what, write, place=place)])
    first = len(skipped) if heading is not None else _start(lines, best)
    while heading is not None and first < len(lines) and not lines[first].strip():
        first += 1
    if one_column:
        best = _settle_comma(best, readings, lines[:first], place)
    names, units = _heading(lines[:first], best)
    shown = [line for line, count in zip(lines, best.counts, strict=True) if count == best.columns]
    cells = _cells(shown[0], best.delimiter)
    seen = {sign for sign in ".," if best.delimiter != sign and any(sign in line for line in shown)}
    return Layout(
        encoding=encoding,
        delimiter=best.delimiter,
        decimal=decimal or (best.decimal if seen or best.delimiter == "," else ""),
        first_line=first + 1,
        columns=best.columns,
        trailing=len(cells) - best.columns,
        quoted='"' in shown[0],
        names=names,
        units=units,
    )


def _start(lines: Sequence[str], reading: _Reading) -> int:
    """Return the index of the first line of samples.

    A line before the first whole one that begins with a number is a spoilt sample and no heading; ``Samples,1000`` is one.
    """
    first = reading.first
    while first > 0:
        cells = _cells(lines[first - 1], reading.delimiter)
        time = cells[0].replace(",", ".") if cells and reading.decimal == "," else "".join(cells[:1])
        if len(cells) != reading.columns or not number(time):
            break
        first -= 1
    return first


def _settle_comma(
    best: _Reading, readings: Sequence[_Reading], heading: Sequence[str], place: str
) -> _Reading:
    """Decide what ``0,5`` is where a time step is given: two columns of whole numbers, or one with a decimal comma.

    Raises:
        InputError: there is no heading that tells.
    """
    rival = next((r for r in readings if r.decimal == "," and r.columns == 1 and r.good == best.good), None)
    if best.delimiter != "," or best.columns != 2 or rival is None:
        return best
    named = [line for line in heading if line.strip()]
    if named:
        return best if _split_heading(named[-1], best) else rival
    what = "the commas may separate columns or be decimal signs"
    raise InputError(
        [Problem(what, "give delimiter = 'comma' or decimal = ','", place=f"{place}:{best.first + 1}")]
    )


def _heading(lines: Sequence[str], reading: _Reading) -> tuple[tuple[str, ...], tuple[str, ...]]:
    rows = [row for row in (_split_heading(line, reading) for line in lines if line.strip()) if row][-3:]
    bare = tuple(f"column {n + 1}" for n in range(reading.columns))
    if not rows:
        return bare, ("",) * reading.columns
    last = rows[-1]
    units = [_spell(cell.strip("[](){}<> ")) for cell in last]
    sorts = [dimension(unit) if unit else "" for unit in units]
    if all(sort in ("time", "current", "voltage") for sort in sorts) and len(set(sorts)) == min(
        2, len(sorts)
    ):
        above = rows[-2] if len(rows) > 1 else list(bare)
        return tuple(unit_in(cell)[0] or name for cell, name in zip(above, bare, strict=True)), tuple(units)
    split = [unit_in(cell) for cell in last]
    return tuple(name or b for (name, _), b in zip(split, bare, strict=True)), tuple(
        unit for _, unit in split
    )


def _split_heading(line: str, reading: _Reading) -> list[str]:
    """Split a heading line into as many names as there are columns, or return nothing."""
    text = line.strip(_COMMENT)
    ways = dict.fromkeys([reading.delimiter, "\t", ";", ",", " "])
    for sign in ways:
        if sign == " ":
            cells = re.findall(r"[^\s\[(]+(?:\s*(?:\[[^\]]*\]|\([^)]*\)))?", text)
        else:
            cells = [
                cell.strip() for cell in next(csv.reader([text], delimiter=sign, skipinitialspace=True), [])
            ]
        if len(cells) == reading.width:  # the samples leave the last columns empty
            cells = cells[: reading.columns]
        while len(cells) > reading.columns and not cells[-1]:
            cells.pop()
        if len(cells) != reading.columns or not any(re.search(r"[^\W\d]", cell) for cell in cells):
            continue
        if any(number(cell) for cell in cells):
            continue  # "Record length,2500"
        # Two words are no two names, unless the samples stand between blanks or each word has its unit.
        if sign != " " or reading.delimiter == " " or all(unit_in(cell)[1] for cell in cells):
            return cells
    return []
