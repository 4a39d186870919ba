"""Values written with their uncertainty, to the digits that the uncertainty leaves."""

from __future__ import annotations

import math
from dataclasses import dataclass
from decimal import ROUND_HALF_EVEN, Decimal


@dataclass(frozen=True, slots=True)
class Rounded:
    """A value and its uncertainty as texts with the same last decimal place."""

    value: str
    uncertainty: str

    def __str__(self) -> str:
        return f"{self.value} ± {self.uncertainty}"


def rounded(value: float, uncertainty: float, digits: int = 2) -> Rounded:
    """Return a value and its uncertainty rounded to the digits of the uncertainty.

    Parameters
    ----------
    value : float
        Value, any unit.
    uncertainty : float
        Its uncertainty in the same unit.
    digits : int
        Significant digits of the uncertainty, 1 or 2.

    Returns
    -------
    Rounded
        Both as texts without exponents, halves to even.

    Notes
    -----
    At most two significant digits of the uncertainty; the value to the same decimal place.

    Source: JCGM 100:2008, 7.2.6.

    Examples
    --------
    >>> str(rounded(100.02147, 0.00035))
    '100.02147 ± 0.00035'
    >>> str(rounded(10.057623, 0.027))
    '10.058 ± 0.027'
    """
    if not (math.isfinite(value) and math.isfinite(uncertainty) and uncertainty > 0.0):
        return Rounded(f"{value:.6g}", f"{uncertainty:.2g}")
    exponent = math.floor(math.log10(uncertainty)) - (digits - 1)
    step = Decimal(1).scaleb(exponent)
    small = _to(Decimal(repr(uncertainty)), step)
    if small >= step.scaleb(digits):
        step = step.scaleb(1)
        small = _to(Decimal(repr(uncertainty)), step)
    return Rounded(_text(_to(Decimal(repr(value)), step)), _text(small))


def _to(number: Decimal, step: Decimal) -> Decimal:
    return (number / step).quantize(Decimal(1), ROUND_HALF_EVEN) * step


def _text(number: Decimal) -> str:
    text = f"{number:f}"
    return text[1:] if text.startswith("-") and not any(sign in "123456789" for sign in text) else text
