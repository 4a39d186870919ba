"""Case stage: from propellant streams and a mixture ratio to atoms, enthalpy and bulk density per mass."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np

from propkit.physics import stoichiometry
from propkit.physics.arrays import Array, Values, values


@dataclass(frozen=True, slots=True, eq=False)
class Stream:
    """One propellant stream as stored: atoms [mol/kg], enthalpy [J/kg] and density [kg/m3] (NaN where unknown)."""

    elements: Mapping[str, float]
    enthalpy: Values
    density: Values = float("nan")


@dataclass(frozen=True, slots=True, eq=False)
class Mixture:
    """Propellant per mass for a batch: element symbols, atoms (case, element) [mol/kg], enthalpy [J/kg], bulk density [kg/m3]."""

    symbols: tuple[str, ...]
    atoms: Array
    enthalpy: Array
    density: Array


def element_order(streams: Sequence[Stream]) -> tuple[str, ...]:
    """Return the element symbols of the streams, sorted, those with no atoms left out."""
    return tuple(sorted({symbol for stream in streams for symbol, amount in stream.elements.items() if amount > 0.0}))


def two_streams(oxidizer: Stream, fuel: Stream, mixture_ratio: Values) -> Mixture:
    """Return the mixture of two streams at each mixture ratio (shape (case,))."""
    symbols = element_order((oxidizer, fuel))
    ratio = np.atleast_1d(values(mixture_ratio))
    both = [np.array([stream.elements.get(symbol, 0.0) for symbol in symbols]) for stream in (oxidizer, fuel)]
    atoms = stoichiometry.mix(ratio[:, None], both[0], both[1])
    enthalpy = np.broadcast_to(stoichiometry.mix(ratio, oxidizer.enthalpy, fuel.enthalpy), ratio.shape)
    density = np.broadcast_to(stoichiometry.bulk_density(ratio, oxidizer.density, fuel.density), ratio.shape)
    return Mixture(symbols, atoms, np.array(enthalpy), np.array(density))


def one_stream(stream: Stream, count: int = 1) -> Mixture:
    """Return the mixture of a single stream, repeated `count` times."""
    symbols = element_order((stream,))
    atoms = np.tile([stream.elements[symbol] for symbol in symbols], (count, 1))
    enthalpy = np.array(np.broadcast_to(values(stream.enthalpy), (count,)))
    return Mixture(symbols, atoms, enthalpy, np.array(np.broadcast_to(values(stream.density), (count,))))


def mixture_ratio_of(oxidizer: Stream, fuel: Stream, equivalence_ratio: Values) -> Array:
    """Return the mixture ratio of an equivalence ratio (stoichiometric over actual)."""
    return stoichiometry.stoichiometric_mixture_ratio(oxidizer.elements, fuel.elements) / values(equivalence_ratio)
