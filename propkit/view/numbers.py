"""Numbers as a person reads them: significant digits, grouped from five digits on, a true minus, powers of ten written out."""

from __future__ import annotations

import math
from collections.abc import Iterable

THIN = "\u202f"
MINUS = "\u2212"
_SUPERSCRIPTS = str.maketrans("-0123456789", "⁻⁰¹²³⁴⁵⁶⁷⁸⁹")
_WIDTHS = {".": 0.6, THIN: 0.4, "×": 1.4, **dict.fromkeys("⁻⁰¹²³⁴⁵⁶⁷⁸⁹", 0.75)}
"""Widths of letters against that of a digit, where they differ; generous, so that nothing spills over."""


def rounded(value: float, digits: int) -> str:
    """Return a number with `digits` significant digits in plain notation (``3594.58``, ``2.903e-05``)."""
    if not math.isfinite(value):
        return {math.inf: "infinite", -math.inf: "-infinite"}.get(value, "-")
    if value == 0.0:
        return "0"
    mantissa, _, power = f"{value:.{max(digits - 1, 0)}e}".partition("e")
    exponent = int(power)
    if exponent >= 7 or exponent < -4:
        return f"{mantissa}e{exponent}"
    return f"{value:.{max(digits - 1 - exponent, 0)}f}"


def pretty(value: float, digits: int) -> str:
    """Return a number as it is set in a sheet: ``12 345.6``, ``2.903 × 10⁻⁵``."""
    text = rounded(value, digits)
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


def latex(value: float, digits: int) -> str:
    r"""Return a number in LaTeX: ``2.903 \times 10^{-5}``."""
    text = rounded(value, digits)
    if not text[-1:].isdigit():
        return rf"\text{{{text}}}"
    mantissa, letter, power = text.partition("e")
    shown = grouped(mantissa).replace(THIN, r"\,").replace(MINUS, "-")
    return rf"{shown} \times 10^{{{power}}}" if letter else shown
