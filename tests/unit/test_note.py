"""The formula that is printed is the formula that is computed."""

import math

import numpy as np
import pytest

from strikeenergy.note import Formula, Given, Note, show_symbol
from strikeenergy.sources import Constant, Source, Standing

SOURCE = Source("k", "A publication", "Table 1")


@pytest.mark.parametrize(
    ("expression", "text"),
    [
        ("expm1(w*alpha*rho0/(q**2*C))/alpha", "(exp(W·α·ρ0/(q^2·C)) − 1)/α"),
        ("a - (b - c)*d**2/(e*f)", "a − (b − c)·d^2/(e·f)"),
        ("-(a + b)**2", "−(a + b)^2"),
        ("a/(b*c)", "a/(b·c)"),
        ("a/b*c", "a/b·c"),
        ("(a/b)**c", "(a/b)^c"),
        ("a**-1", "a^(−1)"),
        ("log1p(x)*2", "ln(1 + x)·2"),
        ("minimum(maximum(a, 0), 1)", "min(max(a, 0), 1)"),
        ("mu0*i**2/(8*pi**2*r**2)", "µ0·i^2/(8·π^2·r^2)"),
        ("sqrt(w/s)", "√(W/s)"),
    ],
)
def test_printed(expression, text):
    assert Formula(expression).text() == text


@pytest.mark.parametrize(
    "bad",
    ["__import__('os')", "a.b", "lambda: 1", "x if y else z", "[1]", "open(x)", "a @ b", "True", "a[0]", "'text'",
     "exp(x, out=y)", "a and b", "~a", "1j"],
)  # fmt: skip
def test_only_formulas_get_in(bad):
    with pytest.raises(ValueError, match="cannot stand in a formula"):
        Formula(bad)


def test_computes_numbers_arrays_and_constants():
    formula = Formula("mu0*i**2/(8*pi**2*r**2)")
    assert formula.names == ("i", "r")
    assert formula(i=100e3, r=9e-3) == pytest.approx(1.96488e6, rel=1e-5)
    np.testing.assert_allclose(formula(i=np.array([1e5, 2e5]), r=9e-3), [1.96488e6, 7.8595e6], rtol=1e-5)


def test_shown_with_the_values_put_in():
    note = Note()
    alpha = Constant(3.92e-3, "1/K", SOURCE, Standing.PUBLISHED, "coefficient")
    rise = note.formula(
        "Δθ",
        "expm1(w*alpha)/alpha",
        "K",
        meaning="rise",
        source=SOURCE,
        finding="temperature_rise",
        w=Given(2.0, "K"),
        alpha=alpha,
    )
    step = note.steps[0]
    assert rise == pytest.approx(math.expm1(2 * 3.92e-3) / 3.92e-3, rel=1e-15)
    assert step.substitution() == "(exp(2·0.00392) − 1)/0.00392"
    assert step.result_text() == "2.0079 K"
    assert step.findings == ("temperature_rise",)
    assert note.constants == [("alpha", alpha)]


def test_negative_values_keep_their_meaning():
    note = Note()
    note.formula("x", "a - b**2", None, a=1.0, b=-3.0)
    assert note.steps[0].substitution() == "1 − (-3)^2"


def test_quiet_note_computes_and_writes_nothing():
    note = Note(quiet=True)
    result = note.formula("y", "2*x", None, x=np.arange(3.0))
    np.testing.assert_array_equal(result, [0, 2, 4])
    assert not note.steps
    assert not note.constants


def test_what_is_said_is_said_once():
    note = Note()
    value = Constant(12.0, "V", SOURCE, Standing.ASSUMED, "drop")
    assert note.assume(value) == 12.0
    note.assume(value)
    note.remark("a")
    note.remark("a")
    note.leaves_out("b")
    note.leaves_out("b")
    note.unknown("f", "why")
    assert (len(note.assumptions), note.remarks, note.left_out, note.unknowns) == (
        1,
        ["a"],
        ["b"],
        {"f": "why"},
    )


def test_symbols():
    assert show_symbol("rho0") == "ρ0"
    assert show_symbol("gamma") == "γ"
    assert show_symbol("W_on") == "W_on"
    assert show_symbol("alphabet") == "alphabet"
