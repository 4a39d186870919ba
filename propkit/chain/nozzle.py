"""Nozzle stage: expansion of a reservoir to its throat and exit in the chosen flow model."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass, replace

import numpy as np

from propkit.chain import outcome, warnings
from propkit.chain.chamber import Combustion, GivenGas, condensed_mass_fraction, sorted_fractions
from propkit.physics import expansion
from propkit.physics.arrays import Array, Values, values
from propkit.physics.expansion import FlowState, Isentrope
from propkit.physics.expansion_parallel import Parallel
from propkit.physics.thermodynamics import SpeciesTable

AT_SONIC = 1e-6
"""Departure of the Mach number from 1 beyond which a throat is not sonic: at a phase boundary, or frozen there."""


@dataclass(frozen=True, slots=True, eq=False)
class Expansion:
    """Expansion of a batch: inlet, throat and exit states and the flow per effective throat area.

    `mass_flux` [kg/(m2 s)] is that of the throat; `area_ratio` [1] is exit area over effective throat area; `isentrope` holds the flow
    model, `table` its species (None for a gas of given properties).
    """

    isentrope: Isentrope
    inlet: FlowState
    throat: FlowState
    exit: FlowState
    mass_flux: Array
    area_ratio: Array
    table: SpeciesTable | None
    watched: SpeciesTable | None = None

    def raise_for_status(self, what: str, index: int = 0) -> None:
        """Raise when a case has no solution."""
        for state, where in ((self.throat, "throat"), (self.exit, "exit of the nozzle"), (self.inlet, "nozzle inlet")):
            outcome.raise_for(state, where, index)

    def doubts(self, index: int = 0) -> Iterator[tuple[str, str, str]]:
        """Yield doubts about the states as text, code and the result they are about."""
        if self.table is None or isinstance(self.isentrope, Parallel):
            return
        yield from self._phase_doubts(index)
        for state, where in ((self.throat, "the throat"), (self.exit, "the exit")):
            if state.amounts is None:
                continue
            yield from warnings.composition_range(self.table, state.amounts[index], float(state.temperature[index]), where, "stations")
            yield from warnings.supersaturation(self.watched, self.table, state.take([index]), where, "stations")

    def _phase_doubts(self, index: int) -> Iterator[tuple[str, str, str]]:
        """Yield what two phases make doubtful: a throat at a phase boundary, and liquids and solids held as they are."""
        if isinstance(self.isentrope, expansion.Shifting):
            both = self.mach_beside_throat(index)
            if both is not None:
                temperature = float(self.throat.temperature[index])
                yield (
                    f"The throat lies at a phase boundary ({temperature:.5g} K), where the sound speed jumps: at the largest mass flux the Mach "
                    f"number is {both[0]:.4g} on the upstream side and {both[1]:.4g} on the downstream side, at one velocity.",
                    "phase-boundary",
                    "stations",
                )
        elif self.condensed_mass_fraction(self.exit, index):
            text = (
                "Liquids and solids are held as they are in frozen flow: nothing melts, freezes or condenses, and heat capacities are held."
            )
            yield text, "held-phases", "stations"

    def mach_beside_throat(self, index: int = 0) -> tuple[float, float] | None:
        """Return the Mach number on both sides of a throat at a phase boundary; None where Mach is 1 at the throat."""
        here = float(self.throat.mach[index])
        if abs(here - 1.0) < AT_SONIC:
            return None
        one = self.isentrope.take(np.array([index]))  # type: ignore[attr-defined]
        beyond = one.at_pressure(self.throat.pressure[[index]] * (1.0 - AT_SONIC), self.throat.take([index]))
        return here, float(beyond.mach[0])

    def streams_at(self, state: FlowState, index: int = 0) -> FlowState | None:
        """Return the states of the streams side by side at the pressure of a state of the whole; None for a single stream."""
        if not isinstance(self.isentrope, Parallel):
            return None
        return self.isentrope.take(np.array([index])).each(state.pressure[[index]])

    def condensed_mass_fraction(self, state: FlowState, index: int = 0) -> float | None:
        """Return the mass of liquids and solids over the whole mass at a state; None where only gases are counted."""
        if self.table is None or state.amounts is None or not self.table.condensed.any():
            return None
        return float(condensed_mass_fraction(self.table, state.amounts)[index])

    def compositions(self, index: int = 0) -> list[tuple[str, list[tuple[str, float]]]]:
        """Return station and (species, mole fraction) pairs for the stations; empty for a gas of given properties."""
        if self.table is None:
            return []
        listed = (("nozzle inlet", self.inlet), ("throat", self.throat), ("exit", self.exit))
        return [(name, sorted_fractions(self.table, state.amounts[index])) for name, state in listed if state.amounts is not None]


def expand(
    reservoir: Combustion | GivenGas,
    *,
    flow: str,
    freeze_at: str | float | None = None,
    exponent: str | None = None,
    area_ratio: Values | None = None,
    exit_pressure: Values | None = None,
) -> Expansion:
    """Return the expansion of a reservoir in a flow model to an area ratio or an exit pressure.

    Parameters
    ----------
    reservoir : Combustion or GivenGas
        What the chamber stage yields.
    flow : str
        ``"shifting"``, ``"frozen"`` or ``"constant-property"``.
    freeze_at : str or float
        Frozen flow: ``"chamber"``, ``"throat"`` or a supersonic area ratio over the effective throat.
    exponent : str
        Constant-property flow of a chamber gas: ``"equilibrium"`` or ``"frozen"``.
    area_ratio, exit_pressure : float or array
        One of exit area over effective throat area [1] and static exit pressure [Pa].
    """
    isentrope = _isentrope(reservoir, flow, freeze_at, exponent)
    shares = getattr(reservoir, "shares", None)
    if shares is not None:
        isentrope = Parallel(isentrope, shares[None, :])
    known = isinstance(isentrope, expansion.Shifting) and isinstance(reservoir, Combustion)
    throat = reservoir.throat if known else expansion.throat(isentrope)  # type: ignore[union-attr]
    flux = throat.mass_flux
    if area_ratio is not None:
        ratio = np.array(np.broadcast_to(values(area_ratio), flux.shape))
        exit_state = expansion.at_area_ratio(isentrope, flux, ratio, throat)
    else:
        pressure = np.array(np.broadcast_to(values(exit_pressure), flux.shape))  # type: ignore[arg-type]
        exit_state = expansion.at_pressure(isentrope, np.minimum(pressure, throat.pressure), throat)
        ratio = flux / exit_state.mass_flux
    if isinstance(isentrope, expansion.FrozenFrom) and freeze_at != "throat":
        exit_state = _beyond_sonic(isentrope, exit_state)
    inlet = _inlet(reservoir, isentrope, throat)
    table, watched = getattr(reservoir, "table", None), getattr(reservoir, "watched", None)
    return Expansion(isentrope, inlet, throat, exit_state, flux, ratio, table, watched)


def _isentrope(reservoir: Combustion | GivenGas, flow: str, freeze_at: str | float | None, exponent: str | None) -> Isentrope:
    if isinstance(reservoir, GivenGas):
        return expansion.perfect_gas(
            reservoir.isentropic_exponent, reservoir.gas_constant, reservoir.temperature, reservoir.stagnation_pressure
        )
    rest = reservoir.stagnation
    shifting = expansion.shifting(reservoir.table, reservoir.atoms, rest)
    if flow == "shifting":
        return shifting
    if flow == "constant-property":
        gamma = rest.isentropic_exponent if exponent == "equilibrium" else rest.frozen_isentropic_exponent
        return expansion.perfect_gas(gamma, rest.gas_constant, rest.temperature, rest.pressure, rest.enthalpy, rest.entropy)
    if freeze_at == "chamber":
        inlet = reservoir.inlet
        return expansion.frozen(reservoir.table, inlet.amounts, rest.enthalpy, rest.entropy, rest.pressure, rest.temperature)
    return expansion.frozen_from(shifting, reservoir.throat, None if freeze_at == "throat" else float(freeze_at))  # type: ignore[arg-type]


def _beyond_sonic(isentrope: expansion.FrozenFrom, exit_state: FlowState) -> FlowState:
    """Return the exit with status 2 where the composition would freeze before the sonic point of the frozen gas."""
    there = isentrope.after.at_pressure(isentrope.place.pressure)
    early = there.velocity < there.sound_speed
    return replace(exit_state, status=np.where(early, outcome.OUT_OF_RANGE, exit_state.status))


def _inlet(reservoir: Combustion | GivenGas, isentrope: Isentrope, throat: FlowState) -> FlowState:
    """Return the state at the contraction ratio, or at rest where the contraction is infinite."""
    ratio = reservoir.contraction_ratio[: len(throat.pressure)]
    finite = np.isfinite(ratio)
    if not finite.any():
        if isinstance(isentrope, expansion.Shifting):
            return isentrope.at_rest()
        rest = expansion.at_pressure(isentrope, isentrope.pressure)
        return replace(rest, velocity=np.zeros_like(rest.velocity))
    return expansion.at_area_ratio(isentrope, throat.mass_flux, np.where(finite, ratio, 1e6), throat, supersonic=False)


def state_at(found: Expansion, *, area_ratio: float | None = None, pressure: float | None = None, supersonic: bool = True) -> FlowState:
    """Return the state at a local area over effective throat area, or at a pressure [Pa]."""
    if pressure is not None:
        return expansion.at_pressure(found.isentrope, pressure, found.throat)
    return expansion.at_area_ratio(found.isentrope, found.mass_flux, np.array([area_ratio]), found.throat, supersonic)
