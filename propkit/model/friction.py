"""The boundary layer along the contour of a nozzle, and the thrust that it costs."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from propkit.model.transport import estimated_gas, gas_at_rest
from propkit.model.wall import flow_at
from propkit.physics import boundary_layer, heat_transfer
from propkit.physics import wall as walls
from propkit.physics.wall import Segment

if TYPE_CHECKING:
    from propkit.model.nozzle import Nozzle

POINTS = 31
"""Points on each segment for the integration along the wall."""


def drag(nozzle: Nozzle, wall_temperature: float | None) -> tuple[float, str]:
    """Return the thrust that the boundary layer costs [N] along the contour, and how it was found in words.

    Parameters
    ----------
    nozzle : Nozzle
        A nozzle with a contour.
    wall_temperature : float or None
        Temperature of the gas-side wall [K]; None for a wall that is not cooled.
    """
    found, words = along(nozzle, nozzle.geometry.segments, wall_temperature)
    start = "from the injector face" if nozzle.geometry.upstream else "from the throat, because the contraction is infinite"
    return found, f"momentum integral along the wall {start}, {words}"


def along(nozzle: Nozzle, segments: tuple[Segment, ...], wall_temperature: float | None, quick: bool = False) -> tuple[float, str]:
    """Return the thrust that a boundary layer along segments of a wall costs [N], and its thickness in words.

    `quick` takes fewer points and Bartz's estimate of the viscosity, whose fifth root enters.
    """
    points = walls.draw(segments, POINTS // 2 if quick else POINTS)
    length = np.concatenate([[0.0], np.cumsum(np.hypot(np.diff(points.x), np.diff(points.r)))])
    flow = flow_at(nozzle, points.x, points.r)
    gas = estimated_gas(nozzle) if quick else gas_at_rest(nozzle, estimate=True)
    recovery = heat_transfer.adiabatic_wall_temperature(flow["temperature"], gas.temperature, gas.prandtl)
    temperature = recovery if wall_temperature is None else np.minimum(np.full_like(recovery, wall_temperature), recovery)
    viscosity = gas.viscosity * (flow["temperature"] / gas.temperature) ** boundary_layer.VISCOSITY_EXPONENT
    good = np.isfinite(flow["velocity"]) & (flow["velocity"] > 0.0)
    wall_flow = boundary_layer.WallFlow(
        length=length[good],
        radius=points.r[good],
        velocity=flow["velocity"][good],
        density=flow["density"][good],
        temperature=flow["temperature"][good],
        viscosity=viscosity[good],
        adiabatic_wall_temperature=recovery[good],
        wall_temperature=temperature[good],
    )
    thickness = float(boundary_layer.momentum_thickness(wall_flow)[-1])
    efficiency = nozzle.chamber.si("cstar_efficiency")
    lost = boundary_layer.boundary_layer_drag(
        points.r[-1], points.angle[-1], wall_flow.density[-1], wall_flow.velocity[-1] * efficiency, thickness
    )
    kind = "adiabatic wall" if wall_temperature is None else f"wall at {wall_temperature:.4g} K"
    return float(lost), f"{kind}, momentum thickness {1e3 * thickness:.3g} mm at the lip"
