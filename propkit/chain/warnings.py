"""Doubts about states: outside the range of the data, or on the way to condensing."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from propkit.physics.arrays import Array
from propkit.physics.thermodynamics import SpeciesTable

CONCERNED = 1e-6
"""Mole fraction above which a species outside its range is worth a warning."""


def composition_range(
    table: SpeciesTable, amounts: Array, temperature: float, where: str, about: str
) -> Iterator[tuple[str, str, str]]:
    """Yield a doubt when species that matter are outside the range of their data."""
    fractions = amounts / amounts.sum()
    gas = ~table.condensed
    beyond = (
        gas & (fractions > CONCERNED) & ((temperature < table.temperature_low) | (temperature > table.temperature_high))
    )
    if beyond.any():
        names = ", ".join(table.names[k] for k in np.argsort(-fractions) if beyond[k])
        side = "below" if temperature < float(table.temperature_low[beyond].max()) else "above"
        limit = table.temperature_low[beyond].max() if side == "below" else table.temperature_high[beyond].min()
        text = f"At {where} the gas is at {temperature:.5g} K, {side} the {limit:g} K limit of the data of {names}; the heat capacity is held there."
        yield text, "data-range", about
