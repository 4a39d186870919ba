"""What the equilibrium iteration works on: the unknowns of a batch, the question asked, sums over species, the end."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, field, fields
from typing import Any, Final, Literal

import numpy as np
import numpy.typing as npt

from propkit.physics.arrays import Array
from propkit.physics.thermodynamics import SpeciesTable

Given = Literal["temperature", "enthalpy", "entropy"]
Integers = npt.NDArray[np.intp]

LOWEST_TEMPERATURE: Final = 10.0
"""Lowest temperature [K] searched; heat capacities are held below the tables."""

LOWEST_HELD_TEMPERATURE: Final = 1.0
"""Lowest temperature [K] of a gas of held composition, whose heat capacity is constant there: monatomic gas cools that far."""


@dataclass(slots=True, eq=False)
class Unknowns:
    """What the iteration moves, one row for each case.

    Parameters
    ----------
    log_amounts : array
        ln of the moles of each gas species in a kilogram, shape (case, gas species).
    potentials : array
        Element potentials over R T, shape (case, element).
    log_moles, log_temperature, log_pressure : array
        ln of the moles of gas [mol/kg], of T [K] and of p over the reference pressure, shape (case,).
    slots : array of int
        Row of the table of each active liquid or solid, -1 for an empty slot, shape (case, slot).
    slot_amounts : array
        Its amount [mol/kg], shape (case, slot).
    """

    log_amounts: Array
    potentials: Array
    log_moles: Array
    log_temperature: Array
    log_pressure: Array
    slots: Integers
    slot_amounts: Array

    def take(self, rows: Any) -> Unknowns:
        """Return the unknowns of some cases (a copy)."""
        return Unknowns(*(getattr(self, part.name)[rows] for part in fields(self)))

    def complex(self) -> Unknowns:
        """Return the unknowns with room for tangents (a copy)."""
        parts = (getattr(self, part.name) for part in fields(self))
        return Unknowns(*(part.astype(np.complex128) if part.dtype.kind == "f" else part.copy() for part in parts))

    def put(self, rows: Any, other: Unknowns) -> None:
        """Overwrite some cases."""
        for part in fields(self):
            getattr(self, part.name)[rows] = getattr(other, part.name)


@dataclass(frozen=True, slots=True, eq=False)
class FlowTrial:
    """What a flow condition sees of each case: the state a step at constant pressure leads to, and how p moves it.

    Parameters
    ----------
    log_pressure, log_moles, log_temperature : array
        ln of p over the reference pressure, of the moles of gas [mol/kg], of T [K].
    enthalpy : array
        Specific enthalpy [J/kg].
    moles_slope, temperature_slope : array
        d ln N / d ln p and d ln T / d ln p at constant entropy.
    """

    log_pressure: Array
    log_moles: Array
    log_temperature: Array
    enthalpy: Array
    moles_slope: Array
    temperature_slope: Array


FlowCondition = Callable[[FlowTrial, Integers], tuple[Array, Array]]
"""(trial, case numbers) -> (residual, its derivative with respect to ln p at constant entropy)."""


@dataclass(slots=True, eq=False)
class Problem:
    """A batch to solve: what does not move.

    Parameters
    ----------
    table : SpeciesTable
        The species; gas species first.
    elements : array
        Moles of atoms in a kilogram, all above zero, shape (case, element) [mol/kg].
    given : {"temperature", "enthalpy", "entropy"}
        What is held together with the pressure.
    target : array
        T [K], h [J/kg] or s [J/(kg K)], shape (case,).
    condition : FlowCondition, optional
        Moves the pressure too, until its residual is zero; with entropy given only.
    """

    table: SpeciesTable
    elements: Array
    given: Given
    target: Array
    condition: FlowCondition | None = None
    bordered: Array = field(init=False)
    atoms: Array = field(init=False)
    products: Array = field(init=False)
    log_bounds: Array = field(init=False)

    def __post_init__(self) -> None:
        gas = self.table.gas_count
        self.bordered = np.hstack([self.table.composition[:gas], np.ones((gas, 1))])
        size = self.bordered.shape[1]
        self.atoms = np.ascontiguousarray(self.bordered[:, :-1].T)
        self.products = (self.bordered[:, :, None] * self.bordered[:, None, :]).reshape(gas, size * size)
        self.log_bounds = self._log_bounds()

    def _log_bounds(self) -> Array:
        """Return ln of what the elements of each case could form of each gas species at most, shape (case, species)."""
        log_elements = np.log(self.elements.real)
        bounds = np.full((self.elements.shape[0], self.table.gas_count), np.inf)
        for column in range(self.elements.shape[1]):
            has = self.bordered[:, column] > 0.0
            reach = log_elements[:, column, None] - np.log(self.bordered[has, column])
            bounds[:, has] = np.minimum(bounds[:, has], reach)
        return bounds


@dataclass(slots=True, eq=False)
class Sums:
    """Sums over species at the current unknowns, and the matrix they make; one row for each case.

    Parameters
    ----------
    matrix : array
        Symmetric matrix of the step: elements, gas, energy, slots.
    shortfall : array
        Right-hand side without the energy row and without the q terms.
    correction : array
        What the q terms add to every row.
    gas_enthalpy, distance : array
        h/(R T) and q of each gas species.
    moles, total : array
        The variable N, and the sum of the amounts [mol/kg].
    enthalpy, entropy, heat_capacity : array
        H/(R T), S/R and frozen cp/R of one kilogram [mol/kg].
    residual : array
        Largest of the relative residuals of elements, gas, equilibrium and slots; energy not counted.
    spread : array
        Sum of n q^2 [mol/kg].
    """

    matrix: Array
    shortfall: Array
    correction: Array
    gas_enthalpy: Array
    distance: Array
    moles: Array
    total: Array
    enthalpy: Array
    entropy: Array
    heat_capacity: Array
    residual: Array
    spread: Array


@dataclass(slots=True, eq=False)
class Outcome:
    """What an iteration came to, one row for each case.

    Parameters
    ----------
    unknowns : Unknowns
        The last unknowns.
    sums : array
        H/(R T), S/R and frozen cp/R of one kilogram, shape (case, 3) [mol/kg].
    slopes : array
        d ln N and d ln T for a heating of R T in a kilogram at constant pressure, then d ln N / d ln p and
        d ln T / d ln p at constant entropy, shape (case, 4).
    iterations : array of int
        Steps taken.
    residual : array
        Relative residual.
    converged : array of bool
        Whether the tolerance was met.
    """

    unknowns: Unknowns
    sums: Array
    slopes: Array
    iterations: Integers
    residual: Array
    converged: npt.NDArray[np.bool_]

    def take(self, rows: Any) -> Outcome:
        """Return the outcome of some cases."""
        rest = (getattr(self, part.name)[rows] for part in fields(self) if part.name != "unknowns")
        return Outcome(self.unknowns.take(rows), *rest)

    def put(self, rows: Any, other: Outcome) -> None:
        """Overwrite some cases."""
        self.unknowns.put(rows, other.unknowns)
        for part in fields(self):
            if part.name != "unknowns":
                getattr(self, part.name)[rows] = getattr(other, part.name)
