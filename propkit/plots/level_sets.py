"""Where a table of numbers over two axes is at least a level: closed rings, ready to be filled and outlined.

The table is taken as linear along the lines of its grid (marching squares); a ring of cells lower than everything is laid
around it, so that every boundary closes. NaN counts as lower than everything: a failed design is left blank.
Source: Lorensen & Cline, Computer Graphics 21 (1987) 163 (marching cubes; here in two dimensions).
"""

from __future__ import annotations

import math
from typing import Final

import numpy as np
import numpy.typing as npt

Array = npt.NDArray[np.float64]
Integers = npt.NDArray[np.intp]

LEVELS: Final = 9
"""About how many contours a map has."""

_BOTTOM, _RIGHT, _TOP, _LEFT = range(4)
_TURNS: Final[dict[int, tuple[tuple[int, int], ...]]] = {
    1: ((_BOTTOM, _LEFT),),
    2: ((_RIGHT, _BOTTOM),),
    3: ((_RIGHT, _LEFT),),
    4: ((_TOP, _RIGHT),),
    5: ((_BOTTOM, _LEFT), (_TOP, _RIGHT)),
    6: ((_TOP, _BOTTOM),),
    7: ((_TOP, _LEFT),),
    8: ((_LEFT, _TOP),),
    9: ((_BOTTOM, _TOP),),
    10: ((_RIGHT, _BOTTOM), (_LEFT, _TOP)),
    11: ((_RIGHT, _TOP),),
    12: ((_LEFT, _RIGHT),),
    13: ((_BOTTOM, _RIGHT),),
    14: ((_LEFT, _BOTTOM),),
    15: (),
    0: (),
    21: ((_TOP, _LEFT), (_BOTTOM, _RIGHT)),
    26: ((_RIGHT, _TOP), (_LEFT, _BOTTOM)),
}
"""Corners inside (1 lower left, 2 lower right, 4 upper right, 8 upper left; 16 for a saddle that is inside at its middle)
to the sides that a boundary enters and leaves by, the inside on its left."""


def _table(which: int) -> Integers:
    """Return the first or the second turn of each kind of cell; -1 where there is none."""
    found = np.full((32, 2), -1, dtype=np.intp)
    for kind, turns in _TURNS.items():
        if len(turns) > which:
            found[kind] = turns[which]
    return found


_FIRST, _SECOND = _table(0), _table(1)
_USED = _FIRST[:, 0] >= 0


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
        self.xs = np.concatenate([xs[:1], xs, xs[-1:]])
        self.ys = np.concatenate([ys[:1], ys, ys[-1:]])
        self.values = np.full((len(self.ys), len(self.xs)), -np.inf)
        self.values[1:-1, 1:-1] = np.where(np.isfinite(table), table, -np.inf)
        rows, columns = self.values.shape
        self.width = columns
        self.first_upright = rows * columns

    def rings(self, level: float) -> tuple[Array, Array]:
        """Return the boundary of where the table is at least `level`: x and y of closed rings, NaN between two rings."""
        inside = self.values >= level
        if not inside.any():
            return np.empty(0), np.empty(0)
        starts, ends = self._segments(inside, level)
        after = dict(zip(starts.tolist(), ends.tolist(), strict=True))
        order: list[int] = []
        while after:
            first, here = after.popitem()
            order += [-1, first]
            while here != first:
                order.append(here)
                here = after.pop(here)
            order.append(first)
        return self._points(np.array(order[1:], dtype=np.intp), level)

    def _segments(self, inside: npt.NDArray[np.bool_], level: float) -> tuple[Integers, Integers]:
        """Return the sides that each piece of the boundary enters and leaves by, as numbers of sides."""
        corners = (inside[:-1, :-1], inside[:-1, 1:], inside[1:, 1:], inside[1:, :-1])
        code = sum((corner.astype(np.intp) << place for place, corner in enumerate(corners)), start=np.zeros(corners[0].shape, dtype=np.intp))
        for row, column in zip(*np.nonzero((code == 5) | (code == 10)), strict=True):
            if self.values[row : row + 2, column : column + 2].mean() >= level:
                code[row, column] += 16
        flat = code.ravel()
        cells = np.flatnonzero(_USED[flat])
        kinds = flat[cells]
        twice = _SECOND[kinds, 0] >= 0
        cells, turns = np.concatenate([cells, cells[twice]]), np.concatenate([_FIRST[kinds], _SECOND[kinds[twice]]])
        rows, columns = np.divmod(cells, code.shape[1])
        level_side = rows * self.width + columns
        sides = np.stack([level_side, self.first_upright + level_side + 1, level_side + self.width, self.first_upright + level_side])
        each = np.arange(len(cells))
        return sides[turns[:, 0], each], sides[turns[:, 1], each]

    def _points(self, sides: Integers, level: float) -> tuple[Array, Array]:
        """Return where the boundary crosses sides; NaN for a side of number -1."""
        gap = sides < 0
        upright = sides >= self.first_upright
        rows, columns = np.divmod(np.where(upright, sides - self.first_upright, sides), self.width)
        rows, columns = np.where(gap, 0, rows), np.where(gap, 0, columns)
        further_row, further_column = rows + upright, columns + (~upright & ~gap)
        here, there = self.values[rows, columns], self.values[further_row, further_column]
        with np.errstate(invalid="ignore", divide="ignore"):
            share = (level - here) / (there - here)
        # beside a blank the boundary stands on the last number
        share = np.where(np.isneginf(here), 1.0, np.where(np.isneginf(there), 0.0, share))
        x = self.xs[columns] + share * (self.xs[further_column] - self.xs[columns])
        y = self.ys[rows] + share * (self.ys[further_row] - self.ys[rows])
        x[gap] = y[gap] = np.nan
        return x, y


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
