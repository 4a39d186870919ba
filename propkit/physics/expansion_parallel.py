"""Streams that flow side by side through one nozzle without mixing, at one static pressure at every place.

Each stream keeps its own stagnation enthalpy, entropy and composition; the areas add up to that of the nozzle. The throat is
where that sum is smallest. What a state shows of the whole: velocity, enthalpy and temperature are means over the mass, so that
mass flow times velocity is the momentum; the density is mass flux over velocity.

Source: A. Bernstein, W. H. Heiser, C. Hevenor, Compound-Compressible Nozzle Flow, J. Applied Mechanics 34 (1967) 548-554.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace
from typing import Final

import numpy as np

from propkit.physics import gas_dynamics
from propkit.physics.arrays import Array
from propkit.physics.equilibrium import CONVERGED, NOT_CONVERGED, OUT_OF_RANGE
from propkit.physics.equilibrium_terms import Integers
from propkit.physics.expansion_state import FlowState, Isentrope, choose

_STEPS: Final = 100
_ZERO: Final = 2e-14
_NARROW: Final = 4e-16
_ACCEPTED: Final = 1e-11
_AT_THROAT: Final = 1e-12
_LOWEST: Final = 1e-9
"""Pressure over stagnation pressure down to which an area ratio is looked for."""
_AT_REST: Final = 1e-12
"""Part of the stagnation pressure within which the whole is at rest: there the velocities are rounding."""
_EXPONENTS: Final = (1.02, 1.9)


@dataclass(frozen=True, slots=True, eq=False)
class Parallel:
    """Streams of one stagnation pressure side by side, a batch of designs.

    Parameters
    ----------
    streams : Isentrope
        The streams of every design, those of the first design first: a batch of designs times streams.
    shares : array
        Mass flow of each stream over the whole, adding up to 1, shape (design, stream).
    """

    streams: Isentrope
    shares: Array

    @property
    def enthalpy(self) -> Array:
        """Stagnation enthalpy of the whole [J/kg]."""
        return self._mean(self.streams.enthalpy)

    @property
    def entropy(self) -> Array:
        """Entropy of the whole [J/(kg K)]."""
        return self._mean(self.streams.entropy)

    @property
    def pressure(self) -> Array:
        """Stagnation pressure [Pa]."""
        return self.streams.pressure.reshape(self.shares.shape)[:, 0]

    def take(self, rows: Integers) -> Parallel:
        """Return some designs as a smaller batch."""
        count = self.shares.shape[1]
        inner = (np.asarray(rows)[:, None] * count + np.arange(count)).ravel()
        return Parallel(self.streams.take(inner), self.shares[rows])  # type: ignore[attr-defined]

    def each(self, pressure: Array, near: FlowState | None = None) -> FlowState:
        """Return the state of every stream at the pressure of its design [Pa]."""
        return self.streams.at_pressure(np.repeat(pressure, self.shares.shape[1]), near)

    def at_pressure(self, pressure: Array, near: FlowState | None = None) -> FlowState:
        """Return the state of the whole at a pressure [Pa]."""
        return self._combined(self.each(pressure))

    def throat(self) -> FlowState:
        """Return the state of largest mass flux of the whole: between the throats of its streams."""
        own = np.log(self.streams.throat().pressure).reshape(self.shares.shape)
        low, high = own.min(axis=1) - 1e-9, own.max(axis=1) + 1e-9
        return self._root(lambda state: self._slope(state), low, high, (self.shares * own).sum(axis=1))

    def at_mass_flux(self, mass_flux: Array, at_throat: FlowState, supersonic: bool) -> FlowState:
        """Return the state at a mass flux [kg/(m2 s)] on one side of the throat; status 2 above the largest."""
        ratio = at_throat.mass_flux / mass_flux
        good = np.isfinite(ratio) & (ratio >= 1.0 - _AT_THROAT)
        usable = np.where(good, np.maximum(ratio, 1.0), 1.0)
        gamma = np.clip(at_throat.isentropic_exponent, *_EXPONENTS)
        mach = gas_dynamics.mach_from_area_ratio(usable, gamma, "supersonic" if supersonic else "subsonic")
        fall = gas_dynamics.pressure_ratio(mach, gamma) / gas_dynamics.pressure_ratio(1.0, gamma)
        middle, top, goal = np.log(at_throat.pressure), np.log(self.pressure), np.log(mass_flux)
        low, high = (middle + np.log(_LOWEST), middle) if supersonic else (middle, top)
        start = np.clip(middle + np.log(fall), low, high)
        sign = -1.0 if supersonic else 1.0
        found = self._root(lambda state: sign * (np.log(state.mass_flux) - goal), low, high, start)
        return choose(replace(found, status=np.where(good, found.status, OUT_OF_RANGE)), at_throat, usable - 1.0 < _AT_THROAT)

    def _root(self, question: Callable[[FlowState], Array], low: Array, high: Array, start: Array) -> FlowState:
        """Return the state at which a question that falls with ln p vanishes: false position, halved where it is slow."""
        low, high, x = low.copy(), high.copy(), start.copy()
        value_low, value_high = np.full(x.shape, np.nan), np.full(x.shape, np.nan)
        near: FlowState | None = None
        for step in range(_STEPS):
            near = self.each(np.exp(x), near)
            state = self._combined(near)
            value = question(state)
            below = value > 0.0
            low, value_low = np.where(below, x, low), np.where(below, value, value_low)
            high, value_high = np.where(below, high, x), np.where(below, value_high, value)
            if ((np.abs(value) < _ZERO) | (high - low < _NARROW * np.abs(x))).all():
                break
            with np.errstate(invalid="ignore", divide="ignore"):
                secant = low + (high - low) * value_low / (value_low - value_high)
                inside = (secant > low) & (secant < high) & (step % 4 != 3)
            following = np.where(inside, secant, 0.5 * (low + high))
            x = np.where((np.abs(value) < _ZERO), x, following)
        settled = (np.abs(value) < _ACCEPTED) | (high - low < _ACCEPTED)
        return replace(state, status=np.where(settled | (state.status != CONVERGED), state.status, NOT_CONVERGED))

    def _slope(self, state: FlowState) -> Array:
        """Return d ln(mass flux)/d ln p of the whole: positive in supersonic flow."""
        with np.errstate(divide="ignore", invalid="ignore"):
            return np.asarray((1.0 - 1.0 / state.mach**2) / state.isentropic_exponent)

    def _mean(self, values: Array) -> Array:
        return np.asarray((self.shares * values.reshape(self.shares.shape)).sum(axis=1))

    def _combined(self, each: FlowState) -> FlowState:
        """Return the state of the whole from those of its streams at one pressure."""
        shape, w = self.shares.shape, self.shares
        density, u, gamma = (getattr(each, name).reshape(shape) for name in ("density", "velocity", "isentropic_exponent"))
        pressure = each.pressure.reshape(shape)[:, 0]
        moving = (pressure < self.pressure * (1.0 - _AT_REST)) & (u > 0.0).all(axis=1)
        velocity = np.where(moving, self._mean(each.velocity), 0.0)
        with np.errstate(divide="ignore", invalid="ignore"):
            area = w / (density * u)
            flux = 1.0 / area.sum(axis=1)
            whole = np.where(moving, flux / velocity, 1.0 / (w / density).sum(axis=1))
            slope = flux[:, None] * area * (1.0 / gamma - pressure[:, None] / (density * u**2))
            resting = (w / density / gamma).sum(axis=1) * whole
            inverse = np.where(moving, slope.sum(axis=1) + pressure / (whole * velocity**2), resting)
        exponent = 1.0 / inverse
        amounts = None if each.amounts is None else (w[:, :, None] * each.amounts.reshape(*shape, -1)).sum(axis=1)
        return FlowState(
            pressure=pressure,
            temperature=self._mean(each.temperature),
            density=whole,
            velocity=velocity,
            sound_speed=np.sqrt(exponent * pressure / whole),
            molar_mass=1.0 / self._mean(1.0 / each.molar_mass),
            isentropic_exponent=exponent,
            enthalpy=self._mean(each.enthalpy),
            entropy=self._mean(each.entropy),
            status=each.status.reshape(shape).max(axis=1),
            iterations=each.iterations.reshape(shape).max(axis=1),
            residual=each.residual.reshape(shape).max(axis=1),
            amounts=amounts,
        )
