"""Plugins: found, loaded, isolated; a broken one is recorded with its stage and the rest goes on."""

import sys
import textwrap
from importlib.metadata import EntryPoint

import pytest

from helpers import one
from strikeenergy import estimate, make_case
from strikeenergy.errors import ExitCode, PluginError
from strikeenergy.registry import GROUP, kind_name, load

GOOD = """
from dataclasses import dataclass
from typing import Annotated, Literal
from strikeenergy.api import Finding, Findings, StruckObject, Unit, Quantity, Value, effect, hookimpl
STRIKEENERGY_API = 1
class Kite(StruckObject):
    '''A kite on a wet line.'''
    kind: Literal["kite"] = "kite"
    line: Annotated[Quantity, Unit("m", gt=0, typical=(10, 100))] = 30.0
    '''Length of the line.'''
@dataclass(frozen=True)
class Pull(Findings):
    pull: Annotated[Value, Finding("N", "pull of the line")]
@effect(Kite)
def pull(kite, flash, note) -> Pull:
    '''Pull.'''
    return Pull({value})
@hookimpl
def strikeenergy_kinds():
    return [Kite]
@hookimpl
def strikeenergy_effects():
    return [pull]
"""


@pytest.fixture
def plugin(tmp_path, monkeypatch):
    """Write a plugin module and return its entry point."""
    monkeypatch.syspath_prepend(tmp_path)
    made = []

    def write(name, text):
        module = f"made_{name}_{tmp_path.name.replace('-', '_')}"
        (tmp_path / f"{module}.py").write_text(textwrap.dedent(text), encoding="utf-8")
        made.append(module)
        return EntryPoint(name, module, GROUP)

    yield write
    for module in made:
        sys.modules.pop(module, None)


def built_in():
    from importlib.metadata import entry_points

    return [point for point in entry_points(group=GROUP) if point.dist.name == "strikeenergy"]


def test_built_ins_come_by_the_same_group(registry):
    assert {"conductor", "sheet", "tree"} <= set(registry.kinds)
    assert [p.name for p in registry.plugins] == sorted(p.name for p in registry.plugins)
    assert registry.versions()["conductor"].startswith("strikeenergy ")


def test_a_plugin_is_run_like_a_built_in(plugin):
    registry = load([*built_in(), plugin("kite", GOOD.replace("{value}", "5.0 * flash.peak / flash.peak"))])
    assert not registry.failures
    result = one(registry, kind="kite")
    assert result["pull"].magnitude == 5.0
    assert kind_name(type(result.thing)) == "kite"


BROKEN = {
    "import": ("import", "raise RuntimeError('cannot find the wind')", "RuntimeError: cannot find the wind"),
    "exit": ("import", "import sys; sys.exit(3)", "SystemExit: 3"),
    "syntax": ("import", "def (", "SyntaxError"),
    "no api": ("register", "x = 1", "STRIKEENERGY_API = None"),
    "new api": ("register", "STRIKEENERGY_API = 99", "speaks version 1"),
    "unknown hook": (
        "register",
        "from strikeenergy.api import hookimpl\nSTRIKEENERGY_API = 1\n@hookimpl\ndef strikeenergy_kind(): return []",
        "unknown hook 'strikeenergy_kind'",
    ),
    "wrong arguments": (
        "register",
        "from strikeenergy.api import hookimpl\nSTRIKEENERGY_API = 1\n@hookimpl\ndef strikeenergy_kinds(wind): return []",
        "PluginValidationError",
    ),
    "listing": (
        "list",
        "from strikeenergy.api import hookimpl\nSTRIKEENERGY_API = 1\n@hookimpl\ndef strikeenergy_kinds(): 1/0",
        "ZeroDivisionError",
    ),
    "not a kind": (
        "register",
        "from strikeenergy.api import hookimpl\nSTRIKEENERGY_API = 1\n@hookimpl\ndef strikeenergy_kinds(): return [int]",
        "no StruckObject",
    ),
    "not an effect": (
        "register",
        "from strikeenergy.api import hookimpl\nSTRIKEENERGY_API = 1\n@hookimpl\ndef strikeenergy_effects(): return [len]",
        "not declared with @effect",
    ),
    "not a table": (
        "register",
        "from strikeenergy.api import hookimpl\nSTRIKEENERGY_API = 1\n@hookimpl\ndef strikeenergy_tables(): return [1]",
        "no mapping",
    ),
}


