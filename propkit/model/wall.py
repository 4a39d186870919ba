"""The wall of a nozzle with a contour: its measures, its points, the flow along it, and files for drawing offices."""

from __future__ import annotations

import math
import os
from collections.abc import Sequence
from dataclasses import dataclass, field, replace
from pathlib import Path
from typing import TYPE_CHECKING, Any

import numpy as np

from propkit.chain import profile
from propkit.errors import InputError, MissingExtraError, NotAvailableError, Problem, StorageError
from propkit.model.contour import Contour
from propkit.model.declare import as_text
from propkit.physics import contour as shapes
from propkit.physics import wall as walls
from propkit.physics.arrays import Array
from propkit.physics.wall import Arc, Segment

if TYPE_CHECKING:
    import pandas as pd

    from propkit.model.nozzle import Nozzle

POINTS = 41
"""Points on each segment of the wall in tables and drawings."""

NO_CONTOUR = 'the nozzle has no contour; give one, for instance contour=pk.Bell(length=0.8) or contour=pk.Cone("15 deg")'
NO_CHAMBER = "the contraction is infinite: give the chamber a contraction_ratio"
WALL_RESULTS = ("divergent_length", "contour_length", "wetted_area", "contour_volume", "divergence_factor",
                "throat_wall_angle", "lip_angle", "wall_mass")  # fmt: skip


@dataclass(frozen=True, slots=True)
class Geometry:
    """Segments of the wall before and after the throat, what was measured, why something is absent, and doubts in words."""

    upstream: tuple[Segment, ...] = ()
    divergent: tuple[Segment, ...] = ()
    results: dict[str, float] = field(default_factory=dict)
    absent: dict[str, str] = field(default_factory=dict)
    doubts: tuple[str, ...] = ()

    @property
    def segments(self) -> tuple[Segment, ...]:
        """The wall in the direction of the flow."""
        return (*self.upstream, *self.divergent)


def divergence_factor(contour: Contour | None, area_ratio: float) -> float:
    """Return the factor on the momentum thrust that a contour brings at an area ratio; 1 without a contour."""
    return 1.0 if contour is None else contour.divergence_factor(contour.divergent(1.0, area_ratio), 1.0)


def geometry(
    contour: Contour | None,
    *,
    throat_radius: float,
    area_ratio: float,
    contraction_ratio: float,
    characteristic_length: float | None,
    wall_thickness: float | None,
    wall_density: float,
) -> Geometry:
    """Return the wall of a nozzle of a size, and its measures.

    Parameters
    ----------
    contour : Contour or None
        The contour; None leaves the chamber volume only.
    throat_radius, area_ratio, contraction_ratio : float
        Throat radius [m]; exit over throat area and chamber over throat area [1], the latter may be infinite.
    characteristic_length, wall_thickness : float or None
        Chamber volume over throat area [m]; thickness of the wall [m].
    wall_density : float
        Density of the wall [kg/m3].

    Returns
    -------
    Geometry
        Segments and results.
    """
    results: dict[str, float] = {}
    absent = dict.fromkeys(WALL_RESULTS, NO_CONTOUR)
    upstream: tuple[Segment, ...] = ()
    divergent: tuple[Segment, ...] = ()
    if characteristic_length is not None:
        results["chamber_volume"] = characteristic_length * math.pi * throat_radius**2
    finite = math.isfinite(contraction_ratio)
    if finite and (contour is not None or characteristic_length is not None):
        if contour is not None:
            upstream = contour.upstream_wall(throat_radius, contraction_ratio, characteristic_length)
        else:
            upstream = shapes.chamber(throat_radius, contraction_ratio, characteristic_length or 0.0)
        if characteristic_length is not None:
            results["chamber_length"] = walls.length(upstream)
    if contour is None:
        upstream = ()
    else:
        divergent = contour.divergent(throat_radius, area_ratio)
        results |= _measures(contour, upstream, divergent, throat_radius)
        absent = {}
        if wall_thickness is not None:
            results["wall_mass"] = wall_density * _wall_volume((*upstream, *divergent), wall_thickness)
        else:
            absent["wall_mass"] = "the wall has no thickness; give wall_thickness"
    if "chamber_volume" not in results:
        absent["chamber_volume"] = "the chamber has no characteristic_length"
    if "chamber_length" not in results:
        absent["chamber_length"] = NO_CHAMBER if not finite else "the chamber has no characteristic_length"
    return Geometry(upstream, divergent, results, absent, contour.own_doubts(area_ratio) if contour is not None else ())


def _measures(contour: Contour, upstream: tuple[Segment, ...], divergent: tuple[Segment, ...], throat_radius: float) -> dict[str, float]:
    whole = (*upstream, *divergent)
    return {
        "divergent_length": walls.length(divergent),
        "contour_length": walls.length(whole),
        "wetted_area": walls.wetted_area(whole),
        "contour_volume": walls.volume(whole),
        "divergence_factor": contour.divergence_factor(divergent, throat_radius),
        "throat_wall_angle": float(divergent[0].angles(np.array([1.0]))[0]),
        "lip_angle": shapes.lip_angle(divergent),
    }


def _wall_volume(segments: Sequence[Segment], thickness: float) -> float:
    try:
        return walls.wall_volume(segments, thickness)
    except InputError as error:
        raise InputError(replace(problem, name="wall_thickness") for problem in error.problems) from error


# -- points and flow ------------------------------------------------------------------------------


