"""Chemical equilibrium of a batch of cases at given (p, h), (p, s) or (p, T), with its derivatives.

A single case is a batch of one. A case without a solution is never an exception here: its `status` says so, and every
number of it is NaN except what the iteration reached.
"""

from __future__ import annotations

from dataclasses import dataclass, fields
from typing import Any, Final

import numpy as np
import numpy.typing as npt

from propkit.constants import GAS_CONSTANT
from propkit.errors import InputError
from propkit.physics.arrays import Array, Values, distinct, has_tangent, plain, require, values
from propkit.physics.equilibrium_condensed import SLOTS, iterate_phases
from propkit.physics.equilibrium_newton import iterate
from propkit.physics.equilibrium_search import Solver, cold_start, search, settled_start
from propkit.physics.equilibrium_terms import (
    LOWEST_TEMPERATURE,
    FlowCondition,
    Given,
    Integers,
    Outcome,
    Problem,
    Unknowns,
)
from propkit.physics.thermodynamics import SpeciesTable

CONVERGED: Final = 0
NOT_CONVERGED: Final = 1
OUT_OF_RANGE: Final = 2
"""No solution between the lowest temperature searched and the highest of the species data."""

BLOCK: Final = 2500
"""Cases worked on together; larger blocks leave the cache."""

_LOWEST_LOG: Final = -700.0
_STAYS: Final = 1e-7
"""Relative change of the pressure beyond which a state is no solution of a flow condition."""

_PLATEAU: Final = 1e-9
"""Share of a heating that warms, below which the heat capacity is undefined: a phase is changing."""


@dataclass(frozen=True, slots=True, eq=False)
class EquilibriumState:
    """The state of each case of a batch at chemical equilibrium.

    Parameters
    ----------
    pressure, temperature : array
        p [Pa], T [K], shape (case,).
    amounts : array
        Moles of each species in a kilogram [mol/kg], shape (case, species).
    gas_moles : array
        Moles of gas in a kilogram [mol/kg].
    density : array
        Mass over volume of the gas [kg/m3]; liquids and solids take no volume.
    enthalpy, entropy : array
        h [J/kg], s [J/(kg K)].
    specific_heat, frozen_specific_heat : array
        cp [J/(kg K)] with the composition following (NaN while a phase melts or freezes), and with the composition held.
    isentropic_exponent, frozen_isentropic_exponent : array
        (d ln p / d ln rho) at constant entropy, with the composition following, and with it held.
    dlnv_dlnt, dlnv_dlnp : array
        (d ln V / d ln T) at constant p and (d ln V / d ln p) at constant T.
    element_potentials : array
        Chemical potential of each element over R T, shape (case, element).
    iterations : array of int
        Steps of the iteration.
    residual : array
        Largest relative residual of element balance, gas, equilibrium and energy.
    status : array of int
        0 converged, 1 not converged, 2 no solution inside the data range.
    condensed_mass_fraction : array
        Mass fraction of liquids and solids.
    """

    pressure: Array
    temperature: Array
    amounts: Array
    gas_moles: Array
    density: Array
    enthalpy: Array
    entropy: Array
    specific_heat: Array
    frozen_specific_heat: Array
    isentropic_exponent: Array
    frozen_isentropic_exponent: Array
    dlnv_dlnt: Array
    dlnv_dlnp: Array
    element_potentials: Array
    iterations: Integers
    residual: Array
    status: Integers
    condensed_mass_fraction: Array

    @property
    def molar_mass(self) -> Array:
        """Mass over moles of gas [kg/mol]."""
        return 1.0 / self.gas_moles

    @property
    def gas_constant(self) -> Array:
        """Specific gas constant [J/(kg K)], so that p = rho R T."""
        return GAS_CONSTANT * self.gas_moles

    @property
    def mole_fractions(self) -> Array:
        """Moles of each species over all moles, liquids and solids included; shape (case, species)."""
        return np.asarray(self.amounts / self.amounts.sum(axis=1, keepdims=True))

    @property
    def sound_speed(self) -> Array:
        """Speed of sound with the composition following [m/s]."""
        return np.sqrt(self.isentropic_exponent * self.gas_constant * self.temperature)

    @property
    def frozen_sound_speed(self) -> Array:
        """Speed of sound with the composition held [m/s]."""
        return np.sqrt(self.frozen_isentropic_exponent * self.gas_constant * self.temperature)

    def take(self, index: Any) -> EquilibriumState:
        """Return some cases as a smaller batch; an integer gives a batch of one."""
        rows = np.atleast_1d(np.arange(self.pressure.size)[index])
        return EquilibriumState(*(getattr(self, part.name)[rows] for part in fields(self)))


