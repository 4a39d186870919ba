"""The propellant case: which propellants, how much of each, in which state."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from propkit import units
from propkit.bridge import basis as bases
from propkit.chain import case as stage
from propkit.data import propellants as library
from propkit.errors import InputError, Problem
from propkit.model import sheet
from propkit.model.base import Calculation, Outcome
from propkit.model.declare import (
    Bounds,
    ChoiceInput,
    CustomInput,
    NumberInput,
    NumberResult,
    QuantityInput,
    QuantityResult,
)
from propkit.model.doubts import Assumption, Doubt
from propkit.model.propellant import Propellant, as_propellant
from propkit.report import Column, Section, Table, UnitSystem
from propkit.series import Axis, Bars, Figure, Series

if TYPE_CHECKING:
    import pandas as pd

ROLES = ("oxidizer", "fuel")
_TEMPERATURES = Bounds(at_least=1.0, at_most=3000.0)
_PRESSURES = Bounds(at_least=100.0, at_most=1e9)
_RATIOS = Bounds(at_least=1e-4, at_most=1e4)


@dataclass(frozen=True, slots=True, eq=False)
class CaseArrays:
    """What objects downstream continue from: the mixture (a batch of one) and the streams it is made of."""

    mixture: stage.Mixture
    oxidizer: stage.Stream | None = None
    fuel: stage.Stream | None = None
    mixture_ratio: float = float("nan")


class PropellantCase(Calculation):
    """Two propellants and their mixture ratio: atoms, enthalpy and bulk density per mass.

    Parameters
    ----------
    oxidizer, fuel : str or Propellant
        A library name (see `propkit.propellants`) or a propellant of one's own.
    mixture_ratio : float or text
        Oxidizer mass flow over fuel mass flow [1]; or `equivalence_ratio`, stoichiometric over actual mixture ratio.
    oxidizer_temperature, fuel_temperature : quantity, optional
        Temperature as stored or fed [K]; the library row's own by default.
    oxidizer_pressure, fuel_pressure : quantity, optional
        Pressure as stored or fed [Pa]; the library row's own by default.
    thermo_basis : str
        ``"tm4513+atct"`` (default) or ``"tm4513"``.
    name : str
        Title of the sheet.

    Raises
    ------
    InputError
        Listing every input that is wrong or missing.

    Examples
    --------
    >>> import propkit as pk
    >>> case = pk.PropellantCase("LOX", "LCH4", mixture_ratio=3.4)
    >>> round(case.stoichiometric_mixture_ratio, 3)
    3.989
    """

    kind = "case"
    title = "Propellant case"
    headline = ("mixture_ratio", "equivalence_ratio", "bulk_density")
    groups = (("mixture_ratio", "equivalence_ratio"),)

    oxidizer: CustomInput = CustomInput(doc="propellant that supplies the oxidizing elements", reader=as_propellant, kw_only=False)
    fuel: CustomInput = CustomInput(doc="propellant that is burnt", reader=as_propellant, kw_only=False)
    mixture_ratio: NumberInput = NumberInput(doc="oxidizer mass flow over fuel mass flow", default=None, bounds=_RATIOS)
    equivalence_ratio: NumberInput = NumberInput(
        doc="stoichiometric over actual mixture ratio; above 1 is fuel-rich", default=None, bounds=_RATIOS
    )
    oxidizer_temperature: QuantityInput = QuantityInput(
        doc="temperature of the oxidizer as stored or fed", default=None, bounds=_TEMPERATURES
    )
    fuel_temperature: QuantityInput = QuantityInput(doc="temperature of the fuel as stored or fed", default=None, bounds=_TEMPERATURES)
    oxidizer_pressure: QuantityInput = QuantityInput(doc="pressure of the oxidizer as stored or fed", default=None, bounds=_PRESSURES)
    fuel_pressure: QuantityInput = QuantityInput(doc="pressure of the fuel as stored or fed", default=None, bounds=_PRESSURES)
    thermo_basis: ChoiceInput = ChoiceInput(
        doc="species data that the equilibrium rests on", choices=bases.BASES, default=bases.BASES[0]
    )

    stoichiometric_mixture_ratio = NumberResult(relation="stoichiometric_mixture_ratio", source="common-practice")
    bulk_density = QuantityResult(relation="bulk_density", source="definition")
    enthalpy = QuantityResult(relation="mixture_enthalpy", source="definition")

    def _check(self, bad: set[str]) -> list[Problem]:
        problems = []
        for role in ROLES:
            if role not in bad:
                propellant = self._values[role]
                problem = library.role_problem(propellant.label, propellant.roles, role)
                if problem is not None:
                    problems.append(problem)
        given = [name for name in self.groups[0] if name in self._typed]
        if len(given) == 2:
            values = f"{self._typed[given[0]]} beside equivalence_ratio {self._typed[given[1]]}"
            problems.append(
                Problem("mixture_ratio", values, "given alone or left to equivalence_ratio", "Give one of the two.")
            )
        elif not given and not bad & set(self.groups[0]):
            problems.append(
                Problem(
                    "mixture_ratio",
                    "missing",
                    "given, or equivalence_ratio in its place",
                    "For example mixture_ratio=3.4.",
                )
            )
        return problems

    def _calculate(self) -> Outcome:
        streams, doubts = {}, []
        for role in ROLES:
            streams[role], words = self._stream(role)
            doubts += [Doubt(word, code="stored-state", about=role) for word in words]
        oxidizer, fuel = streams["oxidizer"], streams["fuel"]
        stoichiometric = float(stage.mixture_ratio_of(oxidizer, fuel, 1.0))
        results: dict[str, float] = {}
        absent: dict[str, str] = {}
        ratio = self._values["mixture_ratio"]
        if ratio is None:
            if not np.isfinite(stoichiometric):
                raise InputError(
                    Problem(
                        "equivalence_ratio",
                        str(self._typed["equivalence_ratio"]),
                        "left out for this pair",
                        "It has no stoichiometric mixture; give mixture_ratio.",
                    )
                )
            ratio = stoichiometric / self._values["equivalence_ratio"]
        mixture = stage.two_streams(oxidizer, fuel, ratio)
        results["mixture_ratio"] = ratio
        results["enthalpy"] = float(mixture.enthalpy[0])
        if np.isfinite(stoichiometric):
            results["stoichiometric_mixture_ratio"] = stoichiometric
            results["equivalence_ratio"] = stoichiometric / ratio
        else:
            absent["stoichiometric_mixture_ratio"] = absent["equivalence_ratio"] = (
                "the valences of this pair do not balance at any mixture ratio"
            )
        if np.isfinite(mixture.density[0]):
            results["bulk_density"] = float(mixture.density[0])
        else:
            unknown = [role for role in ROLES if not np.isfinite(streams[role].density)]
            absent["bulk_density"] = (
                f"the density of the {' and the '.join(unknown)} is not known; give a pk.Propellant with density="
            )
        return Outcome(results, absent, tuple(doubts), CaseArrays(mixture, oxidizer, fuel, ratio))

    def _stream(self, role: str) -> tuple[stage.Stream, tuple[str, ...]]:
        propellant: Propellant = self._values[role]
        return propellant.stream(self._values[f"{role}_temperature"], self._values[f"{role}_pressure"], role)

    # -- beyond the declared ------------------------------------------------------------------

    @property
    def elements(self) -> pd.Series[float]:
        """Moles of atoms of each element per mass of propellant [mol/kg]."""
        import pandas as pd

        mixture = self.held.mixture
        series = pd.Series(mixture.atoms[0].copy(), index=list(mixture.symbols), name="elements")
        series.attrs["units"] = "mol/kg"
        return series

    def subtitle(self) -> str:
        """Return the pair and its mixture ratio."""
        return f"{self.oxidizer.label} / {self.fuel.label} at mixture ratio {self.si('mixture_ratio'):.4g}"

    def input_text(self, name: str) -> str:
        """Return a propellant as its label."""
        return str(self._values[name].label)

    def shows_input(self, name: str) -> bool:
        """Show what was given, and the basis always."""
        return name in self._typed or name == "thermo_basis"

    def _own_assumptions(self) -> tuple[Assumption, ...]:
        basis = self.si("thermo_basis")
        made = [
            Assumption(
                "basis",
                f"Thermodynamic basis {basis}: {bases.load_basis(str(basis)).title}.",
                self.kind_of("thermo_basis"),
                "enthalpy",
            ),
            Assumption("ideal-gas", "Products are a mixture of ideal gases.", "method", "enthalpy"),
            Assumption(
                "no-condensation", "Products are gases only: no liquid or solid forms.", "default", "composition"
            ),
        ]
        for role in ROLES:
            propellant: Propellant = self._values[role]
            origin = "given" if f"{role}_temperature" in self._typed else "default"
            temperature = self._values[f"{role}_temperature"] or propellant.row.temperature
            made.append(
                Assumption(
                    f"{role}-state",
                    f"{role.capitalize()} {propellant.label} enters at {temperature:.5g} K.",
                    origin,
                    "enthalpy",
                )
            )
        return tuple(made)

    def cautions(self) -> tuple[str, ...]:
        """Hazard line of each propellant."""
        return tuple(
            f"{self._values[role].label}: {self._values[role].hazard}" for role in ROLES if self._values[role].hazard
        )

    def sections(self, system: UnitSystem) -> Iterator[Section]:
        """Yield propellants, elements and assumptions."""
        yield self._propellant_section(system)
        mixture = self.held.mixture
        columns = (Column("elements", "atoms", "b", "mol/kg", 6, tuple(float(value) for value in mixture.atoms[0])),)
        yield Section("elements", "Elements", table=Table("elements", "Elements", "element", mixture.symbols, columns))
        yield sheet.assumption_section(self)

    def _propellant_section(self, system: UnitSystem) -> Section:
        rows = [(role, self._values[role], getattr(self.held, role)) for role in ROLES]
        energy_unit = "kJ/kg" if system == "SI" else "Btu/pound"
        density_unit = "kg/m**3" if system == "SI" else "pound/foot**3"

        def density(stream: stage.Stream) -> float | None:
            known = bool(np.isfinite(stream.density))
            return units.convert(float(stream.density), "kg/m**3", density_unit) if known else None  # type: ignore[arg-type]

        columns = (
            Column("propellant", "propellant", "", "", 0, tuple(propellant.label for _, propellant, _ in rows)),
            Column("formula", "formula", "", "", 0, tuple(propellant.formula for _, propellant, _ in rows)),
            Column(
                "enthalpy",
                "enthalpy",
                "h",
                energy_unit,
                6,
                tuple(units.convert(float(s.enthalpy), "J/kg", energy_unit) for _, _, s in rows),
            ),
            Column("density", "density", r"\rho", density_unit, 4, tuple(density(s) for _, _, s in rows)),
            Column(
                "source", "source of the enthalpy", "", "", 0, tuple(propellant.source for _, propellant, _ in rows)
            ),
        )
        return Section(
            "propellants", "Propellants", table=Table("propellants", "Propellants", "stream", ROLES, columns)
        )

    def figures(self, system: UnitSystem = "SI") -> tuple[Figure, ...]:
        """Return the shares of both propellants by mass and, where densities are known, by volume."""
        ratio = self.si("mixture_ratio")
        labels = [self._values[role].label for role in ROLES]
        shares = [ratio / (1.0 + ratio), 1.0 / (1.0 + ratio)]
        categories = [f"{label}, mass" for label in labels]
        if self.has("bulk_density"):
            bulk = self.si("bulk_density")
            shares += [
                share * bulk / float(getattr(self.held, role).density)
                for share, role in zip(shares, ROLES, strict=True)
            ]
            categories += [f"{label}, volume" for label in labels]
        percent = tuple(100.0 * share for share in shares)
        texts = tuple(f"{value:.1f} %" for value in percent)
        bars = Bars(tuple(categories), Series("share", percent, "percent"), texts)
        alt = "Shares of the propellants: " + ", ".join(f"{c} {t}" for c, t in zip(categories, texts, strict=True))
        return (
            Figure(
                "shares", "Shares in the tanks", alt, Axis("share", "percent", low=0.0, high=100.0), Axis(""), (bars,)
            ),
        )