def contour_frame(nozzle: Nozzle) -> pd.DataFrame:
    """Return the wall as points: columns x and r [m], the throat at x = 0."""
    import pandas as pd

    points = walls.draw(wall_of(nozzle).segments, POINTS)
    frame = pd.DataFrame({"x": points.x, "r": points.r})
    frame.attrs["units"] = {"x": "m", "r": "m"}
    return frame


def wall_of(nozzle: Nozzle) -> Geometry:
    """Return the geometry of a nozzle with a contour.

    Raises
    ------
    NotAvailableError
        Without a contour.
    """
    if nozzle._values["contour"] is None:
        raise NotAvailableError(NO_CONTOUR, name="contour")
    return nozzle.geometry


def flow_at(nozzle: Nozzle, x: Array, radius: Array) -> dict[str, Array]:
    """Return the core flow at points of the wall [m]: the one-dimensional state of the chosen flow model at the local area.

    The throat acts as discharge coefficient times its area; a point narrower than that has the throat's state.
    """
    throat_area = nozzle.si("throat_area") * nozzle.si("discharge_coefficient")
    ratio = np.maximum(math.pi * radius**2 / throat_area, 1.0)
    downstream = x > 0.0
    found: dict[str, Array] = {}
    for side in (False, True):
        where = downstream == side
        if where.any():
            for name, column in profile.along(nozzle.held, ratio[where], supersonic=side).items():
                found.setdefault(name, np.full(len(x), np.nan))[where] = column
    return found


def flow_frame(nozzle: Nozzle) -> pd.DataFrame:
    """Return the flow along the wall: x, r, local area ratio, wall angle and the state of the core."""
    import pandas as pd

    points = walls.draw(wall_of(nozzle).segments, POINTS)
    columns = {"x": points.x, "r": points.r, "area_ratio": math.pi * points.r**2 / nozzle.si("throat_area"), "wall_angle": points.angle}
    columns |= flow_at(nozzle, points.x, points.r)
    frame = pd.DataFrame(columns)
    units = {"x": "m", "r": "m", "wall_angle": "radian", "pressure": "Pa", "temperature": "K", "velocity": "m/s", "density": "kg/m**3"}
    frame.attrs["units"] = {name: units.get(name, "") for name in frame.columns}
    return frame


# -- files ----------------------------------------------------------------------------------------


def export(nozzle: Nozzle, path: str | os.PathLike[str]) -> Path:
    """Write the wall to a file: .csv (points in metres) or .dxf (true arcs and splines in millimetres).

    Parameters
    ----------
    nozzle : Nozzle
        A nozzle with a contour.
    path : path
        Where to; the ending says which form.

    Returns
    -------
    pathlib.Path
        The file.

    Raises
    ------
    InputError
        For another ending.
    MissingExtraError
        For .dxf without ezdxf (extra ``cad``).
    StorageError
        When the file cannot be written.
    """
    target = Path(path)
    kind = target.suffix.casefold()
    if kind not in (".csv", ".dxf"):
        raise InputError(Problem("path", as_text(str(path)), "a file name that ends in .csv or .dxf"))
    drawing = _dxf(wall_of(nozzle).segments) if kind == ".dxf" else None
    try:
        if drawing is not None:
            drawing.saveas(target)
        else:
            text = contour_frame(nozzle).rename(columns={"x": "x [m]", "r": "r [m]"}).to_csv(index=False, lineterminator="\n")
            target.write_text(text, encoding="utf-8", newline="")
    except OSError as error:
        raise StorageError(f"{target} cannot be written: {error.strerror or error}", path=str(target)) from error
    return target


def _dxf(segments: Sequence[Segment]) -> Any:
    """Return a drawing in millimetres: the axis, and each segment exactly (circular arc, line, or parabola as a spline)."""
    try:
        import ezdxf
    except ImportError as error:
        raise MissingExtraError("ezdxf", "cad", "Export to DXF") from error
    library: Any = ezdxf
    drawing: Any = library.new("R2010", units=4)
    drawing.layers.add("WALL")
    drawing.layers.add("AXIS", linetype="CONTINUOUS")
    space = drawing.modelspace()
    for segment in segments:
        _draw_segment(space, segment, {"layer": "WALL"})
    ends = [segment.points(np.array([0.0, 1.0]))[0] for segment in (segments[0], segments[-1])]
    space.add_line((1e3 * ends[0][0], 0.0), (1e3 * ends[1][1], 0.0), dxfattribs={"layer": "AXIS"})
    return drawing


def _draw_segment(space: Any, segment: Segment, attributes: dict[str, str]) -> None:
    if isinstance(segment, Arc):
        turn = math.radians(90.0) * segment.bend
        angles = sorted(math.degrees(angle - turn) for angle in (segment.start_angle, segment.end_angle))
        centre = (1e3 * segment.centre_x, 1e3 * segment.centre_r)
        space.add_arc(centre, 1e3 * segment.radius, angles[0], angles[1], dxfattribs=attributes)
        return
    start, crossing, end = ((1e3 * x, 1e3 * r) for x, r in (segment.start, segment.crossing, segment.end))
    if float(np.ptp(segment.angles(np.array([0.0, 1.0])))) < 1e-12:
        space.add_line(start, end, dxfattribs=attributes)
    else:
        space.add_open_spline([(*point, 0.0) for point in (start, crossing, end)], degree=2, dxfattribs=attributes)
