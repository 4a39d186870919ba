"""First guesses for the equilibrium, and the slow sure way for the few cases that the plain iteration leaves.

Enthalpy and entropy at given pressure rise with temperature all the way, so a bracket in T with (p, T) solutions cannot
miss; it also shows when there is no solution between the lowest and the highest temperature of the data.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace
from typing import Final

import numpy as np
import numpy.typing as npt

from propkit.constants import GAS_CONSTANT
from propkit.physics.arrays import Array
from propkit.physics.equilibrium_newton import iterate
from propkit.physics.equilibrium_terms import LOWEST_TEMPERATURE, Outcome, Problem, Unknowns

_FIRST_TEMPERATURE: Final = 3000.0
_SMALL_MOLECULE: Final = 2.0
_PENALTY_PER_ATOM: Final = 2.5
_ATOMS_PER_MOLECULE: Final = 2.5
_WARMING_UP: Final = 60
_WALK: Final = 60
_STRIDE: Final = 0.3
_CLOSE: Final = 1e-5


Solver = Callable[[Problem, Unknowns], Outcome]
"""What solves a batch from a start: the plain iteration, or the one with liquids and solids."""


def cold_start(problem: Problem, pressure: Array, slots: int = 0) -> Unknowns:
    """Return a first guess for cases about which nothing is known: hot, mostly small molecules.

    Parameters
    ----------
    problem : Problem
        The batch.
    pressure : array
        p [Pa].
    slots : int
        Empty slots for liquids and solids.

    Returns
    -------
    Unknowns
        The guess.
    """
    cases, gas = pressure.size, problem.table.gas_count
    weight = -_PENALTY_PER_ATOM * np.maximum(problem.bordered[:, :-1].sum(axis=1) - _SMALL_MOLECULE, 0.0)
    weight -= np.log(np.exp(weight).sum())
    log_moles = np.log(problem.elements.sum(axis=1) / _ATOMS_PER_MOLECULE)
    return Unknowns(
        log_amounts=np.minimum(log_moles[:, None] + weight[None, :], problem.log_bounds).reshape(cases, gas),
        potentials=np.zeros_like(problem.elements),
        log_moles=log_moles,
        log_temperature=np.full(cases, np.log(_FIRST_TEMPERATURE)),
        log_pressure=np.log(pressure / problem.table.reference_pressure),
        slots=np.full((cases, slots), -1),
        slot_amounts=np.zeros((cases, slots)),
    )


def settled_start(problem: Problem, pressure: Array, slots: int = 0) -> Unknowns:
    """Return equilibrium at the first temperature, a start for given entropy, whose step assumes that it is near one."""
    fixed = replace(problem, given="temperature", target=np.full(pressure.size, _FIRST_TEMPERATURE), condition=None)
    return iterate(fixed, cold_start(fixed, pressure, slots), _WARMING_UP).unknowns


def search(problem: Problem, pressure: Array, slots: int = 0, solver: Solver = iterate) -> tuple[Outcome, npt.NDArray[np.bool_]]:
    """Solve cases by walking in temperature from equilibrium to equilibrium, then the plain iteration inside the bracket.

    Parameters
    ----------
    problem : Problem
        The batch, without a flow condition.
    pressure : array
        p [Pa].
    slots : int
        Slots for liquids and solids.
    solver : callable
        What solves a batch from a start.

    Returns
    -------
    tuple
        The outcome, and which cases have no solution inside the data range.
    """
    limits = np.log([LOWEST_TEMPERATURE, problem.table.temperature_high.max()])
    here = np.full(pressure.size, np.clip(np.log(_FIRST_TEMPERATURE), *limits))
    at = _at(problem, cold_start(problem, pressure, slots), here, solver)
    low, high = np.full(here.shape, limits[0]), np.full(here.shape, limits[1])
    outside = np.zeros(here.shape, dtype=bool)
    for _ in range(_WALK):
        side = _side(problem, at)
        low, high = np.where(side > 0, here, low), np.where(side < 0, here, high)
        outside |= at.converged & (((here <= limits[0]) & (side < 0)) | ((here >= limits[1]) & (side > 0)))
        bracketed = (low > limits[0]) & (high < limits[1])
        step = np.where(bracketed, 0.5 * (low + high) - here, np.where(side > 0, _STRIDE, -_STRIDE))
        if problem.given == "temperature":
            step = np.clip(np.log(problem.target) - here, -_STRIDE, _STRIDE)
        there = np.clip(here + np.where(at.converged, step, 0.1 * step), *limits)
        if outside.all() or np.abs(there - here).max() < _CLOSE:
            break
        at, here = _at(problem, at.unknowns, there, solver), there
    outcome = solver(problem, at.unknowns)
    return outcome, outside


def _at(problem: Problem, start: Unknowns, log_temperature: Array, solver: Solver) -> Outcome:
    """Return the equilibrium at a temperature, from one nearby."""
    return solver(replace(problem, given="temperature", target=np.exp(log_temperature)), start)


def _side(problem: Problem, at: Outcome) -> Array:
    """Return whether the solution is hotter (1) or colder (-1) than where `at` is."""
    if problem.given == "temperature":
        return np.sign(np.log(problem.target) - at.unknowns.log_temperature)
    column, scale = (0, np.exp(at.unknowns.log_temperature)) if problem.given == "enthalpy" else (1, 1.0)
    return np.sign(problem.target - GAS_CONSTANT * scale * at.sums[:, column])
