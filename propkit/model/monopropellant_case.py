"""The case of one propellant: a monopropellant that decomposes, or a mixture that burns as one stream."""

from __future__ import annotations

from collections.abc import Iterator
from typing import ClassVar

import numpy as np

from propkit.chain import case as stage
from propkit.chain import chamber as chamber_stage
from propkit.data import propellants as library
from propkit.errors import Problem
from propkit.model import case_inputs
from propkit.model.base import Outcome
from propkit.model.conditions import condition
from propkit.model.declare import Bounds, CustomInput, NumberInput, QuantityInput, QuantityResult
from propkit.model.doubts import Assumption, Doubt
from propkit.model.propellant import Propellant, as_propellant
from propkit.model.propellant_case import CaseArrays, PropellantCase
from propkit.report import Step

_TWO_ONLY = (
    "oxidizer", "fuel", "mixture_ratio", "equivalence_ratio", "mixture_ratio_by_volume", "oxidizer_percent", "oxidizer_temperature",
    "fuel_temperature", "oxidizer_pressure", "fuel_pressure", "additives",
)  # fmt: skip
TYPICAL_DISSOCIATION = 0.6
"""Ammonia dissociation that the price of full equilibrium is told against; common practice, no source."""
REFERENCE_PRESSURE = 1e6
"""Pressure at which a temperature is told where the case has none yet [Pa]; at held composition it does not matter."""


