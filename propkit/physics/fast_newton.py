r"""The quick engine of studies: gas equilibrium in element potentials alone, for a block of cases near their solutions.

The only unknowns are the element potentials l over R T, ln N, ln T and, where a flow condition asks for it, ln p. The
amounts follow from them, n_k = exp(sum_i a_ik l_i + ln N - ln p - g_k(T)), so that every species is exactly at
equilibrium at each step and what is left are the element balances, the sum of the mole fractions and the energy:

    elements   sum_k a_ik n_k (A dl + dlnN + h dlnT)_k           = b_i - sum_k a_ik n_k   + dlnp sum_k a_ik n_k
    energy     sum_k n_k h_k (...)_k + (sum_k n_k cp_k) dlnT     = what is missing        + dlnp (sum_k n_k h_k + sum_k n_k)
    gas        sum_k n_k (...)_k - N dlnN                        = N - sum_k n_k          + dlnp sum_k n_k

(the last terms at constant entropy). The matrix is the same for (p, h) and (p, s); with (p, s) what is missing is
s/R + l.b - sum n h + (N - sum n), because S/R = sum n h - l.(A n) (Euler's relation), and h = R T (s/R + l.b) there. A second
right-hand side, d/dln p at constant entropy, moves the pressure of throat and exit inside the same step.

Arrays have the case as last axis. There is no damping to speak of: a case that does not come to rest in a few steps is
left to the damped iteration (`propkit.physics.equilibrium_newton`), whose solutions these are.

Sources: NACA Report 1037 (1951); Smith & Missen, Chemical Reaction Equilibrium Analysis (1982).
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from functools import cached_property
from typing import Any, Final

import numpy as np
import numpy.typing as npt

from propkit.constants import GAS_CONSTANT
from propkit.physics.arrays import Array
from propkit.physics.equilibrium_terms import Integers
from propkit.physics.thermodynamics import SpeciesTable

RESTED: Final = 2e-9
"""Largest step of an unknown before which matrix and derivatives are those of the solution; the step itself is still taken."""

RESTED_ALONG: Final = 3e-8
"""The same for throat and exit, whose heat capacity is not asked for: their exponents are good to a twentieth of it."""

STEPS: Final = 9
"""Steps after which a design is left to the damped iteration."""

PATIENT: Final = 12
"""Steps allowed where the predictor itself is made, from coarse first guesses."""
_LONGEST: Final = 0.5
"""Longest step in ln T, ln N and ln p."""

_LONGEST_POTENTIAL: Final = 12.0
_SMALL: Final = 1.5e-3
"""Largest change of ln n for which the exponential is taken from its series (error 2e-13)."""

_SMALLEST_HEAD: Final = 1e-12
_POWERS: Final = 7


@dataclass(frozen=True, eq=False)
class Kernel:
    """Some gas species of a table, arranged for the quick engine; arrays have the species as first axis.

    Parameters
    ----------
    composition : array
        Atoms, shape (species, element).
    log_rows : array
        What multiplies (l, ln N - ln p, powers of T) in ln n, by interval, shape (interval, species, element + 8).
    enthalpy_rows : array
        What multiplies the powers of T in h/(R T), shape (interval, species, 6).
    sum_rows : array
        Rows whose products with n are a_i a_j (upper triangle), a_i, 1, and the sums of the heat-capacity coefficients,
        shape (interval, row, species).
    bordered : array
        a_i and 1, shape (element + 1, species).
    breakpoints : array
        Temperatures between the intervals [K].
    reference_pressure : float
        Standard-state pressure [Pa].
    """

    composition: Array
    log_rows: Array
    enthalpy_rows: Array
    sum_rows: Array
    bordered: Array
    breakpoints: Array
    reference_pressure: float

    @classmethod
    def of(cls, table: SpeciesTable) -> Kernel:
        """Return the kernel of all gas species of a table."""
        gas = table.gas_count
        a = table.composition[:gas]
        c = np.moveaxis(table.segments, 2, 1)[:, :gas]
        enthalpy = c[:, :, :6] * np.array([1.0, 1 / 2, 1 / 3, 1 / 4, 1 / 5, 1.0])
        gibbs = np.concatenate(
            [c[:, :, :1] - c[:, :, 6:], c[:, :, 1:5] * np.array([-1 / 2, -1 / 6, -1 / 12, -1 / 20]), c[:, :, 5:6], -c[:, :, :1]], axis=2
        )
        intervals = len(c)
        fixed = np.concatenate([a, np.ones((gas, 1))], axis=1)
        log_rows = np.concatenate([np.broadcast_to(fixed, (intervals, *fixed.shape)), -gibbs], axis=2)
        upper = [a[:, i] * a[:, j] for i in range(a.shape[1]) for j in range(i + 1)]
        common = np.stack([*upper, *a.T, np.ones(gas)])
        sums = np.concatenate([np.broadcast_to(common, (intervals, *common.shape)), np.moveaxis(c[:, :, :5], 1, 2)], axis=1)
        return cls(a, log_rows, enthalpy, sums, np.ascontiguousarray(fixed.T), table.breakpoints, table.reference_pressure)

    @cached_property
    def single_rows(self) -> npt.NDArray[np.float32]:
        """`log_rows` in single precision, for looking at many species."""
        return self.log_rows.astype(np.float32)

    def take(self, species: Integers) -> Kernel:
        """Return the kernel of some of the species."""
        return Kernel(
            np.ascontiguousarray(self.composition[species]),
            np.ascontiguousarray(self.log_rows[:, species]),
            np.ascontiguousarray(self.enthalpy_rows[:, species]),
            np.ascontiguousarray(self.sum_rows[:, :, species]),
            np.ascontiguousarray(self.bordered[:, species]),
            self.breakpoints,
            self.reference_pressure,
        )

    @property
    def elements(self) -> int:
        """Number of elements."""
        return int(self.composition.shape[1])


@dataclass(slots=True, eq=False)
class Point:
    """Unknowns of each case: l (element, case), and ln N, ln T, ln p over the reference pressure (case,)."""

    potentials: Array
    log_moles: Array
    log_temperature: Array
    log_pressure: Array

    def take(self, cases: Any) -> Point:
        """Return some cases."""
        return Point(self.potentials[:, cases], self.log_moles[cases], self.log_temperature[cases], self.log_pressure[cases])

    def stacked(self) -> Array:
        """Return ln N - ln p and the powers of T below l, as `Kernel.log_rows` wants them."""
        elements, cases = self.potentials.shape
        out = np.empty((elements + 1 + _POWERS, cases))
        out[:elements] = self.potentials
        np.subtract(self.log_moles, self.log_pressure, out=out[elements])
        powers = out[elements + 1 :]
        powers[0] = 1.0
        t = np.exp(self.log_temperature, out=powers[1])
        np.multiply(t, t, out=powers[2])
        np.multiply(powers[2], t, out=powers[3])
        np.multiply(powers[2], powers[2], out=powers[4])
        np.divide(1.0, t, out=powers[5])
        powers[6] = self.log_temperature
        return out


@dataclass(slots=True, eq=False)
class Solved:
    """Solutions of a block: unknowns, derivatives, whether each case came to rest, and its steps.

    `turning` is d(ln N + ln T)/d ln p at constant entropy, `heating` d ln T for a heating of R T in a kilogram at constant
    pressure, `heat_capacity` the sum of n cp/R [mol/kg], `shift` the derivative of ln T for the same at constant entropy.
    """

    point: Point
    turning: Array
    heating: Array
    heat_capacity: Array
    good: Any
    steps: Integers
    amounts: Array | None = None


Condition = Callable[[Array, Array, Array, Array, Any], tuple[Array, Array]]
"""(ln p, ln(N T) and h [J/kg] of the trial, its turning, cases) -> (residual, slope with respect to ln p at constant entropy)."""


def solve(
    kernel: Kernel,
    elements: Array,
    target: Array,
    start: Point,
    *,
    entropy: bool,
    condition: Condition | None = None,
    keep_amounts: bool = False,
    steps: int = STEPS,
    rested: float | None = None,
) -> Solved:
    """Return the equilibrium of a block of cases from starts nearby.

    Parameters
    ----------
    kernel : Kernel
        The species that are kept.
    elements : array
        Moles of atoms [mol/kg], shape (element, case).
    target : array
        h [J/kg], or with `entropy` s [J/(kg K)].
    start : Point
        First guess; not modified.
    entropy : bool
        Whether entropy is given instead of enthalpy.
    condition : callable, optional
        Moves the pressure.
    keep_amounts : bool
        Whether the amounts of the species are returned.
    steps : int
        Steps allowed.
    rested : float, optional
        Largest step of a case at rest, where not `RESTED` or `RESTED_ALONG`.

    Returns
    -------
    Solved
        The solutions; where ``good`` is false there is none.
    """
    count = target.size
    out = Solved(
        Point(np.full_like(start.potentials, np.nan), *(np.full(count, np.nan) for _ in range(3))),
        np.full(count, np.nan), np.full(count, np.nan), np.full(count, np.nan),
        np.zeros(count, dtype=bool), np.full(count, steps, dtype=np.intp),
        np.empty((len(kernel.composition), count)) if keep_amounts else None,
    )  # fmt: skip
    cases: Any = slice(None)
    x, stacked, amounts = start, start.stacked(), None
    before: Array | None = None
    largest = rested or (RESTED_ALONG if entropy else RESTED)
    for step in range(1, steps + 1):
        amounts, enthalpy = _species(kernel, stacked, before, amounts)
        found = _step(kernel, elements, target, x, stacked, amounts, enthalpy, entropy, condition, cases)
        size = found.size
        still = size <= largest
        moved = _moved(x, found)
        if still.all():
            _keep(out, cases, slice(None), moved, found, amounts, step)
            return out
        if still.any():
            _keep(out, cases, still, moved, found, amounts, step)
            left = ~still & np.isfinite(size)
            if not left.any():
                return out
            number = np.arange(count) if isinstance(cases, slice) else cases
            cases = number[left]
            elements, target, moved = elements[:, left], target[left], moved.take(left)
            stacked, amounts = stacked[:, left], amounts[:, left]
        x, before, stacked = moved, stacked, moved.stacked()
    return out


@dataclass(slots=True, eq=False)
class _Found:
    """One step of each case and the derivatives at its point."""

    potentials: Array
    log_moles: Array
    log_temperature: Array
    log_pressure: Array | None
    size: Array
    turning: Array
    heating: Array
    heat_capacity: Array


def _keep(out: Solved, cases: Any, rested: Any, moved: Point, found: _Found, amounts: Array, step: int) -> None:
    where: Any = rested
    if not isinstance(cases, slice):
        where = cases[rested]
    point = out.point
    point.potentials[:, where] = moved.potentials[:, rested]
    for name in ("log_moles", "log_temperature", "log_pressure"):
        getattr(point, name)[where] = getattr(moved, name)[rested]
    out.turning[where], out.heating[where] = found.turning[rested], found.heating[rested]
    out.heat_capacity[where] = found.heat_capacity[rested]
    out.good[where], out.steps[where] = True, step
    if out.amounts is not None:
        out.amounts[:, where] = amounts[:, rested]


def _species(kernel: Kernel, stacked: Array, before: Array | None, amounts: Array | None) -> tuple[Array, Array]:
    """Return n and h/(R T) of every species and case; n from the step before where the step is small."""
    elements = kernel.elements
    powers = stacked[elements + 1 : elements + 7]
    interval = np.searchsorted(kernel.breakpoints, stacked[elements + 2], side="right")
    first = int(interval[0])
    if (interval == first).all():
        logs_of, enthalpy = kernel.log_rows[first], kernel.enthalpy_rows[first] @ powers
        if before is not None and amounts is not None:
            change = logs_of @ (stacked - before)
            # the step before may have crossed a breakpoint; the potentials of a species are continuous there to first order only
            largest = float(np.abs(change).max(initial=0.0))
            crossed = not (np.searchsorted(kernel.breakpoints, before[elements + 2], side="right") == first).all()
            if largest < _SMALL and not crossed:
                return _grown(amounts, change), enthalpy
        return np.exp(logs_of @ stacked), enthalpy
    logs = np.empty((len(kernel.composition), stacked.shape[1]))
    enthalpy = np.empty_like(logs)
    for number in np.unique(interval):
        which = np.flatnonzero(interval == number)
        logs[:, which] = kernel.log_rows[number] @ stacked[:, which]
        enthalpy[:, which] = kernel.enthalpy_rows[number] @ powers[:, which]
    return np.exp(logs, out=logs), enthalpy


def _grown(amounts: Array, change: Array) -> Array:
    """Return n exp(change) from the series of the exponential; `change` is used up."""
    growth = change * (1.0 / 6.0)
    growth += 0.5
    growth *= change
    growth += 1.0
    growth *= change
    growth += 1.0
    growth *= amounts
    return growth


def _step(
    kernel: Kernel, elements: Array, target: Array, x: Point, stacked: Array, n: Array, h: Array, entropy: bool,
    condition: Condition | None, cases: Any,
) -> _Found:  # fmt: skip
    """Return the Newton step of every case."""
    size = kernel.elements
    pairs = size * (size + 1) // 2
    temperature = stacked[size + 2]
    interval = int(np.searchsorted(kernel.breakpoints, temperature[0], side="right"))
    sums = kernel.sum_rows[interval] @ n
    nh = n * h
    crossed = kernel.bordered @ nh
    nh *= h
    heat_capacity = _polynomial(kernel, sums[pairs + size + 1 :], temperature, interval, n)
    moles, total = np.exp(x.log_moles), sums[pairs + size]
    atoms, heat = sums[pairs : pairs + size], crossed[size]
    m = size + 2
    matrix = np.empty((m, m, target.size))
    place = 0
    for i in range(size):
        matrix[i, : i + 1] = sums[place : place + i + 1]
        place += i + 1
    matrix[size, :size], matrix[size, size] = crossed[:size], nh.sum(axis=0) + heat_capacity
    matrix[size + 1, :size], matrix[size + 1, size], matrix[size + 1, m - 1] = atoms, heat, total - moles
    right = np.zeros((m, 2 if entropy else 3, target.size))
    np.subtract(elements, atoms, out=right[:size, 0])
    missing_gas = moles - total
    right[size + 1, 0] = missing_gas
    bound = _dot(x.potentials, elements)
    if entropy:
        level = target / GAS_CONSTANT + bound + missing_gas
        right[size, 0] = level - heat
    else:
        right[size, 0] = target / (GAS_CONSTANT * temperature) - heat
    right[:size, 1], right[size, 1], right[size + 1, 1] = atoms, heat + total, total
    if not entropy:
        right[size, 2] = 1.0
    solution = _eliminate(matrix, right)
    step = solution[:, 0]
    turning = solution[size, 1] + solution[size + 1, 1]
    pressure_step = None
    if condition is not None:
        log_thermal = x.log_moles + x.log_temperature + step[size] + step[size + 1]
        residual, slope = condition(x.log_pressure, log_thermal, level * (GAS_CONSTANT * temperature), turning, cases)
        pressure_step = np.clip(-residual / slope, -_LONGEST, _LONGEST)
        step = step + pressure_step * solution[:, 1]
    largest = np.abs(step).max(axis=0)
    if pressure_step is not None:
        largest = np.maximum(largest, np.abs(pressure_step))
    return _Found(step[:size], step[size + 1], step[size], pressure_step, largest, turning, solution[size, -1], heat_capacity)


def _polynomial(kernel: Kernel, coefficients: Array, temperature: Array, interval: int, n: Array) -> Array:
    """Return the sum of n cp/R from the sums of the heat-capacity coefficients in each case's interval."""
    intervals = np.searchsorted(kernel.breakpoints, temperature, side="right")
    if not (intervals == interval).all():
        coefficients = coefficients.copy()
        rows = len(kernel.sum_rows[0]) - 5
        for number in np.unique(intervals):
            if number != interval:
                which = np.flatnonzero(intervals == number)
                coefficients[:, which] = kernel.sum_rows[number, rows:] @ n[:, which]
    found: Array = coefficients[4] * temperature
    for place in (3, 2, 1):
        found += coefficients[place]
        found *= temperature
    found += coefficients[0]
    return found


