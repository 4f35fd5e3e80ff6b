"""Faults that new users found: each stays mended."""

import time

import numpy as np
import pytest

from helpers import command, one, strokes
from strikeenergy import estimate, make_case
from strikeenergy.case import CaseError, read_case
from strikeenergy.errors import InputError
from strikeenergy.lightning import fit

CASE = '[flash]\nthreat = "LPL I"\n'


def refused(text):
    with pytest.raises(CaseError) as caught:
        read_case(text, "c.toml")
    return str(caught.value)


def thing(**fields):
    lines = [
        f"{key} = {value!r}" for key, value in {"kind": "conductor", "material": "copper", **fields}.items()
    ]
    return "[[object]]\n" + "\n".join(lines) + "\n"


def test_a_long_stroke_alone_says_that_its_energy_is_the_least():
    result = one(
        kind="conductor",
        material="copper",
        section="16 mm**2",
        flash=strokes(charge="200 C", duration="0.5 s"),
    )
    assert any("least it can be" in text for text in result.remarks)


def test_classes_that_tie_are_told():
    result = one(kind="tree", species="white oak", diameter="0.5 m", bark="dry", condition="rot")
    assert any("equally probable" in text for text in result.remarks)


def test_a_partial_sum_of_forces_is_not_given():
    near = {"spacing": "0.1 m"}
    result = one(
        kind="conductor",
        material="copper",
        section="50 mm**2",
        share=0.3,
        neighbour=[{**near, "length": "5 m"}, near],
    )
    assert result.findings["neighbour_force"].value is None
    assert "every neighbour" in result.findings["neighbour_force"].why_not


def test_a_strand_is_not_its_diameter():
    assert "metal section" in refused(CASE + thing(form="stranded", diameter="8 mm"))


def test_pipe_by_section_has_no_radius():
    result = one(kind="conductor", material="copper", form="pipe", section="50 mm**2")
    assert result.findings["pinch_pressure"].value is None


def test_many_mistakes_are_told_soon():
    text = CASE + "".join(thing(name=f"part {i}", section="50 mm**2", foo=1, lenght="3") for i in range(400))
    begin = time.process_time()
    lines = refused(text).split("\n")
    assert len(lines) == 51
    assert lines[0].startswith("c.toml:8: object 1 (part 0).foo")
    assert "800" not in lines[-1]
    assert "750 more" in lines[-1]
    # the cost grows with the file, not with its square: 800 mistakes within the time of a hundred parses
    one_parse = time.process_time()
    for _ in range(20):
        __import__("tomllib").loads(text)
    assert one_parse - begin < 40 * (time.process_time() - one_parse)


@pytest.mark.parametrize(
    ("fields", "said"),
    [
        ({"section": "1e300 mm**2"}, "outside any physical range"),
        ({"section": "1e-300 mm**2"}, "outside any physical range"),
        ({"section": "50 mm**2", "share": 1e-160}, "outside any physical range"),
        ({"section": "50 mm**2", "length": "1e300 m"}, "outside any physical range"),
    ],
)
def test_extreme_values_are_refused_and_no_plugin_is_blamed(fields, said):
    assert said in refused(CASE + thing(**fields))


def test_extreme_strokes_are_refused():
    text = "[[flash.stroke]]\ncharge = '1e200 C'\nduration = '1e-2 s'\n" + thing(section="50 mm**2")
    assert "outside any physical range" in refused(text)
    assert "too many digits" in refused(f"share = 1{'0' * 5000}\n")


def test_colder_than_the_straight_line():
    result = one(kind="conductor", material="copper", section="50 mm**2", start="20 kelvin")
    assert not result.failures
    assert any("fallen to zero" in text for text in result.remarks)
    cold = one(kind="conductor", material="copper", section="50 mm**2", start="-200 degC")
    assert any("doubtful" in text for text in cold.remarks)


def test_names_carry_nothing_to_the_terminal():
    assert "cannot be printed" in refused(
        CASE
        + '[[object]]\nkind = "conductor"\nname = "a\\u001b[31m"\nmaterial = "copper"\nsection = "5 mm**2"\n'
    )
    assert "cannot be printed" in refused('title = "a\\nb"\n' + CASE + thing(section="5 mm**2"))
    assert "121 characters" in refused(CASE + thing(section="5 mm**2", name="a" * 121))


@pytest.mark.parametrize("names", [(None, "conductor 1"), ("a", "a "), ("Part", "part")])
def test_names_are_unique_however_written(names):
    parts = [thing(section="5 mm**2", **({} if name is None else {"name": name})) for name in names]
    assert "as well" in refused(CASE + "".join(parts))


def test_empty_standard_is_refused():
    assert command("estimate", "cases/boathouse.toml", "--standard", "").returncode == 3


