"""Performance stage: from an expanded and sized nozzle and an ambient pressure to thrust and its ratios."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from propkit.constants import STANDARD_GRAVITY
from propkit.physics import thrust
from propkit.physics.arrays import Array, Values, values


@dataclass(frozen=True, slots=True, eq=False)
class Delivery:
    """Thrust and its ratios at the ambient pressure and in vacuum, shape (case,), SI."""

    thrust: Array
    specific_impulse: Array
    thrust_coefficient: Array
    effective_exhaust_velocity: Array
    thrust_vacuum: Array
    specific_impulse_vacuum: Array
    thrust_coefficient_vacuum: Array


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
) -> Delivery:
    """Return the full-flowing thrust and its ratios.

    The delivered momentum velocity is the ideal one times the c* efficiency, so that the larger mass flow of an
    incomplete combustion leaves the thrust unchanged.
    """
    velocity = values(cstar_efficiency) * values(exit_velocity)
    there = thrust.thrust(mass_flow, velocity, exit_pressure, ambient, exit_area)
    vacuum = thrust.thrust(mass_flow, velocity, exit_pressure, 0.0, exit_area)
    return Delivery(
        thrust=there,
        specific_impulse=thrust.specific_impulse(there, mass_flow, STANDARD_GRAVITY),
        thrust_coefficient=thrust.thrust_coefficient(there, stagnation_pressure, throat_area),
        effective_exhaust_velocity=np.asarray(there / values(mass_flow)),
        thrust_vacuum=vacuum,
        specific_impulse_vacuum=thrust.specific_impulse(vacuum, mass_flow, STANDARD_GRAVITY),
        thrust_coefficient_vacuum=thrust.thrust_coefficient(vacuum, stagnation_pressure, throat_area),
    )
