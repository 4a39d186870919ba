r"""The Newton iteration behind the equilibrium: damped, for a whole batch, with or without a moving pressure.

Each gas species keeps the logarithm of its amount as its own variable, so that traces never go negative. One step
solves, for every case at once, a symmetric system for the element potentials, the logarithm of the moles of gas, ln T
and the amounts of the active liquids and solids (`slots`):

    elements   sum_j a_ij n_j (A dl + dlnN - q + h dlnT)_j + sum_c a_ic dn_c = b_i - sum_j a_ij n_j - sum_c a_ic n_c
    gas        sum_j n_j (...)_j - N dlnN                                    = N - sum_j n_j
    energy     sum_j n_j h_j (...)_j + (sum n cp) dlnT + sum_c h_c dn_c      = what is missing, over R T
    slot c     sum_i a_ic dl_i + h_c dlnT                                    = g_c - sum_i a_ic l_i

with l the element potentials over R T and q_j = mu_j/(R T) - sum_i a_ij l_i what species j is short of equilibrium. The
energy row serves (p, h) and (p, s) alike, because T ds = dh - v dp at constant elements; for (p, s) the terms in q that
this leaves out away from equilibrium are put back.

The step is shortened so that no abundant species and no temperature moves too far at once, and no species exceeds by
much what the elements of the case could form of it.

Sources: Huff, Gordon & Morrell, NACA Report 1037 (1951); White, Johnson & Dantzig, J. Chem. Phys. 28 (1958) 751;
Smith & Missen, Chemical Reaction Equilibrium Analysis (1982).
"""

from __future__ import annotations

from typing import Any, Final

import numpy as np

from propkit.constants import GAS_CONSTANT
from propkit.physics.arrays import Array, magnitude
from propkit.physics.equilibrium_terms import (
    LOWEST_TEMPERATURE,
    FlowCondition,
    FlowTrial,
    Integers,
    Outcome,
    Problem,
    Sums,
    Unknowns,
)
from propkit.physics.thermodynamics import SpeciesTable, StandardProperties

TOLERANCE: Final = 2e-12
"""Relative residual of a converged case."""

_STALLED_TOLERANCE: Final = 1e-10
"""Relative residual accepted where rounding keeps it from falling further."""

ITERATIONS: Final = 100
_SPECIES_STEP: Final = 4.0
_TEMPERATURE_STEP: Final = 0.4
_MOLES_STEP: Final = 1.0
_PRESSURE_STEP: Final = 1.5
_ABUNDANT: Final = -18.0
"""Logarithm of the mole fraction above which a species counts when the step is shortened."""

_ROOM_ABOVE_BOUND: Final = 0.7
_REGULARISATION: Final = 1e-13
_TINY: Final = 1e-290


def evaluate(problem: Problem, elements: Array, x: Unknowns) -> Sums:
    """Return the sums over species of each case at its unknowns, and the matrix of the step.

    Parameters
    ----------
    problem : Problem
        The batch.
    elements : array
        Moles of atoms of the cases in `x` [mol/kg].
    x : Unknowns
        Where to evaluate.

    Returns
    -------
    Sums
        Residuals and matrix.
    """
    gas, cases, size = problem.table.gas_count, x.log_moles.size, problem.bordered.shape[1]
    last, slots = size - 1, x.slots.shape[1]
    every = problem.table.properties(np.exp(x.log_temperature))
    cp, h, _, mu = every if not slots else (part[:, :gas] for part in every)
    n = np.exp(x.log_amounts)
    mu = mu + x.log_amounts
    mu += (x.log_pressure - x.log_moles)[:, None]
    q = mu - x.potentials @ problem.atoms
    nh, nq = n * h, n * q
    width = size + 1 + slots
    matrix, sides = np.zeros((cases, width, width), dtype=n.dtype), np.zeros((2, cases, width), dtype=n.dtype)
    shortfall, correction = sides
    matrix[:, :size, :size] = (n @ problem.products).reshape(cases, size, size)
    total, moles = matrix[:, last, last].copy(), np.exp(x.log_moles)
    matrix[:, last, last] -= moles
    matrix[:, size, :size] = matrix[:, :size, size] = nh @ problem.bordered
    heat_capacity = _dot(n, cp)
    matrix[:, size, size] = _dot(nh, h)
    correction[:, :size] = nq @ problem.bordered
    correction[:, size] = _dot(nq, h)
    shortfall[:, :last] = elements - matrix[:, :last, last]
    shortfall[:, last] = moles - total
    enthalpy = matrix[:, size, last].copy()
    sums = Sums(
        matrix=matrix,
        shortfall=shortfall,
        correction=correction,
        gas_enthalpy=h,
        distance=q,
        moles=moles,
        total=total,
        enthalpy=enthalpy,
        entropy=enthalpy - _dot(n, mu),
        heat_capacity=heat_capacity,
        residual=magnitude(nq).sum(axis=1) / moles.real,
        spread=_dot(nq, q),
    )
    if slots:
        _add_slots(problem.table, every, x, sums, size)
    matrix[:, size, size] += sums.heat_capacity
    missing = magnitude(shortfall[:, :last] / elements).max(axis=1)
    sums.residual = np.maximum(np.maximum(sums.residual, missing), magnitude(shortfall[:, last]) / moles.real)
    return sums


