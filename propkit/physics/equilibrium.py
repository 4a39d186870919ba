"""Chemical equilibrium of an ideal-gas mixture for a whole batch at once.

Gibbs energy is minimised in the element-potential form (Huff, Gordon & Morrell, NACA Report 1037, 1951; White, Johnson & Dantzig 1958;
Smith & Missen 1982): every Newton step is one stacked solve of (elements + 2) square systems. Amounts are kept as logarithms, so that
traces never go negative. Convergence is decided case by case; converged cases leave the batch.
"""

from __future__ import annotations

from dataclasses import dataclass, fields, replace
from typing import Any, Literal

import numpy as np
import numpy.typing as npt

from propkit.constants import GAS_CONSTANT
from propkit.physics.arrays import Array, Values, values
from propkit.physics.thermodynamics import SpeciesTable

Mode = Literal["temperature", "enthalpy", "entropy"]

CONVERGED, NOT_CONVERGED, OUT_OF_RANGE = 0, 1, 2
TOLERANCE = 1e-11
MOST_ITERATIONS = 120
FIRST_TEMPERATURE = 3500.0
COLDEST, HOTTEST = 5.0, 20_000.0
_BIG_STEP = 2.0
_TRACE_LOG = -18.0
_TRACE_GROWTH = -9.0
_HEAVY = 6.0


@dataclass(frozen=True, slots=True, eq=False)
class EquilibriumState:
    """Equilibrium states of a batch, SI, shape (case,) unless said otherwise.

    `log_amounts` and `amounts` are ln and moles per mass [mol/kg], shape (case, species). `status` is 0 where converged, 1 where not, 2 where
    there is no solution inside the range of the data.
    """

    pressure: Array
    temperature: Array
    amounts: Array
    log_amounts: Array
    enthalpy: Array
    entropy: Array
    molar_mass: Array
    density: Array
    gas_constant: Array
    specific_heat: Array
    frozen_specific_heat: Array
    isentropic_exponent: Array
    frozen_isentropic_exponent: Array
    sound_speed: Array
    dlnv_dlnt: Array
    dlnv_dlnp: Array
    iterations: npt.NDArray[np.int64]
    residual: Array
    status: npt.NDArray[np.int64]

    @property
    def mole_fractions(self) -> Array:
        """Moles of each species over all moles, shape (case, species)."""
        return np.asarray(self.amounts / self.amounts.sum(axis=1, keepdims=True))

    def take(self, index: Any) -> EquilibriumState:
        """Return the cases of `index`."""
        return replace(self, **{field.name: getattr(self, field.name)[index] for field in fields(self)})


def solve(
    table: SpeciesTable,
    elements: Array,
    *,
    pressure: Values,
    temperature: Values | None = None,
    enthalpy: Values | None = None,
    entropy: Values | None = None,
    guess: EquilibriumState | None = None,
) -> EquilibriumState:
    """Return the equilibrium of each case at a pressure and one of temperature, enthalpy and entropy.

    Parameters
    ----------
    table : SpeciesTable
        Gas species.
    elements : array
        Moles of atoms per mass [mol/kg], shape (case, element), all above 0, in the order of ``table.elements``.
    pressure : float or array
        [Pa], above 0.
    temperature, enthalpy, entropy : float or array
        Exactly one of [K], [J/kg], [J/(kg K)].
    guess : EquilibriumState
        States near the solution, one for each case.

    Returns
    -------
    EquilibriumState
        Never raises for a case that fails: `status` says.

    Source
    ------
    NACA Report 1037 (1951); W. R. Smith and R. W. Missen, Chemical Reaction Equilibrium Analysis, 1982.
    """
    atoms = np.atleast_2d(values(elements))
    count = len(atoms)
    given = {"temperature": temperature, "enthalpy": enthalpy, "entropy": entropy}
    named = [(mode, value) for mode, value in given.items() if value is not None]
    if len(named) != 1:
        raise TypeError("give exactly one of temperature, enthalpy, entropy")
    mode, target = named[0]
    aim = np.broadcast_to(values(target), (count,)).astype(float)
    p = np.broadcast_to(values(pressure), (count,)).astype(float)
    log_t, log_n, log_total = _start(table, atoms, aim if mode == "temperature" else None, guess)
    work = _Newton(table, atoms, np.log(p / table.reference_pressure), mode, aim)  # type: ignore[arg-type]
    iterations, residual, done = work.run(log_t, log_n, log_total)
    status = np.where(done, CONVERGED, NOT_CONVERGED)
    state = _state(table, atoms, p, np.exp(log_t), log_n, iterations, residual, status)
    return _checked_range(table, state, mode, aim)


def _start(table: SpeciesTable, atoms: Array, temperature: Array | None, guess: EquilibriumState | None) -> tuple[Array, Array, Array]:
    count = len(atoms)
    if guess is not None:
        log_n = np.array(guess.log_amounts)
        log_t = np.log(guess.temperature if temperature is None else temperature)
        return np.array(log_t), log_n, np.log(np.exp(log_n).sum(axis=1))
    size = table.composition.sum(axis=1)
    likely = np.exp(-_HEAVY * np.maximum(size - 2.0, 0.0))
    total = 0.5 * atoms.sum(axis=1)
    log_n = np.log(total)[:, None] + np.log(likely / likely.sum())
    log_t = np.log(np.full(count, FIRST_TEMPERATURE) if temperature is None else temperature)
    return np.array(log_t), log_n, np.log(total)


