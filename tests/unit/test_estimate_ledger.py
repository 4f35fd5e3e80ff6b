"""The ledger of an estimate: what the effects declare as energy, beside the published range of a flash."""

import pytest

from helpers import ROOT
from strikeenergy import estimate, load_case, make_case
from strikeenergy.case import CaseError
from strikeenergy.report.text import estimate_text


@pytest.fixture(scope="module")
def boathouse():
    return estimate(load_case(ROOT / "cases" / "boathouse.toml"))


def test_every_sort_of_energy_is_entered(boathouse):
    entries = {e.object: e for e in boathouse.ledger.entries}
    assert {e.sort for e in entries.values()} == {"ohmic", "arc root", "channel"}
    copper = entries["west down conductor"]
    assert copper.energy == boathouse["west down conductor"].findings["dissipated_energy"].value
    oak = boathouse["oak by the slipway"].findings["channel_energy_per_length"]
    assert entries["oak by the slipway"].high == pytest.approx(oak.high * 18.0)


def test_published_range_contains_the_figure_of_the_trade(boathouse):
    # 1.1e9 J for a flash: common practice, no source
    assert boathouse.ledger.low < 1.1e9 < boathouse.ledger.high
    told = boathouse.to_dict()["ledger"]["common_practice"]
    assert told["standing"] == "common practice, no source"
    assert told["low"] == 1.1e9


def test_conductors_take_a_small_share(boathouse):
    entry = next(e for e in boathouse.ledger.entries if e.object == "ridge rod")
    low, high = boathouse.ledger.share(entry)
    assert 0 < low < high < 0.1


def test_text_says_what_it_is_not_good_for(boathouse):
    text = " ".join(estimate_text(boathouse).split())
    assert "say nothing usable about an object" in text
    assert "ruler 50 m" in text


SHEET = {"kind": "sheet", "material": "copper", "thickness": "1 mm"}


def test_channel_of_the_case():
    data = {
        "flash": {"threat": "LPL I"},
        "object": [SHEET],
        "ledger": {"height": "2 km", "ruler": "10 m", "dimension": 1.15},
    }
    ledger = estimate(make_case(data)).ledger
    # L = H (H/eps)^(D-1)
    assert ledger.length == pytest.approx(2000 * 200**0.15)


@pytest.mark.parametrize(
    ("ledger", "said"),
    [
        ({"height": "0 km"}, "above 0 m"),
        ({"ruler": "5 km"}, "ruler is longer"),
        ({"dimension": 2.0}, "below 2"),
        ({"hight": "2 km"}, "did you mean 'height'"),
    ],
)
def test_refused(ledger, said):
    with pytest.raises(CaseError, match=said):
        make_case({"flash": {"threat": "LPL I"}, "object": [SHEET], "ledger": ledger})


def test_no_energy_no_ledger():
    thing = {"kind": "conductor", "material": "copper", "section": "50 mm**2"}
    result = estimate(make_case({"flash": {"threat": "LPL I"}, "object": [thing]}))
    assert result.ledger is None
    assert result.to_dict()["ledger"] is None
