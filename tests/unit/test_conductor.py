"""The conductor: sizes, heating through melting, forces."""

import math

import numpy as np
import pytest

from helpers import one, strokes
from strikeenergy import make_case, quantity
from strikeenergy.case import CaseError
from strikeenergy.lightning.flash import Flash, Stroke
from strikeenergy.note import Note
from strikeenergy.plugin import Words
from strikeenergy_conductor import Conductor, forces, heating


def value(result, name):
    return result.findings[name].value


def test_copper_16_at_10_megajoules():
    # IEC 62305-1:2010 Table D.3 prints 309 K; the formula gives 309.06 K.
    result = one(kind="conductor", material="copper", section="16 mm**2")
    assert value(result, "temperature_rise") == pytest.approx(309.06, abs=0.005)
    assert value(result, "end_temperature") == pytest.approx(293.15 + 309.06, abs=0.005)
    assert value(result, "state") == "solid"
    assert value(result, "melted_fraction") == 0.0
    assert result["temperature_rise"].to("K").magnitude == pytest.approx(309.06, abs=0.005)


@pytest.mark.parametrize(
    ("size", "area"),
    [
        ({"section": "50 mm**2"}, 50.0),
        ({"diameter": "8 mm"}, 50.265),
        ({"width": "20 mm", "thickness": "2.5 mm"}, 50.0),
        ({"outer_diameter": "18 mm", "wall": "1 mm"}, 53.407),
        ({"outer_diameter": "18 mm", "wall": "9 mm"}, 254.469),
        ({"awg": 0}, 53.475),
        ({"awg": "1/0"}, 53.475),
        ({"kcmil": 57.4}, 29.085),
        ({"section": "1/0 AWG"}, 53.475),
        ({"section": "57.4 kcmil"}, 29.085),
    ],
)
def test_ways_of_giving_the_size(size, area):
    assert Conductor(material="copper", **size).area * 1e6 == pytest.approx(area, abs=5e-4)


def test_starting_hot_is_the_same_conductor_further_on():
    # Heating from 20 °C by W1 + W2 is heating by W1, then from there by W2.
    cold = Conductor(material="copper", section="16 mm**2")
    half = Flash((Stroke(specific_energy=5e6),))
    first = heating(cold, half)
    second = heating(
        Conductor(material="copper", section="16 mm**2", start=quantity(first.end_temperature, "K")), half
    )
    whole = heating(cold, Flash((Stroke(specific_energy=10e6),)))
    assert second.end_temperature == pytest.approx(whole.end_temperature, rel=1e-9)


def test_start_at_40_degrees():
    # rho and alpha referred to 40 °C by hand: rho = 17.8e-9*(1 + 0.00392*20), alpha = 0.00392/(1 + 0.00392*20).
    rho, alpha = 17.8e-9 * 1.0784, 0.00392 / 1.0784
    expected = math.expm1(10e6 * alpha * rho / (16e-6**2 * 8920 * 385)) / alpha
    result = one(kind="conductor", material="copper", section="16 mm**2", start="40 degC")
    assert value(result, "temperature_rise") == pytest.approx(expected, rel=1e-12)
    assert expected == pytest.approx(333.3, abs=0.05)


def test_two_strokes_without_cooling():
    twice = one(
        kind="conductor",
        material="copper",
        section="16 mm**2",
        flash={"stroke": [{"specific_energy": "5 MJ/ohm"}] * 2},
    )
    once = one(
        kind="conductor", material="copper", section="16 mm**2", flash=strokes(specific_energy="10 MJ/ohm")
    )
    assert value(twice, "temperature_rise") == pytest.approx(value(once, "temperature_rise"), rel=1e-9)
    assert any("without cooling" in text for text in twice.remarks)


def test_melting_is_a_state_and_never_a_temperature():
    # 16 mm² aluminium at LPL I is a marked cell of Table D.3.
    result = one(kind="conductor", material="aluminium", section="16 mm**2", length="1 m")
    assert value(result, "temperature_rise") is None
    assert value(result, "end_temperature") is None
    assert value(result, "state") == "molten"
    assert value(result, "melt_margin") == pytest.approx(0.6858, abs=1e-4)
    assert "melting point" in result.findings["temperature_rise"].why_not
    assert any("lower bound" in text for text in result.remarks)


