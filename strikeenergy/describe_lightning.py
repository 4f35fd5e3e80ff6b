"""Describing the current: threats with how rare they are, shapes, populations of natural flashes, test tolerances."""

from __future__ import annotations

from strikeenergy.formatting import format_number, format_quantity, pretty
from strikeenergy.lightning.flash import Flash, Stroke
from strikeenergy.lightning.populations import population, population_names, rarity
from strikeenergy.lightning.threats import COMPONENTS, Component, levels, single_components, threat
from strikeenergy.lightning.tolerances import (
    SPECIFIED_UNITS,
    specification,
    specification_names,
    tolerance_names,
)
from strikeenergy.lightning.waveform import SHAPES
from strikeenergy.page import Page, constant_text
from strikeenergy.registry import Registry

__all__ = [
    "describe_population",
    "describe_specification",
    "describe_threat",
    "populations",
    "shapes",
    "specifications",
    "threats",
]


def _line(flash: Flash) -> str:
    return repr(flash).strip("<>").split(": ", 1)[1]


def threats(registry: Registry) -> list[Page]:
    """Return every named threat."""
    parts = [(f"LPL I {part}", _line(threat(f"LPL I {part}"))) for part in COMPONENTS]
    single = [
        (name, f"{component.say}: {_line(threat(name))}") for name, component in single_components().items()
    ]
    return [
        Page(
            "Threats",
            [(name, _line(threat(name))) for name in levels()],
            "Protection levels: the first positive impulse and the long stroke.",
        ),
        Page("Their components (the same for each level)", parts),
        Page("Aerospace components, and classes of connector tests", single),
    ]


def describe_threat(registry: Registry, name: str) -> list[Page]:
    """Return a threat with source and standing of each value, what its waveform gives, and how rare its values are."""
    flash = threat(name)
    pages = []
    if flash.name in single_components():
        pages.append(_component(flash.name, single_components()[flash.name]))
    else:
        level = next(known for known in levels() if flash.name == known or flash.name.startswith(known + " "))
        for part, component in levels()[level].items():
            if flash.name in (level, f"{level} {part}"):
                title = "flash totals" if part == "flash" else part
                pages.append(_component(f"{level}: {title}", component))
    pages[0].intro = " ".join([f"Source: {flash.source}.", *(f"{remark}." for remark in flash.remarks)])
    return [*pages, _rarity(flash)]


def _component(title: str, component: Component) -> Page:
    entries = [(key, constant_text(value)) for key, value in component.values.items()]
    if component.waveform is not None:
        entries.append(("waveform", component.shape))
        stroke = Stroke(waveform=component.waveform)
        units = {"peak": "A", "charge": "C", "specific_energy": "J/ohm"}
        for key, value in stroke.integrated.items():
            entries.append((f"{key}, integrated", format_quantity(float(value), units[key])))
        w = component.waveform
        if w.front_time() > 0:
            entries.append(
                (
                    "T1 (10/90), T2",
                    ", ".join(format_quantity(float(v), "s") for v in (w.front_time(), w.half_value_time())),
                )
            )
    return Page(title, entries)


def _rarity(flash: Flash) -> Page:
    """How many natural flashes pass each value, by the default population."""
    data = flash.to_dict()
    values = {key: data[key]["value"] for key in ("peak", "charge", "specific_energy") if data[key]["value"]}
    if len(flash.strokes) > 1 and flash.impulse_charge:
        values["short_charge"] = float(flash.impulse_charge)
    entries = []
    for found in rarity(values):
        said = ", ".join(f"{component}: {_share(share)}" for component, share in found.exceedance.items())
        entries.append((f"{found.quantity} {format_quantity(found.value, found.unit)}", said))
    words = "Share of natural flashes that exceed each value, by stroke type and for the mixture of 10 % positive flashes."
    return Page(f"How rare it is (population {population().name})", entries, words)


def _share(share: float) -> str:
    if share >= 0.0995:
        return f"{100 * share:.0f} %"
    return f"{format_number(100 * share, 2)} %"


def shapes(registry: Registry) -> list[Page]:
    """Return the shapes a stroke may have, with their parameters."""
    entries = []
    for name, shape in SHAPES.items():
        parameters = ", ".join(
            f"{key} [{pretty(unit) or '1'}]{' (optional)' if key in shape.OPTIONAL else ''}"
            for key, unit in shape.UNITS.items()
        )
        entries.append((name, f"{(shape.__doc__ or '').strip().split(chr(10))[0]} Parameters: {parameters}"))
    entries.append(
        (
            "10/350, 8/20, ...",
            "T1/T2 in microseconds: the waveform that has exactly these. Parameter: peak [A]",
        )
    )
    entries.append(
        ("fitted", "to any consistent set of peak, charge, specific_energy, front_time, half_value_time")
    )
    return [Page("Shapes of a stroke", entries)]


def populations(registry: Registry) -> list[Page]:
    """Return the populations of natural flashes."""
    entries = []
    for name in population_names():
        told = population(name).describe()
        entries.append((name, told[0][0]))
    return [Page("Populations of natural flashes", entries)]


def describe_population(registry: Registry, name: str) -> list[Page]:
    """Return the laws of a population with the standing and source of each."""
    told = population(name).describe()
    entries = [("", f"{text} ({standing}; {source})") for text, standing, source in told]
    return [Page(f"Population {population(name).name}", entries)]


def specifications(registry: Registry) -> list[Page]:
    """Return the test specifications that a record can be held against."""
    entries = []
    for name in specification_names():
        choices = tolerance_names(name)
        entries.append((name, f"tolerances: {', '.join(choices)}" if choices else "one tolerance"))
    return [Page("Test specifications for records", entries)]


def describe_specification(registry: Registry, name: str) -> list[Page]:
    """Return the demands of one test specification, with the source and standing of each."""
    found = specification(name)
    entries = []
    for demand in found.demands:
        unit = SPECIFIED_UNITS[demand.quantity]
        nominal = "" if demand.nominal is None else f"nominal {format_quantity(demand.nominal, unit)}, "
        for chosen, (low, high) in (demand.choices or {"": demand.bounds}).items():
            ends = [
                None
                if end is None
                else format_quantity(end if demand.nominal is None else end / 100 * demand.nominal, unit)
                for end in (low, high)
            ]
            allowed = (
                " to ".join(end for end in ends if end)
                if all(ends)
                else f"at most {ends[1]}"
                if ends[1]
                else f"at least {ends[0]}"
            )
            source, standing = demand.backing.get(chosen, (found.source, found.standing))
            entries.append(
                (
                    f"{demand.quantity}{f' ({chosen})' if chosen else ''}",
                    f"{nominal}{allowed} ({standing}; {source})",
                )
            )
    return [Page(found.name, entries)]
