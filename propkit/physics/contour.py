"""Wall contour of a thrust chamber: cylinder, convergent, throat arcs and a conical or parabolic divergent.

The throat is at x = 0 and the flow runs towards growing x. Each function returns segments of
`propkit.physics.wall`, whose functions measure and draw them.
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import Final

import numpy as np

from propkit.errors import InputError, Problem
from propkit.physics.arrays import Array, Values, require, values
from propkit.physics.bell_table import bell_angles
from propkit.physics.wall import Arc, Curve, Segment, straight, volume

UPSTREAM_ARC: Final = 1.5
"""Radius of the wall's arc upstream of the throat over the throat radius: Rao (1960)."""

DOWNSTREAM_ARC: Final = 0.382
"""Radius of the wall's arc downstream of the throat over the throat radius: Rao (1960)."""

INLET_ARC: Final = 1.0
"""Radius of the arc between cylinder and convergent over the throat radius: common practice, no source."""

CONVERGENT_ANGLE: Final = float(np.radians(30.0))
"""Convergent half-angle where the arcs leave room for it [rad]: common practice, no source."""

REFERENCE_ANGLE: Final = float(np.radians(15.0))
"""Half-angle of the cone whose length a bell's length is quoted against [rad]: Rao (1960)."""


def _checked_radii(throat_radius: float, area_ratio: float) -> float:
    """Return the exit radius [m]; InputError for a throat radius or an area ratio that makes no nozzle."""
    require(throat_radius > 0.0, "throat_radius", throat_radius, "above 0")
    require(area_ratio > 1.0, "area_ratio", area_ratio, "above 1 for a divergent", "It is exit over throat area.")
    return throat_radius * float(np.sqrt(area_ratio))


def _throat_arc(throat_radius: float, arc: float, end_angle: float) -> tuple[Arc, tuple[float, float]]:
    """Return the arc downstream of the throat and its end point."""
    require(arc > 0.0, "throat_arc", arc, "above 0", "It is the radius of the arc over the throat radius.")
    radius = arc * throat_radius
    piece = Arc("throat arc", 0.0, throat_radius + radius, radius, 0.0, end_angle)
    x, r = piece.points(np.array([1.0]))
    return piece, (float(x[0]), float(r[0]))


def cone_length(throat_radius: Values, area_ratio: Values, half_angle: Values, throat_arc: float = DOWNSTREAM_ARC) -> Array:
    """Return the length [m] from throat to exit of a cone that leaves the throat in an arc.

    Parameters
    ----------
    throat_radius : float or array
        Throat radius [m], above 0.
    area_ratio : float or array
        Exit over throat area, 1 or more.
    half_angle : float or array
        Half-angle of the cone [rad], above 0 and below pi/2.
    throat_arc : float
        Radius of the arc over the throat radius.

    Returns
    -------
    array
        Length [m].

    Notes
    -----
    L = [Rt (sqrt(eps) - 1) + R (1/cos a - 1)] / tan a.

    Source
    ------
    Geometry; without the arc Sutton & Biblarz print 8.07 throat radii for 15 deg, area ratio 10 (from memory).

    Examples
    --------
    >>> round(float(cone_length(1.0, 10.0, np.radians(15.0), 0.0)), 2)
    8.07
    """
    rt, angle = values(throat_radius), values(half_angle)
    rise = np.sqrt(values(area_ratio)) - 1.0 + throat_arc * (1.0 / np.cos(angle) - 1.0)
    return rt * rise / np.tan(angle)


def cone(throat_radius: float, area_ratio: float, half_angle: float, throat_arc: float = DOWNSTREAM_ARC) -> tuple[Segment, ...]:
    """Return a conical divergent: throat arc and straight wall.

    Parameters
    ----------
    throat_radius : float
        Throat radius [m], above 0.
    area_ratio : float
        Exit over throat area, above 1.
    half_angle : float
        Half-angle [rad], above 0 and below pi/2.
    throat_arc : float
        Radius of the arc over the throat radius, above 0.

    Returns
    -------
    tuple of Arc or Curve
        The wall from x = 0.

    Raises
    ------
    InputError
        Outside the ranges, or where the arc alone already reaches the exit radius.

    Source
    ------
    Geometry.
    """
    exit_radius = _checked_radii(throat_radius, area_ratio)
    require(0.0 < half_angle < 0.5 * np.pi, "half_angle", np.degrees(half_angle), "above 0 and below 90 degrees")
    piece, end = _throat_arc(throat_radius, throat_arc, half_angle)
    if end[1] >= exit_radius:
        least = (end[1] / throat_radius) ** 2
        raise InputError(
            Problem(
                "area_ratio",
                f"{area_ratio:g}",
                f"above {least:.4g} for a cone of {np.degrees(half_angle):g} degrees",
                "The throat arc alone reaches the exit radius: take a smaller half-angle or a larger area ratio.",
            )
        )
    lip = (end[0] + (exit_radius - end[1]) / float(np.tan(half_angle)), exit_radius)
    return piece, straight("cone", end, lip)


