"""Thrust and the ratios made of it."""

from __future__ import annotations

import numpy as np

from propkit.constants import STANDARD_GRAVITY
from propkit.physics.arrays import Array, Values, values


def thrust(mass_flow: Values, exit_velocity: Values, exit_pressure: Values, ambient_pressure: Values, exit_area: Values) -> Array:
    """Return the thrust of a full-flowing nozzle.

    Parameters
    ----------
    mass_flow : float or array
        Mass flow [kg/s].
    exit_velocity : float or array
        Delivered velocity at the exit [m/s].
    exit_pressure, ambient_pressure : float or array
        Static pressures [Pa].
    exit_area : float or array
        Exit area [m2].

    Returns
    -------
    array
        Thrust [N]; negative where the surroundings push harder than the jet.

    Notes
    -----
    F = m' u + (pe - pa) Ae: momentum balance over the chamber and nozzle.

    Source
    ------
    Conservation of momentum.
    """
    return np.asarray(values(mass_flow) * values(exit_velocity) + (values(exit_pressure) - values(ambient_pressure)) * values(exit_area))


def specific_impulse(thrust: Values, mass_flow: Values, gravity: float = STANDARD_GRAVITY) -> Array:
    """Return thrust over weight flow at standard gravity.

    Parameters
    ----------
    thrust : float or array
        Thrust [N].
    mass_flow : float or array
        Mass flow [kg/s], above 0.
    gravity : float
        Standard gravity [m/s2].

    Returns
    -------
    array
        Specific impulse [s].

    Notes
    -----
    Isp = F / (m' g0).

    Source
    ------
    Definition; g0 by CGPM 1901.
    """
    return np.asarray(values(thrust) / (values(mass_flow) * gravity))


def thrust_coefficient(thrust: Values, stagnation_pressure: Values, throat_area: Values) -> Array:
    """Return thrust over stagnation pressure times throat area.

    Parameters
    ----------
    thrust : float or array
        Thrust [N].
    stagnation_pressure : float or array
        Stagnation pressure at the nozzle inlet [Pa], above 0.
    throat_area : float or array
        Throat area [m2], above 0.

    Returns
    -------
    array
        Thrust coefficient [1].

    Notes
    -----
    CF = F / (p0 At).

    Source
    ------
    Definition.
    """
    return np.asarray(values(thrust) / (values(stagnation_pressure) * values(throat_area)))


def characteristic_velocity(stagnation_pressure: Values, throat_area: Values, mass_flow: Values) -> Array:
    """Return stagnation pressure times throat area over mass flow.

    Parameters
    ----------
    stagnation_pressure : float or array
        Stagnation pressure at the nozzle inlet [Pa].
    throat_area : float or array
        Throat area [m2].
    mass_flow : float or array
        Mass flow [kg/s], above 0.

    Returns
    -------
    array
        Characteristic velocity [m/s].

    Notes
    -----
    c* = p0 At / m'.

    Source
    ------
    Definition.
    """
    return np.asarray(values(stagnation_pressure) * values(throat_area) / values(mass_flow))


def effective_exhaust_velocity(thrust: Values, mass_flow: Values) -> Array:
    """Return thrust over mass flow.

    Parameters
    ----------
    thrust : float or array
        Thrust [N].
    mass_flow : float or array
        Mass flow [kg/s], above 0.

    Returns
    -------
    array
        Effective exhaust velocity [m/s].

    Notes
    -----
    c = F / m'.

    Source
    ------
    Definition.
    """
    return np.asarray(values(thrust) / values(mass_flow))


def density_impulse(specific_impulse: Values, bulk_density: Values, gravity: float = STANDARD_GRAVITY) -> Array:
    """Return impulse per volume of propellant.

    Parameters
    ----------
    specific_impulse : float or array
        Specific impulse [s].
    bulk_density : float or array
        Bulk density of the propellants as stored [kg/m3].
    gravity : float
        Standard gravity [m/s2].

    Returns
    -------
    array
        Density impulse [N s/m3].

    Notes
    -----
    I_rho = Isp g0 rho_b.

    Source
    ------
    Definition.
    """
    return np.asarray(values(specific_impulse) * gravity * values(bulk_density))


def circle_area(diameter: Values) -> Array:
    """Return the area [m2] of a circle of a diameter [m].

    Source
    ------
    Definition.
    """
    return np.asarray(np.pi * values(diameter) ** 2 / 4.0)


def circle_diameter(area: Values) -> Array:
    """Return the diameter [m] of a circle of an area [m2].

    Source
    ------
    Definition.
    """
    return np.asarray(np.sqrt(4.0 * values(area) / np.pi))
