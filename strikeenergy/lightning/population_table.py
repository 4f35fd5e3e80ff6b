"""The table of published populations (population.toml), read into populations."""

from __future__ import annotations

from collections.abc import Mapping
from functools import lru_cache
from types import MappingProxyType
from typing import Any

from strikeenergy.errors import DataError, UnknownName
from strikeenergy.lightning.joint import Correlation
from strikeenergy.lightning.marginals import LogNormal, Marginal, StrokeNumber, TwoSlopeLogNormal
from strikeenergy.lightning.population_set import Population
from strikeenergy.lightning.published_laws import QUANTITIES, ContinuingCurrent, PublishedLaw
from strikeenergy.sources import Constant, Source, Standing, source, weakest
from strikeenergy.tables import constant, read_table, standing

__all__ = ["population_aliases", "population_names", "read_continuing", "read_population", "read_strokes"]


@lru_cache(maxsize=1)
def _table() -> dict[str, Any]:
    return read_table("strikeenergy", "data", "population.toml")


def _source(entry: Mapping[str, Any]) -> Source:
    key, own = str(entry["source"]), _table()["sources"]
    found = Source(key, str(own[key])) if key in own else source(key)
    return found.at(str(entry.get("locator", "")))


def _number(entry: Any, unit: str, meaning: str, defaults: Mapping[str, Any]) -> Constant:
    full = {**{k: defaults[k] for k in ("source", "locator", "standing") if k in defaults}}
    full |= entry if isinstance(entry, Mapping) else {"value": entry}
    return constant(full, unit, meaning=meaning, own_source=_source(full))


def _law(row: Mapping[str, Any], unit: str, meaning: str, defaults: Mapping[str, Any]) -> PublishedLaw:
    origin = {**{k: defaults[k] for k in ("source", "locator", "standing")}, **row}

    def branch(part: Mapping[str, Any]) -> LogNormal:
        median = _number(part["median"], unit, meaning, origin).value
        if ("sigma_ln" in part) == ("sigma_log10" in part):
            raise DataError(f"{meaning}: give sigma_ln or sigma_log10")
        make, key = (
            (LogNormal.from_ln, "sigma_ln") if "sigma_ln" in part else (LogNormal.from_log10, "sigma_log10")
        )
        return make(median, _number(part[key], "", meaning, origin).value)

    law: Marginal = branch(row) if "median" in row else LogNormal(1.0, 1.0)
    if "knee" in row:
        knee = _number(row["knee"], unit, meaning, origin).value
        law = TwoSlopeLogNormal(branch(row["below"]), branch(row["above"]), knee)
    points = {
        k: _number(v, unit, meaning, origin).value for k, v in row.items() if k[0] == "p" and k[1:].isdigit()
    }
    return PublishedLaw(law, MappingProxyType(points), _source(origin), standing(origin["standing"]))


def _scaled(row: PublishedLaw, factor: float, defaults: Mapping[str, Any]) -> PublishedLaw:
    law = row.law
    if isinstance(law, LogNormal):
        law = LogNormal(law.median * factor, law.sigma)
    else:
        below, above = (LogNormal(part.median * factor, part.sigma) for part in (law.below, law.above))
        law = TwoSlopeLogNormal(below, above, law.knee * factor)
    rank = weakest([row.standing, Standing.DERIVED])
    return PublishedLaw(law, row.points, _source(defaults), rank, f"{factor:g} times that of {row.source}")


@lru_cache(maxsize=32)
def read_population(name: str) -> Population:
    """Read the population of this name."""
    raw = _table()
    entry = raw["population"][name]
    base = read_population(entry["based_on"]) if "based_on" in entry else None
    laws: dict[str, dict[str, PublishedLaw]] = {q: dict(base.laws[q]) for q in base.laws} if base else {}
    for quantity, rows in entry.get("law", {}).items():
        unit = QUANTITIES[quantity][0]
        fresh = {c: _law(row, unit, f"{quantity} of {c} in {name}", entry) for c, row in rows.items()}
        laws[quantity] = {**laws.get(quantity, {}), **fresh}
    for quantity, factors in entry.get("scale", {}).items():
        laws[quantity] |= {
            c: _scaled(laws[quantity][c], float(factor), entry) for c, factor in factors.items()
        }
    own = tuple(
        (
            str(r["text"]),
            standing(r.get("standing", entry["standing"])),
            _source({**entry, "locator": "", **r}),
        )
        for r in entry.get("remark", ())
    )
    together = {k: float(v) for k, v in raw["correlation"].items() if not isinstance(v, str)}
    if base is None:
        numbers, continuing = read_strokes(entry["strokes"]), read_continuing(entry["continuing"])
        share = _number(entry["positive_share"], "", "share of positive flashes", entry)
    else:
        numbers = read_strokes(entry["strokes"]) if "strokes" in entry else (base.strokes, base.stroke_means)
        continuing = read_continuing(entry["continuing"]) if "continuing" in entry else base.continuing
        share = base.positive_share
        if "positive_share" in entry:
            share = _number(entry["positive_share"], "", "share of positive flashes", entry)
    return Population(
        name=name,
        laws=MappingProxyType({q: MappingProxyType(rows) for q, rows in laws.items()}),
        positive_share=share,
        correlation=Correlation(**together),
        strokes=numbers[0],
        stroke_means=numbers[1],
        continuing=continuing,
        remarks=own + (base.remarks if base else ()),
    )


def read_strokes(name: str) -> tuple[Mapping[str, StrokeNumber], Mapping[str, Constant]]:
    """Read a set of stroke numbers by component: the laws, and their means with the origin."""
    sets = _table()["strokes"]
    if name not in sets:
        raise UnknownName("set of stroke numbers", name, sets)
    sorts, row = {"positive": "positive", "first negative": "negative"}, sets[name]
    single, mean = (
        {c: _number(row[f"{key}_{what}"], "", f"{what}, {key} strokes", row) for c, key in sorts.items()}
        for what in ("single", "mean")
    )
    law = {c: StrokeNumber(single[c].value, mean[c].value) for c in sorts}
    return MappingProxyType(law), MappingProxyType(mean)


def read_continuing(name: str) -> ContinuingCurrent:
    """Read a set of continuing-current shares."""
    sets, law = _table()["continuing"], _table()["joint_law"]
    if name not in sets:
        raise UnknownName("set of continuing currents", name, sets)
    sorts = {"positive": "positive", "first negative": "negative"}
    share = {
        c: _number(sets[name][f"{key}_share"], "", f"{key} share of {name}", sets[name])
        for c, key in sorts.items()
    }
    excess = {
        c: _number(law[f"{key}_excess"], "s", f"{key} excess duration", law) for c, key in sorts.items()
    }
    peak = _number(law["peak"], "A", "strongest negative stroke with continuing current", law)
    duration = _number(law["duration"], "s", "what counts as a long continuing current", law)
    return ContinuingCurrent(name, MappingProxyType(share), MappingProxyType(excess), peak, duration)


def population_names() -> list[str]:
    """Return the name of every population, the default first."""
    return list(_table()["population"])


def population_aliases() -> dict[str, str]:
    """Return the name of the population behind each of its names."""
    table = _table()["population"]
    return {alias: name for name, row in table.items() for alias in (name, *row.get("aliases", ()))}
