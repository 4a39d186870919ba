"""Closed forms of a choked nozzle with constant properties: mass flux, characteristic and exhaust velocity, thrust coefficient.

Symbols: g isentropic exponent (above 1), 0 stagnation, e exit, a ambient, t throat. All functions take floats or arrays that
broadcast together and return arrays.
"""

from __future__ import annotations

import numpy as np

from propkit.physics.arrays import Array, Values, require, values
from propkit.physics.gas_dynamics import checked_exponent


def choked_mass_flux_function(isentropic_exponent: Values) -> Array:
    """Dimensionless mass flux of choked flow, m' sqrt(R T0) / (p0 A*).

    Parameters
    ----------
    isentropic_exponent : float or array
        Isentropic exponent, above 1.

    Returns
    -------
    array
        The function of the exponent, near 0.65.

    Raises
    ------
    InputError
        For an exponent of 1 or less.

    Notes
    -----
    sqrt(g) (2/(g + 1))^((g + 1)/(2 (g - 1))).

    Source
    ------
    Closed form, from NACA Report 1135, equations 43, 44 at M = 1; value at 1.4: handbook, from memory.

    Examples
    --------
    >>> round(float(choked_mass_flux_function(1.4)), 4)
    0.6847
    """
    g = checked_exponent(isentropic_exponent)
    return np.sqrt(g) * (2.0 / (g + 1.0)) ** (0.5 * (g + 1.0) / (g - 1.0))


def choked_mass_flux(
    stagnation_pressure: Values, stagnation_temperature: Values, gas_constant: Values, isentropic_exponent: Values
) -> Array:
    """Mass flow per area of choked flow at constant properties [kg/(m2 s)].

    Parameters
    ----------
    stagnation_pressure : float or array
        p0 [Pa], above 0.
    stagnation_temperature : float or array
        T0 [K], above 0.
    gas_constant : float or array
        R [J/(kg K)], above 0.
    isentropic_exponent : float or array
        Isentropic exponent, above 1.

    Returns
    -------
    array
        m'/A* [kg/(m2 s)].

    Raises
    ------
    InputError
        Outside the ranges stated.

    Notes
    -----
    m'/A* = p0 / sqrt(R T0) sqrt(g) (2/(g + 1))^((g + 1)/(2 (g - 1))).

    Source
    ------
    Closed form; the example (LOX/RP-1 reservoir at 7 MPa) is common practice, no source.

    Examples
    --------
    >>> round(float(choked_mass_flux(7e6, 3558.0, 8.314462618 / 22.19e-3, 1.151)), -1)
    3870.0
    """
    p0, t0, r = values(stagnation_pressure), values(stagnation_temperature), values(gas_constant)
    require(p0 > 0.0, "stagnation_pressure", p0, "above 0")
    require(t0 > 0.0, "stagnation_temperature", t0, "above 0")
    require(r > 0.0, "gas_constant", r, "above 0")
    return p0 / np.sqrt(r * t0) * choked_mass_flux_function(isentropic_exponent)


def characteristic_velocity(stagnation_temperature: Values, gas_constant: Values, isentropic_exponent: Values) -> Array:
    """Characteristic velocity of choked flow at constant properties [m/s].

    Parameters
    ----------
    stagnation_temperature : float or array
        T0 [K], above 0.
    gas_constant : float or array
        R [J/(kg K)], above 0.
    isentropic_exponent : float or array
        Isentropic exponent, above 1.

    Returns
    -------
    array
        c* = p0 A*/m' [m/s].

    Raises
    ------
    InputError
        Outside the ranges stated.

    Notes
    -----
    c* = sqrt(R T0) / [sqrt(g) (2/(g + 1))^((g + 1)/(2 (g - 1)))].

    Source
    ------
    Sutton & Biblarz, chapter 3 (closed form); the example is arithmetic.

    Examples
    --------
    >>> round(float(characteristic_velocity(300.0, 296.8, 1.4)), 1)
    435.8
    """
    return 1.0 / choked_mass_flux(1.0, stagnation_temperature, gas_constant, isentropic_exponent)


