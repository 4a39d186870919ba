"""Standard-state properties of a table of species, for a whole batch of temperatures at once.

The data are seven-coefficient polynomials in two temperature ranges. Outside its range a species keeps the heat
capacity of the limit, so that enthalpy and entropy stay continuous and monotonic; that continuation has the same
seven-coefficient form, so every species has one row of coefficients in each interval between breakpoints.
"""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import NamedTuple

import numpy as np
import numpy.typing as npt

from propkit.constants import REFERENCE_PRESSURE
from propkit.physics.arrays import Array, Values, values

_COEFFICIENTS = 7


class StandardProperties(NamedTuple):
    """Dimensionless standard-state properties, each of shape (case, species).

    Parameters
    ----------
    heat_capacity : array
        cp / R.
    enthalpy : array
        h / (R T).
    entropy : array
        s / R, at the reference pressure of the table.
    gibbs_energy : array
        g / (R T), at the reference pressure of the table.
    """

    heat_capacity: Array
    enthalpy: Array
    entropy: Array
    gibbs_energy: Array


_EXPONENTS = np.array([0.0, 1.0, 2.0, 3.0, 4.0, -1.0, 0.0])
_FACTORS = np.array(
    [
        [1.0, 1.0, 1.0, 1.0, 1.0, 0.0, 0.0],
        [1.0, 1.0 / 2.0, 1.0 / 3.0, 1.0 / 4.0, 1.0 / 5.0, 1.0, 0.0],
        [0.0, 1.0, 1.0 / 2.0, 1.0 / 3.0, 1.0 / 4.0, 0.0, 1.0],
    ]
)[:, None, :]


def powers(temperature: Array) -> Array:
    """Return what multiplies the seven coefficients in cp/R, h/(R T) and s/R.

    Parameters
    ----------
    temperature : array
        Temperature [K], shape (case,).

    Returns
    -------
    array
        For cp/R, h/(R T) and s/R, shape (3, case, 7).

    Notes
    -----
    cp/R = a1 + a2 T + a3 T^2 + a4 T^3 + a5 T^4; h/(R T) and s/R are its integrals with the constants a6 and a7.

    Source: NASA TM-4513, equations 1 to 3 (seven coefficients in each range).
    """
    factors: Array = _FACTORS * temperature[:, None] ** _EXPONENTS
    factors[2, :, 0] = np.log(temperature)
    return factors


@dataclass(frozen=True, slots=True, eq=False)
class SpeciesTable:
    """The species of a case and their standard-state data.

    Parameters
    ----------
    names : tuple of str
        ASCII formula keys, for instance "H2O", "C2H2 (acetylene)", "Al2O3 (liquid)"; gas species first.
    elements : tuple of str
        Chemical symbols, in the order of the columns of `composition`.
    composition : array
        Atoms in each formula, shape (species, elements).
    molar_mass : array
        Molar mass [kg/mol], shape (species,).
    temperature_low, temperature_mid, temperature_high : array
        Limits of the two ranges [K], shape (species,).
    coefficients_low, coefficients_high : array
        Seven coefficients below and above `temperature_mid`, shape (species, 7).
    condensed : array of bool
        True for liquids and solids, shape (species,).
    reference_pressure : float
        Standard-state pressure [Pa].
    """

    names: tuple[str, ...]
    elements: tuple[str, ...]
    composition: Array
    molar_mass: Array
    temperature_low: Array
    temperature_mid: Array
    temperature_high: Array
    coefficients_low: Array
    coefficients_high: Array
    condensed: npt.NDArray[np.bool_]
    reference_pressure: float = REFERENCE_PRESSURE
    breakpoints: Array = field(init=False, repr=False)
    segments: Array = field(init=False, repr=False)
    parts: dict[bytes, tuple[SpeciesTable, npt.NDArray[np.intp]]] = field(init=False, repr=False, default_factory=dict)

    def __post_init__(self) -> None:
        breakpoints, segments = _segments(self)
        object.__setattr__(self, "breakpoints", breakpoints)
        object.__setattr__(self, "segments", segments)
        for name in ("composition", "molar_mass", "temperature_low", "temperature_mid", "temperature_high",
                     "coefficients_low", "coefficients_high", "condensed", "breakpoints", "segments"):  # fmt: skip
            getattr(self, name).setflags(write=False)

    @property
    def gas_count(self) -> int:
        """Number of gas species; they come first."""
        return int(np.count_nonzero(~self.condensed))

    def properties(self, temperature: Values) -> StandardProperties:
        """Standard-state properties of every species at each temperature.

        Parameters
        ----------
        temperature : float or array
            Temperature [K], above 0, shape (case,).

        Returns
        -------
        StandardProperties
            cp/R, h/(R T), s/R, g/(R T), each of shape (case, species).

        Notes
        -----
        Outside the range of a species its heat capacity is held at the value at the limit.

        Source: NASA TM-4513, equations 1 to 3.
        """
        t = np.atleast_1d(values(temperature))
        cp, h, s = apply_segments(powers(t), self.interval(t), self.segments)
        return StandardProperties(cp, h, s, h - s)

    def interval(self, temperature: Array) -> npt.NDArray[np.intp]:
        """Return the number of the interval between breakpoints that each temperature [K] falls in."""
        return np.searchsorted(self.breakpoints, temperature.real, side="right")

    def part(self, present: npt.NDArray[np.bool_]) -> tuple[SpeciesTable, npt.NDArray[np.intp]]:
        """Return the species that can form when only some of the elements are present.

        Parameters
        ----------
        present : array of bool
            Which elements are present, shape (element,).

        Returns
        -------
        tuple
            The smaller table, and the rows of this table that it has. Kept for the next call.
        """
        key = present.tobytes()
        if key not in self.parts:
            rows = np.flatnonzero(~(self.composition[:, ~present] > 0.0).any(axis=1))
            self.parts[key] = (self.take(rows, np.flatnonzero(present)), rows)
        return self.parts[key]

    def take(self, species: npt.ArrayLike, elements: npt.ArrayLike | None = None) -> SpeciesTable:
        """Return the table of some of the species, and of some of the elements where `elements` is given.

        Parameters
        ----------
        species : array of int or bool
            Which species.
        elements : array of int or bool, optional
            Which elements; the others must not occur in the species kept.

        Returns
        -------
        SpeciesTable
            The smaller table.
        """
        rows = np.arange(len(self.names))[np.asarray(species)]
        columns = np.arange(len(self.elements)) if elements is None else np.arange(len(self.elements))[np.asarray(elements)]
        return SpeciesTable(
            names=tuple(self.names[row] for row in rows),
            elements=tuple(self.elements[column] for column in columns),
            composition=np.ascontiguousarray(self.composition[np.ix_(rows, columns)]),
            molar_mass=self.molar_mass[rows],
            temperature_low=self.temperature_low[rows],
            temperature_mid=self.temperature_mid[rows],
            temperature_high=self.temperature_high[rows],
            coefficients_low=self.coefficients_low[rows],
            coefficients_high=self.coefficients_high[rows],
            condensed=self.condensed[rows],
            reference_pressure=self.reference_pressure,
        )


