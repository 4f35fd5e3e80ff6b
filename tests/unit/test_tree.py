"""The tree: what is refused, what is assumed, and what the channel effect returns."""

import tomllib
from importlib.resources import files

import numpy as np
import pytest

from helpers import one, strokes
from strikeenergy import make_case
from strikeenergy.case import CaseError
from strikeenergy.errors import InputError
from strikeenergy.lightning.flash import Flash, Stroke
from strikeenergy.lightning.threats import threat
from strikeenergy.note import Note
from strikeenergy.plugin import Words
from strikeenergy.sources import Standing
from strikeenergy.units import quantity
from strikeenergy_tree import Tree, channel
from strikeenergy_tree.parameters import (
    band,
    find_species,
    parameter_names,
    probability_weights,
    species_names,
)

OAK = {"kind": "tree", "species": "white oak", "diameter": "0.5 m", "height": "20 m"}
MEDIAN = {"peak": "30 kA", "charge": "4.5 C", "specific_energy": "55 kJ/ohm"}
CLASSES = (
    "probability_none_visible",
    "probability_bark_loss",
    "probability_wood_loss",
    "probability_explosive",
)


def run(flash=None, **fields):
    tree = Tree(**{**OAK, **fields})
    return channel(tree, flash or Flash((Stroke(peak=30e3, charge=4.5, specific_energy=5.5e4),)))


def refused(**fields):
    with pytest.raises(InputError) as caught:
        Tree(**{**OAK, **fields})
    return caught.value.problems


# --- what may be said of a tree ---------------------------------------------------------------------------


@pytest.mark.parametrize("name", ["white oak", "White  Oak", "Oak, white", "WHITE-OAK"])
def test_species_by_any_spelling(name):
    assert Tree(species=name, diameter="0.5 m").row.name == "white oak"


@pytest.mark.parametrize("name", species_names())
def test_every_species_gives_a_result(name):
    found = run(species=name)
    assert 0 < found.flashover_current.low < found.flashover_current.value < found.flashover_current.high
    assert found.channel_energy_per_length.value == pytest.approx(28e3)


def test_unknown_species_names_the_near_ones():
    (problem,) = refused(species="white ok")
    assert problem.path == ("species",)
    assert "white oak" in problem.write
    (problem,) = refused(species="oak")
    assert "'northern red oak' or 'white oak'" in problem.write
    (problem,) = refused(species="baobab")
    assert "wood =" in problem.write


def test_the_wood_must_be_known_one_way():
    (problem,) = _problems(diameter="0.5 m")
    assert "conifer" in problem.write
    assert Tree(wood="conifer", diameter="0.5 m").timber == "conifer"
    (problem,) = refused(wood="conifer")
    assert problem.path == ("wood",)
    assert Tree(species="white oak", wood="hardwood", diameter="0.5 m").timber == "hardwood"


def _problems(**fields):
    with pytest.raises(InputError) as caught:
        Tree(**fields)
    return caught.value.problems


@pytest.mark.parametrize(
    ("fields", "path", "words"),
    [
        ({"diameter": "80 mm", "bark_thickness": "40 mm"}, "bark_thickness", "twice the bark"),
        ({"diameter": "8 mm"}, "diameter", "bark and phloem"),
        (
            {"diameter": "60 mm", "bark_thickness": "20 mm", "phloem_thickness": "10 mm"},
            "phloem_thickness",
            "no wood",
        ),
        ({"diameter": "300 mm", "sapwood_thickness": "140 mm"}, "sapwood_thickness", "sapwood"),
    ],
)
def test_layers_that_do_not_fit(fields, path, words):
    (problem,) = refused(**fields)
    assert problem.path == (path,)
    assert words in problem.what
    assert problem.write


@pytest.mark.parametrize(
    "fields",
    [
        {"diameter": "0.5 kg"},
        {"diameter": 0.5},
        {"diameter": "-0.5 m"},
        {"diameter": "0,5 m"},
        {"diameter": "nan m"},
        {"bark": "damp"},
        {"condition": "broken"},
        {"species": 7},
        {"crown": "5 m"},
        {"assume": {"mechanical_yield": 0.5}},
        {"assume": {"luck": 1}},
    ],
)
def test_a_case_refuses(registry, fields):
    with pytest.raises(CaseError) as caught:
        make_case(
            {"flash": {"threat": "LPL I"}, "object": [{"name": "oak", **OAK, **fields}]}, registry=registry
        )
    assert all(problem.what for problem in caught.value.problems)


