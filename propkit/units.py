"""Text and pint quantities to SI floats and back: the one place that touches pint.

`parse` is a small grammar of its own: one decimal number, an optional space, one unit expression.
Only the unit part goes to pint, after the aliases below; they are never added to the user's registry.
Everything ambiguous (decimal commas, digit grouping, arithmetic, gauge pressures) is refused with a hint.
"""

from __future__ import annotations

import decimal
import math
import numbers
import re
from functools import lru_cache
from typing import TYPE_CHECKING, Any

from propkit.errors import InputError, Problem

if TYPE_CHECKING:
    import pint

ALIASES = {
    "psia": "psi",
    "lbm": "pound",
    "lb": "pound",
    "°C": "degC",
    "°F": "degF",
    "°R": "degR",
    "°": "degree",
    "deg": "degree",
    "sec": "second",
    "%": "percent",
}
"""Unit names read in addition to pint's own."""

SHOWN = {
    "degR": "°R",
    "degC": "°C",
    "degF": "°F",
    "percent": "%",
    "psi": "psia",
    "pound": "lbm",
    "degree": "°",
    "": "",
}
"""How a unit name is written where a person reads it."""

_NUMBER = r"[+-]?(?:\d+\.?\d*|\.\d+)(?:[eE][+-]?\d+)?"
_TEXT = re.compile(rf"\s*(?P<number>{_NUMBER})\s*(?P<unit>.*?)\s*", re.DOTALL)
_TOKEN = re.compile(r"\s*(?:(?P<name>[A-Za-zµμ°%]+)(?P<digit>-?[1-9](?![0-9]))?|(?P<operator>\*\*|\^|\*|·|/|\(|\)|-?[1-9](?![0-9])))")
_GAUGE = re.compile(r"(?:(?P<unit>psi|bar|mbar|[kMh]?Pa|atm)\s*\(?\s*(?:g|gauge|gage)\s*\)?|(?P<unit2>psi)\s*g)", re.IGNORECASE)
_ABSOLUTE = re.compile(r"(?P<unit>psi|bar|mbar|[kMh]?Pa|atm)\s*\(?\s*(?:a|abs|absolute)\s*\)?", re.IGNORECASE)
_SUPERSCRIPTS = str.maketrans(
    dict(zip("⁰¹²³⁴⁵⁶⁷⁸⁹⁻", "0123456789-", strict=True)) | {"\u2103": "°C", "\u2109": "°F", "\u212a": "K", "\u00ba": "°", "\u02da": "°"}
)
_MINUS = re.compile("^\\s*\N{MINUS SIGN}")
"""The minus of a printed page, as sheets show it, in front of a number."""
_LONGEST = 80


def to_si(value: object, unit: str, name: str = "value", *, difference: bool = False) -> float:
    """Return `value` as a float in the SI unit `unit`.

    Parameters
    ----------
    value : str, pint.Quantity or real number
        ``"7 MPa"``, a quantity, or a number already in SI.
    unit : str
        The SI unit asked for, in pint's spelling; ``""`` for a pure number.
    name : str
        Name of the input for the error text.
    difference : bool
        Whether a difference of temperatures is meant where `unit` is the kelvin.

    Returns
    -------
    float
        Finite value in `unit`.

    Raises
    ------
    InputError
        For anything that is not one finite number of the right kind.
    """
    if isinstance(value, str):
        return parse(value, unit, name)
    magnitude = getattr(value, "magnitude", None)
    if magnitude is not None and hasattr(value, "units"):
        return _from_quantity(value, unit, name, difference)
    if isinstance(value, bool) or not isinstance(value, (numbers.Real, decimal.Decimal)):
        item = getattr(value, "item", None)
        if getattr(value, "shape", None) == () and item is not None and not isinstance(item(), bool):
            return to_si(item(), unit, name)
        hint = "A study takes lists of values: pk.Study(...)." if isinstance(value, (list, tuple)) or hasattr(value, "shape") else ""
        raise _wrong(name, _shorten(repr(value)), f"{_kind_text(unit)} (text, a quantity or a number in {_si_text(unit)})", hint)
    return _finite(_as_float(value), unit, name, repr(value))


