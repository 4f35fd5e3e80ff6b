"""`strikeenergy record`: what it prints, its exit codes, its plot."""

import csv
import io
import json

import pytest

from helpers import ROOT, command

RECORD = ROOT / "cases" / "mast-shot.csv"
SCALE = ("--scale", "10 kA/V")


def test_json_of_the_contract():
    # The record was made from a 98.5 kA 10/350 current (48.367 C, 2.43986 MJ/ohm), with offset and noise added and cut off.
    data = json.loads(command("record", RECORD, *SCALE, "--json").stdout)
    truth = {
        "peak": 98.5e3,
        "front_time": 10e-6,
        "half_value_time": 350e-6,
        "charge": 48.367,
        "specific_energy": 2.43986e6,
    }
    for name, value in truth.items():
        found = data[name]
        assert set(found) == {"value", "unit", "uncertainty"}
        assert found["value"] == pytest.approx(value, abs=4 * found["uncertainty"]), name
        assert found["uncertainty"] < 0.02 * found["value"], name
    assert {check["name"] for check in data["checks"]} >= {"saturation", "pre-trigger", "tail"}


def test_tolerances_and_exit_codes():
    good = command("record", RECORD, *SCALE, "--spec", "LPL III first positive impulse", "--json")
    assert good.returncode == 0
    assert [t["outcome"] for t in json.loads(good.stdout)["tolerances"]] == ["pass"] * 3
    bad = command("record", RECORD, *SCALE, "--spec", "LPL I first positive impulse", "--text")
    assert bad.returncode == 1
    assert "3 of 3 fail" in bad.stdout
    assert command("record", RECORD, *SCALE, "--spec", "LPL 9").returncode == 3
    assert command("record", RECORD, *SCALE, "--spec", "class H", "--tolerance", "35 %").returncode == 0


def test_text_and_csv():
    text = command("record", RECORD, *SCALE, "--text").stdout
    assert max(map(len, text.splitlines())) <= 80
    assert "± " in text
    assert "cut tail, not added" in text
    rows = list(csv.DictReader(io.StringIO(command("record", RECORD, *SCALE).stdout)))
    assert [row["quantity"] for row in rows][:2] == ["peak", "front_time"]


@pytest.mark.parametrize(
    ("arguments", "said"),
    [
        ((RECORD,), "give scale"),
        ((RECORD, *SCALE, "--channel", "9"), "9"),
        ((ROOT / "cases" / "nothing.csv",), "nothing.csv"),
        ((ROOT / "cases",), "this is a folder"),
        ((RECORD, "--scale", "10 kg"), "scale"),
        ((RECORD, *SCALE, "--baseline", "1 s", "2 s"), "baseline"),
    ],
)
def test_refused(arguments, said):
    done = command("record", *arguments)
    assert done.returncode == 3
    assert said in done.stderr
    assert "Traceback" not in done.stderr


def test_plot(tmp_path):
    target = tmp_path / "out.svg"
    assert command("record", RECORD, *SCALE, "--plot", target, "--json").returncode == 0
    first = target.read_bytes()
    assert first.startswith(b"<?xml")
    assert command("record", RECORD, *SCALE, "--plot", target, "--json").returncode == 2
    assert command("record", RECORD, *SCALE, "--plot", target, "--json", "--force").returncode == 0
    assert target.read_bytes() == first
