"""Isentropic expansion of a batch from its reservoir: throat, state at a pressure, state at an area ratio.

Three flow models share one search: each gives the thermodynamic state at a pressure on the isentrope of the reservoir, and
throat and exit are found by Newton steps in ln p, with d ln(rho u)/d ln p = 1/gamma - p/(rho u^2) exact on an isentrope.
"""

from __future__ import annotations

from dataclasses import dataclass, fields, replace
from typing import Any, Protocol

import numpy as np
import numpy.typing as npt

from propkit.constants import GAS_CONSTANT
from propkit.physics import equilibrium, gas_dynamics
from propkit.physics.arrays import Array, Values, values
from propkit.physics.equilibrium import CONVERGED, NOT_CONVERGED, OUT_OF_RANGE, EquilibriumState
from propkit.physics.thermodynamics import SpeciesTable

TOLERANCE = 2e-13
MOST_STEPS = 60


@dataclass(frozen=True, slots=True, eq=False)
class FlowState:
    """Flow states of a batch, SI, shape (case,). `amounts` [mol/kg] is None for a gas given by its properties."""

    pressure: Array
    temperature: Array
    density: Array
    velocity: Array
    mach: Array
    sound_speed: Array
    molar_mass: Array
    isentropic_exponent: Array
    enthalpy: Array
    entropy: Array
    status: npt.NDArray[np.int64]
    amounts: Array | None = None
    equilibrium: EquilibriumState | None = None

    @property
    def mass_flux(self) -> Array:
        """Mass flow per area [kg/(m2 s)]."""
        return np.asarray(self.density * self.velocity)

    def take(self, index: Any) -> FlowState:
        """Return the cases of `index`."""
        changed: dict[str, Any] = {}
        for field in fields(self):
            value = getattr(self, field.name)
            changed[field.name] = None if value is None else value.take(index) if isinstance(value, EquilibriumState) else value[index]
        return replace(self, **changed)


class Isentrope(Protocol):
    """The isentrope of a reservoir: `enthalpy`, `entropy` and `pressure` at rest, and the state at a pressure."""

    enthalpy: Array
    entropy: Array
    pressure: Array

    def at(self, log_p: Array, near: FlowState | None = None) -> FlowState:
        """Return the flow states at ln p (shape (case,)), starting from states nearby."""
        ...

    def exponent(self) -> Array:
        """Return an isentropic exponent to start searches from."""
        ...


def _velocity(stagnation: Array, enthalpy: Array) -> Array:
    return np.asarray(np.sqrt(np.maximum(2.0 * (stagnation - enthalpy), 0.0)))


@dataclass(frozen=True, slots=True, eq=False)
class Shifting:
    """Composition in equilibrium everywhere."""

    table: SpeciesTable
    elements: Array
    enthalpy: Array
    entropy: Array
    pressure: Array
    reservoir: EquilibriumState

    def exponent(self) -> Array:
        """Return the isentropic exponent of the reservoir."""
        return self.reservoir.isentropic_exponent

    def at(self, log_p: Array, near: FlowState | None = None) -> FlowState:
        """Return the flow states at ln p."""
        guess = self.reservoir if near is None or near.equilibrium is None else near.equilibrium
        state = equilibrium.solve(self.table, self.elements, pressure=np.exp(log_p), entropy=self.entropy, guess=guess)
        velocity = _velocity(self.enthalpy, state.enthalpy)
        return FlowState(
            state.pressure, state.temperature, state.density, velocity, velocity / state.sound_speed, state.sound_speed, state.molar_mass,
            state.isentropic_exponent, state.enthalpy, state.entropy, state.status, state.amounts, state,
        )  # fmt: skip


@dataclass(frozen=True, slots=True, eq=False)
class Frozen:
    """Composition fixed at `amounts` [mol/kg], shape (case, species)."""

    table: SpeciesTable
    amounts: Array
    enthalpy: Array
    entropy: Array
    pressure: Array
    temperature: Array

    def exponent(self) -> Array:
        """Return the frozen exponent at the reservoir."""
        cp, _, _ = self._sums(self.temperature)
        return np.asarray(cp / (cp - GAS_CONSTANT * self.amounts.sum(axis=1)))

    def _sums(self, temperature: Array) -> tuple[Array, Array, Array]:
        cp, h, s = self.table.properties(temperature)[:3]
        n = self.amounts
        return GAS_CONSTANT * (n * cp).sum(axis=1), GAS_CONSTANT * temperature * (n * h).sum(axis=1), GAS_CONSTANT * (n * s).sum(axis=1)

    def at(self, log_p: Array, near: FlowState | None = None) -> FlowState:
        """Return the flow states at ln p."""
        moles = self.amounts.sum(axis=1)
        gas_constant = GAS_CONSTANT * moles
        with np.errstate(divide="ignore", invalid="ignore"):
            mixing = -GAS_CONSTANT * np.where(self.amounts > 0.0, self.amounts * np.log(self.amounts / moles[:, None]), 0.0).sum(axis=1)
        fixed = mixing - gas_constant * (log_p - np.log(self.table.reference_pressure))
        t = np.array(self.temperature if near is None else near.temperature)
        done = np.zeros(len(t), dtype=bool)
        for _ in range(MOST_STEPS):
            cp, _, s = self._sums(t)
            step = np.clip((self.entropy - s - fixed) / cp, -1.0, 1.0)
            t = np.where(done, t, t * np.exp(step))
            done |= np.abs(step) < 1e-14
            if done.all():
                break
        done |= np.abs(step) < 1e-12
        cp, enthalpy, s = self._sums(t)
        gamma = cp / (cp - gas_constant)
        sound = np.sqrt(gamma * gas_constant * t)
        velocity = _velocity(self.enthalpy, enthalpy)
        status = np.where(~done | ~np.isfinite(t), NOT_CONVERGED, np.where(t < equilibrium.COLDEST, OUT_OF_RANGE, CONVERGED))
        pressure = np.exp(log_p)
        return FlowState(
            pressure, t, pressure / (gas_constant * t), velocity, velocity / sound, sound, 1.0 / moles, gamma, enthalpy, s + fixed, status, self.amounts
        )


