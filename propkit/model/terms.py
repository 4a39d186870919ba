"""Which relation gives a result, the numbers that go into it, and the conditions that an iterated state satisfies."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from typing import Any

import numpy as np

from propkit.chain.case import AMOUNTS
from propkit.chain.chamber import STREAMS
from propkit.chain.nozzle import AT_SONIC
from propkit.constants import GAS_CONSTANT
from propkit.data.atomic_weights import ATOMIC_WEIGHTS
from propkit.model import losses
from propkit.model.conditions import condition, element_conditions
from propkit.model.wall_conditions import wall_conditions
from propkit.physics import gas_dynamics, ideal_nozzle, stoichiometry
from propkit.physics.expansion_parallel import Parallel
from propkit.report import Step

SIZED = {
    "throat_diameter": "circle_diameter",
    "exit_diameter": "circle_diameter",
    "throat_area": "circle_area",
    "exit_area": "circle_area",
}


def key_for(link: Any, name: str) -> str:
    """Return the key of the relation that gives a result of this recipe, or of its conditions."""
    entry = link.declared_results.get(name)
    if link.kind == "case":
        return str(link.relation_of(name))
    if link.kind == "nozzle":
        return _nozzle_key(link, name) or (entry.relation if entry is not None else "")
    if entry is None:
        return name
    if name == "mass_flow" and link.kind == "performance":
        return key_for(link.nozzle, name) or "mass_flow"
    if name in ("oxidizer_mass_flow", "fuel_mass_flow") and link.nozzle.chamber.case_or_none.additive_fraction:
        return f"{name}_beside_additives"
    if name.endswith("_vacuum"):
        return name.removesuffix("_vacuum")
    return str(entry.relation)


def _nozzle_key(nozzle: Any, name: str) -> str:
    given = set(nozzle.inputs)
    if name == "mass_flow":
        return "mass_flow"
    if name in ("throat_diameter", "exit_diameter"):
        return "circle_diameter"
    if name == "throat_area":
        if "throat_diameter" in given:
            return "circle_area"
        if "mass_flow" in given:
            return "throat_area_for_mass_flow"
        return "throat_area_for_thrust" if "thrust" in given else "throat_area_of_exit"
    if name == "divergence_factor" and nozzle._values["contour"] is not None:
        return str(nozzle._values["contour"].divergence_relation)
    if name == "exit_area":
        return "circle_area" if "exit_diameter" in given else "exit_area_of_ratio"
    if name == "area_ratio":
        return "area_ratio_of_fluxes" if "exit_pressure" in given else "area_ratio_of_areas"
    return ""


def values_for(link: Any, key: str, name: str) -> dict[str, float]:
    """Return the numbers that go into a relation [SI], by the names that the relation uses."""
    return {"case": _case, "chamber": _chamber, "nozzle": _nozzle, "performance": _performance}[link.kind](link, key, name)


def _case(case: Any, key: str, name: str) -> dict[str, float]:
    held = case.held
    found = {
        entry: case.si(entry)
        for entry in (*AMOUNTS, "stoichiometric_mixture_ratio", "film_fraction", "film_mixture_ratio")
        if case.has(entry)
    }
    if name == "oxygen_balance":
        found["net_valence"] = stoichiometry.net_valence(dict(zip(case.whole.symbols, case.whole.atoms[0].tolist(), strict=True)))
        found["oxygen_mass"] = ATOMIC_WEIGHTS["O"] * 1e-3
    if held.propellant is not None:
        found["molar_enthalpy"] = float(held.propellant.enthalpy) * case._values[case.roles[0]].row.molar_mass
        found["molar_mass"] = case._values[case.roles[0]].row.molar_mass
    for role in ("oxidizer", "fuel"):
        stream = getattr(held, role)
        if stream is not None:
            found |= {
                f"{role}_enthalpy": float(stream.enthalpy),
                f"{role}_density": float(stream.density),
                f"{role}_valence": stoichiometry.net_valence(stream.elements),
            }
    return found


def _chamber(chamber: Any, key: str, name: str) -> dict[str, float]:
    names = (
        "pressure",
        "temperature",
        "density",
        "gas_constant",
        "molar_mass",
        "isentropic_exponent",
        "frozen_specific_heat",
        "sound_speed",
        "stagnation_pressure",
    )
    found = {entry: chamber.si(entry) for entry in names if chamber.has(entry)}
    found["stagnation_temperature"] = found["temperature"]
    if name == "stay_time":
        flux = chamber.si("stagnation_pressure") / (chamber.si("cstar_efficiency") * chamber.si("characteristic_velocity"))
        found |= {"volume": chamber.si("characteristic_length"), "mass_flow": flux}
    return found


def _nozzle(nozzle: Any, key: str, name: str) -> dict[str, float]:
    chamber, held = nozzle.chamber, nozzle.held
    found = {
        entry: nozzle.si(entry)
        for entry in (
            "throat_area",
            "exit_area",
            "mass_flow",
            "discharge_coefficient",
            "area_ratio",
            "characteristic_velocity",
        )
    }
    found |= {
        "throat_mass_flux": float(held.mass_flux[0]),
        "local_mass_flux": nozzle.exit.si("density") * nozzle.exit.si("velocity") / nozzle.si("discharge_coefficient"),
        "cstar_efficiency": chamber.si("cstar_efficiency"),
        "stagnation_pressure": chamber.si("stagnation_pressure"),
    }
    if key == "circle_area":
        found["diameter"] = nozzle.si(name.replace("area", "diameter"))
    if key == "circle_diameter":
        found["area"] = nozzle.si(name.replace("diameter", "area"))
    if key == "throat_area_for_thrust":
        found["thrust"] = nozzle.si("thrust")
        found["thrust_coefficient"] = nozzle.si("thrust") / (found["stagnation_pressure"] * found["throat_area"])
    contour = nozzle._values["contour"]
    if name == "divergence_factor" and contour is not None:
        found |= contour.divergence_terms(nozzle.geometry.divergent, nozzle.si("throat_diameter") / 2.0)
    return found


def _performance(performance: Any, key: str, name: str) -> dict[str, float]:
    nozzle = performance.nozzle
    if name == "mass_flow":
        return _nozzle(nozzle, key, name)
    suffix = "_vacuum" if name.endswith("_vacuum") else ""
    found = {
        "mass_flow": performance.si("mass_flow"),
        "thrust": performance.si(f"thrust{suffix}"),
        "specific_impulse": performance.si("specific_impulse"),
        "exit_velocity": performance.delivered_velocity,
        "exit_pressure": nozzle.exit.si("pressure"),
        "ambient_pressure": 0.0 if suffix else performance.si("ambient"),
        "exit_area": nozzle.si("exit_area"),
        "throat_area": nozzle.si("throat_area"),
        "stagnation_pressure": nozzle.chamber.si("stagnation_pressure"),
    }
    case = nozzle.chamber.case_or_none
    if case is not None:
        found |= {entry: case.si(entry) for entry in ("mixture_ratio", "bulk_density") if case.has(entry)}
        found["additive_fraction"] = case.additive_fraction
    return found


def supporting(link: Any, name: str) -> Iterator[tuple[str, str, Mapping[str, float]]]:
    """Yield (name, relation key, numbers) of the relations that feed the first one."""
    nozzle = {"nozzle": lambda: link, "performance": lambda: link.nozzle}.get(link.kind)
    if nozzle is None:
        return
    flow = nozzle()
    if name in ("mass_flow", "throat_area", "throat_diameter", "characteristic_velocity"):
        throat = {entry: flow.throat.si(entry) for entry in ("density", "velocity")}
        yield "throat_mass_flux", "mass_flux", throat
        if flow.flow == "constant-property" and not isinstance(flow.held.isentrope, Parallel):
            yield "mass_flow_in_closed_form", "choked_mass_flux", reservoir_of(flow)
    if name.startswith(("thrust", "specific_impulse", "effective_exhaust")) and link.kind == "performance":
        if link.resolved_losses.ratios:
            yield from losses.working(link)
            return
        yield (
            "delivered_velocity",
            "delivered_velocity",
            {
                "exit_velocity": flow.exit.si("velocity"),
                "cstar_efficiency": flow.chamber.si("cstar_efficiency"),
                "divergence_factor": flow.si("divergence_factor") if flow.has("divergence_factor") else 1.0,
            },
        )


def reservoir_of(nozzle: Any) -> dict[str, float]:
    """Return the reservoir of constant-property flow as the closed forms name it."""
    gas = nozzle.held.isentrope
    return {
        "stagnation_pressure": float(gas.pressure[0]),
        "stagnation_temperature": float(gas.temperature[0]),
        "gas_constant": float(gas.gas_constant[0]),
        "isentropic_exponent": float(gas.gamma[0]),
    }


def conditions(link: Any, name: str) -> Iterator[Step]:
    """Yield the conditions that the iterated states behind a result satisfy."""
    if link.kind == "case":
        yield from link.conditions(name)
        return
    if link.kind == "chamber":
        yield from _chamber_conditions(link, name) if link.upstream is not None else _gas_conditions(link, name)
        return
    nozzle = link if link.kind == "nozzle" else link.nozzle
    if link.kind == "nozzle":
        yield from wall_conditions(nozzle, name)
    if link.kind == "performance" and name.startswith(("thrust", "specific_impulse")) and not name.endswith("_vacuum"):
        yield from losses.conditions(link)
    if name in ("mass_flow", "throat_area", "throat_diameter", "characteristic_velocity"):
        yield from state_conditions(nozzle, "throat")
    elif link.kind == "performance" or name in ("exit_area", "exit_diameter", "area_ratio", "exit_pressure"):
        yield from state_conditions(nozzle, "exit")


def _chamber_conditions(chamber: Any, name: str) -> Iterator[Step]:
    held = chamber.held
    face = held.injector
    yield condition(
        "enthalpy", "enthalpy at the injector face [J/kg]", "enthalpy of the products = enthalpy of the propellants",
        r"\sum_j n_j H_j(T) = h", float(face.enthalpy[0]), float(held.enthalpy[0]), "conservation",
        scale=float(face.gas_constant[0] * face.temperature[0]),
    )  # fmt: skip
    yield from element_conditions(held.table.elements, held.atoms[0], face.amounts[0] @ held.table.composition)
    if name == "characteristic_velocity":
        throat = held.throat
        if abs(float(throat.mach[0]) - 1.0) < AT_SONIC:
            yield condition(
                "mach",
                "Mach number at the throat",
                "u = a",
                "u_t = a_t",
                float(throat.velocity[0]),
                float(throat.sound_speed[0]),
                "conservation",
            )
        flux = float(held.stagnation.pressure[0]) / float(throat.mass_flux[0])
        yield condition(
            "cstar",
            "characteristic velocity [m/s]",
            "c* = p0 / (rho u) at the throat",
            r"c^{*} = p_0 / (\rho u)_t",
            chamber.si(name),
            flux,
            "definition",
        )
    if np.isfinite(held.contraction_ratio[0]) and name in (
        "stagnation_pressure",
        "pressure",
        "characteristic_velocity",
    ):
        yield from _combustor_conditions(held)


def _gas_conditions(chamber: Any, name: str) -> Iterator[Step]:
    """Yield what the results of a gas given outright satisfy."""
    held = chamber.held
    exponent, rest = float(held.isentropic_exponent[0]), float(held.stagnation_pressure[0])
    if name == "characteristic_velocity":
        closed = float(ideal_nozzle.characteristic_velocity(chamber.si("temperature"), chamber.si("gas_constant"), exponent))
        yield condition(
            "cstar", "characteristic velocity [m/s]", "c* = sqrt(R T0) over the choked mass flux function of the exponent",
            r"c^{*} = \sqrt{R T_0} / \Gamma(\gamma)", chamber.si(name), closed, "sutton-biblarz",
        )  # fmt: skip
    if name not in ("stagnation_pressure", "pressure"):
        return
    ratio, face = float(held.contraction_ratio[0]), float(held.injector_pressure[0])
    if not np.isfinite(ratio):
        text = "p0 = pressure of the gas at rest in a wide chamber"
        yield condition("stagnation_pressure", "stagnation pressure [Pa]", text, r"p_0 = p_c", rest, face, "definition")
        return
    mach = float(gas_dynamics.mach_from_area_ratio(ratio, exponent, "subsonic"))
    static = rest * float(gas_dynamics.pressure_ratio(mach, exponent))
    yield condition(
        "combustor_momentum", f"momentum from the face to the nozzle inlet, at Mach {mach:.5g} [Pa]", "p (1 + g M^2) = p at the face",
        r"p (1 + \gamma M^2) = p_{inj}", static * (1.0 + exponent * mach**2), face, "conservation",
    )  # fmt: skip


def _combustor_conditions(held: Any) -> Iterator[Step]:
    inlet, velocity = held.inlet, float(held.inlet_velocity[0])
    density, pressure = float(inlet.density[0]), float(inlet.pressure[0])
    face = float(held.injector.pressure[0])
    yield condition(
        "combustor_momentum",
        "momentum from the face to the nozzle inlet [Pa]",
        "p + rho u^2 = p at the face",
        r"p + \rho u^2 = p_{inj}",
        pressure + density * velocity**2,
        face,
        "conservation",
    )
    rest = float(inlet.enthalpy[0]) + 0.5 * velocity**2
    scale = float(inlet.gas_constant[0] * inlet.temperature[0])
    yield condition(
        "combustor_energy",
        "energy from the face to the nozzle inlet [J/kg]",
        "h + u^2/2 = h at the face",
        r"h + u^2/2 = h",
        rest,
        float(held.enthalpy[0]),
        "conservation",
        scale,
    )
    flux = float(held.throat.mass_flux[0])
    yield condition(
        "combustor_mass",
        "mass flow over throat area [kg/(m2 s)]",
        "rho u at the inlet times the contraction ratio = rho u at the throat",
        r"\rho u \epsilon_c = (\rho u)_t",
        density * velocity * float(held.contraction_ratio[0]),
        flux,
        "conservation",
    )


def state_conditions(nozzle: Any, state: str) -> Iterator[Step]:
    """Yield the conditions that a state of the nozzle satisfies."""
    held = nozzle.held
    there = getattr(held, state)
    isentrope = held.isentrope
    gas_constant = GAS_CONSTANT / float(there.molar_mass[0])
    rest = float(there.enthalpy[0]) + 0.5 * float(there.velocity[0]) ** 2
    scale = gas_constant * float(there.temperature[0])
    if state == "throat" and abs(float(there.mach[0]) - 1.0) < AT_SONIC:
        yield condition(
            "mach",
            "Mach number at the throat",
            "u = a",
            "u_t = a_t",
            float(there.velocity[0]),
            float(there.sound_speed[0]),
            "conservation",
        )
    if state == "exit":
        ratio = float(held.mass_flux[0] / there.mass_flux[0])
        yield condition(
            "area_ratio",
            "area ratio of the flow",
            "rho u at the throat over rho u at the exit = area ratio over discharge coefficient",
            r"(\rho u)_t / (\rho u)_e = \epsilon / C_d",
            ratio,
            float(held.area_ratio[0]),
            "conservation",
        )
    if isinstance(isentrope, Parallel):
        yield from _stream_conditions(held, there, state)
        return
    yield condition(
        "stagnation_enthalpy",
        f"energy at the {state} [J/kg]",
        "h + u^2/2 = stagnation enthalpy",
        r"h + u^2/2 = h_0",
        rest,
        float(isentrope.enthalpy[0]),
        "conservation",
        scale,
    )
    yield condition(
        "entropy",
        f"entropy at the {state} [J/(kg K)]",
        "s = entropy of the reservoir",
        r"s = s_0",
        float(there.entropy[0]),
        float(isentrope.entropy[0]),
        "conservation",
        gas_constant,
    )
    if held.table is not None and there.amounts is not None:
        chamber = nozzle.chamber.held
        yield from element_conditions(held.table.elements, chamber.atoms[0], there.amounts[0] @ held.table.composition)


def _stream_conditions(held: Any, there: Any, state: str) -> Iterator[Step]:
    """Yield the conditions of streams side by side: energy and entropy of each, and their areas together."""
    each, rest = held.streams_at(there), held.isentrope.streams
    shares = held.isentrope.shares[0]
    for place, name in enumerate(STREAMS):
        gas_constant = GAS_CONSTANT / float(each.molar_mass[place])
        yield condition(
            f"{name}_energy", f"energy of the {name} at the {state} [J/kg]", "h + u^2/2 = stagnation enthalpy", r"h + u^2/2 = h_0",
            float(each.enthalpy[place] + 0.5 * each.velocity[place] ** 2), float(rest.enthalpy[place]), "conservation",
            gas_constant * float(each.temperature[place]),
        )  # fmt: skip
        yield condition(
            f"{name}_entropy", f"entropy of the {name} at the {state} [J/(kg K)]", "s = entropy of the reservoir", r"s = s_0",
            float(each.entropy[place]), float(rest.entropy[place]), "conservation", gas_constant,
        )  # fmt: skip
    if not float(there.mass_flux[0]) > 0.0:
        return
    area = float((shares / (each.density * each.velocity)).sum())
    yield condition(
        "areas", f"area for a unit of mass flow at the {state} [m2 s/kg]", "sum of w/(rho u) over the streams = 1/(rho u)",
        r"\sum w/(\rho u) = 1/(\rho u)", area, 1.0 / float(there.mass_flux[0]), "conservation",
    )  # fmt: skip
