"""Flow of a gas with constant properties, in closed form."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from propkit.constants import GAS_CONSTANT
from propkit.physics import gas_dynamics, ideal_nozzle
from propkit.physics.arrays import Array
from propkit.physics.equilibrium import CONVERGED, OUT_OF_RANGE
from propkit.physics.equilibrium_terms import Integers
from propkit.physics.expansion_state import FlowState, take_cases


@dataclass(frozen=True, slots=True, eq=False)
class PerfectGas:
    """The isentrope of a gas with constant properties.

    Parameters
    ----------
    gamma, gas_constant, temperature, pressure : array
        Isentropic exponent, R [J/(kg K)], T0 [K], p0 [Pa], shape (case,).
    enthalpy, entropy : array
        h0 [J/kg] and s [J/(kg K)] to count from.
    """

    gamma: Array
    gas_constant: Array
    temperature: Array
    pressure: Array
    enthalpy: Array
    entropy: Array

    def take(self, rows: Integers) -> PerfectGas:
        """Return some cases as a smaller batch."""
        return take_cases(self, rows)

    def throat(self) -> FlowState:
        """Return the sonic state."""
        return self._state(np.ones_like(self.gamma), np.full(self.gamma.shape, CONVERGED))

    def at_pressure(self, pressure: Array, near: FlowState | None = None) -> FlowState:
        """Return the state at a pressure [Pa]; status 2 above the stagnation pressure."""
        ratio = pressure / self.pressure
        good = (ratio > 0.0) & (ratio <= 1.0)
        mach = gas_dynamics.mach_from_pressure_ratio(np.where(good, ratio, 1.0), self.gamma)
        return self._state(mach, np.where(good, CONVERGED, OUT_OF_RANGE))

    def at_mass_flux(self, mass_flux: Array, at_throat: FlowState, supersonic: bool) -> FlowState:
        """Return the state at a mass flux [kg/(m2 s)] on one side of the throat; status 2 above the choked one."""
        choked = ideal_nozzle.choked_mass_flux(self.pressure, self.temperature, self.gas_constant, self.gamma)
        ratio = choked / mass_flux
        ratio = np.where(np.abs(ratio - 1.0) < 1e-12, 1.0, ratio)
        good = (ratio >= 1.0) & np.isfinite(ratio)
        branch: gas_dynamics.Branch = "supersonic" if supersonic else "subsonic"
        mach = gas_dynamics.mach_from_area_ratio(np.where(good, ratio, 1.0), self.gamma, branch)
        return self._state(mach, np.where(good, CONVERGED, OUT_OF_RANGE))

    def _state(self, mach: Array, status: Integers) -> FlowState:
        temperature = self.temperature * gas_dynamics.temperature_ratio(mach, self.gamma)
        pressure = self.pressure * gas_dynamics.pressure_ratio(mach, self.gamma)
        sound_speed = np.sqrt(self.gamma * self.gas_constant * temperature)
        heat_capacity = self.gamma * self.gas_constant / (self.gamma - 1.0)
        return FlowState(
            pressure=pressure,
            temperature=temperature,
            density=pressure / (self.gas_constant * temperature),
            velocity=mach * sound_speed,
            sound_speed=sound_speed,
            molar_mass=GAS_CONSTANT / self.gas_constant,
            isentropic_exponent=self.gamma,
            enthalpy=self.enthalpy + heat_capacity * (temperature - self.temperature),
            entropy=self.entropy,
            status=status,
            iterations=np.zeros_like(status),
            residual=np.zeros_like(pressure),
        )
