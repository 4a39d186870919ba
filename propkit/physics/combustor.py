"""Constant-area combustion from the injector face to the nozzle inlet of a chamber of finite contraction ratio.

The three conservation laws with equilibrium composition, and no more: mass, p + rho u^2, and h + u^2/2.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import Final

import numpy as np

from propkit.errors import InputError, Problem
from propkit.physics import equilibrium, expansion, gas_dynamics
from propkit.physics.arrays import Array, Values, distinct, has_tangent, magnitude, require, values
from propkit.physics.equilibrium import EquilibriumState
from propkit.physics.expansion import FlowState
from propkit.physics.thermodynamics import SpeciesTable

PRESSURES: Final = ("injector", "nozzle stagnation", "nozzle inlet static")
"""What a quoted chamber pressure may mean."""

_ITERATIONS: Final = 40
_SETTLED: Final = 1e-13
_ACCEPTED: Final = 1e-11
_WIDE: Final = 1e6
"""Contraction ratio that stands for an infinite one while the others are solved."""


@dataclass(frozen=True, slots=True, eq=False)
class Combustor:
    """The states of a batch of chambers.

    Parameters
    ----------
    injector : EquilibriumState
        At the injector face, where the gas is at rest.
    inlet : EquilibriumState
        Static state at the nozzle inlet.
    inlet_velocity : array
        Velocity there [m/s], shape (case,); zero for infinite contraction.
    stagnation : EquilibriumState
        The gas of the nozzle inlet brought to rest.
    throat : FlowState
        Throat of the flow in equilibrium.
    """

    injector: EquilibriumState
    inlet: EquilibriumState
    inlet_velocity: Array
    stagnation: EquilibriumState
    throat: FlowState


def combustor(
    table: SpeciesTable,
    elements: Array,
    enthalpy: Values,
    pressure: Values,
    contraction_ratio: Values,
    pressure_at: str,
) -> Combustor:
    """States of chambers of finite contraction ratio.

    Parameters
    ----------
    table : SpeciesTable
        The species.
    elements : array
        Moles of atoms in a kilogram [mol/kg], shape (case, element).
    enthalpy : float or array
        Enthalpy of the propellants [J/kg], shape (case,).
    pressure : float or array
        Quoted chamber pressure [Pa], above 0.
    contraction_ratio : float or array
        Chamber area over throat area, above 1; may be infinite.
    pressure_at : str
        One of `PRESSURES`: where the quoted pressure holds.

    Returns
    -------
    Combustor
        The states; `status` of each says whether it is a solution.

    Raises
    ------
    InputError
        Outside the ranges stated.

    Notes
    -----
    rho u, p + rho u^2 and h + u^2/2 are those of the injector face, where u = 0, with the composition in equilibrium. The
    quoted pressure over the stagnation pressure hardly depends on pressure, so p0 <- p0 p_quoted/p_found settles in a few
    steps, each case on its own.

    Source: conservation of mass, momentum and energy at constant area.
    """
    _checked(pressure, contraction_ratio, pressure_at)
    atoms = np.atleast_2d(values(elements))
    shape = atoms.shape[:1]
    h, quoted, ratio = (np.array(np.broadcast_to(values(part), shape)) for part in (enthalpy, pressure, contraction_ratio))
    finite = np.isfinite(ratio)
    p0, settled = quoted.copy(), _SETTLED
    if has_tangent(atoms, h, quoted, ratio):
        rows, back = distinct(atoms.real, h.real, quoted.real, ratio.real)
        known = combustor(table, atoms.real[rows], h.real[rows], quoted.real[rows], ratio.real[rows], pressure_at)
        p0, settled = quoted * (known.stagnation.pressure[back] / quoted.real), _ACCEPTED
    rest: EquilibriumState | None = None
    throat: FlowState | None = None
    before = np.full(shape, np.inf)
    for _ in range(_ITERATIONS):
        rest = equilibrium.solve(table, atoms, pressure=p0, enthalpy=h, guess=rest)
        isentrope = expansion.shifting(table, atoms, rest)
        throat = expansion.throat(isentrope)
        inlet = expansion.at_area_ratio(isentrope, throat.mass_flux, np.where(finite, ratio, _WIDE), throat, False)
        face = inlet.pressure + inlet.density * inlet.velocity**2
        found = {"injector": face, "nozzle stagnation": p0, "nozzle inlet static": inlet.pressure}[pressure_at]
        error = np.where(finite, quoted / found, 1.0)
        miss = magnitude(error - 1.0)
        # where rounding keeps a case from coming nearer it has settled too
        moving = (miss > settled) & ~((miss <= _ACCEPTED) & (miss >= 0.5 * before))
        before = miss
        if not moving.any():
            break
        p0 = np.where(moving, p0 * error, p0)
    assert rest is not None
    assert throat is not None
    assert inlet.equilibrium is not None
    solved = (miss <= _ACCEPTED) & (rest.status == equilibrium.CONVERGED)
    status = np.where(rest.status != equilibrium.CONVERGED, rest.status, np.where(solved, inlet.status, equilibrium.NOT_CONVERGED))
    status = np.where(finite, status, rest.status)
    rest = replace(rest, status=status)
    face = quoted if pressure_at == "injector" else np.where(finite & np.isfinite(face), face, p0)
    injector = equilibrium.solve(table, atoms, pressure=face, enthalpy=h, guess=rest)
    static = equilibrium.choose(rest, inlet.equilibrium, finite)
    return Combustor(injector, static, np.where(finite, inlet.velocity, 0.0), rest, throat)


def _checked(pressure: Values, contraction_ratio: Values, pressure_at: str) -> None:
    p, ratio = values(pressure), values(contraction_ratio)
    require(p > 0.0, "pressure", p, "above 0")
    require(ratio > 1.0, "contraction_ratio", ratio, "above 1", "It is chamber area over throat area.")
    if pressure_at not in PRESSURES:
        raise InputError(Problem("pressure_at", repr(pressure_at), "one of " + ", ".join(map(repr, PRESSURES))))


def constant_property_pressures(pressure: Values, gamma: Values, contraction_ratio: Values, pressure_at: str) -> tuple[Array, Array]:
    """Pressures at the injector face and of the nozzle inlet at rest, for a gas with constant properties.

    Parameters
    ----------
    pressure : float or array
        Quoted chamber pressure [Pa], above 0.
    gamma : float or array
        Isentropic exponent, above 1.
    contraction_ratio : float or array
        Chamber area over throat area, above 1; may be infinite.
    pressure_at : str
        One of `PRESSURES`.

    Returns
    -------
    tuple of array
        Pressure at the face, where the gas is at rest, and stagnation pressure at the nozzle inlet [Pa].

    Raises
    ------
    InputError
        Outside the ranges stated.

    Notes
    -----
    With M the subsonic Mach number of A/A* = contraction ratio, p_face = p (1 + g M^2).

    Source: conservation of momentum at constant area; NACA Report 1135, equations 44 and 80.
    """
    _checked(pressure, contraction_ratio, pressure_at)
    p, g, ratio = np.broadcast_arrays(values(pressure), values(gamma), values(contraction_ratio))
    finite = np.isfinite(ratio)
    mach = gas_dynamics.mach_from_area_ratio(np.where(finite, ratio, 2.0), g, "subsonic")
    mach = np.where(finite, mach, 0.0)
    static = gas_dynamics.pressure_ratio(mach, g)
    face = static * (1.0 + g * mach**2)
    held = {"injector": face, "nozzle stagnation": np.ones_like(face), "nozzle inlet static": static}[pressure_at]
    stagnation = p / held
    return (p if pressure_at == "injector" else stagnation * face), stagnation
