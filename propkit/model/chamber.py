"""The chamber: combustion at a pressure, or a gas given outright."""

from __future__ import annotations

import math
from collections.abc import Iterator
from typing import TYPE_CHECKING, Any

from propkit.chain import chamber as stage
from propkit.constants import GAS_CONSTANT
from propkit.errors import InputError, NotAvailableError, Problem
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
    as_text,
)
from propkit.model.doubts import Assumption, Doubt
from propkit.model.propellant_case import PropellantCase
from propkit.model.state import State
from propkit.physics import contour
from propkit.report import Section, UnitSystem
from propkit.series import Axis, Bars, Figure, Series

if TYPE_CHECKING:
    import pandas as pd

    from propkit.model.declare import NumberLike, QuantityLike

PRESSURE_PLACES = ("injector", "nozzle stagnation", "nozzle inlet static")
PRESSURES = Bounds(at_least=100.0, at_most=1e8)
CONTRACTIONS = Bounds(above=1.0, at_most=1e6)
EFFICIENCIES = Bounds(above=0.5, at_most=1.0)
_HINT_CONTRACTION = "It is chamber area over throat area; did you pass throat over chamber?"
_HINT_EFFICIENCY = "It is delivered over theoretical characteristic velocity."
COMPOSITION_SHOWN = 1e-5
_PLATEAU = (
    "at a phase transition the equilibrium heat capacity is undefined: the temperature stays while heat goes into melting or evaporation"
)
_NO_COMPOSITION_CHANGE = "the composition is given and does not follow equilibrium: the frozen heat capacity is the only one"


def read_case(name: str, value: Any) -> PropellantCase:
    """Return `value` when it is a propellant case."""
    if isinstance(value, PropellantCase):
        return value
    raise InputError(Problem(name, as_text(value), "a pk.PropellantCase", "Chain the objects: case, chamber, nozzle, performance."))


