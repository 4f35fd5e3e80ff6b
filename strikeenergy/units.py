"""The one units registry and the one door through which text becomes a number.

Inside the program every quantity is a plain SI number (or an array of them), temperatures in kelvin. This
module is the only importer of pint and the only place where a user's text meets a unit. pint's own expression
parser never sees that text: it reads ``"1,5 kA"`` as 15 kA and hangs on ``"9**9**9 m"``. One strict pattern splits
the number from the unit, and only the unit is looked up.
"""

from __future__ import annotations

import math
import re
from functools import lru_cache
from typing import TYPE_CHECKING, Any, NamedTuple, cast

from strikeenergy.errors import QuantityError, close_matches

if TYPE_CHECKING:
    import numpy as np
    from numpy.typing import NDArray
    from pint import Quantity as PintQuantity
    from pint import UnitRegistry

    Quantity = float | NDArray[np.float64]
else:
    Quantity = float
"""A declared input or finding, as the program holds it: an SI number, or an array of them."""

__all__ = [
    "Quantity",
    "awg_number",
    "awg_section",
    "convert",
    "dimension_name",
    "quantity",
    "read",
    "registry",
    "scale",
]


@lru_cache(maxsize=1)
def registry() -> UnitRegistry[Any]:
    """Return pint's application registry, so that quantities of the user's own session fit ours."""
    import pint

    return cast("UnitRegistry[Any]", pint.get_application_registry())  # type: ignore[no-untyped-call]


def quantity(value: Any, unit: str | None) -> PintQuantity[Any]:
    """Make a pint quantity of a number or array and a unit as the program writes it (``"J/ohm"``)."""
    return registry().Quantity(value, unit or "dimensionless")


# -- looking a unit up -------------------------------------------------------------------------------------


class Scale(NamedTuple):
    """SI value = (value + offset) * factor, and the dimension as pint spells it."""

    factor: float
    offset: float
    dimension: str

    def to_si(self, value: Quantity) -> Quantity:
        """Turn the number that stands before the unit into SI: 50 mm² is 5e-05 m² and not 4.9999999999999996e-05."""
        whole = round(1 / self.factor) if self.factor < 1 else 0
        if whole and abs(whole * self.factor - 1) < 1e-14:
            return (value + self.offset) / whole
        return (value + self.offset) * self.factor

    def from_si(self, value: Quantity) -> Quantity:
        """Turn an SI number into the number that stands before the unit."""
        whole = round(1 / self.factor) if self.factor < 1 else 0
        if whole and abs(whole * self.factor - 1) < 1e-14:
            return value * whole - self.offset
        return value / self.factor - self.offset


_CELSIUS = Scale(1.0, 273.15, "temperature")
_FAHRENHEIT = Scale(5 / 9, 459.67, "temperature")
_OFFSET_UNITS = dict.fromkeys(("degC", "°C", "degree_Celsius"), _CELSIUS)
_OFFSET_UNITS |= dict.fromkeys(("degF", "°F", "degree_Fahrenheit"), _FAHRENHEIT)
_ALIASES = {
    "mm2": "mm**2",
    "cm2": "cm**2",
    "m2": "m**2",
    "in2": "inch**2",
    "mm3": "mm**3",
    "cm3": "cm**3",
    "m3": "m**3",
    "A2s": "A**2*s",
    "kA2s": "kA**2*s",
    "KA": "kA",
    "MCM": "kcmil",
    "℃": "degC",
    "℉": "degF",
}
_HINTS = {
    "Nm": "N*m",
    "KJ": "kJ",
    "Mj": "MJ",
    "kj": "kJ",
    "KV": "kV",
    "Km": "km",
    "MM": "mm",
    "MM2": "mm**2",
    "sqmm": "mm**2",
    "µΩcm": "µΩ*cm",
    "Ωm": "ohm*m",
    "ohmm": "ohm*m",
    "as": "A*s",
    "As": "A*s",
}
_SUPER = str.maketrans("⁰¹²³⁴⁵⁶⁷⁸⁹⁻⁺", "0123456789-+")
_TOKEN = re.compile(
    r"(?P<name>[A-Za-zµμΩΩ°%℃℉_]+[23]?(?:s(?![A-Za-z]))?)|(?P<power>(?:\*\*|\^)\s*[-+]?[0-9](?![0-9.]))|"
    r"(?P<super>[⁻⁺]?[⁰¹²³⁴⁵⁶⁷⁸⁹])|(?P<times>[*·⋅×])|(?P<over>/)|(?P<open>\()|(?P<close>\))|(?P<blank>[ \u00a0\u202f]+)"
)


