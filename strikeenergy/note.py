"""The calculation note: one expression string is computed *and* shown.

A :class:`Formula` is written in Python's syntax, with the factors in the source's own order. It is walked once
through a whitelist (numbers, names, ``+ - * / **``, a few functions) into closures, so that what is printed is what
is computed. The law modules define their closed forms as formulas; an effect hands them to its :class:`Note`.
"""

from __future__ import annotations

import ast
import math
from collections.abc import Callable, Mapping
from dataclasses import dataclass, field
from functools import lru_cache
from typing import Any

import numpy as np

from strikeenergy.formatting import format_number, format_quantity
from strikeenergy.sources import Constant, Source, Standing

__all__ = ["Formula", "Given", "Note", "Step", "show_symbol"]


def _expm1(x: Any, out: Any = None) -> Any:
    """exp(x) − 1, exact for small x as well. On large arrays the quick exp serves wherever it loses nothing."""
    if not isinstance(x, np.ndarray) or x.size < 4096:
        return np.expm1(x) if out is None else np.expm1(x, out=out)
    small = (x < 0.01) & (x > -0.01)  # beyond it, exp(x) − 1 is good to 1e-14
    exact = np.expm1(x[small]) if small.any() else None
    result = np.exp(x, out=out)
    result -= 1.0
    if exact is not None:
        result[small] = exact
    return result


_FUNCTIONS: dict[str, Callable[..., Any]] = {
    "exp": np.exp,
    "expm1": _expm1,
    "log": np.log,
    "log1p": np.log1p,
    "sqrt": np.sqrt,
    "asinh": np.arcsinh,
    "atan": np.arctan,
    "minimum": np.minimum,
    "maximum": np.maximum,
}
_BINARY: dict[type, tuple[str, int, Callable[[Any, Any], Any]]] = {
    ast.Add: (" + ", 1, lambda a, b: a + b),
    ast.Sub: (" − ", 1, lambda a, b: a - b),
    ast.Mult: ("·", 2, lambda a, b: a * b),
    ast.Div: ("/", 2, lambda a, b: a / b),
    ast.Pow: ("^", 4, lambda a, b: a**b),
}
_CONSTANTS = {"pi": math.pi, "mu0": 4e-7 * math.pi}

_GREEK = {
    "alpha": "α",
    "beta": "β",
    "gamma": "γ",
    "Delta": "Δ",
    "delta": "δ",
    "eta": "η",
    "theta": "θ",
    "lambda_": "λ",
    "mu": "µ",
    "pi": "π",
    "rho": "ρ",
    "sigma": "σ",
    "tau": "τ",
    "phi": "φ",
    "omega": "ω",
}

_SPELT = {"w": "W", "rise": "Δθ", "i2": "i²"}


@lru_cache(maxsize=512)
def show_symbol(name: str) -> str:
    """Typeset a name: ``rho0`` is ``ρ0``, ``gamma`` is ``γ``, ``W_on`` stays."""
    if name in _SPELT:
        return _SPELT[name]
    for plain, greek in _GREEK.items():
        if name == plain or (name.startswith(plain) and not name[len(plain) :][0].islower()):
            return greek + name[len(plain) :]
    return name


_BLOCK = 1 << 14


class Formula:
    """A closed form that computes itself and prints itself.

    Args:
        expression: Python syntax; names, numbers, ``+ - * / **``, and exp, expm1, log, log1p, sqrt, asinh, atan,
            minimum, maximum. ``pi`` and ``mu0`` (4e-7 pi H/m) are known.

    Raises:
        ValueError: anything else stands in the expression.

    >>> Formula("w/q**2")(w=8.0, q=2.0)
    2.0
    """

    def __init__(self, expression: str) -> None:
        self.expression = expression
        self._tree = ast.parse(expression, mode="eval").body
        names: dict[str, None] = {}
        self._run = _compile(self._tree, names)
        self.names = tuple(name for name in names if name not in _CONSTANTS)

    def __call__(self, **values: Any) -> Any:
        """Compute, on numbers, arrays (they broadcast) or pint quantities.

        Long arrays are worked through in blocks that fit the processor's cache: intermediate results never reach memory.
        """
        long = [v for v in values.values() if type(v) is np.ndarray and v.ndim == 1 and v.size > 2 * _BLOCK]
        if not long or any(np.shape(v) not in ((), long[0].shape) for v in values.values()):
            return self._run(values)
        out = np.empty(long[0].shape)
        for begin in range(0, out.size, _BLOCK):
            part = slice(begin, begin + _BLOCK)
            out[part] = self._run({name: v[part] if np.ndim(v) else v for name, v in values.items()})
        return out

    def text(self) -> str:
        """Print with symbols."""
        return _print(self._tree, show_symbol)[0]

    def substituted(self, shown: Mapping[str, str]) -> str:
        """Print with the values put in.

        Args:
            shown: the text of each value.
        """
        return _print(self._tree, lambda name: shown.get(name, show_symbol(name)))[0]

    def __repr__(self) -> str:
        return f"Formula({self.expression!r})"