def bell(
    throat_radius: float,
    area_ratio: float,
    length_fraction: float = 0.8,
    throat_angle: float | None = None,
    exit_angle: float | None = None,
    throat_arc: float = DOWNSTREAM_ARC,
) -> tuple[Segment, ...]:
    """Return a parabolic bell: throat arc and a parabola between two wall angles.

    Parameters
    ----------
    throat_radius : float
        Throat radius [m], above 0.
    area_ratio : float
        Exit over throat area, above 1.
    length_fraction : float
        Length over that of a 15 degree cone of the same area ratio, above 0.
    throat_angle, exit_angle : float, optional
        Wall angles [rad] at the start of the parabola and at the lip; from `bell_angles` where not given.
    throat_arc : float
        Radius of the arc over the throat radius, above 0.

    Returns
    -------
    tuple of Arc or Curve
        The wall from x = 0.

    Raises
    ------
    InputError
        Where no parabola with these angles joins the arc to the lip.

    Notes
    -----
    A parabola with given end tangents exists where the chord is steeper than the lip and flatter than the throat angle.

    Source
    ------
    Rao (1960).
    """
    exit_radius = _checked_radii(throat_radius, area_ratio)
    require(length_fraction > 0.0, "length", length_fraction, "above 0", "It is the share of a 15 degree cone's length.")
    if throat_angle is None or exit_angle is None:
        from_table = bell_angles(area_ratio, length_fraction)
        throat_angle = float(from_table[0]) if throat_angle is None else throat_angle
        exit_angle = float(from_table[1]) if exit_angle is None else exit_angle
    require(0.0 < throat_angle < 0.5 * np.pi, "throat_angle", np.degrees(throat_angle), "above 0 and below 90 degrees")
    require(0.0 <= exit_angle < throat_angle, "exit_angle", np.degrees(exit_angle), "0 or more and below the throat angle")
    piece, start = _throat_arc(throat_radius, throat_arc, throat_angle)
    total = length_fraction * float(cone_length(throat_radius, area_ratio, REFERENCE_ANGLE, throat_arc))
    chord = float(np.arctan2(exit_radius - start[1], total - start[0]))
    if not exit_angle < chord < throat_angle or total <= start[0]:
        raise InputError(
            Problem(
                "length",
                f"{length_fraction:g}",
                f"such that a parabola from {np.degrees(throat_angle):.1f} to {np.degrees(exit_angle):.1f} "
                f"degrees fits area ratio {area_ratio:g}",
                f"The chord of the divergent lies at {np.degrees(chord):.1f} degrees, outside the two: change length "
                "or angles, or take a cone.",
            )
        )
    steep, flat = float(np.tan(throat_angle)), float(np.tan(exit_angle))
    x = (exit_radius - start[1] + steep * start[0] - flat * total) / (steep - flat)
    crossing = (x, start[1] + steep * (x - start[0]))
    return piece, Curve("bell", start, crossing, (total, exit_radius))


def largest_convergent_angle(contraction_ratio: float, upstream_arc: float = UPSTREAM_ARC, inlet_arc: float = INLET_ARC) -> float:
    """Return the steepest convergent half-angle [rad] whose two arcs fit between chamber and throat radius."""
    rise = (np.sqrt(contraction_ratio) - 1.0) / (upstream_arc + inlet_arc)
    return float(np.arccos(max(1.0 - rise, 0.0)))


