"""The command line, as a person would use it: every command, its exit code, what goes where."""

import json
import os
import re
import shlex
import subprocess
import sys

import pytest

from helpers import ROOT, as_json, command, process

CASE = ROOT / "cases" / "boathouse.toml"


@pytest.mark.parametrize("arguments", [["--help"], ["--version"], ["estimate", "--help"], ["new", "--help"]])
def test_help_is_light(arguments):
    script = (
        "import sys\nfrom strikeenergy.__main__ import main\n"
        f"sys.argv[1:] = {arguments!r}\n"
        "try:\n    main()\nexcept SystemExit:\n    pass\n"
        "heavy = {'numpy', 'scipy', 'pint', 'pydantic', 'matplotlib', 'openpyxl', 'rich'} & set(sys.modules)\n"
        "assert not heavy, heavy\n"
    )
    done = subprocess.run([sys.executable, "-c", script], capture_output=True, text=True, cwd=ROOT)
    assert done.returncode == 0, done.stderr
    assert "strikeenergy" in done.stdout


def test_importing_the_package_is_light():
    script = "import strikeenergy, sys; assert not {'numpy', 'pint', 'pydantic'} & set(sys.modules); print(dir(strikeenergy))"
    done = subprocess.run([sys.executable, "-c", script], capture_output=True, text=True, cwd=ROOT)
    assert done.returncode == 0, done.stderr
    assert "load_case" in done.stdout


def test_public_names_exist():
    import strikeenergy

    for name in strikeenergy.__all__:
        assert getattr(strikeenergy, name) is not None
    with pytest.raises(AttributeError, match="no attribute 'lightening'"):
        _ = strikeenergy.lightening


def test_estimate_text_json_csv_notes():
    text = command("estimate", CASE, "--text")
    assert text.returncode == 0, text.stderr
    assert "5 objects" in text.stdout
    assert "\x1b[" not in text.stdout
    assert json.loads(command("estimate", CASE, "--json").stdout)["objects"][1]["name"] == "ridge rod"
    piped = command("estimate", CASE)
    assert piped.stdout.startswith("object,kind,record")
    assert piped.stdout == command("estimate", CASE, "--csv").stdout
    notes = command("estimate", CASE, "--notes")
    assert "CALCULATION NOTES" in notes.stdout
    assert "notes" in json.loads(command("estimate", CASE, "--json", "--notes").stdout)
    assert command("estimate", CASE, "--csv", "--notes").returncode == 2


def test_as_a_process_of_its_own():
    done = process("estimate", CASE, "--json")
    assert done.returncode == 0
    assert done.stdout == command("estimate", CASE, "--json").stdout
    assert process("--version").stdout.startswith("strikeenergy ")
    bad = process("estimate", "-", stdin=b"\xff\xfe\x00binary\x00")
    assert bad.returncode == 3
    assert b"Traceback" not in bad.stderr


def test_standard_input():
    text = CASE.read_text(encoding="utf-8")
    assert as_json("estimate", "-", stdin=text)["case"] == as_json("estimate", CASE)["case"]
    bad = command("estimate", "-", stdin="colour = 1\n")
    assert bad.returncode == 3
    assert bad.stderr.startswith("<stdin>:1: ")


def test_from_new_to_a_verdict_in_two_commands(tmp_path):
    for kind in ("conductor", "sheet", "tree"):
        made = command("new", kind, "-o", tmp_path / f"{kind}.toml")
        assert made.returncode == 0, made.stderr
        done = command("estimate", tmp_path / f"{kind}.toml", "--text")
        assert done.returncode in (0, 1), done.stderr
        assert "Cautions" in done.stdout


