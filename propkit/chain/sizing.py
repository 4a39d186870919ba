"""Sizing stage: from the flow per unit of effective throat area and one size to every size of the nozzle."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from propkit.physics import thrust
from propkit.physics.arrays import Array, Values, values

THROAT_SIZES = ("throat_diameter", "throat_area")
EXIT_SIZES = ("exit_diameter", "exit_area")
FLOW_SIZES = ("mass_flow", "thrust")


@dataclass(frozen=True, slots=True, eq=False)
class Sizes:
    """Geometric areas [m2], their ratio [1] and the mass flow [kg/s], shape (case,)."""

    throat_area: Array
    exit_area: Array
    area_ratio: Array
    mass_flow: Array


def area_of(name: str, size: Values) -> Array:
    """Return the area of a size given as a diameter or an area."""
    return thrust.circle_area(size) if name.endswith("diameter") else values(size)


def size(
    name: str,
    given: Values,
    *,
    mass_flux: Values,
    area_ratio: Values,
    exit_velocity: Values,
    exit_pressure: Values,
    ambient: Values = 0.0,
    discharge_coefficient: Values = 1.0,
    cstar_efficiency: Values = 1.0,
    divergence_factor: Values = 1.0,
) -> Sizes:
    """Return every size from one of them.

    Parameters
    ----------
    name : str
        One of `THROAT_SIZES`, `EXIT_SIZES`, `FLOW_SIZES`.
    given : float or array
        Its value in SI.
    mass_flux : float or array
        Ideal mass flow per effective throat area [kg/(m2 s)].
    area_ratio : float or array
        Geometric exit area over geometric throat area [1].
    exit_velocity, exit_pressure : float or array
        Ideal exit velocity [m/s] and exit pressure [Pa].
    ambient : float or array
        Ambient pressure at which a thrust is asked for [Pa].
    discharge_coefficient, cstar_efficiency : float or array
        Effective over geometric throat area [1]; delivered over theoretical characteristic velocity [1].
    divergence_factor : float or array
        Share of the exit momentum along the axis [1].

    Returns
    -------
    Sizes
        NaN or negative areas where the asked thrust cannot be reached.
    """
    ratio, efficiency = values(area_ratio), values(cstar_efficiency)
    per_area = values(discharge_coefficient) * values(mass_flux) / efficiency
    if name in THROAT_SIZES:
        throat = area_of(name, given)
    elif name in EXIT_SIZES:
        throat = area_of(name, given) / ratio
    elif name == "mass_flow":
        throat = values(given) / per_area
    else:
        throat = values(given) / thrust.thrust(
            per_area, values(divergence_factor) * efficiency * values(exit_velocity), exit_pressure, ambient, ratio
        )
    throat, ratio, per_area = np.broadcast_arrays(throat, ratio, per_area)
    return Sizes(np.array(throat), throat * ratio, np.array(ratio), throat * per_area)
