"""What comes out, in every form."""

import csv
import io
import json

import numpy as np
import pytest

import strikeenergy
from helpers import ROOT
from strikeenergy import estimate, load_case, make_case
from strikeenergy.errors import ExitCode
from strikeenergy.report.machine import COLUMNS, to_csv, to_json
from strikeenergy.report.text import WIDTH, estimate_text, notes_text
from strikeenergy.results import plain


@pytest.fixture(scope="module")
def boathouse():
    return estimate(load_case(ROOT / "cases" / "boathouse.toml"))


def simple(**fields):
    thing = {
        "kind": "conductor",
        "material": "copper",
        "section": "50 mm**2",
        "form": "solid tape",
        "use": "down conductor",
        **fields,
    }
    return estimate(make_case({"flash": {"threat": "LPL I"}, "object": [thing]}))


def test_python_api(boathouse):
    rise = boathouse["west down conductor"]["temperature_rise"]
    assert rise.check("[temperature]")
    assert boathouse["west down conductor"]["end_temperature"].units == strikeenergy.quantity(1, "degC").units
    assert boathouse["west down conductor"]["state"] == "solid"
    assert "\n" not in repr(boathouse)
    assert repr(boathouse["ridge rod"]).startswith("<ridge rod: meets (")
    assert repr(boathouse["ridge rod"].findings["temperature_rise"]).startswith("<temperature_rise = ")
    with pytest.raises(KeyError):
        boathouse["nobody"]


def test_html_says_the_same_and_escapes():
    result = estimate(
        make_case(
            {
                "title": "<script>",
                "flash": {"threat": "LPL I"},
                "object": [{"kind": "sheet", "name": "a<b", "material": "copper", "thickness": "1 mm"}],
            }
        )
    )
    page = result._repr_html_()
    assert "<script>" not in page
    assert "a&lt;b" in page
    assert "not a design approval" in page
    assert "<th>" in page


def test_json_of_the_contract(boathouse):
    data = boathouse.to_dict()
    text = to_json(data)
    assert json.loads(text) == json.loads(to_json(json.loads(text)))
    assert data["schema_version"] == 1
    assert set(data["case"]) >= {"title", "sha256"}
    assert data["flash"]["peak"] == {"value": 200000.0, "unit": "A"}
    assert [thing["name"] for thing in data["objects"]] == [r.name for r in boathouse.objects]
    for thing in data["objects"]:
        assert set(thing) >= {"name", "kind", "findings", "verdicts", "failures", "remarks"}
        for name, found in thing["findings"].items():
            assert {"value", "unit", "effect", "standing", "sources"} <= set(found), name
            assert found["sources"]
            assert found["standing"]
            assert found["value"] is not None or found["why_not"]
        for verdict in thing["verdicts"]:
            assert {"check", "outcome", "value", "limit", "margin", "clause"} <= set(verdict)
            assert verdict["sources"] or verdict["outcome"] == "not covered"
    assert data["software"]["version"] == strikeenergy.__version__
    assert "conductor" in data["software"]["plugins"]


def test_words_have_no_unit(boathouse):
    assert boathouse.to_dict()["objects"][0]["findings"]["state"]["unit"] is None


def test_repeatable(boathouse):
    again = estimate(load_case(ROOT / "cases" / "boathouse.toml"))
    assert to_json(again.to_dict()) == to_json(boathouse.to_dict())
    assert estimate_text(again) == estimate_text(boathouse)


def test_csv(boathouse):
    rows = list(csv.DictReader(io.StringIO(to_csv(boathouse))))
    assert tuple(rows[0]) == COLUMNS
    records = {row["record"] for row in rows}
    assert {"finding", "size", "effect", "reserve", "caution"} <= records
    rise = next(row for row in rows if row["name"] == "temperature_rise" and row["object"] == "ridge rod")
    assert float(rise["value"]) == pytest.approx(boathouse["ridge rod"].findings["temperature_rise"].value)
    assert rise["unit"] == "K"


def test_csv_text_stays_text():
    rows = list(csv.DictReader(io.StringIO(to_csv(simple(name="=1+1")))))
    assert rows[0]["object"] == "'=1+1"


def test_text_fits_a_terminal_and_says_what_matters(boathouse):
    text = estimate_text(boathouse)
    assert max(map(len, text.splitlines())) <= WIDTH
    assert text.index("objects:") < text.index("Findings") < text.index("Cautions")
    for said in (
        "(governs)",
        "upper bound",
        "models leave out",
        "IEC 62305-3:2010 Table 6",
        "does not decide",
        "licensed",
    ):
        assert said in text or said in text.lower(), said


def test_notes_show_values_and_sources(boathouse):
    text = notes_text(boathouse)
    assert max(map(len, text.splitlines())) <= WIDTH
    assert "Δθ = (exp(W·α·ρ0/(q^2·C)) − 1)/α" in text
    assert "1.78e-8" in text
    assert "Table D.2" in text
    assert "from memory (high confidence)" in text
    assert "assumed" in text


def test_every_shown_step_is_the_computed_one(boathouse):
    for thing in boathouse.objects:
        for note in thing.notes.values():
            for step in note.steps:
                values = {name: given.value for name, given in step.values.items()}
                assert float(step.formula(**values)) == pytest.approx(step.result, rel=1e-12)


def test_exit_codes():
    assert simple().exit_code is ExitCode.OK
    assert simple(section="20 mm**2").exit_code is ExitCode.FALLS_SHORT
    nothing = {
        "flash": {"threat": "LPL I"},
        "object": [{"kind": "sheet", "material": "titanium", "thickness": "1 mm"}],
    }
    assert estimate(make_case(nothing)).exit_code is ExitCode.NO_RESULT


def test_sentence():
    assert simple().sentence() == "1 object: 1 meets its checks"
    assert simple(section="20 mm**2").sentence() == "1 object: 1 falls short"


def test_plain_values():
    assert plain(np.float64(1.5)) == 1.5
    assert plain(np.array([1.0, np.nan])) == [1.0, None]
    assert plain(float("inf")) is None
    assert plain(np.bool_(True)) is True


def test_arrays_come_out_as_lists():
    from strikeenergy import quantity

    case = make_case(
        {
            "flash": {"stroke": [{"specific_energy": quantity(np.array([1e6, 1e9]), "J/ohm")}]},
            "object": [{"kind": "conductor", "material": "copper", "section": "16 mm**2"}],
        }
    )
    result = estimate(case)
    data = json.loads(to_json(result.to_dict()))["objects"][0]["findings"]
    assert data["state"]["value"] == ["solid", "molten"]
    assert data["temperature_rise"]["value"][1] is None
    assert result.objects[0]["temperature_rise"].shape == (2,)
    assert "2 values" in estimate_text(result)


def test_governing_is_the_worst_then_the_tightest():
    result = simple(section="20 mm**2").objects[0]
    assert result.governing.check == "minimum section"
    result = simple(material="stainless steel", section="40 mm**2", mechanical="essential").objects[0]
    assert result.outcome == "falls short"
    assert result.governing.margin == min(v.margin for v in result.counting if v.outcome == "falls short")


def test_standing_of_a_finding_is_its_weakest(boathouse):
    assert boathouse["ridge sheet"].findings["melted_volume_bound"].standing == "assumed"
    assert boathouse["ridge rod"].findings["temperature_rise"].standing == "from memory (high confidence)"
