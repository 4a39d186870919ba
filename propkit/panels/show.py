"""Texts of a panel: numbers, differences and labels, set as in a sheet."""

from __future__ import annotations

import math

from propkit.view.numbers import MINUS, grouped, pretty
from propkit.view.symbols import html_symbol

ABSENT = "–"


def sentence(text: str) -> str:
    """Return a label with a capital at its head."""
    return text if text.startswith("c*") else text[:1].upper() + text[1:]


def value(given: float | str | None, digits: int) -> str:
    """Return a value of a row as text."""
    if given is None or (isinstance(given, float) and not math.isfinite(given)):
        return ABSENT
    return pretty(float(given), digits) if isinstance(given, int | float) else given


def difference(step: float, beside: float, digits: int) -> str:
    """Return a difference with the decimals that the value beside it has."""
    if not math.isfinite(step):
        return ABSENT
    if step == 0.0:
        return "±0"
    shown = pretty(beside, digits)
    if "×" in shown:
        return signed(pretty(abs(step), digits), step)
    decimals = len(shown.partition(".")[2])
    text = f"{abs(step):.{decimals}f}"
    return signed(grouped(text), step) if float(text) else f"<{10.0**-decimals:.{decimals}f}"


def signed(text: str, step: float) -> str:
    """Return a text behind the sign of a difference."""
    return f"{'+' if step > 0.0 else MINUS}{text}"


def symbol(latex: str) -> str:
    """Return a symbol of the catalogue as HTML."""
    return html_symbol(latex) if latex else ""
