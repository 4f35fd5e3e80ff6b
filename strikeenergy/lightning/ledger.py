"""The energy ledger: what goes into each struck object, beside the energy of the whole flash.

The energy of an object follows from its own resistance and W/R, or from its voltage drop and the charge; it comes in here as
an :class:`Entry`. The energy of the flash is what has been published: totals, and energies per metre of channel times the
length of the channel. The schools differ by orders of magnitude, so the ledger gives the whole range with its schools, and
every share of the flash as a range too. Nothing about an object is ever computed from the energy of the flash.

Units: SI throughout (J, J/m, m); shares are plain numbers. The numbers stand in ``data/flash_energy.toml``.
Leaves out: energy per metre in sand (a fulgurite), light and radio waves (parts of the whole), in-cloud channels.
"""

from __future__ import annotations

import textwrap
from collections.abc import Iterable, Iterator, Mapping
from dataclasses import dataclass
from functools import lru_cache
from types import MappingProxyType
from typing import Any, Literal, get_args

from strikeenergy.errors import DataError, InputError, Problem, UnknownName
from strikeenergy.formatting import format_number, format_quantity
from strikeenergy.physics import channel
from strikeenergy.sources import Source, Standing, source
from strikeenergy.tables import constant, read_table

__all__ = ["SENTENCE", "Entry", "Ledger", "Published", "Sort", "build_ledger", "practice", "published"]

Sort = Literal["ohmic", "arc root", "channel"]
SENTENCE = "Energy estimates of the flash say nothing usable about an object; W/R and charge do."
_MOST = 1e100  # beyond it a number is no measure of anything, and products would overflow


@dataclass(frozen=True)
class Published:
    """One statement of one publication, in SI; an end of the range that it does not give is None.

    ``school`` is the way to estimate, or what it is a value of; ``name`` is who says it.
    """

    name: str
    school: str
    low: float | None
    high: float | None
    unit: str
    source: Source
    standing: Standing
    say: str = ""

    def to_dict(self) -> dict[str, Any]:
        """Return it for JSON."""
        texts = {"school": self.school, "source": str(self.source), "standing": str(self.standing)}
        return {**texts, "note": self.say, **_range(self.low, self.high, self.unit)}

    def text(self) -> str:
        """Return it in words, with who says so and how firmly that stands."""
        return f"{self.school}: {_span(self.low, self.high, self.unit)} ({self.name}; {self.standing})"


@dataclass(frozen=True)
class Entry:
    """Energy that goes into one struck object.

    ``sort`` is how it gets there; ``low`` and ``high`` are equal to ``energy`` where there is no range (all J).
    """

    object: str
    sort: Sort
    energy: float
    low: float
    high: float


@dataclass(frozen=True)
class Ledger:
    """Energies of objects beside that of the whole flash (SI).

    Attributes:
        entries: of the objects, in the order given.
        low, high: energy of the whole flash (J): every total and every energy per metre times ``length``.
        totals: what the schools say of the whole flash (J).
        per_metre: what the schools say of a metre of channel in air (J/m).
        per_metre_low, per_metre_high: from the least to the most of these (J/m).
        length: of the channel (m), as ``ruler`` measures it.
        height, ruler, dimension: what the length follows from (m, m, 1).
        remarks: what the reader must know.
    """

    entries: tuple[Entry, ...]
    low: float
    high: float
    totals: tuple[Published, ...]
    per_metre: tuple[Published, ...]
    per_metre_low: float
    per_metre_high: float
    length: float
    height: float
    ruler: float
    dimension: float
    remarks: tuple[str, ...]

    def share(self, entry: Entry) -> tuple[float, float]:
        """Return the share of the flash that goes into an object, as a range (1): no object takes more than all."""
        least = float(channel.SHARE(E=entry.low, E_f=self.high))
        return min(1.0, least), min(1.0, float(channel.SHARE(E=entry.high, E_f=self.low)))

    def to_dict(self) -> dict[str, Any]:
        """Return it for JSON, in SI."""
        entries: list[dict[str, Any]] = [{"object": e.object, "sort": e.sort} for e in self.entries]
        for row, e in zip(entries, self.entries, strict=True):
            row["energy"] = {"value": e.energy, **_range(e.low, e.high, "J")}
            row["share"] = _range(*self.share(e), "1")
        per_metre = _range(self.per_metre_low, self.per_metre_high, "J/m")
        per_metre["schools"] = [stated.to_dict() for stated in self.per_metre]
        flash = {**_range(self.low, self.high, "J"), "schools": [stated.to_dict() for stated in self.totals]}
        along = {"value": self.length, "unit": "m", "height": self.height, "ruler": self.ruler}
        return {
            "entries": entries,
            "flash": {**flash, "per_metre": per_metre},
            "channel_length": {**along, "dimension": self.dimension},
            "common_practice": practice("total").to_dict(),
            "remarks": [*self.remarks, SENTENCE],
        }

    def lines(self) -> list[str]:
        """Write it as plain text, no line longer than 80 columns."""
        out = ["Energy into the struck objects, beside that of the whole flash"]
        for entry in self.entries:
            energy = format_quantity(entry.energy, "J", digits=3)
            energy += "" if entry.low == entry.high else f" ({_span(entry.low, entry.high, 'J')})"
            share = _span(*self.share(entry), "1")
            out += _wrap(f"{entry.object}, {entry.sort}: {energy}; share of the flash {share}")
        if not self.entries:
            out += _wrap("no energy into an object is known")
        out += _wrap(f"whole flash: {_span(self.low, self.high, 'J')}, the published range")
        along = _metres(self.length)
        low, high = (channel.ENERGY(e=e, l=self.length) for e in (self.per_metre_low, self.per_metre_high))
        product = f"per metre, times {along} of channel: {_span(low, high, 'J')}"
        schools = [stated.text() for stated in self.totals]
        out += [line for text in (*schools, product) for line in _wrap(text, 4)]
        out += _wrap(f"per metre of channel: {_span(self.per_metre_low, self.per_metre_high, 'J/m')}")
        out += [line for stated in self.per_metre for line in _wrap(stated.text(), 4)]
        ruled = f"height {_metres(self.height)}, ruler {_metres(self.ruler)}, dimension"
        out += _wrap(f"channel length: {along} ({ruled} {format_number(self.dimension)})")
        fact = practice("total")
        out += _wrap(f"in the trade: {_span(fact.low, fact.high, 'J')} a flash ({fact.standing})")
        return out + [line for text in (*self.remarks, SENTENCE) for line in _wrap(text)]