def test_through_melting():
    copper = Conductor(material="copper", section="16 mm**2", length="2 m")
    onset = heating(copper, Flash((Stroke(specific_energy=1.0),))).specific_energy_to_melt
    full = heating(copper, Flash((Stroke(specific_energy=1.0),))).specific_energy_to_melt_fully
    at_onset = heating(copper, Flash((Stroke(specific_energy=onset),)))
    assert at_onset.state == "solid"
    assert at_onset.temperature_rise == pytest.approx(1060.0, rel=1e-9)
    halfway = heating(copper, Flash((Stroke(specific_energy=(onset + full) / 2),)))
    assert halfway.state == "melting"
    assert halfway.melted_fraction == pytest.approx(0.5, rel=1e-9)
    # closure: sensible heat to the melting point and half the latent heat, of 2 m of 16 mm²
    mass = 16e-6 * 2 * 8920
    assert halfway.dissipated_energy == pytest.approx(mass * (385 * 1060 + 0.5 * 209e3), rel=1e-9)
    assert heating(copper, Flash((Stroke(specific_energy=full * 1.01),))).state == "molten"


def test_energy_closes_with_resistance_for_a_small_rise():
    # A small rise: all of R*W goes into heat, and the heat is mass times c times rise.
    result = one(
        kind="conductor",
        material="copper",
        section="50 mm**2",
        length="10 m",
        flash=strokes(specific_energy="1 kJ/ohm"),
    )
    assert value(result, "resistance") == pytest.approx(17.8e-9 * 10 / 50e-6, rel=1e-12)
    assert value(result, "dissipated_energy") == pytest.approx(value(result, "resistance") * 1e3, rel=1e-4)


def test_no_latent_heat_is_said_and_not_guessed():
    result = one(kind="conductor", material="stainless steel", section="25 mm**2", length="1 m")
    assert value(result, "state") == "melting"
    for name in ("melted_fraction", "specific_energy_to_melt_fully", "dissipated_energy"):
        assert value(result, name) is None
        assert "latent heat" in result.findings[name].why_not


def test_set_without_melting_point_goes_only_as_far_as_it_is_meant():
    cool = one(kind="conductor", material="copper", constants="IEC 60949", section="50 mm**2")
    assert value(cool, "temperature_rise") == pytest.approx(20.80, abs=0.01)
    assert value(cool, "state") is None
    hot = one(kind="conductor", material="copper", constants="IEC 60949", section="10 mm**2", length="1 m")
    assert value(hot, "temperature_rise") is None
    assert "500 °C" in hot.findings["temperature_rise"].why_not


def test_zero_temperature_coefficient():
    given = {"source": "made up"}
    own = {name: {"value": v, **given} for name, v in (("resistivity", "44 µohm*cm"), ("temperature_coefficient", "0 1/K"), ("density", "8900 kg/m**3"), ("heat_capacity", "410 J/(kg*K)"), ("melting_temperature", "1280 degC"))}  # fmt: skip
    case = {
        "flash": strokes(specific_energy="1 MJ/ohm"),
        "materials": {"constantan": own},
        "object": [{"kind": "conductor", "material": "constantan", "section": "50 mm**2"}],
    }
    from strikeenergy import estimate

    result = estimate(make_case(case)).objects[0]
    assert value(result, "temperature_rise") == pytest.approx(
        1e6 * 44e-8 / (50e-6**2 * 8900 * 410), rel=1e-12
    )
    assert (
        result.findings["temperature_rise"].standing == "assumed"
    )  # the reference temperature was not given


def test_above_melting_before_the_stroke():
    result = one(kind="conductor", material="copper", section="50 mm**2", start="1200 degC")
    assert "temperature_rise" not in result.findings
    assert any("above its melting point before" in text for text in result.remarks)


def test_arrays_equal_scalars():
    w = np.geomspace(1e4, 3e8, 30)
    copper = Conductor(material="copper", section="16 mm**2", length="1 m")
    many = heating(copper, Flash((Stroke(specific_energy=w),)))
    assert isinstance(many.state, Words)
    for index, single in enumerate(w):
        alone = heating(copper, Flash((Stroke(specific_energy=float(single)),)))
        assert many.state.names[many.state.codes[index]] == alone.state
        assert many.melted_fraction[index] == pytest.approx(alone.melted_fraction, rel=1e-12)
        assert many.dissipated_energy[index] == pytest.approx(alone.dissipated_energy, rel=1e-12)
        if alone.temperature_rise is None:
            assert np.isnan(many.temperature_rise[index])
        else:
            assert many.temperature_rise[index] == pytest.approx(alone.temperature_rise, rel=1e-12)


