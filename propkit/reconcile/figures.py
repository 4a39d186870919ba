"""Reading quoted figures: a value, a standard uncertainty (given, or inferred from the printed digits), a level."""

from __future__ import annotations

import math
import re
from dataclasses import dataclass
from typing import Any

from propkit import quantities, units
from propkit.errors import InputError, Problem
from propkit.study.distributions import Distribution, spread

LEVELS = ("chamber", "engine")
_PRINTED = re.compile(r"\s*[+-]?(?P<whole>\d*)(?:\.(?P<part>\d*))?(?:[eE](?P<power>[+-]?\d+))?")


@dataclass(frozen=True, slots=True)
class QuotedFigure:
    """One figure as given, in SI.

    Parameters
    ----------
    name : str
        The name it was given by.
    key : str
        What the model calls it.
    value, uncertainty : float
        Value and standard uncertainty in SI.
    quantity : Quantity
        Catalogue row.
    inferred : bool
        Whether the uncertainty was inferred from the printed digits.
    level : str
        ``"chamber"`` or ``"engine"``; the two differ where turbine gas is dumped.
    typed : str
        The value as it was typed.
    """

    name: str
    key: str
    value: float
    uncertainty: float
    quantity: quantities.Quantity
    inferred: bool
    level: str
    typed: str


def read_figure(name: str, key: str, given: Any, quantity: quantities.Quantity, level: str) -> QuotedFigure:
    """Return a quoted figure.

    Parameters
    ----------
    name, key : str
        The name it was given by, and what the model calls it.
    given : str, quantity or tuple
        ``"812 kN"`` (the uncertainty is inferred from the digits), or ``("812 kN", "1 %")``, or with its level
        ``("812 kN", "1 %", "engine")``; the uncertainty is one standard uncertainty, or a distribution such as
        ``pk.Normal("2 %", k=2)``. None in its place infers it.
    quantity : Quantity
        Catalogue row.
    level : str
        Level where the figure does not say.

    Returns
    -------
    QuotedFigure
        In SI.

    Raises
    ------
    InputError
        For a value, uncertainty or level that is none.
    """
    value, doubt, stated = _parts(name, given)
    unit = quantity.unit
    si = units.to_si(value, unit, name)
    if stated is not None and stated not in LEVELS:
        raise InputError(Problem(name, repr(stated), "'chamber' or 'engine' as its level"))
    inferred = doubt is None
    if isinstance(doubt, Distribution):
        uncertainty = doubt.resolve(si, unit, f"uncertainty of {name}").standard_uncertainty
    elif inferred:
        uncertainty = printed_uncertainty(value, unit, name)
    else:
        uncertainty = spread(doubt, si, unit, f"uncertainty of {name}")
    shown = value if isinstance(value, str) else f"{value}"
    return QuotedFigure(name, key, si, uncertainty, quantity, inferred, stated or level, shown)


def _parts(name: str, given: Any) -> tuple[Any, Any, str | None]:
    if not isinstance(given, tuple | list):
        return given, None, None
    if len(given) == 2 and given[1] in LEVELS:
        return given[0], None, given[1]
    if len(given) in (2, 3):
        return given[0], given[1], given[2] if len(given) == 3 else None
    allowed = "a value, or (value, standard uncertainty), or (value, standard uncertainty, level)"
    raise InputError(Problem(name, f"a tuple of {len(given)}", allowed))


def printed_uncertainty(value: Any, unit: str, name: str = "figure") -> float:
    """Return the standard uncertainty of a figure of which nothing but its printed digits is known.

    Parameters
    ----------
    value : str
        The figure as printed, with its unit: ``"812 kN"``.
    unit : str
        SI unit in pint's spelling.
    name : str
        The figure's name, for error texts.

    Returns
    -------
    float
        Half a unit of the last printed digit over the square root of 3 [unit].

    Raises
    ------
    InputError
        For a figure that is no text: a number in the computer has no printed digits.

    Notes
    -----
    Rounding leaves a uniform distribution over half a unit of the last digit to both sides.

    Source: JCGM 100:2008, 4.3.7 and F.2.2.1.

    Examples
    --------
    >>> round(printed_uncertainty("812 kN", "N"), 3)
    288.675
    """
    match = _PRINTED.match(value) if isinstance(value, str) else None
    if match is None:
        allowed = "given with its standard uncertainty, as (value, uncertainty)"
        raise InputError(Problem(name, f"{value!r}", allowed, "Only a text such as '812 kN' has printed digits."))
    place = int(match["power"] or 0) - len(match["part"] or "")
    rest = value[match.end() :].strip()

    def at(number: float) -> float:
        return units.to_si(f"{number:.17g} {rest}" if rest else number, unit, name)

    step = abs(at(10.0**place) - at(0.0))
    return 0.5 * step / math.sqrt(3.0)
