"""Maps and curves of a study: contours, shaded limits, the optimum marked, and every number under the pointer.

A map is a neutral figure first, so that the live plot, the panel and the static drawing show the same numbers.
"""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

import numpy as np
import numpy.typing as npt

from propkit import quantities
from propkit import units as unit_text
from propkit.errors import InputError, Problem
from propkit.physics import separation
from propkit.plots.build import build
from propkit.plots.level_sets import LevelSets, contour_levels, label_places
from propkit.report import UnitSystem
from propkit.series import Axis, Figure, Mark, Points, Regions, Series, Texts
from propkit.study.sweep_figures import curves, headline, path_of, shown_axis, shown_values

Array = npt.NDArray[np.float64]

_HEIGHT = 420
SEPARATION = "separation_margin"
"""Name of a limit that no column has: ambient pressure at which the middle of three criteria predicts separation, over the
ambient pressure; at least 1 where the nozzle flows full."""


def plot_of_study(result: Any, x: str | None, y: str | None, *, by: str | None, units: UnitSystem = "SI") -> Any:
    """Return the Bokeh figure of `curves`."""
    return build(curves(result, x, y, by=by, units=units), height=_HEIGHT).figure


# -- maps -----------------------------------------------------------------------------------------


class Grid:
    """Two axes of a grid study and its columns on them; other paths are held at the values of the best design.

    Parameters
    ----------
    result : StudyResult
        Results over a grid.
    name : str
        Column whose best design says where the other paths are held.
    x, y : str or None
        Paths of the axes.
    minimum : bool
        Whether the smallest value is the best.
    """

    def __init__(self, result: Any, name: str, x: str | None, y: str | None, minimum: bool) -> None:
        plan = result.plan.plan
        if not plan.shape:
            raise InputError(Problem("designs", "a list of designs", "a grid", "A map needs designs over a mapping of lists."))
        self.result, self.name = result, name
        if x is None and y is not None:
            y = path_of(result, y)
            x = path_of(result, None, but=y)
        self.x = path_of(result, x)
        self.y = path_of(result, y, but=self.x)
        if self.x == self.y:
            raise InputError(Problem("y", repr(y), "another path than x"))
        row, _ = result.best_design(name, minimum)
        place = list(np.unravel_index(row, plan.shape))
        names = [column.path for column in plan.columns]
        index: list[Any] = [int(entry) for entry in place]
        index[names.index(self.x)] = index[names.index(self.y)] = slice(None)
        self.index = tuple(index)
        self.flipped = names.index(self.x) < names.index(self.y)
        self.shape = plan.shape
        held = np.array([row])
        self.held = {column.path: column.shown(held)[0] for column in plan.columns if column.path not in (self.x, self.y)}

    def on(self, values: Array) -> Array:
        """Return a column on the two axes, shape (y, x), both ascending."""
        table = values.reshape(self.shape)[self.index]
        table = table.T if self.flipped else table
        return np.asarray(table[np.ix_(self.order(self.y), self.order(self.x))])

    def order(self, path: str) -> npt.NDArray[np.intp]:
        """Return the places of an axis in ascending order."""
        return np.argsort(self._column(path).values, kind="stable")

    def ticks(self, path: str, system: UnitSystem) -> Array:
        """Return the values of an axis, ascending, in display units."""
        _, factor, offset = self.result.display(path, system)
        return np.asarray(self._column(path).values[self.order(path)] * factor + offset, dtype=np.float64)

    def _column(self, path: str) -> Any:
        return next(column for column in self.result.plan.plan.columns if column.path == path)


def map_of_study(
    result: Any,
    name: str | None,
    *,
    x: str | None,
    y: str | None,
    limits: Mapping[str, tuple[Any, Any]] | None,
    minimum: bool,
    units: UnitSystem = "SI",
) -> Any:
    """Return a Bokeh map of a result over two paths of a grid (see `StudyResult.map`)."""
    return build(map_figure(result, name, x=x, y=y, limits=limits, minimum=minimum, units=units), height=_HEIGHT).figure


