"""Runs a case: every effect of each object's kind, its findings, and their verdicts.

Each effect runs under its own guard. A plugin that raises becomes a recorded failure and the rest of the run stands; an
effect that lacks an input, or whose model does not cover the object, becomes a remark.
"""

from __future__ import annotations

import contextlib
import sys
from collections.abc import Mapping
from dataclasses import replace
from typing import Any, cast

import numpy as np

from strikeenergy.case import Case
from strikeenergy.errors import InputError, MissingInput, OutsideValidity, PluginError
from strikeenergy.inputs import StruckObject
from strikeenergy.lightning.flash import Flash
from strikeenergy.lightning.ledger import Entry, Ledger, Sort, build_ledger
from strikeenergy.limits import effect_verdict, not_judged, reserves, size_verdicts
from strikeenergy.note import Note
from strikeenergy.plugin import Bracket, Criterion, Effect, Finding, Findings, Words
from strikeenergy.registry import Registry, kind_name, short_reason
from strikeenergy.results import Estimate, FindingResult, ObjectResult, Verdict
from strikeenergy.sources import Standing, weakest
from strikeenergy.version import __version__

__all__ = ["estimate", "run_effect", "run_object"]


def estimate(case: Case) -> Estimate:
    """Compute what the flash of a case does to each of its objects, and compare with the published limits.

    A plugin that fails does not stop the run: see ``Estimate.all_failures``.
    """
    registry = case.registry
    objects = [run_object(thing, case.flash, registry, case.standard) for thing in case.objects]
    software = {"version": __version__, "plugins": registry.versions()}
    return Estimate(
        case.title,
        case.sha256,
        case.flash,
        objects,
        list(registry.failures),
        software,
        case.standard,
        case.skipped,
        _ledger(case, objects),
    )


def _ledger(case: Case, objects: list[ObjectResult]) -> Ledger | None:
    """Enter the energy that goes into each object, as its effects declare it, beside that of the whole flash."""
    entries: list[Entry] = []
    for result in objects:
        for effect in case.registry.effects_of(type(result.thing)):
            for name, declared in effect.findings.items():
                found = result.findings.get(name)
                if declared.ledger and found is not None:
                    entries += _entry(result, found, declared)
    if not entries:
        return None
    channel = {name: float(getattr(case.ledger, name)) for name in ("height", "ruler", "dimension")}
    return build_ledger(entries, **channel)


def _entry(result: ObjectResult, found: FindingResult, declared: Finding) -> list[Entry]:
    """Return the ledger entry of a finding; none where it has no value or is an array."""
    length = getattr(result.thing, declared.along) if declared.along else 1.0
    ends = (found.value if end is None else end for end in (found.low, found.high))
    values = (found.value, *ends)
    if length is None or any(v is None or np.ndim(v) for v in (*values, length)):
        return []
    energy, low, high = (float(v) * float(length) for v in values)
    return [Entry(result.name, cast(Sort, declared.ledger), energy, low, high)]


def run_object(thing: StruckObject, flash: Flash, registry: Registry, standard: str) -> ObjectResult:
    """Compute every effect on one object, and its verdicts."""
    result = ObjectResult(thing.name, kind_name(type(thing)), thing)
    own = flash.through(thing.share)
    ran: list[Effect] = []
    unjudged: list[Verdict] = []
    for effect in registry.effects_of(type(thing)):
        note = Note(quiet=thing.is_array or flash.is_array)
        stopped = _guarded(
            result,
            effect,
            registry,
            lambda e=effect, n=note: result.findings.update(run_effect(e, thing, own, n)),
        )
        if stopped is None:
            ran.append(effect)
            result.notes[effect.name] = note
        elif isinstance(stopped, (MissingInput, OutsideValidity)):
            # A missing input leaves the other checks as they are; what no model covers is no object that meets them.
            counts = isinstance(stopped, OutsideValidity)
            unjudged += [not_judged(c, str(stopped), counts) for c in effect.criteria]
        result.remarks += [text for text in note.remarks if text not in result.remarks]
    sizes: list[Verdict] = []
    try:
        sizes = size_verdicts(thing, result.kind, registry, standard)
    except Exception as error:  # the sizes are the plugin's own code
        owner = registry.owners[f"kind {result.kind}"]
        result.failures.append(
            PluginError(owner.name, owner.distribution, "compute", f"sizes: {short_reason(error)}")
        )
    result.verdicts += sizes
    for effect in ran:
        for criterion in effect.criteria:
            _guarded(result, effect, registry, lambda c=criterion: _compare(result, c, own, sizes))
    result.verdicts += unjudged
    return result


def _compare(result: ObjectResult, criterion: Criterion, flash: Flash, sizes: list[Verdict]) -> None:
    verdict = effect_verdict(criterion, result.findings, flash)
    if verdict is not None:
        result.verdicts.append(replace(verdict, rank=_rank(result, criterion)))
    elif not (result.thing.is_array or flash.is_array):
        found = result.findings.get(criterion.limit) or result.findings.get(criterion.value)
        result.verdicts.append(not_judged(criterion, (found and found.why_not) or "not known", counts=False))
    result.verdicts += reserves(criterion, result.findings, sizes)


