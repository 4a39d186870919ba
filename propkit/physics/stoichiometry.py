"""Mixture arithmetic: valences, stoichiometric mixture ratio, mixing of two streams by mass."""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np

from propkit.physics.arrays import Array, Values, values

VALENCES: Mapping[str, int] = {
    "C": 4, "H": 1, "O": -2, "N": 0, "F": -1, "Cl": -1, "Br": -1, "I": -1, "Al": 3, "B": 3, "Be": 2, "Li": 1, "Na": 1, "K": 1,
    "Mg": 2, "Ca": 2, "Si": 4, "S": 4, "P": 5, "Ti": 4, "Zr": 4, "Fe": 3, "He": 0, "Ne": 0, "Ar": 0, "Kr": 0, "Xe": 0,
}  # fmt: skip
"""Oxidation valence of each element in the burnt products; those of C, H, Al, O, F, Cl, N and noble gases are the usual ones."""


def net_valence(elements: Mapping[str, float]) -> float:
    """Return the net oxidation valence of a set of atoms.

    Parameters
    ----------
    elements : mapping
        Element symbol -> moles of atoms, per formula unit [1] or per mass [mol/kg].

    Returns
    -------
    float
        Positive for a fuel, negative for an oxidizer, in the unit of `elements`.

    Raises
    ------
    KeyError
        For an element without a valence in `VALENCES`.

    Notes
    -----
    Methane: 4 + 4 = 8; oxygen: -4; so 16 g of methane take 2 mol of oxygen.

    Source
    ------
    Common practice, no source.
    """
    return float(sum(VALENCES[symbol] * amount for symbol, amount in elements.items()))


def stoichiometric_mixture_ratio(oxidizer: Mapping[str, float], fuel: Mapping[str, float]) -> float:
    """Return the mixture ratio by mass at which the valences balance.

    Parameters
    ----------
    oxidizer, fuel : mapping
        Element symbol -> moles of atoms per mass of the stream [mol/kg].

    Returns
    -------
    float
        Mass of oxidizer over mass of fuel [1]; NaN where the pair cannot balance (a fuel and a fuel), or an element
        has no valence in `VALENCES`.

    Notes
    -----
    r_st = V_fuel / -V_oxidizer with the net valences per mass of both streams.

    Source
    ------
    Common practice, no source.
    """
    if not {*fuel, *oxidizer} <= set(VALENCES):
        return float("nan")
    rich, lean = net_valence(fuel), net_valence(oxidizer)
    return rich / -lean if rich > 0.0 and lean < 0.0 else float("nan")


def mix(mixture_ratio: Values, oxidizer: Values, fuel: Values) -> Array:
    """Return a per-mass property of a mixture of two streams.

    Parameters
    ----------
    mixture_ratio : float or array
        Mass of oxidizer over mass of fuel [1], shape (case,) or scalar, above 0.
    oxidizer, fuel : float or array
        The property per mass of each stream, broadcast against the ratio (enthalpy [J/kg], atoms [mol/kg], volume [m3/kg]).

    Returns
    -------
    array
        (r x_oxidizer + x_fuel) / (1 + r), in the unit of the property.

    Source
    ------
    Definition.
    """
    ratio = values(mixture_ratio)
    return np.asarray((ratio * values(oxidizer) + values(fuel)) / (1.0 + ratio))


def bulk_density(mixture_ratio: Values, oxidizer_density: Values, fuel_density: Values) -> Array:
    """Return the mass of both propellants over the volume they fill.

    Parameters
    ----------
    mixture_ratio : float or array
        Mass of oxidizer over mass of fuel [1], above 0.
    oxidizer_density, fuel_density : float or array
        Densities as stored [kg/m3], above 0.

    Returns
    -------
    array
        Bulk density [kg/m3].

    Notes
    -----
    rho_b = (1 + r) / (r/rho_ox + 1/rho_fu).

    Source
    ------
    Definition.
    """
    return 1.0 / mix(mixture_ratio, 1.0 / values(oxidizer_density), 1.0 / values(fuel_density))


