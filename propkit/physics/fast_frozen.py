"""Flow of a held composition for a block of designs: throat and exit by Newton's iteration in ln T on sums over the species."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import Final

import numpy as np
import numpy.typing as npt

from propkit.constants import GAS_CONSTANT
from propkit.physics import gas_dynamics
from propkit.physics.arrays import Array
from propkit.physics.equilibrium_terms import LOWEST_TEMPERATURE
from propkit.physics.thermodynamics import SpeciesTable

_STEPS: Final = 12
_RESTED: Final = 1e-7
"""Step in ln T before which the next one is smaller than rounding."""

_LONGEST: Final = 0.4
_SMALLEST: Final = 1e-13


@dataclass(slots=True, eq=False)
class Held:
    """A held composition at a temperature: cp, h/T and s (without mixing) [J/(kg K)], shape (case,)."""

    temperature: Array
    heat_capacity: Array
    enthalpy_over_temperature: Array
    entropy: Array


@dataclass(slots=True, eq=False)
class HeldFlow:
    """State of held flow at one place, shape (case,), SI, and whether it was found."""

    pressure: Array
    temperature: Array
    enthalpy: Array
    heat_capacity: Array
    good: npt.NDArray[np.bool_]


class HeldGas:
    """The isentrope of a held composition of a block, from its gas at rest.

    Parameters
    ----------
    table : SpeciesTable
        All species.
    kept : array of int
        The species whose amounts are given.
    amounts : array
        Moles in a kilogram [mol/kg], shape (species kept, case).
    moles, temperature, pressure, enthalpy : array
        Moles of gas [mol/kg], T [K], p [Pa], h [J/kg] at rest.
    """

    def __init__(
        self,
        table: SpeciesTable,
        kept: npt.NDArray[np.intp],
        amounts: Array,
        moles: Array,
        temperature: Array,
        pressure: Array,
        enthalpy: Array,
    ) -> None:
        self.table, self.kept, self.amounts = table, kept, amounts
        self.gas_constant = GAS_CONSTANT * moles
        self.temperature, self.pressure, self.enthalpy = temperature, pressure, enthalpy
        self._sums: dict[int, Array] = {}
        self.rest = self.at(np.log(temperature))

    def _interval(self, number: int) -> Array:
        if number not in self._sums:
            self._sums[number] = GAS_CONSTANT * (self.table.segments[number][:, self.kept] @ self.amounts)
        return self._sums[number]

    def at(self, log_temperature: Array) -> Held:
        """Return the gas at ln T."""
        t = np.exp(log_temperature)
        intervals = self.table.interval(t)
        first = int(intervals[0])
        a = self._interval(first)
        if not (intervals == first).all():
            a = a.copy()
            for number in np.unique(intervals):
                if number != first:
                    which = np.flatnonzero(intervals == number)
                    a[:, which] = self._interval(int(number))[:, which]
        t2 = t * t
        heat_capacity = a[0] + t * (a[1] + t * (a[2] + t * (a[3] + t * a[4])))
        enthalpy = a[0] + t * (a[1] / 2 + t * (a[2] / 3 + t * (a[3] / 4 + t * (a[4] / 5)))) + a[5] / t
        entropy = a[0] * log_temperature + t * a[1] + t2 * (a[2] / 2 + t * (a[3] / 3 + t * (a[4] / 4))) + a[6]
        return Held(t, heat_capacity, enthalpy, entropy)

    def log_pressure(self, gas: Held) -> Array:
        """Return ln p on the isentrope [ln Pa]."""
        return np.asarray(np.log(self.pressure) + (gas.entropy - self.rest.entropy) / self.gas_constant)

    def _square(self, gas: Held) -> Array:
        head = 2.0 * (self.enthalpy - gas.enthalpy_over_temperature * gas.temperature)
        return np.maximum(head, _SMALLEST * self.gas_constant * gas.temperature)

    def _exponent(self, gas: Held) -> Array:
        return np.asarray(gas.heat_capacity / (gas.heat_capacity - self.gas_constant))

    def throat(self) -> HeldFlow:
        """Return the state where the Mach number of the held gas is 1."""

        def sonic(gas: Held) -> tuple[Array, Array]:
            square = self._square(gas)
            thermal = self.gas_constant * gas.temperature
            return np.log(square / (self._exponent(gas) * thermal)), -2.0 * gas.heat_capacity * gas.temperature / square - 1.0

        return self._found(sonic, self.temperature * 2.0 / (self._exponent(self.rest) + 1.0))

    def at_pressure(self, pressure: Array) -> HeldFlow:
        """Return the state at a pressure [Pa]."""
        goal = np.log(pressure)

        def equation(gas: Held) -> tuple[Array, Array]:
            return self.log_pressure(gas) - goal, gas.heat_capacity / self.gas_constant

        return self._found(equation, self.temperature * (pressure / self.pressure) ** (self.gas_constant / self.rest.heat_capacity))

    def before_throat(self, mass_flux: Array, sonic: HeldFlow) -> HeldFlow:
        """Return the subsonic state at a mass flux [kg/(m2 s)], from the state given: energy with the velocity of the mass flux."""

        def equation(gas: Held) -> tuple[Array, Array]:
            thermal = self.gas_constant * gas.temperature
            square = (mass_flux * thermal / np.exp(self.log_pressure(gas))) ** 2
            content = gas.heat_capacity * gas.temperature
            missing = (gas.enthalpy_over_temperature * gas.temperature + 0.5 * square - self.enthalpy) / content
            return missing, 1.0 - square * (gas.heat_capacity / self.gas_constant - 1.0) / content

        found = self._found(equation, self.temperature)
        found.good &= found.temperature > sonic.temperature
        return found

    def at_mass_flux(self, mass_flux: Array, sonic: HeldFlow) -> HeldFlow:
        """Return the supersonic state at a mass flux [kg/(m2 s)] at most that of the throat."""
        gamma = sonic.heat_capacity / (sonic.heat_capacity - self.gas_constant)
        top = sonic.pressure * np.sqrt(2.0 * (self.enthalpy - sonic.enthalpy)) / (self.gas_constant * sonic.temperature)
        ratio = top / mass_flux
        good = np.isfinite(ratio) & (ratio > 1.0 + 1e-9) & np.isfinite(gamma) & (gamma > 1.0)
        mach = gas_dynamics.mach_from_area_ratio(np.where(good, ratio, 2.0), np.where(good, gamma, 1.2), "supersonic")
        goal = np.log(mass_flux)

        def equation(gas: Held) -> tuple[Array, Array]:
            square = self._square(gas)
            flux = self.log_pressure(gas) - np.log(self.gas_constant * gas.temperature) + 0.5 * np.log(square)
            return flux - goal, gas.heat_capacity / self.gas_constant - 1.0 - gas.heat_capacity * gas.temperature / square

        fall = (1.0 + 0.5 * (gamma - 1.0)) / (1.0 + 0.5 * (gamma - 1.0) * mach**2)
        found = self._found(equation, sonic.temperature * fall)
        found.good &= good
        return found

    def _found(self, equation: Callable[[Held], tuple[Array, Array]], start: Array) -> HeldFlow:
        x, good = np.log(start), np.zeros(start.shape, dtype=bool)
        for _ in range(_STEPS):
            value, slope = equation(self.at(x))
            step = np.clip(-value / slope, -_LONGEST, _LONGEST)
            x = x + step
            good = np.abs(step) < _RESTED
            if good.all():
                break
        gas = self.at(x)
        good &= gas.temperature > LOWEST_TEMPERATURE
        return HeldFlow(
            np.exp(self.log_pressure(gas)), gas.temperature, gas.enthalpy_over_temperature * gas.temperature, gas.heat_capacity, good
        )