def map_figure(
    result: Any,
    name: str | None = None,
    *,
    x: str | None = None,
    y: str | None = None,
    limits: Mapping[str, tuple[Any, Any]] | None = None,
    minimum: bool = False,
    units: UnitSystem = "SI",
    less: Any = None,
) -> Figure:
    """Return a map of a result over two paths of a grid as neutral data.

    Parameters
    ----------
    result : StudyResult
        Results over a grid.
    name : str, optional
        Result whose contours are drawn; the first of the object's headline by default.
    x, y : str, optional
        Paths of the axes; the first two numbers that vary by default.
    limits : mapping of str to (low, high), optional
        Results that must stay inside a range (see `StudyResult.map`), or ``separation_margin``.
    minimum : bool
        Whether the smallest value is the optimum that is marked.
    units : str
        ``"SI"`` or ``"US"``.
    less : StudyResult, optional
        Results over the same grid that are taken off: a map of differences.

    Raises
    ------
    InputError
        Where there is nothing to draw, or a name or a limit is none.
    """
    column = result.name_of(name) if name is not None else headline(result)
    grid = Grid(result, column, x, y, minimum)
    bands = allowed(result, limits or {})
    xs, ys = grid.ticks(grid.x, units), grid.ticks(grid.y, units)
    values = shown_values(result, column, units)
    table = grid.on(values if less is None else values - _same_grid(result, less, column, units))
    if min(table.shape) < 2 or not np.isfinite(table).any():
        raise InputError(
            Problem("designs", f"a grid of {len(xs)} by {len(ys)} with results", "at least two values on each axis, and a result")
        )
    shown = shown_axis(result, column, units)
    axes = [shown_axis(result, path, units) for path in (grid.x, grid.y)]
    title = _title(shown, grid.held, less is not None)
    everywhere = np.isfinite(table)
    for _, room in bands:
        everywhere &= grid.on(room) >= 0.0
    mark = _optimum(xs, ys, np.where(everywhere, table, np.nan), shown, minimum) if less is None else None
    layers = (
        *_contours(xs, ys, table),
        *(_band(xs, ys, grid.on(room), label, place) for place, (label, room) in enumerate(bands)),
        _points(grid, xs, ys, table, shown, axes, result, tuple(limits or {}), units),
        *((mark,) if mark is not None else ()),
    )
    alt = f"{title} over {axes[0].label} and {axes[1].label}{f': {mark.label}' if mark is not None and mark.label else ''}"
    across, up = (Axis(a.label, a.unit, a.symbol, "linear", float(t[0]), float(t[-1])) for a, t in zip(axes, (xs, ys), strict=True))
    return Figure("study-map" if less is None else "study-difference", title, alt, across, up, layers)


def _title(shown: Axis, held: Mapping[str, Any], difference: bool) -> str:
    unit = unit_text.shown_unit(shown.unit)
    title = f"{'Difference in ' + shown.label if difference else shown.label[:1].upper() + shown.label[1:]}{f' [{unit}]' if unit else ''}"
    listed = ", ".join(f"{path} {value:.5g}" if isinstance(value, float) else f"{path} {value}" for path, value in held.items())
    return f"{title}; {listed}" if listed else title


def _same_grid(result: Any, less: Any, column: str, units: UnitSystem) -> Array:
    mine, theirs = result.plan.plan, less.plan.plan
    same = mine.shape == theirs.shape and all(
        one.path == other.path and np.array_equal(one.values, other.values) for one, other in zip(mine.columns, theirs.columns, strict=True)
    )
    if not same or column not in less.results:
        raise InputError(Problem("less", "another grid", "results over the same designs"))
    _, factor, offset = result.display(column, units)
    return np.asarray(less.values(column) * factor + offset, dtype=np.float64)


def allowed(result: Any, limits: Mapping[str, tuple[Any, Any]]) -> list[tuple[str, Array]]:
    """Return label and room left by each limit, one for each design: negative outside, NaN where there is no result."""
    found = []
    problems: list[Problem] = []
    for name, ends in limits.items():
        if isinstance(ends, str) or not isinstance(ends, tuple | list) or len(ends) != 2:
            problems.append(Problem(name, repr(ends), "a pair (low, high), None for no limit"))
            continue
        try:
            column, values, unit = limited(result, name)
            low, high = (None if end is None else unit_text.to_si(end, unit, name) for end in ends)
        except InputError as error:
            problems.extend(error.problems)
            continue
        size = max((abs(end) for end in (low, high) if end is not None), default=1.0) or 1.0
        room = np.full(values.shape, np.inf)
        room = np.minimum(room, (values - low) / size) if low is not None else room
        room = np.minimum(room, (high - values) / size) if high is not None else room
        words = " or ".join(f"{word} {_said(end, unit)}" for word, end in zip(("below", "above"), ends, strict=True) if end is not None)
        found.append((f"{limit_label(result.plan.target, column)} {words}", np.where(np.isnan(values), np.nan, room)))
    if problems:
        raise InputError(problems)
    return found


def _said(end: Any, unit: str) -> str:
    shown = unit_text.shown_unit(unit)
    return f"{end:g}{f' {shown}' if shown else ''}" if isinstance(end, int | float) else f"{end}"


def limit_label(target: Any, name: str) -> str:
    """Return what a person reads of what a limit is set on."""
    return "margin against separation" if name == SEPARATION else result_label(target, name)


