"""Convective heat load on the wall: Bartz's coefficient, recovery temperature, flux and its integral.

Left out: radiation, films and deposits on the wall, and what reacts at a cold wall. The coefficient is good to some
20-30 % near the throat (common practice, no source) and overstates the flux near the injector.
"""

from __future__ import annotations

from typing import Final

import numpy as np

from propkit.errors import InputError, Problem
from propkit.physics.arrays import Array, Values, require, values
from propkit.physics.wall import Wall

VISCOSITY_EXPONENT: Final = 0.6
"""Exponent w of viscosity against temperature in the property correction: Bartz (1957)."""


def recovery_factor(prandtl: Values) -> Array:
    """Return the recovery factor of a turbulent boundary layer.

    Parameters
    ----------
    prandtl : float or array
        Prandtl number, above 0.

    Returns
    -------
    array
        Recovery factor [1].

    Raises
    ------
    InputError
        For a Prandtl number of 0 or less.

    Notes
    -----
    r = Pr^(1/3).

    Source
    ------
    Bartz (1957); Schlichting, Boundary-Layer Theory.

    Examples
    --------
    >>> round(float(recovery_factor(0.512)), 6)
    0.8
    """
    pr = values(prandtl)
    require(pr > 0.0, "prandtl", pr, "above 0")
    return np.cbrt(pr)


def adiabatic_wall_temperature(static_temperature: Values, stagnation_temperature: Values, prandtl: Values) -> Array:
    """Return the temperature that an uncooled wall takes [K].

    Parameters
    ----------
    static_temperature : float or array
        Static temperature of the core flow [K], above 0.
    stagnation_temperature : float or array
        Stagnation temperature [K].
    prandtl : float or array
        Prandtl number, above 0.

    Returns
    -------
    array
        Adiabatic wall (recovery) temperature [K].

    Raises
    ------
    InputError
        Outside the ranges stated.

    Notes
    -----
    Taw = T + Pr^(1/3) (T0 - T).

    Source
    ------
    Bartz (1957).

    Examples
    --------
    >>> round(float(adiabatic_wall_temperature(2000.0, 3000.0, 0.512)), 6)
    2800.0
    """
    static, total = values(static_temperature), values(stagnation_temperature)
    require(static > 0.0, "static_temperature", static, "above 0")
    return static + recovery_factor(prandtl) * (total - static)


def property_correction(wall_temperature: Values, stagnation_temperature: Values, mach: Values, isentropic_exponent: Values) -> Array:
    """Return Bartz's factor for the variation of density and viscosity across the boundary layer.

    Parameters
    ----------
    wall_temperature : float or array
        Temperature of the gas-side wall [K], above 0.
    stagnation_temperature : float or array
        Stagnation temperature [K], above 0.
    mach : float or array
        Mach number of the core flow, 0 or more.
    isentropic_exponent : float or array
        Isentropic exponent, above 1.

    Returns
    -------
    array
        Factor sigma, near 1.

    Raises
    ------
    InputError
        Outside the ranges stated.

    Notes
    -----
    sigma = [1/2 Tw/T0 (1 + (g - 1)/2 M^2) + 1/2]^-(0.8 - w/5) [1 + (g - 1)/2 M^2]^-(w/5), w = 0.6.

    Source
    ------
    Bartz (1957).

    Examples
    --------
    >>> float(property_correction(3000.0, 3000.0, 0.0, 1.2))
    1.0
    """
    wall, total, m, g = (values(v) for v in (wall_temperature, stagnation_temperature, mach, isentropic_exponent))
    require(wall > 0.0, "wall_temperature", wall, "above 0")
    require(total > 0.0, "stagnation_temperature", total, "above 0")
    require(m >= 0.0, "mach", m, "0 or more")
    require(g > 1.0, "isentropic_exponent", g, "above 1")
    heating = 1.0 + 0.5 * (g - 1.0) * m**2
    share = VISCOSITY_EXPONENT / 5.0
    return values((0.5 * wall / total * heating + 0.5) ** -(0.8 - share) * heating**-share)


