"""Whether a measured test current is the one that a test specification asks for.

The specifications stand in ``data/test_tolerances.toml``, each number with its source and standing: IEC 62305-1 Annex C,
IEC 62561-1 classes H and N, impulse currents 1/20, 4/10, 8/20 and 30/80, and the aerospace components A, B, C, D, H.
Where sources conflict on a tolerance the caller chooses one by name; a strict one is the default.

Left out: the number of shots, the front steepness test of Annex C, rectangular currents, and whether peak, charge and W/R
were reached in one impulse (one record is one impulse).
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from functools import lru_cache
from typing import Any, cast

from strikeenergy.errors import DataError, InputError, Problem, StrikeEnergyError, UnknownName
from strikeenergy.lightning.reduction import Reduction
from strikeenergy.sources import Source, Standing, weakest
from strikeenergy.tables import read_table, standing
from strikeenergy.units import read

__all__ = [
    "Specification",
    "ToleranceResult",
    "check",
    "specification",
    "specification_names",
    "tolerance_names",
]

SPECIFIED_UNITS = {
    "peak": "A",
    "front_time": "s",
    "half_value_time": "s",
    "charge": "C",
    "specific_energy": "J/ohm",
    "duration": "s",
    "average_current": "A",
    "reversal": "1",
    "steepness": "A/s",
}
_EXACT = 1e-9  # a value exactly at its limit meets it


@dataclass(frozen=True)
class Demand:
    """What a specification asks of one quantity (SI).

    Attributes:
        quantity: a name of ``Reduction``, or ``average_current`` or ``steepness``.
        nominal: None where only bounds are given, or where the caller has to give it.
        choices: for each name of a tolerance, the bounds (low, high) in per cent of the nominal value; None is no bound.
        bounds: (low, high) in SI, where the specification gives bounds instead of a nominal value.
        default: the tolerance that is taken unless another is chosen.
        within: the time after the virtual origin that counts (s), or None for the whole record.
        backing: for each name of a tolerance, its source and standing.
    """

    quantity: str
    nominal: float | None
    choices: dict[str, tuple[float | None, float | None]]
    bounds: tuple[float | None, float | None]
    default: str
    within: float | None
    backing: dict[str, tuple[Source, Standing]]


@dataclass(frozen=True)
class Specification:
    """A test current and its tolerances."""

    name: str
    aliases: tuple[str, ...]
    demands: tuple[Demand, ...]
    source: Source
    standing: Standing

    @property
    def tolerances(self) -> tuple[str, ...]:
        """Names of the tolerances that can be chosen; empty where there is no choice."""
        return tuple(dict.fromkeys(name for d in self.demands for name in d.choices if name))


@dataclass(frozen=True)
class ToleranceResult:
    """One quantity against its tolerance, in SI.

    Attributes:
        quantity: its name.
        value: measured; None where the record does not give it.
        nominal: None where there is none.
        low, high: the bounds; None for no bound.
        uncertainty: standard uncertainty of the value.
        outcome: ``"pass"``, ``"fail"`` or ``"not measured"``.
        source: where the bounds come from.
        standing: how firmly they stand.
        unit: of value, nominal, bounds and uncertainty.
        tolerance: name of the tolerance, where there was a choice.
        remark: what else the reader must know: a bound within twice the uncertainty, why nothing was measured.
    """

    quantity: str
    value: float | None
    nominal: float | None
    low: float | None
    high: float | None
    uncertainty: float | None
    outcome: str
    source: str
    standing: str
    unit: str = ""
    tolerance: str = ""
    remark: str = ""

    def to_dict(self) -> dict[str, Any]:
        """Return it for JSON."""
        return dict(vars(self))


@lru_cache(maxsize=1)
def _specifications() -> dict[str, Specification]:
    raw = read_table("strikeenergy", "data", "test_tolerances.toml")
    try:
        cited = {key: Source(key, str(text)) for key, text in raw["sources"].items()}
        found = [_specification(entry, cited) for entry in raw["spec"]]
        found += [_shape(entry, raw["shape_tolerances"], cited) for entry in raw["shape"]]
    except (KeyError, TypeError, ValueError, StrikeEnergyError) as error:
        raise DataError(f"test_tolerances.toml: {error}") from error
    return {spec.name: spec for spec in found}


def _factors(pair: list[Any]) -> tuple[float | None, float | None]:
    low, high = (None if side == "none" else 100 + float(side) for side in pair)
    return low, high


def _specification(entry: dict[str, Any], cited: dict[str, Source]) -> Specification:
    own = cited[entry["source"]].at(entry["locator"])
    firm = standing(entry["standing"])
    demands = []
    for quantity, row in entry.items():
        if quantity not in SPECIFIED_UNITS:
            continue
        unit = SPECIFIED_UNITS[quantity]
        choices = {name: _factors(pair) for name, pair in row.get("tolerances", {}).items()}
        if "tolerance" in row:
            choices = {"": _factors(row["tolerance"])}
        stands = standing(row["standing"]) if "standing" in row else firm
        low, high, nominal, within = (
            cast(float, read(row[key], of)) if key in row else None
            for key, of in (("low", unit), ("high", unit), ("nominal", unit), ("within", "s"))
        )
        default = row.get("default", "")
        backing = dict.fromkeys(choices or [""], (own, stands))
        demands.append(Demand(quantity, nominal, choices, (low, high), default, within, backing))
    whole = weakest(stands for d in demands for _, stands in d.backing.values())
    return Specification(entry["name"], tuple(entry.get("aliases", ())), tuple(demands), own, whole)


def _shape(entry: dict[str, Any], tolerances: dict[str, Any], cited: dict[str, Source]) -> Specification:
    name, default = entry["name"], tolerances["default"]
    sets = {
        key: row for key, row in tolerances.items() if key != "default" and name in row.get("shapes", [name])
    }
    backing = {
        key: (cited[row["source"]].at(row["locator"]), standing(row["standing"])) for key, row in sets.items()
    }
    demands = []
    for quantity in ("peak", "front_time", "half_value_time"):
        nominal = cast(float, read(entry[quantity], "s")) if quantity in entry else None
        choices = {key: _factors(row[quantity]) for key, row in sets.items()}
        demands.append(Demand(quantity, nominal, choices, (None, None), default, None, backing))
    most: dict[str, tuple[float | None, float | None]] = {
        key: (None, 100 * float(row["reversal"])) for key, row in sets.items() if "reversal" in row
    }
    demands.append(Demand("reversal", 1.0, most, (None, None), default, None, backing))
    return Specification(name, (f"{name} us", f"impulse {name}"), tuple(demands), *backing[default])


def specification_names() -> list[str]:
    """Return the name of every specification."""
    return list(_specifications())


def tolerance_names(spec_name: str) -> tuple[str, ...]:
    """Return the tolerances that can be chosen for a specification; empty where there is no choice."""
    return specification(spec_name).tolerances


def specification(name: str) -> Specification:
    """Return the specification of this name or alias.

    Raises:
        UnknownName: there is none, with the nearest names.
    """
    table = {n.casefold(): s for s in _specifications().values() for n in (s.name, *s.aliases)}
    folded = " ".join(name.split()).casefold()
    if folded not in table:
        raise UnknownName(
            "test specification", name, [n for s in _specifications().values() for n in (s.name, *s.aliases)]
        )
    return table[folded]


def check(
    reduction: Reduction, spec_name: str, tolerance: str | None = None, *, peak: Any = None
) -> list[ToleranceResult]:
    """Compare a reduced record with a test specification.

    Args:
        reduction: of the record. Charge and W/R count without the tail beyond the end of the record.
        spec_name: such as ``"LPL I first positive impulse"``, ``"class H"``, ``"8/20"``, ``"component A"``.
        tolerance: one of ``tolerance_names(spec_name)``; by default a strict one.
        peak: the peak that the test calls for (A, or a text such as ``"10 kA"``), where the specification is a shape.

    Raises:
        UnknownName: no such specification or tolerance.
        InputError: a peak where the specification has its own.
    """
    spec = specification(spec_name)
    if tolerance is not None and tolerance not in spec.tolerances:
        raise UnknownName(f"tolerance of {spec.name}", tolerance, spec.tolerances)
    wanted = None
    if peak is not None:
        wanted = (
            float(peak)
            if isinstance(peak, (int, float))
            else float(cast(float, read(peak, "A", example="10 kA")))
        )
        own = any(
            d.quantity == "peak" and (d.nominal is not None or d.bounds != (None, None)) for d in spec.demands
        )
        if own or not 0 < wanted < float("inf"):
            what = f"{spec.name} has a peak of its own" if own else f"{peak!r} is no peak current"
            raise InputError([Problem(f"peak: {what}", "leave it out" if own else "write such as '10 kA'")])
    return list(_results(reduction, spec, tolerance, wanted))


def _results(
    reduction: Reduction, spec: Specification, tolerance: str | None, peak: float | None
) -> Iterator[ToleranceResult]:
    for demand in spec.demands:
        chosen = ""
        if "" not in demand.choices and demand.choices:
            chosen = tolerance or demand.default
        if demand.choices and chosen not in demand.choices:
            continue  # this tolerance says nothing of this quantity
        nominal = demand.nominal if demand.nominal is not None or demand.quantity != "peak" else peak
        low, high = demand.bounds
        remark = ""
        if demand.choices:
            factors = demand.choices[chosen]
            low, high = (None if f is None or nominal is None else f * nominal / 100 for f in factors)
            if nominal is None:
                remark = "no nominal peak was given"
        value, uncertainty = _value(reduction, demand)
        outcome = "not measured"
        if value is None:
            remark = (
                "the record does not give it"
                if demand.quantity != "steepness"
                else "not measured from records"
            )
        elif not remark:
            outcome, remark = _judge(value, uncertainty or 0.0, low, high)
        if demand.quantity in ("charge", "specific_energy") and any(
            c.name == "tail" for c in reduction.flags
        ):
            remark = "; ".join(filter(None, (remark, "the record ends before the current does")))
        if any(c.name == "saturation" for c in reduction.flags) and demand.quantity in (
            "peak",
            "charge",
            "specific_energy",
        ):
            remark = "; ".join(filter(None, (remark, "a lower bound: the top is flat")))
        source, firm = demand.backing[chosen]
        if demand.quantity == "reversal":
            nominal = None
        yield ToleranceResult(
            demand.quantity,
            value,
            nominal,
            low,
            high,
            uncertainty,
            outcome,
            str(source),
            str(firm),
            SPECIFIED_UNITS[demand.quantity],
            chosen,
            remark,
        )


def _value(reduction: Reduction, demand: Demand) -> tuple[float | None, float | None]:
    if demand.quantity == "steepness":
        return None, None
    if demand.quantity == "average_current":
        if demand.within is None or reduction.origin is None or reduction.charge.uncertainty is None:
            return None, None
        return reduction.until(demand.within)[0] / demand.within, reduction.charge.uncertainty / demand.within
    measured = getattr(reduction, demand.quantity)
    if demand.within is not None and reduction.origin is not None and measured.value is not None:
        charge, energy = reduction.until(demand.within)
        return (charge if demand.quantity == "charge" else energy), measured.uncertainty
    return measured.value, measured.uncertainty


def _judge(value: float, uncertainty: float, low: float | None, high: float | None) -> tuple[str, str]:
    good = (low is None or value >= low * (1 - _EXACT)) and (high is None or value <= high * (1 + _EXACT))
    near = any(bound is not None and abs(value - bound) < 2 * uncertainty for bound in (low, high))
    return "pass" if good else "fail", "a bound lies within twice the uncertainty" if near else ""
