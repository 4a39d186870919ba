"""Performance: thrust, specific impulse and their ratios at an ambient condition."""

from __future__ import annotations

from collections.abc import Iterable, Iterator
from dataclasses import replace
from typing import TYPE_CHECKING, Any

import numpy as np

from propkit import quantities, units
from propkit.chain import performance as stage
from propkit.errors import Problem
from propkit.model import loss_sheet, operation
from propkit.model import losses as bookkeeping
from propkit.model import separation as criteria
from propkit.model.ambient import Ambient, read_ambient
from propkit.model.assumptions import Assumptions, priced
from propkit.model.base import Calculation, Outcome
from propkit.model.declare import Bounds, CustomInput, NumberResult, QuantityInput, QuantityResult
from propkit.model.doubts import Assumption, Doubt
from propkit.model.ideal import IdealPerformance, ideal_of
from propkit.model.losses import read_losses
from propkit.model.nozzle import Nozzle, read_nozzle
from propkit.physics import atmosphere, balances, thrust
from propkit.report import Section, UnitSystem
from propkit.series import Axis, Figure, Line, Mark, Series

if TYPE_CHECKING:
    from collections.abc import Sequence

    import pandas as pd

    from propkit.model.answer import Answer
    from propkit.model.declare import NumberLike, QuantityLike