def heat_transfer_coefficient(
    throat_diameter: Values,
    throat_arc_radius: Values,
    viscosity: Values,
    specific_heat: Values,
    prandtl: Values,
    stagnation_pressure: Values,
    characteristic_velocity: Values,
    area_ratio: Values,
    property_correction: Values,
) -> Array:
    """Return the convective heat transfer coefficient after Bartz [W/(m2 K)].

    Parameters
    ----------
    throat_diameter : float or array
        Throat diameter [m], above 0.
    throat_arc_radius : float or array
        Radius of curvature of the wall at the throat [m], above 0; the mean of both arcs where they differ.
    viscosity, specific_heat, prandtl : float or array
        Viscosity [Pa s], frozen heat capacity [J/(kg K)] and Prandtl number [1] at stagnation conditions, above 0.
    stagnation_pressure : float or array
        Stagnation pressure at the nozzle inlet [Pa], above 0.
    characteristic_velocity : float or array
        Delivered characteristic velocity [m/s], above 0.
    area_ratio : float or array
        Local over throat area, 1 or more.
    property_correction : float or array
        Factor sigma of `property_correction`.

    Returns
    -------
    array
        Heat transfer coefficient [W/(m2 K)] for the driving difference Taw - Tw.

    Raises
    ------
    InputError
        Outside the ranges stated.

    Notes
    -----
    h = [0.026/Dt^0.2 (mu^0.2 cp/Pr^0.6) (p0/c*)^0.8 (Dt/R)^0.1] (At/A)^0.9 sigma.

    Source
    ------
    Bartz (1957).

    Examples
    --------
    >>> round(float(heat_transfer_coefficient(1.0, 1.0, 1.0, 1.0, 1.0, 1.0, 1.0, 1.0, 1.0)), 3)
    0.026
    """
    given = {
        "throat_diameter": throat_diameter,
        "throat_arc_radius": throat_arc_radius,
        "viscosity": viscosity,
        "specific_heat": specific_heat,
        "prandtl": prandtl,
        "stagnation_pressure": stagnation_pressure,
        "characteristic_velocity": characteristic_velocity,
        "property_correction": property_correction,
    }
    for name, value in given.items():
        require(values(value) > 0.0, name, value, "above 0")
    d, arc, mu, cp, pr, p0, cstar, sigma = (values(value) for value in given.values())
    ratio = values(area_ratio)
    require(ratio >= 1.0 - 1e-9, "area_ratio", ratio, "1 or more", "It is local over throat area.")
    return values(0.026 / d**0.2 * (mu**0.2 * cp / pr**0.6) * (p0 / cstar) ** 0.8 * (d / arc) ** 0.1 * ratio**-0.9 * sigma)


def heat_flux(coefficient: Values, adiabatic_wall_temperature: Values, wall_temperature: Values) -> Array:
    """Return the convective heat flux into the wall [W/m2].

    Parameters
    ----------
    coefficient : float or array
        Heat transfer coefficient [W/(m2 K)], 0 or more.
    adiabatic_wall_temperature : float or array
        Adiabatic wall temperature [K].
    wall_temperature : float or array
        Temperature of the gas-side wall [K], above 0 and at most the adiabatic one.

    Returns
    -------
    array
        Heat flux [W/m2].

    Raises
    ------
    InputError
        For a wall hotter than the gas would make it.

    Notes
    -----
    q = h (Taw - Tw).

    Source
    ------
    Bartz (1957).

    Examples
    --------
    >>> float(heat_flux(5000.0, 3000.0, 800.0))
    11000000.0
    """
    h, hot, cold = (values(v) for v in (coefficient, adiabatic_wall_temperature, wall_temperature))
    require(h >= 0.0, "coefficient", h, "0 or more")
    require(cold > 0.0, "wall_temperature", cold, "above 0")
    shown, limit = np.broadcast_arrays(cold, hot)
    too_hot = shown > limit
    if np.any(too_hot):
        first = int(np.argmax(too_hot))
        raise InputError(
            Problem(
                "wall_temperature",
                f"{shown.flat[first]:.5g} K",
                f"at most the local adiabatic wall temperature, {limit.flat[first]:.5g} K",
                "A hotter wall would heat the gas: give a lower wall temperature.",
            )
        )
    return h * (hot - cold)


