"""The nozzle: expansion of the chamber gas, and the sizes that pass it."""

from __future__ import annotations

import os
from collections.abc import Iterator, Mapping
from pathlib import Path
from typing import TYPE_CHECKING, Any, Self

from propkit import units
from propkit.errors import InputError, Problem
from propkit.model import nozzle_calculation, nozzle_flow, nozzle_sizes, nozzle_states, sheet
from propkit.model import wall as wall_of_nozzle
from propkit.model.ambient import read_ambient
from propkit.model.base import Calculation, Outcome
from propkit.model.chamber import Chamber
from propkit.model.contour import read_contour
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
from propkit.model.doubts import Assumption
from propkit.model.nozzle_sizes import EXPANSIONS, read_chamber, read_freeze
from propkit.model.nozzle_sizes import SIZES as SIZES
from propkit.model.state import STATE_FIELDS, State
from propkit.report import Section, UnitSystem
from propkit.series import Figure

if TYPE_CHECKING:
    import pandas as pd

    from propkit.model.answer import Answer
    from propkit.model.contour import Contour
    from propkit.model.declare import NumberLike, QuantityLike

FLOWS = ("shifting", "frozen", "constant-property")
EXPONENTS = ("equilibrium", "frozen")
STATION_COLUMNS = (
    "pressure",
    "temperature",
    "density",
    "velocity",
    "mach",
    "sound_speed",
    "molar_mass",
    "isentropic_exponent",
    "enthalpy",
    "entropy",
)
_LENGTHS = Bounds(at_least=1e-5, at_most=100.0)
_AREAS = Bounds(at_least=1e-10, at_most=1e4)


def read_nozzle(name: str, value: Any) -> Nozzle:
    """Return `value` when it is a nozzle."""
    if isinstance(value, Nozzle):
        return value
    raise InputError(Problem(name, as_text(value), "a pk.Nozzle", "Chain the objects: case, chamber, nozzle, performance."))