def _canonical(text: str) -> str:
    """Rewrite a unit into the plain form that the registry may see, or raise ValueError saying why not."""
    out: list[str] = []
    last = "start"
    position = 0
    rest = text.strip()
    rest = re.sub(r"^1\s*/", "/", rest)
    if rest.startswith("/"):
        out.append("1")
        last = "name"
    while position < len(rest):
        match = _TOKEN.match(rest, position)
        if match is None:
            raise ValueError(f"{rest[position]!r} cannot stand in a unit")
        position = match.end()
        sort = match.lastgroup or ""
        token = match.group()
        if sort == "blank":
            continue
        if sort in ("name", "open") and last in ("name", "power", "close"):
            out.append("*")
        if sort in ("power", "super"):
            if last not in ("name", "close"):
                raise ValueError("an exponent must follow a unit, once")
            out.append("**" + token.lstrip("*^ ").translate(_SUPER).strip())
            last = "power"
            continue
        if sort in ("times", "over", "close") and last not in ("name", "power", "close"):
            raise ValueError(f"{token!r} has nothing before it")
        if sort == "name":
            out.append(_spell_name(token))
        else:
            out.append({"times": "*", "over": "/", "open": "(", "close": ")"}[sort])
        last = sort
    if "%" in rest and rest != "%":
        raise ValueError("'%' stands alone")
    if last in ("start", "times", "over", "open"):
        raise ValueError("it ends too early" if out else "the unit is missing")
    return "".join(out)


def _spell_name(name: str) -> str:
    name = name.replace("Ω", "Ω")  # OHM SIGN and GREEK CAPITAL OMEGA look alike
    if name in _ALIASES:
        spelt = _ALIASES[name]
        return f"({spelt})" if "*" in spelt else spelt
    if name.endswith("Ohm"):
        return name[:-3] + "ohm"
    return name


@lru_cache(maxsize=4096)
def scale(unit: str) -> Scale:
    """Return factor, offset and dimension of a unit text.

    Raises:
        QuantityError: the text is not a unit, with the nearest one to write.
    """
    if unit in ("", "1", "dimensionless"):
        return Scale(1.0, 0.0, "dimensionless")
    if unit in _HINTS:  # some generations of the registry know these, as something else
        raise QuantityError(f"{unit!r} is not a unit", f"write {_HINTS[unit]!r}")
    try:
        spelt = _canonical(unit)
        if re.sub(r"[^A-Za-z]", "", spelt) in ("kcmil", "AWG"):
            if spelt != "kcmil":
                raise ValueError("write the size before it, such as '6 AWG'")
            return Scale(_KCMIL, 0.0, scale("m**2").dimension)
        offset = _offset_unit(spelt)
        if offset is not None:
            return offset
        # Within a compound, such as J/(kg*degC), only a difference can be meant.
        parsed = registry().parse_units(
            re.sub(r"(?:°|degree_|deg)(C|F)(?:elsius|ahrenheit)?\b", r"delta_deg\1", spelt)
        )
        base = registry().Quantity(1.0, parsed).to_base_units()
        dimension = str(base.dimensionality)
        factor = float(base.magnitude)
    except Exception as error:  # pint raises AttributeError, TypeError, ValueError, even AssertionError here
        reason = str(error) if type(error) is ValueError else "it is not a known unit"
        hint = close_matches(unit, _COMMON_UNITS)
        raise QuantityError(f"{unit!r} is not a unit: {reason}", hint if "mean" in hint else "") from None
    return Scale(factor, 0.0, dimension)