def test_defaults_follow_from_species_and_diameter():
    over, under, cambium, heart = Tree(**OAK).radii(Note())
    assert (over, over - under, under - cambium, cambium - heart) == pytest.approx(
        (0.25, 0.020, 0.005, 0.030)
    )
    own = Tree(**OAK, bark_thickness="10 mm", phloem_thickness="3 mm", sapwood_thickness="50 mm").radii(
        Note()
    )
    assert np.diff(own) == pytest.approx((-0.010, -0.003, -0.050))
    longleaf = Tree(species="longleaf pine", diameter="0.4 m")
    assert longleaf.write_bark(Note()).value == pytest.approx(0.00435 + 0.031 * 0.4)


def test_a_slender_stem_is_all_sapwood():
    note = Note()
    assert Tree(species="white oak", diameter="60 mm").radii(note)[3] == 0
    assert any("sapwood" in remark for remark in note.remarks)


@pytest.mark.parametrize(
    ("name", "share"), [("white oak", 0.075), ("northern red oak", 0.15), ("black walnut", 0.15)]
)
def test_wet_heartwood_draws_the_arc_inside(name, share):
    found = run(species=name)
    assert found.path_deep.value / (found.path_deep.value + found.path_under_bark.value) == pytest.approx(
        share
    )


# --- findings ---------------------------------------------------------------------------------------------


def test_through_a_case(registry):
    result = one(registry, **{"name": "oak", **OAK})
    assert not result.failures
    assert result.findings["damage_class"].value == "wood loss"
    assert result.findings["flashover_current"].standing == "assumed"
    assert sum(result.findings[name].value for name in CLASSES) == pytest.approx(1, abs=1e-12)
    assert sum(
        result.findings[f"path_{p}"].value for p in ("surface", "under_bark", "deep")
    ) == pytest.approx(1)
    assert any("not a safety clearance" in remark for remark in result.remarks)
    assert any("continuing current" in remark for remark in result.remarks)
    assert not result.verdicts


def test_the_example_of_a_new_case_runs(registry):
    result = one(registry, kind="tree", name="tree", **Tree.example_fields)
    assert not result.failures
    assert all(finding.value is not None for finding in result.findings.values())


def test_a_share_of_the_flash(registry):
    whole = one(registry, flash=strokes(**MEDIAN), **{"name": "oak", **OAK})
    half = one(registry, flash=strokes(**MEDIAN), **{"name": "oak", **OAK, "share": 0.5})
    assert whole.findings["channel_energy_per_length"].value == pytest.approx(5e3 * 4.5 + 0.1 * 5.5e4)
    assert half.findings["channel_energy_per_length"].value == pytest.approx(5e3 * 2.25 + 0.1 * 5.5e4 / 4)


def test_brackets_hold_the_value():
    for condition in ("sound", "crack", "rot", "old scar"):
        for bark in ("dry", "wet"):
            found = run(condition=condition, bark=bark)
            for name in ("flashover_current", "trunk_resistance_per_length", "energy_before_flashover_per_length",
                         "path_surface", "path_under_bark", "path_deep", "channel_energy_per_length", "bark_speed"):  # fmt: skip
                bracket = getattr(found, name)
                assert 0 <= bracket.low <= bracket.value <= bracket.high, name


def test_rot_conducts_and_weak_trunks_break_down_sooner():
    sound, rot, crack = run(), run(condition="rot"), run(condition="crack")
    assert rot.trunk_resistance_per_length.value < sound.trunk_resistance_per_length.value
    assert crack.trunk_resistance_per_length.value == sound.trunk_resistance_per_length.value
    assert crack.path_surface.value < sound.path_surface.value
    assert crack.probability_explosive > sound.probability_explosive


