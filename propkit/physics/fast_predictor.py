"""First guesses for the quick engine: Chebyshev polynomials fitted to solutions spread over the box of a study.

Atoms and enthalpy of a study move in few directions (one when the mixture ratio varies); the coordinates are these
principal directions, ln p, and ln of the area ratio or of the exit pressure. The polynomials are fitted by least squares to
solutions at points spread by a Halton sequence with the density of Chebyshev nodes.

Sources: Golub & Van Loan, Matrix Computations (principal directions by singular values); Trefethen, Approximation Theory
and Approximation Practice (Chebyshev polynomials); Halton, Numerische Mathematik 2 (1960) 84.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import lru_cache
from typing import Final

import numpy as np
import numpy.typing as npt

from propkit.physics.arrays import Array
from propkit.physics.equilibrium_terms import Integers

_PRIMES: Final = (2, 3, 5, 7, 11, 13, 17, 19, 23, 29)
_SAME: Final = 1e-9
MARGIN: Final = 0.02
"""Share of the box by which a case may lie outside it."""

NODES_PER_TERM: Final = 1.3


@dataclass(frozen=True, slots=True, eq=False)
class Coordinates:
    """The box of a study: from atoms and enthalpy (row 0 up), and further logarithms, to coordinates from -1 to 1.

    Parameters
    ----------
    centre, directions : array
        Mean of (atoms, enthalpy), each over its size; principal directions, shape (direction, element + 1).
    size : array
        Sizes of atoms and enthalpy.
    low, high : array
        Ends of the box, first along the directions, then of the further logarithms.
    used : array of bool
        Which of the further logarithms vary.
    """

    centre: Array
    directions: Array
    size: Array
    low: Array
    high: Array
    used: npt.NDArray[np.bool_]

    @classmethod
    def of(cls, elements: Array, enthalpy: Array, further: Array) -> Coordinates:
        """Return the box around designs: atoms (element, design), enthalpy (design,), further logarithms (row, design)."""
        whole = np.vstack([elements, enthalpy])
        size = np.abs(whole).max(axis=1)
        size = np.where(size > 0.0, size, 1.0)
        scaled = whole / size[:, None]
        centre = scaled.mean(axis=1)
        left, values, _ = np.linalg.svd(scaled - centre[:, None], full_matrices=False)
        kept = values > _SAME * np.sqrt(scaled.shape[1])
        directions = np.ascontiguousarray(left[:, kept].T)
        along = directions @ (scaled - centre[:, None])
        used = np.ptp(further, axis=1) > _SAME
        every = np.vstack([along, further[used]])
        return cls(centre, directions, size, every.min(axis=1), every.max(axis=1), used)

    @property
    def count(self) -> int:
        """Number of coordinates."""
        return len(self.low)

    def __call__(self, elements: Array, enthalpy: Array, further: Array) -> tuple[Array, npt.NDArray[np.bool_]]:
        """Return coordinates (coordinate, design) clipped to the box, and which designs lie inside it."""
        scaled = np.vstack([elements, enthalpy])
        scaled /= self.size[:, None]
        scaled -= self.centre[:, None]
        along = self.directions @ scaled
        scaled -= self.directions.T @ along
        off = np.abs(scaled).max(axis=0)
        every = np.vstack([along, further[self.used]])
        every -= (0.5 * (self.low + self.high))[:, None]
        every /= (0.5 * (self.high - self.low))[:, None]
        inside = (np.abs(every).max(axis=0, initial=0.0) <= 1.0 + 2.0 * MARGIN) & (off < 1e-6)
        fixed = further[~self.used]
        return np.clip(every, -1.0, 1.0, out=every), inside if not len(fixed) else inside & np.isfinite(fixed).all(axis=0)

    def back(self, coordinates: Array, further: Array) -> tuple[Array, Array, Array]:
        """Return atoms, enthalpy and further logarithms at coordinates; `further` gives those that do not vary."""
        every = 0.5 * (self.low + self.high)[:, None] + 0.5 * (self.high - self.low)[:, None] * coordinates
        count = len(self.directions)
        whole = (self.centre[:, None] + self.directions.T @ every[:count]) * self.size[:, None]
        logs = np.repeat(further[:, :1], coordinates.shape[1], axis=1)
        logs[self.used] = every[count:]
        return whole[:-1], whole[-1], logs


def halton(count: int, dimensions: int) -> Array:
    """Return points of the Halton sequence, shape (dimension, point), from 0 to 1."""
    found = np.empty((dimensions, count))
    for row in range(dimensions):
        base, index = _PRIMES[row], np.arange(1, count + 1)
        value, share = np.zeros(count), 1.0 / base
        while index.any():
            value += share * (index % base)
            index //= base
            share /= base
        found[row] = value
    return found


def nodes(count: int, dimensions: int, pieces: int = 1) -> Array:
    """Return points of the box with the density of Chebyshev nodes in each piece of it, shape (dimension, point), from -1 to 1."""
    local = -np.cos(np.pi * halton(count, dimensions))
    if pieces == 1 or not dimensions:
        return np.asarray(local)
    edges = np.linspace(-1.0, 1.0, pieces + 1)
    found = np.tile(local, pieces)
    centres, halves = 0.5 * (edges[1:] + edges[:-1]), 0.5 * np.diff(edges)
    found[0] = np.concatenate([centre + half * local[0] for centre, half in zip(centres, halves, strict=True)])
    return found


@lru_cache(maxsize=64)
def terms(degrees: tuple[int, ...]) -> Integers:
    """Return the orders of each term of a polynomial: those whose orders, over the degrees, add up to 1 at most."""
    if not degrees:
        return np.zeros((1, 0), dtype=np.intp)
    grid = np.indices([degree + 1 for degree in degrees]).reshape(len(degrees), -1)
    share = (grid / np.array(degrees)[:, None]).sum(axis=0)
    orders = grid[:, share <= 1.0 + 1e-9].T
    fastest = int(np.argmax(degrees))
    keys = [orders[:, fastest], *(orders[:, row] for row in reversed(range(len(degrees))) if row != fastest)]
    return np.ascontiguousarray(orders[np.lexsort(keys)])


@dataclass(frozen=True, slots=True, eq=False)
class Fit:
    """Polynomials of several values over the box, one for each piece of the first coordinate.

    Parameters
    ----------
    orders : array of int
        Orders of each term, shape (term, coordinate).
    coefficients : array
        Shape (piece, value, term).
    """

    orders: Integers
    coefficients: Array

    @classmethod
    def of(cls, coordinates: Array, values: Array, degrees: tuple[int, ...], pieces: int = 1) -> Fit | None:
        """Return the least-squares fit to values (value, point) at coordinates (coordinate, point); None with too few points."""
        orders = terms(degrees)
        found = []
        for which, local in _in_pieces(coordinates, pieces):
            if which.size < len(orders):
                return None
            found.append(np.linalg.lstsq(basis(orders, local).T, values[:, which].T, rcond=1e-12)[0].T)
        return cls(orders, np.ascontiguousarray(np.stack(found))) if len(found) == pieces else None

    def __call__(self, coordinates: Array) -> Array:
        """Return the values at coordinates, shape (value, design)."""
        pieces = len(self.coefficients)
        if pieces == 1:
            return np.asarray(self.coefficients[0] @ basis(self.orders, coordinates))
        out = np.empty((self.coefficients.shape[1], coordinates.shape[1]))
        for number, (which, local) in enumerate(_in_pieces(coordinates, pieces)):
            out[:, which] = self.coefficients[number] @ basis(self.orders, local)
        return out


def _in_pieces(coordinates: Array, pieces: int) -> list[tuple[Integers, Array]]:
    """Return for each piece of the first coordinate its designs and their coordinates within it."""
    if pieces == 1:
        return [(np.arange(coordinates.shape[1]), coordinates)]
    stretched = (coordinates[0] + 1.0) * (0.5 * pieces)
    number = np.clip(stretched.astype(np.intp), 0, pieces - 1)
    found = []
    for piece in range(pieces):
        which = np.flatnonzero(number == piece)
        local = coordinates[:, which]
        local[0] = 2.0 * (stretched[which] - piece) - 1.0
        found.append((which, local))
    return found


def basis(orders: Integers, coordinates: Array) -> Array:
    """Return the terms at coordinates, shape (term, design)."""
    count = coordinates.shape[1]
    out = np.ones((len(orders), count))
    if not len(coordinates):
        return out
    tables = [_chebyshev(int(orders[:, row].max()), coordinates[row]) for row in range(len(coordinates))]
    last = int(np.argmax(orders.max(axis=0)))
    others = [row for row in range(len(coordinates)) if row != last]
    place = 0
    # terms are listed with the coordinate of highest degree running fastest: a run of terms shares everything but that one
    for length, first in _runs(orders.tobytes(), orders.shape[1], last):
        run = out[place : place + length]
        factor = None
        for row in others:
            if first[row]:
                part = tables[row][first[row]]
                factor = part if factor is None else factor * part
        if factor is None:
            run[:] = tables[last][:length]
        else:
            np.multiply(tables[last][:length], factor, out=run)
        place += length
    return out


@lru_cache(maxsize=64)
def _runs(data: bytes, dimensions: int, last: int) -> list[tuple[int, list[int]]]:
    """Return length and first orders of each run of terms."""
    orders = np.frombuffer(data, dtype=np.intp).reshape(-1, dimensions)
    starts = np.flatnonzero(orders[:, last] == 0)
    ends = np.append(starts[1:], len(orders))
    return [(int(end - start), orders[start].tolist()) for start, end in zip(starts, ends, strict=True)]


def _chebyshev(degree: int, u: Array) -> Array:
    found = np.empty((degree + 1, u.size))
    found[0] = 1.0
    if degree:
        found[1] = u
    for k in range(2, degree + 1):
        np.multiply(found[k - 1], u, out=found[k])
        found[k] *= 2.0
        found[k] -= found[k - 2]
    return found
