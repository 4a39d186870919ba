"""Flow whose composition is held: everywhere, or from a place of the nozzle on.

At constant composition and entropy the pressure is an explicit function of temperature, so every question is one equation
in ln T. The mixture has seven coefficients in each interval of temperature, the sums of those of its species.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace
from typing import Final

import numpy as np

from propkit.constants import GAS_CONSTANT
from propkit.physics import gas_dynamics
from propkit.physics.arrays import Array, magnitude
from propkit.physics.equilibrium import CONVERGED, NOT_CONVERGED, OUT_OF_RANGE
from propkit.physics.equilibrium_terms import LOWEST_HELD_TEMPERATURE, Integers
from propkit.physics.expansion_shifting import Shifting
from propkit.physics.expansion_state import FlowState, choose, take_cases, velocity
from propkit.physics.thermodynamics import SpeciesTable, powers

_ITERATIONS: Final = 80
_TOLERANCE: Final = 4e-15
_ACCEPTED: Final = 1e-12
_LARGEST_STEP: Final = 0.4
_SMALLEST_HEAD: Final = 1e-13

Equation = Callable[["Mixture"], tuple[Array, Array]]


@dataclass(frozen=True, slots=True, eq=False)
class Mixture:
    """A held composition at a temperature on its isentrope, a batch.

    Parameters
    ----------
    temperature : array
        T [K].
    heat_capacity : array
        cp [J/(kg K)].
    enthalpy : array
        h [J/kg].
    log_pressure : array
        ln of p [Pa].
    """

    temperature: Array
    heat_capacity: Array
    enthalpy: Array
    log_pressure: Array


@dataclass(frozen=True, slots=True, eq=False)
class Frozen:
    """The isentrope of a gas whose composition, liquids and solids included, is held.

    Parameters
    ----------
    table : SpeciesTable
        The species.
    amounts : array
        Moles of each species in a kilogram [mol/kg], shape (case, species).
    enthalpy, entropy, pressure : array
        Stagnation enthalpy [J/kg], entropy [J/(kg K)], stagnation pressure [Pa].
    temperature : array
        A temperature on the isentrope [K], to start from.
    coefficients : array
        Coefficients of the mixture, shape (case, interval, 7) [mol/kg].
    gas_constant : array
        Specific gas constant [J/(kg K)].
    mixing_entropy : array
        Entropy of mixing of the gas at the reference pressure [J/(kg K)].
    """

    table: SpeciesTable
    amounts: Array
    enthalpy: Array
    entropy: Array
    pressure: Array
    temperature: Array
    coefficients: Array
    gas_constant: Array
    mixing_entropy: Array

    def take(self, rows: Integers) -> Frozen:
        """Return some cases as a smaller batch."""
        return take_cases(self, rows)

    def throat(self) -> FlowState:
        """Return the state of largest mass flux: Mach 1 with the composition held."""

        def sonic(gas: Mixture) -> tuple[Array, Array]:
            square = self._square(gas)
            gamma = gas.heat_capacity / (gas.heat_capacity - self.gas_constant)
            thermal = self.gas_constant * gas.temperature
            return np.log(square / (gamma * thermal)), -2.0 * gas.heat_capacity * gas.temperature / square - 1.0

        gamma = self._exponent(self.mixture(np.log(self.temperature)))
        start = self._rest_temperature() * gas_dynamics.temperature_ratio(1.0, gamma)
        return self._found(sonic, start)

    def at_pressure(self, pressure: Array, near: FlowState | None = None) -> FlowState:
        """Return the state at a pressure [Pa]; status 2 above the stagnation pressure."""
        goal = np.log(pressure)

        def equation(gas: Mixture) -> tuple[Array, Array]:
            return gas.log_pressure - goal, gas.heat_capacity / self.gas_constant

        known = self.mixture(np.log(self.temperature))
        start = known.temperature * np.exp((goal - known.log_pressure) * self.gas_constant / known.heat_capacity)
        found = self._found(equation, start)
        above = pressure > self.pressure * (1.0 + 1e-12)
        return replace(found, status=np.where(above, OUT_OF_RANGE, found.status))

    def at_mass_flux(self, mass_flux: Array, at_throat: FlowState, supersonic: bool) -> FlowState:
        """Return the state at a mass flux [kg/(m2 s)] on one side of this gas's own sonic point; status 2 above its flux."""
        sonic = self.throat()
        ratio = sonic.mass_flux / mass_flux
        ratio = np.where(np.abs(ratio - 1.0) < _ACCEPTED, 1.0, ratio)
        good = np.isfinite(ratio) & (ratio >= 1.0)
        gamma = sonic.isentropic_exponent
        mach = gas_dynamics.mach_from_area_ratio(np.where(good, ratio, 1.0), gamma, "supersonic" if supersonic else "subsonic")
        fall = gas_dynamics.temperature_ratio(mach, gamma) / gas_dynamics.temperature_ratio(1.0, gamma)
        start = np.minimum(sonic.temperature * fall, self._rest_temperature() * (1.0 - 1e-9))
        goal = np.log(mass_flux)

        def equation(gas: Mixture) -> tuple[Array, Array]:
            square = self._square(gas)
            flux = gas.log_pressure - np.log(self.gas_constant * gas.temperature) + 0.5 * np.log(square)
            slope = gas.heat_capacity / self.gas_constant - 1.0 - gas.heat_capacity * gas.temperature / square
            return flux - goal, slope

        found = choose(self._found(equation, start), sonic, ratio == 1.0)
        return replace(found, status=np.where(good, found.status, OUT_OF_RANGE))

    def mixture(self, log_temperature: Array) -> Mixture:
        """Return the mixture at ln T on the isentrope."""
        t = np.exp(log_temperature)
        rows = self.coefficients[np.arange(t.size), self.table.interval(t)]
        cp, h, s = (GAS_CONSTANT * np.einsum("ij,ij->i", part, rows) for part in powers(t))
        log_pressure = np.log(self.table.reference_pressure) + (s + self.mixing_entropy - self.entropy) / self.gas_constant
        return Mixture(t, cp, h * t, log_pressure)

    def _exponent(self, gas: Mixture) -> Array:
        return np.asarray(gas.heat_capacity / (gas.heat_capacity - self.gas_constant))

    def _square(self, gas: Mixture) -> Array:
        return np.maximum(2.0 * (self.enthalpy - gas.enthalpy), _SMALLEST_HEAD * self.gas_constant * gas.temperature)

    def _rest_temperature(self) -> Array:
        """Return the temperature at rest [K], where h is the stagnation enthalpy."""
        x = np.log(self.temperature)
        for _ in range(_ITERATIONS):
            gas = self.mixture(x)
            step = np.clip((self.enthalpy - gas.enthalpy) / (gas.heat_capacity * gas.temperature), -_LARGEST_STEP, _LARGEST_STEP)
            x = x + step
            if not (magnitude(step) > _ACCEPTED).any():
                break
        return np.exp(x)

    def _found(self, equation: Equation, start: Array) -> FlowState:
        """Return the state at which an equation in ln T vanishes; every case stops on its own."""
        x = np.log(start)
        size, steps = np.full(x.shape, np.inf), np.zeros(x.shape, dtype=np.intp)
        active = np.ones(x.shape, dtype=bool)
        for _ in range(_ITERATIONS):
            value, slope = equation(self.mixture(x))
            with np.errstate(divide="ignore", invalid="ignore"):
                step = np.clip(-value / slope, -_LARGEST_STEP, _LARGEST_STEP)
            x = np.where(active & np.isfinite(step), x + step, x)
            smaller = np.minimum(magnitude(step), magnitude(value))
            stalled = (smaller < _ACCEPTED) & (smaller >= 0.5 * size)
            size, steps = np.where(active, smaller, size), steps + active
            active &= (smaller > _TOLERANCE) & ~stalled & np.isfinite(step)
            if not active.any():
                break
        gas = self.mixture(x)
        status = np.where(size <= _ACCEPTED, CONVERGED, NOT_CONVERGED)
        outside = (gas.temperature < LOWEST_HELD_TEMPERATURE) | (gas.temperature > self.table.temperature_high.max())
        return self._state(gas, np.where(outside, OUT_OF_RANGE, status), steps, size)

    def _state(self, gas: Mixture, status: Integers, steps: Integers, residual: Array) -> FlowState:
        pressure, exponent = np.exp(gas.log_pressure), self._exponent(gas)
        return FlowState(
            pressure=pressure,
            temperature=gas.temperature,
            density=pressure / (self.gas_constant * gas.temperature),
            velocity=velocity(self.enthalpy, gas.enthalpy),
            sound_speed=np.sqrt(exponent * self.gas_constant * gas.temperature),
            molar_mass=GAS_CONSTANT / self.gas_constant,
            isentropic_exponent=exponent,
            enthalpy=gas.enthalpy,
            entropy=np.array(self.entropy),
            status=status,
            iterations=steps,
            residual=residual,
            amounts=self.amounts,
        )