class Performance(Calculation):
    """What a nozzle delivers against an ambient pressure.

    Parameters
    ----------
    nozzle : Nozzle
        The nozzle.
    ambient : str or quantity
        ``"sea level"``, ``"vacuum"``, an absolute pressure, or a geometric altitude such as ``"12 km"``.
    losses : mapping, optional
        What is lost beside the divergence of the contour and the c* efficiency of the chamber, by name (``"energy release"``,
        ``"kinetics"``, ``"boundary layer"``, ``"two-phase"``): the ratio of specific impulse after to before the loss at this
        ambient pressure (``0.985``), a decrement (``"3 s"``), ``"estimate"``, or a dict with ``ratio`` or ``decrement`` and
        ``source``. None by default.
    minimum_pressure : quantity, optional
        Lowest chamber pressure [Pa] at which the chamber is known to run; a lower one is refused.
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
    losses: CustomInput = CustomInput(doc="losses by name: Isp ratio, decrement or estimate", default=None, reader=read_losses)
    minimum_pressure: QuantityInput = QuantityInput(
        doc="lowest chamber pressure at which the chamber runs", default=None, bounds=Bounds(above=0.0, at_most=1e8)
    )

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
        chamber = self._values["nozzle"].chamber
        ambient, pressure = self._values["ambient"].pressure, chamber.si("stagnation_pressure")
        lowest, quoted = self._values["minimum_pressure"], chamber.si("pressure")
        problems = []
        if lowest is not None and quoted < lowest:
            hint = "Below its minimum pressure the chamber is not known to run: raise the pressure, or state another minimum."
            problems.append(Problem("chamber.pressure", f"{quoted:g} Pa", f"at least the minimum_pressure of {lowest:g} Pa", hint))
        if ambient < pressure:
            return problems
        return [
            *problems,
            Problem(
                "ambient",
                f"{ambient:g} Pa",
                f"below the chamber's stagnation pressure, {pressure:g} Pa",
                "Nothing would flow out.",
            ),
        ]

    def _calculate(self) -> Outcome:
        nozzle: Nozzle = self._values["nozzle"]
        ambient: Ambient = self._values["ambient"]
        divergence = nozzle.si("divergence_factor") if nozzle.has("divergence_factor") else 1.0
        resolved = bookkeeping.resolve(self._values["losses"] or bookkeeping.Requests(), nozzle, ambient.pressure)
        arrays = stage.deliver(
            mass_flow=nozzle.si("mass_flow"),
            exit_velocity=nozzle.exit.si("velocity"),
            exit_pressure=nozzle.exit.si("pressure"),
            exit_area=nozzle.si("exit_area"),
            throat_area=nozzle.si("throat_area"),
            stagnation_pressure=nozzle.chamber.si("stagnation_pressure"),
            ambient=ambient.pressure,
            cstar_efficiency=nozzle.chamber.si("cstar_efficiency"),
            divergence_factor=divergence,
            losses=resolved.ratios,
        )
        results = {name: float(getattr(arrays, name)) for name in stage.Delivery.__slots__}
        if "energy release" not in resolved.ratios:
            results["mass_flow"] = nozzle.si("mass_flow")
        results["ambient"] = ambient.pressure
        absent = {
            "losses": "no losses were given beside the c* efficiency and the contour",
            "minimum_pressure": "no minimum chamber pressure was stated",
        }
        case = nozzle.chamber.case_or_none
        if case is not None and case.has("mixture_ratio"):
            ratio = case.si("mixture_ratio")
            flow, added = results["mass_flow"], case.additive_fraction
            results["oxidizer_mass_flow"] = float(balances.oxidizer_mass_flow(flow, ratio, added))
            results["fuel_mass_flow"] = float(balances.fuel_mass_flow(flow, ratio, added))
        else:
            absent["oxidizer_mass_flow"] = absent["fuel_mass_flow"] = (
                "the gas has no mixture ratio: it is not made from an oxidizer and a fuel"
            )
        if case is not None and case.has("bulk_density"):
            results["density_impulse"] = float(thrust.density_impulse(results["specific_impulse"], case.si("bulk_density")))
        else:
            absent["density_impulse"] = "the bulk density of the propellants is not known"
        return Outcome(results, absent, tuple(self._doubts(results, nozzle, ambient.pressure, resolved)), resolved)

    def _doubts(self, results: dict[str, float], nozzle: Nozzle, ambient: float, resolved: bookkeeping.Resolved) -> Iterator[Doubt]:
        if results["thrust"] < 0.0:
            yield Doubt(
                "The thrust is negative: the surroundings push harder than the jet; the nozzle cannot run like this.",
                code="negative-thrust",
                about="thrust",
            )
        yield from criteria.doubts(nozzle, ambient)
        for name, words in resolved.estimates.items():
            yield Doubt(f"The {name} loss is an estimate: {words}.", code="estimate", about="specific_impulse")
        if "energy release" in resolved.ratios and "mass_flow" in nozzle.inputs:
            text = "The energy release raises the mass flow above the one that the nozzle was sized for; the chamber's cstar_efficiency would size the nozzle with it."
            yield Doubt(text, code="mass-flow-raised", about="mass_flow")

    # -- ideal and delivered ----------------------------------------------------------------------

    @property
    def resolved_losses(self) -> bookkeeping.Resolved:
        """The losses asked for as ratios, with sources and estimate marks."""
        return self._outcome.held  # type: ignore[no-any-return]

    @property
    def delivered_velocity(self) -> float:
        """Delivered axial velocity at the exit [m/s]: what the thrust leaves after the pressure term, over the mass flow."""
        push = (self.nozzle.exit.si("pressure") - self.si("ambient")) * self.nozzle.si("exit_area")
        return float((self.si("thrust") - push) / self.si("mass_flow"))

    @property
    def velocity_efficiency(self) -> float:
        """Delivered over ideal velocity at the exit [1]."""
        return self.delivered_velocity / float(self.nozzle.exit.si("velocity"))

    @property
    def ideal(self) -> IdealPerformance:
        """The loss-free values of the same nozzle: no c* efficiency, no divergence, no losses."""
        return self.lazily("ideal", lambda: ideal_of(self))

    @property
    def ledger(self) -> pd.DataFrame:
        """Losses from ideal to delivered in their order (DataFrame by loss): ratio, Isp lost, before and after [s], source."""
        return bookkeeping.frame(self)

    # -- separation and operation -----------------------------------------------------------------

    @property
    def separation(self) -> pd.DataFrame:
        """Three separation criteria side by side at the ambient pressure (DataFrame by criterion, SI)."""
        return self.lazily("separation", lambda: criteria.frame(self)).copy()

    @property
    def thrust_separated(self) -> Any:
        """Estimate of the thrust of the separated nozzle: the middle of what three criteria give."""
        return units.quantity(self.lazily("thrust_separated", lambda: criteria.separated_thrust(self)), "N")

    def altitude_profile(self) -> pd.DataFrame:
        """Return thrust and its ratios from sea level to 100 km in the standard atmosphere.

        Returns
        -------
        pandas.DataFrame
            Index altitude [m]; ambient pressure, full-flowing thrust, Isp and CF, how many of three criteria predict
            separation, whether the nozzle flows full (fewer than two do), and the area ratio whose exit pressure would be the
            ambient one. SI floats, units in ``attrs["units"]``.
        """
        return self.lazily("altitude_profile", lambda: operation.altitude_profile(self)).copy()

    def throttle_map(
        self,
        pressure: Sequence[QuantityLike] | QuantityLike | None = None,
        mixture_ratio: Sequence[NumberLike] | NumberLike | None = None,
        *,
        minimum_pressure: QuantityLike | None = None,
    ) -> Answer:
        """Return the performance of the same hardware over chamber pressures and mixture ratios, computed in one batch.

        Parameters
        ----------
        pressure : sequence of quantity, optional
            Chamber pressures [Pa]; 30 % to 100 % of this one by default.
        mixture_ratio : sequence of number, optional
            Mixture ratios [1]; this one by default.
        minimum_pressure : quantity, optional
            Lowest pressure at which the chamber runs [Pa], this performance's own by default; a lower one is refused.

        Returns
        -------
        Answer
            full_flow_pressure (below it the nozzle no longer flows full at sea level); `frame` with every case.
        """
        return operation.throttle_map(self, pressure, mixture_ratio, minimum_pressure)

    def burn(
        self,
        *,
        duration: QuantityLike | None = None,
        total_impulse: QuantityLike | None = None,
        ullage: NumberLike | None = None,
        residuals: NumberLike | None = None,
    ) -> Answer:
        """Return propellant masses and tank volumes of a steady burn.

        Parameters
        ----------
        duration, total_impulse : quantity
            One of the two: burning time [s], or impulse [N s].
        ullage, residuals : number, optional
            Share of the tank volume that is gas [1], 0.03 by default; share of the loaded propellant that is left [1], 0.01.

        Returns
        -------
        Answer
            Loaded masses, tank volumes, duration and total impulse.
        """
        return operation.burn(self, duration, total_impulse, ullage, residuals)

    @property
    def chamber(self) -> Any:
        """The chamber upstream."""
        return self.nozzle.chamber

    @property
    def case(self) -> Any:
        """The propellant case upstream."""
        return self.nozzle.chamber.case

    def _shown_input(self, name: str, value: Any) -> Any:
        if name == "losses":
            return dict(self.resolved_losses.ratios)
        return units.quantity(value, "Pa") if name == "ambient" else value

    def input_text(self, name: str) -> str:
        """Return the ambient condition or the losses in words."""
        return str(self._values[name].text)

    def typed_text(self, name: str) -> str:
        """Return an input as it was typed; losses as one line."""
        return self.input_text(name) if name == "losses" else super().typed_text(name)

    def subtitle(self) -> str:
        """Return the nozzle and the ambient condition."""
        place = self._values["ambient"].text
        return f"{self.nozzle.subtitle()}, {'in' if place == 'vacuum' else 'at'} {place}"

    def _own_assumptions(self) -> tuple[Assumption, ...]:
        made = [
            Assumption("full-flow", "The nozzle flows full; separation is warned of, not modelled.", "method", "thrust"),
        ]
        if self.nozzle.has("contour"):
            text = f"Divergence of the {self.nozzle.input_text('contour')} is taken off the momentum thrust."
            made.append(Assumption("one-dimensional", text, "given", "specific_impulse"))
        else:
            text = "One-dimensional flow: no divergence is taken off."
            made.append(Assumption("one-dimensional", text, "default", "specific_impulse"))
        if self._values["losses"]:
            text = f"Losses taken off: {self.input_text('losses')}."
            made.append(Assumption("losses", text, "given", "specific_impulse"))
        return tuple(made)

    @property
    def assumptions(self) -> Assumptions:
        """Assumptions that carry the numbers, each with what its alternatives would change; the largest first."""
        return self.lazily("assumptions", lambda: priced(self, tuple(self._stated(super(Performance, self).assumptions))))

    def _stated(self, listed: Iterable[Assumption]) -> Iterator[Assumption]:
        """Yield the assumptions; an energy release among the losses stands in for the chamber's c* efficiency."""
        for entry in listed:
            if entry.key == "cstar-efficiency" and "energy release" in self.resolved_losses.ratios:
                text = "The chamber's own c* efficiency stays 1: the energy release among the losses stands in for it."
                yield replace(entry, statement=text, origin="given")
            else:
                yield entry

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

        yield from self.assumptions.sections()
        if bookkeeping.worth_showing(self):
            yield loss_sheet.section(self, system)
        found = criteria.section(self, system)
        if found is not None:
            yield found
        yield from self.nozzle.flow_sections(system)
        yield Section("checks", "Checks", lines=(crosscheck.one_line(self),))

    def figures(self, system: UnitSystem = "SI") -> tuple[Figure, ...]:
        """Return the losses from ideal to delivered where there are any, and thrust against altitude."""
        drawn = (loss_sheet.figure(self),) if bookkeeping.worth_showing(self) else ()
        return (*drawn, self._altitude_figure(system))

    def _altitude_figure(self, system: UnitSystem) -> Figure:
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
            else (60e3 if ambient.pressure <= pressures[-1] else float(atmosphere.altitude_of_pressure(ambient.pressure)))
        )
        mark = Mark(min(max(at, 0.0), 60e3) / scale, units.convert(self.si("thrust"), row.unit, unit), ambient.text)
        alt = f"Thrust against altitude: {shown[0]:.4g} {units.shown_unit(unit)} at sea level, {shown[-1]:.4g} at 60 km"
        return Figure("altitude", "Thrust against altitude", alt, Axis("altitude", length), Axis("thrust", unit, "F"), (line, mark))