def parse(text: str, unit: str, name: str = "value") -> float:
    """Return the SI value of a text such as ``"7 MPa"``.

    Parameters
    ----------
    text : str
        One decimal number, an optional space, one unit expression.
    unit : str
        The SI unit asked for, in pint's spelling; ``""`` for a pure number (a percentage is accepted there).
    name : str
        Name of the input for the error text.

    Returns
    -------
    float
        Finite value in `unit`.

    Raises
    ------
    InputError
        When the text is not of that form or its unit is of another kind.
    """
    shown = _shorten(repr(text))
    allowed = f"{_kind_text(unit)}, for example {_example(unit)}"
    text = _MINUS.sub("-", text)
    match = _TEXT.fullmatch(text) if len(text) <= _LONGEST else None
    if match is None:
        raise _wrong(name, shown, allowed, _hint_for_text(text))
    number, unit_text = float(match["number"]), match["unit"]
    if not unit_text:
        if unit:
            raise _wrong(name, shown, allowed, f"The unit is missing: write {match['number']} {_si_text(unit)} if that is meant.")
        return _finite(number, unit, name, shown)
    gauge = _GAUGE.fullmatch(unit_text)
    if gauge and unit == "Pa":
        raise _wrong(name, shown, allowed, _gauge_hint(match["number"], gauge["unit"] or gauge["unit2"]))
    absolute = _ABSOLUTE.fullmatch(unit_text)
    if absolute and unit == "Pa" and unit_text != "psia":
        raise _wrong(name, shown, allowed, f"Pressures are absolute; write {match['number']} {absolute['unit']}.")
    expression = _unit_expression(unit_text)
    if expression is None:
        raise _wrong(name, shown, allowed, _hint_for_text(text))
    scale = _scale(expression, unit)
    if scale is None:
        raise _wrong(name, shown, allowed, _unknown_unit_hint(unit_text, expression, unit))
    return _finite(_scaled(number, scale[0]) + scale[1], unit, name, shown)


def quantity(value: float, unit: str) -> Any:
    """Return a fresh quantity of the application registry; a plain float where `unit` is ``""``."""
    if not unit:
        return float(value)
    return _registry().Quantity(float(value), unit)


def convert(value: float, unit: str, shown: str) -> float:
    """Return an SI `value` of `unit` in the unit `shown` (both in pint's spelling)."""
    if unit == shown:
        return value
    scale = _scale(shown, unit)
    if scale is None:
        raise InputError(f"{shown!r} is not a unit of the kind of {unit!r}")
    return _scaled(value - scale[1], 1.0 / scale[0])


def _scaled(value: float, factor: float) -> float:
    """Return value times factor; by division where the inverse is whole, so that 95 % is exactly 0.95."""
    inverse = round(1.0 / factor) if 0.0 < factor < 1.0 else 0
    if inverse and abs(inverse * factor - 1.0) < 1e-12:
        return value / inverse
    return value * factor


def shown_unit(unit: str) -> str:
    """Return a unit as a person reads it: ``kg/m**3`` becomes ``kg/m³``."""
    text = SHOWN.get(unit, unit)
    for plain, nice in (("**2", "²"), ("**3", "³"), ("*", "·"), ("pound", "lbm"), ("degR", "°R"), ("percent", "%")):
        text = text.replace(plain, nice)
    return text


def _registry() -> pint.UnitRegistry[Any]:
    import pint

    registry: pint.UnitRegistry[Any] = pint.get_application_registry()  # type: ignore[no-untyped-call]
    return registry


