"""The case of a cold gas: it expands as it is stored, without combustion."""

from __future__ import annotations

from collections.abc import Iterator
from typing import Any, ClassVar

import numpy as np

from propkit.bridge.basis import load_basis
from propkit.chain import case as stage
from propkit.chain import real_gas
from propkit.errors import Problem
from propkit.model import case_inputs, case_sheet
from propkit.model.base import Outcome
from propkit.model.conditions import condition
from propkit.model.declare import Bounds, CustomInput, QuantityInput, QuantityResult
from propkit.model.doubts import Assumption, Doubt
from propkit.model.monopropellant_case import _TWO_ONLY
from propkit.model.propellant import Propellant, as_propellant
from propkit.model.propellant_case import CaseArrays, PropellantCase
from propkit.report import Step, UnitSystem
from propkit.series import Figure

_NO_DENSITY = "the density of a gas rests on the pressure it is stored at; give tank_pressure"


class ColdGasCase(PropellantCase):
    """A gas that expands with the composition it is stored with; made by `PropellantCase.cold_gas`."""

    title = "Cold gas case"
    headline: ClassVar[tuple[str, ...]] = ("temperature", "bulk_density")
    groups: ClassVar[tuple[tuple[str, ...], ...]] = ()
    roles: ClassVar[tuple[str, ...]] = ("gas",)
    undeclared: ClassVar[tuple[str, ...]] = (*_TWO_ONLY, "condensed", "stoichiometric_mixture_ratio", "oxygen_balance")
    no_amount: ClassVar[str] = "it is a gas that does not burn"

    gas: CustomInput = CustomInput(doc="the gas that expands as it is, without combustion", reader=as_propellant, kw_only=False)
    temperature: QuantityInput = QuantityInput(
        doc="temperature of the gas as stored", default=None, bounds=Bounds(at_least=20.0, at_most=3000.0)
    )
    tank_pressure: QuantityInput = QuantityInput(
        doc="pressure at which the gas is stored; the bulk density rests on it",
        default=None,
        bounds=case_inputs.PRESSURES,
    )

    bulk_density = QuantityResult(source="as stored", doc="density of the gas in the tank")
    enthalpy = QuantityResult(source="definition", doc="enthalpy of the ideal gas at its temperature")

    def _check(self, bad: set[str]) -> list[Problem]:
        if "gas" in bad:
            return []
        row = self._values["gas"].row
        if row.phase != "gas":
            return [
                Problem(
                    "gas",
                    f"{row.name!r} (a {row.phase})",
                    "a gas",
                    'For example "GN2"; pk.propellants() lists the cold gases.',
                )
            ]
        if not row.gas_composition:
            hint = "A pk.Propellant of your own needs species=, the formula key of the gas in the species data."
            return [Problem("gas", repr(row.name), "a gas whose species are known", hint)]
        return []

    def _calculate(self) -> Outcome:
        propellant: Propellant = self._values["gas"]
        row = propellant.row
        if self._values["temperature"] is None:
            self._values["temperature"] = row.temperature
        temperature = self._values["temperature"]
        table = load_basis(str(self._values["thermo_basis"])).table(tuple(sorted(row.elements)))
        unknown = sorted(set(row.gas_composition) - set(table.names))
        if unknown:
            raise case_inputs.unknown_species(row.name, unknown)
        density, doubts = float("nan"), []
        if self._values["tank_pressure"] is not None:
            stored, words = propellant.stream(temperature, self._values["tank_pressure"], "gas")
            density = float(np.asarray(stored.density))
            doubts = [Doubt(word, code="stored-state", about="bulk_density") for word in words]
        mixture = stage.unreacted_gas(table, row.gas_composition, temperature, density)
        stream = stage.Stream(dict(zip(mixture.symbols, mixture.atoms[0].tolist(), strict=True)), float(mixture.enthalpy[0]), density)
        results: dict[str, float] = {}
        absent = dict.fromkeys((*_TWO_ONLY, *self.undeclared), self.no_amount)
        case_inputs.mixture_results(mixture, results, absent, _NO_DENSITY)
        results.pop("oxygen_balance", None)
        return Outcome(results, absent, tuple(doubts), CaseArrays(mixture, propellant=stream))

    def conditions(self, name: str) -> Iterator[Step]:
        """Yield the conditions that a result of the case satisfies."""
        if name == "enthalpy":
            total = stage.ideal_enthalpy(self._table(), self.held.mixture, self.si("temperature"))
            text, latex = "sum of n H(T) over the species = enthalpy", r"\sum n_j H_j(T) = h"
            yield condition(name, "enthalpy of a kilogram [J/kg]", text, latex, total, self.si(name), "tm4513")
        if name == "bulk_density":
            stored, _ = self._values["gas"].stream(self.si("temperature"), self.si("tank_pressure"), "gas")
            text, latex = "density as stored = bulk density", r"\rho(p, T) = \rho_b"
            yield condition(name, "density [kg/m3]", text, latex, float(np.asarray(stored.density)), self.si(name), "definition")

    def _table(self) -> Any:
        return load_basis(str(self.si("thermo_basis"))).table(self.held.mixture.symbols)

    # -- what objects downstream ask -------------------------------------------------------------

    def chamber_assumption(self) -> Assumption:
        """Return what a chamber assumes about this case."""
        text = f"The gas comes from the tank at {self.si('temperature'):.5g} K and is neither heated nor burnt."
        return Assumption("no-combustion", text, self.kind_of("temperature"), "temperature")

    def chamber_doubts(self, combustion: Any) -> Iterator[Doubt]:
        """Yield what taking the gas as ideal costs at the nozzle inlet."""
        pressure = float(combustion.stagnation.pressure[0])
        for text, code, about in real_gas.inlet_doubts(self._values["gas"].row, self.si("temperature"), pressure):
            yield Doubt(text, code=code, about=about)

    def flow_doubts(self, expansion: Any) -> Iterator[Doubt]:
        """Yield where along the nozzle the gas would condense, and what rests on its not doing so."""
        for text, code, about in real_gas.flow_doubts(self._values["gas"].row, expansion):
            yield Doubt(text, code=code, about=about)

    # -- display ---------------------------------------------------------------------------------

    def input_text(self, name: str) -> str:
        """Return the gas as its label."""
        return str(self._values[name].label)

    def shows_input(self, name: str) -> bool:
        """Show what was given, the temperature and the basis."""
        return name in self._typed or name in ("thermo_basis", "temperature")

    def subtitle(self) -> str:
        """Return the gas and its temperature."""
        return f"{self.gas.label}, cold gas at {self.si('temperature'):.5g} K"

    def _own_assumptions(self) -> tuple[Assumption, ...]:
        text = "An ideal gas of constant composition: heat capacity follows temperature, nothing condenses."
        return (case_sheet.basis_assumption(self), Assumption("ideal-gas", text, "method", "mass_flow"))

    def figures(self, system: UnitSystem = "SI") -> tuple[Figure, ...]:
        """Return the mole fractions of the gas as stored."""
        return (case_sheet.gas_figure(self._values["gas"].row.gas_composition),)

    @property
    def _constructor(self) -> str:
        return "pk.PropellantCase.cold_gas"
