"""What every installed plugin must keep: declarations, units, sources, zero current, arrays, repeatability."""

import dataclasses
import json

import numpy as np
import pytest

from strikeenergy import engine, make_case
from strikeenergy.inputs import StruckObject, unit_of
from strikeenergy.lightning.flash import Flash, Stroke
from strikeenergy.plugin import Bracket, Words, findings_of
from strikeenergy.registry import kind_name, load
from strikeenergy.results import plain
from strikeenergy.units import scale

REGISTRY = load()
KINDS = list(REGISTRY.kinds.values())
EFFECTS = REGISTRY.effects
FLASH = Flash((Stroke(peak=30e3, charge=5.0, specific_energy=55e3, polarity=-1),))


def example(kind, **more):
    entry = {"kind": kind_name(kind), **kind.example_fields, **more}
    return make_case({"flash": {"threat": "LPL II"}, "object": [entry]}, registry=REGISTRY).objects[0]


def values(results):
    """(field, value) with brackets opened."""
    for field in dataclasses.fields(results):
        value = getattr(results, field.name)
        if isinstance(value, Bracket):
            for end in ("value", "low", "high"):
                yield f"{field.name}.{end}", getattr(value, end)
        else:
            yield field.name, value


@pytest.mark.parametrize("kind", KINDS, ids=kind_name)
def test_declaration_is_complete(kind):
    assert issubclass(kind, StruckObject)
    assert kind.__doc__
    assert kind.example_fields
    for name, info in kind.model_fields.items():
        if name != "kind":
            assert info.description, name
        mark = unit_of(kind, name)
        if mark is None:
            continue
        assert scale(mark.unit)
        assert mark.read(mark.text) is not None, name
        assert mark.typical, name
        for value in mark.typical:
            mark.check(scale(mark.unit).to_si(value))


@pytest.mark.parametrize("effect", EFFECTS, ids=lambda e: f"{kind_name(e.kind)}.{e.name}")
def test_effect_is_a_data_sheet(effect):
    assert effect.summary
    assert effect.sources
    assert effect.validity
    assert effect.leaves_out
    for source in effect.sources:
        assert source.citation
    for declared in findings_of(effect.results).values():
        assert declared.meaning
        if declared.unit is not None:
            assert scale(declared.unit)
        if declared.show:
            assert scale(declared.show).dimension == scale(declared.unit).dimension or declared.show == "degC"
    for criterion in effect.criteria:
        assert criterion.limit in effect.findings
        assert not criterion.smallest or criterion.smallest in effect.findings


