"""Maps and curves of a study as Bokeh figures: contours, shaded limits, the optimum marked, and every number under the pointer."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

import numpy as np
import numpy.typing as npt

from propkit import units as unit_text
from propkit.errors import InputError, MissingExtraError, Problem
from propkit.plots import paint
from propkit.plots.build import FONT, TOOLS, Plot, _frame, build
from propkit.report import UnitSystem
from propkit.series import Figure, Mark
from propkit.study.sweep_figures import curves, headline, path_of, shown_axis, shown_values

Array = npt.NDArray[np.float64]

CONTOURS = 9
_HEIGHT = 420


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
    try:
        from bokeh.models import ColumnDataSource, HoverTool
        from bokeh.plotting import figure as bokeh_figure
    except ImportError as error:
        raise MissingExtraError("bokeh", "notebook", "a map") from error
    column = result.name_of(name) if name is not None else headline(result)
    grid = Grid(result, column, x, y, minimum)
    allowed = _allowed(result, limits or {})
    xs, ys = grid.ticks(grid.x, units), grid.ticks(grid.y, units)
    table = grid.on(shown_values(result, column, units))
    if min(table.shape) < 2 or not np.isfinite(table).any():
        raise InputError(Problem("designs", f"a grid of {len(xs)} by {len(ys)} with results", "at least two values on each axis, and a result"))
    axes = [shown_axis(result, path, units) for path in (grid.x, grid.y)]
    shown = shown_axis(result, column, units)
    unit = unit_text.shown_unit(shown.unit)
    title = f"{shown.label[:1].upper()}{shown.label[1:]}{f' [{unit}]' if unit else ''}"
    if grid.held:
        title += f"; {', '.join(f'{path} {value:.5g}' if isinstance(value, float) else f'{path} {value}' for path, value in grid.held.items())}"
    ranges: dict[str, Any] = {"x_range": (float(xs[0]), float(xs[-1])), "y_range": (float(ys[0]), float(ys[-1]))}
    made: Any = bokeh_figure(height=_HEIGHT, tools=TOOLS, toolbar_location="above", sizing_mode="stretch_width", title=title, name="study-map", **ranges)
    plot = Plot(made, {"x": [float(xs[0]), float(xs[-1])], "y": [float(ys[0]), float(ys[-1])]})
    _frame(plot, Figure("study-map", title, title, axes[0], axes[1]))
    _contours(plot, xs, ys, table)
    for place, (label, room) in enumerate(allowed):
        _band(plot, xs, ys, grid.on(room), label, place)
    points = _points(grid, xs, ys, table, result, tuple(limits or {}), units)
    catch = made.scatter("x", "y", source=ColumnDataSource(points, name="designs"), size=12, fill_alpha=0.0, line_alpha=0.0)
    told = [(axes[0].label, _told("x", axes[0].unit)), (axes[1].label, _told("y", axes[1].unit)), (shown.label, _told("value", shown.unit))]
    told += [(other, f"@{{limit{place}}}") for place, other in enumerate(limits or {})]
    made.add_tools(HoverTool(renderers=[catch], tooltips=told))
    everywhere = np.ones(table.shape, dtype=bool)
    for _, room in allowed:
        everywhere &= grid.on(room) >= 0.0
    _optimum(plot, xs, ys, np.where(everywhere, table, np.nan), unit, minimum)
    return made


def _told(column: str, unit: str) -> str:
    text = unit_text.shown_unit(unit)
    return f"@{column}{{0.[00000]}}{f' {text}' if text else ''}"


def _allowed(result: Any, limits: Mapping[str, tuple[Any, Any]]) -> list[tuple[str, Array]]:
    """Return label and room left by each limit, one for each design: negative outside."""
    from propkit import units as text_units

    found = []
    problems: list[Problem] = []
    for name, ends in limits.items():
        if isinstance(ends, str) or not isinstance(ends, tuple | list) or len(ends) != 2:
            problems.append(Problem(name, repr(ends), "a pair (low, high), None for no limit"))
            continue
        try:
            column = result.name_of(name)
            known = result.quantity(column)
            low, high = (None if end is None else text_units.to_si(end, known.unit, name) for end in ends)
        except InputError as error:
            problems.extend(error.problems)
            continue
        values = result.values(column)
        size = max(abs(end) for end in (low, high) if end is not None) if (low, high) != (None, None) else 1.0
        room = np.full(values.shape, np.inf)
        room = np.minimum(room, values - low) if low is not None else room
        room = np.minimum(room, high - values) if high is not None else room
        room = np.clip(np.where(np.isfinite(values), room / (size or 1.0), -1.0), -1.0, 1.0)
        words = " and ".join(f"{word} {end}" for word, end in zip(("at least", "at most"), ends, strict=True) if end is not None)
        found.append((f"outside: {column} {words}", room))
    if problems:
        raise InputError(problems)
    return found


def _contours(plot: Plot, xs: Array, ys: Array, table: Array) -> None:
    finite = table[np.isfinite(table)]
    low, high = float(finite.min()), float(finite.max())
    levels = contour_levels(low, high)
    shades = [paint.lighter(paint.colour("series-0"), 0.92 - 0.72 * place / max(len(levels) - 2, 1)) for place in range(len(levels) - 1)]
    drawn = plot.figure.contour(xs, ys, np.where(np.isfinite(table), table, np.nan), levels, fill_color=shades, line_color=paint.colour("quiet"), line_width=0.6)
    bar: Any = drawn.construct_color_bar()
    bar.background_fill_color = None
    bar.major_label_text_font = FONT
    plot.paint(bar, "ink", "major_label_text_color")
    plot.figure.add_layout(bar, "right")


def contour_levels(low: float, high: float) -> list[float]:
    """Return round levels that enclose a range, about `CONTOURS` of them."""
    if not high > low:
        pad = abs(low) * 1e-3 or 1e-3
        return [low - pad, low + pad]
    raw = (high - low) / CONTOURS
    size = 10.0 ** np.floor(np.log10(raw))
    step = size * min((entry for entry in (1.0, 2.0, 2.5, 5.0, 10.0) if entry * size >= raw), default=10.0)
    first, last = np.floor(low / step), np.ceil(high / step)
    return [float(step * place) for place in np.arange(first, last + 1)]


def _band(plot: Plot, xs: Array, ys: Array, room: Array, label: str, place: int) -> None:
    """Shade where a limit is broken, up to the curve on which it is just met."""
    if (room >= 0.0).all():
        return
    from bokeh.models.annotations import Legend, LegendItem

    hatch = ("right_diagonal_line", "left_diagonal_line", "cross", "dot")[place % 4]
    role = f"series-{1 + place}"
    colour = paint.colour(role)
    drawn = plot.figure.contour(
        xs, ys, room, [-2.0, 0.0], fill_color=[colour], fill_alpha=0.16, line_color=[colour, colour], line_width=1.4,
        hatch_pattern=[hatch], hatch_color=[colour], hatch_alpha=0.55, hatch_weight=0.8, hatch_scale=9,
    )  # fmt: skip
    shade = drawn.fill_renderer
    made = plot.figure
    if not made.legend:
        look: dict[str, Any] = {"orientation": "horizontal", "location": "top_left", "padding": 2, "margin": 0}
        legend: Any = Legend(items=[], **look)
        legend.background_fill_color = legend.border_line_color = None
        legend.label_text_font, legend.label_text_font_size = FONT, "12px"
        plot.paint(legend, "ink", "label_text_color")
        made.add_layout(legend, "below")
    made.legend[0].items.append(LegendItem(label=label, renderers=[shade]))


def _points(
    grid: Grid, xs: Array, ys: Array, table: Array, result: Any, limits: tuple[str, ...], system: UnitSystem
) -> dict[str, Any]:
    """Return what the pointer tells: every design of the map."""
    across, up = np.meshgrid(xs, ys)
    found: dict[str, Any] = {"x": across.ravel(), "y": up.ravel(), "value": table.ravel()}
    for place, name in enumerate(limits):
        column = result.name_of(name)
        unit = unit_text.shown_unit(result.display(column, system)[0])
        values = grid.on(shown_values(result, column, system)).ravel()
        found[f"limit{place}"] = [f"{value:.5g}{f' {unit}' if unit else ''}" for value in values]
    return found


def _optimum(plot: Plot, xs: Array, ys: Array, table: Array, unit: str, minimum: bool) -> None:
    """Mark the best design of the map."""
    if not np.isfinite(table).any():
        return
    from propkit.plots.build import _mark

    up, across = np.unravel_index(int(np.nanargmin(table) if minimum else np.nanargmax(table)), table.shape)
    value = float(table[up, across])
    word = "smallest" if minimum else "largest"
    _mark(plot, Mark(float(xs[across]), float(ys[up]), f"{word} {value:.5g}{f' {unit}' if unit else ''}"), 0)
