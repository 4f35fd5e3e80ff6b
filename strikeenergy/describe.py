"""What the program knows: kinds, materials, threats, tables, each with source and standing; a case to start from."""

from __future__ import annotations

from collections.abc import Iterable
from typing import Any

from strikeenergy import describe_lightning as lightning
from strikeenergy.errors import UnknownName
from strikeenergy.formatting import format_quantity, pretty
from strikeenergy.inputs import Part, default_text, parts_of, summary_of, unit_of, words_of
from strikeenergy.lightning.populations import population_names
from strikeenergy.lightning.threats import threat_names
from strikeenergy.lightning.tolerances import specification_names
from strikeenergy.lightning.waveform import SHAPES
from strikeenergy.limit_tables import DEFAULT_STANDARD, LimitTable, Row
from strikeenergy.materials import PROPERTIES, Materials, material_names, sets
from strikeenergy.page import Page, constant_text
from strikeenergy.plugin import Effect
from strikeenergy.registry import Registry, kind_name
from strikeenergy.sources import sources
from strikeenergy.units import dimension_name

__all__ = ["Page", "describe", "plugin_data", "plugin_pages"]

_SUBJECTS = (
    "kinds",
    "materials",
    "threats",
    "shapes",
    "populations",
    "specifications",
    "tables",
    "standards",
    "sources",
)


def describe(registry: Registry, subject: str = "", name: str = "") -> list[Page]:
    """Describe a subject, or one thing of it.

    Raises:
        UnknownName: no such subject or name, with the nearest ones.
    """
    several = {
        "kinds": _kinds,
        "materials": _materials,
        "threats": lightning.threats,
        "shapes": lightning.shapes,
        "populations": lightning.populations,
        "specifications": lightning.specifications,
        "tables": _tables,
        "standards": _standards,
        "sources": _sources,
    }
    one = {
        "kind": _kind,
        "material": _material,
        "threat": lightning.describe_threat,
        "population": lightning.describe_population,
        "specification": lightning.describe_specification,
        "table": _table,
    }
    if not subject:
        return [*_kinds(registry), *_overview(registry)]
    if subject in several and not name:
        return several[subject](registry)
    subject = subject.removesuffix("s") if name and subject.removesuffix("s") in one else subject
    if subject in one:
        return one[subject](registry, name) if name else several[subject + "s"](registry)
    if subject in registry.kinds and not name:
        return _kind(registry, subject)
    raise UnknownName("subject", subject, [*registry.kinds, *_SUBJECTS, *one])


def _overview(registry: Registry) -> list[Page]:
    lines = [
        ("describe KIND", "inputs, effects and findings of a kind, such as 'describe conductor'"),
        ("describe materials", f"{len(material_names())} materials in {len(sets())} constant sets"),
        ("describe threats", f"{len(threat_names())} named threats"),
        ("describe shapes", f"{len(SHAPES)} shapes that a stroke may have"),
        ("describe populations", f"{len(population_names())} populations of natural flashes"),
        ("describe specifications", f"{len(specification_names())} tests that a record can be held against"),
        ("describe tables", f"{len(registry.limit_tables)} tables of minimum sizes"),
        ("describe sources", f"{len(sources())} publications that the numbers rest on"),
        ("new KIND", "a commented case to start from"),
    ]
    return [Page("What else can be asked", lines)]


def _kinds(registry: Registry) -> list[Page]:
    entries = []
    for name, kind in registry.kinds.items():
        effects = ", ".join(effect.name for effect in registry.effects_of(kind))
        owner = registry.owners[f"kind {name}"]
        entries.append(
            (name, f"{summary_of(kind)}. Effects: {effects}. From {owner.distribution} {owner.version}.")
        )
    return [Page("Kinds of struck object", entries)]


def _kind(registry: Registry, name: str) -> list[Page]:
    kind = registry.kind(name)
    pages = [Page(f"{name}: inputs", list(_fields(kind)), (kind.__doc__ or "").strip())]
    pages += [Page(f"{name}.{part}: inputs", list(_fields(model))) for part, model in parts_of(kind)]
    if kind.uses:
        pages.append(Page(f"{name}: what use may be", list(kind.uses.items())))
    for effect in registry.effects_of(kind):
        pages.append(_effect(registry, effect))
    return pages


def _effect(registry: Registry, effect: Effect) -> Page:
    owner = registry.owner_of(effect)
    entries = []
    for finding, declared in effect.findings.items():
        unit = "word" if declared.unit is None else pretty(declared.unit) or "1"
        bound = f" ({declared.bound} bound)" if declared.bound else ""
        entries.append((finding, f"{declared.meaning}{bound} [{unit}]"))
    for label, texts in (
        ("rises with", effect.rises_with),
        ("falls with", effect.falls_with),
        ("valid for", [validity.text for validity in effect.validity]),
        ("leaves out", effect.leaves_out),
        ("criteria", [f"{c.check}: {c.value} against {c.limit} ({c.clause})" for c in effect.criteria]),
        ("sources", [str(source) for source in effect.sources]),
    ):
        if texts:
            entries.append((f"· {label}", "; ".join(texts)))
    return Page(
        f"{kind_name(effect.kind)}: effect {effect.name}",
        entries,
        f"{effect.summary} From {owner.distribution} {owner.version}.",
    )


