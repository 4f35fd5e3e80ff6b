"""The confined part of a flash, the energy of a channel, the damage classes over the assumed bands."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass
from itertools import product
from typing import Any

import numpy as np

from strikeenergy.api import Flash, Given, Note, Stroke, source
from strikeenergy.physics import trunk
from strikeenergy_tree.kind import Tree
from strikeenergy_tree.parameters import band, probability_weights
from strikeenergy_tree.stem import Pieces

CHANNEL = source("engineering", "energy of a confined channel, linear in charge and in W/R")
PATHS = ("under_bark", "deep")


@dataclass(frozen=True)
class Confined:
    """Charge (C) and W/R (J/ohm) of the impulses, which act while the channel is shut in.

    ``charges`` and ``energies`` hold what is known; where ``missing`` is empty they belong together one by one.
    """

    charges: list[Any]
    energies: list[Any]
    missing: list[str]


def confined(flash: Flash, longest: float, note: Note) -> Confined:
    """Take the impulses of a flash. Continuing current is left out, also element by element in arrays.

    Args:
        flash: the part of the flash that flows through the tree.
        longest: a stroke that lasts longer (s) is continuing current.
        note: takes the remarks.
    """
    charges: list[Any] = []
    energies: list[Any] = []
    missing: list[str] = []
    for number, stroke in enumerate(flash.strokes, 1):
        lasts = _lasts(stroke, longest)
        if np.all(lasts):
            note.remark(
                "continuing current flows after the bark has opened: it is not counted as confined energy"
            )
            continue
        if stroke.duration is None and (stroke.value("peak") is None or stroke.value("charge") is None):
            note.remark("a stroke whose duration does not follow from the values given counts as an impulse")
        called = f"stroke {number}" + (f" ({stroke.name})" if stroke.name else "")
        for value, into, what, write in (
            (stroke.value("charge"), charges, "charge", "charge = '5 C'"),
            (
                stroke.value("specific_energy"),
                energies,
                "specific energy W/R",
                "specific_energy = '50 kJ/ohm'",
            ),
        ):
            if value is None:
                missing.append(f"{called} has no {what}; give it: {write}")
            else:
                into.append(np.where(lasts, 0.0, value) if np.ndim(lasts) else value)
    if len(charges) > 1:
        note.remark("later impulses find the furrow open and burn as free arcs: the impulse that gives most energy counts, not the sum")  # fmt: skip
    if not charges and not energies and not missing:
        known = [
            v for stroke in flash.strokes for v in (stroke.value("charge"), stroke.duration) if v is not None
        ]
        zero = sum(0.0 * value for value in known)
        if np.ndim(zero):
            # An array of flashes stays one: where no flash of it has an impulse, nothing is confined.
            charges, energies = [zero], [zero]
        else:
            missing.append(
                "the flash has no impulse, and what continuing current alone does is not in this model"
            )
    return Confined(charges, energies, missing)


def _lasts(stroke: Stroke, longest: float) -> Any:
    """Return whether it is continuing current: by its duration, or because its peak cannot bring its charge sooner."""
    if stroke.duration is not None:
        return np.asarray(stroke.duration) > longest
    charge, peak = stroke.value("charge"), stroke.value("peak")
    if charge is not None and peak is not None:
        return np.asarray(charge) > longest * np.asarray(peak)
    return np.asarray(False)


def channel_energy(
    tree: Tree, path: str, strokes: Confined, arcs: Any, field: int, resistance: int, note: Note
) -> Any:  # fmt: skip
    """Return the energy per metre (J/m) of a channel on a path, from the impulse that gives most.

    Args:
        tree: the tree.
        path: ``under_bark`` or ``deep``.
        strokes: the impulses.
        arcs: whether an arc forms at all.
        field, resistance: 0, 1 or 2 for the low, middle or high value of the channel's field and resistance.
        note: takes the working of the impulse that counts.
    """
    fields, resistances = (
        tree.band(f"channel_field_{path}").noted(note),
        tree.band(f"channel_resistance_{path}").noted(note),
    )
    e_ch = (fields.low, fields.value, fields.high)[field]
    r_ch = (resistances.low, resistances.value, resistances.high)[resistance]
    law = trunk.CHANNEL_ENERGY
    limit: dict[str, Any] = {}
    if tree.height is not None:
        law = trunk.CHANNEL_ENERGY_LIMITED
        limit = {"U": band("flash_energy").value, "h": Given(tree.height, "m", "height")}
    plain = [
        law(E_ch=e_ch.value, r_ch=r_ch.value, Q=q, W=w, **{name: item.value for name, item in limit.items()})
        for q, w in zip(strokes.charges, strokes.energies, strict=True)
    ]
    most = plain[0]
    for energy in plain[1:]:
        most = np.maximum(most, energy)
    if not note.quiet:
        counts = int(np.argmax(plain))
        q, w = Given(strokes.charges[counts], "C", "charge of the impulse"), Given(strokes.energies[counts], "J/ohm", "W/R of the impulse")  # fmt: skip
        words = path.replace("_", " ")
        note.formula(f"w'_{path[0]}", law, "J/m", meaning=f"energy per metre of a channel {words}", source=CHANNEL, finding=("channel_energy_per_length", "damage_class", "bark_speed"), E_ch=e_ch, r_ch=r_ch, Q=q, W=w, **limit)  # fmt: skip
    return np.where(arcs, most, 0.0)


def class_probabilities(
    tree: Tree, strokes: Confined, arcs: Any, parts: Pieces, under: Any, deep: Any, note: Note
) -> tuple[Any, Any, Any, Any]:  # fmt: skip
    """Return the probability of each class of ``trunk.CLASSES``; they sum to one.

    A surface arc leaves no mark, and what is left over belongs to that class. For each internal path the class rule is asked at the 27 points of low, middle and
    high channel field, channel resistance and mechanical yield, which are taken as independent. The ends of a band
    are read as its 5 % and 95 % points and weigh 0.185 each, the middle 0.63 (the usual three-point rule).
    """
    weights = probability_weights()
    ends = band("weight_end").noted(note)
    note.formula(
        "q_m",
        "1 - 2*q_e",
        None,
        meaning="weight of the middle of each band (channel field, resistance, yield: 27 points); each end weighs q_e",
        q_e=ends.value,
    )
    wood_loss = band("wood_loss_energy").noted(note).mid
    yields = tree.band("mechanical_yield").three
    quiet = Note(quiet=True)
    marks: list[Any] = [0.0, 0.0, 0.0]
    for path, probability in zip(PATHS, (under, deep), strict=True):
        for field, resistance in product(range(3), repeat=2):
            w = channel_energy(tree, path, strokes, arcs, field, resistance, quiet)
            for eta, weight in zip(yields, weights, strict=True):
                found = trunk.severity(w, eta, deep=path == "deep", bark=parts.bark, slab=parts.slab, wood_loss=wood_loss, split=parts.split, trunk=parts.trunk)  # fmt: skip
                mass = weights[field] * weights[resistance] * weight * probability
                for code in (1, 2, 3):
                    marks[code - 1] = marks[code - 1] + mass * (found == code)
    return tuple(_tidy([1.0 - sum(marks), *marks]))


def _tidy(shares: list[Any]) -> Iterable[Any]:
    """Clip what rounding leaves outside of 0 to 1, and give every share the same shape."""
    for share in np.broadcast_arrays(*shares):
        clipped = np.clip(share, 0.0, 1.0)
        yield clipped if clipped.ndim else float(clipped)
