"""Strokes with a waveform: given and integrated values stay apart, overlaps count in W/R."""

import json

import numpy as np
import pytest

from helpers import one
from strikeenergy import make_case
from strikeenergy.case import CaseError, read_case
from strikeenergy.lightning.flash import Flash, Stroke
from strikeenergy.lightning.threats import single_components, threat
from strikeenergy.lightning.waveform import SHAPES, DoubleExponential, Heidler, Rectangle

FIRST = Heidler(200e3, 19e-6, 485e-6, normalise="standard", k=0.93)
LONG = Rectangle(400.0, 0.5)
OBJECT = '[[object]]\nkind = "conductor"\nmaterial = "copper"\nsection = "16 mm**2"\n'


def flash_of(text):
    return read_case(text + OBJECT).flash


def test_composite_flash():
    # First positive stroke of LPL I and 400 A for 0.5 s that begins with it: Q = 300.2314 C, W/R = 10 435 511.7 J/ohm;
    # 10 355 326.6 J/ohm where they do not overlap.
    together = Flash((Stroke(waveform=FIRST, start=0.0), Stroke(waveform=LONG, start=0.0)))
    apart = Flash((Stroke(waveform=FIRST), Stroke(waveform=LONG)))
    assert together.specific_energy == pytest.approx(10_435_511.7, abs=0.05)
    assert apart.specific_energy == pytest.approx(10_355_326.6, abs=0.05)
    assert together.charge == pytest.approx(300.2314, abs=5e-5)
    assert together.overlap == pytest.approx(80.19e3, abs=5)
    assert together.peak == pytest.approx(apart.peak + 400.0, rel=1e-6)
    assert (together.impulse_charge, together.long_charge) == (pytest.approx(100.2314, abs=5e-5), 200.0)


def test_strokes_far_apart_add():
    d = DoubleExponential(100e3, 22708.0, 1294530.0)
    apart = Flash((Stroke(waveform=d, start=0.0), Stroke(waveform=d, start=0.06)))
    assert apart.overlap == pytest.approx(0.0, abs=1e-6)
    assert apart.specific_energy == pytest.approx(2 * d.specific_energy, rel=1e-12)


def test_given_counts_and_integrated_is_shown():
    stroke = Stroke(peak=200e3, charge=100.0, specific_energy=10e6, waveform=FIRST, shape="10/350")
    flash = Flash((stroke,))
    assert (flash.peak, flash.specific_energy) == (200e3, 10e6)
    shown = stroke.to_dict()
    assert shown["specific_energy"]["value"] == 10e6
    # the function of the standard carries 2.75 % more than its table
    assert shown["integrated"]["specific_energy"]["value"] / 10e6 == pytest.approx(1.0275, abs=5e-5)
    assert shown["shape"] == "10/350"


def test_share_scales_the_waveform():
    part = Flash((Stroke(waveform=FIRST, start=0.0), Stroke(waveform=LONG, start=0.0))).through(0.5)
    assert part.specific_energy == pytest.approx(10_435_511.7 / 4, rel=1e-8)
    assert part.strokes[0].waveform.peak == pytest.approx(FIRST.peak / 2)


def test_arrays_of_waveforms():
    many = Flash((Stroke(waveform=Heidler(np.array([1e5, 2e5]), 19e-6, 485e-6)),))
    assert many.is_array
    assert many.specific_energy[1] == pytest.approx(4 * many.specific_energy[0])


def test_heating_from_waveform_and_from_table_differ_as_stated():
    # copper 16 mm²: 309.1 K from the table's W/R, 321.5 K from that of the standard's own function
    table = one(kind="conductor", material="copper", section="16 mm**2")
    wave = one(
        kind="conductor", material="copper", section="16 mm**2",
        flash={"stroke": [{"shape": "heidler", "peak": "200 kA", "tau1": "19 us", "tau2": "485 us", "normalise": "standard", "k": 0.93}]},
    )  # fmt: skip
    assert table.findings["temperature_rise"].value == pytest.approx(309.06, abs=0.01)
    assert wave.findings["temperature_rise"].value == pytest.approx(321.5, abs=0.05)


