"""One-dimensional flow of a perfect gas with constant properties, in closed form.

Symbols: M Mach number, g isentropic exponent (above 1), 0 stagnation, * sonic. All functions take floats or
arrays that broadcast together and return arrays.
"""

from __future__ import annotations

from typing import Final, Literal

import numpy as np

from propkit.errors import ConvergenceError
from propkit.physics.arrays import Array, Values, has_tangent, require, values

Branch = Literal["supersonic", "subsonic"]

_ITERATIONS: Final = 60
_STEP: Final = 1e-15


def checked_exponent(isentropic_exponent: Values) -> Array:
    """Return the exponent as an array; InputError unless it is above 1."""
    g = values(isentropic_exponent)
    require(g > 1.0, "isentropic_exponent", g, "above 1")
    return g


def checked_mach(mach: Values, lowest: float = 0.0) -> Array:
    """Return the Mach number as an array; InputError below `lowest`."""
    m = values(mach)
    require(m >= lowest, "mach", m, f"{lowest:g} or more")
    return m


def temperature_ratio(mach: Values, isentropic_exponent: Values) -> Array:
    """Ratio of static to stagnation temperature.

    Parameters
    ----------
    mach : float or array
        Mach number, 0 or more.
    isentropic_exponent : float or array
        Isentropic exponent, above 1.

    Returns
    -------
    array
        T/T0, between 0 and 1.

    Raises
    ------
    InputError
        Outside the ranges stated.

    Notes
    -----
    T/T0 = 1 / (1 + (g - 1)/2 M^2).

    Source
    ------
    NACA Report 1135, equation 43.

    Examples
    --------
    >>> round(float(temperature_ratio(2.0, 1.4)), 4)
    0.5556
    """
    g, m = checked_exponent(isentropic_exponent), checked_mach(mach)
    return 1.0 / (1.0 + 0.5 * (g - 1.0) * m**2)


def pressure_ratio(mach: Values, isentropic_exponent: Values) -> Array:
    """Ratio of static to stagnation pressure.

    Parameters
    ----------
    mach : float or array
        Mach number, 0 or more.
    isentropic_exponent : float or array
        Isentropic exponent, above 1.

    Returns
    -------
    array
        p/p0, between 0 and 1.

    Raises
    ------
    InputError
        Outside the ranges stated.

    Notes
    -----
    p/p0 = (T/T0)^(g/(g - 1)).

    Source
    ------
    NACA Report 1135, equation 44.

    Examples
    --------
    >>> round(float(pressure_ratio(2.0, 1.4)), 4)
    0.1278
    """
    g = checked_exponent(isentropic_exponent)
    return temperature_ratio(mach, g) ** (g / (g - 1.0))


def density_ratio(mach: Values, isentropic_exponent: Values) -> Array:
    """Ratio of static to stagnation density.

    Parameters
    ----------
    mach : float or array
        Mach number, 0 or more.
    isentropic_exponent : float or array
        Isentropic exponent, above 1.

    Returns
    -------
    array
        rho/rho0, between 0 and 1.

    Raises
    ------
    InputError
        Outside the ranges stated.

    Notes
    -----
    rho/rho0 = (T/T0)^(1/(g - 1)).

    Source
    ------
    NACA Report 1135, equation 45.

    Examples
    --------
    >>> round(float(density_ratio(2.0, 1.4)), 5)
    0.23005
    """
    g = checked_exponent(isentropic_exponent)
    return temperature_ratio(mach, g) ** (1.0 / (g - 1.0))


def _log_area_ratio(log_mach: Array, g: Array) -> Array:
    """Ln(A/A*), written so that nothing cancels near Mach 1."""
    return 0.5 * (g + 1.0) / (g - 1.0) * np.log1p((g - 1.0) / (g + 1.0) * np.expm1(2.0 * log_mach)) - log_mach


def area_ratio(mach: Values, isentropic_exponent: Values) -> Array:
    """Flow area over sonic area.

    Parameters
    ----------
    mach : float or array
        Mach number, above 0.
    isentropic_exponent : float or array
        Isentropic exponent, above 1.

    Returns
    -------
    array
        A/A*, 1 or more; 1 at Mach 1.

    Raises
    ------
    InputError
        Outside the ranges stated.

    Notes
    -----
    A/A* = 1/M [2/(g + 1) (1 + (g - 1)/2 M^2)]^((g + 1)/(2 (g - 1))).

    Source
    ------
    NACA Report 1135, equation 80.

    Examples
    --------
    >>> round(float(area_ratio(2.0, 1.4)), 4)
    1.6875
    """
    g, m = checked_exponent(isentropic_exponent), values(mach)
    require(m > 0.0, "mach", m, "above 0")
    return np.exp(_log_area_ratio(np.log(m), g))