def _dot(a: Array, b: Array) -> Array:
    return np.asarray(np.einsum("ij,ij->i", a, b))


def _add_slots(table: SpeciesTable, every: StandardProperties, x: Unknowns, sums: Sums, size: int) -> None:
    """Add the active liquids and solids to the sums; an empty slot is a row of the identity."""
    rows = np.arange(x.log_moles.size)
    for slot in range(x.slots.shape[1]):
        active = x.slots[:, slot] >= 0
        species = np.where(active, x.slots[:, slot], 0)
        row, amount = size + 1 + slot, np.where(active, x.slot_amounts[:, slot], 0.0)
        atoms = table.composition[species] * active[:, None]
        h, cp, g = (part[rows, species] * active for part in (every.enthalpy, every.heat_capacity, every.gibbs_energy))
        sums.matrix[:, row, : size - 1] = sums.matrix[:, : size - 1, row] = atoms
        sums.matrix[:, row, size] = sums.matrix[:, size, row] = h
        sums.matrix[:, row, row] = ~active
        sums.shortfall[:, : size - 1] -= amount[:, None] * atoms
        sums.shortfall[:, row] = g - _dot(atoms, x.potentials)
        sums.enthalpy = sums.enthalpy + amount * h
        sums.entropy = sums.entropy + amount * (h - g)
        sums.heat_capacity = sums.heat_capacity + amount * cp
        sums.residual = np.maximum(sums.residual, magnitude(sums.shortfall[:, row]))


def solve_scaled(matrix: Array, right: Array, moles: Array, elements: int) -> Array:
    """Solve the symmetric systems after scaling rows and columns alike.

    Parameters
    ----------
    matrix : array
        Shape (case, size, size); overwritten.
    right : array
        Shape (case, size, columns).
    moles : array
        Moles of gas of each case, the scale of the row of the gas.
    elements : int
        Number of elements, whose rows come first.

    Returns
    -------
    array
        Shape (case, size, columns); not finite where a system has no solution.
    """
    diagonal = np.einsum("ijj->ij", matrix)
    scale = np.abs(diagonal)
    scale[:, elements] = moles.real
    scale[:, elements + 2 :] = 1.0
    np.maximum(scale, _TINY, out=scale)
    scale = 1.0 / np.sqrt(scale)
    matrix *= scale[:, :, None] * scale[:, None, :]
    diagonal[:, :elements] += _REGULARISATION
    bad = ~np.isfinite(matrix.sum(axis=(1, 2)))
    if bad.any():
        matrix[bad] = np.eye(matrix.shape[1])
    right = right * scale[:, :, None]
    try:
        solution = np.linalg.solve(matrix, right)
    except np.linalg.LinAlgError:
        solution = np.linalg.pinv(matrix) @ right
    solution *= scale[:, :, None]
    if bad.any():
        solution[bad] = np.nan
    return np.asarray(solution)