def _rank(result: ObjectResult, criterion: Criterion) -> float | None:
    """Return the object's size over the smallest one that the criterion needs, where both are known."""
    if not criterion.size or not criterion.smallest:
        return None
    size, needed = result.thing.sizes().get(criterion.size), result.findings[criterion.smallest].value
    if size is None or needed is None or np.ndim(size) or np.ndim(needed) or not needed:
        return None
    return float(size) / float(needed)


def _guarded(result: ObjectResult, effect: Effect, registry: Registry, run: Any) -> BaseException | None:
    """Run a piece of a plugin's work; record what went wrong, and return it. None: it ran."""
    try:
        run()
    except MissingInput as error:
        result.remarks.append(f"{effect.name} is not computed: {error}")
        return error
    except OutsideValidity as error:
        result.remarks.append(f"{effect.name} is not computed, no model covers it: {error}")
        return error
    except KeyboardInterrupt:
        raise
    except BaseException as error:  # whatever a plugin does, even sys.exit, the others go on
        owner = registry.owner_of(effect)
        reason = str(error) if isinstance(error, InputError) else short_reason(error)
        result.failures.append(
            PluginError(owner.name, owner.distribution, "compute", f"{effect.name}: {reason}")
        )
        return error
    return None


def run_effect(effect: Effect, thing: StruckObject, flash: Flash, note: Note) -> dict[str, FindingResult]:
    """Compute one effect and return its findings by name.

    Args:
        effect: what to compute.
        thing: the struck object.
        flash: the part of the flash that flows through it.
        note: takes the working.

    Raises:
        MissingInput, OutsideValidity: it cannot be given.
        TypeError: the plugin returned something else than it declared, or a number that is not finite.
    """
    for text in effect.leaves_out:
        note.leaves_out(text)
    # What a plugin prints goes where messages go; what overflows is told by the check of its findings.
    with contextlib.redirect_stdout(sys.stderr), np.errstate(all="ignore"):
        results = effect.function(thing, flash, note)
    if not isinstance(results, effect.results):
        raise TypeError(f"it returned {type(results).__name__} and declares {effect.results.__name__}")
    return {
        name: _finding(name, declared, results, effect, note, flash)
        for name, declared in effect.findings.items()
    }


def _finding(
    name: str, declared: Finding, results: Findings, effect: Effect, note: Note, flash: Flash
) -> FindingResult:
    value: Any = getattr(results, name)
    low = high = None
    if isinstance(value, Bracket):
        value, low, high = value.value, value.low, value.high
    _check_value(name, value, declared)
    standing, sources = _rests_on(name, effect, note, flash)
    return FindingResult(
        name=name,
        value=_tidy(value),
        unit=declared.unit,
        meaning=declared.meaning,
        effect=effect.name,
        standing=standing,
        sources=sources,
        low=_tidy(low),
        high=_tidy(high),
        show=declared.show,
        bound=f"{declared.bound} bound" if declared.bound else "",
        why_not=note.unknowns.get(name, "") if value is None else "",
    )


def _tidy(value: Any) -> Any:
    """Turn numpy scalars into plain ones."""
    return (
        value.item()
        if isinstance(value, np.generic) or (isinstance(value, np.ndarray) and not value.ndim)
        else value
    )


def _check_value(name: str, value: Any, declared: Finding) -> None:
    if value is None:
        return
    word = isinstance(value, (str, bool, np.bool_, Words))
    if declared.unit is None:
        if not word and not (isinstance(value, np.ndarray) and value.dtype == bool):
            raise TypeError(f"{name} is declared a word or truth value and is {value!r}")
    elif word:
        raise TypeError(f"{name} is declared in {declared.unit or 'plain numbers'} and is {value!r}")
    elif np.ndim(value) == 0 and not np.isfinite(float(value)):
        raise TypeError(f"{name} is not a finite number")


def _rests_on(name: str, effect: Effect, note: Note, flash: Flash) -> tuple[str, tuple[str, ...]]:
    """Return the weakest standing of what a finding rests on, and its sources.

    Working that is tagged with the finding is taken together with all the working before it (steps feed one another);
    without a tag the whole note counts. The user's own values do not weaken a finding.
    """
    tagged = [number for number, step in enumerate(note.steps) if name in step.findings]
    steps = note.steps[: tagged[-1] + 1] if tagged else note.steps
    constants = [value for step in steps for value in step.values.values() if hasattr(value, "source")]
    if not tagged:
        constants = [constant for _, constant in note.constants]
    standings = [constant.standing for constant in constants if constant.standing] + [
        constant.standing for constant in note.assumptions
    ]
    standings += [flash.standing, Standing.DERIVED]
    ranked = weakest(s for s in standings if s is not Standing.GIVEN)
    sources: Mapping[str, None] = dict.fromkeys(
        str(source)
        for source in (
            *(step.source for step in steps if name in step.findings),
            *effect.sources,
            *(constant.source for constant in constants),
            flash.source,
        )
        if source is not None
    )
    return str(ranked), tuple(sources)
