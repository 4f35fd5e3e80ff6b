"""Reading a measured current from a text table (CSV and its relatives) in bounded memory.

The table is read in blocks of whole lines. A block whose lines are all sound is turned into numbers at once; only a
block in which something is wrong is looked at line by line, so that every message names its line. Besides the two
arrays of the result, some 30 MB are in use at any time, however large the file is.

Left out: binary files of recorders, COMTRADE, HDF5; several shots in one file; text columns among the numbers.
"""

from __future__ import annotations

import os
from collections.abc import Iterator
from dataclasses import dataclass, field
from typing import IO, Any

import numpy as np
from numpy.typing import ArrayLike, NDArray

from strikeenergy.errors import InputError, Problem
from strikeenergy.lightning.record_blocks import BlockReader, Faults
from strikeenergy.lightning.record_columns import choose_columns
from strikeenergy.lightning.record_layout import DELIMITERS, HEAD, encoding_of, find_layout
from strikeenergy.lightning.record_source import Source

__all__ = ["MAX_SAMPLES", "Record", "read_record"]

MAX_SAMPLES = 50_000_000
"""Most samples that are kept: 800 MB in the two arrays. The size of the file does not matter, only what is kept."""


@dataclass(frozen=True, eq=False)
class Record:
    """A measured current.

    Attributes:
        t: times (s), strictly rising, shape (n,); the steps may differ.
        i: current (A) as measured: with offset, noise, droop and the sign of the sensor, shape (n,).
        channels: names of all channels of the file.
        channel: the one that this is.
        name: of the file.
        understood: how the file was read (delimiter, units and where they came from ...), for people.
        remarks: what the reader of a result must know.
    """

    t: NDArray[np.float64]
    i: NDArray[np.float64]
    channels: tuple[str, ...] = ()
    channel: str = ""
    name: str = ""
    understood: dict[str, str] = field(default_factory=dict)
    remarks: tuple[str, ...] = ()

    @classmethod
    def from_arrays(cls, t: ArrayLike, i: ArrayLike, name: str = "") -> Record:
        """Make a record of times (s) and currents (A), with the checks that a file gets.

        Raises:
            InputError: not finite, not rising, not of one length.
        """
        times, current = np.ascontiguousarray(t, dtype=float), np.ascontiguousarray(i, dtype=float)
        if times.ndim != 1 or times.shape != current.shape or times.size < 2:
            what = f"times of shape {times.shape} and currents of shape {current.shape} are no record"
            raise InputError([Problem(what, "give two lists of one length, of two samples or more")])
        faults = Faults(name or "record", word="sample ")
        for array, label in ((times, "time"), (current, "current")):
            faults.add_many(
                np.flatnonzero(~np.isfinite(array)) + 1,
                f"the {label} is not a finite number",
                "leave the sample out",
            )
        faults.add_many(
            np.flatnonzero(np.diff(times) <= 0) + 2,
            "the time does not rise",
            "give times that rise from sample to sample",
        )
        faults.raise_if_any()
        return cls(times, current, name=name)

    def __len__(self) -> int:
        return self.t.size

    def __repr__(self) -> str:
        return f"<Record {self.name}: {self.t.size} samples of {self.channel or 'current'}, {self.t[0]:g} s to {self.t[-1]:g} s>"


def read_record(
    path_or_stream: str | os.PathLike[str] | IO[str] | IO[bytes],
    *,
    time_unit: str | None = None,
    current_unit: str | None = None,
    scale: float | str | None = None,
    channel: str | int | None = None,
    delimiter: str | None = None,
    decimal: str | None = None,
    time_step: Any = None,
    heading: int | None = None,
    gaps: str = "refuse",
    limit: int = MAX_SAMPLES,
) -> Record:
    """Read a record from a text table: numbers in columns below a heading of any length.

    Args:
        path_or_stream: a path, or an open stream of text or bytes (read once, from where it stands).
        time_unit: unit of the time column, where the heading does not give it (``"us"``).
        current_unit: unit of the channel, where the heading does not give it (``"kA"``).
        scale: a number that multiplies the channel; or ``"10 kA/V"`` for a channel in volts; or the resistance of a
            shunt (``"0.25 mohm"``). A negative number or kA/V turns the sign.
        channel: name or number (from 1, times not counted) where there are several.
        delimiter: ``"comma"``, ``"semicolon"``, ``"tab"`` or ``"blank"`` (or the sign), where it cannot be told.
        decimal: ``"."`` or ``","``, where it cannot be told.
        time_step: time between samples (``"0.1 us"``, or a number in s) of a table without a usable time column.
        heading: number of heading lines, where it cannot be told.
        gaps: ``"refuse"`` samples that are missing from an otherwise even record, or ``"keep"`` the record with a remark.
        limit: most samples to keep; a file with more is refused before it is read, as far as its size tells.

    Raises:
        InputError: everything that is wrong with the file, up to 20 problems and their total number, each with its line.
    """
    if gaps not in ("refuse", "keep"):
        raise InputError([Problem(f"gaps = {gaps!r} is not known", "write gaps = 'refuse' or gaps = 'keep'")])
    with Source(path_or_stream) as source:
        head = source.look(HEAD)
        if not head:
            raise InputError([Problem("the file is empty", "export the record again", place=source.name)])
        encoding = encoding_of(head, source.name)
        source.decode(encoding)
        text, whole = source.first_lines()
        layout = find_layout(
            text,
            encoding,
            source.name,
            delimiter=delimiter,
            decimal=decimal,
            heading=heading,
            one_column=time_step is not None,
        )
        columns = choose_columns(
            layout,
            source.name,
            time_unit=time_unit,
            current_unit=current_unit,
            scale=scale,
            channel=channel,
            time_step=time_step,
        )
        expected = source.expected_lines(text, layout.first_line, whole)
        if expected > 1.25 * limit:
            raise _too_large(source, expected, limit)
        reader = BlockReader(layout, columns, source.name, expected, keep_gaps=gaps == "keep")
        for block, line in _sample_blocks(source, layout.first_line):
            reader.take(block, line)
            if reader.size > limit:
                raise _too_large(source, reader.size, limit)
    t, i = reader.finish()
    signs = {sign: name for name, sign in DELIMITERS.items()}
    understood = {
        "encoding": encoding,
        "heading": f"{layout.first_line - 1} lines",
        "delimiter": signs[layout.delimiter],
        "decimal": {".": "point", ",": "comma"}[reader.decimal or "."],
        **columns.understood,
    }
    return Record(t, i, columns.channels, columns.channel, source.name, understood, tuple(reader.remarks))


def _sample_blocks(source: Source, first_line: int) -> Iterator[tuple[bytes, int]]:
    """Yield the blocks of whole lines from the first line of samples on, each with the number of its first line."""
    line, skip = 1, first_line - 1
    for whole in source.blocks():
        block = whole
        if skip:
            ends = np.flatnonzero(np.frombuffer(block, np.uint8) == 10)
            dropped = min(skip, ends.size)
            block = block[int(ends[dropped - 1]) + 1 :]
            line, skip = line + dropped, skip - dropped
        if block:
            yield block, line
            line += block.count(b"\n")


def _too_large(source: Source, samples: int, limit: int) -> InputError:
    size = f" in {source.size / 1e9:.3g} GB" if source.size else ""
    what = (
        f"about {samples:,} samples{size} are more than the {limit:,} that are kept at once; nothing was read"
    )
    write = f"cut out the part with the stroke, keep every {-(-samples // limit)}th line, or give a higher limit (16 bytes a sample)"
    return InputError([Problem(what.replace(",", " "), write, place=source.name)])
