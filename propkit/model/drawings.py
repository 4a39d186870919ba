"""Drawings of the objects as neutral figures."""

from __future__ import annotations

import math
from typing import TYPE_CHECKING

from propkit import quantities, units
from propkit.physics import wall as walls
from propkit.report import UnitSystem
from propkit.series import Axis, Figure, Line, Mark, Series

if TYPE_CHECKING:
    from propkit.model.nozzle import Nozzle

DRAWN_POINTS = 17
"""Points on each segment of a drawn wall."""

SCHEMATIC_HALF_ANGLE = math.radians(15.0)
"""Half-angle of the divergent part where no contour is given [rad]: the drawing says that its length is schematic."""


def nozzle_figures(nozzle: Nozzle, system: UnitSystem) -> tuple[Figure, ...]:
    """Return the outline of the nozzle to scale: with its contour, or else with schematic lengths."""
    unit = "m" if system == "SI" else "inch"
    throat, lip = nozzle.si("throat_diameter") / 2.0, nozzle.si("exit_diameter") / 2.0
    ratio = nozzle.chamber.si("contraction_ratio")
    chamber = throat * math.sqrt(ratio if math.isfinite(ratio) else 6.0)
    real = nozzle.has("contour")
    wall = contour_wall(nozzle) if real else schematic_wall(throat, lip, chamber)
    upper = [(x, r) for x, r in wall]
    outline = [*upper, *((x, -r) for x, r in reversed(upper))]
    scale = units.convert(1.0, "m", unit)
    xs, ys = (tuple(scale * point[axis] for point in outline) for axis in (0, 1))
    body = Line(
        Series("axial position", xs, unit, "x"),
        Series("radius", ys, unit, "r"),
        colour="ink",
        dash="solid" if real else "dashed",
        closed=True,
        fill=True,
    )
    end = wall[-1][0]
    marks = (
        Mark(0.0, scale * throat, f"throat {_diameter('throat_diameter', nozzle, system)}"),
        Mark(scale * end, scale * lip, f"exit {_diameter('exit_diameter', nozzle, system)}"),
    )
    alt = f"Nozzle outline: throat diameter {scale * 2 * throat:.4g} {units.shown_unit(unit)}, exit diameter {scale * 2 * lip:.4g}, area ratio {nozzle.si('area_ratio'):.4g}"
    title = "Schematic: diameters to scale, a 15° cone assumed"
    if not math.isfinite(ratio):
        title = "Schematic: diameters to scale, 15° cone and chamber assumed"
    if real:
        title = f"Nozzle to scale: {nozzle.input_text('contour')}"
        if not nozzle.geometry.upstream:
            title += "; no contraction ratio, so no chamber"
    return (
        Figure(
            "outline",
            title,
            alt,
            Axis("axial position", unit, "x"),
            Axis("radius", unit, "r"),
            (body, *marks),
            equal_aspect=True,
        ),
    )


def _diameter(name: str, nozzle: Nozzle, system: UnitSystem) -> str:
    row = quantities.quantity(name)
    unit = row.shown_in(system, (nozzle.si(name),))
    return f"{units.convert(nozzle.si(name), row.unit, unit):.4g} {units.shown_unit(unit)}"


def contour_wall(nozzle: Nozzle) -> list[tuple[float, float]]:
    """Return points (x, r) [m] on the wall of a nozzle with a contour, x = 0 at the throat."""
    points = walls.draw(nozzle.geometry.segments, DRAWN_POINTS)
    return list(zip(points.x.tolist(), points.r.tolist(), strict=True))


def schematic_wall(throat: float, lip: float, chamber: float) -> list[tuple[float, float]]:
    """Return wall points (x, r) [m] from the chamber to the lip with x = 0 at the throat."""
    points = [(-2.2 * chamber, chamber), (-1.2 * (chamber - throat) - 0.8 * throat, chamber)]
    arc = 1.5 * throat
    angle = math.radians(40.0)
    start = throat + arc * (1.0 - math.cos(angle))
    if start < chamber:
        points.append((-arc * math.sin(angle) - (chamber - start) / math.tan(angle), chamber))
        points[1] = points[2]
        points.pop()
    for step in range(8, 0, -1):
        turn = angle * step / 8.0
        radius = throat + arc * (1.0 - math.cos(turn))
        if radius < chamber:
            points.append((-arc * math.sin(turn), radius))
    points.append((0.0, throat))
    down = 0.4 * throat
    for step in range(1, 7):
        turn = SCHEMATIC_HALF_ANGLE * step / 6.0
        radius = throat + down * (1.0 - math.cos(turn))
        if radius < lip:
            points.append((down * math.sin(turn), radius))
    x, r = points[-1]
    if lip > r:
        points.append((x + (lip - r) / math.tan(SCHEMATIC_HALF_ANGLE), lip))
    if points[0][0] >= points[1][0]:
        points[0] = (points[1][0] - chamber, chamber)
    return points
