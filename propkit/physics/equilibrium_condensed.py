"""Liquids and solids in the equilibrium: an active set of pure phases around the plain iteration.

Each case has a few slots. Solved with the phases it has, a case gives up the phase whose amount is most negative, or else
takes the phase that is most supersaturated for each of its atoms; when neither is left it is done. Both phases of a
substance may be active at given (p, h) and (p, s): their two rows fix the temperature and the energy row the split, so a
melting plateau needs nothing special. At given (p, T) one takes the place of the other.

A phase may form up to a little above its table, and without limit below it, where its other phase wins by itself.

Source: Smith & Missen, Chemical Reaction Equilibrium Analysis (1982), chapter 9 on the phase rule and stability.
"""

from __future__ import annotations

from dataclasses import replace
from typing import Final

import numpy as np
import numpy.typing as npt

from propkit.physics.arrays import Array
from propkit.physics.equilibrium_newton import iterate
from propkit.physics.equilibrium_terms import Integers, Outcome, Problem, Unknowns
from propkit.physics.thermodynamics import SpeciesTable

SLOTS: Final = 4
"""Liquids and solids that a case can hold at once."""

_ROUNDS: Final = 40
_ABOVE_TABLE: Final = 20.0
"""How far above its table [K] a liquid or solid may form."""

_SUPERSATURATION: Final = 1e-9
"""ln of the saturation ratio for each atom above which a phase forms."""


def iterate_phases(problem: Problem, start: Unknowns, iterations: int = 100) -> Outcome:
    """Iterate every case to convergence with the phases that are stable there.

    Parameters
    ----------
    problem : Problem
        The batch; its table has liquids and solids.
    start : Unknowns
        First guess, with slots.
    iterations : int
        Steps allowed for each set of phases.

    Returns
    -------
    Outcome
        The end of each case; converged only with a stable set of phases.
    """
    number = np.arange(start.log_moles.size)
    found = iterate(problem, start, iterations)
    steps = found.iterations.copy()
    for _ in range(_ROUNDS):
        part = found.take(number)
        x, changed = _change(problem, part)
        found.converged[number[changed]] = False
        number = number[changed]
        if not number.size:
            break
        again = iterate(_part(problem, number), x.take(changed), iterations)
        steps[number] += again.iterations
        found.put(number, again)
    else:
        found.converged[number[_change(_part(problem, number), found.take(number))[1]]] = False
    found.iterations[:] = steps
    return found


def _part(problem: Problem, number: Integers) -> Problem:
    return replace(problem, elements=problem.elements[number], target=problem.target[number])


def _change(problem: Problem, found: Outcome) -> tuple[Unknowns, npt.NDArray[np.bool_]]:
    """Return the unknowns with one phase dropped or added where the set is not stable, and which cases changed."""
    x = found.unknowns
    temperature = np.exp(x.log_temperature)
    active = x.slots >= 0
    rows = np.arange(temperature.size)
    worst = np.where(active, x.slot_amounts, np.inf).argmin(axis=1)
    drop = active.any(axis=1) & (~found.converged | (x.slot_amounts[rows, worst] < 0.0))
    affinity, best = _most_supersaturated(problem.table, x, temperature)
    place = _place(problem, x, best)
    add = ~drop & found.converged & (affinity > _SUPERSATURATION) & (place >= 0)
    cap = np.where(active, problem.table.temperature_high[np.where(active, x.slots, 0)] + _ABOVE_TABLE, np.inf)
    beyond = ~drop & ~add & (temperature[:, None] > cap).any(axis=1)
    worst = np.where(beyond, (temperature[:, None] - cap).argmax(axis=1), worst)
    drop |= beyond
    x.slots[rows[drop], worst[drop]] = -1
    x.slot_amounts[rows[drop], worst[drop]] = 0.0
    x.slot_amounts[rows[add], place[add]] *= x.slots[rows[add], place[add]] >= 0
    x.slots[rows[add], place[add]] = best[add]
    return x, drop | add


def _most_supersaturated(table: SpeciesTable, x: Unknowns, temperature: Array) -> tuple[Array, Integers]:
    """Return the largest ln of the saturation ratio for each atom among the phases not active, and whose it is."""
    gas = table.gas_count
    atoms = table.composition[gas:]
    affinity = saturation(table, x.potentials, temperature) / atoms.sum(axis=1)
    affinity[temperature[:, None] > table.temperature_high[gas:] + _ABOVE_TABLE] = -np.inf
    rows, slots = np.nonzero(x.slots >= 0)
    affinity[rows, x.slots[rows, slots] - gas] = -np.inf
    best = affinity.argmax(axis=1)
    return affinity[np.arange(temperature.size), best], best + gas


def saturation(table: SpeciesTable, potentials: Array, temperature: Array) -> Array:
    """Return ln of the saturation ratio of each liquid and solid.

    Parameters
    ----------
    table : SpeciesTable
        The species, with liquids and solids.
    potentials : array
        Element potentials over R T, shape (case, element).
    temperature : array
        T [K], shape (case,).

    Returns
    -------
    array
        Sum of the element potentials of its atoms less its Gibbs energy over R T, shape (case, liquid or solid).
    """
    gas = table.gas_count
    return np.asarray(potentials @ table.composition[gas:].T - table.properties(temperature).gibbs_energy[:, gas:])


def _place(problem: Problem, x: Unknowns, best: Integers) -> Integers:
    """Return the slot for a new phase: at given temperature that of the same substance, else an empty one, else -1."""
    empty = x.slots < 0
    place = np.where(empty.any(axis=1), empty.argmax(axis=1), -1)
    if problem.given != "temperature":
        return place
    shares = problem.table.composition / problem.table.composition.sum(axis=1, keepdims=True)
    same = ~empty & (np.abs(shares[np.where(empty, 0, x.slots)] - shares[best][:, None, :]).max(axis=2) < 1e-12)
    return np.where(same.any(axis=1), same.argmax(axis=1), place)