def test_every_commented_line_of_a_new_case_works():
    """Take each commented key of [[object]] in turn and use it: the case still runs or says what clashes."""
    text = command("new", "conductor").stdout
    lines = text.splitlines()
    tried = 0
    for number, line in enumerate(lines):
        match = re.match(r"# (\w+) = ([^|]*?)(?: \| .*)?(?:    # .*)?$", line)
        if (
            not match
            or number < lines.index("[[object]]")
            or any(c.startswith("# [") for c in lines[lines.index("[[object]]") : number])
        ):
            continue
        used = [*lines]
        used[number] = f"{match[1]} = {match[2]}"
        done = command("estimate", "-", "--json", stdin="\n".join(used))
        assert (
            done.returncode in (0, 1)
            or "more than once" in done.stderr
            or "belong together" in done.stderr
            or "does not go with" in done.stderr
        ), done.stderr
        tried += 1
    assert tried > 8


def test_new_does_not_overwrite(tmp_path):
    target = tmp_path / "x.toml"
    target.write_text("mine")
    refused = command("new", "sheet", "-o", target)
    assert (refused.returncode, target.read_text()) == (2, "mine")
    assert command("new", "sheet", "-o", target, "--force").returncode == 0
    assert "thickness" in target.read_text(encoding="utf-8")
    assert command("new", "sheet", "-o", tmp_path / "no" / "x.toml").returncode == 2
    assert [p.name for p in tmp_path.iterdir()] == ["x.toml"]


@pytest.mark.parametrize(
    ("arguments", "said"),
    [
        ([], "conductor"),
        (["kinds"], "effects"),
        (["conductor"], "What it is made of"),
        (["kind", "sheet"], "melted_volume_bound"),
        (["tree"], "channel"),
        (["materials"], "IEC 60949"),
        (["material", "copper"], "from memory (high confidence)"),
        (["material", "lead"], "lead in IEC 60949"),
        (["material", "titanium"], "No constant set"),
        (["threats"], "LPL IV"),
        (["threat", "LPL I"], "Table 3"),
        (["threat", "LPL I subsequent impulse"], "0.25/100"),
        (["threat", "LPL I"], "short_charge 100 C positive: 9.1 %"),
        (["threat", "component A"], "first return stroke"),
        (["shapes"], "Heidler"),
        (["populations"], "CIGRE TB 63"),
        (["population", "IEC 62305-1"], "correlation"),
        (["specifications"], "class H"),
        (["specification", "class H"], "90 kA to 110 kA"),
        (["tables"], "Table 6"),
        (["table", "IEC 62305-3:2010 Table 6"], "note b"),
        (["table", "nfpa 780 class i materials"], "29 mm²"),
        (["standards"], "decides"),
        (["sources"], "IEC 62305-1:2010"),
    ],
)
def test_describe(arguments, said):
    done = command("describe", *arguments)
    assert done.returncode == 0, done.stderr
    assert said.lower() in " ".join(done.stdout.lower().split())
    assert max(map(len, done.stdout.splitlines())) <= 80
    told = json.loads(command("describe", *arguments, "--json").stdout)
    assert told["sections"][0]["title"]


@pytest.mark.parametrize(
    ("arguments", "code", "said"),
    [
        (["estimate"], 2, "Missing argument"),
        (["estimat"], 2, "Did you mean 'estimate'"),
        (["estimate", "x", "--jsn"], 2, "Did you mean"),
        (["estimate", "nothing.toml"], 3, "no such file"),
        (["estimate", "cases"], 3, "directory"),
        (["describe", "thret"], 3, "did you mean 'threat'"),
        (["describe", "material", "coper"], 3, "did you mean 'copper'"),
        (["describe", "threat", "LPL"], 3, "did you mean"),
        (["describe", "table", "Table 66"], 3, "unknown table"),
        (["new", "shet"], 3, "did you mean 'sheet'"),
        (["estimate", CASE, "--threat", "LPL X"], 3, "--threat"),
        (["estimate", CASE, "--standard", "IEC"], 3, "--standard"),
    ],
)
def test_mistakes(arguments, code, said):
    done = command(*arguments)
    assert done.returncode == code
    assert said in done.stderr
    assert done.stdout == ""
    assert "Traceback" not in done.stderr


def test_no_arguments_show_help():
    assert "Usage" in command().stdout + command().stderr