@np.errstate(over="ignore", divide="ignore", invalid="ignore")
def iterate(problem: Problem, start: Unknowns, iterations: int = ITERATIONS) -> Outcome:
    """Iterate every case of a batch to convergence; converged cases leave the batch.

    Parameters
    ----------
    problem : Problem
        The batch.
    start : Unknowns
        First guess; not modified.
    iterations : int
        Steps allowed.

    Returns
    -------
    Outcome
        The end of each case, converged or not.

    Notes
    -----
    A case that runs away leaves the batch with a residual that is not finite, so floating-point warnings are left out.
    """
    count = start.log_moles.size
    kind = start.log_amounts.dtype
    out = Outcome(start.take(np.arange(count)), np.full((count, 3), np.nan, dtype=kind), np.full((count, 4), np.nan, dtype=kind),
                  np.full(count, iterations), np.full(count, np.inf), np.zeros(count, dtype=bool))  # fmt: skip
    number, x, elements, target = np.arange(count), start.take(np.arange(count)), problem.elements, problem.target
    bounds = problem.log_bounds + _ROOM_ABOVE_BOUND
    before = np.full(count, np.inf)
    for step in range(iterations + 1):
        sums = evaluate(problem, elements, x)
        solution, energy = _solve(problem, sums, x, target)
        residual = np.maximum(sums.residual, magnitude(energy) / sums.heat_capacity.real)
        pressure_step = None
        if problem.condition is not None:
            flow, pressure_step = _flow(problem.condition, sums, x, solution, energy, number)
            residual = np.maximum(residual, np.minimum(magnitude(flow), magnitude(pressure_step)))
        done = (residual <= TOLERANCE) | ((residual <= _STALLED_TOLERANCE) & (residual >= 0.5 * before))
        leaving = np.ones_like(done) if step == iterations else done | ~np.isfinite(residual)
        if leaving.any():
            _store(out, number[leaving], x.take(leaving), sums, solution, leaving, done[leaving], residual[leaving], step)
            if leaving.all():
                break
            keep = ~leaving
            number, x, elements, target, bounds = number[keep], x.take(keep), elements[keep], target[keep], bounds[keep]
            solution, residual = solution[keep], residual[keep]
            sums.gas_enthalpy, sums.distance = sums.gas_enthalpy[keep], sums.distance[keep]
            pressure_step = None if pressure_step is None else pressure_step[keep]
        before = residual
        _advance(problem, x, sums, solution, pressure_step, bounds)
    return out


def _solve(problem: Problem, sums: Sums, x: Unknowns, target: Array) -> tuple[Array, Array]:
    """Return the solutions for (the step, unit heating, unit d ln p at constant entropy) and the energy missing.

    The energy missing is over R T, in moles, for one kilogram. Where the temperature is given, that many moles times the
    heat capacity stand for what is missing in ln T, and heat is added as needed.
    """
    size = problem.bordered.shape[1]
    last = size - 1
    right = np.zeros((*sums.shortfall.shape, 3), dtype=sums.matrix.dtype)
    right[:, :, 0] = sums.shortfall + sums.correction
    energy = np.zeros_like(sums.enthalpy)
    if problem.given == "enthalpy":
        energy = target * np.exp(-x.log_temperature) / GAS_CONSTANT - sums.enthalpy
        right[:, size, 0] += energy
    elif problem.given == "entropy":
        energy = target / GAS_CONSTANT - sums.entropy
        right[:, size, 0] += energy + _dot(x.potentials, sums.shortfall[:, :last]) + sums.shortfall[:, last] - sums.spread
        sums.matrix[:, size, : size + 1] -= sums.correction[:, : size + 1]
        sums.matrix[:, size, size + 1 :] -= sums.shortfall[:, size + 1 :]
    right[:, size, 1] = 1.0
    right[:, : size + 1, 2] = sums.matrix[:, last, : size + 1]
    right[:, last, 2] = sums.total
    right[:, size, 2] += sums.total
    if problem.given == "entropy":
        right[:, size, 2] -= sums.correction[:, last]
    solution = solve_scaled(sums.matrix, right, sums.moles, last)
    if problem.given == "temperature":
        wanted = np.log(target) - x.log_temperature
        energy = wanted * sums.heat_capacity
        wanted = np.clip(wanted, -_TEMPERATURE_STEP, _TEMPERATURE_STEP)
        heating = (wanted - solution[:, size, 0]) / solution[:, size, 1]
        solution[:, :, 0] += heating[:, None] * solution[:, :, 1]
    return solution, energy