class _Newton:
    """Damped Newton iteration over the logarithms of amounts, total amount and temperature."""

    def __init__(self, table: SpeciesTable, atoms: Array, log_p: Array, mode: Mode, aim: Array) -> None:
        self.table, self.atoms, self.log_p, self.mode, self.aim = table, atoms, log_p, mode, aim

    def run(self, log_t: Array, log_n: Array, log_total: Array) -> tuple[npt.NDArray[np.int64], Array, npt.NDArray[np.bool_]]:
        """Iterate in place; return iterations, residual and convergence of each case."""
        count = len(log_t)
        iterations = np.zeros(count, dtype=np.int64)
        residual = np.full(count, np.inf)
        done = np.zeros(count, dtype=bool)
        active = np.arange(count)
        for step in range(1, MOST_ITERATIONS + 1):
            t, n, total = log_t[active], log_n[active], log_total[active]
            change_n, change_total, change_t, error = self._step(active, t, n, total)
            damping = _damping(n, total, change_n, change_total, change_t)
            log_n[active] = np.maximum(n + damping[:, None] * change_n, total[:, None] - 1500.0)
            log_total[active] = total + damping * change_total
            log_t[active] = np.clip(t + damping * change_t, np.log(COLDEST), np.log(HOTTEST))
            iterations[active] = step
            residual[active] = error
            good = (error < TOLERANCE) & (damping == 1.0)
            done[active[good]] = True
            active = active[~good & np.isfinite(error)]
            if not len(active):
                break
        return iterations, residual, done

    def _step(self, active: npt.NDArray[np.int64], t: Array, n: Array, total: Array) -> tuple[Array, Array, Array, Array]:
        table, a = self.table, self.table.composition
        cp, h, s = table.properties(np.exp(t))[:3]
        amounts = np.exp(n)
        mu = h - s + n - total[:, None] + self.log_p[active][:, None]
        matrix, right = _element_system(a, amounts, total)
        elements = a.shape[1]
        b = self.atoms[active]
        sums = amounts @ a
        weighted = amounts * mu
        right[:, :elements] = b - sums + weighted @ a
        right[:, elements] = np.exp(total) - amounts.sum(axis=1) + weighted.sum(axis=1)
        if self.mode == "temperature":
            solution = _solve(matrix[:, :-1, :-1], right[:, :-1])
            change_t = np.zeros(len(t))
            energy = change_t
        else:
            energy = self._energy_row(active, matrix, right, t, n, total, amounts, mu, cp, h, s)
            solution = _solve(matrix, right)
            change_t = solution[:, -1]
        change_total = solution[:, elements]
        change_n = solution[:, :elements] @ a.T + change_total[:, None] - mu
        if self.mode != "temperature":
            change_n += h * change_t[:, None]
        share = amounts / np.exp(total)[:, None]
        error = np.maximum.reduce(
            [
                np.abs(share * change_n).max(axis=1),
                np.abs(change_total),
                np.abs(change_t),
                np.abs(b - sums).max(axis=1) / b.max(axis=1),
                energy,
            ]
        )
        return change_n, change_total, change_t, np.where(np.isfinite(error), error, np.inf)

    def _energy_row(
        self, active: Any, matrix: Array, right: Array, t: Array, n: Array, total: Array, amounts: Array, mu: Array, cp: Array, h: Array, s: Array
    ) -> Array:
        a, elements = self.table.composition, self.table.composition.shape[1]
        nh = amounts * h
        matrix[:, :elements, -1] = nh @ a
        matrix[:, elements, -1] = nh.sum(axis=1)
        scale = GAS_CONSTANT * np.exp(total)
        if self.mode == "enthalpy":
            weight, held = nh, nh.sum(axis=1)
            missing = self.aim[active] / (GAS_CONSTANT * np.exp(t)) - held
            matrix[:, -1, elements] = held
        else:
            local = s - (n - total[:, None]) - self.log_p[active][:, None]
            weight = amounts * local
            held = weight.sum(axis=1)
            missing = self.aim[active] / GAS_CONSTANT - held + np.exp(total) - amounts.sum(axis=1)
            matrix[:, -1, elements] = held
        matrix[:, -1, :elements] = weight @ a
        matrix[:, -1, -1] = (amounts * cp).sum(axis=1) + (weight * h).sum(axis=1)
        right[:, -1] = missing + (weight * mu).sum(axis=1)
        if self.mode == "entropy":
            matrix[:, -1, elements] -= 0.0
        return np.abs(missing) * GAS_CONSTANT / scale


