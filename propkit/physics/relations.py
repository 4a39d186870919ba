"""Written relations of the whole chain, by key; the form of each is `propkit.physics.relation.Relation`."""

from __future__ import annotations

from collections.abc import Mapping
from types import MappingProxyType
from typing import Any

from propkit.physics import balances, gas_dynamics, ideal_nozzle, stoichiometry, thrust
from propkit.physics.relation import TERMS, Relation, Term, relation
from propkit.physics.relations_delivered import DELIVERED

__all__ = ["RELATIONS", "TERMS", "Relation", "Term"]


def _stoichiometric(fuel_valence: float, oxidizer_valence: float) -> float:
    """Return the stoichiometric mixture ratio of streams that carry these net valences per mass."""
    return stoichiometry.stoichiometric_mixture_ratio({"O": -0.5 * oxidizer_valence}, {"H": fuel_valence})


def _mixture_enthalpy(mixture_ratio: float, oxidizer_enthalpy: float, fuel_enthalpy: float) -> Any:
    return stoichiometry.mix(mixture_ratio, oxidizer_enthalpy, fuel_enthalpy)


def _enthalpy_by_mass(molar_enthalpy: float, molar_mass: float) -> float:
    return molar_enthalpy / molar_mass


def _oxygen_balance(net_valence: float, oxygen_mass: float) -> Any:
    """Return the oxygen balance of a mixture that carries this net valence per mass."""
    return stoichiometry.oxygen_balance({"H": net_valence}, oxygen_mass)


_CHOKED = (
    "sqrt({isentropic_exponent}) * (2 / ({isentropic_exponent} + 1)) ** (({isentropic_exponent} + 1) / (2 * ({isentropic_exponent} - 1)))"
)
_T_RATIO = "(1 + ({isentropic_exponent} - 1) / 2 * {mach} ** 2)"