def _flow(condition: FlowCondition, sums: Sums, x: Unknowns, solution: Array, energy: Array, number: Integers) -> tuple[Array, Array]:
    """Return the residual of the flow condition and the step in ln p that removes it."""
    last = x.potentials.shape[1]
    heat = energy + _dot(x.potentials, sums.shortfall[:, :last]) + sums.shortfall[:, last]
    trial = FlowTrial(
        log_pressure=x.log_pressure,
        log_moles=x.log_moles + solution[:, last, 0],
        log_temperature=x.log_temperature + solution[:, last + 1, 0],
        enthalpy=(sums.enthalpy + heat) * GAS_CONSTANT * np.exp(x.log_temperature),
        moles_slope=solution[:, last, 2],
        temperature_slope=solution[:, last + 1, 2],
    )
    residual, slope = condition(trial, number)
    return residual, np.clip(-residual / slope, -_PRESSURE_STEP, _PRESSURE_STEP)


def _advance(problem: Problem, x: Unknowns, sums: Sums, solution: Array, pressure_step: Array | None, bounds: Array) -> None:
    """Take the step, shortened where it is too long; changes `x`."""
    last = x.potentials.shape[1]
    step = solution[:, :, 0]
    if pressure_step is not None:
        step = step + pressure_step[:, None] * solution[:, :, 2]
    dlnn, dlnt = step[:, last], step[:, last + 1]
    species = step[:, : last + 1] @ problem.bordered.T
    species -= sums.distance
    species += sums.gas_enthalpy * dlnt[:, None]
    if pressure_step is not None:
        species -= pressure_step[:, None]
    abundant = x.log_amounts > (x.log_moles + _ABUNDANT)[:, None]
    rise = np.max(species.real, axis=1, where=abundant, initial=0.0)
    longest = np.maximum(np.maximum(rise / _SPECIES_STEP, np.abs(dlnt) / _TEMPERATURE_STEP), np.abs(dlnn) / _MOLES_STEP)
    factor = 1.0 / np.maximum(longest, 1.0)
    x.log_amounts += factor[:, None] * species
    np.minimum(x.log_amounts, bounds, out=x.log_amounts)
    x.potentials += factor[:, None] * step[:, :last]
    x.log_moles += factor * dlnn
    x.log_temperature += factor * dlnt
    np.clip(
        x.log_temperature,
        np.log(LOWEST_TEMPERATURE),
        np.log(problem.table.temperature_high.max()),
        out=x.log_temperature,
    )
    if pressure_step is not None:
        x.log_pressure += factor * pressure_step
    if x.slots.shape[1]:
        x.slot_amounts += factor[:, None] * step[:, last + 2 :]


def _store(
    out: Outcome,
    rows: Integers,
    x: Unknowns,
    sums: Sums,
    solution: Array,
    chosen: Any,
    done: Any,
    residual: Array,
    step: int,
) -> None:
    """Keep the end of the cases that leave the batch; the gas of a converged case is put exactly at equilibrium."""
    last = x.potentials.shape[1]
    x.log_amounts[done] -= sums.distance[chosen][done]
    out.unknowns.put(rows, x)
    out.sums[rows] = np.stack([sums.enthalpy, sums.entropy, sums.heat_capacity], axis=1)[chosen]
    heating, isentropic = solution[chosen, :, 1], solution[chosen, :, 2]
    out.slopes[rows, 0] = heating[:, last]
    out.slopes[rows, 1] = heating[:, last + 1]
    out.slopes[rows, 2] = isentropic[:, last]
    out.slopes[rows, 3] = isentropic[:, last + 1]
    out.iterations[rows] = step
    out.residual[rows] = residual
    out.converged[rows] = done