def mach_from_area_ratio(area_ratio: Values, isentropic_exponent: Values, branch: Branch = "supersonic") -> Array:
    """Mach number at which the flow area is a given multiple of the sonic area.

    Parameters
    ----------
    area_ratio : float or array
        Flow area over sonic area A/A*, 1 or more.
    isentropic_exponent : float or array
        Isentropic exponent, above 1.
    branch : str
        ``"supersonic"`` or ``"subsonic"``.

    Returns
    -------
    array
        Mach number.

    Raises
    ------
    InputError
        Outside the ranges stated.
    ConvergenceError
        Where Newton's iteration does not settle.

    Notes
    -----
    Newton in ln M. ln(A/A*) is convex in ln M, so the iteration converges from any start on its branch.

    Source
    ------
    NACA Report 1135, equation 80, inverted.

    Examples
    --------
    >>> round(float(mach_from_area_ratio(1.6875, 1.4)), 6)
    2.0
    """
    ratio, g = np.broadcast_arrays(values(area_ratio), checked_exponent(isentropic_exponent))
    require(np.isfinite(ratio) & (ratio >= 1.0), "area_ratio", ratio, "1 or more", "It is flow over sonic area.")
    sign = 1.0 if branch == "supersonic" else -1.0
    goal, exponent = np.log(ratio.real), g.real
    x = np.asarray(sign * np.sqrt(0.5 * (exponent + 1.0) * goal))
    for _ in range(_ITERATIONS):
        step = _towards(goal, x, exponent)
        x = x + step
        if np.all(np.abs(step) <= 4.0 * np.spacing(np.abs(x)) + _STEP):
            # one more step from the root carries the tangents
            return values(np.exp(x + _towards(np.log(ratio), x, g) if has_tangent(ratio, g) else x))
    worst = float(np.max(np.abs(step)))
    raise ConvergenceError("The Mach number of an area ratio did not settle.", iterations=_ITERATIONS, residual=worst)


def _towards(goal: Array, x: Array, g: Array) -> Array:
    """Return Newton's step in x = ln M towards ln(A/A*) = goal; none at the throat, where the slope vanishes."""
    square = np.expm1(2.0 * x)
    slope = square / (1.0 + 0.5 * (g - 1.0) * (square + 1.0))
    return np.where(goal > 0.0, (goal - _log_area_ratio(x, g)) / np.where(slope == 0.0, 1.0, slope), 0.0)


def mach_from_pressure_ratio(pressure_ratio: Values, isentropic_exponent: Values) -> Array:
    """Mach number at which static over stagnation pressure has a given value.

    Parameters
    ----------
    pressure_ratio : float or array
        p/p0, above 0 and at most 1.
    isentropic_exponent : float or array
        Isentropic exponent, above 1.

    Returns
    -------
    array
        Mach number.

    Raises
    ------
    InputError
        Outside the ranges stated.

    Notes
    -----
    M^2 = 2/(g - 1) [(p/p0)^(-(g - 1)/g) - 1].

    Source
    ------
    NACA Report 1135, equation 44, inverted.

    Examples
    --------
    >>> round(float(mach_from_pressure_ratio(0.12780452546, 1.4)), 6)
    2.0
    """
    ratio, g = values(pressure_ratio), checked_exponent(isentropic_exponent)
    require((ratio > 0.0) & (ratio <= 1.0), "pressure_ratio", ratio, "above 0 and at most 1")
    return np.sqrt(2.0 / (g - 1.0) * np.expm1(-(g - 1.0) / g * np.log(ratio)))


def mach_from_temperature_ratio(temperature_ratio: Values, isentropic_exponent: Values) -> Array:
    """Mach number at which static over stagnation temperature has a given value.

    Parameters
    ----------
    temperature_ratio : float or array
        T/T0, above 0 and at most 1.
    isentropic_exponent : float or array
        Isentropic exponent, above 1.

    Returns
    -------
    array
        Mach number.

    Raises
    ------
    InputError
        Outside the ranges stated.

    Notes
    -----
    M^2 = 2/(g - 1) (T0/T - 1).

    Source
    ------
    NACA Report 1135, equation 43, inverted.

    Examples
    --------
    >>> round(float(mach_from_temperature_ratio(0.5555555556, 1.4)), 6)
    2.0
    """
    ratio, g = values(temperature_ratio), checked_exponent(isentropic_exponent)
    require((ratio > 0.0) & (ratio <= 1.0), "temperature_ratio", ratio, "above 0 and at most 1")
    return np.sqrt(2.0 / (g - 1.0) * (1.0 - ratio) / ratio)


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


def exhaust_velocity(
    pressure_ratio: Values, stagnation_temperature: Values, gas_constant: Values, isentropic_exponent: Values
) -> Array:
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
