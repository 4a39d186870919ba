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
