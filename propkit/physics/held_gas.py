"""A gas of given composition at rest: its properties, and its temperature at a given enthalpy."""

from __future__ import annotations

from typing import Final

import numpy as np

from propkit.constants import GAS_CONSTANT
from propkit.physics.arrays import Array, Values, magnitude, values
from propkit.physics.equilibrium import CONVERGED, NOT_CONVERGED, OUT_OF_RANGE, EquilibriumState
from propkit.physics.equilibrium_terms import LOWEST_HELD_TEMPERATURE
from propkit.physics.thermodynamics import SpeciesTable

_ITERATIONS: Final = 80
_START: Final = 1000.0
_LARGEST_STEP: Final = 0.5
_SETTLED: Final = 1e-14
_ACCEPTED: Final = 1e-12


def held_state(table: SpeciesTable, amounts: Array, pressure: Values, temperature: Values) -> EquilibriumState:
    """Return the state of a gas whose composition is given instead of computed.

    Parameters
    ----------
    table : SpeciesTable
        The species, gases only.
    amounts : array
        Moles of each species in a kilogram [mol/kg], shape (case, species).
    pressure, temperature : float or array
        p [Pa] and T [K], shape (case,).

    Returns
    -------
    EquilibriumState
        The state: its heat capacities and exponents are those at fixed composition, the equilibrium heat capacity and the element
        potentials are NaN, for there is no equilibrium.

    Notes
    -----
    Ideal gas: h = sum n_j H_j(T), s = sum n_j (S_j(T) - R ln(x_j p / p_ref)).

    Source: NASA TM-4513, equations 1 to 3.
    """
    count = len(amounts)
    p, t = (np.array(np.broadcast_to(values(part), (count,))) for part in (pressure, temperature))
    properties = table.properties(t)
    moles = amounts.sum(axis=1)
    with np.errstate(divide="ignore", invalid="ignore"):
        logs = np.where(amounts > 0.0, np.log(amounts / moles[:, None]), 0.0)
    logs = logs + np.log(p / table.reference_pressure)[:, None]
    heat = GAS_CONSTANT * np.sum(amounts * properties.heat_capacity, axis=1)
    exponent = heat / (heat - GAS_CONSTANT * moles)
    outside = ~((t >= LOWEST_HELD_TEMPERATURE) & (t <= table.temperature_high.max()))
    return EquilibriumState(
        pressure=p,
        temperature=t,
        amounts=amounts,
        gas_moles=moles,
        density=p / (GAS_CONSTANT * moles * t),
        enthalpy=GAS_CONSTANT * t * np.sum(amounts * properties.enthalpy, axis=1),
        entropy=GAS_CONSTANT * np.sum(amounts * (properties.entropy - logs), axis=1),
        specific_heat=np.full(count, np.nan),
        frozen_specific_heat=heat,
        isentropic_exponent=exponent,
        frozen_isentropic_exponent=exponent.copy(),
        dlnv_dlnt=np.ones(count),
        dlnv_dlnp=-np.ones(count),
        element_potentials=np.full((count, len(table.elements)), np.nan),
        iterations=np.zeros(count, dtype=np.intp),
        residual=np.zeros(count),
        status=np.where(np.isfinite(t), np.where(outside, OUT_OF_RANGE, CONVERGED), NOT_CONVERGED),
        condensed_mass_fraction=np.zeros(count),
    )


def held_temperature(table: SpeciesTable, amounts: Array, enthalpy: Values) -> Array:
    """Return the temperature at which a gas of given composition has a given enthalpy.

    Parameters
    ----------
    table : SpeciesTable
        The species.
    amounts : array
        Moles of each species in a kilogram [mol/kg], shape (case, species).
    enthalpy : float or array
        h [J/kg], shape (case,).

    Returns
    -------
    array
        T [K]; NaN where the iteration did not settle.

    Notes
    -----
    Newton's method on sum n_j H_j(T) = h in ln T; the heat capacity is positive everywhere, so the root is the only one.

    Source: conservation of energy.
    """
    wanted = np.broadcast_to(values(enthalpy), (len(amounts),))
    t = np.full(wanted.shape, _START)
    for _ in range(_ITERATIONS):
        properties = table.properties(t)
        heat = np.sum(amounts * properties.heat_capacity, axis=1)
        missing = wanted / (GAS_CONSTANT * t) - np.sum(amounts * properties.enthalpy, axis=1)
        step = np.clip(missing / heat, -_LARGEST_STEP, _LARGEST_STEP)
        t = t * np.exp(step)
        if not (magnitude(step) > _SETTLED).any():
            break
    return np.where(magnitude(step) <= _ACCEPTED, t, np.nan)