class Chamber(Calculation):
    """Combustion of a propellant case at a pressure, to chemical equilibrium.

    Parameters
    ----------
    case : PropellantCase
        The propellants upstream.
    pressure : quantity
        Quoted chamber pressure, absolute [Pa], 100 Pa to 100 MPa.
    pressure_at : str
        Where it holds: ``"injector"`` (default), ``"nozzle stagnation"`` or ``"nozzle inlet static"``.
    contraction_ratio : float
        Chamber area over throat area [1], above 1; infinite by default, and then all three readings agree.
    cstar_efficiency : float
        Delivered over theoretical characteristic velocity [1], above 0.5 and at most 1.
    characteristic_length : quantity, optional
        Chamber volume over throat area [m]: brings the stay time and, with a contraction ratio, the size of the chamber.
    name : str
        Title of the sheet.

    Raises
    ------
    InputError
        Listing every input that is wrong or missing.
    RangeError, ConvergenceError
        When the enthalpy has no temperature inside the data, or the equilibrium does not converge; the error carries the state.
    """

    kind = "chamber"
    title = "Chamber"
    upstream_input = "case"
    headline = ("temperature", "characteristic_velocity", "molar_mass")
    case: CustomInput = CustomInput(doc="the propellants upstream", reader=read_case, kw_only=False, quantity="name")
    pressure: QuantityInput = QuantityInput(doc="quoted chamber pressure, absolute", bounds=PRESSURES)
    pressure_at: ChoiceInput = ChoiceInput(doc="where the quoted pressure holds", choices=PRESSURE_PLACES, default=PRESSURE_PLACES[0])
    contraction_ratio: NumberInput = NumberInput(
        doc="chamber area over throat area",
        default=math.inf,
        bounds=CONTRACTIONS,
        hint=_HINT_CONTRACTION,
        infinite=True,
    )
    cstar_efficiency: NumberInput = NumberInput(
        doc="delivered over theoretical characteristic velocity",
        default=1.0,
        bounds=EFFICIENCIES,
        hint=_HINT_EFFICIENCY,
    )

    characteristic_length: QuantityInput = QuantityInput(
        doc="chamber volume over throat area", default=None, bounds=Bounds(above=0.0, at_most=100.0)
    )

    temperature = QuantityResult(relation="chamber_equilibrium", source="rn1037")
    characteristic_velocity = QuantityResult(relation="theoretical_characteristic_velocity", source="definition")
    stagnation_pressure = QuantityResult(relation="combustor_balance", source="conservation")
    molar_mass = QuantityResult(relation="chamber_equilibrium", source="rn1037")
    density = QuantityResult(relation="ideal_gas_density", source="definition")
    isentropic_exponent = NumberResult(relation="equilibrium_derivatives", source="rn1037")
    frozen_isentropic_exponent = NumberResult(relation="frozen_isentropic_exponent", source="definition")
    specific_heat = QuantityResult(relation="equilibrium_derivatives", source="rn1037")
    frozen_specific_heat = QuantityResult(relation="chamber_equilibrium", source="tm4513")
    gas_constant = QuantityResult(relation="gas_constant", source="definition")
    sound_speed = QuantityResult(relation="sound_speed", source="definition")
    stay_time = QuantityResult(relation="stay_time", source="sutton-biblarz")

    def _check(self, bad: set[str]) -> list[Problem]:
        if bad & {"case", "contraction_ratio"}:
            return []
        return list(self._values["case"].chamber_problems(self._values["contraction_ratio"]))

    def _calculate(self) -> Outcome:
        case: PropellantCase = self._values["case"]
        combustion = stage.combust(
            case.held.mixture,
            case.si("thermo_basis"),  # type: ignore[arg-type]
            pressure=self._values["pressure"],
            contraction_ratio=self._values["contraction_ratio"],
            pressure_at=self._values["pressure_at"],
        )
        combustion.raise_for_status(self.kind)
        face = combustion.injector
        results = {name: float(getattr(face, name)[0]) for name in stage.INJECTOR_RESULTS if math.isfinite(getattr(face, name)[0])}
        results["stagnation_pressure"] = float(combustion.stagnation.pressure[0])
        results["characteristic_velocity"] = float(combustion.characteristic_velocity[0])
        pressure = self._values["pressure"]
        if float(face.pressure[0]) == pressure or self._values["pressure_at"] != "injector":
            results["pressure"] = float(face.pressure[0])
        absent = {"specific_heat": _NO_COMPOSITION_CHANGE if combustion.held else _PLATEAU}
        self._stay(results, absent)
        doubts = (
            *(Doubt(text, code=code, about=about) for text, code, about in combustion.doubts()),
            *case.chamber_doubts(combustion),
        )
        return Outcome(results, absent, doubts, combustion)

    def _stay(self, results: dict[str, float], absent: dict[str, str]) -> None:
        """Add the stay time: the gas in a chamber volume L* At over the mass flow p0 At/(efficiency c*)."""
        length = self._values["characteristic_length"]
        if length is None:
            absent["stay_time"] = absent["characteristic_length"] = "the chamber has no size; give characteristic_length"
            return
        flux = results["stagnation_pressure"] / (self._values["cstar_efficiency"] * results["characteristic_velocity"])
        results["stay_time"] = float(contour.stay_time(length, results["density"], flux))

    # -- the gas given outright ----------------------------------------------------------------

    @classmethod
    def from_gas(
        cls,
        *,
        pressure: QuantityLike,
        temperature: QuantityLike,
        isentropic_exponent: NumberLike,
        molar_mass: QuantityLike | None = None,
        gas_constant: QuantityLike | None = None,
        contraction_ratio: NumberLike = math.inf,
        pressure_at: str = "injector",
        cstar_efficiency: NumberLike = 1.0,
        characteristic_length: QuantityLike | None = None,
        name: str = "",
    ) -> GasChamber:
        """Return a chamber of a gas with given properties: constant-property flow only.

        Parameters
        ----------
        pressure, temperature : quantity
            Absolute pressure [Pa] and stagnation temperature [K].
        isentropic_exponent : float
            Ratio of heat capacities [1], above 1 and at most 2.
        molar_mass, gas_constant : quantity
            One of the two: mass per amount [kg/mol], or specific gas constant [J/(kg K)].
        contraction_ratio, pressure_at, cstar_efficiency, characteristic_length, name
            As for `Chamber`.
        """
        optional: dict[str, Any] = {
            "molar_mass": molar_mass,
            "gas_constant": gas_constant,
            "contraction_ratio": None if contraction_ratio == math.inf else contraction_ratio,
            "pressure_at": None if pressure_at == "injector" else pressure_at,
            "cstar_efficiency": None if cstar_efficiency == 1.0 else cstar_efficiency,
            "characteristic_length": characteristic_length,
            "name": name or None,
        }
        given: dict[str, Any] = {key: value for key, value in optional.items() if value is not None}
        return GasChamber(pressure=pressure, temperature=temperature, isentropic_exponent=isentropic_exponent, **given)

    @property
    def flows(self) -> tuple[str, ...]:
        """The flow models that a nozzle of this chamber can have, the default first."""
        return self._values["case"].flows  # type: ignore[no-any-return]

    @property
    def flow_reason(self) -> str:
        """Why other flow models are refused."""
        return self._values["case"].flow_reason  # type: ignore[no-any-return]

    @property
    def freezes_late(self) -> bool:
        """Whether the composition may freeze at the throat or beyond, instead of at the nozzle inlet."""
        case = self.case_or_none
        return case is not None and case.freezes_late

    @property
    def chooses_exponent(self) -> bool:
        """Whether constant-property flow has an equilibrium and a frozen exponent to choose from."""
        return "shifting" in self.flows

    @property
    def case_or_none(self) -> PropellantCase | None:
        """The propellant case, or None for a gas given outright."""
        return self.upstream  # type: ignore[return-value]

    @property
    def composition(self) -> pd.Series[float]:
        """Mole fractions at the injector face, the largest first (Series by species)."""
        import pandas as pd

        pairs = self.held.composition()
        series = pd.Series(dict(pairs), name="composition", dtype=float)
        series.attrs["units"] = ""
        return series

    def states(self) -> tuple[State, ...]:
        """Return the states that belong to the chamber: the injector face, where it differs from the nozzle inlet."""
        return (self.lazily("injector", lambda: State("injector face", self.held.injector_values())),) if self._shows_face() else ()

    def _shows_face(self) -> bool:
        return math.isfinite(self._values["contraction_ratio"])

    def subtitle(self) -> str:
        """Return the pair and the pressure."""
        return f"{self.case.subtitle()}, {self._values['pressure'] / 1e6:.4g} MPa"

    def _own_assumptions(self) -> tuple[Assumption, ...]:
        return (self._values["case"].chamber_assumption(), *self._common_assumptions())

    def _common_assumptions(self) -> tuple[Assumption, ...]:
        ratio = self._values["contraction_ratio"]
        if math.isinf(ratio):
            text = "The chamber is wide (infinite contraction): gas is at rest at the nozzle inlet, so that all readings of the chamber pressure agree."
        else:
            text = f"Combustion at constant area (contraction ratio {ratio:g}) conserves mass, momentum and energy; the pressure holds at the {self._values['pressure_at']}."
        made = [Assumption("contraction", text, self.kind_of("contraction_ratio"), "mass_flow")]
        eta = self._values["cstar_efficiency"]
        text = (
            "Nothing is lost in the chamber (c* efficiency 1)."
            if eta == 1.0
            else f"Combustion delivers {eta:g} of the theoretical characteristic velocity."
        )
        made.append(Assumption("cstar-efficiency", text, self.kind_of("cstar_efficiency"), "mass_flow"))
        return tuple(made)

    def sections(self, system: UnitSystem) -> Iterator[Section]:
        """Yield what the case has to show, composition and assumptions."""
        yield from self.case.chamber_sections(self, system)
        pairs = [(name, value) for name, value in self.held.composition() if value >= COMPOSITION_SHOWN]
        yield sheet.composition_table(
            pairs, f"Mole fractions of {COMPOSITION_SHOWN:.5f} and above, at the injector face{self._over_all_moles()}."
        )
        yield sheet.assumption_section(self)

    def _over_all_moles(self) -> str:
        return ", over all moles, liquids and solids included" if self.held.table.condensed.any() else ""

    def figures(self, system: UnitSystem = "SI") -> tuple[Figure, ...]:
        """Return the largest mole fractions as bars."""
        pairs = self.held.composition()[:8]
        percent = tuple(100.0 * value for _, value in pairs)
        texts = tuple(f"{value:.2f} %" if value < 10.0 else f"{value:.1f} %" for value in percent)
        bars = Bars(tuple(name for name, _ in pairs), Series("mole fraction", percent, "percent", "x"), texts)
        alt = "Largest mole fractions: " + ", ".join(f"{name} {text}" for (name, _), text in zip(pairs, texts, strict=True))
        return (
            Figure(
                "composition",
                "Composition of the gas",
                alt,
                Axis("mole fraction", "percent", "x", low=0.0),
                Axis(""),
                (bars,),
            ),
        )