def exhaust_velocity(pressure_ratio: Values, stagnation_temperature: Values, gas_constant: Values, isentropic_exponent: Values) -> Array:
    """Velocity after isentropic expansion from rest at constant properties [m/s].

    Parameters
    ----------
    pressure_ratio : float or array
        Static over stagnation pressure p/p0, 0 (the limit velocity) to 1.
    stagnation_temperature : float or array
        T0 [K], above 0.
    gas_constant : float or array
        R [J/(kg K)], above 0.
    isentropic_exponent : float or array
        Isentropic exponent, above 1.

    Returns
    -------
    array
        Velocity [m/s].

    Raises
    ------
    InputError
        Outside the ranges stated.

    Notes
    -----
    u = sqrt(2 g/(g - 1) R T0 [1 - (p/p0)^((g - 1)/g)]).

    Source
    ------
    Sutton & Biblarz, chapter 3 (closed form). Example: NACA Report 1135 at M = 2, u = M sqrt(g R T).

    Examples
    --------
    >>> round(float(exhaust_velocity(0.1278045, 1.8, 1.0, 1.4)) / (2.0 * 1.4**0.5), 6)
    1.0
    """
    g, ratio = checked_exponent(isentropic_exponent), values(pressure_ratio)
    t0, r = values(stagnation_temperature), values(gas_constant)
    require((ratio >= 0.0) & (ratio <= 1.0), "pressure_ratio", ratio, "between 0 and 1")
    require(t0 > 0.0, "stagnation_temperature", t0, "above 0")
    require(r > 0.0, "gas_constant", r, "above 0")
    return np.sqrt(2.0 * g / (g - 1.0) * r * t0 * (1.0 - ratio ** ((g - 1.0) / g)))


def thrust_coefficient(
    isentropic_exponent: Values, exit_pressure_ratio: Values, area_ratio: Values, ambient_pressure_ratio: Values = 0.0
) -> Array:
    """Thrust coefficient of ideal flow at constant properties.

    Parameters
    ----------
    isentropic_exponent : float or array
        Isentropic exponent, above 1.
    exit_pressure_ratio : float or array
        Exit over stagnation pressure pe/p0, 0 to 1.
    area_ratio : float or array
        Exit over throat area.
    ambient_pressure_ratio : float or array
        Ambient over stagnation pressure pa/p0; 0 is vacuum.

    Returns
    -------
    array
        CF = F/(p0 At).

    Raises
    ------
    InputError
        Outside the ranges stated.

    Notes
    -----
    CF = sqrt(2 g^2/(g - 1) (2/(g + 1))^((g + 1)/(g - 1)) [1 - (pe/p0)^((g - 1)/g)]) + (pe/p0 - pa/p0) eps.

    Source
    ------
    Sutton & Biblarz, chapter 3 (closed form). Example: the largest coefficient at exponent 1.2, from memory.

    Examples
    --------
    >>> f"{float(thrust_coefficient(1.2, 0.0, 1.0)):.3f}"
    '2.247'
    """
    g, exit_ratio, outside = (
        checked_exponent(isentropic_exponent),
        values(exit_pressure_ratio),
        values(ambient_pressure_ratio),
    )
    area = values(area_ratio)
    require((exit_ratio >= 0.0) & (exit_ratio <= 1.0), "exit_pressure_ratio", exit_ratio, "between 0 and 1")
    require(outside >= 0.0, "ambient_pressure_ratio", outside, "0 or more")
    require(area >= 1.0, "area_ratio", area, "1 or more")
    limit = 2.0 * g**2 / (g - 1.0) * (2.0 / (g + 1.0)) ** ((g + 1.0) / (g - 1.0))
    return np.sqrt(limit * (1.0 - exit_ratio ** ((g - 1.0) / g))) + (exit_ratio - outside) * area
