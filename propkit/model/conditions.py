"""Conditions that an iterated result satisfies, with both sides evaluated."""

from __future__ import annotations

from collections.abc import Iterator
from typing import Any

import numpy as np

from propkit.report import Step


def condition(name: str, label: str, text: str, latex: str, left: float, right: float, source: str, scale: float = 0.0) -> Step:
    """Return a condition with both sides evaluated; the residual is relative to the larger side, or to `scale`."""
    size = scale or max(abs(left), abs(right)) or 1.0
    return Step(
        name=name,
        label=label,
        text=text,
        latex=latex,
        numbers=f"{left:.10g} = {right:.10g}",
        source=source,
        left=float(left),
        right=float(right),
        residual=float(abs(left - right) / size),
    )


def element_conditions(symbols: tuple[str, ...], atoms: np.ndarray[Any, Any], found: np.ndarray[Any, Any]) -> Iterator[Step]:
    """Yield the balance of each element: atoms in the propellants against atoms in the products."""
    for symbol, given, made in zip(symbols, atoms, found, strict=True):
        yield condition(
            f"balance_{symbol}",
            f"balance of {symbol} [mol/kg]",
            f"atoms of {symbol} in the products = atoms in the propellants",
            rf"\sum_j a_{{{symbol} j}} n_j = b_{{{symbol}}}",
            float(made),
            float(given),
            "conservation",
        )