class GasChamber(Chamber):
    """A chamber of a gas with given properties; made by `Chamber.from_gas`. Constant-property flow only."""

    upstream_input = ""
    headline = ("temperature", "characteristic_velocity", "molar_mass")
    groups = (("molar_mass", "gas_constant"),)
    undeclared = ("case",)

    temperature: QuantityInput = QuantityInput(doc="stagnation temperature", bounds=Bounds(at_least=10.0, at_most=20_000.0))
    isentropic_exponent: NumberInput = NumberInput(doc="ratio of the heat capacities", bounds=Bounds(above=1.0, at_most=2.0))
    molar_mass: QuantityInput = QuantityInput(doc="mass per amount of gas", default=None, bounds=Bounds(at_least=1e-3, at_most=1.0))
    gas_constant: QuantityInput = QuantityInput(doc="specific gas constant", default=None, bounds=Bounds(at_least=8.0, at_most=8400.0))

    if not TYPE_CHECKING:

        @property
        def case(self) -> Any:
            """Raise: a gas given outright has no propellant case."""
            raise NotAvailableError("the chamber is of a gas given outright: it has no propellant case; pk.Chamber(case, ...) has one")

    def _check(self, bad: set[str]) -> list[Problem]:
        given = [name for name in self.groups[0] if name in self._typed]
        if len(given) == 2:
            return [
                Problem(
                    "molar_mass",
                    f"{self._typed['molar_mass']} beside a gas_constant",
                    "given alone",
                    "Give one of the two.",
                )
            ]
        if not given and not bad & set(self.groups[0]):
            return [Problem("molar_mass", "missing", "given, or gas_constant in its place", 'For example molar_mass="22 g/mol".')]
        return []

    def _calculate(self) -> Outcome:
        values = self._values
        gas_constant = values["gas_constant"] or GAS_CONSTANT / values["molar_mass"]
        combustion = stage.given_gas(
            pressure=values["pressure"],
            temperature=values["temperature"],
            gas_constant=gas_constant,
            isentropic_exponent=values["isentropic_exponent"],
            contraction_ratio=values["contraction_ratio"],
            pressure_at=values["pressure_at"],
        )
        combustion.raise_for_status(self.kind)
        face = combustion.injector_values()
        results = {
            "pressure": face["pressure"],
            "density": face["density"],
            "sound_speed": face["sound_speed"],
            "gas_constant": gas_constant,
            "molar_mass": values["molar_mass"] or GAS_CONSTANT / gas_constant,
            "frozen_specific_heat": combustion.specific_heat(),
            "stagnation_pressure": float(combustion.stagnation_pressure[0]),
            "characteristic_velocity": float(combustion.characteristic_velocity[0]),
        }
        reason = "the gas was given by its properties, without a composition; pk.Chamber(case, ...) computes it"
        absent = dict.fromkeys(("specific_heat", "frozen_isentropic_exponent", "composition"), reason)
        del results["frozen_specific_heat"]
        absent["frozen_specific_heat"] = reason
        self._stay(results, absent)
        return Outcome(results, absent, (), combustion)

    @property
    def flows(self) -> tuple[str, ...]:
        """The flow models that a nozzle of this chamber can have."""
        return ("constant-property",)

    @property
    def flow_reason(self) -> str:
        """Why other flow models are refused."""
        return "A gas given by its exponent has no composition to shift or freeze."

    def _code(self, names: Any) -> str:
        return super()._code(names).replace("pk.GasChamber(", "pk.Chamber.from_gas(", 1)

    @property
    def composition(self) -> pd.Series[float]:
        """Raise: the gas was given without a composition."""
        raise NotAvailableError(self._outcome.absent["composition"], name="composition")

    def subtitle(self) -> str:
        """Return the gas and the pressure."""
        return f"gas of exponent {self.si('isentropic_exponent'):.4g} at {self.si('temperature'):.5g} K, {self._values['pressure'] / 1e6:.4g} MPa"

    def _own_assumptions(self) -> tuple[Assumption, ...]:
        return (
            Assumption("given-gas", "Gas properties are given, not computed, and constant.", "given", "temperature"),
            *self._common_assumptions(),
        )

    def sections(self, system: UnitSystem) -> Iterator[Section]:
        """Yield the assumptions."""
        yield sheet.assumption_section(self)

    def figures(self, system: UnitSystem = "SI") -> tuple[Figure, ...]:
        """Return nothing: a gas without composition has no bars."""
        return ()
