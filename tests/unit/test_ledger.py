"""The energy ledger: what it refuses, what it says, what it hands on."""

from __future__ import annotations

import json
import math

import numpy as np
import pytest

from strikeenergy.errors import DataError, InputError, UnknownName
from strikeenergy.lightning import ledger as module
from strikeenergy.lightning.ledger import SENTENCE, Entry, build_ledger, practice, published

WIRE = Entry("west down conductor", "ohmic", 69e3, 60e3, 80e3)
ROOT = Entry("roof sheet", "arc root", 3e3, 3e3, 3e3)
OAK = Entry("oak", "channel", 2e6, 1e5, 5e6)


def problems(*entries, **channel):
    with pytest.raises(InputError) as caught:
        build_ledger(entries, **channel)
    return [str(problem) for problem in caught.value.problems]


def test_shares_are_ranges_over_both_ranges():
    ledger = build_ledger([WIRE, ROOT])
    assert ledger.share(WIRE) == (pytest.approx(60e3 / 3e10), pytest.approx(80e3 / ledger.low))
    assert ledger.share(ROOT)[0] < ledger.share(ROOT)[1]


def test_no_object_takes_more_than_all():
    ledger = build_ledger([OAK])
    assert ledger.share(OAK)[1] == 1.0
    assert ["weakest" in text for text in ledger.remarks] == [True]
    giant = Entry("x", "ohmic", 1e12, 1e12, 1e12)
    assert build_ledger([giant]).share(giant) == (1.0, 1.0)
    assert "look at its inputs" in build_ledger([giant]).remarks[0]


def test_remarks_only_where_they_belong():
    assert build_ledger([WIRE]).remarks == ()
    assert "branched pattern" in build_ledger([], dimension=1.34).remarks[0]
    assert build_ledger([], dimension=1.15).remarks == ()
    assert "300 m to 9 km" in build_ledger([], height=100).remarks[0]
    assert "300 m to 9 km" in build_ledger([], height=12e3).remarks[0]


def test_straight_channel():
    assert build_ledger([], dimension=1).length == 3e3
    assert build_ledger([], height=50, ruler=50, dimension=1.9).length == 50


def test_everything_wrong_is_said_at_once():
    bad = Entry("", "heat", -1.0, math.nan, math.inf)
    said = problems(bad, WIRE, height=-3.0, ruler="50 m", dimension=2.0)
    assert len(said) == 8
    assert said[0] == "entry 1.object: an entry needs the name of its object"
    assert said[1] == "entry 1.sort: unknown sort 'heat'; known: 'ohmic', 'arc root', 'channel'"
    for text, name in zip(said[2:5], ("energy", "low", "high"), strict=True):
        assert text.startswith(f"entry 1.{name}: ")
        assert text.endswith("is no energy; write a finite number of joules, not negative")
    assert said[5] == "height: -3.0 is no length; write a positive, finite number of metres"
    assert said[6].startswith("ruler: '50 m' is no length")
    assert said[7] == "dimension: 2.0 is no dimension of a channel; from 1 to below 2"


@pytest.mark.parametrize(
    "given",
    [
        {"height": 0.0},
        {"height": math.inf},
        {"height": math.nan},
        {"height": True},
        {"height": None},
        {"height": 10**400},
        {"height": 1e300},
        {"ruler": 0},
        {"ruler": -1.0},
        {"ruler": 3000.1},
        {"ruler": math.nan},
        {"ruler": 1e-300, "dimension": 1.9},
        {"dimension": 0.99},
        {"dimension": math.nan},
        {"dimension": "1.1"},
        {"dimension": -1},
    ],
)
def test_a_channel_that_cannot_be_is_refused(given):
    (said,) = problems(**given)
    assert "; " in said


@pytest.mark.parametrize(("low", "energy", "high"), [(2.0, 1.0, 3.0), (0.0, 4.0, 3.0), (3.0, 2.0, 1.0)])
def test_an_energy_outside_its_own_range_is_refused(low, energy, high):
    assert problems(Entry("x", "ohmic", energy, low, high)) == [
        "entry 1.energy: it lies outside its own range; low <= energy <= high"
    ]


@pytest.mark.parametrize("name", [None, 3, "  ", "\n\t"])
def test_an_entry_needs_a_name(name):
    assert problems(Entry(name, "ohmic", 1.0, 1.0, 1.0)) == [
        "entry 1.object: an entry needs the name of its object"
    ]