def choose(first: EquilibriumState, second: EquilibriumState, where: npt.NDArray[np.bool_]) -> EquilibriumState:
    """Return `first` with the cases of `where` taken from `second`."""
    parts: list[Any] = []
    for part in fields(EquilibriumState):
        mine, theirs = getattr(first, part.name), getattr(second, part.name)
        parts.append(np.where(where if mine.ndim == 1 else where[:, None], theirs, mine))
    return EquilibriumState(*parts)


def solve(
    table: SpeciesTable,
    elements: Values,
    *,
    pressure: Values,
    temperature: Values | None = None,
    enthalpy: Values | None = None,
    entropy: Values | None = None,
    guess: EquilibriumState | None = None,
) -> EquilibriumState:
    """Chemical equilibrium at given pressure and one of temperature, enthalpy and entropy.

    Parameters
    ----------
    table : SpeciesTable
        The species of the case.
    elements : array
        Moles of atoms in a kilogram in the order of `table.elements` [mol/kg], 0 or more, shape (case, element).
    pressure : float or array
        p [Pa], above 0, shape (case,).
    temperature : float or array, optional
        T [K], above 0.
    enthalpy : float or array, optional
        h [J/kg].
    entropy : float or array, optional
        s [J/(kg K)].
    guess : EquilibriumState, optional
        A state of the same cases nearby.

    Returns
    -------
    EquilibriumState
        The states; `status` says which cases have none.

    Raises
    ------
    InputError
        Unless exactly one of temperature, enthalpy and entropy is given, or where a number is outside its range.

    Notes
    -----
    Least Gibbs energy at given elements; ideal gas, liquids and solids pure and without volume. Species whose elements
    do not all occur in a case do not occur in its solution.

    Source: NACA Report 1037; Smith & Missen, Chemical Reaction Equilibrium Analysis (1982).
    """
    b = np.atleast_2d(values(elements))
    given, wanted = _given(temperature, enthalpy, entropy)
    if b.shape[1] != len(table.elements):
        raise InputError(f"`elements` has {b.shape[1]} columns; the table has the elements {', '.join(table.elements)}.")
    p, target = (np.array(np.broadcast_to(values(part), b.shape[0])) for part in (pressure, wanted))
    require(p > 0.0, "pressure", p, "above 0")
    require(b >= 0.0, "elements", b, "0 or more")
    require(b.sum(axis=1) > 0.0, "elements", b.sum(axis=1), "above 0 for at least one element")
    if given == "temperature":
        require(target > 0.0, "temperature", target, "above 0")
    if guess is not None and has_tangent(guess.temperature):
        guess = plain(guess)
    if not has_tangent(b, p, target):
        return solve_batch(table, b, p, given, target, guess)
    rows, back = distinct(b.real, p.real, target.real)
    near = None if guess is None else guess.take(rows)
    known = solve_batch(table, b.real[rows], p.real[rows], given, target.real[rows], near)
    return with_tangent(table, b, p, given, target, known.take(back))


