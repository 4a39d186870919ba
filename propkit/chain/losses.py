"""Loss stage: what the estimates of losses need of the chain."""

from __future__ import annotations

from typing import Any

import numpy as np

from propkit.chain import nozzle
from propkit.constants import STANDARD_GRAVITY
from propkit.physics.arrays import Array, Values, values


def impulse(found: nozzle.Expansion, ambient: Values) -> Array:
    """Return the loss-free specific impulse [s] of an expansion at an ambient pressure [Pa], shape (case,)."""
    there = found.exit
    push = (there.pressure - values(ambient)) * found.area_ratio / found.mass_flux
    return np.asarray((there.velocity + push) / STANDARD_GRAVITY)


def shifting_and_frozen(reservoir: Any, area_ratio: Values, ambient: Values, index: int = 0) -> tuple[float, float]:
    """Return the loss-free specific impulse [s] with equilibrium and with frozen composition.

    Parameters
    ----------
    reservoir : Combustion
        What the chamber stage yields.
    area_ratio : float
        Exit area over effective throat area [1].
    ambient : float
        Ambient pressure [Pa].
    index : int
        Case of the batch.

    Returns
    -------
    tuple of float
        Shifting, and frozen from the nozzle inlet.
    """
    made = []
    for flow, freeze_at in (("shifting", None), ("frozen", "chamber")):
        found = nozzle.expand(reservoir, flow=flow, freeze_at=freeze_at, area_ratio=area_ratio)
        found.raise_for_status("nozzle", index)
        made.append(float(impulse(found, ambient)[index]))
    return made[0], made[1]
