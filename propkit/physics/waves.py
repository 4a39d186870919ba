"""Normal shocks and Prandtl-Meyer turns of a perfect gas, in closed form.

Symbols: M Mach number, g isentropic exponent (above 1), 1 ahead of and 2 behind the shock.
"""

from __future__ import annotations

import numpy as np

from propkit.physics.arrays import Array, Values, require, values
from propkit.physics.gas_dynamics import checked_exponent, checked_mach


def shock_mach(mach: Values, isentropic_exponent: Values) -> Array:
    """Mach number behind a normal shock.

    Parameters
    ----------
    mach : float or array
        Mach number ahead of the shock, 1 or more.
    isentropic_exponent : float or array
        Isentropic exponent, above 1.

    Returns
    -------
    array
        M2, at most 1.

    Raises
    ------
    InputError
        Outside the ranges stated.

    Notes
    -----
    M2^2 = ((g - 1) M^2 + 2) / (2 g M^2 - (g - 1)).

    Source
    ------
    NACA Report 1135, equation 96.

    Examples
    --------
    >>> round(float(shock_mach(2.0, 1.4)), 4)
    0.5774
    """
    g, m = checked_exponent(isentropic_exponent), checked_mach(mach, 1.0)
    return np.sqrt(((g - 1.0) * m**2 + 2.0) / (2.0 * g * m**2 - (g - 1.0)))


def shock_pressure_ratio(mach: Values, isentropic_exponent: Values) -> Array:
    """Ratio of static pressures behind and ahead of a normal shock.

    Parameters
    ----------
    mach : float or array
        Mach number ahead of the shock, 1 or more.
    isentropic_exponent : float or array
        Isentropic exponent, above 1.

    Returns
    -------
    array
        p2/p1, 1 or more.

    Raises
    ------
    InputError
        Outside the ranges stated.

    Notes
    -----
    p2/p1 = (2 g M^2 - (g - 1)) / (g + 1).

    Source
    ------
    NACA Report 1135, equation 93.

    Examples
    --------
    >>> round(float(shock_pressure_ratio(2.0, 1.4)), 4)
    4.5
    """
    g, m = checked_exponent(isentropic_exponent), checked_mach(mach, 1.0)
    return (2.0 * g * m**2 - (g - 1.0)) / (g + 1.0)


def shock_density_ratio(mach: Values, isentropic_exponent: Values) -> Array:
    """Ratio of densities behind and ahead of a normal shock.

    Parameters
    ----------
    mach : float or array
        Mach number ahead of the shock, 1 or more.
    isentropic_exponent : float or array
        Isentropic exponent, above 1.

    Returns
    -------
    array
        rho2/rho1, 1 or more.

    Raises
    ------
    InputError
        Outside the ranges stated.

    Notes
    -----
    rho2/rho1 = (g + 1) M^2 / ((g - 1) M^2 + 2).

    Source
    ------
    NACA Report 1135, equation 94.

    Examples
    --------
    >>> round(float(shock_density_ratio(2.0, 1.4)), 4)
    2.6667
    """
    g, m = checked_exponent(isentropic_exponent), checked_mach(mach, 1.0)
    return (g + 1.0) * m**2 / ((g - 1.0) * m**2 + 2.0)


def shock_temperature_ratio(mach: Values, isentropic_exponent: Values) -> Array:
    """Ratio of static temperatures behind and ahead of a normal shock.

    Parameters
    ----------
    mach : float or array
        Mach number ahead of the shock, 1 or more.
    isentropic_exponent : float or array
        Isentropic exponent, above 1.

    Returns
    -------
    array
        T2/T1, 1 or more.

    Raises
    ------
    InputError
        Outside the ranges stated.

    Notes
    -----
    T2/T1 = (p2/p1) / (rho2/rho1).

    Source
    ------
    NACA Report 1135, equation 95.

    Examples
    --------
    >>> round(float(shock_temperature_ratio(2.0, 1.4)), 4)
    1.6875
    """
    return shock_pressure_ratio(mach, isentropic_exponent) / shock_density_ratio(mach, isentropic_exponent)


def shock_stagnation_pressure_ratio(mach: Values, isentropic_exponent: Values) -> Array:
    """Ratio of stagnation pressures behind and ahead of a normal shock.

    Parameters
    ----------
    mach : float or array
        Mach number ahead of the shock, 1 or more.
    isentropic_exponent : float or array
        Isentropic exponent, above 1.

    Returns
    -------
    array
        p02/p01, at most 1.

    Raises
    ------
    InputError
        Outside the ranges stated.

    Notes
    -----
    p02/p01 = (rho2/rho1)^(g/(g - 1)) (p2/p1)^(-1/(g - 1)).

    Source
    ------
    NACA Report 1135, equation 99.

    Examples
    --------
    >>> round(float(shock_stagnation_pressure_ratio(2.0, 1.4)), 4)
    0.7209
    """
    g = checked_exponent(isentropic_exponent)
    return shock_density_ratio(mach, g) ** (g / (g - 1.0)) * shock_pressure_ratio(mach, g) ** (-1.0 / (g - 1.0))


def prandtl_meyer_angle(mach: Values, isentropic_exponent: Values) -> Array:
    """Angle through which a sonic flow turns to reach a Mach number [rad].

    Parameters
    ----------
    mach : float or array
        Mach number, 1 or more.
    isentropic_exponent : float or array
        Isentropic exponent, above 1.

    Returns
    -------
    array
        Prandtl-Meyer angle [rad].

    Raises
    ------
    InputError
        Outside the ranges stated.

    Notes
    -----
    nu = k arctan(b/k) - arctan(b), k = sqrt((g + 1)/(g - 1)), b = sqrt(M^2 - 1).

    Source
    ------
    NACA Report 1135, equation 171c.

    Examples
    --------
    >>> round(float(np.degrees(prandtl_meyer_angle(2.0, 1.4))), 2)
    26.38
    """
    g, m = checked_exponent(isentropic_exponent), checked_mach(mach, 1.0)
    k, b = np.sqrt((g + 1.0) / (g - 1.0)), np.sqrt(m**2 - 1.0)
    return k * np.arctan(b / k) - np.arctan(b)


def mach_from_prandtl_meyer_angle(angle: Values, isentropic_exponent: Values) -> Array:
    """Mach number that a sonic flow reaches by turning through an angle.

    Parameters
    ----------
    angle : float or array
        Prandtl-Meyer angle [rad], 0 to below (k - 1) pi/2, the turn to vacuum.
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
    Bisection in arctan(sqrt(M^2 - 1)), in which the angle rises monotonically.

    Source
    ------
    NACA Report 1135, equation 171c, inverted.

    Examples
    --------
    >>> round(float(mach_from_prandtl_meyer_angle(np.radians(26.379761), 1.4)), 5)
    2.0
    """
    nu, g = np.broadcast_arrays(values(angle), checked_exponent(isentropic_exponent))
    k = np.sqrt((g + 1.0) / (g - 1.0))
    require((nu >= 0.0) & (nu < 0.5 * np.pi * (k - 1.0)), "angle", nu, "0 or more and below the turn to vacuum")
    low, high = np.zeros_like(nu), np.full_like(nu, 0.5 * np.pi)
    for _ in range(60):
        middle = 0.5 * (low + high)
        below = k * np.arctan(np.tan(middle) / k) - middle < nu
        low, high = np.where(below, middle, low), np.where(below, high, middle)
    return values(1.0 / np.cos(0.5 * (low + high)))
