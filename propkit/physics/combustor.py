"""Constant-area combustion from the injector face to the nozzle inlet of a chamber of finite contraction ratio.

The three conservation laws with equilibrium composition, and no more: mass, p + rho u^2, and h + u^2/2.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from propkit.physics import equilibrium, expansion, gas_dynamics
from propkit.physics.arrays import Array
from propkit.physics.equilibrium import EquilibriumState
from propkit.physics.expansion import FlowState
from propkit.physics.thermodynamics import SpeciesTable

MOST_STEPS = 40
TOLERANCE = 1e-13


@dataclass(frozen=True, slots=True, eq=False)
class Combustor:
    """States of a batch: injector face (at rest), nozzle inlet (static, with its velocity), nozzle stagnation, throat of shifting flow."""

    injector: EquilibriumState
    inlet: EquilibriumState
    inlet_velocity: Array
    stagnation: EquilibriumState
    throat: FlowState


def combustor(table: SpeciesTable, elements: Array, enthalpy: Array, pressure: Array, contraction_ratio: Array, pressure_at: str) -> Combustor:
    """Return the states of chambers of finite contraction ratio.

    Parameters
    ----------
    table : SpeciesTable
        Gas species.
    elements : array
        Atoms [mol/kg], shape (case, element).
    enthalpy, pressure, contraction_ratio : array
        Propellant enthalpy [J/kg], quoted pressure [Pa], chamber area over throat area [1] above 1, shape (case,).
    pressure_at : str
        ``"injector"``, ``"nozzle stagnation"`` or ``"nozzle inlet static"``: where the pressure holds.

    Returns
    -------
    Combustor
        States; `status` of each says whether it converged.

    Notes
    -----
    The ratio of the quoted to the stagnation pressure hardly depends on pressure, so p0 <- p0 p_quoted / p_found converges in a few steps.

    Source
    ------
    Conservation of mass, momentum and energy at constant area.
    """
    stagnation_pressure = np.array(pressure, dtype=float)
    rest: EquilibriumState | None = None
    for _ in range(MOST_STEPS):
        rest = equilibrium.solve(table, elements, pressure=stagnation_pressure, enthalpy=enthalpy, guess=rest)
        isentrope = expansion.shifting(table, elements, rest)
        throat = expansion.throat(isentrope)
        inlet = expansion.at_area_ratio(isentrope, throat.mass_flux, contraction_ratio, throat, supersonic=False)
        face = inlet.pressure + inlet.density * inlet.velocity**2
        found = {"injector": face, "nozzle stagnation": stagnation_pressure, "nozzle inlet static": inlet.pressure}[pressure_at]
        error = pressure / found
        if (np.abs(error - 1.0) < TOLERANCE).all() or not np.isfinite(error).all():
            break
        stagnation_pressure = stagnation_pressure * error
    settled = np.abs(error - 1.0) < 1e-11
    assert rest is not None and inlet.equilibrium is not None
    rest = replace(rest, status=np.where(settled, rest.status, equilibrium.NOT_CONVERGED))
    injector_pressure = pressure if pressure_at == "injector" else face
    injector = equilibrium.solve(table, elements, pressure=injector_pressure, enthalpy=enthalpy, guess=rest)
    return Combustor(injector, inlet.equilibrium, inlet.velocity, rest, throat)


def constant_property_pressures(pressure: Array, gamma: Array, contraction_ratio: Array, pressure_at: str) -> tuple[Array, Array]:
    """Return injector-face and nozzle stagnation pressure of a gas of constant properties.

    Parameters
    ----------
    pressure, gamma, contraction_ratio : array
        Quoted pressure [Pa], isentropic exponent [1], chamber area over throat area [1] (may be infinite), shape (case,).
    pressure_at : str
        Where the pressure holds, as for `combustor`.

    Returns
    -------
    tuple of array
        p + rho u^2 at the nozzle inlet, which is the pressure at the face where the gas is at rest, and the stagnation pressure [Pa].

    Source
    ------
    Conservation of momentum at constant area; NACA Report 1135 for the subsonic inlet.
    """
    finite = np.isfinite(contraction_ratio)
    mach = np.where(finite, gas_dynamics.mach_from_area_ratio(np.where(finite, contraction_ratio, 2.0), gamma, "subsonic"), 0.0)
    static = gas_dynamics.pressure_ratio(mach, gamma)
    face = static * (1.0 + gamma * mach**2)
    quoted = {"injector": face, "nozzle stagnation": np.ones_like(face), "nozzle inlet static": static}[pressure_at]
    stagnation = pressure / quoted
    return np.where(pressure_at == "injector", pressure, stagnation * face), stagnation