def test_arrays_of_sections():
    q = np.array([16.0, 50.0])
    result = heating(
        Conductor(material="copper", section=quantity(q, "mm**2")), Flash((Stroke(specific_energy=10e6),))
    )
    np.testing.assert_allclose(result.temperature_rise, [309.056, 21.598], rtol=1e-4)


def test_no_current_no_damage():
    nothing = heating(
        Conductor(material="copper", section="16 mm**2"), Flash((Stroke(peak=0.0, specific_energy=0.0),))
    )
    assert nothing.temperature_rise == 0.0
    assert nothing.melt_margin is None
    still = forces(
        Conductor(material="copper", section="16 mm**2", neighbour=({"spacing": "0.1 m"},)),
        Flash((Stroke(peak=0.0, specific_energy=0.0),)),
    )
    assert still.force_per_length == 0.0


def test_parallel_conductors_of_the_standard():
    # IEC 62305-1:2010 Annex D.4.2 formula; 100 kA, 0.10 m, 5 m: 100 kN, and 98.02 kN for the finite length.
    infinite = one(
        kind="conductor",
        material="copper",
        section="50 mm**2",
        flash=strokes(peak="100 kA"),
        neighbour=[{"spacing": "0.1 m"}],
    )
    assert value(infinite, "force_per_length") * 5 == pytest.approx(100e3, rel=1e-9)
    finite = one(
        kind="conductor",
        material="copper",
        section="50 mm**2",
        flash=strokes(peak="100 kA"),
        neighbour=[{"spacing": "0.1 m", "length": "5 m"}],
    )
    assert value(finite, "neighbour_force") == pytest.approx(98.02e3, rel=1e-5)
    assert value(finite, "force_per_length") == pytest.approx(98.02e3 / 5, rel=1e-5)
    assert value(finite, "force_sense") == "attraction"
    assert value(finite, "force_impulse_per_length") is None
    assert "no specific energy" in finite.findings["force_impulse_per_length"].why_not


def test_impulse_of_the_force():
    # 2e-7 * W/R / d: 10 MJ/ohm at 0.1 m gives 20 N s/m.
    result = one(
        kind="conductor",
        material="copper",
        section="50 mm**2",
        neighbour=[{"spacing": "0.1 m", "direction": "opposite"}],
    )
    assert value(result, "force_impulse_per_length") == pytest.approx(20.0, rel=1e-9)
    assert value(result, "force_per_length") == pytest.approx(80e3, rel=1e-9)
    assert value(result, "force_sense") == "repulsion"


def test_shares_of_the_neighbours():
    result = one(
        kind="conductor",
        material="copper",
        section="50 mm**2",
        share=0.5,
        flash=strokes(peak="100 kA"),
        neighbour=[{"spacing": "0.1 m", "share": 0.25}],
    )
    assert value(result, "force_per_length") == pytest.approx(0.125 * 20e3, rel=1e-9)


def test_several_neighbours_are_an_upper_bound():
    near = {"spacing": "0.1 m"}
    result = one(
        kind="conductor",
        material="copper",
        section="50 mm**2",
        share=0.3,
        flash=strokes(peak="100 kA"),
        neighbour=[near, {**near, "direction": "opposite"}],
    )
    assert value(result, "force_per_length") == pytest.approx(2 * 0.09 * 20e3, rel=1e-9)
    assert value(result, "force_sense") == "both"
    assert any("upper bound" in text for text in result.remarks)


def test_more_than_the_whole_current_is_called_a_bound():
    result = one(kind="conductor", material="copper", section="50 mm**2", neighbour=[{"spacing": "0.1 m"}])
    assert any("more than the whole flash current" in text for text in result.remarks)


def test_bend_is_bracketed():
    # Totals on a 0.5 m leg at 100 kA: 4640.10 N from 4 mm (current at the surface).
    result = one(
        kind="conductor",
        material="copper",
        diameter="8 mm",
        flash=strokes(peak="100 kA"),
        bend={"leg": "0.5 m", "span": "0.5 m"},
    )
    found = result.findings["bend_force"]
    assert found.low == pytest.approx(4640.10, abs=0.005)
    assert found.value == found.high > found.low
    assert found.high - found.low == pytest.approx(1e-7 * 1e10 * 0.25, rel=1e-3)  # ln(r/x1) = 1/4