class MonopropellantCase(PropellantCase):
    """One propellant; made by `PropellantCase.monopropellant`."""

    title = "Monopropellant case"
    headline: ClassVar[tuple[str, ...]] = ("bulk_density", "enthalpy")
    groups: ClassVar[tuple[tuple[str, ...], ...]] = ()
    roles: ClassVar[tuple[str, ...]] = ("propellant",)
    undeclared: ClassVar[tuple[str, ...]] = (*_TWO_ONLY, "stoichiometric_mixture_ratio")
    no_amount: ClassVar[str] = "it has one propellant"

    propellant: CustomInput = CustomInput(doc="the propellant, or the mixture that burns as one", reader=as_propellant, kw_only=False)
    propellant_temperature: QuantityInput = QuantityInput(
        doc="temperature of the propellant as stored or fed", default=None, bounds=case_inputs.TEMPERATURES
    )
    propellant_pressure: QuantityInput = QuantityInput(
        doc="pressure of the propellant as stored or fed", default=None, bounds=case_inputs.PRESSURES
    )
    ammonia_dissociation: NumberInput = NumberInput(
        doc="hydrazine only: part of the ammonia that dissociates; full equilibrium unless given",
        default=None,
        bounds=Bounds(at_least=0.0, at_most=1.0),
        hint="0.4 to 0.7 is usual for a warm catalyst bed.",
    )

    bulk_density = QuantityResult(source="as stored", doc="density of the propellant as stored or fed")
    enthalpy = QuantityResult(relation="enthalpy_by_mass", source="definition")

    def _check(self, bad: set[str]) -> list[Problem]:
        if "propellant" in bad:
            return []
        propellant: Propellant = self._values["propellant"]
        problems = []
        problem = library.role_problem(propellant.label, propellant.roles, "monopropellant")
        if problem is not None:
            problems.append(Problem("propellant", problem.value, problem.allowed, problem.hint))
        given = self._values["ammonia_dissociation"]
        if given is not None and not _is_hydrazine(propellant):
            problems.append(
                Problem(
                    "ammonia_dissociation",
                    f"{given:g}",
                    "left out unless the propellant is hydrazine",
                    f"It is {propellant.label}.",
                )
            )
        if given is not None and self._values["condensed"]:
            problems.append(
                Problem(
                    "condensed",
                    "True",
                    "left out beside ammonia_dissociation",
                    "That composition is given, and all gas.",
                )
            )
        return problems

    def _calculate(self) -> Outcome:
        stream, words = self._stream("propellant")
        doubts = [Doubt(word, code="stored-state", about="propellant") for word in words]
        given = self._values["ammonia_dissociation"]
        propellant: Propellant = self._values["propellant"]
        if given is not None:
            mixture = stage.hydrazine_bed(stream, given, propellant.row.molar_mass)
        else:
            mixture = stage.one_stream(stream, condensed=self._values["condensed"])
        absent = dict.fromkeys(_TWO_ONLY, self.no_amount)
        absent["stoichiometric_mixture_ratio"] = self.no_amount
        results: dict[str, float] = {}
        unknown = f"the density of {propellant.label} is not known; give a pk.Propellant with density="
        case_inputs.mixture_results(mixture, results, absent, unknown)
        if given is None and _is_hydrazine(propellant):
            doubts.append(self._bed_doubt(stream, propellant))
        return Outcome(results, absent, tuple(doubts), CaseArrays(mixture, propellant=stream))

    def _bed_doubt(self, stream: stage.Stream, propellant: Propellant) -> Doubt:
        bed = stage.hydrazine_bed(stream, TYPICAL_DISSOCIATION, propellant.row.molar_mass)
        basis = str(self._values["thermo_basis"])
        held = chamber_stage.combust(bed, basis, pressure=REFERENCE_PRESSURE)
        free = chamber_stage.combust(stage.one_stream(stream), basis, pressure=REFERENCE_PRESSURE)
        temperatures = [float(found.injector.temperature[0]) for found in (free, held)]
        return Doubt(
            f"At full equilibrium nearly all ammonia dissociates ({temperatures[0]:.4g} K at 1 MPa); a catalyst bed leaves part of it. With "
            f"ammonia_dissociation={TYPICAL_DISSOCIATION:g} the gas is at {temperatures[1]:.4g} K.",
            code="ammonia",
            about="propellant",
        )

    def conditions(self, name: str) -> Iterator[Step]:
        """Yield the conditions that a result of the case satisfies."""
        row = self._values["propellant"].row
        stored = self.held.propellant.density
        if name == "bulk_density" and row.components and row.density_source != "as given":
            volume = sum(share / part.density for part, share in row.components) * row.density / float(stored)
            text, latex = "sum of w/rho over the ingredients = 1 / bulk density", r"\sum w/\rho = 1/\rho_b"
            yield condition(name, "volume of a kilogram [m3]", text, latex, volume, 1.0 / self.si(name), "definition")
        elif name == "bulk_density":
            text, latex = "density as stored = bulk density", r"\rho = \rho_b"
            yield condition(name, "density [kg/m3]", text, latex, float(stored), self.si(name), "definition")

    def input_text(self, name: str) -> str:
        """Return the propellant as its label."""
        return str(self._values[name].label)

    def shows_input(self, name: str) -> bool:
        """Show what was given, the basis, and whether liquids and solids may form where that is computed."""
        held = self._values["ammonia_dissociation"] is not None
        return name in self._typed or name == "thermo_basis" or (name == "condensed" and not held)

    def subtitle(self) -> str:
        """Return the propellant, and its ammonia dissociation where it was given."""
        given = self._values["ammonia_dissociation"]
        return str(self.propellant.label) + (f", ammonia dissociation {given:g}" if given is not None else "")

    def chamber_assumption(self) -> Assumption:
        """Return what a chamber assumes about this case."""
        given = self._values["ammonia_dissociation"]
        if given is None:
            return super().chamber_assumption()
        text = f"The bed decomposes hydrazine to a composition fixed by its ammonia dissociation, {given:g}, without heat loss."
        return Assumption("fixed-composition", text, "given", "temperature")

    def _own_assumptions(self) -> tuple[Assumption, ...]:
        made = super()._own_assumptions()
        if self._values["ammonia_dissociation"] is None:
            return made
        return tuple(entry for entry in made if entry.key != "no-condensation")

    @property
    def _constructor(self) -> str:
        return "pk.PropellantCase.monopropellant"


def _is_hydrazine(propellant: Propellant) -> bool:
    """Whether the atoms are those of N2H4 and nothing else."""
    elements = propellant.row.elements
    return set(elements) == {"H", "N"} and bool(np.isclose(elements["H"], 2.0 * elements["N"], rtol=1e-9))