def _given(temperature: Values | None, enthalpy: Values | None, entropy: Values | None) -> tuple[Given, Values]:
    wanted: dict[Given, Values | None] = {"temperature": temperature, "enthalpy": enthalpy, "entropy": entropy}
    given: list[tuple[Given, Values]] = [(name, value) for name, value in wanted.items() if value is not None]
    if len(given) != 1:
        raise InputError("Give exactly one of `temperature`, `enthalpy` and `entropy`.")
    return given[0]


def solve_batch(
    table: SpeciesTable,
    elements: Array,
    pressure: Array,
    given: Given,
    target: Array,
    guess: EquilibriumState | None = None,
    condition: FlowCondition | None = None,
) -> EquilibriumState:
    """Solve a batch of arrays already checked, block by block; cases with the same elements present go together.

    Parameters
    ----------
    table : SpeciesTable
        The species.
    elements : array
        Moles of atoms in a kilogram [mol/kg], shape (case, element).
    pressure : array
        p [Pa], or a first guess of it where there is a condition.
    given : {"temperature", "enthalpy", "entropy"}
        What is held together with the pressure.
    target : array
        T [K], h [J/kg] or s [J/(kg K)].
    guess : EquilibriumState, optional
        A state of the same cases nearby.
    condition : FlowCondition, optional
        Moves the pressure.

    Returns
    -------
    EquilibriumState
        The states.
    """
    state = _empty(pressure.size, table)
    for rows, mask in _patterns(elements > 0.0):
        part, species = (table, np.arange(len(table.names))) if mask.all() else table.part(mask)
        for first in range(0, rows.size, BLOCK):
            block = rows[first : first + BLOCK]
            problem = Problem(part, elements[np.ix_(block, mask)], given, target[block], _renumbered(condition, block))
            start = _start(problem, pressure[block], guess, block, species, mask)
            outcome = _solver(part)(problem, start)
            outside = _retry(problem, pressure[block], outcome)
            _fill(state, block, species, mask, problem, outcome, outside)
    return state


def with_tangent(
    table: SpeciesTable,
    elements: Array,
    pressure: Array,
    given: Given,
    target: Array,
    known: EquilibriumState,
    condition: FlowCondition | None = None,
) -> EquilibriumState:
    """Return states whose values are known with the tangents that those of the arguments give them.

    Parameters
    ----------
    table, elements, pressure, given, target, condition
        As for `solve_batch`, with tangents.
    known : EquilibriumState
        The solution without tangents.

    Returns
    -------
    EquilibriumState
        The same states with tangents; status 1 for a case that is no smooth solution of the condition.

    Notes
    -----
    From a solution, one Newton step leads to the tangent of the unknowns, dx = -J^-1 (dF/dy) dy with the converged matrix J; the
    sums and slopes at the unknowns so moved have theirs. The step is taken by the iteration itself, phases held.

    Source: implicit function theorem.
    """
    state = _empty(pressure.size, table, np.complex128)
    solved = known.status == CONVERGED
    for rows, mask in _patterns(elements.real > 0.0):
        block = rows[solved[rows]]
        if not block.size:
            continue
        part, species = (table, np.arange(len(table.names))) if mask.all() else table.part(mask)
        atoms, goal = elements[np.ix_(block, mask)].astype(np.complex128), target[block].astype(np.complex128)
        problem = Problem(part, atoms, given, goal, _renumbered(condition, block))
        start = _start(problem, known.pressure[block], known, block, species, mask).complex()
        if condition is None:
            start.log_pressure = np.log(pressure[block] / part.reference_pressure)
        _fill(state, block, species, mask, problem, iterate(problem, start), np.zeros(block.size, dtype=bool))
    # where the condition is met elsewhere (a throat at a jump of the sound speed) the step leads away
    stays = np.abs(state.pressure.real - known.pressure) <= _STAYS * known.pressure
    status = np.where(solved, np.where(stays, state.status, NOT_CONVERGED), known.status)
    found: dict[str, Any] = {part.name: _joined(getattr(known, part.name), getattr(state, part.name)) for part in fields(EquilibriumState)}
    return EquilibriumState(**found | {"status": status})