@pytest.mark.parametrize("name", SHAPES)
def test_every_shape_from_a_case(name):
    values = {
        "peak": "100 kA", "tau1": "19 us", "tau2": "485 us", "alpha": "2000 1/s", "beta": "200000 1/s", "p": 2.9,
        "tau": "4 us", "front": "10 us", "tail": "500 us", "duration": "0.5 ms", "fall": "20 us", "rise": "10 us",
        "current": "400 A", "max_steepness": "24 kA/us", "half_value_time": "75 us",
    }  # fmt: skip
    shape = SHAPES[name]
    entry = {"shape": name, **{p: values[p] for p in shape.UNITS if p not in shape.OPTIONAL}}
    if name == "concave front":
        entry["peak"], entry["front"] = "31.1 kA", "6.4 us"
    stroke = make_case(
        {
            "flash": {"stroke": [entry]},
            "object": [{"kind": "sheet", "material": "copper", "thickness": "1 mm"}],
        }
    ).flash.strokes[0]
    assert type(stroke.waveform) is shape
    assert stroke.integrated["charge"] > 0
    json.dumps(stroke.to_dict())


def test_designation():
    stroke = flash_of('[[flash.stroke]]\nshape = "10/350"\npeak = "100 kA"\n').strokes[0]
    assert stroke.waveform.front_time() == pytest.approx(10e-6, rel=1e-6)
    assert stroke.waveform.half_value_time() == pytest.approx(350e-6, rel=1e-6)


def test_charge_given_beside_a_shape_counts():
    flash = flash_of('[[flash.stroke]]\nshape = "10/350"\npeak = "100 kA"\ncharge = "50 C"\n')
    assert flash.charge == 50.0
    assert flash.strokes[0].integrated["charge"] == pytest.approx(49.10, abs=0.01)


def test_named_strokes_in_a_case():
    flash = flash_of(
        '[[flash.stroke]]\nthreat = "component A"\nstart = "0 s"\n[[flash.stroke]]\nthreat = "component C"\nstart = "1 ms"\nname = "tail"\n'
    )
    assert [s.name for s in flash.strokes] == ["component A", "tail"]
    assert flash.peak == 200e3
    assert flash.charge == pytest.approx(218.93, abs=0.01)


def test_fitted_waveform():
    text = '[[flash.stroke]]\nshape = "fitted"\npeak = "200 kA"\ncharge = "100 C"\nspecific_energy = "10.28 MJ/ohm"\nfront_time = "10 us"\n'
    flash = flash_of(text)
    stroke = flash.strokes[0]
    assert stroke.integrated["charge"] == pytest.approx(100.0, rel=1e-6)
    assert stroke.integrated["specific_energy"] == pytest.approx(10.28e6, rel=1e-6)
    assert stroke.waveform.front_time() == pytest.approx(10e-6, rel=1e-5)
    assert any("fitted to peak" in text for text in flash.remarks)


