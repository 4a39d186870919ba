"""Case stage: from propellant streams and how much of each to atoms, enthalpy and bulk density per mass."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace

import numpy as np

from propkit.constants import GAS_CONSTANT
from propkit.data.atomic_weights import ATOMIC_WEIGHTS
from propkit.physics import balances, decomposition, stoichiometry
from propkit.physics.arrays import Array, Values, values
from propkit.physics.thermodynamics import SpeciesTable

AMOUNTS = ("mixture_ratio", "equivalence_ratio", "mixture_ratio_by_volume", "oxidizer_percent")
"""The ways to say how much oxidizer goes with the fuel; any one of them fixes the others."""

FUEL_RICH_LIMIT = 3.0
"""Equivalence ratio from which a gas counts as that of a fuel-rich gas generator; common practice, no source."""


@dataclass(frozen=True, slots=True, eq=False)
class Stream:
    """One propellant stream as stored: atoms [mol/kg], enthalpy [J/kg] and density [kg/m3] (NaN where unknown)."""

    elements: Mapping[str, float]
    enthalpy: Values
    density: Values = float("nan")


@dataclass(frozen=True, slots=True, eq=False)
class Mixture:
    """Propellant per mass for a batch: element symbols, atoms (case, element) [mol/kg], enthalpy [J/kg], bulk density [kg/m3].

    `condensed` says whether liquids and solids may form. `composition` holds moles of each species [mol/kg], shape (case,), where the
    composition of the gas is given instead of computed. `shares` has the mass of each case over the whole, shape (case,), where the cases
    are streams that flow side by side through one chamber and nozzle; the first is the core.
    """

    symbols: tuple[str, ...]
    atoms: Array
    enthalpy: Array
    density: Array
    condensed: bool = False
    composition: Mapping[str, Array] | None = None
    shares: Array | None = None


def element_order(streams: Sequence[Stream]) -> tuple[str, ...]:
    """Return the element symbols of the streams, sorted, those with no atoms left out."""
    return tuple(sorted({symbol for stream in streams for symbol, amount in stream.elements.items() if amount > 0.0}))


def two_streams(
    oxidizer: Stream,
    fuel: Stream,
    mixture_ratio: Values,
    additives: Sequence[tuple[Stream, float]] = (),
    condensed: bool = False,
) -> Mixture:
    """Return the mixture of two streams at each mixture ratio (shape (case,)).

    Parameters
    ----------
    oxidizer, fuel : Stream
        The two streams.
    mixture_ratio : float or array
        Mass of oxidizer over mass of fuel [1]; 0 is the fuel alone.
    additives : sequence of (Stream, float)
        Further streams, each with its mass over the whole mass [1].
    condensed : bool
        Whether liquids and solids may form.
    """
    symbols = element_order((oxidizer, fuel, *(stream for stream, _ in additives)))
    ratio = np.atleast_1d(values(mixture_ratio))
    atoms = stoichiometry.mix(ratio[:, None], _atoms(oxidizer, symbols), _atoms(fuel, symbols))
    enthalpy = stoichiometry.mix(ratio, oxidizer.enthalpy, fuel.enthalpy)
    volume = stoichiometry.mix(ratio, 1.0 / values(oxidizer.density), 1.0 / values(fuel.density))
    if additives:
        rest = 1.0 - sum(share for _, share in additives)
        atoms = rest * atoms + sum(share * _atoms(stream, symbols) for stream, share in additives)
        enthalpy = rest * enthalpy + sum(share * values(stream.enthalpy) for stream, share in additives)
        volume = rest * volume + sum(share / values(stream.density) for stream, share in additives)
    enthalpy, density = (np.array(np.broadcast_to(part, ratio.shape)) for part in (enthalpy, 1.0 / volume))
    return Mixture(symbols, np.array(np.broadcast_to(atoms, (ratio.size, len(symbols)))), enthalpy, density, condensed)


def core_and_film(
    oxidizer: Stream,
    fuel: Stream,
    mixture_ratio: float,
    film_fraction: float,
    film_mixture_ratio: float,
    additives: Sequence[tuple[Stream, float]] = (),
    condensed: bool = False,
) -> Mixture:
    """Return core and film of one design as two cases side by side.

    Parameters
    ----------
    oxidizer, fuel : Stream
        The two streams.
    mixture_ratio : float
        Mass of oxidizer over mass of fuel of the whole [1].
    film_fraction : float
        Mass of the film over the whole [1].
    film_mixture_ratio : float
        Mass of oxidizer over mass of fuel in the film [1]; 0 is fuel alone.
    additives, condensed
        As for `two_streams`.
    """
    core = core_ratio(mixture_ratio, film_fraction, film_mixture_ratio)
    both = two_streams(oxidizer, fuel, np.array([float(core), film_mixture_ratio]), additives, condensed)
    return replace(both, shares=np.array([1.0 - film_fraction, film_fraction]))


def core_ratio(mixture_ratio: Values, film_fraction: Values, film_mixture_ratio: Values) -> Array:
    """Return the mixture ratio that is left for the core beside a film."""
    return stoichiometry.core_mixture_ratio(mixture_ratio, film_fraction, film_mixture_ratio)


def one_stream(stream: Stream, count: int = 1, condensed: bool = False) -> Mixture:
    """Return the mixture of a single stream, repeated `count` times."""
    symbols = element_order((stream,))
    atoms = np.tile(_atoms(stream, symbols), (count, 1))
    enthalpy, density = (np.array(np.broadcast_to(values(part), (count,))) for part in (stream.enthalpy, stream.density))
    return Mixture(symbols, atoms, enthalpy, density, condensed)


def repeated(mixture: Mixture, count: int) -> Mixture:
    """Return a mixture of one case repeated `count` times."""
    atoms, enthalpy, density = (np.repeat(part, count, axis=0) for part in (mixture.atoms, mixture.enthalpy, mixture.density))
    held = mixture.composition
    composition = None if held is None else {name: np.repeat(amount, count) for name, amount in held.items()}
    return replace(mixture, atoms=atoms, enthalpy=enthalpy, density=density, composition=composition)


def hydrazine_bed(stream: Stream, ammonia_dissociation: float, molar_mass: float) -> Mixture:
    """Return hydrazine decomposed to the composition that an ammonia dissociation fixes.

    Parameters
    ----------
    stream : Stream
        Hydrazine as stored.
    ammonia_dissociation : float
        Part of the ammonia that dissociates [1], 0 to 1.
    molar_mass : float
        Molar mass of hydrazine [kg/mol].
    """
    whole = one_stream(stream)
    products = decomposition.hydrazine_products(ammonia_dissociation)
    composition = {name: np.array([moles / molar_mass]) for name, moles in products.items()}
    return Mixture(whole.symbols, whole.atoms, whole.enthalpy, whole.density, composition=composition)


def unreacted_gas(table: SpeciesTable, mole_fractions: Mapping[str, float], temperature: float, density: float = float("nan")) -> Mixture:
    """Return a gas that expands with the composition it is stored with, as an ideal gas.

    Parameters
    ----------
    table : SpeciesTable
        Species of its elements.
    mole_fractions : mapping
        Species key -> mole fraction [1].
    temperature : float
        T as stored [K].
    density : float
        Density in the tank [kg/m3]; NaN where it is not known.
    """
    rows = [table.names.index(name) for name in mole_fractions]
    fractions = np.array(list(mole_fractions.values()))
    moles = fractions / float(fractions @ table.molar_mass[rows])
    composition = {name: np.array([amount]) for name, amount in zip(mole_fractions, moles, strict=True)}
    atoms = (moles @ table.composition[rows])[None, :]
    whole = Mixture(table.elements, atoms, np.zeros(1), np.array([density]), composition=composition)
    return replace(whole, enthalpy=np.array([ideal_enthalpy(table, whole, temperature)]))


def ideal_enthalpy(table: SpeciesTable, mixture: Mixture, temperature: float) -> float:
    """Return the enthalpy of a gas of given composition at a temperature [K], per mass [J/kg]."""
    assert mixture.composition is not None
    per_mole = table.properties(temperature).enthalpy[0] * GAS_CONSTANT * temperature
    return float(sum(amount[0] * per_mole[table.names.index(name)] for name, amount in mixture.composition.items()))


def oxygen_balance(mixture: Mixture) -> Array:
    """Return the oxygen balance of each case of a mixture [1]; NaN where an element has no valence."""
    atoms = dict(zip(mixture.symbols, mixture.atoms.T, strict=True))
    return stoichiometry.oxygen_balance(atoms, ATOMIC_WEIGHTS["O"] * 1e-3)


def _atoms(stream: Stream, symbols: Sequence[str]) -> Array:
    return np.array([stream.elements.get(symbol, 0.0) for symbol in symbols])


def mixture_ratio_of(oxidizer: Stream, fuel: Stream, equivalence_ratio: Values) -> Array:
    """Return the mixture ratio of an equivalence ratio (stoichiometric over actual)."""
    stoichiometric = stoichiometry.stoichiometric_mixture_ratio(oxidizer.elements, fuel.elements)
    return balances.mixture_ratio(stoichiometric, equivalence_ratio)


def mixture_ratio_from(oxidizer: Stream, fuel: Stream, name: str, value: Values) -> Array:
    """Return the mixture ratio by mass from one of `AMOUNTS`; NaN where the streams do not allow it.

    Parameters
    ----------
    oxidizer, fuel : Stream
        The two streams.
    name : str
        Which of `AMOUNTS` is given.
    value : float or array
        Its value.
    """
    if name == "mixture_ratio":
        return values(value)
    if name == "equivalence_ratio":
        return mixture_ratio_of(oxidizer, fuel, value)
    if name == "mixture_ratio_by_volume":
        return stoichiometry.ratio_from_volumes(value, oxidizer.density, fuel.density)
    return stoichiometry.ratio_from_percent(value)


def amounts_of(oxidizer: Stream, fuel: Stream, mixture_ratio: Values) -> dict[str, Array]:
    """Return every one of `AMOUNTS` and the stoichiometric ratio at a mixture ratio by mass; NaN where the streams do not allow it."""
    stoichiometric = values(mixture_ratio_of(oxidizer, fuel, 1.0))
    return {
        "mixture_ratio": values(mixture_ratio),
        "stoichiometric_mixture_ratio": stoichiometric,
        "equivalence_ratio": balances.equivalence_ratio(stoichiometric, mixture_ratio),
        "mixture_ratio_by_volume": stoichiometry.ratio_of_volumes(mixture_ratio, oxidizer.density, fuel.density),
        "oxidizer_percent": stoichiometry.percent_of_ratio(mixture_ratio),
    }
