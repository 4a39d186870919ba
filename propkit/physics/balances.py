"""Mass flow, mixture splits and state arithmetic: the small balances that the objects show the working of.

Every function takes floats or arrays that broadcast together and returns an array. The written form of each stands in
`propkit.physics.relations` and is tested against the function; thrust itself is in `propkit.physics.thrust`.
"""

from __future__ import annotations

import numpy as np

from propkit.constants import GAS_CONSTANT
from propkit.physics.arrays import Array, Values, values
from propkit.physics.ideal_nozzle import choked_mass_flux


def choked_mass_flow(
    stagnation_pressure: Values,
    throat_area: Values,
    stagnation_temperature: Values,
    gas_constant: Values,
    isentropic_exponent: Values,
) -> Array:
    """Return the mass flow [kg/s] of a choked throat [m2] at constant properties: p0 [Pa], T0 [K], R [J/(kg K)]."""
    flux = choked_mass_flux(stagnation_pressure, stagnation_temperature, gas_constant, isentropic_exponent)
    return flux * values(throat_area)


def mass_flow(throat_mass_flux: Values, throat_area: Values, discharge_coefficient: Values = 1.0, cstar_efficiency: Values = 1.0) -> Array:
    """Return the mass flow [kg/s]: ideal throat mass flux [kg/(m2 s)] and area [m2], Cd, c* efficiency."""
    return values(discharge_coefficient) * values(throat_mass_flux) * values(throat_area) / values(cstar_efficiency)


def delivered_velocity(exit_velocity: Values, cstar_efficiency: Values = 1.0, divergence_factor: Values = 1.0) -> Array:
    """Return delivered axial velocity [m/s]: ideal exit velocity times c* efficiency and divergence factor."""
    return values(exit_velocity) * values(cstar_efficiency) * values(divergence_factor)


def throat_area_for_thrust(thrust: Values, thrust_coefficient: Values, stagnation_pressure: Values) -> Array:
    """Return the throat area [m2] that gives a thrust [N] at a thrust coefficient and stagnation pressure [Pa]."""
    return values(thrust) / (values(thrust_coefficient) * values(stagnation_pressure))


def throat_area_for_mass_flow(mass_flow: Values, characteristic_velocity: Values, stagnation_pressure: Values) -> Array:
    """Return the throat area [m2] passing a mass flow [kg/s] at a delivered c* [m/s] and stagnation pressure [Pa]."""
    return values(mass_flow) * values(characteristic_velocity) / values(stagnation_pressure)


def oxidizer_mass_flow(mass_flow: Values, mixture_ratio: Values, additive_fraction: Values = 0.0) -> Array:
    """Return the oxidizer part [kg/s] of a mass flow [kg/s] at a mixture ratio by mass, beside additives."""
    ratio = values(mixture_ratio)
    return values(mass_flow) * (1.0 - values(additive_fraction)) * ratio / (1.0 + ratio)


def fuel_mass_flow(mass_flow: Values, mixture_ratio: Values, additive_fraction: Values = 0.0) -> Array:
    """Return the fuel part [kg/s] of a mass flow [kg/s] at a mixture ratio by mass, beside additives."""
    return values(mass_flow) * (1.0 - values(additive_fraction)) / (1.0 + values(mixture_ratio))


def equivalence_ratio(stoichiometric_mixture_ratio: Values, mixture_ratio: Values) -> Array:
    """Return the equivalence ratio: stoichiometric over actual mixture ratio; above 1 is fuel-rich."""
    return values(stoichiometric_mixture_ratio) / values(mixture_ratio)


def mixture_ratio(stoichiometric_mixture_ratio: Values, equivalence_ratio: Values) -> Array:
    """Return the mixture ratio of an equivalence ratio."""
    return values(stoichiometric_mixture_ratio) / values(equivalence_ratio)


def gas_constant(molar_mass: Values) -> Array:
    """Return R [J/(kg K)] of a gas of a molar mass [kg/mol]."""
    return GAS_CONSTANT / values(molar_mass)


def ideal_gas_density(pressure: Values, gas_constant: Values, temperature: Values) -> Array:
    """Return the density [kg/m3] of an ideal gas: p [Pa], R [J/(kg K)], T [K]."""
    return values(pressure) / (values(gas_constant) * values(temperature))


def sound_speed(isentropic_exponent: Values, gas_constant: Values, temperature: Values) -> Array:
    """Return the speed of sound [m/s] of an ideal gas with exponent (d ln p/d ln rho) at s, R [J/(kg K)], T [K]."""
    return values(np.sqrt(values(isentropic_exponent) * values(gas_constant) * values(temperature)))


def frozen_isentropic_exponent(frozen_specific_heat: Values, gas_constant: Values) -> Array:
    """Return cp/(cp - R) of an ideal gas from its frozen heat capacity [J/(kg K)] and gas constant [J/(kg K)]."""
    heat = values(frozen_specific_heat)
    return heat / (heat - values(gas_constant))


def velocity_from_enthalpy(stagnation_enthalpy: Values, enthalpy: Values) -> Array:
    """Return the velocity [m/s] of adiabatic flow: sqrt(2 (h0 - h)), enthalpies [J/kg]."""
    return values(np.sqrt(2.0 * (values(stagnation_enthalpy) - values(enthalpy))))


def mass_flux(density: Values, velocity: Values) -> Array:
    """Return the mass flow per area [kg/(m2 s)]: rho [kg/m3] times u [m/s]."""
    return values(density) * values(velocity)


def mach(velocity: Values, sound_speed: Values) -> Array:
    """Return the Mach number: velocity over sound speed, both [m/s]."""
    return values(velocity) / values(sound_speed)


def area_ratio_of_fluxes(throat_mass_flux: Values, local_mass_flux: Values) -> Array:
    """Return local area over throat area from the mass fluxes [kg/(m2 s)] by continuity."""
    return values(throat_mass_flux) / values(local_mass_flux)


def area_ratio_of_areas(exit_area: Values, throat_area: Values) -> Array:
    """Return exit over throat area from both areas [m2]."""
    return values(exit_area) / values(throat_area)


def exit_area_of_ratio(area_ratio: Values, throat_area: Values) -> Array:
    """Return the exit area [m2] of an area ratio and a throat area [m2]."""
    return values(area_ratio) * values(throat_area)


def throat_area_of_exit(exit_area: Values, area_ratio: Values) -> Array:
    """Return the throat area [m2] of an exit area [m2] and an area ratio."""
    return values(exit_area) / values(area_ratio)
