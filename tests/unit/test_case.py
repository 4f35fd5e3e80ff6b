"""Case files: all mistakes at once, each with its line and what to write."""

import random
import re
import tomllib

import pytest

from strikeenergy.case import load_case, make_case, read_case
from strikeenergy.casetext import LARGEST, CaseError, locate

WHOLE = """\
title = "A case"

[flash]
threat = "LPL II"

[[object]]
kind = "conductor"
name = "one"
material = "copper"
section = "16 mm**2"

[[object]]
kind = "sheet"
material = "aluminium"
thickness = "0.7 mm"
"""


def refused(text, **more):
    with pytest.raises(CaseError) as caught:
        read_case(text, "c.toml", **more)
    return str(caught.value).split("\n")


def test_whole_case(registry):
    case = read_case(WHOLE, "c.toml", registry=registry)
    assert (case.title, len(case.objects), case.flash.name) == ("A case", 2, "LPL II")
    assert case.objects[1].name == "sheet 2"
    assert case.standard == "IEC 62305-3:2010"
    assert len(case.sha256) == 64
    assert "2 objects" in repr(case)


MANY = """\
title = 5
colour = "red"
standard = "IEC 1"
[flash]
threat = "LPL V"
[materials."my alloy"]
resistivity = "3e-8 ohm*m"
densty = { value = "2700 kg/m**3", source = "x" }
heat_capacity = { value = "900 J/kg", source = "cert" }
density = { value = "2700 kg/m**3", source = "" }
latent_heat = { value = 397e3, unit = "J/kg", sauce = "x", source = "y" }
melting_temperature = { source = "y" }
expansion = { value = "-1 1/K", source = "y" }
family = "aluminum foil"
[[object]]
kind = "conductor"
name = "a"
material = "coper"
constants = "IEC 60494"
section = "50 mm"
lenght = "3 m"
use = "down conducter"
[[object]]
kind = "sheet"
name = "a"
thickness = "-0.5 mm"
[[object]]
kind = "shet"
[[object]]
name = "no kind"
[[object]]
kind = "conductor"
material = 5
section = "5 mm**2"
form = "sold round"
neighbour = [{ spacing = "0,1 m", spaceing = "1 m" }]
bend = { leg = 5 }
"""


def test_all_mistakes_at_once_with_line_object_and_cure():
    lines = refused(MANY)
    expected = [
        "c.toml:1: title: the title is a text",
        "c.toml:2: colour: unknown key; known: 'title'",
        "c.toml:3: standard: unknown standard 'IEC 1'",
        "c.toml:5: flash.threat: unknown threat 'LPL V'; did you mean",
        "c.toml:7: materials.my alloy.resistivity: value and source are due",
        "c.toml:8: materials.my alloy.densty: unknown property; did you mean 'density'?",
        "c.toml:9: materials.my alloy.heat_capacity: '900 J/kg' is a heat per mass; a specific heat",
        "c.toml:10: materials.my alloy.density: the source is missing",
        "c.toml:11: materials.my alloy.latent_heat.sauce: unknown key; did you mean 'source'",
        "c.toml:12: materials.my alloy.melting_temperature: the value is missing",
        "c.toml:13: materials.my alloy.expansion: coefficient of linear thermal expansion must be above 0",
        "c.toml:14: materials.my alloy.family: unknown material 'aluminum foil'",
        "c.toml:18: object 1 (a).material: unknown material 'coper'; did you mean 'copper'",
        "c.toml:19: object 1 (a).constants: unknown constant set 'IEC 60494'; did you mean 'IEC 60949'?",
        "c.toml:20: object 1 (a).section: '50 mm' is a length; an area such as '50 mm**2' is needed",
        "c.toml:21: object 1 (a).lenght: unknown key; did you mean 'length'?",
        "c.toml:22: object 1 (a).use: unknown use 'down conducter'; did you mean 'down conductor'",
        "c.toml:23: object 2 (a).material: it is missing; give material",
        "c.toml:25: object 2 (a).name: the name 'a' is that of object 1 as well",
        "c.toml:26: object 2 (a).thickness: '-0.5 mm' must be above 0 mm",
        "c.toml:28: object 3.kind: unknown kind 'shet'; did you mean 'sheet'?",
        "c.toml:29: object 4 (no kind): the kind is missing; write kind = one of 'conductor'",
        "c.toml:33: object 5.material: 5 is no material",
        "c.toml:35: object 5.form: 'sold round' is not one of them; did you mean 'solid round'?",
        "c.toml:36: object 5.neighbour 1.spaceing: unknown key; did you mean 'spacing'?",
        "c.toml:36: object 5.neighbour 1.spacing: '0,1 m' has a comma in the number; write '0.1 m'",
        "c.toml:37: object 5.bend.leg: 5 has no unit; write '5 m'",
        "c.toml:37: object 5.bend.span: it is missing",
    ]
    for said in expected:
        assert any(line.startswith(said) for line in lines), said
    assert len(lines) == len(expected), [
        line for line in lines if not any(line.startswith(e) for e in expected)
    ]