def result_label(target: Any, name: str) -> str:
    """Return what a person reads of a result: its label, with the station of a state, or the object it is of."""
    kind, point, rest = name.partition(".")
    is_upstream = bool(point) and any(link.kind == kind for link in target.chain())
    owner, inner = (kind, rest) if is_upstream else (target.kind, name)
    station, dotted, last = inner.rpartition(".")
    label = quantities.quantity(last, owner).label
    if dotted:
        return f"{label} at the {station}"
    return f"{label}, {owner}" if is_upstream and owner not in label else label


def limited(result: Any, name: str) -> tuple[str, Array, str]:
    """Return name, values and SI unit of what a limit is set on: a result, or the margin against separation."""
    if name == SEPARATION:
        return name, separation_margin(result), ""
    column = result.name_of(name)
    return column, result.values(column), result.quantity(column).unit


def separation_margin(result: Any) -> Array:
    """Return the ambient pressure at which the middle of three criteria predicts separation, over the ambient pressure.

    Raises
    ------
    InputError
        For a study without a nozzle's exit and an ambient pressure.
    """
    names = ("nozzle.exit.pressure", "chamber.stagnation_pressure", "nozzle.exit.mach")
    if result.plan.target.kind != "performance" or any(name not in result.results for name in names):
        raise InputError(Problem(SEPARATION, "not available", "a study of a performance with all its results"))
    pressure, stagnation, mach = (result.values(name) for name in names)
    varied = {column.path for column in result.plan.plan.columns}
    ambient = (
        result.values("performance.ambient")
        if "performance.ambient" in varied
        else np.full(len(pressure), result.plan.target.si("ambient"))
    )
    with np.errstate(all="ignore"):
        found = [np.asarray(entry.ambient(pressure, stagnation, mach)) for entry in separation.CRITERIA.values()]
        return np.asarray(np.median(np.stack(found), axis=0) / ambient, dtype=np.float64)


def _contours(xs: Array, ys: Array, table: Array) -> tuple[Regions, Texts]:
    """Return where the table is at least each of some round levels, laid over each other, and the values of the levels."""
    finite = table[np.isfinite(table)]
    levels = contour_levels(float(finite.min()), float(finite.max()))
    sets = LevelSets(xs, ys, table)
    rings = [sets.rings(level) for level in levels[:-1]]
    places = label_places(rings[1:], xs, ys)
    regions = Regions(tuple(tuple(x.tolist()) for x, _ in rings), tuple(tuple(y.tolist()) for _, y in rings))
    texts = tuple(f"{level:.6g}" for level in levels[1:-1])
    return regions, Texts(tuple(x for x, _ in places), tuple(y for _, y in places), texts)


def _band(xs: Array, ys: Array, room: Array, label: str, place: int) -> Regions:
    """Return where a limit is broken, up to the curve on which it is just met."""
    if (room[np.isfinite(room)] >= 0.0).all():
        x, y = np.empty(0), np.empty(0)
    else:
        x, y = LevelSets(xs, ys, -room).rings(0.0)
    return Regions((tuple(x.tolist()),), (tuple(y.tolist()),), colour=1 + place, opacity=0.16, hatched=True, label=label)


def _points(
    grid: Grid, xs: Array, ys: Array, table: Array, shown: Axis, axes: list[Axis], result: Any, limits: tuple[str, ...], system: UnitSystem
) -> Points:
    """Return what the pointer tells: every design of the map."""
    across, up = (found.ravel().tolist() for found in np.meshgrid(xs, ys))
    hover = [Series(shown.label, tuple(table.ravel().tolist()), shown.unit)]
    for name in limits:
        if name == SEPARATION:
            hover.append(Series(name, tuple(grid.on(separation_margin(result)).ravel().tolist())))
            continue
        column = result.name_of(name)
        hover.append(
            Series(column, tuple(grid.on(shown_values(result, column, system)).ravel().tolist()), result.display(column, system)[0])
        )
    return Points(Series(axes[0].label, tuple(across), axes[0].unit), Series(axes[1].label, tuple(up), axes[1].unit), tuple(hover))


def _optimum(xs: Array, ys: Array, table: Array, shown: Axis, minimum: bool) -> Mark:
    """Return the mark of the best design of the map; nowhere where there is none."""
    if not np.isfinite(table).any():
        return Mark(float("nan"), float("nan"), "")
    up, across = np.unravel_index(int(np.nanargmin(table) if minimum else np.nanargmax(table)), table.shape)
    unit = unit_text.shown_unit(shown.unit)
    word = "smallest" if minimum else "largest"
    return Mark(float(xs[across]), float(ys[up]), f"{word} {float(table[up, across]):.5g}{f' {unit}' if unit else ''}")