def _dot(a: Array, b: Array) -> Array:
    found: Array = a[0] * b[0]
    for row in range(1, len(a)):
        found += a[row] * b[row]
    return found


def _eliminate(matrix: Array, right: Array) -> Array:
    """Solve symmetric systems without pivots, the elements first and the gas last: each pivot has its sign by itself.

    `matrix` has its lower triangle, shape (row, column, case); both arguments are used up.
    """
    m = len(matrix)
    for j in range(m - 1):
        inverse = 1.0 / matrix[j, j]
        for i in range(j + 1, m):
            factor = matrix[i, j] * inverse
            matrix[i, j + 1 : i + 1] -= factor * matrix[j + 1 : i + 1, j]
            right[i] -= factor * right[j]
            # column j below the diagonal is needed unscaled by the rows further down
    for j in range(m - 1, -1, -1):
        for i in range(j + 1, m):
            right[j] -= matrix[i, j] * right[i]
        right[j] /= matrix[j, j]
    return right


def _moved(x: Point, found: _Found) -> Point:
    """Return the unknowns after the step, shortened where it is absurdly long."""
    factor: Any = 1.0
    if not float(found.size.max()) < _LONGEST:
        longest = np.maximum(np.maximum(np.abs(found.log_moles), np.abs(found.log_temperature)) / _LONGEST, 1.0)
        longest = np.maximum(longest, np.abs(found.potentials).max(axis=0) / _LONGEST_POTENTIAL)
        factor = 1.0 / longest
    pressure = x.log_pressure if found.log_pressure is None else x.log_pressure + factor * found.log_pressure
    return Point(
        x.potentials + factor * found.potentials,
        x.log_moles + factor * found.log_moles,
        x.log_temperature + factor * found.log_temperature,
        pressure,
    )


