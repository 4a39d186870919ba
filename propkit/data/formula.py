"""Chemical formulas as text: ``"C H1.95"``, ``"C2H6O"``, ``"N2 O4"``, to element counts and back.

The grammar is element symbols with an optional decimal count, spaces where wanted. Groups in parentheses, hydrate
dots, charges and isotopes are refused: written out, a formula leaves no room for doubt.
"""

from __future__ import annotations

import re
from collections.abc import Mapping
from decimal import Decimal

from propkit.data.atomic_weights import ATOMIC_WEIGHTS
from propkit.errors import InputError, Problem, near_matches

_TERM = re.compile(r"\s*(?P<symbol>[A-Z][a-z]?)(?P<count>\d+(?:\.\d*)?|\.\d+)?")
_SUBSCRIPTS = str.maketrans("₀₁₂₃₄₅₆₇₈₉", "0123456789")
_LONGEST = 200
_LARGEST_COUNT = 1e6
_ALLOWED = 'element symbols with optional counts, for example "C H1.95", "C2H6O" or "N2 O4"'
_ORDER = ("C", "H", "N", "O", "F", "Cl")


def parse_formula(text: str, name: str = "formula") -> dict[str, float]:
    """Return the element counts of a formula.

    Parameters
    ----------
    text : str
        Element symbols with optional decimal counts; the order and spaces are free, a repeated element adds up.
    name : str
        Name of the input for the error text.

    Returns
    -------
    dict
        Element symbol -> count per formula unit [1], in the order of first appearance.

    Raises
    ------
    InputError
        When the text is not of that form, names an unknown element, or has a count of zero.

    Notes
    -----
    ``parse_formula("CH3NO2")`` gives C 1, H 3, N 1, O 2.
    """
    if not isinstance(text, str):
        raise InputError(Problem(name, repr(text), _ALLOWED, "Give the formula as text."))
    shown = repr(text) if len(text) <= 60 else repr(f"{text[:57]}...")
    if len(text) > _LONGEST or not text.strip():
        raise InputError(Problem(name, shown, _ALLOWED, "A formula cannot be empty." if not text.strip() else "That is too long."))
    plain = text.translate(_SUBSCRIPTS)
    counts: dict[str, float] = {}
    position = 0
    while plain[position:].strip():
        match = _TERM.match(plain, position)
        if match is None:
            raise InputError(Problem(name, shown, _ALLOWED, _hint(plain[position:].strip())))
        symbol = match["symbol"]
        if symbol not in ATOMIC_WEIGHTS:
            raise InputError(Problem(name, shown, _ALLOWED, _unknown_element(symbol)))
        count = float(match["count"]) if match["count"] else 1.0
        if count <= 0.0:
            raise InputError(Problem(name, shown, _ALLOWED, f"The count of {symbol} is zero: leave the element out."))
        counts[symbol] = counts.get(symbol, 0.0) + count
        position = match.end()
        if not 1e-9 <= counts[symbol] <= _LARGEST_COUNT:
            raise InputError(Problem(name, shown, _ALLOWED, f"The count of {symbol} is beyond {_LARGEST_COUNT:g} or nearly 0."))
    return counts


def molar_mass(elements: Mapping[str, float]) -> float:
    """Return the molar mass of one formula unit.

    Parameters
    ----------
    elements : Mapping
        Element symbol -> count [1].

    Returns
    -------
    float
        Molar mass [kg/mol], with Cantera's atomic weights.
    """
    return sum(ATOMIC_WEIGHTS[symbol] * count for symbol, count in elements.items()) * 1e-3


def formula_text(elements: Mapping[str, float], digits: int = 6) -> str:
    """Return element counts as a formula that `parse_formula` reads: ``"C H1.95"``."""
    first = [symbol for symbol in _ORDER if symbol in elements]
    rest = sorted(symbol for symbol in elements if symbol not in _ORDER)
    return " ".join(f"{symbol}{_count_text(elements[symbol], digits)}" for symbol in [*first, *rest])


def _count_text(count: float, digits: int) -> str:
    text = f"{count:.{digits}g}"
    return "" if text == "1" else format(Decimal(text), "f") if "e" in text else text


def _hint(rest: str) -> str:
    head = rest[0]
    if head in "()[]{}":
        return "Parentheses are not read: write the formula out, (CH3)2 as C2 H6."
    if head in "·*.":
        return "Hydrate dots are not read: add the counts up."
    if head in "+-":
        return "Charged species are not propellants: leave the charge out."
    if head.isdigit():
        return f"The number {rest.split()[0]} stands alone: write it right behind its element."
    if head.islower():
        return f"Element symbols begin with a capital letter: {rest.split()[0]!r}."
    return f"{head!r} is not part of a formula."


def _unknown_element(symbol: str) -> str:
    near = near_matches(symbol, ATOMIC_WEIGHTS)
    split = symbol[0] in ATOMIC_WEIGHTS and symbol[1:].upper() in ATOMIC_WEIGHTS
    hint = f"{symbol!r} is not an element with a standard atomic weight."
    if split:
        return f"{hint} Did you mean {symbol[0]} {symbol[1:].upper()}?"
    return f"{hint} Near: {', '.join(near)}." if near else hint