def test_no_current_no_damage():
    found = run(Flash((Stroke(peak=0.0, charge=0.0, specific_energy=0.0),)))
    assert found.damage_class == "none visible"
    assert found.probability_none_visible == 1
    assert found.channel_energy_per_length.high == found.bark_speed.high == 0
    assert found.energy_before_flashover_per_length.high == 0


def test_a_peak_below_the_flashover_current_leaves_no_mark():
    note = Note()
    found = channel(Tree(**OAK), Flash((Stroke(peak=100.0, charge=0.19, specific_energy=10.0),)), note)
    assert found.probability_none_visible == 1
    assert any("below the flashover current" in remark for remark in note.remarks)


def test_continuing_current_is_never_confined():
    impulse = Stroke(peak=30e3, charge=4.5, specific_energy=5.5e4)
    long = Stroke(charge=200.0, duration=0.5)
    assert (
        run(Flash((impulse, long))).channel_energy_per_length
        == run(Flash((impulse,))).channel_energy_per_length
    )
    note = Note()
    only = channel(Tree(**OAK), threat("LPL I long stroke"), note)
    assert only.damage_class is None  # not "none visible": it is not in the model
    assert "no impulse" in note.unknowns["damage_class"]
    many = run(Flash((Stroke(charge=np.array([50.0, 200.0]), duration=0.5),)))
    assert many.damage_class.codes.tolist() == [0, 0]
    # Known by its charge and peak alone.
    slow = run(Flash((impulse, Stroke(peak=400.0, charge=100.0, specific_energy=3e4))))
    assert slow.channel_energy_per_length.value == pytest.approx(28e3)


def test_of_several_impulses_the_strongest_counts():
    first = Stroke(peak=30e3, charge=4.5, specific_energy=5.5e4)
    later = Stroke(peak=12e3, charge=1.0, specific_energy=5e3)
    note = Note()
    found = channel(Tree(**OAK), Flash((first, later, first)), note)
    assert found.channel_energy_per_length == run(Flash((first,))).channel_energy_per_length
    assert any("not the sum" in remark for remark in note.remarks)


@pytest.mark.parametrize(
    ("known", "lacks", "least"),
    [
        ({"peak": "30 kA", "charge": "4.5 C"}, "specific energy", "9 kJ/m"),
        ({"peak": "30 kA", "specific_energy": "55 kJ/ohm"}, "charge", "1.65 kJ/m"),
    ],
)
def test_half_a_stroke_gives_a_lower_bound_in_words_only(registry, known, lacks, least):
    result = one(registry, flash=strokes(**known), **{"name": "oak", **OAK})
    assert result.findings["flashover_current"].value > 0
    for name in ("channel_energy_per_length", "damage_class", "bark_speed", *CLASSES):
        assert result.findings[name].value is None
        assert f"has no {lacks}" in result.findings[name].why_not
    assert any(f"at least {least}" in remark for remark in result.remarks)


def test_a_peak_alone_still_gives_the_trunk(registry):
    result = one(registry, flash=strokes(peak="30 kA"), **{"name": "oak", **OAK})
    assert result.findings["path_deep"].value > 0
    assert "has no charge" in result.findings["damage_class"].why_not
    assert "has no specific energy" in result.findings["damage_class"].why_not
    assert not any("at least" in remark for remark in result.remarks)


def test_without_a_height():
    note = Note()
    found = channel(Tree(species="white oak", diameter="0.5 m"), threat("LPL I"), note)
    assert found.energy_before_flashover_per_length is None
    assert "height" in note.unknowns["energy_before_flashover_per_length"]
    assert found.channel_energy_per_length.value == pytest.approx(1.5e6)


def test_frozen_and_hot_wood_say_where_the_law_ends():
    for start, words in (("-5 degC", "frozen"), ("95 degC", "90 °C")):
        note = Note()
        channel(Tree(**OAK, start=start), threat("LPL I"), note)
        assert any(words in remark for remark in note.remarks)
    assert run(start="0 degC").trunk_resistance_per_length == run(start="-9 degC").trunk_resistance_per_length  # fmt: skip


# --- assumptions ------------------------------------------------------------------------------------------


