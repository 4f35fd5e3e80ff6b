"""What the arc does to a trunk: flashover, path, channel energy, probabilities of the damage classes."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Annotated, Any

import numpy as np

from strikeenergy.api import (  # fmt: skip
    Bracket,
    Finding,
    Findings,
    Flash,
    Given,
    MissingInput,
    Note,
    Value,
    Words,
    effect,
    format_quantity,
    source,
)
from strikeenergy.physics import trunk
from strikeenergy_tree.damage import Confined, channel_energy, class_probabilities, confined
from strikeenergy_tree.kind import Tree
from strikeenergy_tree.parameters import band
from strikeenergy_tree.stem import MODEL, Pieces, layers, pieces

SURVEY = source("makela2009", "damage classes; wet trees are damaged less, rotten trees most")
FURROWS = source("taylor1969", "furrows and their widths")
FULGURITES = source("pasek2016", "energy per metre of fulgurites, an upper end for channels")

_NEEDS_STROKE = (
    "channel_energy_per_length",
    "damage_class",
    "probability_none_visible",
    "probability_bark_loss",
    "probability_wood_loss",
    "probability_explosive",
    "bark_speed",
)


@dataclass(frozen=True)
class Channel(Findings):
    """What a stroke to a trunk comes to."""

    flashover_current: Annotated[
        Value,
        Finding("A", "current in the tissue at which the trunk flashes over; the tissue never carries more"),
    ]
    trunk_resistance_per_length: Annotated[
        Value, Finding("ohm/m", "resistance of the trunk until it flashes over")
    ]
    energy_before_flashover_per_length: Annotated[
        Value,
        Finding("J/m", "heat in the whole section while the flashover develops: far too little for damage"),
    ]
    path_surface: Annotated[Value, Finding("", "probability that the arc runs on the bark")]
    path_under_bark: Annotated[Value, Finding("", "probability that the arc runs under the bark")]
    path_deep: Annotated[Value, Finding("", "probability that the arc runs deep in the wood")]
    channel_energy_per_length: Annotated[
        Value,
        Finding(
            "J/m",
            "energy of an arc on the likelier of the two internal paths, if it is inside; with the assumed band",
            ledger="channel",
            along="height",
        ),
    ]
    damage_class: Annotated[
        Value, Finding(None, "the most probable of four classes, not a forecast: see the four probabilities")
    ]
    probability_none_visible: Annotated[Value, Finding("", "probability of no visible mark")]
    probability_bark_loss: Annotated[Value, Finding("", "probability of a furrow or strip in the bark only")]
    probability_wood_loss: Annotated[
        Value, Finding("", "probability that wood is thrown or the trunk splits")
    ]
    probability_explosive: Annotated[Value, Finding("", "probability that the trunk bursts")]
    bark_speed: Annotated[Value, Finding("m/s", "speed of a bark strip if the arc runs on the likelier of the two internal paths")]  # fmt: skip


@effect(
    Tree,
    sources=[MODEL, SURVEY, FURROWS, FULGURITES],
    rises_with=["diameter"],
    validity=[
        "living stems above freezing",
        "impulses, up to about a millisecond; the whole charge of an impulse counts, also what flows after the bark has opened",
        "orders of magnitude: nothing published calibrates path, channel energy or yield",
    ],
    leaves_out=[
        "continuing current and fire: it flows after the bark has opened and never counts as confined energy",
        "steam pressure in the sap: the classes rest on energies alone",
        "crown, roots, side flashes, step voltage, and death of the tree without a visible mark",
        "air drag on what flies",
    ],
)
def channel(tree: Tree, flash: Flash, note: Note) -> Channel:
    """Flashover, path, channel energy and damage class of a struck trunk; the field inside is capped."""
    stem = layers(tree, note)
    note.remark(
        "channel energies, also that in the energy ledger, hold only if the arc runs inside the trunk"
    )
    note.remark(
        "not a safety clearance: do not approach the tree before it is declared safe; it may hide cracks, hanging limbs "
        "and embers, also without a visible mark"
    )
    note.remark(
        "the figures are bands of an uncalibrated model with assumed parameters; the class is only the most probable one"
    )
    fields = _Fields.of(tree, note)
    current = _flashover(fields, stem.resistance, note)
    before = _before(tree, flash, fields, stem.resistance, note)
    surface, under, deep = _paths(tree, fields, note)
    strokes = confined(flash, band("longest_impulse").noted(note).mid, note)
    arcs = _arcs(flash, current, note)
    if strokes.missing:
        _say_missing(tree, strokes, arcs, note)
        return Channel(
            current, stem.resistance, before, surface, under, deep, None, None, None, None, None, None, None
        )

    parts = pieces(tree, stem, note)
    # The tie of a cracked, rotten or scarred trunk goes to the crack.
    deep_first: Any = np.asarray(deep.value) >= np.asarray(under.value)
    energies = _energies(tree, strokes, arcs, deep_first, note)
    speed = _speed(tree, parts, energies, note)
    probabilities = class_probabilities(tree, strokes, arcs, parts, under.value, deep.value, note)
    _say_ties(probabilities, note)
    return Channel(
        current, stem.resistance, before, surface, under, deep, energies, _most_probable(probabilities), *probabilities, speed
    )  # fmt: skip


# -- until the flashover -----------------------------------------------------------------------------------


@dataclass(frozen=True)
class _Fields:
    """Breakdown fields (V/m), each as (low, middle, high): along the bark, inside, and that of the weaker."""

    surface: tuple[Any, Any, Any]
    inside: tuple[Any, Any, Any]
    cap: tuple[Any, Any, Any]

    @classmethod
    def of(cls, tree: Tree, note: Note) -> _Fields:
        """Return the fields of a tree, and write the cap down."""
        surface, inside = tree.band("field_surface").noted(note), tree.band("field_inside").noted(note)
        cap = note.formula("E_fo", "minimum(E_surf, E_int)", "V/m", meaning="breakdown field of the weaker path, the cap of the internal field", source=MODEL, finding="flashover_current", show="kV/m", E_surf=surface.value, E_int=inside.value)  # fmt: skip
        low, high = (np.minimum(a, b) for a, b in zip(surface.ends, inside.ends, strict=True))
        return cls(surface.three, inside.three, (low, cap, high))


def _flashover(fields: _Fields, resistance: Bracket, note: Note) -> Bracket:
    low, mid, high = fields.cap
    law = trunk.FLASHOVER_CURRENT
    current = note.formula("i_fo", law, "A", meaning="flashover current", source=MODEL, finding="flashover_current", E_fo=Given(mid, "V/m"), r=Given(resistance.value, "ohm/m"))  # fmt: skip
    return Bracket(current, law(E_fo=low, r=resistance.high), law(E_fo=high, r=resistance.low))


def _before(tree: Tree, flash: Flash, fields: _Fields, resistance: Bracket, note: Note) -> Value:
    """Return the heat in the tissue while the flashover develops: what the capped field leaves of Joule heating."""
    if tree.height is None:
        note.unknown("energy_before_flashover_per_length", "give the height of the tree")
        return None
    peak = _peak(flash)
    speed = band("leader_speed").noted(note)
    low, mid, high = fields.cap

    def heat(cap: Any, r: Any, u: Any, into: Note) -> Any:
        field = cap
        if peak is not None:
            field = into.formula("E", trunk.INTERNAL_FIELD, "V/m", meaning="field inside, capped", source=MODEL, show="kV/m", r=Given(r, "ohm/m"), i=Given(peak, "A", "peak current"), E_fo=Given(cap, "V/m"))  # fmt: skip
        return into.formula("w_pre", trunk.ENERGY_DURING_LAG, "J/m", meaning="heat before the flashover", source=MODEL, finding="energy_before_flashover_per_length", E=Given(field, "V/m"), h=Given(tree.height, "m", "height"), u=u, r=Given(r, "ohm/m"))  # fmt: skip

    quiet = Note(quiet=True)
    value = heat(mid, resistance.value, speed.value, note)
    ends = heat(low, resistance.high, speed.high, quiet), heat(high, resistance.low, speed.low, quiet)
    # Below the flashover current the heat rises with the resistance, above it falls: sort the ends.
    return Bracket(value, np.minimum(value, np.minimum(*ends)), np.maximum(value, np.maximum(*ends)))


def _peak(flash: Flash) -> Any:
    try:
        return flash.peak
    except MissingInput:
        return None


def _arcs(flash: Flash, current: Bracket, note: Note) -> Any:
    """Return whether an arc forms: not where the whole peak stays below the flashover current."""
    peak = _peak(flash)
    if peak is None:
        note.remark("without a peak current it is taken that the trunk flashes over")
        return np.asarray(True)
    arcs = np.asarray(peak) > np.asarray(current.value)
    if not np.all(arcs):
        note.remark("a peak current below the flashover current stays in the tissue and leaves no mark")
    return arcs


# -- the path ----------------------------------------------------------------------------------------------


def _paths(tree: Tree, fields: _Fields, note: Note) -> tuple[Bracket, Bracket, Bracket]:
    """Return the probabilities of the three paths. The middle values sum to one; each has its own band."""
    n, share = band("path_exponent").noted(note).value, tree.band("deep_share").noted(note)
    inside = note.formula("P_i", trunk.PROBABILITY_INTERNAL, None, meaning="probability that the arc forms inside", source=MODEL, finding=("path_surface", "path_under_bark", "path_deep"), E_int=Given(fields.inside[1], "V/m"), E_surf=Given(fields.surface[1], "V/m"), n=n)  # fmt: skip
    law = trunk.PROBABILITY_INTERNAL
    low = law(E_int=fields.inside[2], E_surf=fields.surface[0], n=n.value)
    high = law(E_int=fields.inside[0], E_surf=fields.surface[2], n=n.value)
    p, d = Given(inside, None, "probability of an internal arc"), share.value
    deep = note.formula(
        "P_d", "P_i*d", None, meaning="probability of a deep arc", finding="path_deep", P_i=p, d=d
    )
    under = note.formula("P_u", "P_i*(1 - d)", None, meaning="probability of an arc under the bark", finding="path_under_bark", P_i=p, d=d)  # fmt: skip
    surface = note.formula("P_s", "1 - P_i", None, meaning="probability of an arc on the bark", finding="path_surface", P_i=p)  # fmt: skip
    few, many = share.ends
    return (
        Bracket(surface, 1 - high, 1 - low),
        Bracket(under, low * (1 - many), high * (1 - few)),
        Bracket(deep, low * few, high * many),
    )


# -- the arc -----------------------------------------------------------------------------------------------


def _energies(tree: Tree, strokes: Confined, arcs: Any, deep_first: Any, note: Note) -> Bracket:
    """Return the channel energy on the likelier internal path, over the band of its field and resistance."""
    out = []
    quiet = Note(quiet=True)
    for index in range(3):
        under, deep = (channel_energy(tree, path, strokes, arcs, index, index, note if index == 1 else quiet) for path in ("under_bark", "deep"))  # fmt: skip
        chosen: Any = np.where(deep_first, deep, under)
        out.append(chosen if chosen.ndim else float(chosen))
    if np.any(deep_first):
        note.remark(
            "channel energy and bark speed are those of a deep arc, at least as likely here as one under the bark"
        )
    return Bracket(out[1], out[0], out[2])


def _speed(tree: Tree, parts: Pieces, energies: Bracket, note: Note) -> Bracket:
    eta = tree.band("mechanical_yield").noted(note)
    common: dict[str, Any] = {
        "G": tree.band("fracture_energy").value,
        "A": parts.strip_area,
        "m": parts.strip_mass,
        "v_max": band("speed_ceiling").noted(note).value,
    }

    def speed(w: Any, yield_: Any, into: Note) -> Any:
        return into.formula("v_b", trunk.EJECTION_SPEED, "m/s", meaning="speed of a bark strip", source=MODEL, finding="bark_speed", eta=yield_, w=Given(w, "J/m", "channel energy"), **common)  # fmt: skip

    quiet = Note(quiet=True)
    return Bracket(
        speed(energies.value, eta.value, note),
        speed(energies.low, eta.low, quiet),
        speed(energies.high, eta.high, quiet),
    )


def _most_probable(probabilities: tuple[Any, ...]) -> Value:
    # Equal probabilities (to rounding) go to the more severe class.
    stacked = np.stack(np.broadcast_arrays(*probabilities))[::-1]
    codes = (len(trunk.CLASSES) - 1 - np.argmax(stacked.round(12), axis=0)).astype(np.int8)
    return Words(codes, trunk.CLASSES) if codes.ndim else trunk.CLASSES[int(codes)]


def _say_ties(probabilities: tuple[Any, ...], note: Note) -> None:
    """Say where two classes are equally probable: the one named is then the more severe."""
    if any(np.ndim(p) for p in probabilities):
        return
    values = [round(float(p), 12) for p in probabilities]
    top = [name for name, value in zip(trunk.CLASSES, values, strict=True) if value == max(values)]
    if len(top) > 1:
        note.remark(f"{' and '.join(top)} are equally probable; the more severe is named")


def _say_missing(tree: Tree, strokes: Confined, arcs: Any, note: Note) -> None:
    """Say what is missing, and what can still be said honestly: one term of the energy is a lower bound of the sum."""
    why = "; ".join(strokes.missing)
    for finding in _NEEDS_STROKE:
        note.unknown(finding, why)
    note.remark(f"channel energy and damage class are not given: {why}")
    if not np.all(arcs):
        return
    field, resistance = tree.band("channel_field_under_bark"), tree.band("channel_resistance_under_bark")
    for known, part, what in (
        (strokes.charges, field, "charge"),
        (strokes.energies, resistance, "specific energy"),
    ):
        if known and not any(np.ndim(value) for value in known) and np.ndim(part.ends[0]) == 0:
            least = max(float(value) for value in known) * part.ends[0]
            note.remark(f"the {what} alone gives an arc under the bark at least {format_quantity(least, 'J/m')}, at the low end of the band")  # fmt: skip