@pytest.mark.parametrize("effect", EFFECTS, ids=lambda e: f"{kind_name(e.kind)}.{e.name}")
class TestRuns:
    def test_finite_and_repeatable(self, effect):
        thing = example(effect.kind)
        first, second = (effect(thing, FLASH.through(thing.share)) for _ in range(2))
        for (name, a), (_, b) in zip(values(first), values(second), strict=True):
            assert a == b, name
            if isinstance(a, float):
                assert np.isfinite(a), name

    def test_brackets_hold_the_value(self, effect):
        for field in dataclasses.fields(effect.results):
            value = getattr(effect(example(effect.kind), FLASH), field.name)
            if isinstance(value, Bracket):
                assert value.low <= value.value <= value.high, field.name

    def test_array_is_the_loop(self, effect):
        thing = example(effect.kind)
        peaks = np.array([5e3, 30e3, 200e3])
        many = Flash((Stroke(peak=peaks, charge=peaks * 2e-4, specific_energy=peaks**2 * 8e-5),))
        together = dict(values(effect(thing, many)))
        for index, peak in enumerate(peaks.tolist()):
            alone = dict(
                values(
                    effect(
                        thing, Flash((Stroke(peak=peak, charge=peak * 2e-4, specific_energy=peak**2 * 8e-5),))
                    )
                )
            )
            for name, value in alone.items():
                both = together[name]
                if isinstance(both, Words):
                    assert both.names[both.codes[index]] == value, name
                elif both is not None and np.ndim(both):
                    assert (
                        np.isnan(both[index])
                        if value is None
                        else both[index] == pytest.approx(value, rel=1e-9)
                    ), name

    def test_declared_monotony_is_true(self, effect):
        first = dataclasses.fields(effect.results)[0].name

        def result(thing, flash):
            value = getattr(effect(thing, flash), first)
            return value.value if isinstance(value, Bracket) else value

        base_flash = {"peak": 30e3, "charge": 5.0, "specific_energy": 55e3}
        thing = example(effect.kind)
        base = result(thing, Flash((Stroke(**base_flash),)))
        for name, sign in [*((n, 1) for n in effect.rises_with), *((n, -1) for n in effect.falls_with)]:
            if name.startswith("flash."):
                changed = {**base_flash, name[6:]: base_flash[name[6:]] * 1.1}
                other = result(thing, Flash((Stroke(**changed),)))
            else:
                value = getattr(thing, name)
                assert value is not None, f"the example does not set {name}"
                other = result(thing.model_copy(update={name: value * 1.1}), Flash((Stroke(**base_flash),)))
            assert (other - base) * sign > 0, name

    def test_units_of_the_input_make_no_difference(self, effect):
        from strikeenergy import quantity

        plain_thing = example(effect.kind)
        converted = {}
        for name, text in effect.kind.example_fields.items():
            mark = unit_of(effect.kind, name)
            if mark is not None and mark.unit:
                converted[name] = quantity(
                    getattr(plain_thing, name),
                    "K" if mark.unit == "degC" else str(mark.unit and si(mark.unit)),
                )
            else:
                converted[name] = text
        other = make_case(
            {"flash": {"threat": "LPL II"}, "object": [{"kind": kind_name(effect.kind), **converted}]},
            registry=REGISTRY,
        ).objects[0]
        for (name, a), (_, b) in zip(
            values(effect(plain_thing, FLASH)), values(effect(other, FLASH)), strict=True
        ):
            assert b == (pytest.approx(a, rel=1e-9) if isinstance(a, float) else a), name


def si(unit):
    """The coherent SI unit of the same dimension, as pint spells it."""
    from strikeenergy.units import registry

    return str(registry().Quantity(1.0, unit).to_base_units().units)


@pytest.mark.parametrize("kind", KINDS, ids=kind_name)
def test_example_case_round_trips_to_json(kind):
    case = make_case(
        {"flash": {"threat": "LPL I"}, "object": [{"kind": kind_name(kind), **kind.example_fields}]},
        registry=REGISTRY,
    )
    result = engine.estimate(case)
    assert not result.all_failures
    data = result.to_dict()
    assert json.loads(json.dumps(data, allow_nan=False)) == plain(data)


@pytest.mark.parametrize("kind", KINDS, ids=kind_name)
@pytest.mark.parametrize("bad", ["nan", "-1", "1,5", "", "1e999", "wrong"])
def test_bad_input_is_refused(kind, bad):
    from strikeenergy.case import CaseError

    quantities = [
        name
        for name in kind.model_fields
        if (mark := unit_of(kind, name)) and mark.unit and mark.unit != "degC"
    ]
    assert quantities
    for name in quantities:
        unit = unit_of(kind, name).unit
        with pytest.raises(CaseError):
            example(kind, **{name: f"{bad} {unit}"})


def test_no_damage_without_current():
    nothing = Flash((Stroke(peak=0.0, charge=0.0, specific_energy=0.0),))
    for kind in KINDS:
        for effect in REGISTRY.effects_of(kind):
            for name, value in values(effect(example(kind), nothing)):
                if any(
                    word in name
                    for word in (
                        "rise",
                        "volume",
                        "radius",
                        "force",
                        "pressure",
                        "speed",
                        "dissipated",
                        "melted_fraction",
                    )
                ):
                    assert not value, (kind, name)