def _joined(known: Array, moved: Array) -> Array:
    """Return known values with the tangents of others, which differ from them by rounding."""
    return known + 1j * moved.imag if np.iscomplexobj(moved) else moved


def _renumbered(condition: FlowCondition | None, block: Integers) -> FlowCondition | None:
    """Return the condition for a block, whose cases are numbered from zero."""
    if condition is None:
        return None
    whole = condition
    return lambda trial, number: whole(trial, block[number])


def _patterns(present: npt.NDArray[np.bool_]) -> list[tuple[Integers, npt.NDArray[np.bool_]]]:
    """Return (cases, elements present) for every pattern of elements present in the batch."""
    if present.all():
        return [(np.arange(present.shape[0]), np.ones(present.shape[1], dtype=bool))]
    patterns, inverse = np.unique(present, axis=0, return_inverse=True)
    return [(np.flatnonzero(inverse.ravel() == number), pattern) for number, pattern in enumerate(patterns)]


def _solver(table: SpeciesTable) -> Solver:
    return iterate_phases if table.condensed.any() else iterate


def _slots(table: SpeciesTable) -> int:
    return SLOTS if table.condensed.any() else 0


def _start(
    problem: Problem,
    pressure: Array,
    guess: EquilibriumState | None,
    block: Integers,
    species: Integers,
    mask: npt.NDArray[np.bool_],
) -> Unknowns:
    """Return the first guess of a block: a state nearby where there is one that is a solution, else a cold start."""
    make = settled_start if problem.given == "entropy" else cold_start
    slots = _slots(problem.table)
    if guess is None or not (guess.status[block] == CONVERGED).any():
        return make(problem, pressure, slots)
    good = guess.status[block] == CONVERGED
    rows, gas = block[good], problem.table.gas_count
    active, held = _phases(guess.amounts[rows[:, None], species[gas:]], gas, slots)
    with np.errstate(divide="ignore"):
        warm = Unknowns(
            log_amounts=np.maximum(np.log(guess.amounts[rows[:, None], species[:gas]]), _LOWEST_LOG),
            potentials=guess.element_potentials[rows[:, None], mask],
            log_moles=np.log(guess.gas_moles[rows]),
            log_temperature=np.log(guess.temperature[rows]),
            log_pressure=np.log(pressure[good] / problem.table.reference_pressure),
            slots=active,
            slot_amounts=held,
        )
    if good.all():
        return warm
    start = make(problem, pressure, slots)
    start.put(np.flatnonzero(good), warm)
    return start


def _phases(amounts: Array, gas: int, slots: int) -> tuple[Integers, Array]:
    """Return the liquids and solids present as slots, the largest first, and their amounts."""
    if not slots:
        return np.zeros((len(amounts), 0), dtype=np.intp), np.zeros((len(amounts), 0))
    width = max(slots - amounts.shape[1], 0)
    order = np.argsort(-amounts, axis=1, kind="stable")[:, :slots]
    held = np.pad(np.take_along_axis(amounts, order, axis=1), ((0, 0), (0, width)))
    return np.where(held > 0.0, np.pad(order, ((0, 0), (0, width))) + gas, -1), np.maximum(held, 0.0)


def _retry(problem: Problem, pressure: Array, outcome: Outcome) -> npt.NDArray[np.bool_]:
    """Solve what the plain iteration left, the slow way; return which cases lie outside the data range."""
    outside = np.zeros(pressure.size, dtype=bool)
    left = np.flatnonzero(~outcome.converged)
    if not left.size:
        return outside
    if problem.condition is not None:
        temperature = np.exp(outcome.unknowns.log_temperature)
        return ~outcome.converged & (temperature < LOWEST_TEMPERATURE * (1.0 + 1e-9))
    part = Problem(problem.table, problem.elements[left], problem.given, problem.target[left])
    slots, solver = _slots(problem.table), _solver(problem.table)
    again = solver(part, cold_start(part, pressure[left], slots))
    outcome.put(left[again.converged], again.take(again.converged))
    left = left[~again.converged]
    if left.size:
        part = Problem(problem.table, problem.elements[left], problem.given, problem.target[left])
        slow, outside[left] = search(part, pressure[left], slots, solver)
        outcome.put(left, slow)
    return outside