@pytest.mark.parametrize(
    ("text", "said"),
    [
        ('[flash]\nstroke = ["x", 3]\n', "[[flash.stroke]]"),
        (CASE + thing(section="5 mm**2", neighbour=[3]), "[[object.neighbour]]"),
        (
            CASE + thing(section="5 mm**2", neighbour=[{}]).replace("{}", "{ share = 0.5 }"),
            "such as spacing = '0.1 m'",
        ),
        (CASE + '[[object]]\nkind = "conductor"\nsection = "5 mm**2"\n', "such as material = 'copper'"),
        (
            "[[flash.stroke]]\npeak='5 kA'\nstart='50 ms'\n[[flash.stroke]]\npeak='5 kA'\nstart='0 s'\n"
            + thing(section="5 mm**2"),
            "not in time order",
        ),
        (
            CASE
            + '[materials.""]\nresistivity = { value = "1e-8 ohm*m", source = "x" }\n'
            + thing(section="5 mm**2"),
            "has no name",
        ),
    ],
)
def test_messages(text, said):
    assert said in refused(text)


def test_a_field_of_two_types_is_told_once():
    assert refused(CASE + thing(awg=6.5)).count("awg") == 1


def test_value_and_unit_apart():
    text = (
        CASE
        + '[materials."m"]\nresistivity = { value = "1e-8", unit = "ohm*m", source = "x" }\n'
        + thing(section="5 mm**2").replace("'copper'", "'m'")
    )
    assert read_case(text).materials.own["m"]["resistivity"].value == 1e-8


def test_result_is_a_sequence_with_hints():
    result = estimate(
        make_case(
            {
                "flash": {"threat": "LPL I"},
                "object": [{"kind": "sheet", "name": "ridge rod", "material": "copper", "thickness": "1 mm"}],
            }
        )
    )
    assert len(result) == len(list(result)) == 1
    with pytest.raises(KeyError, match="did you mean 'ridge rod'"):
        result["ridge rodd"]
    with pytest.raises(KeyError, match="did you mean 'root_energy'"):
        result["ridge rod"]["root_enrgy"]


def test_notes_do_not_square_an_energy():
    result = one(kind="conductor", material="copper", section="50 mm**2", neighbour=[{"spacing": "0.1 m"}])
    impulse = next(s for s in result.notes["forces"].steps if s.symbol == "J'")
    assert "∫i1·i2·dt" in impulse.formula_text()
    assert "i²" not in impulse.formula_text()


@pytest.mark.parametrize(("size", "symbols"), [({"awg": 10}, ["d", "q"]), ({"kcmil": 57.4}, ["q"])])
def test_notes_derive_wire_sizes(size, symbols):
    result = one(kind="conductor", material="copper", **size)
    assert [s.symbol for s in result.notes["heating"].steps][: len(symbols)] == symbols


def test_kind_of_a_failed_plugin_is_left_out_and_told(tmp_path, monkeypatch):
    from importlib.metadata import EntryPoint, entry_points

    from strikeenergy.registry import GROUP, load
    from strikeenergy.report.text import estimate_text

    (tmp_path / "broken_fence.py").write_text("raise RuntimeError('no posts')\n")
    monkeypatch.syspath_prepend(tmp_path)
    points = [p for p in entry_points(group=GROUP) if p.dist.name == "strikeenergy"]
    registry = load([*points, EntryPoint("fence", "broken_fence", GROUP)])
    data = {
        "flash": {"threat": "LPL I"},
        "object": [
            {"kind": "fence", "name": "west fence"},
            {"kind": "sheet", "material": "copper", "thickness": "1 mm"},
        ],
    }
    result = estimate(make_case(data, registry=registry))
    assert len(result) == 1
    assert int(result.exit_code) == 5
    assert "west fence" in result.skipped[0]
    assert "no posts" in estimate_text(result)
    with pytest.raises(CaseError, match="no posts"):
        make_case({"flash": {"threat": "LPL I"}, "object": data["object"][:1]}, registry=registry)


def test_what_a_plugin_prints_does_not_mix_with_results(tmp_path, monkeypatch, capsys):
    from importlib.metadata import EntryPoint

    from strikeenergy.registry import GROUP, load

    (tmp_path / "chatty.py").write_text("print('HELLO')\nSTRIKEENERGY_API = 1\n")
    monkeypatch.syspath_prepend(tmp_path)
    load([EntryPoint("chatty", "chatty", GROUP)])
    out, err = capsys.readouterr()
    assert "HELLO" not in out
    assert "HELLO" in err


def test_wanted_plugins_that_are_not_there(monkeypatch):
    from strikeenergy.registry import load

    monkeypatch.setenv("STRIKEENERGY_PLUGINS", "nonsense,sheet")
    registry = load()
    assert [p.name for p in registry.plugins] == ["sheet"]
    assert "STRIKEENERGY_PLUGINS" in registry.failures[0].reason
    monkeypatch.setenv("STRIKEENERGY_PLUGINS", " ")
    assert len(load().plugins) >= 3