def test_pinch():
    # 9 mm radius: 1.96488 MPa at 100 kA; rod of 4 mm radius: 9.947 MPa at the surface, 19.894 MPa on the axis.
    pipe = one(
        kind="conductor", material="copper", outer_diameter="18 mm", wall="1 mm", flash=strokes(peak="100 kA")
    )
    assert value(pipe, "pinch_pressure") == pytest.approx(1.96488e6, rel=1e-5)
    rod = one(kind="conductor", material="copper", diameter="8 mm", flash=strokes(peak="100 kA")).findings[
        "pinch_pressure"
    ]
    assert (rod.low, rod.high) == (pytest.approx(9.947e6, rel=1e-4), pytest.approx(19.894e6, rel=1e-4))
    tape = one(
        kind="conductor",
        material="copper",
        width="20 mm",
        thickness="2.5 mm",
        bend={"leg": "1 m", "span": "1 m"},
    )
    assert value(tape, "pinch_pressure") is None
    assert any("taken as a round conductor" in text for text in tape.remarks)


def test_energy_alone_gives_impulses_alone():
    result = one(
        kind="conductor",
        material="copper",
        diameter="8 mm",
        flash=strokes(specific_energy="1 MJ/ohm"),
        bend={"leg": "1 m", "span": "1 m"},
        neighbour=[{"spacing": "1 m"}],
    )
    assert value(result, "pinch_pressure") is None
    assert value(result, "bend_force") is None
    assert value(result, "bend_force_impulse") > 0
    assert value(result, "force_impulse_per_length") == pytest.approx(0.2)


def test_charge_alone_gives_no_force_and_says_so():
    result = one(kind="conductor", material="copper", diameter="8 mm", flash=strokes(charge="10 C"))
    assert "pinch_pressure" not in result.findings
    assert [text.split(" is not")[0] for text in result.remarks] == ["heating", "forces"]


@pytest.mark.parametrize(
    ("fields", "where", "said"),
    [
        ({}, "section", "the size is missing"),
        ({"section": "5 mm**2", "diameter": "8 mm"}, "diameter", "more than once"),
        ({"width": "5 mm"}, "thickness", "belong together"),
        ({"outer_diameter": "5 mm"}, "wall", "belong together"),
        ({"outer_diameter": "5 mm", "wall": "3 mm"}, "wall", "thicker than the radius"),
        ({"awg": "99"}, "awg", "not an AWG size"),
        ({"diameter": "8 mm", "form": "solid tape"}, "form", "does not go with"),
        ({"diameter": "8 mm", "neighbour": [{"spacing": "3 mm"}]}, "spacing", "inside the conductor"),
        ({"diameter": "8 mm", "bend": {"leg": "1 m", "span": "3 mm"}}, "span", "not longer than the radius"),
        ({"diameter": "0 mm"}, "diameter", "above 0 mm"),
        ({"section": 50}, "section", "no unit"),
        ({"section": "50 mm**2", "share": 0}, "share", "above 0"),
        ({"section": "50 mm**2", "share": 1.01}, "share", "at most 1"),
        ({"section": "50 mm**2", "neighbour": {"spacing": "1 m"}}, "neighbour", "[[object.neighbour]]"),
        ({"section": "50 mm**2", "bend": [1]}, "bend", "[object.bend]"),
        ({"section": "50 mm**2", "name": 5}, "name", "wrong type"),
        ({"section": "50 mm**2", "start": "-300 degC"}, "start", "above -273.15"),
    ],
)
def test_refused(fields, where, said):
    with pytest.raises(CaseError) as caught:
        one(kind="conductor", material="copper", **fields)
    assert any(where in problem.path and said in str(problem) for problem in caught.value.problems), str(
        caught.value
    )


def test_the_class_itself_refuses_in_python():
    from strikeenergy.errors import InputError

    with pytest.raises(InputError, match="the size is missing"):
        Conductor(material="copper")


def test_working_is_written_down():
    note = Note()
    heating(Conductor(material="copper", diameter="8 mm"), Flash((Stroke(specific_energy=10e6),)), note)
    assert [step.symbol for step in note.steps][:2] == ["q", "C"]
    assert {name for name, _ in note.constants} >= {"rho0", "alpha", "gamma", "c", "L", "T_m"}