def _offset_unit(spelt: str) -> Scale | None:
    """Return the scale of a lone temperature unit with an offset; None where no offset unit is in it.

    Raises:
        ValueError: an offset unit that is neither Celsius nor Fahrenheit, or one with a prefix or in brackets.
    """
    parsed = registry().parse_units(spelt)
    if registry().Quantity(1.0, parsed)._is_multiplicative or len(dict(parsed._units)) > 1:
        return None
    (name,) = dict(parsed._units)
    found = _OFFSET_UNITS.get(name) if spelt.isidentifier() or "°" in spelt else None
    if found is None:
        raise ValueError("write degC or degF for a temperature")
    return found


_KCMIL = 1000 * math.pi / 4 * (25.4e-6) ** 2
_COMMON_UNITS = [
    "m",
    "mm",
    "cm",
    "km",
    "µm",
    "inch",
    "ft",
    "mm**2",
    "cm**2",
    "m**2",
    "mm**3",
    "m**3",
    "s",
    "ms",
    "µs",
    "A",
    "kA",
    "C",
    "J",
    "kJ",
    "MJ",
    "J/ohm",
    "kJ/ohm",
    "MJ/ohm",
    "A**2*s",
    "ohm",
    "mohm",
    "µohm",
    "ohm*m",
    "V",
    "kV",
    "N",
    "kN",
    "Pa",
    "kPa",
    "MPa",
    "GPa",
    "kg",
    "kg/m**3",
    "J/kg",
    "J/(kg*K)",
    "J/(m**3*K)",
    "W/(m*K)",
    "K",
    "degC",
    "degF",
    "1/K",
    "N/m",
    "kN/m",
    "Hz",
    "m/s",
    "deg",
    "kcmil",
]

_NAMES = {
    "m": "a length",
    "m**2": "an area",
    "m**3": "a volume",
    "s": "a time",
    "A": "a current",
    "C": "a charge",
    "J": "an energy",
    "J/ohm": "a specific energy",
    "ohm": "a resistance",
    "ohm*m": "a resistivity",
    "V": "a voltage",
    "V/m": "a field",
    "N": "a force",
    "Pa": "a pressure",
    "kg": "a mass",
    "kg/m**3": "a density",
    "J/kg": "a heat per mass",
    "J/(kg*K)": "a specific heat",
    "J/(m**3*K)": "a heat capacity per volume",
    "W/(m*K)": "a thermal conductivity",
    "1/K": "a temperature coefficient",
    "K": "a temperature difference",
    "N/m": "a force per length",
    "J/m": "an energy per length",
    "Hz": "a frequency",
    "m/s": "a speed",
}


@lru_cache(maxsize=1)
def _dimension_names() -> dict[str, str]:
    names = {scale(unit).dimension: name for unit, name in reversed(_NAMES.items())}
    names |= {"temperature": "a temperature", "dimensionless": "a plain number"}
    return names


def dimension_name(unit: str) -> str:
    """Name the sort of quantity in plain words: ``"mm**2"`` is ``"an area"``."""
    dimension = scale(unit).dimension
    return _dimension_names().get(dimension, f"a quantity in {unit}")


# -- the door ----------------------------------------------------------------------------------------------

_NUMBER = re.compile(
    r"(?P<number>[+-]?(?:[0-9]+(?:\.[0-9]*)?|\.[0-9]+)(?:[eE][+-]?[0-9]{1,3})?)(?P<rest>.*)", re.DOTALL
)
_COMMA = re.compile(r"([0-9]),([0-9])")
_LONGEST_TEXT = 80


