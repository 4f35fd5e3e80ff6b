"""The worked third-party plugin of DEVELOPERS.md: built, installed, found, run and reported like a built-in."""

import json
import os
import subprocess
import sys
from pathlib import Path

import pytest

from helpers import ROOT, process

EXAMPLE = ROOT / "tests" / "example_plugin"


@pytest.fixture(scope="module")
def installed(tmp_path_factory):
    """Install the package beside the program, with the tools at hand and without a network."""
    target = tmp_path_factory.mktemp("site")
    done = subprocess.run(
        [sys.executable, "-m", "pip", "install", "-q", "--no-deps", "--no-build-isolation", "--no-index", "--target", str(target), str(EXAMPLE)],
        capture_output=True,
        text=True,
        env={**os.environ, "PIP_DISABLE_PIP_VERSION_CHECK": "1"},
    )  # fmt: skip
    assert done.returncode == 0, done.stderr
    return {"PYTHONPATH": str(target)}


def test_found(installed):
    data = json.loads(process("plugins", "--json", env=installed).stdout)
    fence = next(p for p in data["plugins"] if p["name"] == "fence")
    assert (fence["distribution"], fence["version"], fence["kinds"]) == (
        "strikeenergy-fence",
        "1.0",
        ["fence"],
    )
    assert not data["failures"]


def test_from_new_to_a_result(installed, tmp_path):
    case = tmp_path / "fence.toml"
    assert process("new", "fence", "-o", case, env=installed).returncode == 0
    done = process("estimate", case, "--json", env=installed)
    assert done.returncode == 0, done.stderr
    result = json.loads(done.stdout)
    # LPL I, a tenth of the current: 20 kA over 50 m at 0.05 ohm/m; W/R is a hundredth
    findings = result["objects"][0]["findings"]
    assert findings["voltage_along"]["value"] == pytest.approx(50e3)
    assert findings["heat"]["value"] == pytest.approx(250e3)
    assert findings["heat"]["sources"][0] == "Ohm's law and Joule's law"
    assert result["software"]["plugins"]["fence"] == "strikeenergy-fence 1.0"
    text = process("estimate", case, "--notes", env=installed).stdout
    assert "voltage along" in text
    assert "U = I·r·l" in text
    assert "inductive part" in text


def test_described_and_in_the_schema(installed):
    assert "resistance per length of the wires" in process("describe", "fence", env=installed).stdout.lower()
    assert "fence" in json.loads(process("schema", env=installed).stdout)["$defs"]


def test_meets_the_conformance_tests(installed):
    done = subprocess.run(
        [
            sys.executable,
            "-m",
            "pytest",
            "-q",
            "-k",
            "fence",
            str(ROOT / "tests" / "conformance" / "test_installed_plugins.py"),
        ],
        capture_output=True,
        text=True,
        cwd=ROOT,
        env={**os.environ, **installed},
    )
    assert done.returncode == 0, done.stdout
    assert " passed" in done.stdout


def test_developers_guide_shows_the_file_that_is_tested():
    guide = (ROOT / "DEVELOPERS.md").read_text(encoding="utf-8")
    for name in ("pyproject.toml", "strikeenergy_fence/__init__.py"):
        assert (EXAMPLE / name).read_text(encoding="utf-8").strip() in guide, name
    assert Path(EXAMPLE / "pyproject.toml").exists()