def test_threat_and_standard_from_the_command_line():
    assert as_json("estimate", CASE, "--threat", "LPL IV")["flash"]["peak"]["value"] == 100e3
    other = as_json("estimate", CASE, "--standard", "NFPA 780 Class I")
    assert {
        v["standard"] for o in other["objects"] for v in o["verdicts"] if v["counts"] and v["sort"] == "size"
    } == {"NFPA 780 Class I"}


def test_falls_short(tmp_path):
    case = tmp_path / "thin.toml"
    case.write_text(
        '[flash]\nthreat = "LPL I"\n[[object]]\nkind = "conductor"\nuse = "down conductor"\nmaterial = "copper"\nsection = "10 mm**2"\n'
    )
    assert command("estimate", case, "--text").returncode == 1


def test_no_model_covers_it(tmp_path):
    case = tmp_path / "ti.toml"
    case.write_text(
        '[flash]\nthreat = "LPL I"\n[[object]]\nkind = "sheet"\nmaterial = "titanium"\nthickness = "1 mm"\n'
    )
    assert command("estimate", case, "--json").returncode == 4


def test_schema_accepts_every_case_and_refuses_mistakes():
    jsonschema = pytest.importorskip("jsonschema")
    import tomllib

    schema = json.loads(command("schema").stdout)
    validator = jsonschema.Draft202012Validator(schema)
    for case in sorted((ROOT / "cases").glob("*.toml")):
        validator.validate(tomllib.loads(case.read_text(encoding="utf-8")))
    for kind in ("conductor", "sheet", "tree"):
        validator.validate(tomllib.loads(command("new", kind).stdout))
    wrong = {
        "flash": {"threat": "LPL V"},
        "object": [{"kind": "conductor", "material": "copper", "lenght": "1 m"}],
    }
    assert len(list(validator.iter_errors(wrong))) == 2


def test_plugins():
    done = command("plugins")
    assert done.returncode == 0
    assert "effects conductor.heating" in " ".join(done.stdout.split())
    assert [p["name"] for p in json.loads(command("plugins", "--json").stdout)["plugins"]] == [
        "conductor",
        "sheet",
        "tree",
    ]


def test_a_fault_of_ours_has_its_own_code_and_no_traceback():
    script = (
        "import sys, strikeenergy.cli as c\n"
        "import strikeenergy.engine as e\n"
        "e.estimate = lambda case: 1 / 0\n"
        f"sys.exit(c.run(['estimate', {str(CASE)!r}]))\n"
    )
    done = subprocess.run([sys.executable, "-c", script], capture_output=True, text=True, cwd=ROOT)
    assert done.returncode == 70
    assert "fault of the program" in done.stderr
    assert "Traceback" not in done.stderr
    loud = subprocess.run(
        [sys.executable, "-c", script],
        capture_output=True,
        text=True,
        cwd=ROOT,
        env={**os.environ, "STRIKEENERGY_TRACEBACK": "1"},
    )
    assert "Traceback" in loud.stderr


def test_closed_pipe_is_quiet():
    done = subprocess.run(
        f"{sys.executable} -m strikeenergy estimate {CASE} --text | head -1",
        shell=True,
        capture_output=True,
        text=True,
        cwd=ROOT,
    )
    assert done.stdout.strip() == "Boathouse on the lake"
    assert "Traceback" not in done.stderr


def test_another_encoding_of_the_console_does_not_matter():
    done = subprocess.run(
        [sys.executable, "-m", "strikeenergy", "estimate", str(CASE), "--text"],
        capture_output=True,
        cwd=ROOT,
        env={**os.environ, "PYTHONIOENCODING": "cp1252"},
    )
    assert done.returncode == 0, done.stderr
    assert "MJ/Ω" in done.stdout.decode("utf-8")


def test_help_examples_run(tmp_path):
    """Every example that a command's help shows does what it says."""
    for name in ("estimate", "record", "new", "describe", "schema", "plugins"):
        shown = command(name, "--help").stdout
        examples = re.findall(r"^\s+strikeenergy (.*)$", shown.split("Example")[1], re.M)
        assert examples, name
        for example in examples:
            done = command(*shlex.split(example.replace("-o ", f"-o {tmp_path}/")))
            assert done.returncode == 0, (example, done.stderr)