def read(value: Any, unit: str, *, example: str = "", wire: bool = False) -> Quantity:
    """Turn what a user wrote into an SI number.

    Args:
        value: a text such as ``"50 mm**2"``, or a pint quantity (whose magnitude may be an array). For a
            dimensionless ``unit`` a bare number will do as well.
        unit: the unit that is due, such as ``"mm**2"``; ``"degC"`` stands for a temperature, ``"K"`` for a difference.
        example: what to show in the message.
        wire: also accept ``"6 AWG"`` (ASTM B258 sizes) for an area.

    Raises:
        QuantityError: with what to write instead.
    """
    example = example or f"1 {unit}"
    if isinstance(value, bool):
        raise QuantityError(f"{value} is a truth value, not {dimension_name(unit)}", f"write {example!r}")
    if isinstance(value, str):
        return _read_text(value, unit, example, wire)
    if hasattr(value, "magnitude") and hasattr(value, "units"):
        return _read_quantity(value, unit, example)
    if scale(unit).dimension == "dimensionless" and isinstance(value, (int, float)):
        if isinstance(value, int) and abs(value) > 10**300:
            raise QuantityError("the number is too large", f"write {example!r}")
        return _finite(float(value), str(value), example)
    if scale(unit).dimension == "dimensionless" and hasattr(value, "dtype"):
        return _finite_array(value, example)
    if isinstance(value, (int, float)):
        if not -1e308 <= value <= 1e308:
            raise QuantityError(f"{value} is not a finite number", f"write {example!r}")
        raise QuantityError(
            f"{value} has no unit", f"write {_with_unit(value, unit)!r} if that is what is meant"
        )
    raise QuantityError(
        f"{_SORTS.get(type(value).__name__, type(value).__name__)} found where {dimension_name(unit)} is due",
        f"write a text such as {example!r}",
    )


_SORTS = {"list": "a list", "tuple": "a list", "dict": "a table", "NoneType": "nothing"}


def _with_unit(value: float, unit: str) -> str:
    return f"{value:g} {unit}"


def _read_text(text: str, unit: str, example: str, wire: bool) -> float:
    shown = text if len(text) <= _LONGEST_TEXT else text[: _LONGEST_TEXT - 1] + "…"
    stripped = text.strip().strip("\u00a0\u202f")
    if len(text) > 4 * _LONGEST_TEXT:
        raise QuantityError(
            f"{shown!r} is too long for a quantity", f"write one number and one unit, such as {example!r}"
        )
    if not stripped:
        raise QuantityError("the text is empty", f"write {example!r}")
    if any(ord(c) < 32 for c in stripped):
        raise QuantityError(
            f"{shown!r} holds a control character", f"write it in one line, such as {example!r}"
        )
    if wire:
        size = re.fullmatch(r"(?:AWG\s*)?([0-9]{1,2}(?:/0)?|0{2,4})\s*(?:AWG)?", stripped, re.IGNORECASE)
        if size and "awg" in stripped.casefold():
            return awg_section(size.group(1))
    lowered = stripped.lstrip("+-").casefold()
    if re.match(r"(nan|inf|infinity)\b", lowered):
        raise QuantityError(f"{shown!r} is not a finite number", f"write {example!r}")
    if stripped[0] in "−–—" or any(c in stripped for c in "−"):
        raise QuantityError(
            f"{shown!r} has a typographic minus",
            f"write {stripped.replace('−', '-').replace('–', '-').replace('—', '-')!r}",
        )
    if _COMMA.search(stripped):
        pointed = _COMMA.sub(r"\1.\2", stripped)
        once = len(_COMMA.findall(stripped)) == 1
        joined = stripped.replace(",", "")
        hint = (
            f"write {pointed!r} with a decimal point, or {joined!r} if the comma parts thousands"
            if once and re.search(r"[1-9]\d{0,2},\d{3}(?!\d)", stripped)
            else f"write {pointed!r} with a decimal point"
            if once
            else f"write it without commas, such as {example!r}"
        )
        raise QuantityError(f"{shown!r} has a comma in the number", hint)
    match = _NUMBER.fullmatch(stripped)
    if match is None:
        raise QuantityError(
            f"{shown!r} does not begin with a number", f"write one number and one unit, such as {example!r}"
        )
    number = float(match["number"])
    rest = match["rest"].strip(" \u00a0\u202f\t")
    due = scale(unit)
    if not rest:
        if due.dimension == "dimensionless":
            return _finite(number, shown, example)
        raise QuantityError(
            f"{shown!r} has no unit", f"write {_with_unit(number, unit)!r} if that is what is meant"
        )
    if rest[0] in "0123456789.,_'" and not rest.startswith("1/"):
        raise QuantityError(f"{shown!r} is not one number and one unit", f"write it like {example!r}")
    if due.dimension == "dimensionless" and rest == "%":
        return _finite(number / 100, shown, example)
    try:
        found = scale(rest)
    except QuantityError as error:
        raise QuantityError(
            f"{shown!r}: {error.what}", error.write or f"write one number and one unit, such as {example!r}"
        ) from None
    _check_dimension(found, due, shown, rest, unit, example)
    return _finite(cast(float, found.to_si(number)), shown, example)


