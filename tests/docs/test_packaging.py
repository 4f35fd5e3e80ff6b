"""The wheel and the editable install: everything is in them, data files included, and it runs from there."""

import json
import os
import subprocess
import sys
import zipfile

import pytest

from helpers import ROOT

PIP = [sys.executable, "-m", "pip", "--disable-pip-version-check", "-q"]


@pytest.fixture(scope="module")
def wheel(tmp_path_factory):
    folder = tmp_path_factory.mktemp("wheel")
    done = subprocess.run(
        [*PIP, "wheel", "--no-deps", "--no-build-isolation", "--no-index", "-w", str(folder), str(ROOT)],
        capture_output=True,
        text=True,
    )
    assert done.returncode == 0, done.stderr
    (built,) = folder.glob("strikeenergy-*.whl")
    return built


def run_in(site, *arguments):
    """Run the program as installed in a folder, from elsewhere, with the source tree out of reach."""
    code = "import sys; sys.path.insert(0, sys.argv.pop(1)); from strikeenergy.__main__ import main; main()"
    return subprocess.run(
        [sys.executable, "-c", code, str(site), *map(str, arguments)],
        capture_output=True,
        text=True,
        cwd=site,
        env={**os.environ, "PYTHONPATH": str(site)},
    )


def test_wheel_holds_every_file_of_every_package(wheel):
    inside = set(zipfile.ZipFile(wheel).namelist())
    for folder, top in (
        (ROOT / "strikeenergy", ROOT),
        *((p, p.parent) for p in (ROOT / "plugins").iterdir() if p.is_dir()),
    ):
        for path in folder.rglob("*"):
            if path.is_file() and "__pycache__" not in path.parts:
                assert path.relative_to(top).as_posix() in inside, path
    assert not any(name.startswith(("tests", "plugins")) for name in inside)
    assert any(name.endswith("licenses/LICENSE") for name in inside)


def test_wheel_runs(wheel, tmp_path):
    done = subprocess.run(
        [*PIP, "install", "--no-deps", "--no-index", "--target", str(tmp_path), str(wheel)],
        capture_output=True,
        text=True,
    )
    assert done.returncode == 0, done.stderr
    where = subprocess.run(
        [sys.executable, "-c", "import strikeenergy; print(strikeenergy.__file__)"],
        capture_output=True,
        text=True,
        cwd=tmp_path,
        env={**os.environ, "PYTHONPATH": str(tmp_path)},
    )
    assert where.stdout.startswith(str(tmp_path))
    listed = json.loads(run_in(tmp_path, "plugins", "--json").stdout)
    assert [p["name"] for p in listed["plugins"]] == ["conductor", "sheet", "tree"]
    result = run_in(tmp_path, "estimate", ROOT / "cases" / "boathouse.toml", "--json")
    assert result.returncode == 0, result.stderr
    assert len(json.loads(result.stdout)["objects"]) == 5


def test_editable_install_puts_both_roots_on_the_path(tmp_path):
    """An editable wheel is a path file of two folders, which editors and type checkers can follow."""
    code = "from hatchling.build import build_editable; import sys; print(build_editable(sys.argv[1]))"
    done = subprocess.run(
        [sys.executable, "-c", code, str(tmp_path)], capture_output=True, text=True, cwd=ROOT
    )
    assert done.returncode == 0, done.stderr
    archive = zipfile.ZipFile(tmp_path / done.stdout.strip().split("\n")[-1])
    (path_file,) = [name for name in archive.namelist() if name.endswith(".pth")]
    roots = archive.read(path_file).decode().split()
    assert {str(ROOT), str(ROOT / "plugins")} <= {r.rstrip("/") for r in roots}
    site = tmp_path / "site"
    site.mkdir()
    archive.extractall(site)
    script = (
        "import site, sys; site.addsitedir(sys.argv.pop(1));"
        "from strikeenergy.__main__ import main; import strikeenergy_tree; main()"
    )
    ran = subprocess.run(
        [sys.executable, "-c", script, str(site), "plugins", "--json"],
        capture_output=True,
        text=True,
        cwd=tmp_path,
    )
    assert ran.returncode == 0, ran.stderr
