"""README and DEVELOPERS say what is true: commands run, outputs are real, names exist."""

import re
import shlex
import tomllib

import pytest

from helpers import ROOT, command

README = (ROOT / "README.md").read_text(encoding="utf-8")
GUIDE = (ROOT / "DEVELOPERS.md").read_text(encoding="utf-8")
CASES = sorted((ROOT / "cases").glob("*.toml"))


@pytest.mark.parametrize("path", CASES, ids=lambda p: p.stem)
def test_every_case_runs_and_says_what_it_shows(path):
    done = command("estimate", path, "--json")
    assert done.returncode in (0, 1), done.stderr
    text = path.read_text(encoding="utf-8")
    assert re.search(r"^# \w", text, re.M)
    assert text.startswith("#:schema ")


def test_readme_opens_with_the_job_and_two_commands():
    body = README.split("\n", 1)[1].strip()
    first, second = body.split("\n\n")[:2]
    assert len(first) > 200
    assert not first.startswith(("#", "`"))
    commands = re.search(r"```sh\n(.*?)```", README, re.S)[1].strip().split("\n")
    commands = [line for line in commands if line and not line.startswith("#")]
    assert len(commands) == 2
    assert "estimate cases/boathouse.toml" in commands[0]
    assert "pytest" in commands[1]
    assert second


def blocks(text, language):
    return re.findall(rf"```{language}\n(.*?)```", text, re.S)


def test_python_example_prints_what_is_shown():
    example, shown = next(b for b in blocks(README, "python") if "load_case" in b), blocks(README, "text")
    lines = []
    exec(example, {"print": lambda *a: lines.append(" ".join(map(str, a)))})
    assert len([line for line in example.splitlines() if line.strip()]) <= 5
    assert "\n".join(lines) in "\n".join(shown)


def test_console_blocks_show_the_real_output():
    found = blocks(README, "console")
    assert found
    for block in found:
        first, *rest = block.rstrip("\n").split("\n")
        assert first.startswith("$ strikeenergy ")
        done = command(*shlex.split(first.removeprefix("$ strikeenergy ")))
        parts = [part.strip("\n") for part in re.split(r"^\[\.\.\.\]$", "\n".join(rest), flags=re.M)]
        assert any(parts)
        for part in parts:
            assert part in done.stdout, part


@pytest.mark.parametrize("text", [README, GUIDE], ids=["README", "DEVELOPERS"])
def test_commands_named_in_the_documents_exist(text):
    known = set(re.findall(r"^  (\w+)  ", command("--help").stdout, re.M))
    named = set(re.findall(r"(?:^|[`/ ])strikeenergy (\w+)", text))
    commands = {name for name in named if not name.startswith("strikeenergy")}
    assert {"estimate", "describe", "new", "schema", "plugins"} <= known
    assert commands & known
    for name in re.findall(r"`strikeenergy (\w+)", text):
        assert name in known, name


def test_paths_named_in_the_guide_exist():
    for path in set(re.findall(r"`((?:strikeenergy|plugins|tests|cases)/[\w./-]+)`", GUIDE)):
        assert (ROOT / path).exists(), path


def test_every_hook_has_a_section_with_its_signature():
    from strikeenergy.plugin import HookSpecs

    hooks = [name for name in vars(HookSpecs) if name.startswith("strikeenergy_")]
    assert len(hooks) == 3
    for name in hooks:
        assert f"### `{name}()" in GUIDE, name


def test_every_plugin_folder_is_packaged_and_declared():
    project = tomllib.loads((ROOT / "pyproject.toml").read_text(encoding="utf-8"))
    folders = sorted(p.name for p in (ROOT / "plugins").iterdir() if (p / "__init__.py").exists())
    packaged = sorted(
        p.split("/")[1] for p in project["tool"]["hatch"]["build"]["targets"]["wheel"]["packages"] if "/" in p
    )
    declared = sorted(project["project"]["entry-points"]["strikeenergy.plugins"].values())
    contract = next(
        c for c in project["tool"]["importlinter"]["contracts"] if c["name"].startswith("a plugin imports")
    )
    assert folders == packaged == declared == sorted(contract["source_modules"])


def test_top_level_holds_nothing_else():
    import subprocess

    tracked = subprocess.run(["git", "ls-files"], capture_output=True, text=True, cwd=ROOT)
    if tracked.returncode:
        pytest.skip("not a git checkout")
    top = {path.split("/")[0] for path in tracked.stdout.split("\n") if path}
    assert {name for name in top if not name.startswith(".")} <= {
        "README.md", "DEVELOPERS.md", "LICENSE", "pyproject.toml", "strikeenergy", "plugins", "tests", "cases",
    }  # fmt: skip
