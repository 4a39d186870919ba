"""Texts of a panel: numbers with the digits of the catalogue, symbols, labels."""

from __future__ import annotations

import math
import re
from html import escape

MINUS = "\N{MINUS SIGN}"
_GREEK = {"epsilon": "ε", "eta": "η", "phi": "φ", "rho": "ρ", "gamma": "γ", "Omega": "Ω", "Delta": "Δ"}


def sentence(text: str) -> str:
    """Return a label with a capital at its head."""
    return text if text.startswith("c*") else text[:1].upper() + text[1:]


def number(value: float, digits: int) -> str:
    """Return a number with `digits` significant digits, as a decimal where that is readable."""
    if not math.isfinite(value):
        return "–"
    if value == 0.0:
        return "0"
    exponent = math.floor(math.log10(abs(float(f"{value:.{digits - 1}e}"))))
    if -4 <= exponent < 7:
        return f"{value:.{max(0, digits - 1 - exponent)}f}".replace("-", MINUS)
    return f"{value:.{digits - 1}e}".replace("-", MINUS)


def value(given: float | str | None, digits: int) -> str:
    """Return a value of a row as text."""
    if given is None:
        return "–"
    return number(given, digits) if isinstance(given, int | float) else given


def difference(step: float, beside: float, digits: int) -> str:
    """Return a difference with the decimals that the value beside it has."""
    text = number(beside, digits)
    decimals = len(text.partition(".")[2]) if "e" not in text else digits
    shown = f"{step:+.{decimals}f}"
    if float(shown) == 0.0:
        return "±0" if step == 0.0 else ("<" if abs(step) else "") + f"{10.0**-decimals:.{decimals}f}"
    return shown.replace("-", MINUS)


def symbol(latex: str) -> str:
    """Return a symbol of the catalogue as HTML."""
    return _markup(latex) if latex else ""


def _markup(text: str) -> str:
    made, rest = "", text
    while rest:
        if match := re.match(r"\\dot\{(\w)\}", rest):
            made += f"<i>{match[1]}\N{COMBINING DOT ABOVE}</i>"
        elif match := re.match(r"\\mathrm\{(\w+)\}", rest):
            made += match[1]
        elif match := re.match(r"\\([A-Za-z]+) ?", rest):
            made += f"<i>{_GREEK.get(match[1], match[1])}</i>"
        elif match := re.match(r"([_^])\{((?:[^{}]|\{[^{}]*\})*)\}", rest):
            tag = "sub" if match[1] == "_" else "sup"
            inner = match[2].replace("*", "∗")
            made += f"<{tag}>{_markup(inner) if chr(92) in inner or '{' in inner else escape(inner)}</{tag}>"
        else:
            match = re.match(r".", rest, re.DOTALL)
            assert match is not None
            made += f"<i>{escape(match[0])}</i>" if match[0].isalpha() else escape(match[0])
        rest = rest[match.end() :]
    return made