def build_ledger(
    entries: Iterable[Entry], height: float = 3e3, ruler: float = 50, dimension: float = 1.1
) -> Ledger:
    """Put the energies of struck objects beside that of the whole flash.

    Args:
        entries: of the objects; may be none.
        height: straight height that the channel spans (m).
        ruler: with which the dimension is stated (m), not longer than the height.
        dimension: fractal dimension of the channel at that ruler (1), from 1 to below 2.

    Raises:
        InputError: what cannot be, all at once.
    """
    given = tuple(entries)
    if problems := list(_problems(given, height, ruler, dimension)):
        raise InputError(problems)
    height, ruler, dimension = float(height), float(ruler), float(dimension)
    length = float(channel.LENGTH(H=height, eps=ruler, D=dimension))
    if not length <= _MOST:
        raise InputError([Problem("the channel would be endless", "take a longer one", ("ruler",))])
    clean = tuple(Entry(_plain(e.object), e.sort, *map(float, (e.energy, e.low, e.high))) for e in given)
    totals, per_metre = published("total"), published("per_metre")
    low_m, high_m = metre = _hull(per_metre)
    least, most = _hull(totals)
    low = min(least, float(channel.ENERGY(e=low_m, l=length)))
    high = max(most, float(channel.ENERGY(e=high_m, l=length)))
    remarks = tuple(_remarks(clean, low, high, height, dimension))
    return Ledger(clean, low, high, totals, per_metre, *metre, length, height, ruler, dimension, remarks)


def published(quantity: str) -> tuple[Published, ...]:
    """Return what has been published about a quantity of the flash or its channel, such as ``"per_metre"``.

    Raises:
        UnknownName: nothing is held about it.
    """
    if quantity not in _read():
        raise UnknownName("quantity of the flash", quantity, _read())
    return _read()[quantity]


def practice(fact: str) -> Published:
    """Return a fact of the trade, which has no source: cloud_height, dimension, duration, temperature, total.

    Raises:
        UnknownName: no such fact.
    """
    facts = {found.name: found for found in published("practice")}
    if fact not in facts:
        raise UnknownName("fact of the trade", fact, facts)
    return facts[fact]


@lru_cache(maxsize=1)
def _read() -> Mapping[str, tuple[Published, ...]]:
    raw = read_table("strikeenergy", "data", "flash_energy.toml")
    try:
        cited = {key: Source(key, str(text)) for key, text in raw["sources"].items()}
        rows = {q: [{**raw["defaults"], "unit": u, **row} for row in raw[q]] for q, u in raw["units"].items()}
        common = raw["practice_defaults"]
        rows["practice"] = [{**common, "name": name, **row} for name, row in raw["practice"].items()]
        return MappingProxyType({q: tuple(_statement(r, cited) for r in many) for q, many in rows.items()})
    except (KeyError, TypeError, AttributeError, UnknownName) as error:
        raise DataError(f"flash_energy.toml: {error!r}") from error