@pytest.mark.parametrize(
    ("line", "said"),
    [
        ("section = 50 mm**2", 'c.toml:6: not valid TOML: .*write section = "50 mm\\*\\*2"'),
        ("material = copper", 'c.toml:6: not valid TOML: .*write material = "copper"'),
        ('material = "copper', "c.toml:6: not valid TOML"),
        ('kind = "sheet"', "c.toml:6: not valid TOML: cannot overwrite a value"),
        ("=", "c.toml:6: not valid TOML"),
    ],
)
def test_syntax_errors(line, said):
    (text,) = refused(f'title = "x"\n[flash]\nthreat = "LPL I"\n[[object]]\nkind = "conductor"\n{line}\n')
    assert re.match(said, text), text


@pytest.mark.parametrize(
    ("text", "said"),
    [
        ("", "the flash is missing"),
        ("", "no object is given"),
        ("[flash]\n", "the flash is empty"),
        ("flash = 5\n", "a table is due here"),
        ("object = 5\n", "objects are a list"),
        ("[object]\nkind = 'sheet'\n", "write [[object]] with two brackets"),
        ("object = [1]\n", "a table is due here"),
        ("materials = 1\n", "a table is due here"),
        ("[materials]\nx = 1\n", "a table is due here"),
        ("[flash]\nthreat = 'LPL I'\n[[flash.stroke]]\npeak = '5 kA'\n", "threat and strokes are both given"),
        ("[[flash.stroke]]\npolarity = 'up'\n", "unknown polarity 'up'"),
        ("[[flash.stroke]]\npolarity = 'negative'\n", "no peak, charge or specific energy"),
        ("[flash]\nstroke = 5\n", "[[flash.stroke]]"),
        ("[[flash.stroke]]\npeak = '0 kA'\n", "must be above 0 kA"),
        (
            "[[flash.stroke]]\npeak = '35 kA'\ncharge = '16 C'\nspecific_energy = '650 kJ/ohm'\n",
            "c.toml:4: flash.stroke 1.specific_energy: no current can have this",
        ),
    ],
)
def test_wrong_shapes(text, said):
    assert any(said in line for line in refused(text)), refused(text)


def test_strokes():
    case = read_case(
        "[[flash.stroke]]\npeak='30 kA'\npolarity='negative'\n[[flash.stroke]]\ncharge='100 C'\nduration='0.4 s'\nstart='1 ms'\n[[object]]\nkind='sheet'\nmaterial='copper'\nthickness='1 mm'\n"
    )
    first, second = case.flash.strokes
    assert (first.peak, first.polarity, second.duration, second.start) == (30e3, -1, 0.4, 1e-3)
    assert second.is_long


def test_own_material_is_used():
    text = """
    [flash]
    threat = "LPL I"
    [materials."line alloy"]
    family = "aluminium alloy"
    resistivity = { value = 32.5, unit = "nohm*m", source = "certificate 17" }
    temperature_coefficient = { value = "3.6e-3 1/K", source = "certificate 17" }
    density = { value = "2700 kg/m**3", source = "certificate 17" }
    heat_capacity = { value = "900 J/(kg*K)", source = "handbook" }
    melting_temperature = { value = "620 degC", source = "certificate 17" }
    reference_temperature = { value = "20 degC", source = "certificate 17" }
    [[object]]
    kind = "conductor"
    use = "down conductor"
    material = "line alloy"
    form = "solid round"
    section = "50 mm**2"
    """
    from strikeenergy import estimate

    result = estimate(read_case(text)).objects[0]
    found = result.findings["temperature_rise"]
    assert found.value == pytest.approx(58.997, abs=0.001)
    assert "certificate 17" in found.sources
    assert result.verdicts[0].outcome == "meets"
    assert found.standing == "from memory (high confidence)"  # that of the threat


