"""What the measures of a wall satisfy, with both sides evaluated: lengths, angles, area and volume of a contour, chamber size."""

from __future__ import annotations

import math
from collections.abc import Iterator
from typing import Any

import numpy as np

from propkit.model.conditions import condition
from propkit.model.contour import Bell, Cone
from propkit.physics import bell_table
from propkit.physics import contour as shapes
from propkit.physics import wall as walls
from propkit.report import Step

_FINE = 4000
"""Straight pieces into which a segment of the wall is cut for the sums."""


def wall_conditions(nozzle: Any, name: str) -> Iterator[Step]:
    """Yield the conditions that a measure of the wall of a nozzle satisfies; nothing for other results."""
    known = {
        "divergent_length": _divergent_length,
        "contour_length": _contour_length,
        "throat_wall_angle": _throat_angle,
        "lip_angle": _lip_angle,
        "wetted_area": _wetted_area,
        "contour_volume": _contour_volume,
        "wall_mass": _wall_mass,
        "chamber_volume": _chamber_volume,
        "chamber_length": _chamber_length,
    }
    if name in known and nozzle.has(name):
        yield known[name](nozzle, nozzle.si(name))


def _divergent_length(nozzle: Any, value: float) -> Step:
    contour, radius, ratio = nozzle._values["contour"], nozzle.si("throat_diameter") / 2.0, nozzle.si("area_ratio")
    if isinstance(contour, Cone):
        angle, arc = contour.si("half_angle"), contour.si("throat_arc")
        right = float(shapes.cone_length(radius, ratio, angle, arc))
        text = "length = r_t (sqrt(area ratio) - 1 + arc (1/cos a - 1)) / tan a"
        latex = r"L_n = r_t \frac{\sqrt{\epsilon} - 1 + k (1/\cos\alpha - 1)}{\tan\alpha}"
        return condition("divergent_length", "length of the cone [m]", text, latex, value, right, "sutton-biblarz")
    right = contour.si("length") * float(shapes.cone_length(radius, ratio, math.radians(15.0), contour.si("throat_arc")))
    text = "length = share of that of a 15 degree cone, r_t (sqrt(area ratio) - 1 + arc (1/cos 15 - 1)) / tan 15"
    latex = r"L_n = L_f\, r_t \frac{\sqrt{\epsilon} - 1 + k (1/\cos 15^{\circ} - 1)}{\tan 15^{\circ}}"
    return condition("divergent_length", "length of the bell [m]", text, latex, value, right, "rao-1960")


def _contour_length(nozzle: Any, value: float) -> Step:
    parts = [walls.length(part) for part in (nozzle.geometry.upstream, nozzle.geometry.divergent) if part]
    text, latex = "length = wall ahead of the throat + divergent", r"L = L_u + L_n"
    return condition("contour_length", "length of the wall [m]", text, latex, value, sum(parts), "definition")


def _throat_angle(nozzle: Any, value: float) -> Step:
    contour = nozzle._values["contour"]
    if isinstance(contour, Cone):
        text, latex, right, source = "angle = half-angle of the cone", r"\theta_n = \alpha", contour.si("half_angle"), "definition"
    elif contour._values["throat_angle"] is not None:
        text, latex, right, source = "angle = the one given", r"\theta_n", contour._values["throat_angle"], "definition"
    else:
        right = float(bell_table.bell_angles(nozzle.si("area_ratio"), contour.si("length"))[0])
        text, latex, source = "angle = that of the chart at area ratio and length", r"\theta_n(\epsilon, L_f)", "rao-1960"
    return condition("throat_wall_angle", "wall angle after the throat [rad]", text, latex, value, right, source)


def _lip_angle(nozzle: Any, value: float) -> Step:
    contour = nozzle._values["contour"]
    if isinstance(contour, Bell):
        given = contour._values["exit_angle"]
        chart = float(bell_table.bell_angles(nozzle.si("area_ratio"), contour.si("length"))[1])
        text = "angle = that of the chart at area ratio and length" if given is None else "angle = the one given"
        right, latex, source = chart if given is None else given, r"\theta_e(\epsilon, L_f)", "rao-1960"
    else:
        text, latex, right, source = "angle = half-angle of the cone", r"\theta_e = \alpha", contour.si("half_angle"), "definition"
    return condition("lip_angle", "wall angle at the lip [rad]", text, latex, value, right, source)


def _wetted_area(nozzle: Any, value: float) -> Step:
    x, r = _polygon(nozzle.geometry.segments)
    right = float(np.sum(math.pi * (r[1:] + r[:-1]) * np.hypot(np.diff(x), np.diff(r))))
    text, latex = "area = sum of pi (r1 + r2) s over short pieces of the wall", r"A_w = \int 2 \pi r\, ds"
    return condition("wetted_area", "wetted area [m2]", text, latex, value, right, "definition")


def _contour_volume(nozzle: Any, value: float) -> Step:
    text, latex = "volume = sum of pi/3 (r1^2 + r1 r2 + r2^2) dx over short pieces", r"V = \int \pi r^2\, dx"
    return condition("contour_volume", "volume [m3]", text, latex, value, _volume(nozzle.geometry.segments), "definition")


def _wall_mass(nozzle: Any, value: float) -> Step:
    density, thickness = nozzle.si("wall_density"), nozzle.si("wall_thickness")
    right = density * walls.wall_volume(nozzle.geometry.segments, thickness)
    text, latex = "mass = density times the volume between the wall and its offset", r"m_w = \rho_w V_w"
    return condition("wall_mass", "mass of the wall [kg]", text, latex, value, right, "definition")


def _chamber_volume(nozzle: Any, value: float) -> Step:
    right = nozzle.chamber.si("characteristic_length") * nozzle.si("throat_area")
    text, latex = "volume = characteristic length times throat area", r"V_c = L^{*} A_t"
    return condition("chamber_volume", "volume of the chamber [m3]", text, latex, value, right, "sutton-biblarz")


def _chamber_length(nozzle: Any, value: float) -> Step:
    chamber, radius = nozzle.chamber, nozzle.si("throat_diameter") / 2.0
    given = chamber.si("contraction_ratio"), chamber.si("characteristic_length")
    contour = nozzle._values["contour"]
    pieces = shapes.chamber(radius, *given) if contour is None else contour.upstream_wall(radius, *given)
    text = "volume of cylinder and convergent of this length = characteristic length times throat area"
    right = given[1] * nozzle.si("throat_area")
    return condition(
        "chamber_length", "volume of the chamber [m3]", text, r"\int \pi r^2\, dx = L^{*} A_t", _volume(pieces), right, "sutton-biblarz"
    )


def _volume(segments: Any) -> float:
    x, r = _polygon(segments)
    return float(np.sum(math.pi / 3.0 * (r[1:] ** 2 + r[1:] * r[:-1] + r[:-1] ** 2) * np.diff(x)))


def _polygon(segments: Any) -> tuple[Any, Any]:
    points = walls.draw(segments, _FINE)
    return points.x, points.r