@dataclass(frozen=True, slots=True, eq=False)
class PerfectGas:
    """Gas constant and isentropic exponent fixed; enthalpy and entropy are those of the reservoir there."""

    gamma: Array
    gas_constant: Array
    temperature: Array
    enthalpy: Array
    entropy: Array
    pressure: Array

    def exponent(self) -> Array:
        """Return the exponent."""
        return self.gamma

    def at(self, log_p: Array, near: FlowState | None = None) -> FlowState:
        """Return the flow states at ln p, in closed form."""
        pressure = np.exp(log_p)
        ratio = np.minimum(pressure / self.pressure, 1.0)
        mach = gas_dynamics.mach_from_pressure_ratio(ratio, self.gamma)
        t = self.temperature * gas_dynamics.temperature_ratio(mach, self.gamma)
        sound = np.sqrt(self.gamma * self.gas_constant * t)
        heat = self.gamma * self.gas_constant / (self.gamma - 1.0)
        enthalpy = self.enthalpy + heat * (t - self.temperature)
        status = np.zeros(len(pressure), dtype=np.int64)
        molar_mass = GAS_CONSTANT / self.gas_constant
        shape = pressure.shape
        return FlowState(
            pressure, t, pressure / (self.gas_constant * t), mach * sound, mach, sound, np.broadcast_to(molar_mass, shape),
            np.broadcast_to(self.gamma, shape), enthalpy, np.broadcast_to(self.entropy, shape), status,
        )  # fmt: skip


def shifting(table: SpeciesTable, elements: Array, reservoir: EquilibriumState) -> Shifting:
    """Return the isentrope of equilibrium flow from a reservoir at rest."""
    return Shifting(table, np.atleast_2d(elements), reservoir.enthalpy, reservoir.entropy, reservoir.pressure, reservoir)


def frozen(table: SpeciesTable, amounts: Array, enthalpy: Array, entropy: Array, pressure: Array, temperature: Array) -> Frozen:
    """Return the isentrope of a fixed composition: `enthalpy` and `entropy` are the conserved stagnation values."""
    return Frozen(table, np.atleast_2d(amounts), enthalpy, entropy, pressure, temperature)


def perfect_gas(gamma: Values, gas_constant: Values, temperature: Values, pressure: Values, enthalpy: Values = 0.0, entropy: Values = 0.0) -> PerfectGas:
    """Return the isentrope of a gas of constant properties."""
    arrays = np.broadcast_arrays(*(np.atleast_1d(values(v)) for v in (gamma, gas_constant, temperature, enthalpy, entropy, pressure)))
    return PerfectGas(*(np.array(array) for array in arrays))


def at_pressure(isentrope: Isentrope, pressure: Values, near: FlowState | None = None) -> FlowState:
    """Return the flow states at pressures [Pa] at most the stagnation pressure."""
    log_p = np.broadcast_to(np.log(values(pressure)), isentrope.pressure.shape)
    return isentrope.at(np.array(log_p), near)


def throat(isentrope: Isentrope) -> FlowState:
    """Return the state of largest mass flux, where the Mach number is 1.

    Notes
    -----
    Newton in ln p on ln M^2 = 0 with d ln M^2/d ln p = -2 p/(rho u^2) - (gamma - 1)/gamma, exact but for the change of gamma.
    """
    gamma = isentrope.exponent()
    top = np.log(isentrope.pressure)
    log_p = top + gamma / (gamma - 1.0) * np.log(2.0 / (gamma + 1.0))

    def step(state: FlowState) -> Array:
        g = state.isentropic_exponent
        slope = -2.0 / (g * state.mach**2) - (g - 1.0) / g
        return np.asarray(-2.0 * np.log(state.mach) / slope)

    return _search(isentrope, log_p, step, np.full_like(top, -np.inf), top - 1e-9)


