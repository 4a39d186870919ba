"""Derivatives of a batch function by differences of fourth order, inside legal ranges, in one evaluation."""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

Array = npt.NDArray[np.float64]
Evaluate = Callable[[dict[str, Array]], Mapping[str, Array]]


@dataclass(frozen=True, slots=True)
class Stencil:
    """Points of the differences and what is made of the results there.

    Parameters
    ----------
    points : array, shape (1 + 4 inputs, inputs)
        The centre first, then four points for each input.
    first, second : array, shape (inputs, 4)
        Weights of the first and second derivative; that of the centre makes their sum nothing.
    """

    points: Array
    first: Array
    second: Array

    def inputs(self, paths: Sequence[str]) -> dict[str, Array]:
        """Return the points as arrays by path."""
        return {path: self.points[:, place].copy() for place, path in enumerate(paths)}

    def slopes(self, table: Array) -> Array:
        """Return first derivatives, shape (results, inputs), from results at the points, shape (results, points)."""
        return _weighted(table, self.first)

    def bends(self, table: Array) -> Array:
        """Return second derivatives, shape (results, inputs)."""
        return _weighted(table, self.second)


def stencil(centre: Array, steps: Array, low: Array, high: Array) -> Stencil:
    """Return the points and weights of differences about `centre`.

    Parameters
    ----------
    centre : array
        Inputs at which the derivatives are wanted, legal.
    steps : array
        Largest distance from the centre, above 0.
    low, high : array
        Legal range of each input; infinite where there is none.

    Returns
    -------
    Stencil
        Both sides where there is room for a hundredth of a step, one side else.

    Notes
    -----
    Central and one-sided difference formulas of fourth order, equal spacing (any text on numerical analysis).
    """
    count = len(centre)
    points = np.tile(centre, (1 + 4 * count, 1))
    first, second = np.zeros((count, 4)), np.zeros((count, 4))
    for place in range(count):
        below, above = centre[place] - low[place], high[place] - centre[place]
        step = float(steps[place])
        if min(below, above) >= 0.01 * step:
            step = min(step, below, above)
            offsets = np.array([-step, -0.5 * step, 0.5 * step, step])
            first[place] = np.array([1.0, -8.0, 8.0, -1.0]) / (6.0 * step)
            second[place] = np.array([-1.0, 16.0, 16.0, -1.0]) / (3.0 * step**2)
        else:
            step = math.copysign(min(step, max(below, above)), above - below)
            offsets = step * np.array([0.25, 0.5, 0.75, 1.0])
            first[place] = np.array([16.0, -12.0, 16.0 / 3.0, -1.0]) / step
            second[place] = np.array([-416.0 / 3.0, 152.0, -224.0 / 3.0, 44.0 / 3.0]) / step**2
        points[1 + 4 * place : 5 + 4 * place, place] = np.clip(centre[place] + offsets, low[place], high[place])
    return Stencil(points, first, second)


def _weighted(table: Array, weights: Array) -> Array:
    results, count = len(table), len(weights)
    around = table[:, 1:].reshape(results, count, 4)
    found: Array = np.einsum("rps,ps->rp", around, weights) - table[:, :1] * weights.sum(axis=1)
    return found
