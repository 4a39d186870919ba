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
from propkit.series import Axis, Figure, Line, Mark, Series

Array = npt.NDArray[np.float64]

CONTOURS = 9
_HEIGHT = 420
MOST_CURVES = 8


def shown_axis(result: Any, name: str, system: UnitSystem) -> Axis:
    """Return the axis of a column: its label, display unit and symbol."""
    known = result.quantity(name)
    return Axis(known.label, result.display(name, system)[0], known.symbol)


def shown_values(result: Any, name: str, system: UnitSystem) -> Array:
    """Return a column in its display unit."""
    _, factor, offset = result.display(name, system)
    return np.asarray(result.values(name) * factor + offset, dtype=np.float64)


# -- curves ---------------------------------------------------------------------------------------


def curves(result: Any, x: str | None, y: str | None, *, by: str | None, units: UnitSystem = "SI") -> Figure:
    """Return a result over a path as neutral data, one curve for each value of another path.

    Raises
    ------
    InputError
        Where nothing varies along the axis, or a name is none.
    """
    plan = result.plan.plan
    along = _path(result, x, longest=True)
    name = result.name_of(y) if y is not None else headline(result)
    others = [column for column in plan.columns if column.path != along]
    split = next((column for column in plan.columns if column.path == _any_path(result, by)), None) if by is not None else None
    if split is None and others:
        split = max((column for column in others if len(np.unique(column.values)) > 1), key=lambda column: len(np.unique(column.values)), default=None)
    xs, ys = shown_values(result, along, units), shown_values(result, name, units)
    rows = np.arange(plan.count)
    keep = np.isfinite(xs)
    for column in others:
        if column is not split:
            values = column.at(rows)
            keep &= values == values[0]
    axis_x, axis_y = shown_axis(result, along, units), shown_axis(result, name, units)
    lines = []
    for place, (label, chosen) in enumerate(_kinds(result, split, rows[keep], units)):
        order = chosen[np.argsort(xs[chosen], kind="stable")]
        lines.append(
            Line(
                Series(axis_x.label, tuple(map(float, xs[order])), axis_x.unit, axis_x.symbol),
                Series(axis_y.label, tuple(map(float, ys[order])), axis_y.unit, axis_y.symbol),
                colour=place,
                label=label,
            )
        )
    title = f"{axis_y.label[:1].upper()}{axis_y.label[1:]} over {axis_x.label}"
    return Figure("study-curves", title, f"{title}, {len(lines)} curves", axis_x, axis_y, tuple(lines))


def _kinds(result: Any, split: Any, rows: npt.NDArray[np.intp], system: UnitSystem) -> list[tuple[str, npt.NDArray[np.intp]]]:
    """Return label and designs of each curve, at most `MOST_CURVES` of them, evenly spread."""
    if split is None:
        return [("", rows)]
    values = split.at(rows)
    kinds = np.unique(values)
    if len(kinds) > MOST_CURVES:
        kinds = kinds[np.unique(np.linspace(0, len(kinds) - 1, MOST_CURVES).astype(int))]
    if split.is_choice:
        return [(str(split.shown(rows[values == kind][:1])[0]), rows[values == kind]) for kind in kinds]
    unit, factor, offset = result.display(split.path, system)
    text = unit_text.shown_unit(unit)
    label = result.quantity(split.path).label
    return [(f"{label} {float(kind) * factor + offset:.5g}{f' {text}' if text else ''}", rows[values == kind]) for kind in kinds]


def plot_of_study(result: Any, x: str | None, y: str | None, *, by: str | None, units: UnitSystem = "SI") -> Any:
    """Return the Bokeh figure of `curves`."""
    return build(curves(result, x, y, by=by, units=units), height=_HEIGHT).figure


def headline(result: Any) -> str:
    """Return the result that is shown where none is named: the first of the object's headline."""
    return next((name for name in result.plan.target.headline if name in result.results), result.results[0])


def _any_path(result: Any, name: str) -> str:
    found = [column.path for column in result.plan.plan.columns if column.path == name or column.path.endswith(f".{name}")]
    if len(found) != 1:
        listed = ", ".join(column.path for column in result.plan.plan.columns)
        raise InputError(Problem("path", repr(name), f"one of {listed}"))
    return str(found[0])


