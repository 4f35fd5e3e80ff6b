"""Turning blocks of lines into numbers, with every fault and its line."""

from __future__ import annotations

import re
import warnings
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from strikeenergy.errors import InputError, Problem
from strikeenergy.lightning.record_columns import Columns
from strikeenergy.lightning.record_layout import Layout, number

__all__ = ["MAX_PROBLEMS", "BlockReader", "Faults"]

MAX_PROBLEMS = 20
"""Problems that are shown; the rest are counted."""

_Floats = NDArray[np.float64]
_Ints = NDArray[np.intp]
_BLANK_LINES = re.compile(rb"\n{2,}")
_GAP = 1.5  # steps of an even record: a missing sample makes 2, the rounding of printed times less than 1.5


@dataclass
class Faults:
    """Problems found so far: the first ones in full, all of them counted."""

    place: str
    word: str = ""
    """What stands before the number in a message: nothing for a line of a file."""
    total: int = 0
    shown: list[tuple[int, Problem]] = field(default_factory=list)

    def add(self, line: int, what: str, write: str) -> None:
        """Record one problem at a line."""
        self.total += 1
        if len(self.shown) < MAX_PROBLEMS:
            self.shown.append((line, Problem(what, write, place=f"{self.place}:{self.word}{line}")))

    def add_many(self, lines: _Ints, what: str, write: str) -> None:
        """Record the same problem at many lines."""
        for line in lines[: MAX_PROBLEMS - len(self.shown)].tolist():
            self.add(line, what, write)
            self.total -= 1
        self.total += lines.size

    def raise_if_any(self) -> None:
        """Refuse the record if anything was found.

        Raises:
            InputError: the problems in the order of their lines, and the total number where not all are shown.
        """
        if not self.total:
            return
        problems = [problem for _, problem in sorted(self.shown, key=lambda pair: pair[0])]
        if self.total > len(problems):
            what = f"{self.total} problems in all, of which {len(problems)} are shown"
            problems.append(Problem(what, "mend what they have in common first", place=self.place))
        raise InputError(problems)


