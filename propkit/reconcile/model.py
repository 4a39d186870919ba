"""What the figures of an engine are in terms of the chain: levels, dump flow, burn time, both ambient conditions.

Chamber figures are those of the objects, with a thrust-coefficient efficiency on the vacuum thrust where it is freed.
Engine figures add what a dumped turbine flow makes: with the fraction f of the engine's flow that is dumped,
m_engine = m_chamber/(1 - f), F_engine = F_chamber + f m_engine g0 I_dump.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from typing import Any

import numpy as np
import numpy.typing as npt

from propkit import quantities
from propkit.constants import SEA_LEVEL_PRESSURE, STANDARD_GRAVITY
from propkit.errors import InputError, Problem, near_matches
from propkit.model import paths
from propkit.model.performance import Performance
from propkit.study.evaluation import ChainFunction, result_name, variable

Array = npt.NDArray[np.float64]

EXTRA_UNKNOWNS: dict[str, tuple[float, float, float]] = {
    "thrust_coefficient_efficiency": (1.0, 0.5, 1.2),
    "dump_flow_fraction": (0.0, 0.0, 0.5),
    "dump_specific_impulse": (0.0, 0.0, 1000.0),
    "burn_time": (1.0, 1e-6, 1e7),
}
"""Unknowns that are no inputs of the chain: first guess, low, high, in SI."""

LEVELLED = (
    "thrust",
    "thrust_vacuum",
    "thrust_sea_level",
    "specific_impulse",
    "specific_impulse_vacuum",
    "specific_impulse_sea_level",
    "effective_exhaust_velocity",
    "mass_flow",
    "total_impulse",
    "propellant_mass",
)
"""Figures that differ between chamber and engine where turbine gas is dumped."""

CHAMBER_ONLY = ("thrust_coefficient", "thrust_coefficient_vacuum", "oxidizer_mass_flow", "fuel_mass_flow")
"""Figures that this model knows for the chamber alone."""

OWN = (*LEVELLED, *CHAMBER_ONLY, "burn_time", *(name for name in EXTRA_UNKNOWNS if name != "burn_time"))
"""Figures computed here rather than read from the chain."""

_BASE = (
    "mass_flow",
    "thrust_vacuum",
    "ambient",
    "nozzle.exit_area",
    "nozzle.throat_area",
    "chamber.stagnation_pressure",
)


def figure_key(target: Performance, name: str) -> str:
    """Return what the model calls a figure that was given by `name`.

    Raises
    ------
    InputError
        For a name that is neither a figure of this model nor a path of the chain.
    """
    bare = name.removeprefix("performance.")
    if bare in OWN:
        if bare in ("oxidizer_mass_flow", "fuel_mass_flow") and not target.has(bare):
            raise InputError(Problem(name, "quoted", "left out: the gas has no mixture ratio"))
        return bare
    if bare == "characteristic_velocity":  # quoted c* is the delivered one
        return "nozzle.characteristic_velocity"
    if bare == "dump_mixture_ratio":
        raise InputError(Problem(name, "quoted", "left out", "Quote oxidizer and fuel flow at chamber level."))
    try:
        place = paths.resolve(target, name)
    except InputError as error:
        near = near_matches(bare, OWN)
        hint = f" Among the figures of an engine: {', '.join(near)}." if near else ""
        raise InputError(f"{error}{hint}", path=name) from None
    if place.is_input:
        return variable(target, place.path).path
    found = result_name(target, place.path)
    return found


def figure_quantity(target: Performance, key: str) -> quantities.Quantity:
    """Return the catalogue row of a figure."""
    if key in OWN:
        return quantities.quantity(key)
    if "." not in key:
        return quantities.quantity(key, target.kind)
    place = paths.resolve(target, key)
    return quantities.quantity(place.name.rpartition(".")[2], target.chain()[place.position].kind)


@dataclass(frozen=True)
class FigureModel:
    """Figures of an engine as a batch function of unknowns.

    Parameters
    ----------
    target : Performance
        The object.
    unknowns : tuple of str
        Paths of chain inputs and names of `EXTRA_UNKNOWNS` that vary.
    keys : tuple of (str, str)
        Figures wanted: key and level.
    fixed : mapping of str to float
        Values of the extra unknowns that do not vary.
    """

    target: Performance
    unknowns: tuple[str, ...]
    keys: tuple[tuple[str, str], ...]
    fixed: Mapping[str, float] = field(default_factory=dict)
    function: ChainFunction = field(init=False, repr=False, compare=False)

    def __post_init__(self) -> None:
        chain = tuple(path for path in self.unknowns if path not in EXTRA_UNKNOWNS)
        wanted = [key for key, _ in self.keys if key not in OWN and key not in chain]
        mixed = ["oxidizer_mass_flow", "fuel_mass_flow"] if self.target.has("oxidizer_mass_flow") else []
        results = tuple(dict.fromkeys([*_BASE, *mixed, *wanted]))
        object.__setattr__(self, "function", ChainFunction(self.target, chain, results))

    def __call__(self, inputs: Mapping[str, Array]) -> dict[str, Array]:
        """Return the figures by ``key at level`` (see `name_of`)."""
        chain = {path: values for path, values in inputs.items() if path not in EXTRA_UNKNOWNS}
        count = len(next(iter(inputs.values())))
        if chain:
            base: dict[str, Any] = dict(self.function(chain))
        else:
            base = {name: np.full(count, paths.value_of(self.target, name)) for name in self.function.results}
        extras = {name: inputs.get(name, self._extra(name)) for name in EXTRA_UNKNOWNS}
        found = {}
        for key, level in self.keys:
            values = _figure(key, level, base, extras) if key in OWN else base.get(key, chain.get(key))
            found[name_of(key, level)] = np.broadcast_to(np.asarray(values, dtype=np.float64), (count,))
        return found

    def _extra(self, name: str) -> float:
        return self.fixed.get(name, EXTRA_UNKNOWNS[name][0])


def name_of(key: str, level: str) -> str:
    """Return the name of a figure at a level among the results of the model."""
    return f"{key} at {level}"


def _figure(key: str, level: str, base: Mapping[str, Any], extras: Mapping[str, Any]) -> Any:
    """Return one figure of `OWN` at a level."""
    if key in extras:
        return extras[key]
    share = extras["dump_flow_fraction"] if level == "engine" else 0.0
    flow = base["mass_flow"] / (1.0 - share)
    back = {"sea_level": SEA_LEVEL_PRESSURE, "vacuum": 0.0}
    ending = next((word for word in back if key.endswith(word)), "")
    ambient = back[ending] if ending else base["ambient"]
    own = extras["thrust_coefficient_efficiency"] * base["thrust_vacuum"] - ambient * base["nozzle.exit_area"]
    force = own + share * flow * STANDARD_GRAVITY * extras["dump_specific_impulse"]
    if key.startswith("thrust_coefficient"):
        return own / (base["chamber.stagnation_pressure"] * base["nozzle.throat_area"])
    if key.startswith("thrust"):
        return force
    if key.startswith("specific_impulse"):
        return force / (flow * STANDARD_GRAVITY)
    if key == "effective_exhaust_velocity":
        return force / flow
    if key == "total_impulse":
        return force * extras["burn_time"]
    if key == "propellant_mass":
        return flow * extras["burn_time"]
    return flow if key == "mass_flow" else base[key]


def default_free(target: Performance, keys: Sequence[str]) -> tuple[str, ...]:
    """Return the inputs that quoted figures free: those quoted directly or through a figure of the same group.

    Efficiencies, the discharge coefficient and the mixture ratio are freed only when listed.
    """
    nozzle = target.nozzle
    held = ("cstar_efficiency", "discharge_coefficient", "mixture_ratio", "equivalence_ratio")
    expansion = [name for name in ("area_ratio", "exit_pressure") if name in nozzle.inputs]
    throat = [name for name in ("throat_diameter", "throat_area", "mass_flow", "thrust") if name in nozzle.inputs]
    lip = [name for name in ("exit_diameter", "exit_area") if name in nozzle.inputs]
    size = throat or lip
    outer = expansion or lip
    found: list[str] = []
    for key in keys:
        name = key.removeprefix("nozzle.")
        if key.startswith("nozzle.") and name in ("area_ratio", "exit_pressure", "exit_diameter", "exit_area"):
            found += [f"nozzle.{outer[0]}"]
        elif (key.startswith("nozzle.") and name in ("throat_diameter", "throat_area")) or key in (
            "mass_flow",
            "thrust",
            "nozzle.mass_flow",
            "nozzle.thrust",
        ):
            found += [f"nozzle.{size[0]}"]
        elif key == "burn_time":
            found.append(key)
        elif key not in OWN and key.rpartition(".")[2] not in held and "." in key:
            place = paths.resolve(target, key)
            if place.is_input and target.chain()[place.position].given_or_result(place.name) is not None:
                found.append(place.path)
    if any(key in ("propellant_mass", "total_impulse") for key in keys):
        found.append("burn_time")
    return tuple(dict.fromkeys(found))
