"""A wall as a chain of smooth segments, and integrals over it: length, wetted area, volume, force, material.

x runs along the axis with the flow, r is the radius [m]; angles are wall angles against the axis [rad], positive where
the wall opens. Integrals use Gauss-Legendre quadrature on each segment, so that they carry no error of a polygon.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Final

import numpy as np

from propkit.errors import InputError, Problem
from propkit.physics.arrays import Array, Values, values

_NODES, _WEIGHTS = np.polynomial.legendre.leggauss(20)
_ARC_PANELS: Final = (0.0, 1.0)
_CURVE_PANELS: Final = (0.0, 0.03, 0.2, 1.0)
"""Panels of the quadrature: graded towards the start of a divergent, where pressure falls as the root of the area."""


def _rule(panels: Sequence[float]) -> tuple[Array, Array]:
    """Return shares and weights of Gauss-Legendre quadrature on each panel."""
    edges = values(panels)
    width = np.diff(edges)[:, None]
    return (edges[:-1, None] + 0.5 * width * (_NODES + 1.0)).ravel(), (0.5 * width * _WEIGHTS).ravel()


@dataclass(frozen=True, slots=True)
class Arc:
    """A circular piece of wall between two wall angles.

    `bend` is +1 where the wall curves away from the axis along the flow (the throat), -1 where it curves towards it.
    """

    name: str
    centre_x: float
    centre_r: float
    radius: float
    start_angle: float
    end_angle: float
    bend: int = 1

    def points(self, share: Array) -> tuple[Array, Array]:
        """Return x and r [m] at shares (0 to 1) of the segment."""
        angle = self.angles(share)
        signed = self.bend * self.radius
        return self.centre_x + signed * np.sin(angle), self.centre_r - signed * np.cos(angle)

    def slopes(self, share: Array) -> tuple[Array, Array]:
        """Return dx and dr per share [m]."""
        angle = self.angles(share)
        turn = self.bend * self.radius * (self.end_angle - self.start_angle)
        return turn * np.cos(angle), turn * np.sin(angle)

    def angles(self, share: Array) -> Array:
        """Return the wall angle [rad] at shares of the segment."""
        return self.start_angle + values(share) * (self.end_angle - self.start_angle)

    def curvatures(self, share: Array) -> Array:
        """Return d(wall angle)/d(wall length) [1/m] at shares of the segment."""
        return np.full_like(values(share), self.bend / self.radius)


@dataclass(frozen=True, slots=True)
class Curve:
    """A parabola given by its ends and the crossing of its end tangents; a straight line where they are in line."""

    name: str
    start: tuple[float, float]
    crossing: tuple[float, float]
    end: tuple[float, float]

    def points(self, share: Array) -> tuple[Array, Array]:
        """Return x and r [m] at shares (0 to 1) of the segment."""
        t = values(share)
        x, r = (
            (1.0 - t) ** 2 * a + 2.0 * t * (1.0 - t) * b + t**2 * c for a, b, c in zip(self.start, self.crossing, self.end, strict=True)
        )
        return values(x), values(r)

    def slopes(self, share: Array) -> tuple[Array, Array]:
        """Return dx and dr per share [m]."""
        t = values(share)
        dx, dr = (2.0 * ((1.0 - t) * (b - a) + t * (c - b)) for a, b, c in zip(self.start, self.crossing, self.end, strict=True))
        return values(dx), values(dr)

    def angles(self, share: Array) -> Array:
        """Return the wall angle [rad] at shares of the segment."""
        dx, dr = self.slopes(share)
        return np.arctan2(dr, dx)

    def curvatures(self, share: Array) -> Array:
        """Return d(wall angle)/d(wall length) [1/m] at shares of the segment."""
        dx, dr = self.slopes(share)
        ddx, ddr = (2.0 * (a - 2.0 * b + c) for a, b, c in zip(self.start, self.crossing, self.end, strict=True))
        return values((dx * ddr - dr * ddx) / np.hypot(dx, dr) ** 3)


Segment = Arc | Curve


def straight(name: str, start: tuple[float, float], end: tuple[float, float]) -> Curve:
    """Return a straight piece of wall between two points (x, r) [m]."""
    return Curve(name, start, (0.5 * (start[0] + end[0]), 0.5 * (start[1] + end[1])), end)


@dataclass(frozen=True, slots=True, eq=False)
class Wall:
    """Points on the wall in order of x: coordinates [m], wall angle [rad], rate of turn [1/m], weights.

    ``sum(f * dx)``, ``sum(f * dr)`` and ``sum(f * ds)`` are the integrals of f over axis, radius and wall length; the
    weights are zero in a wall meant for drawing.
    """

    x: Array
    r: Array
    angle: Array
    curvature: Array
    dx: Array
    dr: Array
    ds: Array


def draw(segments: Sequence[Segment], count: int = 33) -> Wall:
    """Return the wall as points for drawing and tables, `count` on each segment, joints once."""
    shares = np.linspace(0.0, 1.0, count)
    pieces = [(*segment.points(shares), segment.angles(shares), segment.curvatures(shares)) for segment in segments]
    columns = [np.concatenate([column if not i else column[1:] for i, column in enumerate(parts)]) for parts in zip(*pieces, strict=True)]
    nothing = np.zeros_like(columns[0])
    return Wall(columns[0], columns[1], columns[2], columns[3], nothing, nothing, nothing)


def quadrature(segments: Sequence[Segment]) -> Wall:
    """Return the wall as quadrature points: 20 Gauss-Legendre points on each arc, three times that on a curve."""
    columns: list[list[Array]] = [[] for _ in range(7)]
    for segment in segments:
        shares, weights = _rule(_CURVE_PANELS if isinstance(segment, Curve) else _ARC_PANELS)
        dx, dr = segment.slopes(shares)
        parts = (
            *segment.points(shares),
            segment.angles(shares),
            segment.curvatures(shares),
            dx * weights,
            dr * weights,
            np.hypot(dx, dr) * weights,
        )
        for column, part in zip(columns, parts, strict=True):
            column.append(part)
    return Wall(*(np.concatenate(column) for column in columns))


def length(segments: Sequence[Segment]) -> float:
    """Return the axial length of a wall [m]."""
    ends = np.array([0.0, 1.0])
    return float(segments[-1].points(ends)[0][1] - segments[0].points(ends)[0][0])


def wetted_area(segments: Sequence[Segment]) -> float:
    """Return the wetted area [m2] of a wall: the integral of 2 pi r over its length."""
    wall = quadrature(segments)
    return float(np.sum(2.0 * np.pi * wall.r * wall.ds))


def volume(segments: Sequence[Segment]) -> float:
    """Return the volume [m3] inside a wall: the integral of pi r^2 over the axis."""
    wall = quadrature(segments)
    return float(np.sum(np.pi * wall.r**2 * wall.dx))


def wall_force(pressure: Array, wall: Wall) -> float:
    """Return the axial force [N] of a pressure [Pa] at the points of `quadrature`: the integral of 2 pi p r dr."""
    return float(np.sum(2.0 * np.pi * pressure * wall.r * wall.dr))


def wall_volume(segments: Sequence[Segment], thickness: Values) -> float:
    """Return the volume of material [m3] of a wall of even thickness laid on its outside.

    Parameters
    ----------
    segments : sequence of Arc or Curve
        The wetted wall.
    thickness : float
        Thickness normal to the wall [m], above 0 and below the smallest outward radius of curvature.

    Returns
    -------
    float
        Volume of material [m3]; times the density of the material it is the mass.

    Raises
    ------
    InputError
        For a thickness of 0 or less, or one that folds the outer surface at the throat.

    Notes
    -----
    2 pi times the integral of (r + n cos a)(1 - n k) over thickness n and wall length, a wall angle, k its rate of
    turn: exact for a shell bounded by the parallel surface.

    Source
    ------
    Pappus' theorem.
    """
    t = float(values(thickness))
    wall = quadrature(segments)
    sharpest = float(np.max(wall.curvature))
    problem = ""
    if not t > 0.0:
        problem = "above 0"
    elif sharpest > 0.0 and t * sharpest >= 1.0:
        problem = f"below the smallest radius of curvature of the wall, {1.0 / sharpest:.4g} m"
    if problem:
        raise InputError(Problem("thickness", f"{t:g} m", problem, "It is measured normal to the wall."))
    c, k = np.cos(wall.angle), wall.curvature
    section = wall.r * t + 0.5 * (c - wall.r * k) * t**2 - c * k * t**3 / 3.0
    return float(np.sum(2.0 * np.pi * section * wall.ds))