def convergent(
    throat_radius: float,
    contraction_ratio: float,
    half_angle: float | None = None,
    upstream_arc: float = UPSTREAM_ARC,
    inlet_arc: float = INLET_ARC,
) -> tuple[Segment, ...]:
    """Return the convergent: inlet arc, straight wall and the arc upstream of the throat.

    Parameters
    ----------
    throat_radius : float
        Throat radius [m], above 0.
    contraction_ratio : float
        Chamber cross-section over throat area, above 1.
    half_angle : float, optional
        Half-angle of the straight wall [rad]; 30 degrees by default, or less where the arcs leave no room for it.
    upstream_arc, inlet_arc : float
        Radii of the arcs over the throat radius, above 0.

    Returns
    -------
    tuple of Arc or Curve
        The wall, ending at x = 0.

    Raises
    ------
    InputError
        Outside the ranges, or for a half-angle that does not fit.

    Source
    ------
    Geometry; arc of 1.5 throat radii after Rao (1960), the rest common practice, no source.
    """
    require(throat_radius > 0.0, "throat_radius", throat_radius, "above 0")
    require(contraction_ratio > 1.0, "contraction_ratio", contraction_ratio, "above 1", "It is chamber over throat area.")
    require(upstream_arc > 0.0, "upstream_arc", upstream_arc, "above 0")
    require(inlet_arc > 0.0, "inlet_arc", inlet_arc, "above 0")
    steepest = largest_convergent_angle(contraction_ratio, upstream_arc, inlet_arc)
    angle = min(CONVERGENT_ANGLE, steepest) if half_angle is None else half_angle
    if not 0.0 < angle <= steepest:
        raise InputError(
            Problem(
                "convergent_angle",
                f"{np.degrees(angle):g} degrees",
                f"above 0 and at most {np.degrees(steepest):.1f} degrees at contraction ratio {contraction_ratio:g}",
                "The arcs leave no room for a steeper wall: take a smaller angle or a larger contraction ratio.",
            )
        )
    chamber_radius = throat_radius * float(np.sqrt(contraction_ratio))
    near, far = upstream_arc * throat_radius, inlet_arc * throat_radius
    throat_side = Arc("throat approach", 0.0, throat_radius + near, near, -angle, 0.0)
    x, r = (float(column[0]) for column in throat_side.points(np.array([0.0])))
    corner = chamber_radius - far * (1.0 - float(np.cos(angle)))
    start_x = x - (corner - r) / float(np.tan(angle))
    inlet = Arc("inlet arc", start_x - far * float(np.sin(angle)), chamber_radius - far, far, 0.0, -angle, -1)
    if corner - r <= 1e-9 * throat_radius:
        return inlet, throat_side
    return inlet, straight("convergent", (start_x, corner), (x, r)), throat_side


def chamber(
    throat_radius: float,
    contraction_ratio: float,
    characteristic_length: float,
    half_angle: float | None = None,
    upstream_arc: float = UPSTREAM_ARC,
    inlet_arc: float = INLET_ARC,
) -> tuple[Segment, ...]:
    """Return cylinder and convergent that hold characteristic length times throat area.

    Parameters
    ----------
    throat_radius : float
        Throat radius [m], above 0.
    contraction_ratio : float
        Chamber cross-section over throat area, above 1.
    characteristic_length : float
        Volume from injector face to throat over throat area [m].
    half_angle : float, optional
        Convergent half-angle [rad]; see `convergent`.
    upstream_arc, inlet_arc : float
        Radii of the arcs over the throat radius, above 0.

    Returns
    -------
    tuple of Arc or Curve
        The wall from the injector face to x = 0.

    Raises
    ------
    InputError
        Outside the ranges, or where the convergent alone holds more than the volume asked for.

    Notes
    -----
    L* = V/At; the cylinder has the length that is left, (L* At - V_convergent)/(eps_c At).

    Source
    ------
    Sutton & Biblarz, chapter 8 (definition of L*).
    """
    pieces = convergent(throat_radius, contraction_ratio, half_angle, upstream_arc, inlet_arc)
    throat_area = np.pi * throat_radius**2
    least = volume(pieces) / throat_area
    if not characteristic_length >= least:
        raise InputError(
            Problem(
                "characteristic_length",
                f"{characteristic_length:g} m",
                f"at least {least:.4g} m, which the convergent alone holds",
                "Ask for more, or take a steeper convergent or a smaller contraction ratio.",
            )
        )
    start, radius = pieces[0].points(np.array([0.0]))
    x, r = float(start[0]), float(radius[0])
    cylinder = (characteristic_length - least) / contraction_ratio
    return (straight("cylinder", (x - cylinder, r), (x, r)), *pieces) if cylinder > 0.0 else pieces


def stay_time(volume: Values, density: Values, mass_flow: Values) -> Array:
    """Return the mean time that the gas spends in the chamber [s].

    Parameters
    ----------
    volume : float or array
        Chamber volume from injector face to throat [m3].
    density : float or array
        Gas density in the chamber [kg/m3].
    mass_flow : float or array
        Mass flow [kg/s], above 0.

    Returns
    -------
    array
        V rho / m' [s].

    Notes
    -----
    The volume is taken as filled with burnt gas at the chamber state.

    Source
    ------
    Sutton & Biblarz, chapter 8.
    """
    return values(volume) * values(density) / values(mass_flow)


def throat_to_lip_angle(segments: Sequence[Segment], throat_radius: float) -> float:
    """Return the angle [rad] of the line from the throat's wall to the lip."""
    x, r = segments[-1].points(np.array([1.0]))
    return float(np.arctan2(r[0] - throat_radius, x[0]))


def lip_angle(segments: Sequence[Segment]) -> float:
    """Return the wall angle [rad] at the lip."""
    return float(segments[-1].angles(np.array([1.0]))[0])
