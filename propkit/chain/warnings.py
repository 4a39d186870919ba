"""Doubts about states: outside the range of the data, or on the way to condensing."""

from __future__ import annotations

from collections.abc import Iterator
from typing import Any

import numpy as np

from propkit.physics import saturation
from propkit.physics.arrays import Array
from propkit.physics.thermodynamics import SpeciesTable

CONCERNED = 1e-6
"""Mole fraction above which a species outside its range, or a supersaturated vapour, is worth a warning."""


def times(ratio: float) -> str:
    """Return a saturation ratio in words: beyond a million its size tells nothing more."""
    return f"{ratio:.3g}" if ratio < 1e6 else "over a million"


def composition_range(table: SpeciesTable, amounts: Array, temperature: float, where: str, about: str) -> Iterator[tuple[str, str, str]]:
    """Yield a doubt when species that matter are outside the range of their data."""
    fractions = amounts / amounts.sum()
    gas = ~table.condensed
    beyond = gas & (fractions > CONCERNED) & ((temperature < table.temperature_low) | (temperature > table.temperature_high))
    if beyond.any():
        names = ", ".join(table.names[k] for k in np.argsort(-fractions) if beyond[k])
        side = "below" if temperature < float(table.temperature_low[beyond].max()) else "above"
        limit = table.temperature_low[beyond].max() if side == "below" else table.temperature_high[beyond].min()
        text = f"At {where} the gas is at {temperature:.5g} K, {side} the {limit:g} K limit of the data of {names}; the heat capacity is held there."
        yield text, "data-range", about


WATCHED = {"C": "carbon", "H2O": "water"}
"""Substances whose liquids and solids are watched in a gas-only composition: name in the species data -> name in words."""


def watched_phases(table: SpeciesTable) -> SpeciesTable | None:
    """Return the liquids and solids to watch out of a table with condensed species; None when it has none of them."""
    rows = [row for row, name in enumerate(table.names) if table.condensed[row] and name.partition(" (")[0] in WATCHED]
    return table.take(rows) if rows else None


def supersaturation(phases: SpeciesTable | None, table: SpeciesTable, state: Any, where: str, about: str) -> Iterator[tuple[str, str, str]]:
    """Yield a doubt when a gas-only state holds more carbon or water vapour than a condensed phase would allow.

    Parameters
    ----------
    phases : SpeciesTable
        The liquids and solids to watch, of the elements of `table`; None for none.
    table : SpeciesTable
        The species of the gas.
    state : EquilibriumState or FlowState
        A batch of one; a state of held composition is judged by its vapours alone.
    where, about : str
        Place in words, and the result concerned.
    """
    if phases is None:
        return
    potentials = getattr(state, "element_potentials", None)
    if potentials is None and getattr(state, "equilibrium", None) is not None:
        potentials = state.equilibrium.element_potentials
    if potentials is not None and np.isfinite(potentials).all():
        ratios = saturation.saturation_ratios(phases, state.temperature, potentials)[0]
    else:
        # a vapour of held composition that is next to nothing has next to nothing to give to a liquid or solid
        vapours = np.where(state.amounts > CONCERNED * state.amounts.sum(axis=1, keepdims=True), state.amounts, 0.0)
        ratios = saturation.vapour_saturation_ratios(phases, table, state.temperature, state.pressure, vapours)[0]
    present = (state.amounts[0] @ table.composition) > 0.0
    possible = ~(phases.composition[:, ~present] > 0.0).any(axis=1)
    ratios = np.where(possible, ratios, 0.0)
    for key, words in WATCHED.items():
        found = [float(ratio) for name, ratio in zip(phases.names, ratios, strict=True) if name.partition(" (")[0] == key]
        largest = max(found, default=0.0)
        if largest > 1.0:
            text = (
                f"At {where} the gas is supersaturated with {words} (saturation ratio {times(largest)}), but only gases are counted; "
                f"condensed=True on the case lets it form."
            )
            yield text, "supersaturation", about