def test_writing_follows_links_and_harms_nothing_beside(tmp_path):
    target, beside = tmp_path / "k.toml", tmp_path / "k.toml.part"
    beside.write_text("keep")
    assert command("new", "sheet", "-o", target).returncode == 0
    assert beside.read_text() == "keep"
    link = tmp_path / "link.toml"
    link.symlink_to(target)
    assert command("new", "tree", "-o", link, "--force").returncode == 0
    assert link.is_symlink()
    assert "tree" in target.read_text(encoding="utf-8")
    assert sorted(p.name for p in tmp_path.iterdir()) == ["k.toml", "k.toml.part", "link.toml"]


def test_a_full_disk_is_no_fault_of_the_program():
    import os
    import subprocess
    import sys

    from helpers import ROOT

    if not os.path.exists("/dev/full"):
        pytest.skip("this system has no full device")
    done = subprocess.run(
        f"{sys.executable} -m strikeenergy describe threats > /dev/full",
        shell=True,
        capture_output=True,
        text=True,
        cwd=ROOT,
    )
    assert done.returncode == 2
    assert "cannot be written" in done.stderr
    closed = subprocess.run(
        f"{sys.executable} -m strikeenergy estimate - <&-",
        shell=True,
        capture_output=True,
        text=True,
        cwd=ROOT,
    )
    assert closed.returncode == 3
    assert "Traceback" not in closed.stderr


def test_arrays_where_all_melt_stay_arrays():
    from strikeenergy.lightning.flash import Flash, Stroke
    from strikeenergy_conductor import Conductor, heating

    found = heating(
        Conductor(material="copper", section="4 mm**2"),
        Flash((Stroke(specific_energy=np.array([1e7, 2e7])),)),
    )
    assert np.isnan(found.temperature_rise).all()
    assert found.state.codes.tolist() == [2, 2]


def melting(result):
    return next(v for v in result.verdicts if v.check == "melting")


def test_melting_that_is_not_judged_is_a_verdict_of_its_own():
    given = {"kind": "conductor", "material": "copper", "section": "50 mm**2", "use": "down conductor"}
    given["form"] = "solid round"
    no_energy = one(**given, flash=strokes(peak="100 kA"))
    assert (melting(no_energy).outcome, melting(no_energy).counts) == ("not covered", False)
    assert "specific energy" in melting(no_energy).note
    assert no_energy.outcome == "meets"
    # A conductor that is already molten is no conductor that meets its checks.
    molten = one(**given, start="1100 degC")
    assert (melting(molten).outcome, melting(molten).counts) == ("not covered", True)
    assert molten.outcome == "not covered"
    assert melting(one(**given)).outcome == "meets"


def test_melting_or_molten_is_told():
    result = one(kind="conductor", material="stainless steel", section="4 mm**2")
    assert result.findings["state"].value == "melting"
    assert any("melting or molten" in text for text in result.remarks)


def test_every_stroke_that_lacks_a_value_is_named():
    flash = {"stroke": [{"peak": "10 kA"}, {"peak": "20 kA"}]}
    result = one(kind="conductor", material="copper", section="50 mm**2", flash=flash)
    assert any("strokes 1 and 2 have no specific energy" in text for text in result.remarks)


def test_own_copper_is_told():
    case = make_case(
        {
            "flash": {"threat": "LPL I"},
            "materials": {"copper": {"resistivity": {"value": "18 nohm*m", "source": "certificate"}}},
            "object": [{"kind": "conductor", "material": "copper", "section": "50 mm**2"}],
        }
    )
    assert any("takes the place of the built-in" in text for text in estimate(case).objects[0].remarks)


def test_a_comma_may_part_thousands():
    said = refused(CASE + thing(section="1,000 mm**2"))
    assert "'1.000 mm**2'" in said
    assert "'1000 mm**2'" in said
    assert "thousands" not in refused(CASE + thing(section="1,5 mm**2"))


def test_a_bare_nan_is_not_given_a_unit():
    said = refused(CASE + '[[object]]\nkind = "conductor"\nmaterial = "copper"\nsection = nan\n')
    assert "not a finite number" in said
    assert "nan mm" not in said


def test_a_key_that_stands_twice_is_named():
    said = refused(CASE + '[[object]]\nkind = "tree"\ndiameter = "1 m"\ndiameter = "2 m"\n')
    assert "diameter stands twice" in said


def test_strokes_apart_are_told():
    first = {"shape": "heidler", "peak": "200 kA", "tau1": "19 us", "tau2": "485 us"}
    second = {"shape": "rectangle", "current": "400 A", "duration": "0.5 s", "start": "0 s"}
    case = make_case(
        {
            "flash": {"stroke": [first, second]},
            "object": [{"kind": "sheet", "material": "copper", "thickness": "1 mm"}],
        }
    )
    assert any("no start is given of stroke 1" in text for text in case.flash.remarks)


def test_no_tail_ends_before_its_front():
    with pytest.raises(InputError, match=r"0\.9\*T1 <= T2"):
        fit(peak=1e5, front_time=1e-5, half_value_time=5e-6)


def test_tolerances_need_a_specification():
    done = command("record", "cases/mast-shot.csv", "--scale", "10 kA/V", "--peak", "20 kA")
    assert done.returncode == 2
    assert "--spec" in done.stderr