def _fields(model: type[Part]) -> Iterable[tuple[str, str]]:
    for name, info in model.model_fields.items():
        if name == "kind":
            continue
        said = [(info.description or "").strip().rstrip(".")]
        mark = unit_of(model, name)
        if mark is not None:
            said.append(
                f"{dimension_name(mark.unit)}{', ' + mark.range_text if mark.range_text else ''}; such as {mark.text!r}"
            )
        words = words_of(info.annotation)
        if words:
            said.append(f"one of {', '.join(map(repr, words))}")
        default = default_text(model, name)
        if default:
            said.append(f"default {default}")
        elif info.is_required():
            said.append("required")
        yield name, ". ".join(said) + "."


def _materials(registry: Registry) -> list[Page]:
    known = Materials()
    entries = []
    for name in material_names():
        having = [s for s in sets() if known.get(name, s).properties]
        entries.append(
            (
                name,
                "constants in " + ", ".join(having)
                if having
                else "no constants; rows of the limit tables only",
            )
        )
    pages = [Page("Materials", entries)]
    pages.append(
        Page(
            "Constant sets",
            [(s.name, s.note) for s in sets().values()],
            "One calculation takes all constants of a material from one set.",
        )
    )
    pages.append(
        Page(
            "Properties that an own material may give",
            [(n, f"{meaning} [{pretty(unit) or '1'}]") for n, (unit, meaning) in PROPERTIES.items()],
        )
    )
    return pages


def _material(registry: Registry, name: str) -> list[Page]:
    known = Materials()
    canonical = known.canonical(name)
    pages = []
    for set_name in sets():
        material = known.get(canonical, set_name)
        if material.properties:
            entries = [(key, constant_text(value)) for key, value in material.properties.items()]
            citation = next(iter(material.properties.values())).source.citation
            intro = ". ".join([*material.remarks, f"Source: {citation}"])
            pages.append(Page(f"{canonical} in {set_name}", entries, intro))
    return pages or [Page(canonical, [], "No constant set has it; the limit tables have rows for it.")]


def _tables(registry: Registry) -> list[Page]:
    entries = [
        (table.name, f"{table.title} ({sum(len(c.rows) for c in table.checks)} rows)")
        for table in registry.limit_tables
    ]
    return [Page("Tables of minimum sizes", entries), *_standards(registry)]


def _standards(registry: Registry) -> list[Page]:
    entries = [
        (
            name,
            "decides unless the case says otherwise"
            if name == DEFAULT_STANDARD
            else "for comparison, or with standard = ...",
        )
        for name in registry.standards
    ]
    return [Page("Standards that a case may name", entries)]


def _table(registry: Registry, name: str) -> list[Page]:
    known = {table.name: table for table in registry.limit_tables}
    folded = {key.casefold(): key for key in known}
    if name.casefold() not in folded:
        raise UnknownName("table", name, known)
    table = known[folded[name.casefold()]]
    return [_check_page(table, number) for number in range(len(table.checks))]


def _check_page(table: LimitTable, number: int) -> Page:
    check = table.checks[number]
    entries = []
    for row in check.rows:
        label = ", ".join(filter(None, (" or ".join(row.materials), " or ".join(row.forms))))
        entries.append((label, _row(row)))
    intro = f"{table.title}. For use: {', '.join(table.uses)}. {check.say} {table.remark}".strip()
    return Page(f"{table.name}: {check.name}", entries, " ".join(intro.split()))


def _row(row: Row) -> str:
    show = "mm**2" if row.quantity == "section" else "mm"
    said = [
        f"{row.quantity} {format_quantity(row.minimum.value, row.minimum.unit, show)} ({row.minimum.standing})"
    ]
    said += [variant.say for variant in row.variants]
    return "; ".join([*said, *filter(None, (row.say, row.only_when_say))])


def _sources(registry: Registry) -> list[Page]:
    return [Page("Publications", [(key, source.citation) for key, source in sorted(sources().items())])]


# -- plugins -----------------------------------------------------------------------------------------------


def plugin_data(registry: Registry) -> dict[str, Any]:
    """Return what is installed and what failed, for JSON."""
    from strikeenergy.results import failure_dict

    return {
        "schema_version": 1,
        "plugins": [
            {
                "name": p.name,
                "module": p.module,
                "distribution": p.distribution,
                "version": p.version,
                "kinds": list(p.kinds),
                "effects": list(p.effects),
                "tables": list(p.tables),
            }
            for p in registry.plugins
        ],
        "failures": [failure_dict(failure) for failure in registry.failures],
    }


def plugin_pages(registry: Registry) -> list[Page]:
    """Return what is installed and what failed, for people."""
    entries = []
    for p in registry.plugins:
        brings = [f"kinds {', '.join(p.kinds)}"] if p.kinds else []
        brings += [f"effects {', '.join(p.effects)}"] if p.effects else []
        brings += [f"tables {', '.join(p.tables)}"] if p.tables else []
        entries.append(
            (p.name, f"{p.distribution} {p.version}, module {p.module}: {'; '.join(brings) or 'nothing'}")
        )
    pages = [Page("Plugins", entries)]
    if registry.failures:
        failed = [(f.plugin, f"{f.distribution}: failed to {f.stage}: {f.reason}") for f in registry.failures]
        pages.append(Page("FAILED", failed))
    return pages