def _statement(row: dict[str, Any], cited: Mapping[str, Source]) -> Published:
    """Make a statement of one row, which has a ``value``, or a ``low``, a ``high`` or both."""
    key, place, unit = str(row["source"]), str(row["locator"]), str(row["unit"])
    own = cited[key].at(place) if key in cited else source(key, place)
    ends = {end: row.get(end, row.get("value")) for end in ("low", "high")}
    given = {end: {**row, "value": value} for end, value in ends.items() if value is not None}
    read = {end: constant(entry, unit, meaning=row["name"], own_source=own) for end, entry in given.items()}
    one = read.get("low") or read["high"]
    low, high = (read[end].value if end in read else None for end in ("low", "high"))
    texts = row["name"], row["school"]
    return Published(*texts, low, high, one.unit, own, one.standing, row.get("say", ""))


def _hull(statements: Iterable[Published]) -> tuple[float, float]:
    ends = [x for s in statements for x in (s.low, s.high) if x is not None]
    return min(ends), max(ends)


def _problems(entries: Iterable[Entry], height: Any, ruler: Any, dimension: Any) -> Iterator[Problem]:
    for n, entry in enumerate(entries):
        if not isinstance(entry.object, str) or not _plain(entry.object):
            yield Problem("an entry needs the name of its object", path=("entry", n, "object"))
        if entry.sort not in get_args(Sort):
            known = ", ".join(repr(sort) for sort in get_args(Sort))
            yield Problem(f"unknown sort {entry.sort!r}", f"known: {known}", ("entry", n, "sort"))
        numbers = {name: getattr(entry, name) for name in ("energy", "low", "high")}
        wrong = [name for name, value in numbers.items() if not _measure(value)]
        for name in wrong:
            what = f"{numbers[name]!r} is no energy"
            yield Problem(what, "write a finite number of joules, not negative", ("entry", n, name))
        if not wrong and not entry.low <= entry.energy <= entry.high:
            yield Problem("it lies outside its own range", "low <= energy <= high", ("entry", n, "energy"))
    lengths = {"height": height, "ruler": ruler}
    wrong = [name for name, value in lengths.items() if not _measure(value) or value == 0]
    for name in wrong:
        yield Problem(f"{lengths[name]!r} is no length", "write a positive, finite number of metres", (name,))
    if not wrong and ruler > height:
        yield Problem("the ruler is longer than the height", "take a shorter one", ("ruler",))
    if not _measure(dimension) or not 1 <= dimension < 2:
        yield Problem(f"{dimension!r} is no dimension of a channel", "from 1 to below 2", ("dimension",))


def _measure(value: Any) -> bool:
    return isinstance(value, (int, float)) and not isinstance(value, bool) and 0 <= value <= _MOST


def _remarks(entries: Iterable[Entry], low: float, high: float, height: float, bend: float) -> Iterator[str]:
    most = _hull(s for s in published("dimension") if s.school == "main channel")[1]
    if bend > most:
        yield f"A dimension above {format_number(most)} is that of a branched pattern: the main path is shorter."
    lowest, highest = _hull(published("cloud_base") + published("charge_height"))
    if not lowest <= height <= highest:
        yield f"The height lies outside the published ones, {_metres(lowest)} to {_metres(highest)}."
    if any(e.low > high for e in entries):
        yield "An object takes more than the strongest published flash has: look at its inputs again."
    elif any(e.high > low for e in entries):
        yield "An object takes more than the weakest published flash has: this flash was stronger than that."


def _plain(text: str) -> str:
    """Make one line of a name, without what a terminal would take for a command."""
    return " ".join("".join(c if c.isprintable() else " " for c in text).split())


def _range(low: float | None, high: float | None, unit: str) -> dict[str, Any]:
    return {"low": low, "high": high, "unit": unit}


def _span(low: float | None, high: float | None, unit: str) -> str:
    digits = 2 if unit == "1" else 3
    least, most = ("" if x is None else format_quantity(x, unit, digits=digits) for x in (low, high))
    if least == most:
        return least
    return f"{least} to {most}" if least and most else f"{least} and more" if least else f"up to {most}"


def _metres(length: float) -> str:
    return format_quantity(length, "m", "km" if length >= 1000 else "m", digits=3)


def _wrap(text: str, indent: int = 2) -> list[str]:
    pad = " " * indent
    return textwrap.wrap(text, 80, initial_indent=pad, subsequent_indent=pad + "  ")