def test_the_note_lists_every_assumption():
    note = Note()
    channel(Tree(**OAK), threat("LPL I"), note)
    assert all(item.standing is Standing.ASSUMED and item.source.citation for item in note.assumptions)
    listed = " ".join(item.meaning for item in note.assumptions)
    for word in ("sapwood", "heartwood", "dry outer bark", "phloem", "breakdown field", "exponent", "run deep", "field of the channel under",
                 "field of the channel deep", "resistance of the channel", "mechanical", "tear", "bark, hardwood", "highest speed",
                 "least channel energy", "weight", "strip", "slab", "bursts", "splits"):  # fmt: skip
        assert word in listed, word
    used = [constant for _, constant in note.constants if constant.standing is Standing.ASSUMED]
    assert {constant.meaning for constant in used} <= {item.meaning for item in note.assumptions}
    assert "resistivity of dry outer bark (1e4 ohm*m to 1e6 ohm*m)" in {
        item.meaning for item in note.assumptions
    }


def test_own_values_replace_assumptions():
    note = Note()
    tree = Tree(
        **OAK, assume={"channel_field_under_bark": "10 kV/m", "mechanical_yield": 0.01, "deep_share": 0}
    )
    found = channel(tree, Flash((Stroke(peak=30e3, charge=4.5, specific_energy=5.5e4),)), note)
    assert found.channel_energy_per_length.value == pytest.approx(10e3 * 4.5 + 0.1 * 5.5e4)
    assert found.channel_energy_per_length.low == pytest.approx(10e3 * 4.5 + 0.03 * 5.5e4)
    assert found.path_deep.value == found.path_deep.high == 0
    assert not any("becomes mechanical" in item.meaning for item in note.assumptions)


def test_missing_species_numbers_fall_back_on_the_wood():
    note = Note()
    channel(Tree(species="American elm", diameter="0.5 m"), threat("LPL I"), note)
    assert any("species not known" in item.meaning for item in note.assumptions)
    assert find_species("American elm").get("bark_factor") is None


def test_every_parameter_has_unit_meaning_and_source():
    raw = tomllib.loads((files("strikeenergy_tree") / "data" / "parameters.toml").read_text(encoding="utf-8"))
    assert set(parameter_names()) == set(raw) - {"defaults"}
    for name in parameter_names():
        found = band(name)
        low, mid, high = found.three
        assert low <= mid <= high, name
        assert found.value.meaning
    assert sum(probability_weights()) == pytest.approx(1)


def test_own_values_have_fields_that_the_table_knows():
    roles = {
        name.removesuffix("_conifer").removesuffix("_dry").removesuffix("_sound")
        for name in parameter_names()
    }
    from strikeenergy_tree.kind import Assume

    assert set(Assume.model_fields) <= roles


# --- arrays -----------------------------------------------------------------------------------------------


def test_words_for_many_strokes():
    found = run(Flash((Stroke(peak=np.array([0.0, 3e4, 2e5]), charge=np.array([0.0, 4.5, 100.0]), specific_energy=np.array([0.0, 5.5e4, 1e7])),)))  # fmt: skip
    assert isinstance(found.damage_class, Words)
    assert [found.damage_class.names[code] for code in found.damage_class.codes] == [
        "none visible",
        "bark loss",
        "wood loss",
    ]


def test_arrays_through_a_case(registry):
    from strikeenergy.engine import run_object

    flash = Flash((Stroke(peak=np.full(3, 3e4), charge=np.full(3, 4.5), specific_energy=np.full(3, 5.5e4)),))
    result = run_object(Tree(**OAK, name="oak"), flash, registry, "IEC 62305-3:2010")
    assert not result.failures
    trees = Tree(
        **{**OAK, "name": "oaks", "diameter": quantity(np.array([0.3, 0.5, 0.9]), "m")},
        assume={"mechanical_yield": np.array([0.01, 0.02, 0.03])},
    )
    assert trees.is_array
    result = run_object(trees, flash, registry, "IEC 62305-3:2010")
    assert not result.failures
    assert np.all(np.diff(result.findings["flashover_current"].value) > 0)


def test_an_array_of_own_values_alone_is_an_array():
    assert Tree(**OAK, assume={"mechanical_yield": np.array([0.01, 0.02])}).is_array
    assert not Tree(**OAK, assume={"mechanical_yield": 0.01}).is_array
    assert not Tree(**OAK).is_array