class Nozzle(Calculation):
    """Expansion of the chamber gas through a throat to an exit, and its sizes.

    Parameters
    ----------
    chamber : Chamber
        The chamber upstream.
    area_ratio, exit_pressure : number, quantity
        One of the two says how far the gas expands: exit area over throat area [1], or static exit pressure [Pa].
    throat_diameter, throat_area, exit_diameter, exit_area, mass_flow, thrust : quantity
        One size; or one throat size with one exit size and nothing else. `thrust` goes with `sizing_ambient`.
    flow : str
        ``"shifting"``, ``"frozen"`` or ``"constant-property"``; the default is shifting, or constant-property where the
        chamber allows nothing else.
    freeze_at : str or float
        Frozen flow only: ``"chamber"`` (default, nozzle-inlet gas), ``"throat"`` or a supersonic area ratio.
    exponent : str
        Constant-property flow only: ``"equilibrium"`` (default) or ``"frozen"`` isentropic exponent of the reservoir.
    discharge_coefficient : float
        Effective over geometric throat area [1], above 0.5 and at most 1.
    contour : Cone or Bell, optional
        Shape of the wall: brings its measures, and the divergence loss to a performance.
    wall_thickness, wall_density : quantity
        Thickness [m] and density [kg/m3] of the wall, for its mass.
    name : str
        Title of the sheet.

    Raises
    ------
    InputError
        Listing every input that is wrong, missing or clashing.
    RangeError, ConvergenceError
        When the flow has no solution inside the data, or an iteration does not converge; the error carries the state.
    """

    kind = "nozzle"
    title = "Nozzle"
    upstream_input = "chamber"
    headline = ("mass_flow", "throat_diameter", "exit_diameter", "area_ratio")

    chamber: CustomInput = CustomInput(doc="the chamber upstream", reader=read_chamber, kw_only=False, quantity="name")
    area_ratio: NumberInput = NumberInput(
        doc="exit area over throat area",
        default=None,
        bounds=Bounds(at_least=1.0, at_most=1e4),
        hint="Did you pass throat over exit?",
    )
    exit_pressure: QuantityInput = QuantityInput(doc="static pressure at the exit", default=None, bounds=Bounds(at_least=0.1, at_most=1e8))
    throat_diameter: QuantityInput = QuantityInput(doc="geometric throat diameter", default=None, bounds=_LENGTHS)
    throat_area: QuantityInput = QuantityInput(doc="geometric throat area", default=None, bounds=_AREAS)
    exit_diameter: QuantityInput = QuantityInput(doc="geometric exit diameter", default=None, bounds=_LENGTHS)
    exit_area: QuantityInput = QuantityInput(doc="geometric exit area", default=None, bounds=_AREAS)
    mass_flow: QuantityInput = QuantityInput(doc="mass flow to be passed", default=None, bounds=Bounds(at_least=1e-9, at_most=1e6))
    thrust: QuantityInput = QuantityInput(
        doc="thrust to be delivered at sizing_ambient", default=None, bounds=Bounds(at_least=1e-6, at_most=1e9)
    )
    sizing_ambient: CustomInput = CustomInput(doc="surroundings at which the thrust is asked for", default=None, reader=read_ambient)
    flow: ChoiceInput = ChoiceInput(doc="how composition behaves in the nozzle", choices=FLOWS, default=None)
    freeze_at: CustomInput = CustomInput(doc="where the composition freezes, frozen flow only", default=None, reader=read_freeze)
    exponent: ChoiceInput = ChoiceInput(doc="isentropic exponent of constant-property flow", choices=EXPONENTS, default=None)
    discharge_coefficient: NumberInput = NumberInput(
        doc="effective over geometric throat area", default=1.0, bounds=Bounds(above=0.5, at_most=1.0)
    )
    contour: CustomInput = CustomInput(doc="shape of the wall: a cone or a bell", default=None, reader=read_contour)
    wall_thickness: QuantityInput = QuantityInput(
        doc="thickness of the wall, for its mass", default=None, bounds=Bounds(above=0.0, at_most=1.0)
    )
    wall_density: QuantityInput = QuantityInput(
        doc="density of the wall, for its mass", default=8900.0, bounds=Bounds(above=0.0, at_most=3e4)
    )

    characteristic_velocity = QuantityResult(relation="characteristic_velocity", source="definition")
    divergence_factor = NumberResult(relation="divergence_factor", source="sutton-biblarz")
    divergent_length = QuantityResult(relation="divergent_length", source="rao-1960")
    contour_length = QuantityResult(relation="contour_length", source="rao-1960")
    throat_wall_angle = QuantityResult(relation="throat_wall_angle", source="rao-1960")
    lip_angle = QuantityResult(relation="lip_angle", source="rao-1960")
    wetted_area = QuantityResult(relation="wetted_area", source="definition")
    contour_volume = QuantityResult(relation="contour_volume", source="definition")
    wall_mass = QuantityResult(relation="wall_mass", source="definition")
    chamber_volume = QuantityResult(relation="chamber_volume", source="sutton-biblarz")
    chamber_length = QuantityResult(relation="chamber_length", source="sutton-biblarz")

    # -- checks over several inputs -------------------------------------------------------------

    def _check(self, bad: set[str]) -> list[Problem]:
        problems = [
            Problem(name, as_text(self._typed[name]), f"left out unless {needed} is given")
            for name, needed in (("wall_thickness", "contour"), ("wall_density", "wall_thickness"))
            if name in self._typed and self._values[needed] is None and needed not in bad
        ]
        problems += list(nozzle_sizes.size_problems(self._typed, self._values, bad))
        if "chamber" in bad or "flow" in bad:
            return problems
        return [*problems, *nozzle_flow.flow_problems(self._values["chamber"], self.flow_model(), self._typed, self._values)]

    def displaced(self, typed: dict[str, Any], changes: Mapping[str, Any]) -> dict[str, Any]:
        """Return `typed` without the sizes that the changes displace: naming one member of a group displaces the others."""
        return nozzle_sizes.displaced(typed, changes)

    def flow_model(self) -> str:
        """Return the flow model asked for, or the first that the chamber allows."""
        return str(self._values["flow"] or self._values["chamber"].flows[0])

    # -- the calculation -------------------------------------------------------------------------

    def _calculate(self) -> Outcome:
        return nozzle_calculation.calculate(self)

    def shape(self, results: Mapping[str, float]) -> wall_of_nozzle.Geometry:
        """Return the wall for a throat diameter and an area ratio."""
        chamber = self._values["chamber"]
        return wall_of_nozzle.geometry(
            self._values["contour"],
            throat_radius=0.5 * results["throat_diameter"],
            area_ratio=results["area_ratio"],
            contraction_ratio=chamber.si("contraction_ratio"),
            characteristic_length=chamber._values["characteristic_length"],
            wall_thickness=self._values["wall_thickness"],
            wall_density=self._values["wall_density"],
        )

    @property
    def geometry(self) -> wall_of_nozzle.Geometry:
        """Segments of the wall and its measures."""
        return self.lazily("geometry", lambda: self.shape(self._outcome.results))

    # -- constructors and states ------------------------------------------------------------------

    @classmethod
    def sized_for(
        cls,
        chamber: Chamber,
        *,
        thrust: QuantityLike,
        ambient: QuantityLike,
        area_ratio: NumberLike | None = None,
        exit_pressure: QuantityLike | None = None,
        flow: str | None = None,
        freeze_at: str | float | None = None,
        exponent: str | None = None,
        discharge_coefficient: NumberLike = 1.0,
        contour: Contour | None = None,
        wall_thickness: QuantityLike | None = None,
        name: str = "",
    ) -> Self:
        """Return the nozzle that delivers `thrust` at `ambient`: sugar for ``Nozzle(..., thrust=..., sizing_ambient=...)``.

        Parameters
        ----------
        chamber : Chamber
            The chamber upstream.
        thrust, ambient : quantity
            Thrust [N], and the surroundings at which it is asked for.
        area_ratio, exit_pressure, flow, freeze_at, exponent, discharge_coefficient, contour, wall_thickness, name
            As for `Nozzle`.

        Raises
        ------
        RangeError
            When no size delivers that thrust there.
        """
        chosen = {
            "area_ratio": area_ratio,
            "exit_pressure": exit_pressure,
            "flow": flow,
            "freeze_at": freeze_at,
            "exponent": exponent,
            "discharge_coefficient": None if discharge_coefficient == 1.0 else discharge_coefficient,
            "contour": contour,
            "wall_thickness": wall_thickness,
            "name": name or None,
        }
        named: dict[str, Any] = {key: value for key, value in chosen.items() if value is not None}
        return cls(chamber, thrust=thrust, sizing_ambient=ambient, **named)

    @property
    def inlet(self) -> State:
        """State at the nozzle inlet: at the contraction ratio, or at rest where the contraction is infinite."""
        return self._state("nozzle inlet", "inlet")

    @property
    def throat(self) -> State:
        """State at the throat."""
        return self._state("throat", "throat")

    @property
    def exit(self) -> State:
        """State at the exit."""
        return self._state("exit", "exit")

    def _state(self, station: str, attribute: str) -> State:
        return self.lazily(attribute, lambda: nozzle_states.state_of(station, getattr(self.held, attribute), self.held))

    def state_paths(self) -> tuple[str, ...]:
        """Return the dotted names of the states' properties."""
        return tuple(f"{state}.{field}" for state in ("inlet", "throat", "exit") for field in STATE_FIELDS)

    @property
    def case(self) -> Any:
        """The propellant case upstream."""
        return self.chamber.case

    def at(self, *, area_ratio: NumberLike | None = None, pressure: QuantityLike | None = None, branch: str = "supersonic") -> State:
        """Return the flow state at a local area ratio or at a pressure.

        Parameters
        ----------
        area_ratio : number
            Local area over throat area [1], at least 1; `branch` says on which side of the throat.
        pressure : quantity
            Static pressure [Pa], below the stagnation pressure. Give one of the two.
        branch : str
            ``"supersonic"`` (default) or ``"subsonic"``.

        Raises
        ------
        InputError
            For a value that no state of this flow has.
        """
        return nozzle_states.state_at(self, area_ratio, pressure, branch)

    @property
    def stations(self) -> pd.DataFrame:
        """Flow states as a table: index station, SI floats; units in ``attrs["units"]``."""
        import pandas as pd

        states = self.all_states()
        columns = [name for name in STATE_FIELDS if any(name in state.names() for state in states)]
        frame = pd.DataFrame(
            {name: [state.si(name) if name in state.names() else float("nan") for state in states] for name in columns},
            index=pd.Index([state.station for state in states], name="station"),
        )
        frame.attrs["units"] = {name: getattr(State, name).quantity.unit for name in columns}
        return frame

    def all_states(self) -> tuple[State, ...]:
        """Return the states from the injector face, or the reservoir, to the exit."""
        return (*self.chamber.states(), self.inlet, self.throat, self.exit)

    # -- the wall ---------------------------------------------------------------------------------

    @property
    def wall_flow(self) -> pd.DataFrame:
        """Flow along the wall (DataFrame by point): x, r, area ratio, wall angle and the state of the core in SI."""
        return self.lazily("wall_flow", lambda: wall_of_nozzle.flow_frame(self)).copy()

    def export_contour(self, path: str | os.PathLike[str]) -> Path:
        """Write the contour to a file: .csv (points in metres) or .dxf (true arcs and splines in millimetres, extra ``cad``).

        Parameters
        ----------
        path : path
            Where to; the ending says which form.
        """
        return wall_of_nozzle.export(self, path)

    def heat_flux(
        self,
        wall_temperature: QuantityLike,
        *,
        coolant: str | None = None,
        coolant_pressure: QuantityLike | None = None,
        coolant_limit: QuantityLike | None = None,
    ) -> Answer:
        """Return the convective heat flux along the contour after Bartz, with its integral.

        Parameters
        ----------
        wall_temperature : quantity
            Temperature of the gas-side wall [K], the same everywhere and below the local adiabatic wall temperature.
        coolant : str, optional
            ``"fuel"``, ``"oxidizer"`` or ``"propellant"``: the propellant that takes up the load, with its whole flow.
        coolant_pressure, coolant_limit : quantity, optional
            Pressure in the jacket [Pa], the chamber pressure by default; temperature [K] that the coolant must stay below, its
            boiling temperature at that pressure by default.

        Returns
        -------
        Answer
            heat_load, peak_heat_flux, heat_share of the chamber power, coolant_temperature_rise, ...; `frame` along the wall.

        Raises
        ------
        InputError
            For a wall hotter than the gas would make it.
        NotAvailableError
            Without a contour, or where too much of the gas has no transport data.
        """
        from propkit.model import heat

        return heat.heat_flux(self, wall_temperature, coolant, coolant_pressure, coolant_limit)

    # -- display -----------------------------------------------------------------------------------

    def _shown_input(self, name: str, value: Any) -> Any:
        if name == "contour":
            return wall_of_nozzle.contour_frame(self)
        return units.quantity(value, "Pa") if name == "sizing_ambient" else value

    def input_text(self, name: str) -> str:
        """Return a choice as text."""
        value = self._values[name]
        return str(getattr(value, "text", value))

    def typed_text(self, name: str) -> str:
        """Return an input as it was typed; a contour as its line of code."""
        return repr(self._typed[name]) if name == "contour" else super().typed_text(name)

    def shows_input(self, name: str) -> bool:
        """Show what was given, and the flow model always."""
        if name == "wall_density":
            return self._values["wall_thickness"] is not None
        always = {"flow", "freeze_at", "exponent", "discharge_coefficient"}
        return name in self._typed or (name in always and self._values[name] is not None)

    def resolved(self) -> tuple[str, ...]:
        """Return the inputs that were not given and follow from the others."""
        return tuple(name for name in (*EXPANSIONS, *SIZES[:-1]) if name not in self._typed)

    def subtitle(self) -> str:
        """Return the chamber, area ratio and flow."""
        return f"{self.chamber.subtitle()}, area ratio {self.si('area_ratio'):.4g}, {self.flow}"

    def _own_assumptions(self) -> tuple[Assumption, ...]:
        return nozzle_states.assumptions(self)

    def flow_sections(self, system: UnitSystem) -> Iterator[Section]:
        """Yield the stations and the composition along the nozzle."""
        yield sheet.station_table(self.all_states(), (*STATION_COLUMNS, "condensed_mass_fraction"), system)
        case = self.chamber.case_or_none
        if case is not None:
            yield from case.flow_sections(self, system)
        section = self.composition_section()
        if section is not None:
            yield section

    def composition_section(self) -> Section | None:
        """Return mole fractions at the stations, or None for a gas without composition."""
        return sheet.composition_along(self.held.compositions())

    def sections(self, system: UnitSystem) -> Iterator[Section]:
        """Yield stations, composition and assumptions."""
        yield from self.flow_sections(system)
        yield sheet.assumption_section(self)

    def figures(self, system: UnitSystem = "SI") -> tuple[Figure, ...]:
        """Return the nozzle to scale with its stations."""
        from propkit.model import drawings

        return drawings.nozzle_figures(self, system)