def _element_system(a: Array, amounts: Array, total: Array) -> tuple[Array, Array]:
    """Return the matrix of the element and total-amount rows, with room for the energy row, and an empty right side."""
    count, elements = len(amounts), a.shape[1]
    matrix = np.zeros((count, elements + 2, elements + 2))
    matrix[:, :elements, :elements] = (amounts[:, None, :] * a.T[None]) @ a
    sums = amounts @ a
    matrix[:, :elements, elements] = sums
    matrix[:, elements, :elements] = sums
    matrix[:, elements, elements] = amounts.sum(axis=1) - np.exp(total)
    return matrix, np.zeros((count, elements + 2))


def _solve(matrix: Array, right: Array) -> Array:
    """Solve the stack; rows and columns scaled, with a vanishing ridge for potentials that nothing fixes."""
    diagonal = np.abs(np.einsum("kii->ki", matrix))
    scale = 1.0 / np.sqrt(np.where(diagonal > 0.0, diagonal, 1.0))
    scaled = matrix * scale[:, :, None] * scale[:, None, :]
    np.einsum("kii->ki", scaled)[...] += 1e-15
    try:
        return np.asarray(np.linalg.solve(scaled, (right * scale)[..., None])[..., 0] * scale)
    except np.linalg.LinAlgError:
        return np.stack([np.linalg.lstsq(m, r, rcond=None)[0] * s for m, r, s in zip(scaled, right * scale, scale, strict=True)])


def _damping(n: Array, total: Array, change_n: Array, change_total: Array, change_t: Array) -> Array:
    """Return the share of the step to take: bounded for temperature, total and major species; traces must stay traces."""
    share = n - total[:, None]
    major = share > _TRACE_LOG
    largest = np.where(major, np.abs(change_n), 0.0).max(axis=1)
    worst = np.maximum.reduce([largest, 5.0 * np.abs(change_total), 5.0 * np.abs(change_t)])
    with np.errstate(divide="ignore", invalid="ignore"):
        damping = np.minimum(1.0, _BIG_STEP / worst)
        growth = change_n - change_total[:, None]
        room = np.where(~major & (growth > 0.0) & (share + growth > _TRACE_GROWTH), (_TRACE_GROWTH - share) / growth, 1.0)
    return np.asarray(np.minimum(np.nan_to_num(damping, nan=0.1), room.min(axis=1)))


def _state(
    table: SpeciesTable, atoms: Array, pressure: Array, temperature: Array, log_n: Array, iterations: Any, residual: Array, status: Any
) -> EquilibriumState:
    """Return the properties of converged amounts, with the derivatives from the converged matrix."""
    cp, h, s = table.properties(temperature)[:3]
    n = np.exp(log_n)
    moles = n.sum(axis=1)
    a, elements = table.composition, table.composition.shape[1]
    matrix, right = _element_system(a, n, np.log(moles))
    both = np.zeros((len(n), elements + 1, 2))
    nh = n * h
    both[:, :elements, 0] = -(nh @ a)
    both[:, elements, 0] = -nh.sum(axis=1)
    both[:, :elements, 1] = n @ a
    both[:, elements, 1] = moles
    derivative = np.stack([_solve(matrix[:, :-1, :-1], both[:, :, k]) for k in range(2)], axis=2)
    dlnv_dlnt = 1.0 + derivative[:, elements, 0]
    dlnv_dlnp = derivative[:, elements, 1] - 1.0
    change = derivative[:, :elements, 0] @ a.T + derivative[:, elements, 0][:, None] + h
    frozen = GAS_CONSTANT * (n * cp).sum(axis=1)
    specific = frozen + GAS_CONSTANT * (nh * change).sum(axis=1)
    gas_constant = GAS_CONSTANT * moles
    with np.errstate(divide="ignore", invalid="ignore"):
        exponent = 1.0 / (-dlnv_dlnp - gas_constant * dlnv_dlnt**2 / specific)
    log_x = log_n - np.log(moles)[:, None]
    entropy = GAS_CONSTANT * (n * (s - log_x)).sum(axis=1) - gas_constant * np.log(pressure / table.reference_pressure)
    return EquilibriumState(
        pressure=pressure,
        temperature=temperature,
        amounts=n,
        log_amounts=log_n,
        enthalpy=GAS_CONSTANT * temperature * nh.sum(axis=1),
        entropy=entropy,
        molar_mass=1.0 / moles,
        density=pressure / (gas_constant * temperature),
        gas_constant=gas_constant,
        specific_heat=specific,
        frozen_specific_heat=frozen,
        isentropic_exponent=exponent,
        frozen_isentropic_exponent=frozen / (frozen - gas_constant),
        sound_speed=np.sqrt(np.abs(exponent) * gas_constant * temperature),
        dlnv_dlnt=dlnv_dlnt,
        dlnv_dlnp=dlnv_dlnp,
        iterations=iterations,
        residual=residual,
        status=status,
    )


def _checked_range(table: SpeciesTable, state: EquilibriumState, mode: str, aim: Array) -> EquilibriumState:
    """Return the state with status 2 where the temperature left the range of the data."""
    status = state.status.copy()
    outside = (state.temperature > float(table.temperature_high.max())) | (state.temperature < COLDEST * 1.001)
    if mode == "enthalpy":
        outside |= state.temperature < float(table.temperature_low.min())
    status[outside] = OUT_OF_RANGE
    return replace(state, status=status)