class Sonic:
    """The condition Mach 1 at given stagnation enthalpy; `change` is d ln gamma / d ln p, held, one for each case."""

    def __init__(self, enthalpy: Array, change: Array) -> None:
        self.enthalpy = enthalpy
        self.change = change

    def __call__(self, log_pressure: Array, log_thermal: Array, enthalpy: Array, turning: Array, cases: Any) -> tuple[Array, Array]:
        """Return ln M^2 and its slope."""
        thermal = GAS_CONSTANT * np.exp(log_thermal)
        square = np.maximum(2.0 * (self.enthalpy[cases] - enthalpy), _SMALLEST_HEAD * thermal)
        turned = np.maximum(1.0 - turning, _SMALLEST_HEAD)
        return np.log(square * turned / thermal), -2.0 * thermal / square - turning - self.change[cases]


class AtFlux:
    """The condition of a given mass flux at given stagnation enthalpy; `log_flux` is ln of it over the reference pressure."""

    def __init__(self, enthalpy: Array, log_flux: Array) -> None:
        self.enthalpy = enthalpy
        self.log_flux = log_flux

    def __call__(self, log_pressure: Array, log_thermal: Array, enthalpy: Array, turning: Array, cases: Any) -> tuple[Array, Array]:
        """Return ln of the mass flux over the given one, and its slope."""
        thermal = GAS_CONSTANT * np.exp(log_thermal)
        square = np.maximum(2.0 * (self.enthalpy[cases] - enthalpy), _SMALLEST_HEAD * thermal)
        flux = log_pressure + np.log(np.sqrt(square) / thermal)
        return flux - self.log_flux[cases], 1.0 - turning - thermal / square