@pytest.mark.parametrize("name", BROKEN)
def test_a_broken_plugin_is_recorded_and_the_rest_goes_on(plugin, name):
    stage, text, said = BROKEN[name]
    registry = load([plugin(name.replace(" ", "_"), text), *built_in()])
    assert [(f.stage, f.plugin) for f in registry.failures] == [(stage, name.replace(" ", "_"))]
    assert said in registry.failures[0].reason
    assert registry.failures[0].distribution == "unknown distribution"
    case = make_case(
        {
            "flash": {"threat": "LPL I"},
            "object": [{"kind": "conductor", "material": "copper", "section": "16 mm**2"}],
        },
        registry=registry,
    )
    result = estimate(case)
    assert result.exit_code is ExitCode.PLUGIN
    assert result.objects[0].findings["temperature_rise"].value == pytest.approx(309.06, abs=0.01)
    assert result.to_dict()["failures"][0]["stage"] == stage


COMPUTING = {
    "raises": ("1/0", "ZeroDivisionError"),
    "exits": ("exit(1)", "SystemExit"),
    "not finite": ("float('nan')", "not a finite number"),
    "a word": ("'strong'", "declared in N"),
    "missing package": ("__import__('no_such_package')", "ModuleNotFoundError"),
}


@pytest.mark.parametrize("name", COMPUTING)
def test_a_plugin_that_fails_while_computing(plugin, name):
    value, said = COMPUTING[name]
    registry = load([*built_in(), plugin("kite", GOOD.replace("{value}", value))])
    case = make_case(
        {
            "flash": {"threat": "LPL I"},
            "object": [{"kind": "kite"}, {"kind": "sheet", "material": "copper", "thickness": "1 mm"}],
        },
        registry=registry,
    )
    result = estimate(case)
    kite, sheet = result.objects
    assert [f.stage for f in kite.failures] == ["compute"]
    assert said in kite.failures[0].reason
    assert sheet.findings["melted_volume_bound"].value > 0
    assert result.exit_code is ExitCode.PLUGIN


def test_returning_another_class_is_a_failure(plugin):
    registry = load([plugin("kite", GOOD.replace("return Pull({value})", "return None"))])
    assert "returned NoneType" in one(registry, kind="kite").failures[0].reason


def test_clash_of_names_names_both(plugin):
    clash = GOOD.replace("{value}", "1.0")
    registry = load([plugin("a", clash), plugin("b", clash), plugin("b", clash)])
    reasons = [str(f) for f in registry.failures]
    assert any("kind kite is already brought by plugin a" in text for text in reasons)
    assert any("effect kite.pull is already brought by plugin a" in text for text in reasons)
    assert any("the name 'b' is taken" in text for text in reasons)
    assert one(registry, kind="kite")["pull"].magnitude == 1.0


def test_effect_on_a_kind_of_somebody_else(plugin):
    text = """
    from dataclasses import dataclass
    from typing import Annotated
    from strikeenergy.api import Finding, Findings, Value, effect, hookimpl
    from strikeenergy_sheet import Sheet
    STRIKEENERGY_API = 1
    @dataclass(frozen=True)
    class Noise(Findings):
        loudness: Annotated[Value, Finding("", "how loud it is")]
    @effect(Sheet)
    def noise(sheet, flash, note) -> Noise:
        return Noise(11.0)
    @hookimpl
    def strikeenergy_effects():
        return [noise]
    """
    registry = load([*built_in(), plugin("noise", text)])
    result = one(registry, kind="sheet", material="copper", thickness="1 mm")
    assert result.findings["loudness"].value == 11.0
    assert "melted_volume_bound" in result.findings