_LIST = (
    # propellants
    relation(
        "stoichiometric_mixture_ratio",
        TERMS["stoichiometric_mixture_ratio"],
        "{fuel_valence} / -{oxidizer_valence}",
        _stoichiometric,
        "common-practice",
    ),
    relation(
        "equivalence_ratio",
        TERMS["equivalence_ratio"],
        "{stoichiometric_mixture_ratio} / {mixture_ratio}",
        balances.equivalence_ratio,
        "definition",
    ),
    relation(
        "mixture_ratio",
        TERMS["mixture_ratio"],
        "{stoichiometric_mixture_ratio} / {equivalence_ratio}",
        balances.mixture_ratio,
        "definition",
    ),
    relation(
        "mixture_ratio_of_volumes",
        TERMS["mixture_ratio"],
        "{mixture_ratio_by_volume} * {oxidizer_density} / {fuel_density}",
        stoichiometry.ratio_from_volumes,
        "definition",
    ),
    relation(
        "mixture_ratio_of_percent",
        TERMS["mixture_ratio"],
        "{oxidizer_percent} / (100 - {oxidizer_percent})",
        stoichiometry.ratio_from_percent,
        "definition",
    ),
    relation(
        "mixture_ratio_by_volume",
        TERMS["mixture_ratio_by_volume"],
        "{mixture_ratio} * {fuel_density} / {oxidizer_density}",
        stoichiometry.ratio_of_volumes,
        "definition",
    ),
    relation(
        "oxidizer_percent",
        TERMS["oxidizer_percent"],
        "100 * {mixture_ratio} / (1 + {mixture_ratio})",
        stoichiometry.percent_of_ratio,
        "definition",
    ),
    relation(
        "core_mixture_ratio",
        Term(r"r_{c}"),
        "({mixture_ratio} / (1 + {mixture_ratio}) - {film_fraction} * {film_mixture_ratio} / (1 + {film_mixture_ratio}))"
        " / (1 / (1 + {mixture_ratio}) - {film_fraction} / (1 + {film_mixture_ratio}))",
        stoichiometry.core_mixture_ratio,
        "conservation",
    ),
    relation(
        "oxygen_balance",
        Term(r"B_{O}"),
        "-{net_valence} / 2 * {oxygen_mass}",
        _oxygen_balance,
        "common-practice",
    ),
    relation(
        "mixture_enthalpy",
        TERMS["enthalpy"],
        "({mixture_ratio} * {oxidizer_enthalpy} + {fuel_enthalpy}) / (1 + {mixture_ratio})",
        _mixture_enthalpy,
        "conservation",
    ),
    relation(
        "bulk_density",
        TERMS["bulk_density"],
        "(1 + {mixture_ratio}) / ({mixture_ratio} / {oxidizer_density} + 1 / {fuel_density})",
        stoichiometry.bulk_density,
        "definition",
    ),
    relation(
        "oxidizer_mass_flow",
        Term(r"\dot{m}_{ox}", "kg/s"),
        "{mass_flow} * {mixture_ratio} / (1 + {mixture_ratio})",
        balances.oxidizer_mass_flow,
        "conservation",
    ),
    relation(
        "fuel_mass_flow",
        Term(r"\dot{m}_{fu}", "kg/s"),
        "{mass_flow} / (1 + {mixture_ratio})",
        balances.fuel_mass_flow,
        "conservation",
    ),
    relation(
        "oxidizer_mass_flow_beside_additives",
        Term(r"\dot{m}_{ox}", "kg/s"),
        "{mass_flow} * (1 - {additive_fraction}) * {mixture_ratio} / (1 + {mixture_ratio})",
        balances.oxidizer_mass_flow,
        "conservation",
    ),
    relation(
        "fuel_mass_flow_beside_additives",
        Term(r"\dot{m}_{fu}", "kg/s"),
        "{mass_flow} * (1 - {additive_fraction}) / (1 + {mixture_ratio})",
        balances.fuel_mass_flow,
        "conservation",
    ),
    relation(
        "enthalpy_by_mass",
        TERMS["enthalpy"],
        "{molar_enthalpy} / {molar_mass}",
        _enthalpy_by_mass,
        "definition",
    ),
    # gas
    relation(
        "gas_constant",
        TERMS["gas_constant"],
        "{molar_gas_constant} / {molar_mass}",
        balances.gas_constant,
        "si-brochure",
    ),
    relation(
        "ideal_gas_density",
        TERMS["density"],
        "{pressure} / ({gas_constant} * {temperature})",
        balances.ideal_gas_density,
        "naca1135",
    ),
    relation(
        "sound_speed",
        TERMS["sound_speed"],
        "sqrt({isentropic_exponent} * {gas_constant} * {temperature})",
        balances.sound_speed,
        "naca1135",
    ),
    relation(
        "frozen_isentropic_exponent",
        Term(r"\gamma_{f}"),
        "{frozen_specific_heat} / ({frozen_specific_heat} - {gas_constant})",
        balances.frozen_isentropic_exponent,
        "naca1135",
    ),
    relation(
        "velocity",
        TERMS["velocity"],
        "sqrt(2 * ({stagnation_enthalpy} - {enthalpy}))",
        balances.velocity_from_enthalpy,
        "conservation",
    ),
    relation("mach", TERMS["mach"], "{velocity} / {sound_speed}", balances.mach, "definition"),
    relation("mass_flux", TERMS["local_mass_flux"], "{density} * {velocity}", balances.mass_flux, "definition"),
    # one-dimensional flow at constant properties
    relation("temperature_ratio", Term(r"\frac{T}{T_{0}}"), f"1 / {_T_RATIO}", gas_dynamics.temperature_ratio, "naca1135"),
    relation(
        "pressure_ratio",
        Term(r"\frac{p}{p_{0}}"),
        f"{_T_RATIO} ** (-{{isentropic_exponent}} / ({{isentropic_exponent}} - 1))",
        gas_dynamics.pressure_ratio,
        "naca1135",
    ),
    relation(
        "density_ratio",
        Term(r"\frac{\rho}{\rho_{0}}"),
        f"{_T_RATIO} ** (-1 / ({{isentropic_exponent}} - 1))",
        gas_dynamics.density_ratio,
        "naca1135",
    ),
    relation(
        "area_ratio_of_mach",
        TERMS["area_ratio"],
        f"1 / {{mach}} * (2 / ({{isentropic_exponent}} + 1) * {_T_RATIO})"
        " ** (({isentropic_exponent} + 1) / (2 * ({isentropic_exponent} - 1)))",
        gas_dynamics.area_ratio,
        "naca1135",
    ),
    relation("choked_mass_flux_function", Term(r"\Gamma"), _CHOKED, ideal_nozzle.choked_mass_flux_function, "sutton-biblarz"),
    relation(
        "choked_mass_flux",
        TERMS["throat_mass_flux"],
        f"{{stagnation_pressure}} / sqrt({{gas_constant}} * {{stagnation_temperature}}) * {_CHOKED}",
        ideal_nozzle.choked_mass_flux,
        "sutton-biblarz",
    ),
    relation(
        "choked_mass_flow",
        TERMS["mass_flow"],
        f"{{stagnation_pressure}} * {{throat_area}} / sqrt({{gas_constant}} * {{stagnation_temperature}}) * {_CHOKED}",
        balances.choked_mass_flow,
        "sutton-biblarz",
    ),
    relation(
        "characteristic_velocity_constant_properties",
        TERMS["characteristic_velocity"],
        f"sqrt({{gas_constant}} * {{stagnation_temperature}}) / ({_CHOKED})",
        ideal_nozzle.characteristic_velocity,
        "sutton-biblarz",
    ),
    relation(
        "exhaust_velocity_constant_properties",
        TERMS["velocity"],
        "sqrt(2 * {isentropic_exponent} / ({isentropic_exponent} - 1) * {gas_constant} * {stagnation_temperature}"
        " * (1 - {pressure_ratio} ** (({isentropic_exponent} - 1) / {isentropic_exponent})))",
        ideal_nozzle.exhaust_velocity,
        "sutton-biblarz",
    ),
    relation(
        "thrust_coefficient_constant_properties",
        TERMS["thrust_coefficient"],
        "sqrt(2 * {isentropic_exponent} ** 2 / ({isentropic_exponent} - 1)"
        " * (2 / ({isentropic_exponent} + 1)) ** (({isentropic_exponent} + 1) / ({isentropic_exponent} - 1))"
        " * (1 - {exit_pressure_ratio} ** (({isentropic_exponent} - 1) / {isentropic_exponent})))"
        " + ({exit_pressure_ratio} - {ambient_pressure_ratio}) * {area_ratio}",
        ideal_nozzle.thrust_coefficient,
        "sutton-biblarz",
    ),
    # nozzle and performance
    relation(
        "area_ratio_of_fluxes",
        TERMS["area_ratio"],
        "{throat_mass_flux} / {local_mass_flux}",
        balances.area_ratio_of_fluxes,
        "conservation",
    ),
    relation(
        "area_ratio_of_areas",
        TERMS["area_ratio"],
        "{exit_area} / {throat_area}",
        balances.area_ratio_of_areas,
        "definition",
    ),
    relation(
        "exit_area_of_ratio",
        TERMS["exit_area"],
        "{area_ratio} * {throat_area}",
        balances.exit_area_of_ratio,
        "definition",
    ),
    relation(
        "throat_area_of_exit",
        TERMS["throat_area"],
        "{exit_area} / {area_ratio}",
        balances.throat_area_of_exit,
        "definition",
    ),
    relation("circle_area", TERMS["area"], "pi / 4 * {diameter} ** 2", thrust.circle_area, "definition"),
    relation("circle_diameter", TERMS["diameter"], "sqrt(4 / pi * {area})", thrust.circle_diameter, "definition"),
    relation(
        "mass_flow",
        TERMS["mass_flow"],
        "{discharge_coefficient} * {throat_mass_flux} * {throat_area} / {cstar_efficiency}",
        balances.mass_flow,
        "conservation",
    ),
    relation(
        "characteristic_velocity",
        TERMS["characteristic_velocity"],
        "{stagnation_pressure} * {throat_area} / {mass_flow}",
        thrust.characteristic_velocity,
        "definition",
    ),
    relation(
        "delivered_velocity",
        Term(r"u_{d}", "m/s"),
        "{exit_velocity} * {cstar_efficiency} * {divergence_factor}",
        balances.delivered_velocity,
        "cpia-246",
    ),
    relation(
        "thrust",
        TERMS["thrust"],
        "{mass_flow} * {exit_velocity} + ({exit_pressure} - {ambient_pressure}) * {exit_area}",
        thrust.thrust,
        "conservation",
    ),
    relation(
        "thrust_coefficient",
        TERMS["thrust_coefficient"],
        "{thrust} / ({stagnation_pressure} * {throat_area})",
        thrust.thrust_coefficient,
        "definition",
    ),
    relation(
        "specific_impulse",
        TERMS["specific_impulse"],
        "{thrust} / ({mass_flow} * {standard_gravity})",
        thrust.specific_impulse,
        "definition",
    ),
    relation(
        "effective_exhaust_velocity",
        Term("c", "m/s"),
        "{thrust} / {mass_flow}",
        thrust.effective_exhaust_velocity,
        "definition",
    ),
    relation(
        "density_impulse",
        Term(r"I_{\rho}", "N*s/m**3"),
        "{specific_impulse} * {standard_gravity} * {bulk_density}",
        thrust.density_impulse,
        "definition",
    ),
    relation(
        "throat_area_for_thrust",
        TERMS["throat_area"],
        "{thrust} / ({thrust_coefficient} * {stagnation_pressure})",
        balances.throat_area_for_thrust,
        "definition",
    ),
    relation(
        "throat_area_for_mass_flow",
        TERMS["throat_area"],
        "{mass_flow} * {characteristic_velocity} / {stagnation_pressure}",
        balances.throat_area_for_mass_flow,
        "definition",
    ),
)

RELATIONS: Mapping[str, Relation] = MappingProxyType({each.key: each for each in (*_LIST, *DELIVERED)})
"""Every written relation by key."""