def _compile(node: ast.expr, names: dict[str, None]) -> Callable[[dict[str, Any]], Any]:
    if isinstance(node, ast.Constant) and type(node.value) in (int, float):
        number = node.value
        return lambda values: number
    if isinstance(node, ast.Name):
        name = node.id
        names[name] = None
        if name in _CONSTANTS:
            known = _CONSTANTS[name]
            return lambda values: values.get(name, known)
        return lambda values: values[name]
    if isinstance(node, ast.UnaryOp) and isinstance(node.op, ast.USub):
        inner = _compile(node.operand, names)
        return lambda values: -inner(values)
    if isinstance(node, ast.BinOp) and type(node.op) in _BINARY:
        apply = _BINARY[type(node.op)][2]
        left, right = _compile(node.left, names), _compile(node.right, names)
        if _makes_new(node.left) and type(node.op) in _IN_PLACE:
            in_place = _IN_PLACE[type(node.op)]

            def run(values: dict[str, Any]) -> Any:
                a, b = left(values), right(values)
                # A large intermediate result is overwritten instead of copied: most of the cost is in the memory.
                if type(a) is np.ndarray and a.dtype == np.float64 and _fits(b, a):
                    return in_place(a, b, out=a)
                return apply(a, b)

            return run
        return lambda values: apply(left(values), right(values))
    if isinstance(node, ast.Call) and isinstance(node.func, ast.Name) and not node.keywords:
        function = _FUNCTIONS.get(node.func.id)
        if function is not None:
            arguments = [_compile(argument, names) for argument in node.args]
            if len(arguments) == 1 and _makes_new(node.args[0]):
                (argument,) = arguments

                def call(values: dict[str, Any]) -> Any:
                    a = argument(values)
                    if type(a) is np.ndarray and a.dtype == np.float64 and a.ndim:
                        return function(a, out=a)
                    return function(a)

                return call
            return lambda values: function(*(argument(values) for argument in arguments))
    raise ValueError(f"{ast.unparse(node)!r} cannot stand in a formula")


_IN_PLACE: dict[type, Callable[..., Any]] = {
    ast.Add: np.add,
    ast.Sub: np.subtract,
    ast.Mult: np.multiply,
    ast.Div: np.divide,
}


def _makes_new(node: ast.expr) -> bool:
    """Whether a node's result is an array of its own, which nobody else holds."""
    return isinstance(node, (ast.BinOp, ast.Call))


def _fits(b: Any, a: np.ndarray[Any, Any]) -> bool:
    """Whether ``b`` can be worked into ``a`` without changing its shape or kind."""
    if a.ndim == 0:
        return False
    if isinstance(b, (int, float)):
        return True
    return (
        isinstance(b, (np.ndarray, np.generic))
        and b.dtype == np.float64
        and (b.ndim == 0 or b.shape == a.shape)
    )


def _print(node: ast.expr, show: Callable[[str], str]) -> tuple[str, int]:
    """Return the text of a node and how tightly it binds (5 = an atom)."""
    if isinstance(node, ast.Constant):
        return format_number(float(node.value), 6), 5  # type: ignore[arg-type]  # _compile let only numbers in
    if isinstance(node, ast.Name):
        text = show(node.id)
        return text, 5 if _is_atom(text) else 3
    if isinstance(node, ast.UnaryOp):
        text, binds = _print(node.operand, show)
        return f"−{text}" if binds > 1 else f"−({text})", 1
    if isinstance(node, ast.Call) and isinstance(node.func, ast.Name):
        arguments = ", ".join(_print(argument, show)[0] for argument in node.args)
        if node.func.id == "expm1":
            return f"exp({arguments}) − 1", 1
        if node.func.id == "log1p":
            return f"ln(1 + {arguments})", 5
        name = {"log": "ln", "minimum": "min", "maximum": "max", "sqrt": "√"}.get(node.func.id, node.func.id)
        return f"{name}({arguments})", 5
    assert isinstance(node, ast.BinOp)
    sign, binds, _ = _BINARY[type(node.op)]
    left, left_binds = _print(node.left, show)
    right, right_binds = _print(node.right, show)
    if isinstance(node.op, ast.Pow):
        return f"{left if left_binds == 5 else f'({left})'}^{right if right_binds == 5 else f'({right})'}", 4
    if left_binds < binds:
        left = f"({left})"
    # a − (b + c) and a/(b·c) need their brackets; a·b·c does not
    same_needs = isinstance(node.op, (ast.Sub, ast.Div))
    if right_binds < binds or (same_needs and right_binds == binds):
        right = f"({right})"
    return f"{left}{sign}{right}", binds


