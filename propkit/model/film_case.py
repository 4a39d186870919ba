"""The case of two propellants with a coolant film: core and film flow side by side, each at its own mixture ratio."""

from __future__ import annotations

from collections.abc import Iterator
from typing import TYPE_CHECKING, Any, ClassVar

import numpy as np

from propkit import quantities, units
from propkit.chain import case as stage
from propkit.chain import chamber as chamber_stage
from propkit.errors import Problem
from propkit.model import case_inputs
from propkit.model.base import Outcome
from propkit.model.declare import Bounds, NumberInput, NumberResult
from propkit.model.doubts import Assumption, Doubt
from propkit.model.propellant_case import CaseArrays, PropellantCase
from propkit.report import Column, Section, Table, UnitSystem

if TYPE_CHECKING:
    from propkit.model.performance import Performance

_FILM = ("film_fraction", "film_mixture_ratio")
_CHAMBER_COLUMNS = ("temperature", "molar_mass", "isentropic_exponent")
_FLOW_COLUMNS = ("temperature", "velocity", "mach", "molar_mass", "isentropic_exponent")


class FilmCase(PropellantCase):
    """Two propellants with a coolant film; made by `PropellantCase.with_film`.

    Core and film are solved each at its own mixture ratio and at chamber pressure. `mixture_ratio` is that of the whole flow.
    """

    title = "Propellant case with film"
    headline: ClassVar[tuple[str, ...]] = ("mixture_ratio", "core_mixture_ratio", "film_fraction")

    film_fraction: NumberInput = NumberInput(doc="mass flow of the film over the whole mass flow", bounds=Bounds(above=0.0, at_most=0.9))
    film_mixture_ratio: NumberInput = NumberInput(
        doc="oxidizer over fuel mass flow in the film; 0 is fuel alone",
        default=0.0,
        bounds=Bounds(at_least=0.0, at_most=1e4),
    )

    core_mixture_ratio = NumberResult(relation="core_mixture_ratio", source="conservation")

    def _calculate(self) -> Outcome:
        whole = super()._calculate()
        held: CaseArrays = whole.held
        assert held.oxidizer is not None
        assert held.fuel is not None
        share, film_ratio = (self._values[name] for name in _FILM)
        core = float(stage.core_ratio(held.mixture_ratio, share, film_ratio))
        if not (np.isfinite(core) and core > 0.0):
            raise case_inputs.no_core(self._typed, held.mixture_ratio)
        parts = stage.core_and_film(
            held.oxidizer, held.fuel, held.mixture_ratio, share, film_ratio, held.additives, self._values["condensed"]
        )
        whole.results["core_mixture_ratio"] = core
        doubts = [doubt for doubt in whole.doubts if doubt.code != "fuel-rich"]
        if film_ratio > 0.0 and "stoichiometric_mixture_ratio" in whole.results:
            rich = whole.results["stoichiometric_mixture_ratio"] / film_ratio
            doubts += [
                Doubt(f"Film: {text}", code=text.code, about="film_mixture_ratio") for text in case_inputs.fuel_rich_doubts(rich, parts)
            ]
        elif film_ratio == 0.0:
            text = "Film of fuel alone: it is taken at the chemical equilibrium of the fuel, which a cool film does not reach."
            doubts.append(Doubt(text, code="fuel-rich", about="film_mixture_ratio"))
        arrays = CaseArrays(parts, held.oxidizer, held.fuel, held.mixture_ratio, held.additives, whole=held.mixture)
        return Outcome(whole.results, whole.absent, tuple(doubts), arrays)

    # -- what objects downstream ask -------------------------------------------------------------

    @property
    def freezes_late(self) -> bool:
        """Whether the composition may freeze at the throat or beyond: not where two streams have a throat each."""
        return False

    @property
    def flow_reason(self) -> str:
        """Why other flow models are refused."""
        return "Core and film freeze at the nozzle inlet or follow equilibrium: neither has a throat of its own."

    def chamber_problems(self, contraction_ratio: float) -> Iterator[Problem]:
        """Yield what a chamber of this case cannot have."""
        if np.isfinite(contraction_ratio):
            hint = "Core and film share one stagnation pressure, which holds for a wide chamber only."
            yield Problem("contraction_ratio", f"{contraction_ratio:g}", "left out beside a film", hint)

    def chamber_assumption(self) -> Assumption:
        """Return what a chamber assumes about this case."""
        text = (
            f"Core and film ({100.0 * self.film_fraction:.3g} % of the flow) do not mix: each burns to equilibrium at its own mixture ratio "
            f"({self.core_mixture_ratio:.4g} and {self.film_mixture_ratio:.4g}) and at chamber pressure, and along the nozzle both have the "
            f"same static pressure. Values of the chamber are those of the core, c* is that of the whole."
        )
        return Assumption("film", text, "given", "characteristic_velocity")

    def chamber_doubts(self, combustion: Any) -> Iterator[Doubt]:
        """Yield doubts about the film in a reservoir."""
        for text, code, about in combustion.doubts(1, "the injector face in the film"):
            yield Doubt(text, code=code, about=about)

    def chamber_sections(self, chamber: Any, system: UnitSystem) -> Iterator[Section]:
        """Yield core and film side by side, and what the film costs against the uniform mixture."""
        held = chamber.held
        ratios = (self.core_mixture_ratio, self.film_mixture_ratio)
        shares = tuple(100.0 * float(share) for share in held.shares)
        columns = [
            Column("share", "share by mass", "w", "percent", 4, shares),
            _column("mixture_ratio", ratios, system),
        ]
        columns += [_column(name, tuple(getattr(held.injector, name).tolist()), system) for name in _CHAMBER_COLUMNS]
        yield Section("streams", "Streams", table=Table("streams", "Streams", "stream", chamber_stage.STREAMS, tuple(columns)))
        uniform = self.lazily(f"uniform {chamber.si('pressure')}", lambda: self._uniform_cstar(chamber))
        here = chamber.si("characteristic_velocity")
        row = quantities.quantity("characteristic_velocity")
        unit = row.shown_in(system, (here,))
        shown = [f"{units.convert(value, row.unit, unit):.6g}" for value in (here, uniform)]
        change = f"{100.0 * (here / uniform - 1.0):+.2f}".replace("-", "−")
        line = f"Against the uniform mixture: c* {shown[0]} instead of {shown[1]} {units.shown_unit(unit)} ({change} %)."
        yield Section("film", "What the film costs", lines=(line,))

    def _uniform_cstar(self, chamber: Any) -> float:
        found = chamber_stage.combust(self.whole, str(self.si("thermo_basis")), pressure=chamber._values["pressure"])
        return float(found.characteristic_velocity[0])

    def flow_sections(self, nozzle: Any, system: UnitSystem) -> Iterator[Section]:
        """Yield core and film at the throat and the exit."""
        index, states = [], []
        for station in ("throat", "exit"):
            found = nozzle.held.streams_at(getattr(nozzle.held, station))
            for place, stream in enumerate(chamber_stage.STREAMS):
                index.append(f"{station}, {stream}")
                states.append({name: float(getattr(found, name)[place]) for name in _FLOW_COLUMNS})
        columns = tuple(_column(name, tuple(state[name] for state in states), system) for name in _FLOW_COLUMNS)
        yield Section("streams", "Core and film", table=Table("streams", "Core and film", "stream", tuple(index), columns))

    # -- the uniform mixture beside it ----------------------------------------------------------

    def uniform(self) -> PropellantCase:
        """Return the case whose film is mixed into the core."""
        return PropellantCase(**{name: value for name, value in self._typed.items() if name not in _FILM})

    def beside_uniform(self, performance: Performance) -> Performance:
        """Return a performance of this case with the uniform mixture in its place, on the same hardware."""
        from propkit.model.nozzle_sizes import EXPANSIONS, SIZES

        above: Any = self.uniform()
        for link in performance.chain()[1:]:
            typed = {**link._typed, link.upstream_input: above}
            if link.kind == "nozzle":
                typed = {name: value for name, value in typed.items() if name not in (*SIZES, *EXPANSIONS, "sizing_ambient")}
                typed |= {"throat_area": link.si("throat_area"), "area_ratio": link.si("area_ratio")}
            above = type(link)(**typed)
        made: Performance = above
        return made

    # -- display ---------------------------------------------------------------------------------

    def shows_input(self, name: str) -> bool:
        """Show what was given, the mixture ratio of the film, the basis, and whether liquids and solids may form."""
        return super().shows_input(name) or name == "film_mixture_ratio"

    def subtitle(self) -> str:
        """Return the pair, its mixture ratio and the film."""
        return f"{super().subtitle()}, {100.0 * self.film_fraction:.3g} % film at {self.film_mixture_ratio:.4g}"

    @property
    def _constructor(self) -> str:
        return "pk.PropellantCase.with_film"


def _column(name: str, values: tuple[float, ...], system: UnitSystem) -> Column:
    row = quantities.quantity(name)
    unit = row.shown_in(system, values)
    shown = tuple(units.convert(value, row.unit, unit) if unit else value for value in values)
    return Column(name, row.label, row.symbol, unit, row.digits, shown)
