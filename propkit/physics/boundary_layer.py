"""Turbulent boundary layer along a nozzle wall, and the thrust that it costs.

An integral method: von Karman's momentum integral for axisymmetric compressible flow, closed by the Blasius-type
friction law of the 1/7-power profile at Eckert's reference temperature and by Crocco's relation for the form parameter.
In theta^(5/4) the equation is linear and is integrated along the wall by quadrature.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final

import numpy as np

from propkit.physics.arrays import Array, Values, require, values

FRICTION_CONSTANT: Final = 0.0128
"""cf/2 = 0.0128 (u theta/nu)^(-1/4), 1/7-power profile: Schlichting, Boundary-Layer Theory, from memory."""

FORM_PARAMETER: Final = 9.0 / 7.0
"""Displacement over momentum thickness of the 1/7-power profile at low speed: Schlichting, from memory."""

VISCOSITY_EXPONENT: Final = 0.6
"""Exponent of viscosity against temperature between core and reference temperature: as in Bartz (1957)."""


@dataclass(frozen=True, slots=True, eq=False)
class WallFlow:
    """Core flow at points along a wall, in order, from the start of the boundary layer to the exit.

    Parameters
    ----------
    length : array
        Length along the wall [m], rising.
    radius : array
        Wall radius [m].
    velocity, density, temperature : array
        Core velocity [m/s], density [kg/m3] and temperature [K].
    viscosity : array
        Viscosity at the core temperature [Pa s].
    adiabatic_wall_temperature, wall_temperature : array
        Temperatures [K]; equal where the wall is not cooled.
    """

    length: Array
    radius: Array
    velocity: Array
    density: Array
    temperature: Array
    viscosity: Array
    adiabatic_wall_temperature: Array
    wall_temperature: Array


def reference_temperature(temperature: Values, wall_temperature: Values, adiabatic_wall_temperature: Values) -> Array:
    """Return Eckert's reference temperature [K]: T + 0.5 (Tw - T) + 0.22 (Taw - T).

    Parameters
    ----------
    temperature, wall_temperature, adiabatic_wall_temperature : float or array
        Core, wall and adiabatic wall temperature [K].

    Returns
    -------
    array
        Temperature [K] at which the low-speed friction law is evaluated.

    Source
    ------
    E. R. G. Eckert, J. Aeronautical Sciences 22 (1955) 585-587.

    Examples
    --------
    >>> float(reference_temperature(1000.0, 2000.0, 2000.0))
    1720.0
    """
    core = values(temperature)
    return core + 0.5 * (values(wall_temperature) - core) + 0.22 * (values(adiabatic_wall_temperature) - core)


def form_parameter(temperature: Values, wall_temperature: Values, adiabatic_wall_temperature: Values) -> Array:
    """Return displacement over momentum thickness of a compressible turbulent layer.

    Parameters
    ----------
    temperature, wall_temperature, adiabatic_wall_temperature : float or array
        Core, wall and adiabatic wall temperature [K].

    Returns
    -------
    array
        Form parameter H [1]; it may be negative on a strongly cooled wall at low speed only.

    Notes
    -----
    H = 9/7 Tw/T + Taw/T - 1, from Crocco's linear relation of total enthalpy and velocity.

    Source
    ------
    Schlichting, Boundary-Layer Theory, chapter XXIII (Crocco), from memory.

    Examples
    --------
    >>> round(float(form_parameter(1000.0, 1000.0, 1000.0)), 4)
    1.2857
    """
    core = values(temperature)
    return FORM_PARAMETER * values(wall_temperature) / core + values(adiabatic_wall_temperature) / core - 1.0


def momentum_thickness(flow: WallFlow) -> Array:
    """Return the momentum thickness along a wall [m].

    Parameters
    ----------
    flow : WallFlow
        Core flow at the points along the wall; the layer starts with no thickness at the first.

    Returns
    -------
    array
        Momentum thickness [m], shape of the points.

    Raises
    ------
    InputError
        Where lengths do not rise, or a velocity, density, radius, temperature or viscosity is not above 0.

    Notes
    -----
    d theta/ds + theta [(2 + H) d ln u/ds + d ln rho/ds + d ln r/ds] = cf/2, with
    cf/2 = 0.0128 (rho* u theta/mu*)^(-1/4) rho*/rho. With y = theta^(5/4): dy/ds = 5/4 (a - b y), solved with its
    integrating factor; trapezoids between points, so use some 200 points or more.

    Source
    ------
    Schlichting, Boundary-Layer Theory (momentum integral and friction law); Eckert (1955); from memory.
    """
    require(np.diff(flow.length) > 0.0, "length", np.diff(flow.length), "rising along the wall")
    for name in ("radius", "velocity", "density", "temperature", "viscosity"):
        require(getattr(flow, name) > 0.0, name, getattr(flow, name), "above 0")
    reference = reference_temperature(flow.temperature, flow.wall_temperature, flow.adiabatic_wall_temperature)
    heating = reference / flow.temperature
    density, viscosity = flow.density / heating, flow.viscosity * heating**VISCOSITY_EXPONENT
    source = FRICTION_CONSTANT * (viscosity / (density * flow.velocity)) ** 0.25 / heating
    form = form_parameter(flow.temperature, flow.wall_temperature, flow.adiabatic_wall_temperature)
    growth = 0.5 * (form[1:] + form[:-1] + 4.0) * np.diff(np.log(flow.velocity))
    growth = growth + np.diff(np.log(flow.density)) + np.diff(np.log(flow.radius))
    exponent = np.concatenate([[0.0], np.cumsum(1.25 * growth)])
    exponent = exponent - exponent.max()
    factor = np.exp(exponent)
    pieces = 0.625 * (source[1:] * factor[1:] + source[:-1] * factor[:-1]) * np.diff(flow.length)
    grown = np.concatenate([[0.0], np.cumsum(pieces)]) / factor
    return values(grown**0.8)


def boundary_layer_drag(exit_radius: Values, lip_angle: Values, density: Values, velocity: Values, momentum_thickness: Values) -> Array:
    """Return the thrust that a boundary layer costs [N].

    Parameters
    ----------
    exit_radius : float or array
        Wall radius at the lip [m].
    lip_angle : float or array
        Wall angle at the lip [rad].
    density, velocity : float or array
        Core density [kg/m3] and velocity [m/s] at the lip.
    momentum_thickness : float or array
        Momentum thickness at the lip [m].

    Returns
    -------
    array
        Thrust lost [N].

    Notes
    -----
    dF = 2 pi re rho u^2 theta cos a: momentum deficit at the lip, to first order in thickness over radius, the mass
    flow held; the displacement of the throat belongs to the discharge coefficient and is not in it.

    Source
    ------
    Conservation of momentum; bookkeeping of CPIA Publication 246.

    Examples
    --------
    >>> round(float(boundary_layer_drag(1.0, 0.0, 1.0, 1.0, 1.0)), 4)
    6.2832
    """
    push = values(density) * values(velocity) ** 2 * values(momentum_thickness)
    return 2.0 * np.pi * values(exit_radius) * push * np.cos(values(lip_angle))