def _is_atom(text: str) -> bool:
    return text.replace(".", "").replace("_", "").isalnum() or text.startswith("∫")


@dataclass(frozen=True)
class Given:
    """A value that goes into a formula: an input of the user, or a result of an earlier step. In SI."""

    value: Any
    unit: str | None = None
    meaning: str = ""
    standing: Standing | None = None
    symbol: str = ""
    """What it is called in this formula, where its name alone would mislead (∫i²dt in the place of i²)."""


@dataclass(frozen=True)
class Step:
    """One line of working."""

    symbol: str
    meaning: str
    formula: Formula | None
    values: dict[str, Given | Constant]
    result: float
    unit: str | None
    show: str | None
    source: Source | None
    findings: tuple[str, ...]

    def formula_text(self) -> str:
        """Return the formula with symbols."""
        own = {name: v.symbol for name, v in self.values.items() if isinstance(v, Given) and v.symbol}
        return self.formula.substituted(own) if self.formula is not None else ""

    def substitution(self) -> str:
        """Return the formula with the SI values put in, as it was computed."""
        if self.formula is None:
            return ""
        return self.formula.substituted(
            {name: format_number(float(v.value), 6) for name, v in self.values.items()}
        )

    def result_text(self) -> str:
        """Return the result with its unit."""
        return format_quantity(self.result, self.unit, self.show, 5)


@dataclass
class Note:
    """The working of one effect: formulas with their values, constants, assumptions, remarks.

    With arrays the note keeps no working (``quiet``): the formulas are computed and nothing is written down.
    """

    quiet: bool = False
    steps: list[Step] = field(default_factory=list)
    constants: list[tuple[str, Constant]] = field(default_factory=list)
    assumptions: list[Constant] = field(default_factory=list)
    remarks: list[str] = field(default_factory=list)
    left_out: list[str] = field(default_factory=list)
    unknowns: dict[str, str] = field(default_factory=dict)

    def formula(
        self,
        symbol: str,
        expression: str | Formula,
        unit: str | None,
        *,
        meaning: str = "",
        source: Source | None = None,
        finding: str | tuple[str, ...] = (),
        show: str | None = None,
        **values: Any,
    ) -> Any:
        """Compute an expression, and write down how.

        Args:
            symbol: of the result, as it is to be printed.
            expression: a :class:`Formula` of a law, or a string.
            unit: coherent SI unit of the result; None for a plain number.
            meaning: what the result is.
            source: where the formula stands.
            finding: the finding or findings that rest on this step; their standing follows from the constants in it.
            show: the unit to show the result in.
            values: a :class:`Given`, a :class:`Constant`, or a plain number for each name of the expression.

        Returns:
            The value: a number, or an array where a value is one.
        """
        law = expression if isinstance(expression, Formula) else _formula(expression)
        plain = {
            name: value.value if isinstance(value, (Given, Constant)) else value
            for name, value in values.items()
        }
        result = law(**plain)
        if not self.quiet:
            full = {
                name: value if isinstance(value, (Given, Constant)) else Given(value)
                for name, value in values.items()
            }
            findings = (finding,) if isinstance(finding, str) else finding
            for name, value in full.items():
                if isinstance(value, Constant):
                    self.constant(name, value)
            self.steps.append(
                Step(
                    symbol,
                    meaning,
                    law,
                    full,
                    float(result),
                    unit,
                    show,
                    source,
                    tuple(f for f in findings if f),
                )
            )
        return result

    def constant(self, name: str, value: Constant) -> None:
        """Write a constant down, once."""
        if (name, value) not in self.constants:
            self.constants.append((name, value))

    def assume(self, value: Constant) -> float:
        """Write an assumption down and return its value."""
        if value not in self.assumptions:
            self.assumptions.append(value)
        return value.value

    def remark(self, text: str) -> None:
        """Say something that the reader of the result must know."""
        if text not in self.remarks:
            self.remarks.append(text)

    def unknown(self, finding: str, why: str) -> None:
        """Say why a finding is not given."""
        self.unknowns[finding] = why

    def leaves_out(self, text: str) -> None:
        """Say what the model leaves out."""
        if text not in self.left_out:
            self.left_out.append(text)


@lru_cache(maxsize=1024)
def _formula(expression: str) -> Formula:
    return Formula(expression)