def test_long_list_is_cut_with_its_count():
    text = WHOLE + "".join(f"wrong{i} = 1\n" for i in range(200))
    lines = refused(text)
    assert len(lines) == 51
    assert lines[-1] == "... and 150 more problems"


def test_files(tmp_path):
    good = tmp_path / "good.toml"
    good.write_text(WHOLE, encoding="utf-8")
    assert load_case(good).title == "A case"
    good.write_bytes(b"\xef\xbb\xbf" + WHOLE.replace("\n", "\r\n").encode())
    assert load_case(good).title == "A case"
    good.write_bytes(WHOLE.encode("utf-16"))
    assert load_case(str(good)).title == "A case"


@pytest.mark.parametrize(
    ("name", "content", "said"),
    [
        ("binary.toml", bytes(range(256)) * 10, "not UTF-8"),
        ("nul.toml", b"a\0b", "binary"),
        ("latin.toml", 'title = "Hütte"\n'.encode("latin-1"), "latin.toml:1: this is not UTF-8"),
        ("large.toml", b"#" * (LARGEST + 2), "larger than 2 MB"),
        ("deep.toml", b"a=" + b"[" * 5000 + b"]" * 5000, "nested too deeply"),
        ("utf16.toml", b"\xff\xfea", "not UTF-8"),
    ],
)
def test_files_that_are_no_cases(tmp_path, name, content, said):
    (tmp_path / name).write_bytes(content)
    with pytest.raises(CaseError, match=said):
        load_case(tmp_path / name)


def test_missing_file_and_directory(tmp_path):
    (tmp_path / "boathouse.toml").write_text(WHOLE)
    with pytest.raises(CaseError, match=r"did you mean .*boathouse\.toml"):
        load_case(tmp_path / "boathose.toml")
    with pytest.raises(CaseError, match="this is a directory"):
        load_case(tmp_path)
    with pytest.raises(CaseError, match="strikeenergy new"):
        load_case(tmp_path / "nowhere" / "x.toml")


def test_overrides():
    assert read_case(WHOLE, threat="LPL IV").flash.name == "LPL IV"
    assert read_case(WHOLE, standard="NFPA 780 Class I").standard == "NFPA 780 Class I"
    assert refused(WHOLE, threat="LPL 7")[0].startswith("--threat: unknown threat")
    assert refused(WHOLE, standard="x")[0].startswith("--standard: unknown standard")


def test_same_text_same_hash():
    assert read_case(WHOLE).sha256 == read_case(WHOLE).sha256 != read_case(WHOLE + "\n").sha256
    data = tomllib.loads(WHOLE)
    assert make_case(data).sha256 == make_case(data).sha256


def test_locate_agrees_with_a_plain_count():
    """Random documents whose lines are known by construction."""
    draw = random.Random(7)
    for _ in range(60):
        lines, where = ['title = "t"'], {("title",): 1}
        for number in range(draw.randint(1, 6)):
            lines += [""] * draw.randint(0, 2) + ["# a comment"] * draw.randint(0, 2)
            lines.append("[[object]]")
            where["object", number] = len(lines)
            for key in draw.sample("abcdef", draw.randint(0, 4)):
                if draw.random() < 0.3:
                    lines += [f"{key} = [", "  1,", "  2,", "]"]
                    where["object", number, key] = len(lines) - 3
                elif draw.random() < 0.3:
                    lines += [f'{key} = """', "[[object]]", '"""']
                    where["object", number, key] = len(lines) - 2
                else:
                    lines.append(f"{key} = {{ x = 1 }}")
                    where["object", number, key] = len(lines)
        text = "\n".join(lines) + "\n"
        for path, line in where.items():
            assert locate(text, path) == line, (path, text)
        assert locate(text, ("object", 0, "missing", "deeper")) == where["object", 0]
        assert locate(text, ("nothing",)) == 1
