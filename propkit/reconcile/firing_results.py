"""What a firing delivered, as a batch function of its measured means: c*, thrust coefficient, impulse, efficiencies."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Any

import numpy as np
import numpy.typing as npt

from propkit.constants import STANDARD_GRAVITY
from propkit.model.performance import Performance
from propkit.physics import thrust
from propkit.study.evaluation import ChainFunction

Array = npt.NDArray[np.float64]

PRESSURE, THROAT, THRUST, FLOW = "chamber.pressure", "throat_diameter", "thrust", "mass_flow"
OXIDIZER, FUEL, AMBIENT = "oxidizer_mass_flow", "fuel_mass_flow", "ambient"

REFERENCES = {"shifting": "shifting", "frozen": "frozen", "constant-property": "constant_property"}
"""Flow model of a reference -> how it ends the names of efficiencies."""


@dataclass(frozen=True)
class DeliveredFunction:
    """Delivered results and efficiencies as a batch function of measured means.

    Parameters
    ----------
    target : Performance
        Geometry and propellants; its efficiencies are left out of the references.
    inputs : tuple of str
        Measured means that come in: chamber pressure, flows, thrust, ambient pressure, hot throat diameter.

    Notes
    -----
    c* = p0 At/m', CF = F/(p0 At), Isp = F/(m' g0), with p0 the stagnation pressure at the nozzle inlet that the model
    gives for the measured chamber pressure, and At the hot throat. References: complete combustion and ideal flow at the
    measured pressure, mixture ratio and ambient pressure, exit area over the hot throat area.
    """

    target: Performance
    inputs: tuple[str, ...]
    ideal: dict[str, ChainFunction] = field(init=False, repr=False, compare=False)
    exit_area: float = field(init=False, repr=False, compare=False)

    def __post_init__(self) -> None:
        target = self.target
        exit_area = target.nozzle.si("exit_area")
        ideal = target.replace(
            {
                "chamber.cstar_efficiency": 1.0,
                "nozzle.discharge_coefficient": 1.0,
                "nozzle.area_ratio": target.nozzle.si("area_ratio"),
                "nozzle.throat_diameter": target.nozzle.si("throat_diameter"),
            }
        )
        paths = ["chamber.pressure", "nozzle.area_ratio", "performance.ambient"]
        if self.has_ratio:
            paths.append("case.mixture_ratio")
        wanted = (
            "nozzle.characteristic_velocity",
            "thrust_coefficient",
            "specific_impulse",
            "chamber.stagnation_pressure",
        )
        flows = ("shifting", "frozen") if "shifting" in target.nozzle.chamber.flows else ("constant-property",)
        functions = {}
        for flow in flows:
            changed = ideal if ideal.nozzle.si("flow") == flow else ideal.replace({"nozzle.flow": flow})
            functions[flow] = ChainFunction(changed, tuple(paths), wanted)
        object.__setattr__(self, "ideal", functions)
        object.__setattr__(self, "exit_area", exit_area)

    @property
    def has_ratio(self) -> bool:
        """Whether the mixture ratio is measured."""
        case = self.target.nozzle.chamber.case_or_none
        return OXIDIZER in self.inputs and FUEL in self.inputs and case is not None and case.has("mixture_ratio")

    @property
    def has_flow(self) -> bool:
        """Whether the mass flow is measured."""
        return FLOW in self.inputs or (OXIDIZER in self.inputs and FUEL in self.inputs)

    def __call__(self, given: Mapping[str, Array]) -> dict[str, Array]:
        """Return the delivered results by name."""
        throat = np.asarray(thrust.circle_area(given[THROAT]))
        count = len(throat)
        case = self.target.nozzle.chamber.case_or_none
        chain: dict[str, Any] = {
            "chamber.pressure": given[PRESSURE],
            "nozzle.area_ratio": self.exit_area / throat,
            "performance.ambient": given.get(AMBIENT, np.full(count, self.target.si("ambient"))),
        }
        found: dict[str, Array] = {PRESSURE: np.array(given[PRESSURE]), "throat_area": throat}
        if self.has_ratio:
            found["mixture_ratio"] = chain["case.mixture_ratio"] = given[OXIDIZER] / given[FUEL]
        elif case is not None and case.has("mixture_ratio"):
            found["mixture_ratio"] = np.full(count, case.si("mixture_ratio"))
        ideals = {flow: function(chain) for flow, function in self.ideal.items()}
        rest = next(iter(ideals.values()))["chamber.stagnation_pressure"]
        if self.has_flow:
            found[FLOW] = given[FLOW] if FLOW in given else given[OXIDIZER] + given[FUEL]
            found["characteristic_velocity"] = rest * throat / found[FLOW]
        if THRUST in given:
            found[THRUST] = np.array(given[THRUST])
            found["thrust_coefficient"] = given[THRUST] / (rest * throat)
        if THRUST in given and self.has_flow:
            found["specific_impulse"] = given[THRUST] / (STANDARD_GRAVITY * found[FLOW])
        pairs = (
            ("characteristic_velocity", "nozzle.characteristic_velocity", "cstar_efficiency"),
            ("thrust_coefficient", "thrust_coefficient", "thrust_coefficient_efficiency"),
            ("specific_impulse", "specific_impulse", "specific_impulse_efficiency"),
        )
        for flow, ideal in ideals.items():
            for own, reference, name in pairs:
                if own in found:
                    found[f"{name}_{REFERENCES[flow]}"] = found[own] / ideal[reference]
        return found