def test_two_effects_may_not_bring_one_finding(plugin):
    text = """
    from dataclasses import dataclass
    from typing import Annotated
    from strikeenergy.api import Finding, Findings, Value, effect, hookimpl
    from strikeenergy_sheet import Sheet
    STRIKEENERGY_API = 1
    @dataclass(frozen=True)
    class Other(Findings):
        root_energy: Annotated[Value, Finding("J", "another opinion")]
    @effect(Sheet)
    def other(sheet, flash, note) -> Other:
        return Other(1.0)
    @hookimpl
    def strikeenergy_effects():
        return [other]
    """
    registry = load([*built_in(), plugin("zother", text)])
    assert (
        "the finding 'root_energy' is already brought by plugin sheet (strikeenergy)"
        in registry.failures[0].reason
    )


def test_undeclared_finding_is_refused_where_it_is_written():
    from strikeenergy.plugin import effect

    with pytest.raises(TypeError, match="must be annotated to return"):

        @effect(object)
        def nothing(thing, flash, note) -> int:
            return 1


def test_wanted_plugins_only(monkeypatch):
    monkeypatch.setenv("STRIKEENERGY_PLUGINS", "sheet, tree")
    assert [p.name for p in load().plugins] == ["sheet", "tree"]
    monkeypatch.setenv("STRIKEENERGY_PLUGINS", "none")
    assert load().plugins == []


def test_table_from_a_plugin(plugin):
    text = """
    from strikeenergy.api import hookimpl
    STRIKEENERGY_API = 1
    @hookimpl
    def strikeenergy_tables():
        return [{
            "name": "House rule", "standard": "House rule 1", "clause": "rule", "title": "t", "kind": "conductor",
            "quantity": "section", "use": ["down conductor"],
            "defaults": {"source": "engineering", "standing": "assumed"},
            "check": [{"name": "minimum section", "row": [{"material": "copper", "minimum": "95 mm**2"}]}],
        }]
    """
    registry = load([*built_in(), plugin("rule", text)])
    result = one(
        registry,
        kind="conductor",
        material="copper",
        section="50 mm**2",
        form="solid tape",
        use="down conductor",
    )
    found = next(v for v in result.verdicts if v.standard == "House rule 1")
    assert (found.outcome, found.counts) == ("falls short", False)


def test_damaged_table_of_a_plugin_does_not_stop_the_others(plugin):
    text = """
    from strikeenergy.api import hookimpl
    STRIKEENERGY_API = 1
    @hookimpl
    def strikeenergy_tables():
        return [{"name": "Half a table"}]
    """
    registry = load([*built_in(), plugin("half", text)])
    assert [f.stage for f in registry.failures] == ["register"]
    assert "Half a table" in registry.failures[0].reason
    result = one(
        registry,
        kind="conductor",
        material="copper",
        section="50 mm**2",
        form="solid tape",
        use="down conductor",
    )
    assert result.outcome == "meets"


def test_plugin_error_text():
    error = PluginError("p", "d", "list", "why")
    assert str(error) == "plugin p (d) failed to list: why"
    assert error.exit_code is ExitCode.PLUGIN


def test_a_plugin_cannot_throw_out_a_built_in_kind_by_its_name(plugin):
    # "aaa" sorts before "conductor": the built-in ones are loaded first all the same.
    thief = GOOD.replace("{value}", "1.0").replace('"kite"', '"conductor"')
    registry = load([*built_in(), plugin("aaa", thief)])
    told = [str(failure) for failure in registry.failures]
    assert any("kind conductor is already brought by plugin conductor" in text for text in told)
    result = one(registry, kind="conductor", material="copper", section="50 mm**2")
    assert "temperature_rise" in result.findings