def test_an_object_that_takes_nothing_is_an_entry_too():
    ledger = build_ledger([Entry("spare", "ohmic", 0.0, 0.0, 0.0)])
    assert ledger.share(ledger.entries[0]) == (0.0, 0.0)
    assert "spare, ohmic: 0 J; share of the flash 0" in ledger.lines()[1]


def test_json():
    ledger = build_ledger([WIRE, Entry("sheet", "arc root", np.float64(3e3), 3000, np.float64(3e3))])
    text = json.dumps(ledger.to_dict(), sort_keys=True, allow_nan=False)
    assert text == json.dumps(build_ledger(ledger.entries).to_dict(), sort_keys=True, allow_nan=False)
    read = json.loads(text)
    assert read["entries"][0]["energy"] == {"value": 69e3, "low": 60e3, "high": 80e3, "unit": "J"}
    assert read["entries"][0]["share"]["unit"] == "1"
    assert read["entries"][1]["sort"] == "arc root"
    assert read["flash"]["low"] == ledger.low
    assert read["flash"]["unit"] == "J"
    assert [s["school"] for s in read["flash"]["schools"]] == [s.school for s in published("total")]
    assert read["flash"]["schools"][1]["low"] is None
    assert read["flash"]["schools"][1]["note"] == "may reach"
    assert read["flash"]["per_metre"]["high"] == 2.3e5
    assert len({s["school"] for s in read["flash"]["per_metre"]["schools"]}) == 4
    assert read["channel_length"] == {
        "value": ledger.length,
        "unit": "m",
        "height": 3e3,
        "ruler": 50.0,
        "dimension": 1.1,
    }
    assert read["common_practice"]["standing"] == "common practice, no source"
    assert read["remarks"][-1] == SENTENCE


def test_text():
    lines = build_ledger([WIRE, ROOT, OAK]).lines()
    text = " ".join(line.strip() for line in lines)
    assert max(map(len, lines)) <= 80
    assert "west down conductor, ohmic: 69 kJ (60 kJ to 80 kJ); share of the flash 2e-6 to 0.089" in text
    assert "roof sheet, arc root: 3 kJ; share" in text
    assert "whole flash: 904 kJ to 30 GJ, the published range" in text
    assert "per metre of channel: 200 J/m to 230 kJ/m" in text
    assert "channel length: 4.52 km (height 3 km, ruler 50 m, dimension 1.1)" in text
    assert "order of magnitude: up to 1 GJ (Pasek and Hurst 2016; published)" in text
    assert "in the trade: 1.1 GJ a flash (common practice, no source)" in text
    for stated in (*published("total"), *published("per_metre")):
        assert f"{stated.school}: " in text
        assert stated.name in text
    assert text.endswith(SENTENCE)


def test_the_sentence():
    assert "say nothing usable about an object" in SENTENCE
    assert "W/R and charge do" in SENTENCE


def test_text_without_objects():
    assert build_ledger([]).lines()[1] == "  no energy into an object is known"


def test_a_name_stays_on_its_line():
    ledger = build_ledger([Entry("oak\n\x1b[31m by\tthe barn", "channel", 1.0, 1.0, 1.0)])
    assert ledger.entries[0].object == "oak [31m by the barn"


def test_open_ranges_in_words():
    (dry,) = (s for s in published("cloud_base") if "dry" in s.school)
    assert "m and more (" in dry.text()


def test_unknown_names():
    with pytest.raises(UnknownName, match="did you mean 'per_metre'"):
        published("per_meter")
    with pytest.raises(UnknownName, match="cloud_height"):
        practice("cloud_heigth")


@pytest.mark.parametrize(
    ("change", "reason"),
    [
        (lambda raw: raw.pop("units"), "units"),
        (lambda raw: raw["total"][0].pop("source"), "source"),
        (lambda raw: raw["total"][0].update(source="nobody"), "nobody"),
        (lambda raw: raw["total"][0].update(low="1e7 W"), "Marshall"),
        (lambda raw: raw["total"][1].pop("high"), "high"),
        (lambda raw: raw["practice"].update(total="1.1e9 J"), "flash_energy"),
    ],
)
def test_a_damaged_table_is_a_fault_of_ours(monkeypatch, change, reason):
    raw = module.read_table("strikeenergy", "data", "flash_energy.toml")
    change(raw)
    monkeypatch.setattr(module, "read_table", lambda *path: raw)
    module._read.cache_clear()
    try:
        with pytest.raises(DataError, match=reason):
            published("total")
    finally:
        module._read.cache_clear()
