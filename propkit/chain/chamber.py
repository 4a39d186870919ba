"""Chamber stage: combustion to equilibrium at the injector face, and the nozzle-inlet state that follows from it."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass, replace

import numpy as np

from propkit.bridge.basis import load_basis
from propkit.chain import outcome, warnings
from propkit.chain.case import Mixture
from propkit.constants import GAS_CONSTANT
from propkit.physics import combustor, equilibrium, expansion, held_gas, ideal_nozzle
from propkit.physics.arrays import Array, Values, values
from propkit.physics.equilibrium import EquilibriumState
from propkit.physics.expansion import FlowState
from propkit.physics.expansion_parallel import Parallel
from propkit.physics.thermodynamics import SpeciesTable

STREAMS = ("core", "film")
"""What the streams of a chamber with a film are called."""

COLD_STREAM = (
    "A cold liquid alone cannot be a gas of its own enthalpy: a film takes its heat from the core, which this model does not pass on. "
    "Let it burn a little (film_mixture_ratio=0.3), or feed it warm, as from a cooling jacket (fuel_temperature=)."
)
"""What to try where a stream has less enthalpy than gases can hold."""

INJECTOR_RESULTS = (
    "pressure", "temperature", "density", "molar_mass", "gas_constant", "isentropic_exponent", "frozen_isentropic_exponent",
    "specific_heat", "frozen_specific_heat", "sound_speed",
)  # fmt: skip
"""Results of the chamber that are properties of the state at the injector face."""


@dataclass(frozen=True, slots=True, eq=False)
class Combustion:
    """Combustion of a batch: the state at the injector face, at the nozzle inlet and brought to rest there.

    `inlet` is the static state at the nozzle inlet (that of `stagnation` where the contraction is infinite), `throat` the throat of
    shifting flow, `characteristic_velocity` the theoretical value [m/s]. `contraction_ratio` is infinite where not given. `watched` has
    the liquids and solids that a gas-only composition might be supersaturated with; `held` says that the composition is given, not
    computed: then throat and characteristic velocity are those of frozen flow. With `shares`, the cases are streams side by side (see
    `Mixture`), and throat and characteristic velocity are those of the whole.
    """

    table: SpeciesTable
    atoms: Array
    enthalpy: Array
    injector: EquilibriumState
    inlet: EquilibriumState
    inlet_velocity: Array
    stagnation: EquilibriumState
    throat: FlowState
    contraction_ratio: Array
    characteristic_velocity: Array
    watched: SpeciesTable | None = None
    held: bool = False
    shares: Array | None = None

    def raise_for_status(self, what: str, index: int = 0) -> None:
        """Raise when a case has no solution."""
        for stream in range(len(self.shares) if self.shares is not None else 0):
            outcome.raise_for(self.injector, f"combustion of the {STREAMS[stream]}", stream, COLD_STREAM)
        outcome.raise_for(self.injector, "combustion at the injector face", index)
        outcome.raise_for(self.stagnation, "stagnation state at the nozzle inlet", index)
        outcome.raise_for(self.throat, "throat", index)

    def composition(self, index: int = 0) -> list[tuple[str, float]]:
        """Return species and mole fractions at the injector face, the largest first."""
        return sorted_fractions(self.table, self.injector.amounts[index])

    def injector_values(self, index: int = 0) -> dict[str, float]:
        """Return the state at the injector face as the properties of a station."""
        face = self.injector
        values_there = {name: float(getattr(face, name)[index]) for name in ("pressure", "temperature", "density")}
        values_there |= {"velocity": 0.0, "mach": 0.0}
        values_there |= {
            name: float(getattr(face, name)[index]) for name in ("sound_speed", "molar_mass", "isentropic_exponent", "enthalpy", "entropy")
        }
        if self.table.condensed.any():
            values_there["condensed_mass_fraction"] = float(condensed_mass_fraction(self.table, face.amounts)[index])
        return values_there

    def doubts(self, index: int = 0, where: str = "the injector face") -> Iterator[tuple[str, str, str]]:
        """Yield doubts as text, code and the result they are about; `where` names the place."""
        yield from warnings.composition_range(
            self.table,
            self.injector.amounts[index],
            float(self.injector.temperature[index]),
            where,
            "temperature",
        )
        face = self.injector.take([index])
        yield from warnings.supersaturation(self.watched, self.table, face, where, "temperature")


def combust(
    mixture: Mixture,
    basis: str,
    *,
    pressure: Values,
    contraction_ratio: Values = np.inf,
    pressure_at: str = "injector",
) -> Combustion:
    """Return the combustion of a mixture at each pressure.

    Parameters
    ----------
    mixture : Mixture
        Atoms and enthalpy per mass, a batch; one with a composition of its own is taken as it is, not burnt.
    basis : str
        Name of the thermodynamic basis.
    pressure : float or array
        Quoted chamber pressure [Pa], read as `pressure_at` says.
    contraction_ratio : float or array
        Chamber area over effective throat area [1], above 1; infinite for a chamber at rest.
    pressure_at : str
        ``"injector"``, ``"nozzle stagnation"`` or ``"nozzle inlet static"``.
    """
    table = load_basis(basis).table(mixture.symbols, mixture.condensed)
    count = len(mixture.atoms)
    p, ratio = (np.array(np.broadcast_to(values(part), (count,))) for part in (pressure, contraction_ratio))
    if mixture.composition is not None:
        return _held(table, mixture, p, ratio, pressure_at)
    contracted = np.isfinite(ratio).any()
    found = _contracted(table, mixture, p, ratio, pressure_at) if contracted else _wide(table, mixture, p, ratio)
    watched = None if mixture.condensed else warnings.watched_phases(load_basis(basis).table(mixture.symbols, True))
    found = replace(found, watched=watched)
    return found if mixture.shares is None else _side_by_side(found, mixture.shares)


def _side_by_side(found: Combustion, shares: Array) -> Combustion:
    """Return streams of one stagnation pressure as one chamber, with the throat of the whole."""
    if (found.injector.status != outcome.CONVERGED).any():
        return replace(found, shares=shares)
    isentrope = Parallel(expansion.shifting(found.table, found.atoms, found.stagnation), shares[None, :])
    throat = expansion.throat(isentrope)
    cstar = _cstar(found.stagnation.pressure, throat)
    return replace(found, throat=throat, characteristic_velocity=cstar, shares=shares)


def _cstar(pressure: Array, throat: FlowState) -> Array:
    """Return p0 over the mass flux of the throat; infinite where a case has none."""
    with np.errstate(divide="ignore", invalid="ignore"):
        return np.asarray(pressure / throat.mass_flux)


def _wide(table: SpeciesTable, mixture: Mixture, p: Array, ratio: Array) -> Combustion:
    face = equilibrium.solve(table, mixture.atoms, pressure=p, enthalpy=mixture.enthalpy)
    face = replace(face, pressure=p)
    throat = expansion.throat(expansion.shifting(table, mixture.atoms, face))
    cstar = _cstar(p, throat)
    return Combustion(table, mixture.atoms, mixture.enthalpy, face, face, np.zeros(len(p)), face, throat, ratio, cstar)


def _contracted(table: SpeciesTable, mixture: Mixture, pressure: Array, ratio: Array, pressure_at: str) -> Combustion:
    found = combustor.combustor(table, mixture.atoms, mixture.enthalpy, pressure, ratio, pressure_at)
    cstar = _cstar(found.stagnation.pressure, found.throat)
    return Combustion(
        table,
        mixture.atoms,
        mixture.enthalpy,
        found.injector,
        found.inlet,
        found.inlet_velocity,
        found.stagnation,
        found.throat,
        ratio,
        cstar,
    )


def _held(table: SpeciesTable, mixture: Mixture, pressure: Array, ratio: Array, pressure_at: str) -> Combustion:
    """Return the reservoir of a gas of given composition, with the conservation laws of a combustor where the contraction is finite.

    Composition and stagnation temperature do not depend on pressure, so neither do the ratios of the pressures along the isentrope:
    one expansion from the quoted pressure gives them.
    """
    assert mixture.composition is not None
    table = table.take([table.names.index(name) for name in mixture.composition])
    amounts = np.stack([np.broadcast_to(mixture.composition[name], pressure.shape) for name in table.names], axis=1)
    temperature = held_gas.held_temperature(table, amounts, mixture.enthalpy)
    finite = np.isfinite(ratio)

    def at_rest(p: Array) -> EquilibriumState:
        return held_gas.held_state(table, amounts, p, temperature)

    def inside(rest: EquilibriumState) -> tuple[FlowState, FlowState]:
        isentrope = expansion.frozen(table, amounts, rest.enthalpy, rest.entropy, rest.pressure, rest.temperature)
        throat = expansion.throat(isentrope)
        wide = np.where(finite, ratio, 1e6)
        return throat, expansion.at_area_ratio(isentrope, throat.mass_flux, wide, throat, supersonic=False)

    _, inlet = inside(at_rest(pressure))
    static = np.where(finite, inlet.pressure / pressure, 1.0)
    face = np.where(finite, (inlet.pressure + inlet.density * inlet.velocity**2) / pressure, 1.0)
    quoted = {"injector": face, "nozzle stagnation": np.ones_like(face), "nozzle inlet static": static}[pressure_at]
    rest = at_rest(pressure / quoted)
    throat, inlet = inside(rest)
    return Combustion(
        table,
        mixture.atoms,
        mixture.enthalpy,
        at_rest(pressure if pressure_at == "injector" else rest.pressure * face),
        held_gas.held_state(table, amounts, rest.pressure * static, np.where(finite, inlet.temperature, temperature)),
        np.where(finite, inlet.velocity, 0.0),
        rest,
        throat,
        ratio,
        rest.pressure / throat.mass_flux,
        held=True,
    )


@dataclass(frozen=True, slots=True, eq=False)
class GivenGas:
    """A gas of given properties at rest and at the nozzle inlet, a batch."""

    isentropic_exponent: Array
    gas_constant: Array
    temperature: Array
    injector_pressure: Array
    stagnation_pressure: Array
    contraction_ratio: Array
    characteristic_velocity: Array

    def raise_for_status(self, what: str, index: int = 0) -> None:
        """Do nothing: closed forms always converge."""

    def specific_heat(self, index: int = 0) -> float:
        """Return the isobaric heat capacity [J/(kg K)]."""
        gamma = float(self.isentropic_exponent[index])
        return gamma / (gamma - 1.0) * float(self.gas_constant[index])

    def injector_values(self, index: int = 0) -> dict[str, float]:
        """Return the state at the injector face as the properties of a station."""
        pressure, temperature = float(self.injector_pressure[index]), float(self.temperature[index])
        gas_constant, gamma = float(self.gas_constant[index]), float(self.isentropic_exponent[index])
        return {
            "pressure": pressure,
            "temperature": temperature,
            "density": pressure / (gas_constant * temperature),
            "velocity": 0.0,
            "mach": 0.0,
            "sound_speed": float(np.sqrt(gamma * gas_constant * temperature)),
            "molar_mass": GAS_CONSTANT / gas_constant,
            "isentropic_exponent": gamma,
        }


def given_gas(
    *,
    pressure: Values,
    temperature: Values,
    gas_constant: Values,
    isentropic_exponent: Values,
    contraction_ratio: Values = np.inf,
    pressure_at: str = "injector",
) -> GivenGas:
    """Return the reservoir of a gas of constant properties; arguments as for `combust`, temperature at rest [K]."""
    arrays = np.broadcast_arrays(
        *(np.atleast_1d(values(v)) for v in (pressure, temperature, gas_constant, isentropic_exponent, contraction_ratio))
    )
    p, t, r, gamma, ratio = (np.array(array) for array in arrays)
    injector, stagnation = combustor.constant_property_pressures(p, gamma, ratio, pressure_at)
    cstar = ideal_nozzle.characteristic_velocity(t, r, gamma)
    return GivenGas(gamma, r, t, injector, stagnation, ratio, np.asarray(cstar))


def sorted_fractions(table: SpeciesTable, amounts: Array) -> list[tuple[str, float]]:
    """Return species and mole fractions, the largest first."""
    fractions = amounts / amounts.sum()
    order = np.argsort(-fractions, kind="stable")
    return [(table.names[k], float(fractions[k])) for k in order]


def condensed_mass_fraction(table: SpeciesTable, amounts: Array) -> Array:
    """Return the mass of liquids and solids over the whole mass, shape (case,); zero for a table of gases."""
    return np.asarray(amounts[:, table.condensed] @ table.molar_mass[table.condensed])
