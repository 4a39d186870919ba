"""Limits of an axis: round, so that they stay while a value moves a little, and wide enough for every point."""

from __future__ import annotations

import math
from collections.abc import Iterable


def round_limits(values: Iterable[float], low: float | None = None, high: float | None = None) -> tuple[float, float]:
    """Return round limits around the finite `values`.

    Parameters
    ----------
    values : iterable of float
        What must be inside; NaN and infinities do not count.
    low, high : float, optional
        Limits that are fixed.

    Returns
    -------
    tuple of float
        Lower and upper limit, the lower below the upper.
    """
    finite = [value for value in values if math.isfinite(value)]
    smallest = min(finite, default=0.0) if low is None else low
    largest = max(finite, default=1.0) if high is None else high
    if not smallest < largest:
        room = 0.1 * abs(smallest) or 1.0
        smallest, largest = (smallest - room if low is None else low), (largest + room if high is None else smallest + room)
    step = nice_step((largest - smallest) / 5.0)
    margin = 0.02 * (largest - smallest)
    if low is None:
        smallest = step * math.floor((smallest - margin) / step + 1e-9) if smallest != 0.0 else 0.0
    if high is None:
        largest = step * math.ceil((largest + margin) / step - 1e-9)
    return smallest, largest


def nice_step(size: float) -> float:
    """Return 1, 2 or 5 times a power of ten, at least `size`."""
    power = 10.0 ** math.floor(math.log10(size))
    return next(factor * power for factor in (1.0, 2.0, 5.0, 10.0) if factor * power >= size * (1.0 - 1e-12))
