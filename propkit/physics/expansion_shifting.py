"""Flow in chemical equilibrium everywhere: throat and area ratio found inside the equilibrium iteration itself.

The pressure is one more unknown of each Newton step. The step at constant pressure leads to the isentrope, the response
to pressure at constant entropy leads along it, and the flow condition says how far.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace
from typing import Final

import numpy as np

from propkit.constants import GAS_CONSTANT
from propkit.physics import expansion_two_phase, gas_dynamics
from propkit.physics.arrays import Array, distinct, has_tangent, plain
from propkit.physics.equilibrium import CONVERGED, NOT_CONVERGED, EquilibriumState, solve_batch, with_tangent
from propkit.physics.equilibrium_terms import FlowCondition, FlowTrial, Integers
from propkit.physics.expansion_state import FlowState, choose, take_cases, velocity
from propkit.physics.thermodynamics import SpeciesTable

_LOWEST_EXPONENT: Final = 1.02
_SMALLEST_HEAD: Final = 1e-12
"""Smallest share of R T0 / M that the kinetic energy is taken to be while the iteration runs."""

_SLOW: Final = 0.02
"""Dynamic over stagnation pressure below which a subsonic search starts from the gas at rest."""

_NEAR_THROAT: Final = 0.1
"""ln of the area ratio below which the search follows the square root of ln A, which runs straight through the throat."""

_LARGEST_CHANGE: Final = 0.1
"""Largest d ln gamma / d ln p that is believed."""

_AT_THROAT: Final = 1e-12
"""ln of the area ratio below which the throat itself is meant."""


@dataclass(frozen=True, slots=True, eq=False)
class Shifting:
    """The isentrope of a gas in equilibrium everywhere.

    Parameters
    ----------
    table : SpeciesTable
        The species.
    elements : array
        Moles of atoms in a kilogram [mol/kg], shape (case, element).
    enthalpy, entropy, pressure : array
        h0 [J/kg], s [J/(kg K)], p0 [Pa] of the gas at rest.
    reservoir : EquilibriumState
        The gas at rest.
    """

    table: SpeciesTable
    elements: Array
    enthalpy: Array
    entropy: Array
    pressure: Array
    reservoir: EquilibriumState

    def take(self, rows: Integers) -> Shifting:
        """Return some cases as a smaller batch."""
        return take_cases(self, rows)

    def at_rest(self) -> FlowState:
        """Return the reservoir itself."""
        return self._state(self.reservoir)

    def at_pressure(self, pressure: Array, near: FlowState | None = None) -> FlowState:
        """Return the state at a pressure [Pa]."""
        if has_tangent(*self._given, pressure):
            base, rows, back = self._plain(pressure)
            nearby = None if near is None else plain(near).take(rows)
            return self._moved(base.at_pressure(pressure.real[rows], nearby).take(back), None, pressure)
        known = self.reservoir if near is None or near.equilibrium is None else near.equilibrium
        return self._state(self._solve(pressure, known, None))

    def throat(self) -> FlowState:
        """Return the state of largest mass flux: Mach 1 with the composition following."""
        if has_tangent(*self._given):
            base, _, back = self._plain()
            return self._moved(base.throat().take(back), _Sonic(self))
        if self.table.condensed.any():
            return expansion_two_phase.throat(self)
        gamma = np.maximum(self.reservoir.isentropic_exponent, _LOWEST_EXPONENT)
        pressure = self.pressure * gas_dynamics.pressure_ratio(1.0, gamma)
        found = self._state(self._solve(pressure, self.reservoir, _Sonic(self)))
        return self._rescued(found, lambda part, rows: expansion_two_phase.throat(part))

    def at_mass_flux(self, mass_flux: Array, at_throat: FlowState, supersonic: bool) -> FlowState:
        """Return the state at a mass flux [kg/(m2 s)] on one side of the throat."""
        if has_tangent(*self._given, mass_flux, at_throat.mass_flux):
            base, rows, back = self._plain(mass_flux)
            there = base.at_mass_flux(mass_flux.real[rows], plain(at_throat).take(rows), supersonic)
            return self._moved(there.take(back), self._passing(mass_flux, at_throat, supersonic))
        if self.table.condensed.any():
            return expansion_two_phase.at_mass_flux(self, mass_flux, at_throat, supersonic)
        ratio = at_throat.mass_flux / mass_flux
        gamma = np.maximum(at_throat.isentropic_exponent, _LOWEST_EXPONENT)
        usable = np.where(np.isfinite(ratio) & (ratio >= 1.0), ratio, 1.0)
        mach = gas_dynamics.mach_from_area_ratio(usable, gamma, "supersonic" if supersonic else "subsonic")
        fall = gas_dynamics.pressure_ratio(mach, gamma) / gas_dynamics.pressure_ratio(1.0, gamma)
        if supersonic:
            pressure = at_throat.pressure * fall
        else:
            head = 0.5 * mass_flux**2 / self.reservoir.density
            slow = self.pressure - head
            pressure = np.where(head < _SLOW * self.pressure, slow, np.minimum(at_throat.pressure * fall, slow))
        known = at_throat.equilibrium if at_throat.equilibrium is not None and supersonic else self.reservoir
        found = self._state(self._solve(pressure, known, self._passing(mass_flux, at_throat, supersonic)))
        found = choose(found, at_throat, np.abs(np.log(ratio)) < _AT_THROAT)
        return self._rescued(
            found,
            lambda part, rows: expansion_two_phase.at_mass_flux(part, mass_flux[rows], at_throat.take(rows), supersonic),
        )

    @property
    def _given(self) -> tuple[Array, ...]:
        return self.elements, self.enthalpy, self.entropy, self.pressure

    def _plain(self, *more: Array) -> tuple[Shifting, Integers, Integers]:
        """Return the isentrope without tangents of the cases that differ, which these are, and where each case is among them."""
        base = plain(self)
        rows, back = distinct(*base._given, *(part.real for part in more))
        return base.take(rows), rows, back

    def _moved(self, known: FlowState, condition: FlowCondition | None, pressure: Array | None = None) -> FlowState:
        """Return a state of known values with its tangents."""
        assert known.equilibrium is not None
        given = known.pressure if pressure is None else pressure
        found = with_tangent(self.table, self.elements, given, "entropy", self.entropy, known.equilibrium, condition)
        return self._state(replace(found, status=np.where(known.status == CONVERGED, found.status, known.status)))

    def _passing(self, mass_flux: Array, at_throat: FlowState, supersonic: bool) -> FlowCondition:
        """Return the condition of a mass flux on one side of the throat."""
        goal, log_top = np.log(mass_flux), np.log(at_throat.mass_flux)
        wanted = np.sqrt(2.0 * np.maximum(log_top - goal, 0.0))

        def condition(trial: FlowTrial, number: Integers) -> tuple[Array, Array]:
            flux, slope, mach = self._flux(trial, number)
            missing, root = flux - goal[number], wanted[number]
            side = np.where((mach > 1.0) == supersonic, 1.0, -1.0)
            distance = side * np.sqrt(2.0 * np.maximum(log_top[number] - flux, _SMALLEST_HEAD))
            near = root < np.sqrt(2.0 * _NEAR_THROAT)
            return np.where(near, distance - root, missing), np.where(near, -slope / distance, slope)

        return condition

    def _rescued(self, found: FlowState, bracketed: Callable[[Shifting, Integers], FlowState]) -> FlowState:
        """Return the states with those that did not converge solved again by a bracket in pressure."""
        rows = np.flatnonzero(found.status == NOT_CONVERGED)
        if not rows.size:
            return found
        again = bracketed(self.take(rows), rows)
        back = np.zeros(found.status.size, dtype=np.intp)
        back[rows] = np.arange(rows.size)
        return expansion_two_phase.chosen(found, again.take(back), found.status == NOT_CONVERGED)

    def _solve(self, pressure: Array, near: EquilibriumState, condition: FlowCondition | None) -> EquilibriumState:
        exponent = np.maximum(near.isentropic_exponent, _LOWEST_EXPONENT)
        with np.errstate(invalid="ignore"):
            temperature = near.temperature * (pressure / near.pressure) ** ((exponent - 1.0) / exponent)
        guess = replace(near, temperature=temperature)
        return solve_batch(self.table, self.elements, pressure, "entropy", self.entropy, guess, condition)

    def kinetic(self, trial: FlowTrial, number: Integers) -> tuple[Array, Array]:
        """Return u^2 and R T / M of a trial [m2/s2]."""
        thermal = GAS_CONSTANT * np.exp(trial.log_moles + trial.log_temperature)
        square = 2.0 * (self.enthalpy[number] - trial.enthalpy)
        return np.maximum(square, _SMALLEST_HEAD * thermal), thermal

    def _flux(self, trial: FlowTrial, number: Integers) -> tuple[Array, Array, Array]:
        """Return ln of the mass flux, its slope 1/gamma - R T / (M u^2), and the Mach number."""
        square, thermal = self.kinetic(trial, number)
        log_density = trial.log_pressure + np.log(self.table.reference_pressure / thermal)
        turning = trial.moles_slope + trial.temperature_slope
        return (
            log_density + 0.5 * np.log(square),
            1.0 - turning - thermal / square,
            np.sqrt(np.abs(square * (1.0 - turning) / thermal)),
        )

    def _state(self, found: EquilibriumState) -> FlowState:
        return FlowState(
            pressure=found.pressure,
            temperature=found.temperature,
            density=found.density,
            velocity=velocity(self.enthalpy, found.enthalpy),
            sound_speed=found.sound_speed,
            molar_mass=found.molar_mass,
            isentropic_exponent=found.isentropic_exponent,
            enthalpy=found.enthalpy,
            entropy=found.entropy,
            status=found.status,
            iterations=found.iterations,
            residual=found.residual,
            amounts=found.amounts,
            equilibrium=found,
        )


class _Sonic:
    """The condition Mach 1, with the change of the isentropic exponent taken from the step before."""

    def __init__(self, isentrope: Shifting) -> None:
        self.isentrope = isentrope
        self.log_pressure = np.full(isentrope.pressure.shape, np.nan, dtype=np.result_type(*isentrope._given))
        self.log_exponent = np.zeros_like(self.log_pressure)

    def __call__(self, trial: FlowTrial, number: Integers) -> tuple[Array, Array]:
        """Return ln M^2 and its slope."""
        square, thermal = self.isentrope.kinetic(trial, number)
        turning = trial.moles_slope + trial.temperature_slope
        log_exponent = -np.log(np.maximum(1.0 - turning, _SMALLEST_HEAD))
        with np.errstate(divide="ignore", invalid="ignore"):
            change = _moving(log_exponent - self.log_exponent[number]) / _moving(trial.log_pressure - self.log_pressure[number])
        self.log_pressure[number], self.log_exponent[number] = trial.log_pressure, log_exponent
        change = np.clip(np.where(np.isfinite(change), change, 0.0), -_LARGEST_CHANGE, _LARGEST_CHANGE)
        return np.log(square / thermal) - log_exponent, -2.0 * thermal / square - turning - change


def _moving(step: Array) -> Array:
    """Return what moves in a step: where there are tangents the values have settled before."""
    return step.imag if np.iscomplexobj(step) else step