def frozen_gas(table: SpeciesTable, amounts: Array, enthalpy: Array, entropy: Array, pressure: Array, temperature: Array) -> Frozen:
    """Return the isentrope of a held composition; arguments as for `propkit.physics.expansion.frozen`."""
    gas = amounts[:, : table.gas_count]
    moles = gas.sum(axis=1)
    share = np.maximum(gas / moles[:, None], np.finfo(float).tiny)  # a trace below the smallest normal number adds nothing
    mixing = -(gas * np.log(share)).sum(axis=1)
    coefficients = np.stack([amounts @ segment.T for segment in table.segments], axis=1)
    shape = moles.shape
    enthalpy, entropy, pressure, temperature = (
        np.array(np.broadcast_to(part, shape)) for part in (enthalpy, entropy, pressure, temperature)
    )
    return Frozen(
        table,
        amounts,
        enthalpy,
        entropy,
        pressure,
        temperature,
        coefficients,
        GAS_CONSTANT * moles,
        GAS_CONSTANT * mixing,
    )


@dataclass(frozen=True, slots=True, eq=False)
class FrozenFrom:
    """The isentrope that is in equilibrium down to a place of the nozzle and whose composition is held beyond.

    Parameters
    ----------
    before : Shifting
        The flow in equilibrium.
    after : Frozen
        The flow with the composition of the place.
    equilibrium_throat : FlowState
        Throat of the flow in equilibrium.
    place : FlowState
        Where the composition freezes.
    at_the_throat : array of bool
        Whether that is the throat, shape (case,).
    """

    before: Shifting
    after: Frozen
    equilibrium_throat: FlowState
    place: FlowState
    at_the_throat: Array

    @property
    def enthalpy(self) -> Array:
        """Stagnation enthalpy [J/kg]."""
        return self.before.enthalpy

    @property
    def entropy(self) -> Array:
        """Entropy [J/(kg K)]."""
        return self.before.entropy

    @property
    def pressure(self) -> Array:
        """Stagnation pressure [Pa]."""
        return self.before.pressure

    def take(self, rows: Integers) -> FrozenFrom:
        """Return some cases as a smaller batch."""
        return take_cases(self, rows)

    def throat(self) -> FlowState:
        """Return the throat of the flow in equilibrium; with the sound speed of the frozen gas where it freezes there."""
        known = self.equilibrium_throat
        exponent = self.after._exponent(self.after.mixture(np.log(known.temperature)))
        frozen_speed = np.sqrt(exponent * self.after.gas_constant * known.temperature)
        return replace(
            known,
            sound_speed=np.where(self.at_the_throat, frozen_speed, known.sound_speed),
            isentropic_exponent=np.where(self.at_the_throat, exponent, known.isentropic_exponent),
        )

    def at_pressure(self, pressure: Array, near: FlowState | None = None) -> FlowState:
        """Return the state at a pressure [Pa]; status 2 between the freezing throat and the frozen sonic point."""
        late = self.after.at_pressure(pressure)
        early = self.before.at_pressure(np.maximum(pressure, self.place.pressure), self.equilibrium_throat)
        beyond = pressure < self.place.pressure * (1.0 - 1e-12)
        found = choose(early, late, beyond)
        skipped = beyond & (late.velocity < late.sound_speed)
        return replace(found, status=np.where(skipped, OUT_OF_RANGE, found.status), equilibrium=None)

    def at_mass_flux(self, mass_flux: Array, at_throat: FlowState, supersonic: bool) -> FlowState:
        """Return the state at a mass flux [kg/(m2 s)] on one side of the throat."""
        if not supersonic:
            return replace(self.before.at_mass_flux(mass_flux, self.equilibrium_throat, False), equilibrium=None)
        late = self.after.at_mass_flux(mass_flux, at_throat, True)
        reached = np.where(self.at_the_throat, True, mass_flux <= self.place.mass_flux * (1.0 + 1e-12))
        if reached.all():
            return late
        early = self.before.at_mass_flux(np.where(reached, self.place.mass_flux, mass_flux), self.equilibrium_throat, True)
        return replace(choose(early, late, reached), equilibrium=None)