def _path(result: Any, name: str | None, *, longest: bool = False, but: str = "") -> str:
    """Return the path of a number that varies: the one named, or the first (or longest) other than `but`."""
    numbers = [column for column in result.plan.plan.numbers if len(np.unique(column.values)) > 1 and column.path != but]
    if name is not None:
        path = _any_path(result, name)
        if path not in {column.path for column in numbers}:
            raise InputError(Problem("path", repr(name), "a number that varies in this study"))
        return path
    if not numbers:
        raise InputError(Problem("designs", "without a number that varies" if not but else "with a single number that varies", "a study that varies another number"))
    return str((max(numbers, key=lambda column: len(np.unique(column.values))) if longest else numbers[0]).path)


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
            y = _path(result, y)
            x = _path(result, None, but=y)
        self.x = _path(result, x)
        self.y = _path(result, y, but=self.x)
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
        from bokeh.models import ColumnDataSource, HoverTool, Range1d
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
    ranges: dict[str, Any] = {"x_range": Range1d(float(xs[0]), float(xs[-1])), "y_range": Range1d(float(ys[0]), float(ys[-1]))}
    made: Any = bokeh_figure(height=_HEIGHT, tools=TOOLS, toolbar_location="above", sizing_mode="stretch_width", title=title, name="study-map", **ranges)
    plot = Plot(made, {"x": [float(xs[0]), float(xs[-1])], "y": [float(ys[0]), float(ys[-1])]})
    _frame(plot, Figure("study-map", title, title, axes[0], axes[1]))
    _contours(plot, xs, ys, table)
    for place, (label, inside) in enumerate(allowed):
        _band(plot, xs, ys, grid.on(inside.astype(np.float64)), label, place)
    points = _points(grid, xs, ys, table, result, tuple(limits or {}), units)
    catch = made.scatter("x", "y", source=ColumnDataSource(points, name="designs"), size=12, fill_alpha=0.0, line_alpha=0.0)
    told = [(axes[0].label, _told("x", axes[0].unit)), (axes[1].label, _told("y", axes[1].unit)), (shown.label, _told("value", shown.unit))]
    told += [(other, f"@{{limit{place}}}") for place, other in enumerate(limits or {})]
    made.add_tools(HoverTool(renderers=[catch], tooltips=told))
    everywhere = np.ones(table.shape, dtype=bool)
    for _, inside in allowed:
        everywhere &= grid.on(inside.astype(np.float64)) > 0.5
    _optimum(plot, xs, ys, np.where(everywhere, table, np.nan), unit, minimum)
    return made


def _told(column: str, unit: str) -> str:
    text = unit_text.shown_unit(unit)
    return f"@{column}{{0.[00000]}}{f' {text}' if text else ''}"


def _allowed(result: Any, limits: Mapping[str, tuple[Any, Any]]) -> list[tuple[str, npt.NDArray[np.bool_]]]:
    """Return label and truth of each limit, one for each design."""
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
        inside = np.isfinite(values)
        inside &= (values >= low) if low is not None else True
        inside &= (values <= high) if high is not None else True
        words = " and ".join(f"{word} {end}" for word, end in zip(("at least", "at most"), ends, strict=True) if end is not None)
        found.append((f"outside: {known.label} {words}", inside))
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


def _band(plot: Plot, xs: Array, ys: Array, inside: Array, label: str, place: int) -> None:
    """Shade where a limit is broken."""
    if (inside > 0.5).all():
        return
    from bokeh.models import Legend, LegendItem

    hatch = ("right_diagonal_line", "left_diagonal_line", "cross", "dot")[place % 4]
    width, height = np.gradient(xs), np.gradient(ys)
    where_y, where_x = np.nonzero(inside < 0.5)
    role = f"series-{1 + place}"
    shade = plot.figure.rect(
        xs[where_x], ys[where_y], width=width[where_x], height=height[where_y], line_color=None, fill_alpha=0.16,
        hatch_pattern=hatch, hatch_alpha=0.55, hatch_weight=0.8, hatch_scale=9,
    )  # fmt: skip
    plot.paint(shade.glyph, role, "fill_color", "hatch_color")
    made = plot.figure
    if not made.legend:
        legend: Any = Legend(items=[], orientation="horizontal", location="top_left", padding=2, margin=0)
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