def at_area_ratio(isentrope: Isentrope, mass_flux: Values, area_ratio: Values, at_throat: FlowState, supersonic: bool = True) -> FlowState:
    """Return the states where the area is `area_ratio` times that which passes `mass_flux` [kg/(m2 s)] at the throat.

    Notes
    -----
    Newton in ln p on ln(rho u) - ln(flux/ratio) = 0; started from the perfect gas of the throat's exponent.
    """
    ratio = np.broadcast_to(values(area_ratio), isentrope.pressure.shape).astype(float)
    aim = np.log(values(mass_flux)) - np.log(ratio)
    gamma = np.maximum(at_throat.isentropic_exponent, 1.01)
    mach = gas_dynamics.mach_from_area_ratio(ratio, gamma, "supersonic" if supersonic else "subsonic")
    base = gas_dynamics.pressure_ratio(1.0, gamma)
    top, middle = np.log(isentrope.pressure), np.log(at_throat.pressure)
    log_p = middle + np.log(gas_dynamics.pressure_ratio(mach, gamma) / base)
    if not supersonic:
        log_p = np.minimum(log_p, top - 1e-13)

    def step(state: FlowState) -> Array:
        with np.errstate(divide="ignore", invalid="ignore"):
            slope = (1.0 - 1.0 / state.mach**2) / state.isentropic_exponent
            return np.asarray(-(np.log(state.mass_flux) - aim) / slope)

    low = np.full_like(top, -np.inf) if supersonic else middle
    high = middle if supersonic else top
    found = _search(isentrope, log_p, step, low, high)
    at_one = ratio <= 1.0 + 1e-12
    return found if not at_one.any() else _merge(found, at_throat, at_one)


def _search(isentrope: Isentrope, log_p: Array, step: Any, low: Array, high: Array) -> FlowState:
    """Return the states where `step` vanishes; a step that leaves the bracket goes half way to its end."""
    state = isentrope.at(log_p)
    done = np.zeros(len(log_p), dtype=bool)
    for _ in range(MOST_STEPS):
        move = np.clip(np.nan_to_num(step(state), nan=0.1), -1.5, 1.5)
        done = np.abs(move) < TOLERANCE * np.maximum(1.0, np.abs(log_p))
        bad = state.status != CONVERGED
        if (done | bad).all():
            break
        there = log_p + np.where(done, 0.0, move)
        there = np.where(there >= high, 0.5 * (log_p + np.minimum(high, log_p + 3.0)), there)
        there = np.where(there <= low, 0.5 * (log_p + np.maximum(low, log_p - 3.0)), there)
        log_p = there
        state = isentrope.at(log_p, state)
    close = np.abs(np.nan_to_num(step(state), nan=1.0)) < 1e-10
    status = np.where(state.status != CONVERGED, state.status, np.where(done | close, CONVERGED, NOT_CONVERGED))
    return replace(state, status=status)


def _merge(state: FlowState, other: FlowState, where: npt.NDArray[np.bool_]) -> FlowState:
    """Return `state` with the cases of `where` taken from `other`."""
    changed: dict[str, Any] = {}
    for field in fields(state):
        mine, theirs = getattr(state, field.name), getattr(other, field.name)
        if mine is None or isinstance(mine, EquilibriumState):
            changed[field.name] = mine
            continue
        choose = where if mine.ndim == 1 else where[:, None]
        changed[field.name] = np.where(choose, theirs, mine)
    return replace(state, **changed)


@dataclass(frozen=True, slots=True, eq=False)
class FrozenFrom:
    """Equilibrium down to a freezing state, frozen composition below its pressure."""

    before: Shifting
    after: Frozen
    freezing: FlowState
    enthalpy: Array
    entropy: Array
    pressure: Array

    def exponent(self) -> Array:
        """Return the exponent of the reservoir."""
        return self.before.exponent()

    def at(self, log_p: Array, near: FlowState | None = None) -> FlowState:
        """Return the flow states at ln p: the frozen ones strictly below the freezing pressure."""
        early = self.before.at(log_p, near if near is not None and near.equilibrium is not None else None)
        late = self.after.at(log_p)
        return replace(_merge(early, late, log_p < np.log(self.freezing.pressure)), equilibrium=early.equilibrium)


def frozen_from(before: Shifting, at_throat: FlowState, area_ratio: float | None) -> FrozenFrom:
    """Return the isentrope that is in equilibrium down to the throat, or to a supersonic area ratio, and frozen beyond."""
    freezing = at_throat if area_ratio is None else at_area_ratio(before, at_throat.mass_flux, area_ratio, at_throat)
    assert freezing.amounts is not None
    after = frozen(before.table, freezing.amounts, before.enthalpy, before.entropy, freezing.pressure, freezing.temperature)
    return FrozenFrom(before, after, freezing, before.enthalpy, before.entropy, before.pressure)