class _Growing:
    """An array that grows at its end, in place where the system lets it."""

    def __init__(self, expected: int) -> None:
        # Memory that is asked for and never written costs nothing, so a little too much is no loss.
        self._held = np.empty(max(int(expected * 1.02), 1024))
        self.size = 0

    def append(self, values: _Floats) -> None:
        end = self.size + values.size
        if end > self._held.size:
            self._held.resize(max(end, self._held.size * 5 // 4), refcheck=False)
        self._held[self.size : end] = values
        self.size = end

    def done(self) -> _Floats:
        self._held.resize(self.size, refcheck=False)
        return self._held


class BlockReader:
    """Collects the samples of the chosen columns, block by block.

    Args:
        layout: how the table is written.
        columns: what to take of it.
        place: name of the file.
        expected: about how many samples will come.
        keep_gaps: remark on missing samples in an even record instead of refusing them.
    """

    def __init__(
        self, layout: Layout, columns: Columns, place: str, expected: int, *, keep_gaps: bool = False
    ) -> None:
        self.layout, self.columns, self.keep_gaps = layout, columns, keep_gaps
        self.decimal = layout.decimal
        self.faults = Faults(place)
        self.remarks: list[str] = []
        self._t, self._i = _Growing(expected if columns.time is not None else 0), _Growing(expected)
        self._last = np.empty(0)
        self._last_lines = np.empty(0, dtype=np.intp)

    @property
    def size(self) -> int:
        """Samples so far."""
        return self._i.size

    def take(self, block: bytes, line: int) -> None:
        """Read a block of whole lines whose first has this number."""
        found = self._at_once(block, line)
        time, current, lines = found if found is not None else self._one_by_one(block, line)
        sound = np.isfinite(current) if time is None else np.isfinite(current) & np.isfinite(time)
        if not sound.all():
            self.faults.add_many(
                lines[~sound], "the sample is not a finite number", "leave the line out or repair it"
            )
            current, lines = current[sound], lines[sound]
            time = None if time is None else time[sound]
        if not current.size:
            return
        if time is not None:
            seconds = np.asarray(self.columns.time_scale.to_si(time))
            self._check_times(seconds, lines)
            self._t.append(seconds)
        self._i.append(np.asarray(self.columns.current_scale.to_si(current)) * self.columns.factor)

    def finish(self) -> tuple[_Floats, _Floats]:
        """Return times (s) and currents (A).

        Raises:
            InputError: everything that was found.
        """
        self.faults.raise_if_any()
        if self._i.size < 2:
            raise InputError(
                [
                    Problem(
                        "there are fewer than two samples", "export the whole record", place=self.faults.place
                    )
                ]
            )
        current = self._i.done()
        if self.columns.time is None:
            times = np.arange(current.size, dtype=float)
            times *= self.columns.step or 1.0
            return times, current
        return self._t.done(), current

    # -- numbers ---------------------------------------------------------------------------------------

    def _tidy(self, block: bytes) -> bytes | None:
        """Return the block with decimal points and without ornaments, or None where that needs a closer look."""
        layout = self.layout
        if layout.quoted:
            block = block.replace(b'"', b"")
        if b"\r" in block:
            block = block.replace(b"\r\n", b"\n")
        if layout.delimiter != ",":
            comma = b"," in block
            point = b"." in block
            if not self.decimal and comma != point:
                self.decimal = "," if comma else "."
            if (comma and point) or (comma and self.decimal == ".") or (point and self.decimal == ","):
                return None
            if comma:
                block = block.replace(b",", b".")
        if layout.trailing:
            block = block.replace(layout.delimiter.encode() * layout.trailing + b"\n", b"\n")
        return block

    def _at_once(self, block: bytes, line: int) -> tuple[_Floats | None, _Floats, _Ints] | None:
        """Turn a block without faults into numbers; return None where anything at all is odd."""
        tidy = self._tidy(block)
        if tidy is None:
            return None
        lines = None
        if tidy.startswith(b"\n") or b"\n\n" in tidy:
            ends = np.flatnonzero(np.frombuffer(tidy, np.uint8) == 10)
            lines = line + np.flatnonzero(np.diff(ends, prepend=-1) > 1)
            tidy = _BLANK_LINES.sub(b"\n", tidy.lstrip(b"\n"))
            if not tidy:
                return np.empty(0), np.empty(0), np.empty(0, dtype=np.intp)
        rows, width = tidy.count(b"\n"), self.layout.columns
        if not self._regular(tidy, rows):
            return None
        sign = self.layout.delimiter
        flat = tidy[:-1] if sign == " " else tidy[:-1].replace(b"\n", sign.encode())
        try:
            with warnings.catch_warnings():
                warnings.simplefilter("error", DeprecationWarning)  # what older numpy says of text in numbers
                values = np.fromstring(flat, sep=sign)
        except (ValueError, DeprecationWarning):
            return None
        if values.size != rows * width:
            return None
        table = values.reshape(rows, width)
        time = None if self.columns.time is None else table[:, self.columns.time]
        return time, table[:, self.columns.current], line + np.arange(rows) if lines is None else lines

    def _regular(self, block: bytes, rows: int) -> bool:
        """Whether every line has the same number of cells. A sum would not do: one line may lack what another has too much."""
        width, sign = self.layout.columns, self.layout.delimiter
        array = np.frombuffer(block, np.uint8)
        ends = np.flatnonzero(array == 10)
        if sign in " \t":
            dark = array > 32
            starts = np.flatnonzero(dark & ~np.concatenate(([False], dark[:-1])))
            if not _even(starts, ends, rows, width):
                return False
        if sign == " ":
            return True
        return _even(np.flatnonzero(array == ord(sign)), ends, rows, width - 1)

    def _one_by_one(self, block: bytes, line: int) -> tuple[_Floats | None, _Floats, _Ints]:
        """Read a block line by line, and say what is wrong with each bad line."""
        layout, columns = self.layout, self.columns
        times, currents, lines = [], [], []
        for offset, raw in enumerate(block.decode("utf-8", "replace").split("\n")[:-1]):
            text = raw.strip("\r\x1a\0 ") if layout.delimiter != "\t" else raw.strip("\r\x1a\0")
            if not text.strip():
                continue
            text = text.replace('"', "")
            cells = (
                text.split()
                if layout.delimiter == " "
                else [cell.strip() for cell in text.split(layout.delimiter)]
            )
            while len(cells) > layout.columns and not cells[-1]:
                cells.pop()
            if len(cells) != layout.columns:
                self._wrong_count(line + offset, text, len(cells))
                continue
            try:
                current = self._number(cells[columns.current], columns.current, line + offset)
                time = (
                    0.0
                    if columns.time is None
                    else self._number(cells[columns.time], columns.time, line + offset)
                )
            except ValueError:
                continue
            times.append(time)
            currents.append(current)
            lines.append(line + offset)
        time_array = None if columns.time is None else np.array(times, dtype=float)
        return time_array, np.array(currents, dtype=float), np.array(lines, dtype=np.intp)

    def _wrong_count(self, line: int, text: str, found: int) -> None:
        shown = text if len(text) <= 40 else text[:39] + "…"
        if not any(character.isdigit() for character in text):
            self.faults.add(line, f"{shown!r} is no line of samples", "delete the line")
            return
        what = f"{found} columns instead of {self.layout.columns}: {shown!r}"
        self.faults.add(line, what, "repair the line or leave it out")

    def _number(self, cell: str, column: int, line: int) -> float:
        plain = cell
        if self.layout.delimiter != "," and "," in cell:
            self.decimal = self.decimal or ","
            if self.decimal == "," and "." not in cell:
                plain = cell.replace(",", ".")
        elif "." in cell and self.decimal == ",":
            plain = ""
        elif "." in cell:
            self.decimal = self.decimal or "."
        if number(plain):
            return float(plain)
        name = self.layout.names[column]
        if not cell:
            self.faults.add(line, f"{name!r}: the value is missing", "leave the line out or repair it")
        else:
            sign = {",": "comma", ".": "point"}.get(self.decimal or ".")
            shown = cell if len(cell) <= 30 else cell[:29] + "…"
            what = f"{name!r}: {shown!r} is not a number" + (
                f" with a decimal {sign}" if re.search(r"\d[.,]\d", cell) else ""
            )
            self.faults.add(line, what, "repair the line or leave it out")
        raise ValueError

    # -- times -----------------------------------------------------------------------------------------

    def _check_times(self, seconds: _Floats, lines: _Ints) -> None:
        """Find times that repeat or fall, and samples that are missing between even ones."""
        seen = self._last.size  # the last times of the block before, whose own steps were looked at with it
        all_times = np.concatenate((self._last, seconds))
        all_lines = np.concatenate((self._last_lines, lines))
        steps = np.diff(all_times)
        first = max(seen - 1, 0)
        bad = first + np.flatnonzero(steps[first:] <= 0)
        if bad.size:
            same = steps[bad] == 0
            repair = "print the times with more digits, or give time_step"
            self.faults.add_many(
                all_lines[bad[same] + 1], "the time is the same as on the line before", repair
            )
            self.faults.add_many(
                all_lines[bad[~same] + 1],
                "the time is before that of the line before",
                "give one shot in order of time",
            )
        if steps.size >= 6:
            self._check_gaps(steps, all_lines, max(seen - 2, 0))
        keep = min(4, all_times.size)
        self._last, self._last_lines = all_times[-keep:].copy(), all_lines[-keep:].copy()

    def _check_gaps(self, steps: _Floats, lines: _Ints, first: int) -> None:
        """Find single long steps between even ones. The last step waits for the next block: it may be a new step width."""
        before, after = steps[:-1], steps[1:]
        if np.mean(np.abs(after - before) <= 0.2 * np.minimum(after, before)) < 0.7:
            return  # the steps of this record differ on purpose
        left = np.concatenate((steps[1:2], steps[:-2]))
        right = steps[1:]
        long = before > _GAP * np.maximum(left, right)
        long &= np.abs(left - right) <= 0.2 * np.minimum(left, right)
        long[:first] = False
        for k in np.flatnonzero(long).tolist():
            missing = round(float(steps[k] / (0.5 * (left[k] + right[k])))) - 1
            if self.faults.total and lines[k + 1] - lines[k] > missing:
                continue  # the lines are there and are already complained of
            what = (
                f"{missing} samples are missing before this line"
                if missing > 1
                else "a sample is missing before this line"
            )
            if self.keep_gaps:
                if len(self.remarks) < MAX_PROBLEMS:
                    self.remarks.append(
                        f"line {lines[k + 1]}: {what}; the current is taken as straight across the gap"
                    )
            else:
                self.faults.add(int(lines[k + 1]), what, "cut the record there, or give gaps = 'keep'")


def _even(marks: _Ints, ends: _Ints, rows: int, each: int) -> bool:
    """Whether there are so many marks between each two line ends."""
    if marks.size != rows * each:
        return False
    if not each:
        return True
    table = marks.reshape(rows, each)
    return bool((table[:, -1] < ends).all() and (table[1:, 0] > ends[:-1]).all())
