"""Numbers as a person reads them: significant digits, grouped from five digits on, a true minus, powers of ten written out.

With an uncertainty beside it a value has the decimals that the uncertainty leaves, whatever its own digits.
"""

from __future__ import annotations

import math
from collections.abc import Iterable
from dataclasses import dataclass
from decimal import ROUND_HALF_EVEN, Decimal

THIN = "\u202f"
MINUS = "\u2212"
_SUPERSCRIPTS = str.maketrans("-0123456789", "⁻⁰¹²³⁴⁵⁶⁷⁸⁹")
_WIDTHS = {".": 0.6, THIN: 0.4, "×": 1.4, **dict.fromkeys("⁻⁰¹²³⁴⁵⁶⁷⁸⁹", 0.75)}
"""Widths of letters against that of a digit, where they differ; generous, so that nothing spills over."""


def rounded(value: float, digits: int, uncertainty: float | None = None) -> str:
    """Return a number with `digits` significant digits, or those its uncertainty leaves, in plain notation (``3594.58``, ``2.903e-5``)."""
    if _doubtful(value, uncertainty):
        return beside(value, uncertainty).value  # type: ignore[arg-type]
    if not math.isfinite(value):
        return {math.inf: "infinite", -math.inf: "-infinite"}.get(value, "-")
    if value == 0.0:
        return "0"
    mantissa, _, power = f"{value:.{max(digits - 1, 0)}e}".partition("e")
    exponent = int(power)
    if exponent >= 7 or exponent < -4:
        return f"{mantissa}e{exponent}"
    return f"{value:.{max(digits - 1 - exponent, 0)}f}"


@dataclass(frozen=True, slots=True)
class Rounded:
    """A value and its uncertainty as texts with the same last decimal place."""

    value: str
    uncertainty: str

    def __str__(self) -> str:
        return f"{self.value} ± {self.uncertainty}"


def rounded_together(value: float, uncertainty: float, digits: int = 2) -> Rounded:
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
    >>> str(rounded_together(100.02147, 0.00035))
    '100.02147 ± 0.00035'
    >>> str(rounded_together(10.057623, 0.027))
    '10.058 ± 0.027'
    """
    if not (math.isfinite(value) and math.isfinite(uncertainty) and uncertainty > 0.0):
        return Rounded(rounded(value, 6), rounded(uncertainty, 2))
    exponent = math.floor(math.log10(uncertainty)) - (digits - 1)
    step = Decimal(1).scaleb(exponent)
    small = _to(Decimal(repr(float(uncertainty))), step)
    if small >= step.scaleb(digits):
        step = step.scaleb(1)
        small = _to(Decimal(repr(float(uncertainty))), step)
    return Rounded(_text(_to(Decimal(repr(float(value))), step)), _text(small))


def _to(number: Decimal, step: Decimal) -> Decimal:
    return (number / step).quantize(Decimal(1), ROUND_HALF_EVEN) * step


def _text(number: Decimal) -> str:
    text = f"{number:f}"
    return text[1:] if text.startswith("-") and not any(sign in "123456789" for sign in text) else text


def _doubtful(value: float, uncertainty: float | None) -> bool:
    return uncertainty is not None and math.isfinite(value) and math.isfinite(uncertainty) and uncertainty > 0.0


def beside(value: float, uncertainty: float) -> Rounded:
    """Return a value and its uncertainty rounded together, with one power of ten for both where a sheet would use one."""
    if not _doubtful(value, uncertainty):
        return Rounded(rounded(value, 6), rounded(uncertainty, 2))
    exponent = math.floor(math.log10(max(abs(value), uncertainty)))
    if -4 <= exponent < 7:
        return rounded_together(value, uncertainty)
    scale = 10.0**exponent
    pair = rounded_together(value / scale, uncertainty / scale)
    return Rounded(f"{pair.value}e{exponent}", f"{pair.uncertainty}e{exponent}")


def pretty(value: float, digits: int, uncertainty: float | None = None) -> str:
    """Return a number as it is set in a sheet: ``12 345.6``, ``2.903 × 10⁻⁵``; with the decimals of its uncertainty where it has one."""
    return _set(rounded(value, digits, uncertainty))


def pretty_uncertainty(value: float, uncertainty: float) -> str:
    """Return the uncertainty of a number as it is set behind it."""
    return _set(beside(value, uncertainty).uncertainty)


def _set(text: str) -> str:
    mantissa, letter, power = text.partition("e")
    if not letter or not power.lstrip("-").isdigit():
        return grouped(text) if text[-1:].isdigit() else text
    return f"{grouped(mantissa)}{THIN}×{THIN}10{power.translate(_SUPERSCRIPTS)}"


def grouped(text: str) -> str:
    """Return a plain number whose whole part is grouped by threes from five digits on, with a true minus."""
    sign, body = (MINUS, text[1:]) if text.startswith("-") else ("", text)
    whole, point, part = body.partition(".")
    if len(whole) > 4:
        head = len(whole) % 3
        groups = ([whole[:head]] if head else []) + [whole[k : k + 3] for k in range(head, len(whole), 3)]
        whole = THIN.join(groups)
    return f"{sign}{whole}{point}{part}"


def split(text: str) -> tuple[str, str]:
    """Return a number as it is set, cut before its decimal sign or, without one, before its power of ten."""
    for sign in (".", f"{THIN}×"):
        head, found, tail = text.partition(sign)
        if found:
            return head, found + tail
    return text, ""


def lined_up(texts: Iterable[str]) -> list[str]:
    """Return plain numbers padded to one width, their decimal signs in one column of a terminal."""
    cut = [plain_split(text) for text in texts]
    before = max((len(head) for head, _ in cut), default=0)
    behind = max((len(tail) for _, tail in cut), default=0)
    return [f"{head:>{before}}{tail:<{behind}}" for head, tail in cut]


def plain_split(text: str) -> tuple[str, str]:
    """Return a plain number cut before its decimal sign or its exponent."""
    place = next((k for k, letter in enumerate(text) if letter in ".e"), len(text))
    return text[:place], text[place:]


def room(texts: Iterable[str]) -> int:
    """Return the width, in digits, that the parts behind the decimal sign need at most."""
    return max((math.ceil(sum(_WIDTHS.get(letter, 1.0) for letter in split(text)[1])) for text in texts), default=0)


def latex(value: float, digits: int, uncertainty: float | None = None) -> str:
    r"""Return a number in LaTeX: ``2.903 \times 10^{-5}``; with its uncertainty where it has one."""
    text = _latex(rounded(value, digits, uncertainty))
    return text if uncertainty is None else rf"{text} \pm {_latex(beside(value, uncertainty).uncertainty)}"


def _latex(text: str) -> str:
    if not text[-1:].isdigit():
        return rf"\text{{{text}}}"
    mantissa, letter, power = text.partition("e")
    shown = grouped(mantissa).replace(THIN, r"\,").replace(MINUS, "-")
    return rf"{shown} \times 10^{{{power}}}" if letter else shown