def _scale(expression: str, unit: str) -> tuple[float, float] | None:
    """Return (factor, offset) from a unit expression to `unit`; None when it is not of that kind."""
    registry: Any = _registry()
    actual = registry.get() if hasattr(registry, "get") else registry
    return _scale_in(actual, expression, unit)


@lru_cache(maxsize=512)
def _scale_in(registry: Any, expression: str, unit: str) -> tuple[float, float] | None:
    try:
        there = registry.parse_units(expression)
        wanted = registry.parse_units(unit) if unit else registry.dimensionless
        if there.dimensionality != wanted.dimensionality:
            return None
        zero = registry.Quantity(0.0, there).to(wanted).magnitude
        # differences of large anchors would lose digits; two anchors of the same size do not
        one = registry.Quantity(1.0, there).to(wanted).magnitude
    except Exception:  # pint raises many kinds for a text that is no unit
        return None
    return (float(one - zero), float(zero)) if zero else (float(one), 0.0)


def _from_quantity(value: Any, unit: str, name: str, difference: bool) -> float:
    shown = _shorten(f"{value}")
    try:
        magnitude = value.to(unit or "dimensionless").magnitude
    except Exception as error:
        raise _wrong(name, shown, f"{_kind_text(unit)}, for example {_example(unit)}", "The quantity is of another kind.") from error
    if getattr(magnitude, "shape", ()) not in ((), None):
        raise _wrong(name, shown, "one value", "A study takes lists of values: pk.Study(...).")
    if unit == "K" and not difference and "delta_" in str(value.units):
        raise _wrong(name, shown, f"{_kind_text(unit)}, for example {_example(unit)}", "That is a temperature difference.")
    if isinstance(magnitude, bool) or not isinstance(magnitude, (numbers.Real, decimal.Decimal)):
        item = getattr(magnitude, "item", None)
        magnitude = item() if item is not None else magnitude
        if isinstance(magnitude, bool) or not isinstance(magnitude, (numbers.Real, decimal.Decimal)):
            raise _wrong(name, shown, f"{_kind_text(unit)}, for example {_example(unit)}", "Give one real number.")
    return _finite(_as_float(magnitude), unit, name, shown)


def _as_float(value: Any) -> float:
    """Return a real number as a float; not a number where it has no value, infinite where it is beyond all floats."""
    try:
        return float(value)
    except OverflowError:  # integers and fractions beyond the range of floats
        return math.inf
    except ValueError:  # a signalling decimal
        return math.nan


def _finite(value: float, unit: str, name: str, shown: str) -> float:
    if not math.isfinite(value):
        raise _wrong(name, _shorten(shown), f"a finite number ({_kind_text(unit)})", "")
    return value


def _unit_expression(text: str) -> str | None:
    """Return the unit part in pint's spelling, or None when it is not a plain unit expression."""
    translated = text.translate(_SUPERSCRIPTS)
    parts: list[str] = []
    position = 0
    power_next = False
    while position < len(translated):
        match = _TOKEN.match(translated, position)
        if match is None:
            return None
        position = match.end()
        operator = match["operator"]
        if operator is None:
            if power_next:
                return None
            if parts and parts[-1] not in ("*", "/", "("):
                parts.append("*")
            parts.append(ALIASES.get(match["name"], match["name"].replace("μ", "µ")))
            if match["digit"]:
                parts.append(f"**{match['digit']}")
        elif operator in ("**", "^"):
            power_next = True
        elif operator[-1].isdigit():
            if not power_next or not parts:
                return None
            parts.append(f"**{operator}")
            power_next = False
        else:
            if operator == "(" and parts and parts[-1] not in ("*", "/", "("):
                parts.append("*")
            parts.append("*" if operator == "·" else operator)
    return None if power_next or not parts else "".join(parts)


def _wrong(name: str, given: str, allowed: str, hint: str) -> InputError:
    return InputError(Problem(name, given, allowed, hint))


