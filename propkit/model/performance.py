"""Performance: thrust, specific impulse and their ratios at an ambient condition."""

from __future__ import annotations

from collections.abc import Iterator
from typing import Any

import numpy as np

from propkit import quantities, units
from propkit.chain import performance as stage
from propkit.errors import Problem
from propkit.model import sheet
from propkit.model.ambient import Ambient, read_ambient
from propkit.model.base import Calculation, Outcome
from propkit.model.declare import CustomInput, NumberResult, QuantityResult
from propkit.model.doubts import Assumption, Doubt
from propkit.model.nozzle import Nozzle, read_nozzle
from propkit.physics import atmosphere, stoichiometry, thrust, waves
from propkit.report import Section, UnitSystem
from propkit.series import Axis, Figure, Line, Mark, Series


class Performance(Calculation):
    """What a nozzle delivers against an ambient pressure.

    Parameters
    ----------
    nozzle : Nozzle
        The nozzle.
    ambient : str or quantity
        ``"sea level"``, ``"vacuum"``, an absolute pressure, or a geometric altitude such as ``"12 km"``.
    name : str
        Title of the sheet.

    Raises
    ------
    InputError
        Listing every input that is wrong or missing.
    """

    kind = "performance"
    title = "Performance"
    upstream_input = "nozzle"
    headline = ("thrust", "specific_impulse", "mass_flow")

    nozzle: CustomInput = CustomInput(doc="the nozzle", reader=read_nozzle, kw_only=False, quantity="name")
    ambient: CustomInput = CustomInput(doc="surroundings: sea level, vacuum, a pressure or an altitude", reader=read_ambient)

    thrust = QuantityResult(relation="thrust", source="conservation")
    specific_impulse = QuantityResult(relation="specific_impulse", source="definition")
    mass_flow = QuantityResult(relation="mass_flow", source="conservation")
    thrust_coefficient = NumberResult(relation="thrust_coefficient", source="definition")
    effective_exhaust_velocity = QuantityResult(relation="effective_exhaust_velocity", source="definition")
    thrust_vacuum = QuantityResult(relation="thrust_vacuum", source="conservation")
    specific_impulse_vacuum = QuantityResult(relation="specific_impulse_vacuum", source="definition")
    thrust_coefficient_vacuum = NumberResult(relation="thrust_coefficient_vacuum", source="definition")
    oxidizer_mass_flow = QuantityResult(relation="oxidizer_mass_flow", source="definition")
    fuel_mass_flow = QuantityResult(relation="fuel_mass_flow", source="definition")
    density_impulse = QuantityResult(relation="density_impulse", source="definition")

    def _check(self, bad: set[str]) -> list[Problem]:
        if bad & {"nozzle", "ambient"}:
            return []
        ambient, pressure = self._values["ambient"].pressure, self._values["nozzle"].chamber.si("stagnation_pressure")
        if ambient < pressure:
            return []
        return [
            Problem(
                "ambient",
                f"{ambient:g} Pa",
                f"below the chamber's stagnation pressure, {pressure:g} Pa",
                "Nothing would flow out.",
            )
        ]

    def _calculate(self) -> Outcome:
        nozzle: Nozzle = self._values["nozzle"]
        ambient: Ambient = self._values["ambient"]
        arrays = stage.deliver(
            mass_flow=nozzle.si("mass_flow"),
            exit_velocity=nozzle.exit.si("velocity"),
            exit_pressure=nozzle.exit.si("pressure"),
            exit_area=nozzle.si("exit_area"),
            throat_area=nozzle.si("throat_area"),
            stagnation_pressure=nozzle.chamber.si("stagnation_pressure"),
            ambient=ambient.pressure,
            cstar_efficiency=nozzle.chamber.si("cstar_efficiency"),
        )
        results = {name: float(getattr(arrays, name)) for name in stage.Delivery.__slots__}
        results["mass_flow"] = nozzle.si("mass_flow")
        results["ambient"] = ambient.pressure
        absent = {}
        case = nozzle.chamber.case_or_none
        if case is not None and case.has("mixture_ratio"):
            ratio = case.si("mixture_ratio")
            results["oxidizer_mass_flow"] = float(stoichiometry.mix(ratio, results["mass_flow"], 0.0))
            results["fuel_mass_flow"] = float(stoichiometry.mix(ratio, 0.0, results["mass_flow"]))
        else:
            absent["oxidizer_mass_flow"] = absent["fuel_mass_flow"] = (
                "the gas has no mixture ratio: it is not made from an oxidizer and a fuel"
            )
        if case is not None and case.has("bulk_density"):
            results["density_impulse"] = float(
                thrust.density_impulse(results["specific_impulse"], case.si("bulk_density"))
            )
        else:
            absent["density_impulse"] = "the bulk density of the propellants is not known"
        return Outcome(results, absent, tuple(self._doubts(results, nozzle, ambient.pressure)))

    def _doubts(self, results: dict[str, float], nozzle: Nozzle, ambient: float) -> Iterator[Doubt]:
        exit_state = nozzle.exit
        if results["thrust"] < 0.0:
            yield Doubt(
                "The thrust is negative: the surroundings push harder than the jet; the nozzle cannot run like this.",
                code="negative-thrust",
                about="thrust",
            )
        shock = 0.0
        if exit_state.si("mach") > 1.0:
            shock = exit_state.si("pressure") * float(
                waves.shock_pressure_ratio(exit_state.si("mach"), exit_state.si("isentropic_exponent"))
            )
            if ambient > shock:
                yield Doubt(
                    f"The ambient pressure exceeds the {shock / 1e3:.4g} kPa that a normal shock at the lip sustains: the nozzle does not flow full and the value is not delivered.",
                    code="shock-inside",
                    about="thrust",
                )
        if ambient > 0.0 and exit_state.si("pressure") < self.separation_limit * ambient:
            yield Doubt(
                f"Separation is likely: the exit pressure is {exit_state.si('pressure') / ambient:.3g} of the ambient pressure (below about "
                f"{self.separation_limit:g}, Summerfield et al. 1954). The thrust is the full-flowing value.",
                code="separation",
                about="thrust",
            )

    separation_limit = 0.4
    """Exit pressure over ambient pressure below which separation is to be expected (Summerfield et al. 1954: 0.4)."""

    @property
    def delivered_velocity(self) -> float:
        """Delivered velocity at the exit [m/s]: the ideal one times the c* efficiency."""
        return float(self.nozzle.exit.si("velocity") * self.nozzle.chamber.si("cstar_efficiency"))

    @property
    def chamber(self) -> Any:
        """The chamber upstream."""
        return self.nozzle.chamber

    @property
    def case(self) -> Any:
        """The propellant case upstream."""
        return self.nozzle.chamber.case

    def _shown_input(self, name: str, value: Any) -> Any:
        return units.quantity(value, "Pa") if name == "ambient" else value

    def input_text(self, name: str) -> str:
        """Return the ambient condition in words."""
        return str(self._values["ambient"].text)

    def subtitle(self) -> str:
        """Return the nozzle and the ambient condition."""
        return f"{self.nozzle.subtitle()}, at {self._values['ambient'].text}"

    def _own_assumptions(self) -> tuple[Assumption, ...]:
        return (
            Assumption(
                "full-flow", "The nozzle flows full; separation is warned of, not modelled.", "method", "thrust"
            ),
            Assumption(
                "one-dimensional",
                "One-dimensional flow: no divergence, friction or kinetic loss is taken off.",
                "default",
                "specific_impulse",
            ),
        )

    def cross_check(self) -> Any:
        """Return an independent solution of chamber, throat and exit by Cantera's own solver, with the differences.

        Raises
        ------
        NotAvailableError
            With the reason, where the second engine does not apply.
        """
        from propkit.model import crosscheck

        return self.lazily("cross_check", lambda: crosscheck.cross_check(self))

    def sections(self, system: UnitSystem) -> Iterator[Section]:
        """Yield stations, composition, assumptions and the check by the second engine."""
        from propkit.model import crosscheck

        yield from self.nozzle.flow_sections(system)
        yield sheet.assumption_section(self)
        yield Section("checks", "Checks", lines=(crosscheck.one_line(self),))

    def figures(self, system: UnitSystem = "SI") -> tuple[Figure, ...]:
        """Return thrust against altitude, with the ambient condition marked."""
        altitudes = np.linspace(0.0, 60e3, 61)
        pressures = atmosphere.pressure(altitudes)
        forces = self.si("thrust_vacuum") - pressures * self.nozzle.si("exit_area")
        row = quantities.quantity("thrust")
        unit = row.shown_in(system, forces.tolist())
        length = "km" if system == "SI" else "kft"
        scale = 1e3 if system == "SI" else 304.8
        shown = [units.convert(float(force), row.unit, unit) for force in forces]
        xs = tuple(float(altitude / scale) for altitude in altitudes)
        line = Line(Series("altitude", xs, length), Series("thrust", tuple(shown), unit, "F"), colour="accent")
        ambient: Ambient = self._values["ambient"]
        at = (
            ambient.altitude
            if ambient.altitude is not None
            else (
                60e3 if ambient.pressure <= pressures[-1] else float(atmosphere.altitude_of_pressure(ambient.pressure))
            )
        )
        mark = Mark(min(max(at, 0.0), 60e3) / scale, units.convert(self.si("thrust"), row.unit, unit), ambient.text)
        alt = f"Thrust against altitude: {shown[0]:.4g} {units.shown_unit(unit)} at sea level, {shown[-1]:.4g} at 60 km"
        return (
            Figure(
                "altitude",
                "Thrust against altitude",
                alt,
                Axis("altitude", length),
                Axis("thrust", unit, "F"),
                (line, mark),
            ),
        )
