"""How near a gas is to forming a liquid or solid that is left out of its composition."""

from __future__ import annotations

from typing import Final

import numpy as np

from propkit.physics.arrays import Array, Values, values
from propkit.physics.thermodynamics import SpeciesTable

ABOVE_TABLE: Final = 20.0
"""Temperature [K] above the range of a liquid or solid up to which it is still looked at; below its range it always is."""

LARGEST: Final = 700.0
"""Logarithm [1] at which a saturation ratio is cut off, below the largest float: cold exits reach it."""


def saturation_ratios(phases: SpeciesTable, temperature: Values, potentials: Array) -> Array:
    """Return the saturation ratio of liquids and solids over a gas in equilibrium.

    Parameters
    ----------
    phases : SpeciesTable
        The liquids and solids.
    temperature : float or array
        T [K], shape (case,).
    potentials : array
        Chemical potential of each element over R T, shape (case, element).

    Returns
    -------
    array
        Activity that the phase would have [1], shape (case, phase): above 1 it would form; zero well above the range of its data.

    Notes
    -----
    ln S_c = sum a_ic pi_i - g_c(T)/(R T); for a single vapour that is its partial pressure over the vapour pressure.

    Source: Smith & Missen, Chemical Reaction Equilibrium Analysis (1982).
    """
    t = np.atleast_1d(values(temperature))
    with np.errstate(invalid="ignore", over="ignore"):
        ratios = np.exp(potentials @ phases.composition.T - phases.properties(t).gibbs_energy)
    return np.where(t[:, None] > phases.temperature_high + ABOVE_TABLE, 0.0, ratios)


def vapour_saturation_ratios(phases: SpeciesTable, gas: SpeciesTable, temperature: Values, pressure: Values, amounts: Array) -> Array:
    """Return the saturation ratio of liquids and solids over a gas of held composition that has their vapour.

    Parameters
    ----------
    phases : SpeciesTable
        The liquids and solids.
    gas : SpeciesTable
        The species of the gas, of the same elements.
    temperature, pressure : float or array
        T [K] and p [Pa], shape (case,).
    amounts : array
        Moles of each species of `gas` in a kilogram [mol/kg], shape (case, species).

    Returns
    -------
    array
        Partial pressure of the vapour over its vapour pressure [1], shape (case, phase); zero where the gas has no vapour of the same
        formula, or well above the range of the data.

    Notes
    -----
    ln S_c = g_vapour(T)/(R T) + ln(x p / p_ref) - g_c(T)/(R T).

    Source: definition.
    """
    t, p = (np.atleast_1d(values(part)) for part in (temperature, pressure))
    ratios = np.zeros((t.size, len(phases.names)))
    gibbs, vapour_gibbs = phases.properties(t).gibbs_energy, gas.properties(t).gibbs_energy
    moles = amounts[:, : gas.gas_count].sum(axis=1)
    for place in range(len(phases.names)):
        same = (gas.composition[: gas.gas_count] == phases.composition[place]).all(axis=1)
        if not same.any():
            continue
        vapour = int(np.flatnonzero(same)[0])
        partial = amounts[:, vapour] / moles * p / gas.reference_pressure
        with np.errstate(divide="ignore"):  # no vapour at all: the logarithm is minus infinity, the ratio zero
            logarithm = np.log(partial) + vapour_gibbs[:, vapour] - gibbs[:, place]
        ratios[:, place] = np.exp(np.minimum(logarithm, LARGEST))
    return np.where(t[:, None] > phases.temperature_high + ABOVE_TABLE, 0.0, ratios)
