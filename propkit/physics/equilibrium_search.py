"""First guesses for the equilibrium, and the slow sure way for the few cases that the plain iteration leaves.

Enthalpy and entropy at given pressure rise with temperature all the way, so a bracket in T with (p, T) solutions cannot
miss; it also shows when there is no solution between the lowest and the highest temperature of the data.
"""

from __future__ import annotations

from dataclasses import replace
from typing import Final

import numpy as np
import numpy.typing as npt

from propkit.constants import GAS_CONSTANT
from propkit.physics.arrays import Array
from propkit.physics.equilibrium_newton import LOWEST_TEMPERATURE, Outcome, Problem, Unknowns, iterate

_FIRST_TEMPERATURE: Final = 3000.0
_SMALL_MOLECULE: Final = 3.0
_PENALTY_PER_ATOM: Final = 2.5
_ATOMS_PER_MOLECULE: Final = 2.5
_BISECTIONS: Final = 14


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
    temperature = problem.target if problem.given == "temperature" else np.full(cases, _FIRST_TEMPERATURE)
    return Unknowns(
        log_amounts=np.minimum(log_moles[:, None] + weight[None, :], problem.log_bounds).reshape(cases, gas),
        potentials=np.zeros_like(problem.elements),
        log_moles=log_moles,
        log_temperature=np.log(temperature),
        log_pressure=np.log(pressure / problem.table.reference_pressure),
        slots=np.full((cases, slots), -1),
        slot_amounts=np.zeros((cases, slots)),
    )


def search(problem: Problem, pressure: Array, slots: int = 0) -> tuple[Outcome, npt.NDArray[np.bool_]]:
    """Solve cases by a bracket in temperature, then the plain iteration from there.

    Parameters
    ----------
    problem : Problem
        The batch, without a flow condition.
    pressure : array
        p [Pa].
    slots : int
        Slots for liquids and solids.

    Returns
    -------
    tuple
        The outcome, and which cases have no solution inside the data range.
    """
    high = np.full(pressure.size, np.log(problem.table.temperature_high.max()))
    low = np.full(pressure.size, np.log(LOWEST_TEMPERATURE))
    if problem.given == "temperature":
        outside = (np.log(problem.target) > high + 1e-12) | (np.log(problem.target) < low - 1e-12)
        return iterate(problem, cold_start(problem, pressure, slots), iterations=400), outside
    at_high, solved_high = _level(problem, pressure, high, slots)
    at_low, solved_low = _level(problem, pressure, low, slots)
    outside = (solved_high & (at_high < problem.target)) | (solved_low & (at_low > problem.target))
    for _ in range(_BISECTIONS):
        middle = 0.5 * (low + high)
        level, solved = _level(problem, pressure, middle, slots)
        below = solved & (level < problem.target)
        low, high = np.where(below, middle, low), np.where(solved & ~below, middle, high)
    fixed = replace(problem, given="temperature", target=np.exp(0.5 * (low + high)))
    near = iterate(fixed, cold_start(fixed, pressure, slots))
    outcome = iterate(problem, near.unknowns)
    inside = (outcome.unknowns.log_temperature >= low - 1e-6) & (outcome.unknowns.log_temperature <= high + 1e-6)
    outcome.converged &= inside
    return outcome, outside


def _level(
    problem: Problem, pressure: Array, log_temperature: Array, slots: int
) -> tuple[Array, npt.NDArray[np.bool_]]:
    """Return h [J/kg] or s [J/(kg K)] at a temperature, and where that was solved."""
    fixed = replace(problem, given="temperature", target=np.exp(log_temperature))
    outcome = iterate(fixed, cold_start(fixed, pressure, slots))
    scale = GAS_CONSTANT * (np.exp(log_temperature) if problem.given == "enthalpy" else 1.0)
    return outcome.sums[:, 0 if problem.given == "enthalpy" else 1] * scale, outcome.converged