def apply_segments(factors: Array, interval: npt.NDArray[np.intp], segments: Array) -> Array:
    """Multiply the powers of each case by the coefficients of the interval that the case falls in.

    Parameters
    ----------
    factors : array
        Powers of temperature, shape (3, case, 7).
    interval : array of int
        Interval of each case.
    segments : array
        Coefficients, shape (interval, 7, species).

    Returns
    -------
    array
        cp/R, h/(R T), s/R, shape (3, case, species).
    """
    count, first = interval.size, int(interval[0])
    if count == 1 or (interval == first).all():
        return np.asarray(factors.reshape(3 * count, _COEFFICIENTS) @ segments[first]).reshape(3, count, -1)
    out = np.empty((3, count, segments.shape[2]), dtype=factors.dtype)
    for number in np.unique(interval):
        rows = np.flatnonzero(interval == number)
        out[:, rows] = (factors[:, rows].reshape(-1, _COEFFICIENTS) @ segments[number]).reshape(3, rows.size, -1)
    return out


def _segments(table: SpeciesTable) -> tuple[Array, Array]:
    """Return the breakpoints [K] and, for each interval between them, the coefficients (interval, 7, species)."""
    low, mid, high = table.temperature_low, table.temperature_mid, table.temperature_high
    breakpoints = np.unique(np.concatenate([low, mid, high]))
    edges = np.concatenate([[0.5 * breakpoints[0]], breakpoints, [2.0 * breakpoints[-1]]])
    below = _held(table.coefficients_low, low)
    above = _held(np.where((mid < high)[:, None], table.coefficients_high, table.coefficients_low), high)
    segments = np.empty((breakpoints.size + 1, _COEFFICIENTS, len(table.names)))
    for number in range(breakpoints.size + 1):
        middle = 0.5 * (edges[number] + edges[number + 1])
        inside = np.where((middle < mid)[:, None], table.coefficients_low, table.coefficients_high)
        chosen = np.where((middle < low)[:, None], below, np.where((middle > high)[:, None], above, inside))
        segments[number] = chosen.T
    return breakpoints, segments


def _held(coefficients: Array, limit: Array) -> Array:
    """Return coefficients of constant heat capacity that continue enthalpy and entropy from `limit` [K]."""
    cp, h, s = (np.einsum("ij,ij->i", part, coefficients) for part in powers(limit))
    held = np.zeros_like(coefficients)
    held[:, 0] = cp
    held[:, 5] = (h - cp) * limit
    held[:, 6] = s - cp * np.log(limit)
    return held