def _shorten(text: str) -> str:
    return text if len(text) <= 60 else f"{text[:57]}..."


def _hint_for_text(text: str) -> str:
    stripped = text.strip()
    if re.match(r"[+-]?\d{1,3}(,\d{3})+(?!\d)", stripped):
        return f"A comma is ambiguous: write {stripped.replace(',', '')} or {stripped.replace(',', '.', 1)}."
    if re.match(r"[+-]?\d+,\d", stripped):
        return f"Write the decimal sign as a point, without grouping: {stripped.replace(',', '.', 1)}."
    if "delta_" in stripped:
        return "That is a temperature difference."
    if re.match(r"[+-]?\d*_", stripped):
        return "Write the number without underscores."
    if re.match(r"[+-]?\d+(\s\d{3})+(?!\d)", stripped):
        return f"Write the number without spaces: {re.sub(r'(?<=[0-9])[ ](?=[0-9])', '', stripped)}."
    if re.match(r".*\d.*[-+*/^].*\d", stripped) or "**" in stripped:
        return "Arithmetic is not evaluated: give one number and one unit."
    if stripped.lower() in ("nan", "inf", "-inf", "infinity", "+inf"):
        return "Give a finite number."
    if len(text) > _LONGEST:
        return "The text is too long for one number and one unit."
    return "Give one number and one unit."


def _gauge_hint(number: str, unit: str) -> str:
    base = {"psi": ("psi", 14.695949), "atm": ("atm", 1.0), "bar": ("bar", 1.01325), "mbar": ("mbar", 1013.25)}
    spelled, standard = base.get(unit.lower(), (unit, {"kpa": 101.325, "mpa": 0.101325, "hpa": 1013.25}.get(unit.lower(), 101325.0)))
    return (
        f"That is a gauge pressure; pressures are absolute. Over the standard atmosphere it is {float(number) + standard:.6g} {spelled}; "
        f"use the barometer reading of the test if there is one."
    )


def _unknown_unit_hint(unit_text: str, expression: str, unit: str) -> str:
    letters = {"C": "°C", "F": "°F", "R": "°R"}
    if unit == "K" and unit_text in letters:
        return f"For degrees write {letters[unit_text]}."
    registry = _registry()
    try:
        registry.parse_units(expression)
    except Exception:
        return f"{_shorten(repr(unit_text))} is not a known unit; units are case-sensitive (MPa, kg/s, K)."
    return f"{_shorten(repr(unit_text))} is a unit of another kind."


_KINDS = {
    "": ("a number", "3.4"),
    "Pa": ("an absolute pressure", '"7 MPa" or "1015 psia"'),
    "K": ("an absolute temperature", '"298.15 K" or "25 °C"'),
    "m": ("a length", '"0.18 m" or "7.1 in"'),
    "m**2": ("an area", '"0.025 m2"'),
    "kg/s": ("a mass flow", '"12 kg/s"'),
    "N": ("a force", '"80 kN" or "18000 lbf"'),
    "kg/m**3": ("a density", '"810 kg/m3"'),
    "J/mol": ("an energy per amount", '"-24.717 kJ/mol"'),
    "J/kg": ("an energy per mass", '"-1768 kJ/kg"'),
    "kg/mol": ("a molar mass", '"22.2 g/mol"'),
    "J/(kg*K)": ("a specific heat or gas constant", '"375 J/(kg K)"'),
    "m/s": ("a speed", '"1800 m/s"'),
    "s": ("a time", '"315 s"'),
    "radian": ("an angle", '"15 deg"'),
}


def _kind_text(unit: str) -> str:
    return _KINDS.get(unit, (f"a quantity in {shown_unit(unit)}", ""))[0]


def _example(unit: str) -> str:
    return _KINDS.get(unit, ("", f'"1 {unit}"'))[1]


def _si_text(unit: str) -> str:
    return shown_unit(unit) if unit else "no unit"
