"""The string that is printed, read back, gives the number that was computed."""

import math
import re

import pytest
from hypothesis import given
from hypothesis import strategies as st

from strikeenergy import physics
from strikeenergy.note import Formula
from strikeenergy.physics import adiabatic, arcroot, channel, magnetics

LAWS = [
    (f"{module.__name__.rsplit('.', 1)[-1]}.{name}", law)
    for module in (adiabatic, magnetics, arcroot, channel)
    for name, law in vars(module).items()
    if isinstance(law, Formula)
]


def reread(text, values):
    """Evaluate the printed text with Python's own grammar: an independent reading of it."""
    text = (
        text.replace("·", "*").replace("−", "-").replace("^", "**").replace("√", "sqrt").replace("µ0", "mu0")
    )
    text = text.replace("ln(", "log(").replace("π", "pi").replace("max(", "max(").replace("min(", "min(")
    scope = {"exp": math.exp, "log": math.log, "sqrt": math.sqrt, "pi": math.pi, "mu0": 4e-7 * math.pi}
    scope |= {"max": max, "min": min, "asinh": math.asinh, "atan": math.atan}
    assert not re.search(r"[^\w\s.*/+\-(),]", text), text
    return eval(text, {"__builtins__": {}}, scope | values)


def test_there_are_laws():
    assert len(LAWS) > 15
    assert physics.__doc__


@pytest.mark.parametrize(("name", "law"), LAWS)
@given(data=st.data())
def test_printed_is_computed(name, law, data):
    values = {n: data.draw(st.floats(0.3, 2.0), label=n) for n in law.names}
    if "MELTED_FRACTION" in name:
        values["W_full"] = values["W_on"] + values["W_full"]
    if name.endswith((".BEND", "MELTED_VOLUME_BOUND")):
        values |= {k: values[k] + 3.0 for k in ("x2", "T_m") if k in values}
    shown = {n: f"({v!r})" for n, v in values.items()}
    assert reread(law.substituted(shown), {}) == pytest.approx(float(law(**values)), rel=1e-9, abs=1e-12)
