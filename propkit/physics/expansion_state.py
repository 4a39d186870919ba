"""What the flow models of a nozzle share: the state at a place, and the isentrope that answers for it."""

from __future__ import annotations

from dataclasses import dataclass, fields, replace
from typing import Any, Protocol, TypeVar

import numpy as np
import numpy.typing as npt

from propkit.physics.arrays import Array
from propkit.physics.equilibrium import EquilibriumState
from propkit.physics.equilibrium_terms import Integers


@dataclass(frozen=True, slots=True, eq=False)
class FlowState:
    """The state of each case of a batch at one place of a nozzle.

    Parameters
    ----------
    pressure, temperature, density : array
        p [Pa], T [K], rho [kg/m3], shape (case,).
    velocity, sound_speed : array
        u and the sound speed of the flow model [m/s].
    molar_mass : array
        Mass over moles of gas [kg/mol].
    isentropic_exponent : array
        (d ln p / d ln rho) at constant entropy, of the flow model.
    enthalpy, entropy : array
        h [J/kg], s [J/(kg K)].
    status, iterations : array of int
        0 converged, 1 not converged, 2 no solution; steps of the last iteration.
    residual : array
        Largest relative residual of the last iteration.
    amounts : array, optional
        Moles of each species in a kilogram [mol/kg], shape (case, species); None for a gas with constant properties.
    equilibrium : EquilibriumState, optional
        The state as the equilibrium left it, for flow in equilibrium.
    """

    pressure: Array
    temperature: Array
    density: Array
    velocity: Array
    sound_speed: Array
    molar_mass: Array
    isentropic_exponent: Array
    enthalpy: Array
    entropy: Array
    status: Integers
    iterations: Integers
    residual: Array
    amounts: Array | None = None
    equilibrium: EquilibriumState | None = None

    @property
    def mach(self) -> Array:
        """Velocity over the sound speed of the flow model."""
        return np.asarray(self.velocity / self.sound_speed)

    @property
    def mass_flux(self) -> Array:
        """Mass flow per area [kg/(m2 s)]."""
        return np.asarray(self.density * self.velocity)

    def take(self, index: Any) -> FlowState:
        """Return some cases as a smaller batch; an integer gives a batch of one."""
        return take_cases(self, np.atleast_1d(np.arange(self.pressure.size)[index]))


_Batch = TypeVar("_Batch")


def take_cases(batch: _Batch, rows: Integers) -> _Batch:
    """Return some cases of a dataclass whose arrays and states all have the case as first axis; tables stay."""
    changed: dict[str, Any] = {}
    for part in fields(batch):  # type: ignore[arg-type]
        value = getattr(batch, part.name)
        if isinstance(value, np.ndarray):
            changed[part.name] = value[rows]
        elif part.name != "table" and hasattr(value, "take"):
            changed[part.name] = value.take(rows)
    return replace(batch, **changed)  # type: ignore[type-var]


def choose(first: FlowState, second: FlowState, where: npt.NDArray[np.bool_]) -> FlowState:
    """Return `first` with the cases of `where` taken from `second`; the equilibrium stays that of `first`."""
    changed: dict[str, Any] = {}
    for part in fields(first):
        mine, theirs = getattr(first, part.name), getattr(second, part.name)
        if isinstance(mine, np.ndarray) and theirs is not None:
            changed[part.name] = np.where(where if mine.ndim == 1 else where[:, None], theirs, mine)
    return replace(first, **changed)


class Isentrope(Protocol):
    """The isentrope of a reservoir, for a batch of cases.

    `enthalpy` [J/kg], `entropy` [J/(kg K)] and `pressure` [Pa] are those of the gas at rest.
    """

    @property
    def enthalpy(self) -> Array:
        """Stagnation enthalpy [J/kg]."""

    @property
    def entropy(self) -> Array:
        """Entropy [J/(kg K)]."""

    @property
    def pressure(self) -> Array:
        """Stagnation pressure [Pa]."""

    def throat(self) -> FlowState:
        """Return the state of largest mass flux."""

    def at_pressure(self, pressure: Array, near: FlowState | None = None) -> FlowState:
        """Return the state at a pressure [Pa]."""

    def at_mass_flux(self, mass_flux: Array, at_throat: FlowState, supersonic: bool) -> FlowState:
        """Return the state at a mass flux [kg/(m2 s)] on one side of the throat."""


def velocity(stagnation_enthalpy: Array, enthalpy: Array) -> Array:
    """Velocity of adiabatic flow from rest [m/s]: u = sqrt(2 (h0 - h)); zero where rounding leaves less than none.

    Parameters
    ----------
    stagnation_enthalpy, enthalpy : array
        h0 and h [J/kg].

    Returns
    -------
    array
        u [m/s].

    Notes
    -----
    u = sqrt(2 (h0 - h)).

    Source: conservation of energy.
    """
    return np.sqrt(np.maximum(2.0 * (stagnation_enthalpy - enthalpy), 0.0))
