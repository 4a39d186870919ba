"""The propellant case: which propellants, how much of each, in which state."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any, ClassVar

import numpy as np

from propkit.bridge import basis as bases
from propkit.chain import case as stage
from propkit.data import propellants as library
from propkit.errors import InputError, NotAvailableError, Problem
from propkit.model import case_inputs, case_sheet, sheet
from propkit.model.base import Calculation, Outcome
from propkit.model.case_kinds import CaseKinds
from propkit.model.conditions import condition
from propkit.model.declare import (
    ChoiceInput,
    CustomInput,
    FlagInput,
    NumberInput,
    NumberResult,
    QuantityInput,
    QuantityResult,
)
from propkit.model.doubts import Assumption, Doubt
from propkit.model.propellant import Propellant, as_propellant
from propkit.report import Section, Step, UnitSystem
from propkit.series import Figure

if TYPE_CHECKING:
    import pandas as pd


ROLES = ("oxidizer", "fuel")


@dataclass(frozen=True, slots=True, eq=False)
class CaseArrays:
    """What objects downstream continue from: the mixture (a batch of one) and the streams it is made of.

    Where core and film flow side by side, `mixture` has both, and `whole` what they are together.
    """

    mixture: stage.Mixture
    oxidizer: stage.Stream | None = None
    fuel: stage.Stream | None = None
    mixture_ratio: float = float("nan")
    additives: tuple[tuple[stage.Stream, float], ...] = ()
    propellant: stage.Stream | None = None
    whole: stage.Mixture | None = None

    def stream(self, role: str) -> stage.Stream:
        """Return the stream of a role."""
        found = getattr(self, "propellant" if role == "gas" else role)
        assert isinstance(found, stage.Stream)
        return found


class PropellantCase(CaseKinds, Calculation):
    """Two propellants and how much of each: atoms, enthalpy and bulk density per mass.

    Parameters
    ----------
    oxidizer, fuel : str, Propellant or mapping
        A library name (see `propkit.propellants`), a propellant of one's own, or several with their mass fractions.
    mixture_ratio, equivalence_ratio, mixture_ratio_by_volume, oxidizer_percent : float or text
        One of the four: oxidizer mass flow over fuel mass flow [1]; stoichiometric over actual mixture ratio [1]; oxidizer volume flow
        over fuel volume flow as stored [1]; oxidizer mass over the mass of both [percent].
    oxidizer_temperature, fuel_temperature : quantity, optional
        Temperature as stored or fed [K]; the library row's own by default.
    oxidizer_pressure, fuel_pressure : quantity, optional
        Pressure as stored or fed [Pa]; the library row's own by default.
    additives : mapping or sequence of pairs, optional
        Library name or propellant -> mass fraction of the whole propellant flow [1].
    condensed : bool
        Whether liquids and solids may form among the products; gases only by default.
    thermo_basis : str
        ``"tm4513+atct"`` (default) or ``"tm4513"``.
    name : str
        Title of the sheet.

    Raises
    ------
    InputError
        Listing every input that is wrong or missing.

    Notes
    -----
    `PropellantCase.monopropellant`, `PropellantCase.cold_gas` and `PropellantCase.with_film` make the other cases.

    Examples
    --------
    >>> import propkit as pk
    >>> case = pk.PropellantCase("LOX", "LCH4", mixture_ratio=3.4)
    >>> round(case.stoichiometric_mixture_ratio, 3)
    3.989
    """

    kind = "case"
    title = "Propellant case"
    headline: ClassVar[tuple[str, ...]] = ("mixture_ratio", "equivalence_ratio", "bulk_density")
    groups: ClassVar[tuple[tuple[str, ...], ...]] = (stage.AMOUNTS,)
    roles: ClassVar[tuple[str, ...]] = ROLES
    undeclared: ClassVar[tuple[str, ...]] = ()
    no_amount: ClassVar[str] = ""

    oxidizer: CustomInput = CustomInput(doc="propellant that supplies the oxidizing elements", reader=as_propellant, kw_only=False)
    fuel: CustomInput = CustomInput(doc="propellant that is burnt", reader=as_propellant, kw_only=False)
    mixture_ratio: NumberInput = NumberInput(doc="oxidizer mass flow over fuel mass flow", default=None, bounds=case_inputs.RATIOS)
    equivalence_ratio: NumberInput = NumberInput(
        doc="stoichiometric over actual mixture ratio; above 1 is fuel-rich", default=None, bounds=case_inputs.RATIOS
    )
    mixture_ratio_by_volume: NumberInput = NumberInput(
        doc="oxidizer volume flow over fuel volume flow, as stored", default=None, bounds=case_inputs.RATIOS
    )
    oxidizer_percent: NumberInput = case_inputs.PercentInput(
        doc="oxidizer mass flow over that of both propellants, in percent", default=None, bounds=case_inputs.PERCENTS
    )
    oxidizer_temperature: QuantityInput = QuantityInput(
        doc="temperature of the oxidizer as stored or fed", default=None, bounds=case_inputs.TEMPERATURES
    )
    fuel_temperature: QuantityInput = QuantityInput(
        doc="temperature of the fuel as stored or fed", default=None, bounds=case_inputs.TEMPERATURES
    )
    oxidizer_pressure: QuantityInput = QuantityInput(
        doc="pressure of the oxidizer as stored or fed", default=None, bounds=case_inputs.PRESSURES
    )
    fuel_pressure: QuantityInput = QuantityInput(doc="pressure of the fuel as stored or fed", default=None, bounds=case_inputs.PRESSURES)
    additives: CustomInput = CustomInput(
        doc="what is added, as mass fractions of the whole propellant flow",
        reader=case_inputs.read_additives,
        default=None,
    )
    condensed: FlagInput = FlagInput(doc="whether liquids and solids may form among the products", default=False)
    thermo_basis: ChoiceInput = ChoiceInput(doc="species data that the equilibrium rests on", choices=bases.BASES, default=bases.BASES[0])

    stoichiometric_mixture_ratio = NumberResult(relation="stoichiometric_mixture_ratio", source="common-practice")
    bulk_density = QuantityResult(relation="bulk_density", source="definition")
    oxygen_balance = NumberResult(relation="oxygen_balance", source="common-practice")
    enthalpy = QuantityResult(relation="mixture_enthalpy", source="definition")

    # -- checks and calculation ------------------------------------------------------------------

    def _check(self, bad: set[str]) -> list[Problem]:
        problems = []
        for role in self.roles:
            if role not in bad:
                propellant = self._values[role]
                problem = library.role_problem(propellant.label, propellant.roles, role)
                if problem is not None:
                    problems.append(problem)
        problems += case_inputs.amount_problems(self._typed, bad)
        return problems

    def _calculate(self) -> Outcome:
        streams, doubts = {}, []
        for role in self.roles:
            streams[role], words = self._stream(role)
            doubts += [Doubt(word, code="stored-state", about=role) for word in words]
        oxidizer, fuel = streams["oxidizer"], streams["fuel"]
        additives = []
        for propellant, share in self._values["additives"] or ():
            stream, words = propellant.stream(None, None, "")
            additives.append((stream, share))
            doubts += [Doubt(word, code="stored-state", about="additives") for word in words]
        ratio = self._ratio(oxidizer, fuel)
        mixture = stage.two_streams(oxidizer, fuel, ratio, additives, self._values["condensed"])
        results, absent = case_inputs.amount_results(stage.amounts_of(oxidizer, fuel, ratio))
        case_inputs.mixture_results(mixture, results, absent, self._unknown_density(streams))
        doubts += case_inputs.fuel_rich_doubts(results.get("equivalence_ratio"), mixture)
        held = CaseArrays(mixture, oxidizer, fuel, ratio, tuple(additives))
        return Outcome(results, absent, tuple(doubts), held)

    def _ratio(self, oxidizer: stage.Stream, fuel: stage.Stream) -> float:
        """Return the mixture ratio by mass from whatever was given."""
        name = next(name for name in stage.AMOUNTS if name in self._typed)
        ratio = float(stage.mixture_ratio_from(oxidizer, fuel, name, self._values[name]))
        if np.isfinite(ratio):
            return ratio
        reasons = {
            "equivalence_ratio": "It has no stoichiometric mixture; give mixture_ratio.",
            "mixture_ratio_by_volume": "A density is not known; give mixture_ratio, or a pk.Propellant with density=.",
        }
        raise InputError(Problem(name, str(self._typed[name]), "left out for this pair", reasons[name]))

    def _unknown_density(self, streams: Mapping[str, stage.Stream]) -> str:
        unknown = [role for role in self.roles if not np.isfinite(streams[role].density)]
        what = " and the ".join(unknown) or "additives"
        return f"the density of the {what} is not known; give a pk.Propellant with density="

    def _stream(self, role: str) -> tuple[stage.Stream, tuple[str, ...]]:
        propellant: Propellant = self._values[role]
        return propellant.stream(self._values[f"{role}_temperature"], self._values[f"{role}_pressure"], role)

    # -- what objects downstream ask -------------------------------------------------------------

    @property
    def flows(self) -> tuple[str, ...]:
        """The flow models that a nozzle can have with this case, the default first."""
        held = self.held.mixture.composition is not None
        return ("frozen", "constant-property") if held else ("shifting", "frozen", "constant-property")

    @property
    def whole(self) -> stage.Mixture:
        """Everything that flows as one mixture."""
        held: CaseArrays = self.held
        return held.mixture if held.whole is None else held.whole

    @property
    def freezes_late(self) -> bool:
        """Whether the composition may freeze at the throat or beyond, instead of at the nozzle inlet."""
        return "shifting" in self.flows

    @property
    def flow_reason(self) -> str:
        """Why other flow models are refused."""
        return "The composition of this gas is given and does not follow equilibrium." if len(self.flows) == 2 else ""

    @property
    def fixed_composition(self) -> pd.Series[float] | None:
        """Moles of each species per mass [mol/kg] where the composition is given instead of computed, else None."""
        composition = self.held.mixture.composition
        if composition is None:
            return None
        import pandas as pd

        series = pd.Series({name: float(value[0]) for name, value in composition.items()}, name="composition")
        series.attrs["units"] = "mol/kg"
        return series

    def chamber_assumption(self) -> Assumption:
        """Return what a chamber assumes about this case."""
        text = "Combustion reaches chemical equilibrium, without heat loss."
        return Assumption("equilibrium", text, "method", "temperature")

    def chamber_problems(self, contraction_ratio: float) -> Iterator[Problem]:
        """Yield what a chamber of this case cannot have."""
        return iter(())

    def chamber_sections(self, chamber: Any, system: UnitSystem) -> Iterator[Section]:
        """Yield what the sheet of a chamber shows of this case."""
        return iter(())

    def flow_sections(self, nozzle: Any, system: UnitSystem) -> Iterator[Section]:
        """Yield what the sheet of a nozzle shows of this case."""
        return iter(())

    def chamber_doubts(self, combustion: Any) -> Iterator[Doubt]:
        """Yield doubts of the case about a reservoir."""
        return iter(())

    def flow_doubts(self, expansion: Any) -> Iterator[Doubt]:
        """Yield doubts of the case about an expansion."""
        return iter(())

    @property
    def additive_fraction(self) -> float:
        """Mass of all additives over the whole mass."""
        return float(sum(share for _, share in self.held.additives))

    def relation_of(self, name: str) -> str:
        """Return the key of the written relation that gives a result of this recipe; empty where conditions say it."""
        given = [entry for entry in stage.AMOUNTS if entry in self._typed]
        if name == "mixture_ratio":
            return {
                "mixture_ratio_by_volume": "mixture_ratio_of_volumes",
                "oxidizer_percent": "mixture_ratio_of_percent",
            }.get(given[0], name)
        if name in ("enthalpy", "bulk_density") and self.held.additives:
            return ""
        entry = self.declared_results.get(name)
        return entry.relation if entry is not None else name

    def conditions(self, name: str) -> Iterator[Step]:
        """Yield the conditions that a result of the case satisfies, where it does not follow from a written relation."""
        if not self.held.additives:
            return
        parts = case_sheet.parts_of(self)
        if name == "bulk_density":
            volume = sum(share / float(stream.density) for _, _, stream, share in parts)
            text, latex = "sum of w/rho over the streams = 1 / bulk density", r"\sum w/\rho = 1/\rho_b"
            yield condition(name, "volume of a kilogram [m3]", text, latex, volume, 1.0 / self.si(name), "definition")
        if name == "enthalpy":
            total = sum(share * float(stream.enthalpy) for _, _, stream, share in parts)
            text, latex = "sum of w h over the streams = enthalpy", r"\sum w h_k = h"
            yield condition(name, "enthalpy of a kilogram [J/kg]", text, latex, total, self.si(name), "conservation")

    # -- beyond the declared ------------------------------------------------------------------

    def attribute(self, name: str) -> Any:
        """Return what reading the attribute `name` gives; NotAvailableError for an input that this kind of case does not have."""
        if name in self.undeclared:
            raise NotAvailableError(f"a case of this kind has no {name}: {self.no_amount}", name=name)
        if name == "additives":
            return {propellant.label: share for propellant, share in self._values[name] or ()}
        return super().attribute(name)

    @property
    def elements(self) -> pd.Series[float]:
        """Moles of atoms of each element per mass of propellant [mol/kg]."""
        import pandas as pd

        mixture = self.whole
        series = pd.Series(mixture.atoms[0].copy(), index=list(mixture.symbols), name="elements")
        series.attrs["units"] = "mol/kg"
        return series

    def recipe(self) -> dict[str, Any]:
        """Return a JSON-able mapping that rebuilds this case."""
        made = super().recipe()
        additives = self._typed.get("additives")
        if isinstance(additives, Mapping):
            made["inputs"]["additives"] = [
                [part.recipe() if isinstance(part, Propellant) else part, share] for part, share in additives.items()
            ]
        return made

    def subtitle(self) -> str:
        """Return the pair and its mixture ratio."""
        added = "".join(f", {100 * share:g} % {part.label}" for part, share in self._values["additives"] or ())
        return f"{self.oxidizer.label} / {self.fuel.label} at mixture ratio {self.si('mixture_ratio'):.4g}{added}"

    def input_text(self, name: str) -> str:
        """Return a propellant as its label, additives with their shares."""
        value = self._values[name]
        if name == "additives":
            return ", ".join(f"{part.label} {100.0 * share:.6g} %" for part, share in value or ())
        return str(value.label)

    def typed_text(self, name: str) -> str:
        """Return an input as it was typed, as text."""
        return self.input_text(name) if name == "additives" else super().typed_text(name)

    def shows_input(self, name: str) -> bool:
        """Show what was given, and always the basis and whether liquids and solids may form."""
        return name in self._typed or name in ("thermo_basis", "condensed")

    def _own_assumptions(self) -> tuple[Assumption, ...]:
        return case_sheet.assumptions(self)

    def cautions(self) -> tuple[str, ...]:
        """Hazard line of each propellant."""
        listed = [self._values[role] for role in self.roles] + [part for part, _ in self._values.get("additives") or ()]
        return tuple(dict.fromkeys(f"{part.label}: {part.hazard}" for part in listed if part.hazard))

    def sections(self, system: UnitSystem) -> Iterator[Section]:
        """Yield propellants, elements and assumptions."""
        yield case_sheet.propellant_section(self, system)
        yield case_sheet.element_section(self)
        yield sheet.assumption_section(self)

    def figures(self, system: UnitSystem = "SI") -> tuple[Figure, ...]:
        """Return the shares of the propellants by mass and, where densities are known, by volume."""
        return (case_sheet.share_figure(self),)