@pytest.mark.parametrize(
    ("entry", "said"),
    [
        (
            'shape = "heidlr"',
            "c.toml:2: flash.stroke 1.shape: unknown shape 'heidlr'; did you mean 'heidler'?",
        ),
        (
            'shape = "double exponential"\npeak = "1 kA"\nalpha = "1e5 1/s"\nbeta = "1e4 1/s"',
            "beta is the rate of the front",
        ),
        ('shape = "rectangle"\ncurrent = "5 A"', "flash.stroke 1.duration: it is missing"),
        (
            'shape = "rectangle"\ncurrent = "5 A"\nduration = "1 s"\nn = 5',
            "flash.stroke 1.n: unknown parameter",
        ),
        ('tau1 = "1 us"', "tau1 is a parameter of a shape; say the shape as well, such as shape = 'heidler'"),
        ('threat = "LPL I"', "'LPL I' is a whole flash, not one stroke"),
        ('threat = "LPL 8"', "flash.stroke 1.threat: unknown threat"),
        ('threat = "component A"\npeak = "5 kA"', "a named threat brings its own values"),
        (
            'shape = "fitted"\npeak = "35 kA"\ncharge = "16 C"\nspecific_energy = "650 kJ/ohm"',
            "W/R <= I*Q does not hold",
        ),
        ('shape = "fitted"\npeak = "35 kA"\ntau1 = "1 us"', "a fitted waveform takes no such value"),
        ('shape = "8/"\npeak = "35 kA"', "unknown shape '8/'"),
        ('shape = "10/350"', "flash.stroke 1.peak: it is missing"),
        (
            'shape = "10/350"\npeak = "5 kA"\ncharge = "50 C"\nspecific_energy = "50 MJ/ohm"',
            "no current can have this",
        ),
    ],
)
def test_refused(entry, said):
    with pytest.raises(CaseError) as caught:
        read_case(f"[[flash.stroke]]\n{entry}\n{OBJECT}", "c.toml")
    assert said in str(caught.value)


def test_components_of_the_aircraft_environment():
    # nominal peak and action integral, and what the double exponentials deliver (SAE ARP5412 / EUROCAE ED-84, recalled)
    for name, peak, action, charge in (
        ("A", 200e3, 2e6, 18.933569),
        ("AH", 150e3, 0.8e6, 10.072741),
        ("D", 100e3, 0.25e6, 4.733392),
    ):
        component = single_components()[f"component {name}"]
        stroke = component.stroke()
        assert (stroke.peak, stroke.specific_energy) == (peak, action)
        assert stroke.integrated["peak"] == pytest.approx(peak, rel=1e-5)
        assert stroke.integrated["specific_energy"] == pytest.approx(action, rel=2e-5)
        assert stroke.integrated["charge"] == pytest.approx(charge, rel=1e-6)
    b = single_components()["component B"].waveform
    assert b.charge_until(5e-3) == pytest.approx(10.00564, rel=1e-6)
    assert single_components()["component H"].waveform.peak == pytest.approx(10e3, rel=2e-5)


def test_connector_classes():
    assert (threat("class H").peak, threat("class H").specific_energy) == (100e3, 2.5e6)
    assert threat("Class n").specific_energy == 625e3


def test_level_remarks_say_what_the_waveform_adds():
    assert any("W/R +2.75 %" in text for text in threat("LPL I").remarks)


def test_record_as_the_flash(tmp_path):
    t = np.arange(-50e-6, 2e-3, 0.5e-6)
    current = np.where(t > 0, Heidler(50e3, 1.82e-6, 285e-6).current(np.maximum(t, 0)), 0.0)
    lines = [f"{a * 1e6:.2f},{b / 1e3:.6f}" for a, b in zip(t, current, strict=True)]
    (tmp_path / "shot.csv").write_text("time [us],current [kA]\n" + "\n".join(lines) + "\n")
    case = tmp_path / "case.toml"
    case.write_text('[flash]\nrecord = "shot.csv"\n' + OBJECT)
    from strikeenergy import load_case

    flash = load_case(case).flash
    assert flash.peak == pytest.approx(50e3, rel=2e-3)
    assert flash.strokes[0].shape == "record"
    assert "standard uncertainty" in flash.remarks[0]
    case.write_text('[flash]\nrecord = "nothing.csv"\n' + OBJECT)
    with pytest.raises(CaseError, match=r"nothing\.csv"):
        load_case(case)
    case.write_text('[flash.record]\nfile = "shot.csv"\nchanel = "2"\n' + OBJECT)
    with pytest.raises(CaseError, match="did you mean 'channel'"):
        load_case(case)
