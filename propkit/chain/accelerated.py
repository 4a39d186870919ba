"""The quick way through chamber and nozzle for many designs at once; what it cannot keep goes through the plain stages.

The quick engine (`propkit.physics.fast_flow`) solves the same equations as the damped iteration. It serves gases in equilibrium,
from a chamber of infinite or finite contraction, in shifting, frozen (from the nozzle inlet) and constant-property flow; designs that its guards
refuse are solved by the plain stages, one by one as it were, and counted.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace
from functools import lru_cache
from typing import Any, Final

import numpy as np

from propkit.bridge.basis import load_basis
from propkit.chain import chamber as chamber_stage
from propkit.chain import nozzle as nozzle_stage
from propkit.chain.case import Mixture
from propkit.chain.chamber import Combustion
from propkit.constants import GAS_CONSTANT
from propkit.physics import expansion, fast_build, fast_combustor, fast_flow
from propkit.physics.arrays import Array, Values, values
from propkit.physics.expansion import FlowState
from propkit.physics.fast_combustor import Contracted
from propkit.physics.fast_flow import Flow, Predictor, Station
from propkit.physics.fast_frozen import HeldFlow, HeldGas
from propkit.physics.fast_newton import Kernel
from propkit.physics.thermodynamics import SpeciesTable

FEWEST: Final = 100
"""Designs below which the plain stages are as quick."""

FLOWS: Final = ("shifting", "frozen", "constant-property")


@dataclass(slots=True, eq=False)
class Rest:
    """The gas at rest of a batch, as the plain chamber stage gives it, without its composition."""

    pressure: Array
    temperature: Array
    density: Array
    molar_mass: Array
    gas_constant: Array
    isentropic_exponent: Array
    frozen_isentropic_exponent: Array
    specific_heat: Array
    frozen_specific_heat: Array
    sound_speed: Array
    enthalpy: Array
    entropy: Array
    status: Any


@dataclass(slots=True, eq=False)
class Reservoir:
    """What the plain chamber stage gives, from the quick engine; `slow` are designs left to the plain stages.

    `again` solves some designs by the plain chamber stage; `contracted` has the nozzle inlet of finite contraction.
    """

    table: SpeciesTable
    atoms: Array
    enthalpy: Array
    injector: Rest
    stagnation: Rest
    throat: FlowState
    contraction_ratio: Array
    characteristic_velocity: Array
    flow: Flow
    elements: Array
    log_pressure: Array
    slow: Any
    again: Callable[[Any], Combustion]
    contracted: Contracted | None = None
    inlet_velocity: Any = None


@dataclass(frozen=True, slots=True, eq=False)
class Expanded:
    """An expansion, and how many of its designs were left to the plain stages."""

    expansion: nozzle_stage.Expansion
    slow: int


@dataclass(slots=True, eq=False)
class Accelerator:
    """A predictor over the box of a study, with what it holds for; picklable.

    Parameters
    ----------
    basis : str
        Name of the thermodynamic basis.
    symbols : tuple of str
        Elements.
    predictor : Predictor
        First guesses.
    """

    basis: str
    symbols: tuple[str, ...]
    predictor: Predictor
    to: str = ""

    def serves(self, mixture: Mixture, contraction_ratio: Array) -> bool:
        """Whether the quick engine can take a batch."""
        return len(mixture.atoms) >= FEWEST and mixture.symbols == self.symbols and servable(mixture) and one_kind(contraction_ratio)

    def combust(
        self, mixture: Mixture, pressure: Array, *, contraction_ratio: Values = np.inf, pressure_at: str = "injector", keep: bool = False
    ) -> Reservoir:
        """Return the combustion of a mixture at each pressure [Pa], as the plain chamber stage does; `keep` keeps the composition."""
        table, kernel = _kernel(self.basis, self.symbols)
        elements = np.ascontiguousarray(mixture.atoms.T)
        contraction = np.array(np.broadcast_to(values(contraction_ratio), pressure.shape))
        contracted: Contracted | None = None
        if np.isfinite(contraction).all():
            contracted = fast_combustor.contracted(
                kernel, self.predictor, elements, mixture.enthalpy, pressure, contraction, pressure_at, keep=keep
            )
            flow, log_pressure, good = contracted.flow, contracted.log_pressure, contracted.good
            rest, face = _rest(flow.chamber, flow.entropy), _rest(contracted.face, contracted.face_entropy)
        else:
            log_pressure = np.log(pressure / kernel.reference_pressure)
            guess, inside = fast_flow.guesses(self.predictor, elements, mixture.enthalpy, log_pressure)
            flow = fast_flow.chamber_and_throat(kernel, elements, mixture.enthalpy, log_pressure, guess, keep=keep)
            rest = face = _rest(flow.chamber, flow.entropy)
            good = flow.good & inside
        throat = _state(flow.throat, mixture.enthalpy, flow.entropy)
        slow = np.flatnonzero(~good)
        cstar = rest.pressure / throat.mass_flux

        def again(rows: Any) -> Combustion:
            return chamber_stage.combust(
                _some(mixture, rows), self.basis, pressure=pressure[rows], contraction_ratio=contraction[rows], pressure_at=pressure_at
            )

        if slow.size:
            plain = again(slow)
            for mine, theirs in ((rest, plain.stagnation), (face, plain.injector), (throat, plain.throat)):
                _put(mine, slow, theirs)
            cstar[slow] = plain.characteristic_velocity
        return Reservoir(
            table, mixture.atoms, mixture.enthalpy, face, rest, throat, contraction, cstar,
            flow, elements, log_pressure, slow, again, contracted,
        )  # fmt: skip

    def expand(
        self, reservoir: Reservoir, *, flow: str, exponent: str | None, area_ratio: Array | None, exit_pressure: Array | None
    ) -> Expanded:
        """Return the expansion of a reservoir, as the plain nozzle stage does; `area_ratio` over the effective throat."""
        if flow == "constant-property":
            plain = nozzle_stage.expand(reservoir, flow=flow, exponent=exponent, area_ratio=area_ratio, exit_pressure=exit_pressure)  # type: ignore[arg-type]
            return Expanded(plain, len(reservoir.slow))
        if flow == "frozen":
            throat, inlet, exit_state, good = _frozen(reservoir, area_ratio, exit_pressure)
        else:
            throat, inlet = reservoir.throat, _shifting_inlet(reservoir)
            exit_state, good = self._shifting(reservoir, area_ratio, exit_pressure)
        good[reservoir.slow] = False
        flux = throat.mass_flux
        ratio = flux / exit_state.mass_flux if area_ratio is None else area_ratio
        slow = np.flatnonzero(~good)
        if slow.size:
            plain = nozzle_stage.expand(
                reservoir.again(slow),
                flow=flow,
                freeze_at="chamber" if flow == "frozen" else None,
                area_ratio=None if area_ratio is None else area_ratio[slow],
                exit_pressure=None if exit_pressure is None else exit_pressure[slow],
            )
            throat = throat if throat is not reservoir.throat else _copied(throat)
            for mine, theirs in ((throat, plain.throat), (inlet, plain.inlet), (exit_state, plain.exit)):
                _put(mine, slow, theirs)
            flux[slow], ratio = plain.mass_flux, np.array(ratio)
            ratio[slow] = plain.area_ratio
        return Expanded(nozzle_stage.Expansion(None, inlet, throat, exit_state, flux, ratio, None), int(slow.size))  # type: ignore[arg-type]

    def _shifting(self, reservoir: Reservoir, area_ratio: Array | None, exit_pressure: Array | None) -> tuple[FlowState, Any]:
        _, kernel = _kernel(self.basis, self.symbols)
        rest = reservoir.stagnation
        log_ratio = None if area_ratio is None else np.log(area_ratio)
        log_exit = np.log(np.asarray(exit_pressure) / rest.pressure) if log_ratio is None else log_ratio
        guess, inside = fast_flow.exit_guess(self.predictor, reservoir.elements, reservoir.enthalpy, reservoir.log_pressure, log_exit)
        station, good = fast_flow.shifting_exit(kernel, reservoir.elements, reservoir.flow, guess, log_ratio)
        return _state(station, reservoir.enthalpy, reservoir.flow.entropy), good & inside


def servable(mixture: Mixture) -> bool:
    """Whether a mixture is of the kind that the quick engine takes: a gas in equilibrium with every element present."""
    return not mixture.condensed and mixture.composition is None and bool((mixture.atoms > 0.0).all())


def one_kind(contraction_ratio: Array) -> bool:
    """Whether all contractions are infinite, or all finite."""
    finite = np.isfinite(contraction_ratio)
    return bool(finite.all() or not finite.any())


def prepare(
    mixture: Mixture,
    basis: str,
    pressure: Array,
    *,
    area_ratio: Array | None = None,
    exit_pressure: Array | None = None,
    contraction_ratio: Array | None = None,
    pressure_at: str = "injector",
) -> Accelerator | None:
    """Return an accelerator for the box of some designs; None where the quick engine does not serve.

    Parameters
    ----------
    mixture : Mixture
        Designs that span the box.
    basis : str
        Name of the thermodynamic basis.
    pressure : array
        p [Pa].
    area_ratio, exit_pressure : array, optional
        Exit area over effective throat area [1], or exit pressure [Pa], of shifting flow; neither where no exit is wanted.
    contraction_ratio : array, optional
        Chamber area over throat area [1]; infinite by default.
    pressure_at : str
        Where the pressure holds.
    """
    elements, enthalpy = np.ascontiguousarray(mixture.atoms.T), mixture.enthalpy
    if not servable(mixture) or not (np.isfinite(pressure) & (pressure > 0.0)).all():
        return None
    if contraction_ratio is not None and np.isfinite(contraction_ratio).any():
        if not one_kind(contraction_ratio):
            return None
        # the box has to hold the pressure at the face as well as that at rest at the nozzle inlet
        pressure = np.concatenate(fast_combustor.typical_pressures(pressure, contraction_ratio, pressure_at))
        elements, enthalpy = np.tile(elements, 2), np.tile(enthalpy, 2)
        area_ratio, exit_pressure = (None if part is None else np.tile(part, 2) for part in (area_ratio, exit_pressure))
    table, kernel = _kernel(basis, mixture.symbols)
    log_pressure = np.log(pressure / kernel.reference_pressure)
    to, log_exit = "area_ratio", None
    if area_ratio is not None:
        log_exit = np.log(area_ratio)
    elif exit_pressure is not None:
        to, log_exit = "exit_pressure", np.log(exit_pressure / pressure)
    with np.errstate(all="ignore"):
        made = fast_build.build(table, kernel, elements, enthalpy, log_pressure, log_exit, to)
    return None if made is None else Accelerator(basis, mixture.symbols, made, to if log_exit is not None else "")


@lru_cache(maxsize=32)
def _kernel(basis: str, symbols: tuple[str, ...]) -> tuple[SpeciesTable, Kernel]:
    table = load_basis(basis).table(symbols)
    return table, Kernel.of(table)


def _some(mixture: Mixture, rows: Any) -> Mixture:
    return Mixture(mixture.symbols, mixture.atoms[rows], mixture.enthalpy[rows], mixture.density[rows])


def _rest(chamber: Station, entropy: Array) -> Rest:
    gas_constant, cp = GAS_CONSTANT * chamber.moles, chamber.solved.heat_capacity
    exponent = chamber.exponent
    return Rest(
        pressure=chamber.pressure,
        temperature=chamber.temperature,
        density=chamber.pressure / (gas_constant * chamber.temperature),
        molar_mass=1.0 / chamber.moles,
        gas_constant=gas_constant,
        isentropic_exponent=exponent,
        frozen_isentropic_exponent=cp / (cp - chamber.moles),
        specific_heat=GAS_CONSTANT / chamber.solved.heating,
        frozen_specific_heat=GAS_CONSTANT * cp,
        sound_speed=np.sqrt(exponent * gas_constant * chamber.temperature),
        enthalpy=np.array(chamber.enthalpy),
        entropy=np.array(entropy),
        status=np.zeros(len(cp), dtype=np.intp),
    )


def _state(station: Station, stagnation_enthalpy: Array, entropy: Array) -> FlowState:
    gas_constant = GAS_CONSTANT * station.moles
    exponent = station.exponent
    count = len(entropy)
    return FlowState(
        pressure=station.pressure,
        temperature=station.temperature,
        density=station.pressure / (gas_constant * station.temperature),
        velocity=np.sqrt(np.maximum(2.0 * (stagnation_enthalpy - station.enthalpy), 0.0)),
        sound_speed=np.sqrt(exponent * gas_constant * station.temperature),
        molar_mass=1.0 / station.moles,
        isentropic_exponent=exponent,
        enthalpy=station.enthalpy,
        entropy=np.array(entropy),
        status=np.zeros(count, dtype=np.intp),
        iterations=station.solved.steps,
        residual=np.zeros(count),
    )


def _inlet(rest: Rest, *, frozen: bool) -> FlowState:
    """Return the gas at rest as a state of the flow."""
    exponent = np.array(rest.frozen_isentropic_exponent if frozen else rest.isentropic_exponent)
    count = len(exponent)
    return FlowState(
        pressure=np.array(rest.pressure),
        temperature=np.array(rest.temperature),
        density=np.array(rest.density),
        velocity=np.zeros(count),
        sound_speed=np.sqrt(exponent * rest.gas_constant * rest.temperature),
        molar_mass=np.array(rest.molar_mass),
        isentropic_exponent=exponent,
        enthalpy=np.array(rest.enthalpy),
        entropy=np.array(rest.entropy),
        status=np.array(rest.status),
        iterations=np.zeros(count, dtype=np.intp),
        residual=np.zeros(count),
    )


def _shifting_inlet(reservoir: Reservoir) -> FlowState:
    """Return the nozzle inlet of flow in equilibrium: at rest, or at the contraction ratio."""
    found = reservoir.contracted
    if found is None:
        return _inlet(reservoir.stagnation, frozen=False)
    state = _state(found.inlet, reservoir.enthalpy, reservoir.flow.entropy)
    return replace(state, velocity=np.array(found.inlet_velocity))


def _frozen(reservoir: Reservoir, area_ratio: Array | None, exit_pressure: Array | None) -> tuple[FlowState, FlowState, FlowState, Any]:
    """Return throat, inlet and exit of flow whose composition is that of the nozzle inlet, and which designs were found."""
    rest, found_inlet = reservoir.stagnation, reservoir.contracted
    source, kept = (reservoir.flow.chamber, reservoir.flow.kept) if found_inlet is None else (found_inlet.inlet, found_inlet.kept)
    assert source.solved.amounts is not None
    gas = HeldGas(reservoir.table, kept, source.solved.amounts, source.moles, source.temperature, source.pressure, rest.enthalpy)
    sonic = gas.throat()
    throat = _held(sonic, gas, rest)
    if area_ratio is not None:
        found = gas.at_mass_flux(throat.mass_flux / area_ratio, sonic)
    else:
        assert exit_pressure is not None
        found = gas.at_pressure(np.minimum(exit_pressure, sonic.pressure))
    good = sonic.good & found.good
    if found_inlet is None:
        return throat, _inlet(rest, frozen=True), _held(found, gas, rest), good
    flux = throat.mass_flux / reservoir.contraction_ratio
    slow = gas.before_throat(flux, sonic)
    inlet = _held(slow, gas, rest)
    return throat, replace(inlet, velocity=flux / inlet.density), _held(found, gas, rest), good & slow.good


def _held(found: HeldFlow, gas: HeldGas, rest: Rest) -> FlowState:
    exponent = found.heat_capacity / (found.heat_capacity - gas.gas_constant)
    thermal = gas.gas_constant * found.temperature
    count = len(exponent)
    return FlowState(
        pressure=found.pressure,
        temperature=found.temperature,
        density=found.pressure / thermal,
        velocity=expansion.velocity(rest.enthalpy, found.enthalpy),
        sound_speed=np.sqrt(exponent * thermal),
        molar_mass=GAS_CONSTANT / gas.gas_constant,
        isentropic_exponent=exponent,
        enthalpy=found.enthalpy,
        entropy=np.array(rest.entropy),
        status=np.zeros(count, dtype=np.intp),
        iterations=np.zeros(count, dtype=np.intp),
        residual=np.zeros(count),
    )


_COPIED = ("pressure", "temperature", "density", "velocity", "sound_speed", "molar_mass", "isentropic_exponent", "enthalpy",
           "entropy", "status", "iterations", "residual")  # fmt: skip


def _copied(state: FlowState) -> FlowState:
    copies: Any = {name: np.array(getattr(state, name)) for name in _COPIED}
    return FlowState(**copies)


def _put(mine: Any, rows: Any, theirs: Any) -> None:
    """Overwrite some designs of a state by those of the plain stages."""
    for name in mine.__slots__:
        kept = getattr(mine, name)
        if isinstance(kept, np.ndarray) and kept.ndim == 1:
            kept[rows] = getattr(theirs, name)
