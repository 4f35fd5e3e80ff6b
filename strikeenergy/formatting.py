"""Writing quantities for people: significant figures, fitting prefixes, typeset units."""

from __future__ import annotations

import math
import re

from strikeenergy.units import convert

__all__ = ["engineering", "format_number", "format_quantity", "pretty"]

_PRETTY = {"ohm": "Ω", "degC": "°C", "degF": "°F", "mohm": "mΩ", "kohm": "kΩ", "µohm": "µΩ", "inch": "in"}
_POWERS = str.maketrans("0123456789-", "⁰¹²³⁴⁵⁶⁷⁸⁹⁻")


def pretty(unit: str | None) -> str:
    """Typeset a unit: ``"J/(kg*K)"`` is ``"J/(kg·K)"``, ``"mm**2"`` is ``"mm²"``."""
    if not unit:
        return ""
    text = re.sub(r"\*\*(-?[0-9])", lambda m: m[1].translate(_POWERS), unit)
    text = re.sub(r"[A-Za-zµ]+", lambda m: _PRETTY.get(m[0], re.sub(r"ohm$", "Ω", m[0])), text)
    return text.replace("*", "·")


_PREFIXED = ("A", "C", "J", "N", "Pa", "V", "ohm", "Hz", "J/ohm", "N/m", "J/m", "V/m", "N*s", "N*s/m")
_PREFIXES = {-9: "n", -6: "µ", -3: "m", 0: "", 3: "k", 6: "M", 9: "G"}


def engineering(value: float, unit: str) -> str:
    """Choose the prefix that brings the number between 1 and 1000, where the unit takes one."""
    if unit not in (*_PREFIXED, "s") or value == 0 or not math.isfinite(value):
        return unit
    power = 3 * math.floor(math.log10(abs(value) * (1 + 1e-12)) / 3)
    power = min(max(power, -9), 0 if unit == "s" else 9)
    return _PREFIXES[power] + unit


def format_quantity(value: float, unit: str | None, show: str | None = None, digits: int = 4) -> str:
    """Write an SI number with its unit for people, to ``digits`` significant figures.

    Args:
        value: in the coherent SI unit.
        unit: that unit, or None for a plain number.
        show: the unit to show it in; by default the SI unit with a fitting prefix.
        digits: significant figures.
    """
    if not unit or unit in ("1", "dimensionless"):
        return format_number(value, digits)
    shown = show or engineering(value, unit)
    number = float(convert(value, shown))
    return f"{format_number(number, digits)} {pretty(shown)}"


def format_number(value: float, digits: int = 4) -> str:
    """Write a number to so many significant figures, without an exponent where it reads better without."""
    if value == 0:
        return "0"
    magnitude = math.floor(math.log10(abs(value)))
    if -4 <= magnitude < 7:
        decimals = max(digits - 1 - magnitude, 0)
        text = f"{round(value, digits - 1 - magnitude):.{decimals}f}"
        return text.rstrip("0").rstrip(".") if "." in text else text
    mantissa, exponent = f"{value:.{digits - 1}e}".split("e")
    return f"{mantissa.rstrip('0').rstrip('.')}e{int(exponent)}"
