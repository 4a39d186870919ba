"""The second engine as an object sees it: what it solved, and how far the two engines are apart."""

from __future__ import annotations

from typing import Any


def one_line(performance: Any) -> str:
    """Return the outcome of the check in one line."""
    return "second engine: pending"