def oxygen_balance(elements: Mapping[str, Values], oxygen_mass: float) -> Array:
    """Return the mass of oxygen left over (positive) or missing (negative) for complete combustion, over the mass.

    Parameters
    ----------
    elements : mapping
        Element symbol -> moles of atoms per mass [mol/kg], floats or arrays of shape (case,).
    oxygen_mass : float
        Molar mass of an oxygen atom [kg/mol].

    Returns
    -------
    array
        Oxygen balance [1]; NaN where an element has no valence in `VALENCES`.

    Notes
    -----
    -V M_O / 2 with the net valence V per mass; carbon burns to CO2, hydrogen to H2O, aluminium to Al2O3, and chlorine and fluorine
    take hydrogen. Ammonium perchlorate: +0.34; ammonium nitrate: +0.20.

    Source
    ------
    Common practice, no source.
    """
    if not set(elements) <= set(VALENCES):
        return np.full(np.shape(next(iter(elements.values()))), np.nan)
    return np.asarray(-0.5 * oxygen_mass * sum(VALENCES[symbol] * values(amount) for symbol, amount in elements.items()))


def ratio_of_volumes(mixture_ratio: Values, oxidizer_density: Values, fuel_density: Values) -> Array:
    """Return the mixture ratio by volume.

    Parameters
    ----------
    mixture_ratio : float or array
        Mass of oxidizer over mass of fuel [1].
    oxidizer_density, fuel_density : float or array
        Densities as stored [kg/m3].

    Returns
    -------
    array
        Volume of oxidizer over volume of fuel [1]: r rho_fu / rho_ox.

    Source
    ------
    Definition.
    """
    return np.asarray(values(mixture_ratio) * values(fuel_density) / values(oxidizer_density))


def ratio_from_volumes(mixture_ratio_by_volume: Values, oxidizer_density: Values, fuel_density: Values) -> Array:
    """Return the mixture ratio by mass of one by volume; arguments and inverse as for `ratio_of_volumes`.

    Parameters
    ----------
    mixture_ratio_by_volume : float or array
        Volume of oxidizer over volume of fuel [1].
    oxidizer_density, fuel_density : float or array
        Densities as stored [kg/m3].

    Returns
    -------
    array
        Mass of oxidizer over mass of fuel [1].

    Source
    ------
    Definition.
    """
    return np.asarray(values(mixture_ratio_by_volume) * values(oxidizer_density) / values(fuel_density))


def percent_of_ratio(mixture_ratio: Values) -> Array:
    """Return the percent oxidizer of a mixture ratio.

    Parameters
    ----------
    mixture_ratio : float or array
        Mass of oxidizer over mass of fuel [1].

    Returns
    -------
    array
        Mass of oxidizer over mass of both [percent].

    Source
    ------
    Definition.
    """
    ratio = values(mixture_ratio)
    return np.asarray(100.0 * ratio / (1.0 + ratio))


def ratio_from_percent(oxidizer_percent: Values) -> Array:
    """Return the mixture ratio of a percent oxidizer.

    Parameters
    ----------
    oxidizer_percent : float or array
        Mass of oxidizer over mass of both [percent], below 100.

    Returns
    -------
    array
        Mass of oxidizer over mass of fuel [1].

    Source
    ------
    Definition.
    """
    percent = values(oxidizer_percent)
    return np.asarray(percent / (100.0 - percent))


def core_mixture_ratio(mixture_ratio: Values, film_fraction: Values, film_mixture_ratio: Values) -> Array:
    """Return the mixture ratio that is left for the core beside a film.

    Parameters
    ----------
    mixture_ratio : float or array
        Mass of oxidizer over mass of fuel of the whole [1].
    film_fraction : float or array
        Mass of the film over the whole [1], below 1.
    film_mixture_ratio : float or array
        Mass of oxidizer over mass of fuel in the film [1].

    Returns
    -------
    array
        Mass of oxidizer over mass of fuel in the core [1]; negative or infinite where the film would take more than there is.

    Notes
    -----
    With w = r/(1 + r) the oxidizer share: w_core = (w - f w_film)/(1 - f), r_core = w_core/(1 - w_core).

    Source
    ------
    Conservation of mass.
    """
    whole, film, share = (values(part) for part in (mixture_ratio, film_mixture_ratio, film_fraction))
    oxidizer = whole / (1.0 + whole) - share * film / (1.0 + film)
    with np.errstate(divide="ignore"):
        return np.asarray(oxidizer / (1.0 - share - oxidizer))
