"""Where a table of numbers over two axes is at least a level: closed rings, ready to be filled and outlined.

The work is contourpy's, which Bokeh brings along: the table is taken as linear along the lines of its grid, and the frame and
the corners of cells beside NaN, a failed design, close every boundary.
"""

from __future__ import annotations

import math
from typing import Any, Final

import numpy as np
import numpy.typing as npt

Array = npt.NDArray[np.float64]

LEVELS: Final = 9
"""About how many contours a map has."""


def contour_levels(low: float, high: float) -> list[float]:
    """Return round levels that enclose a range, about `LEVELS` of them."""
    if not high > low:
        pad = abs(low) * 1e-3 or 1e-3
        return [low - pad, low + pad]
    raw = (high - low) / LEVELS
    size = 10.0 ** np.floor(np.log10(raw))
    step = size * min((entry for entry in (1.0, 2.0, 2.5, 5.0, 10.0) if entry * size >= raw), default=10.0)
    first, last = np.floor(low / step), np.ceil(high / step)
    return [float(step * place) for place in np.arange(first, last + 1)]


class LevelSets:
    """A table over two ascending axes, ready for any number of levels.

    Parameters
    ----------
    xs, ys : array
        Ascending values of the axes, shape (n,) and (m,).
    table : array
        Values, shape (m, n); NaN where there is none.
    """

    def __init__(self, xs: Array, ys: Array, table: Array) -> None:
        from contourpy import FillType, contour_generator

        shown = np.ma.masked_invalid(table)
        self.highest = float(shown.max()) if shown.count() else -math.inf
        self._generator: Any = contour_generator(xs, ys, shown, name="serial", corner_mask=True, fill_type=FillType.ChunkCombinedOffset)

    def rings(self, level: float) -> tuple[Array, Array]:
        """Return the boundary of where the table is at least `level`: x and y of closed rings, NaN between two rings."""
        if level > self.highest:
            return np.empty(0), np.empty(0)
        above = max(level, self.highest) + max(abs(level), abs(self.highest), 1.0)
        points, offsets = self._generator.filled(level, above)
        if points[0] is None:
            return np.empty(0), np.empty(0)
        found, starts = np.asarray(points[0], dtype=np.float64), np.asarray(offsets[0], dtype=np.intp)
        apart = np.insert(found, starts[1:-1], np.nan, axis=0)
        return apart[:, 0], apart[:, 1]


def label_places(rings: list[tuple[Array, Array]], xs: Array, ys: Array) -> list[tuple[float, float]]:
    """Return where the value of each contour is written; NaN where there is no room.

    The place is near a diagonal, so that it moves little, off the frame and off the other labels.
    """
    wide, high = float(xs[-1] - xs[0]), float(ys[-1] - ys[0])
    placed: list[tuple[float, float]] = []
    found = []
    for x, y in rings:
        across, up = (x - xs[0]) / wide, (y - ys[0]) / high
        free = np.isfinite(across) & (np.minimum(across, 1.0 - across) > 0.06) & (np.minimum(up, 1.0 - up) > 0.05)
        cost = np.where(free, np.minimum(np.abs(across - up), np.abs(1.0 - across - up) + 0.15), np.inf)
        for left, down in placed:
            cost = np.where((np.abs(across - left) < 0.12) & (np.abs(up - down) < 0.07), np.inf, cost)
        place = int(np.argmin(cost)) if len(cost) else 0
        if not len(cost) or not math.isfinite(cost[place]):
            found.append((math.nan, math.nan))
            continue
        placed.append((float(across[place]), float(up[place])))
        found.append((float(x[place]), float(y[place])))
    return found
