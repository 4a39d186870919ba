"""Isentropic flow of a batch from its reservoir: throat, state at a pressure, state at an area ratio.

An isentrope knows its gas at rest and answers for a whole batch; the functions here are what the chain calls. Four models:
composition in equilibrium (`shifting`), held (`frozen`), in equilibrium first and held from a place on (`frozen_from`), and
a gas with constant properties (`perfect_gas`).
"""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from propkit.physics.arrays import Array, Values, values
from propkit.physics.equilibrium import OUT_OF_RANGE, EquilibriumState
from propkit.physics.expansion_frozen import Frozen, FrozenFrom, frozen_gas
from propkit.physics.expansion_gas import PerfectGas
from propkit.physics.expansion_shifting import Shifting
from propkit.physics.expansion_state import FlowState, Isentrope, velocity
from propkit.physics.thermodynamics import SpeciesTable

__all__ = ["FlowState", "Frozen", "FrozenFrom", "Isentrope", "PerfectGas", "Shifting", "at_area_ratio", "at_pressure",
           "frozen", "frozen_from", "perfect_gas", "shifting", "throat", "velocity"]  # fmt: skip

_WIDE = 2.0
"""Subsonic area ratio above which the velocity is taken from the mass flux."""


def shifting(table: SpeciesTable, elements: Array, reservoir: EquilibriumState) -> Shifting:
    """Return the isentrope of a gas in equilibrium everywhere.

    Parameters
    ----------
    table : SpeciesTable
        The species.
    elements : array
        Moles of atoms in a kilogram [mol/kg], shape (case, element).
    reservoir : EquilibriumState
        The gas at rest.

    Returns
    -------
    Shifting
        The isentrope.
    """
    return Shifting(table, np.atleast_2d(values(elements)), reservoir.enthalpy, reservoir.entropy, reservoir.pressure, reservoir)


def frozen(table: SpeciesTable, amounts: Array, enthalpy: Array, entropy: Array, pressure: Array, temperature: Array) -> Frozen:
    """Return the isentrope of a gas whose composition is held.

    Parameters
    ----------
    table : SpeciesTable
        The species.
    amounts : array
        Moles of each species in a kilogram [mol/kg], shape (case, species).
    enthalpy, entropy, pressure : array
        Stagnation enthalpy [J/kg], entropy [J/(kg K)] and pressure [Pa].
    temperature : array
        A temperature on the isentrope [K], to start from.

    Returns
    -------
    Frozen
        The isentrope.
    """
    return frozen_gas(table, np.atleast_2d(values(amounts)), enthalpy, entropy, pressure, temperature)


def frozen_from(before: Shifting, at_throat: FlowState, area_ratio: Values | None) -> FrozenFrom:
    """Return the isentrope that is in equilibrium down to a place of the nozzle and whose composition is held beyond.

    Parameters
    ----------
    before : Shifting
        The flow in equilibrium.
    at_throat : FlowState
        Its throat.
    area_ratio : float or array, optional
        Local area over throat area where the composition freezes, above 1, on the supersonic side and beyond the sonic
        point of the frozen gas; the throat itself when None.

    Returns
    -------
    FrozenFrom
        The isentrope.

    Notes
    -----
    Freezing at the throat leaves throat and mass flow those of the equilibrium flow; states between the throat and the
    sonic point of the frozen gas have status 2.
    """
    place = at_throat if area_ratio is None else at_area_ratio(before, at_throat.mass_flux, area_ratio, at_throat)
    assert place.amounts is not None
    after = frozen(before.table, place.amounts, before.enthalpy, before.entropy, before.pressure, place.temperature)
    return FrozenFrom(before, after, at_throat, place, np.full(place.pressure.shape, area_ratio is None))


def perfect_gas(
    gamma: Values,
    gas_constant: Values,
    temperature: Values,
    pressure: Values,
    enthalpy: Values = 0.0,
    entropy: Values = 0.0,
) -> PerfectGas:
    """Return the isentrope of a gas with constant properties.

    Parameters
    ----------
    gamma, gas_constant, temperature, pressure : float or array
        Isentropic exponent, R [J/(kg K)], T0 [K], p0 [Pa].
    enthalpy, entropy : float or array
        h0 [J/kg] and s [J/(kg K)] to count from.

    Returns
    -------
    PerfectGas
        The isentrope.
    """
    given = (gamma, gas_constant, temperature, pressure, enthalpy, entropy)
    arrays = np.broadcast_arrays(*(np.atleast_1d(values(part)) for part in given))
    return PerfectGas(*(np.array(part) for part in arrays))


def throat(isentrope: Isentrope) -> FlowState:
    """Return the state of largest mass flux, which passes what the nozzle passes.

    Parameters
    ----------
    isentrope : Isentrope
        The flow.

    Returns
    -------
    FlowState
        The throat.

    Notes
    -----
    d(rho u) = 0 at constant entropy and stagnation enthalpy, which is Mach 1 where the sound speed has no jump.

    Source: conservation of mass and energy.
    """
    return isentrope.throat()


def at_pressure(isentrope: Isentrope, pressure: Values, near: FlowState | None = None) -> FlowState:
    """Return the state at a pressure.

    Parameters
    ----------
    isentrope : Isentrope
        The flow.
    pressure : float or array
        p [Pa], above 0 and at most the stagnation pressure.
    near : FlowState, optional
        A state of the same flow to start from.

    Returns
    -------
    FlowState
        The state.
    """
    p = np.array(np.broadcast_to(values(pressure), isentrope.pressure.shape))
    return isentrope.at_pressure(p, near)


def at_area_ratio(
    isentrope: Isentrope,
    mass_flux: Values,
    area_ratio: Values,
    at_throat: FlowState | None = None,
    supersonic: bool = True,
) -> FlowState:
    """Return the state where the area is a given multiple of the throat's.

    Parameters
    ----------
    isentrope : Isentrope
        The flow.
    mass_flux : float or array
        Mass flow per throat area [kg/(m2 s)].
    area_ratio : float or array
        Local area over throat area, 1 or more; status 2 below 1.
    at_throat : FlowState, optional
        The throat, when it is known already.
    supersonic : bool
        Which side of the throat.

    Returns
    -------
    FlowState
        The state.

    Notes
    -----
    rho u A = rho* u* A*. On the subsonic side the velocity is the mass flux over the density: in a wide chamber the
    difference of two enthalpies would leave only noise.

    Source: conservation of mass.
    """
    shape = isentrope.pressure.shape
    ratio = np.array(np.broadcast_to(values(area_ratio), shape))
    good = ratio >= 1.0 - 1e-12
    goal = np.broadcast_to(values(mass_flux), shape) / np.where(good, np.maximum(ratio, 1.0), 1.0)
    found = isentrope.at_mass_flux(goal, isentrope.throat() if at_throat is None else at_throat, supersonic)
    velocity = found.velocity if supersonic else np.where(ratio > _WIDE, goal / found.density, found.velocity)
    return replace(found, velocity=velocity, status=np.where(good, found.status, OUT_OF_RANGE))