def heat_load(flux: Values, wall: Wall) -> float:
    """Return the heat flow into a wall [W].

    Parameters
    ----------
    flux : array
        Heat flux [W/m2] at the points of `propkit.physics.wall.quadrature`.
    wall : Wall
        Those points.

    Returns
    -------
    float
        Integral of 2 pi r q over the wall length [W].

    Source
    ------
    Geometry.
    """
    return float(np.sum(2.0 * np.pi * values(flux) * wall.r * wall.ds))


def coolant_temperature_rise(heat_load: Values, coolant_mass_flow: Values, coolant_specific_heat: Values) -> Array:
    """Return the temperature rise of a coolant that takes up a heat load [K].

    Parameters
    ----------
    heat_load : float or array
        Heat flow [W].
    coolant_mass_flow : float or array
        Coolant mass flow [kg/s], above 0.
    coolant_specific_heat : float or array
        Mean heat capacity of the coolant [J/(kg K)], above 0.

    Returns
    -------
    array
        Temperature rise [K], for a coolant that does not boil or decompose.

    Raises
    ------
    InputError
        Outside the ranges stated.

    Notes
    -----
    dT = Q / (m' c).

    Source
    ------
    Conservation of energy.

    Examples
    --------
    >>> float(coolant_temperature_rise(1e6, 5.0, 2000.0))
    100.0
    """
    flow, heat = values(coolant_mass_flow), values(coolant_specific_heat)
    require(flow > 0.0, "coolant_mass_flow", flow, "above 0")
    require(heat > 0.0, "coolant_specific_heat", heat, "above 0")
    return values(heat_load) / (flow * heat)


def estimated_viscosity(molar_mass: Values, temperature: Values) -> Array:
    """Return Bartz's estimate of the viscosity of combustion gas, for a gas without a known composition [Pa s].

    Parameters
    ----------
    molar_mass : float or array
        Molar mass [kg/mol], above 0.
    temperature : float or array
        Temperature [K], above 0.

    Returns
    -------
    array
        Viscosity [Pa s].

    Raises
    ------
    InputError
        Outside the ranges stated.

    Notes
    -----
    46.6e-10 sqrt(M) T^0.6 lbm/(in s) with M in lbm/lbmol and T in degrees Rankine.

    Source
    ------
    Bartz (1957), estimated properties; from memory.

    Examples
    --------
    >>> f"{float(estimated_viscosity(0.022, 3500.0)):.3g}"
    '7.43e-05'
    """
    m, t = values(molar_mass), values(temperature)
    require(m > 0.0, "molar_mass", m, "above 0")
    require(t > 0.0, "temperature", t, "above 0")
    return 46.6e-10 * 0.45359237 / 0.0254 * np.sqrt(1000.0 * m) * (1.8 * t) ** 0.6


def estimated_prandtl(isentropic_exponent: Values) -> Array:
    """Return the Prandtl number of a gas by Eucken's relation, for a gas without a known composition.

    Parameters
    ----------
    isentropic_exponent : float or array
        Ratio of the frozen heat capacities, above 1.

    Returns
    -------
    array
        Prandtl number [1].

    Raises
    ------
    InputError
        For an exponent of 1 or less.

    Notes
    -----
    Pr = 4 g / (9 g - 5).

    Source
    ------
    Bartz (1957), after Eucken.

    Examples
    --------
    >>> round(float(estimated_prandtl(5.0 / 3.0)), 6)
    0.666667
    """
    g = values(isentropic_exponent)
    require(g > 1.0, "isentropic_exponent", g, "above 1")
    return 4.0 * g / (9.0 * g - 5.0)