def _empty(count: int, table: SpeciesTable, kind: Any = np.float64) -> EquilibriumState:
    """Return a batch of `count` states without numbers."""

    def blank() -> Array:
        return np.full(count, np.nan, dtype=kind)

    blanks: list[Any] = [blank() for _ in fields(EquilibriumState)]
    state = EquilibriumState(*blanks)
    object.__setattr__(state, "amounts", np.zeros((count, len(table.names)), dtype=kind))
    object.__setattr__(state, "element_potentials", np.zeros((count, len(table.elements)), dtype=kind))
    object.__setattr__(state, "residual", np.full(count, np.nan))
    object.__setattr__(state, "iterations", np.zeros(count, dtype=np.intp))
    object.__setattr__(state, "status", np.full(count, NOT_CONVERGED))
    object.__setattr__(state, "condensed_mass_fraction", np.zeros(count, dtype=kind))
    return state


def _fill(
    state: EquilibriumState,
    block: Integers,
    species: Integers,
    mask: npt.NDArray[np.bool_],
    problem: Problem,
    outcome: Outcome,
    outside: npt.NDArray[np.bool_],
) -> None:
    """Write the outcome of a block into the states."""
    x, table = outcome.unknowns, problem.table
    gas = table.gas_count
    temperature, moles = np.exp(x.log_temperature), np.exp(x.log_moles)
    enthalpy, entropy, heat_capacity = outcome.sums.T
    heating_moles, heating, isentropic_moles, isentropic = outcome.slopes.T
    state.pressure[block] = table.reference_pressure * np.exp(x.log_pressure)
    state.temperature[block] = temperature
    state.amounts[np.ix_(block, species[:gas])] = np.exp(x.log_amounts)
    state.gas_moles[block] = moles
    with np.errstate(over="ignore", divide="ignore", invalid="ignore"):
        state.density[block] = state.pressure[block] / (GAS_CONSTANT * moles * temperature)
    rows, slots = np.nonzero(x.slots >= 0)
    state.amounts[block[rows], species[x.slots[rows, slots]]] = x.slot_amounts[rows, slots]
    if rows.size:
        np.add.at(
            state.condensed_mass_fraction,
            block[rows],
            x.slot_amounts[rows, slots] * table.molar_mass[x.slots[rows, slots]],
        )
    state.enthalpy[block] = GAS_CONSTANT * temperature * enthalpy
    state.entropy[block] = GAS_CONSTANT * entropy
    state.frozen_specific_heat[block] = GAS_CONSTANT * heat_capacity
    heating = np.where(heating * heat_capacity > _PLATEAU, heating, np.nan)
    with np.errstate(divide="ignore", invalid="ignore"):
        state.specific_heat[block] = GAS_CONSTANT / heating
        state.frozen_isentropic_exponent[block] = heat_capacity / (heat_capacity - moles)
        state.isentropic_exponent[block] = 1.0 / (1.0 - isentropic_moles - isentropic)
        state.dlnv_dlnt[block] = 1.0 + heating_moles / heating
        state.dlnv_dlnp[block] = isentropic_moles + isentropic - 1.0 - state.dlnv_dlnt[block] ** 2 * moles * heating
    state.element_potentials[np.ix_(block, np.flatnonzero(mask))] = x.potentials
    state.iterations[block] = outcome.iterations
    state.residual[block] = outcome.residual
    state.status[block] = np.where(outside, OUT_OF_RANGE, np.where(outcome.converged, CONVERGED, NOT_CONVERGED))