def _check_dimension(found: Scale, due: Scale, shown: str, given: str, unit: str, example: str) -> None:
    if found.dimension == due.dimension:
        return
    kelvin = "[temperature]"
    if due.dimension == "temperature" and found.dimension == kelvin:
        return
    sort = _dimension_names().get(found.dimension, f"in {given}")
    hint = ""
    if due.dimension == "temperature" and given.strip() == "C":
        hint = "write 'degC' for degrees Celsius (C alone is the coulomb)"
    elif due.dimension == "temperature" and given.strip() == "F":
        hint = "write 'degF' for degrees Fahrenheit (F alone is the farad)"
    elif given.strip() == "ka" and "[current]" in due.dimension:
        hint = "write 'kA' for kiloampere (ka is the kiloyear)"
    elif due.dimension == kelvin and found.dimension == "temperature":
        hint = f"a difference is due, in kelvin: write {example!r}"
    raise QuantityError(f"{shown!r} is {sort}; {dimension_name(unit)} such as {example!r} is needed", hint)


def _read_quantity(value: Any, unit: str, example: str) -> Quantity:
    due = scale(unit)
    magnitude = value.magnitude
    try:
        found = scale(str(value.units))
    except QuantityError:
        found = Scale(math.nan, 0.0, str(value.dimensionality))
    _check_dimension(found, due, str(value), str(value.units), unit, example)
    if hasattr(magnitude, "dtype") and getattr(magnitude, "ndim", 0) > 0:
        return _finite_array(found.to_si(magnitude), example)
    return _finite(cast(float, found.to_si(float(magnitude))), str(value), example)


def _finite(number: float, shown: str, example: str) -> float:
    if not math.isfinite(number):
        raise QuantityError(f"{shown!r} is not a finite number", f"write {example!r}")
    return number


def _finite_array(values: Any, example: str) -> Quantity:
    import numpy as np

    try:
        array = np.asarray(values, dtype=float)
    except (TypeError, ValueError):
        raise QuantityError("the array does not hold numbers", f"give numbers as in {example!r}") from None
    bad = ~np.isfinite(array)
    if bad.any():
        raise QuantityError(f"{int(bad.sum())} of {array.size} values are not finite", "leave them out")
    return array


def awg_number(size: str | int) -> int:
    """Gauge number n of an American wire gauge: 1/0 is 0, 2/0 is -1, 3/0 is -2, 4/0 is -3.

    Raises:
        QuantityError: the size is not between 4/0 and 40.
    """
    text = str(size).strip()
    known = {"0000": -3, "000": -2, "00": -1, "4/0": -3, "3/0": -2, "2/0": -1, "1/0": 0}
    if text in known:
        return known[text]
    if text.isascii() and text.isdigit() and len(text) <= 2 and int(text) <= 40:
        return int(text)
    raise QuantityError(
        f"{size!r} is not an AWG size", "write a number from 0 to 40, or '1/0', '2/0', '3/0', '4/0'"
    )


def awg_section(size: str | int) -> float:
    """Section in m² of a solid wire of American wire gauge (ASTM B258: diameter 0.005 in x 92^((36-n)/39)).

    Raises:
        QuantityError: the size is not between 4/0 and 40.
    """
    diameter: float = 0.127e-3 * 92.0 ** ((36 - awg_number(size)) / 39)
    return math.pi / 4 * diameter**2


def convert(value: Quantity, unit: str) -> Quantity:
    """Turn an SI number into the number that stands before ``unit``."""
    return scale(unit).from_si(value)
