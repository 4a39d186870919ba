"""Performance stage: from an expanded and sized nozzle and an ambient pressure to thrust and its ratios."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from types import MappingProxyType
from typing import Final

import numpy as np

from propkit.constants import STANDARD_GRAVITY
from propkit.physics import thrust
from propkit.physics.arrays import Array, Values, values
from propkit.physics.losses import divergence_ratio

NO_LOSSES: Final[Mapping[str, float]] = MappingProxyType({})
"""The default: nothing is taken off."""


@dataclass(frozen=True, slots=True, eq=False)
class Delivery:
    """Thrust and its ratios at the ambient pressure and in vacuum, and the delivered mass flow, shape (case,), SI."""

    thrust: Array
    specific_impulse: Array
    thrust_coefficient: Array
    effective_exhaust_velocity: Array
    thrust_vacuum: Array
    specific_impulse_vacuum: Array
    thrust_coefficient_vacuum: Array
    mass_flow: Array


def deliver(
    *,
    mass_flow: Values,
    exit_velocity: Values,
    exit_pressure: Values,
    exit_area: Values,
    throat_area: Values,
    stagnation_pressure: Values,
    ambient: Values,
    cstar_efficiency: Values = 1.0,
    divergence_factor: Values = 1.0,
    losses: Mapping[str, Values] = NO_LOSSES,
) -> Delivery:
    """Return the full-flowing thrust and its ratios, with the losses taken off in their order.

    Parameters
    ----------
    mass_flow : float or array
        Mass flow of the nozzle [kg/s], c* efficiency included.
    exit_velocity, exit_pressure, exit_area, throat_area, stagnation_pressure, ambient : float or array
        Ideal exit velocity [m/s], pressures [Pa] and areas [m2].
    cstar_efficiency, divergence_factor : float or array
        Delivered over theoretical characteristic velocity [1]; share of the exit momentum along the axis [1].
    losses : mapping
        Ratio of specific impulse at the ambient pressure by name of the loss, of those that neither a chamber nor a contour
        brings: ``"energy release"``, ``"kinetics"``, ``"boundary layer"``, ``"two-phase"``.

    Returns
    -------
    Delivery
        Delivered values.

    Notes
    -----
    The delivered momentum velocity is the ideal one times the c* efficiency, so that the larger mass flow of an incomplete
    combustion leaves the thrust unchanged; an energy release among the losses does the same. The thrust that a loss costs
    does not depend on the ambient pressure, so that thrust falls by the ambient pressure times the exit area at every altitude.
    """
    velocity = values(cstar_efficiency) * values(exit_velocity)
    ideal = thrust.thrust(mass_flow, velocity, exit_pressure, ambient, exit_area)
    push = (values(exit_pressure) - values(ambient)) * values(exit_area)
    there = ideal * values(losses.get("kinetics", 1.0))
    there = there - (1.0 - values(divergence_factor)) * (there - push)
    there = there * values(losses.get("boundary layer", 1.0)) * values(losses.get("two-phase", 1.0))
    flow = values(mass_flow) / values(losses.get("energy release", 1.0))
    vacuum = there + values(ambient) * values(exit_area)
    return Delivery(
        thrust=there,
        specific_impulse=thrust.specific_impulse(there, flow, STANDARD_GRAVITY),
        thrust_coefficient=thrust.thrust_coefficient(there, stagnation_pressure, throat_area),
        effective_exhaust_velocity=np.asarray(there / flow),
        thrust_vacuum=vacuum,
        specific_impulse_vacuum=thrust.specific_impulse(vacuum, flow, STANDARD_GRAVITY),
        thrust_coefficient_vacuum=thrust.thrust_coefficient(vacuum, stagnation_pressure, throat_area),
        mass_flow=np.asarray(flow),
    )


def ledger(
    *,
    mass_flow: float,
    exit_velocity: float,
    exit_pressure: float,
    exit_area: float,
    ambient: float,
    cstar_efficiency: float,
    divergence_factor: float,
    losses: Mapping[str, float],
) -> tuple[float, dict[str, float]]:
    """Return the loss-free specific impulse [s] and every loss as a ratio in its order, by the same arithmetic as `deliver`.

    Parameters
    ----------
    mass_flow, exit_velocity, exit_pressure, exit_area, ambient, cstar_efficiency, divergence_factor, losses
        As for `deliver`, one case.

    Returns
    -------
    tuple
        Ideal specific impulse, and ratio by name of the loss, of those that are there.
    """
    push = (exit_pressure - ambient) * exit_area
    momentum = mass_flow * cstar_efficiency * exit_velocity
    ideal = (momentum + push) / (mass_flow * cstar_efficiency * STANDARD_GRAVITY)
    ratios: dict[str, float] = {}
    if cstar_efficiency != 1.0 or "energy release" in losses:
        ratios["energy release"] = cstar_efficiency * losses.get("energy release", 1.0)
    if "kinetics" in losses:
        ratios["kinetics"] = losses["kinetics"]
        momentum = losses["kinetics"] * (momentum + push) - push
    if divergence_factor != 1.0:
        ratios["divergence"] = float(divergence_ratio(divergence_factor, momentum, push))
    for name in ("boundary layer", "two-phase"):
        if name in losses:
            ratios[name] = losses[name]
    return ideal, ratios
