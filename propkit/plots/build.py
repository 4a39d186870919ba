"""A neutral figure as a Bokeh figure.

Each layer has one `ColumnDataSource` named ``layer-<n>``; `columns` says what it holds, for the first paint and for
every later one, so that a plot that is updated in place and a plot built anew cannot differ.
"""

from __future__ import annotations

import json
from dataclasses import dataclass, field
from functools import partial
from typing import Any

from propkit import units
from propkit.errors import MissingExtraError
from propkit.plots import paint
from propkit.plots.limits import round_limits
from propkit.plots.still import still
from propkit.series import Axis, Bars, Figure, Layer, Line, Mark, Points, Regions, Rule, Series, Texts

HEIGHT = 300
FONT = "system-ui, sans-serif"
ROOM_BELOW = 72
"""Room for axis and legend below a plot [px]; without it BokehJS forgets the legend when the page is resized."""
LONG_TEXT = 8
"""Texts of bars up to this length stand beside the frame."""
TOOLS = "pan,box_zoom,reset"


@dataclass(slots=True)
class Plot:
    """A Bokeh figure, and which colour role each property of its models plays."""

    figure: Any
    where: dict[str, Any]
    legend: bool = False
    rules: int = 0
    painted: list[tuple[Any, str, str]] = field(default_factory=list)

    def paint(self, model: Any, role: str, *properties: str) -> None:
        """Give properties of a model the colour of a role, and remember that."""
        for name in properties:
            self.painted.append((model, name, role))
            setattr(model, name, paint.colour(role))


def structure(figure: Figure) -> str:
    """Return a text that is the same for two figures exactly when one can be shown by new data in the plot of the other."""
    layers = [
        [type(layer).__name__, str(getattr(layer, "colour", "")), getattr(layer, "dash", ""), _layer_extra(layer)]
        for layer in figure.layers
    ]
    axes = [[axis.label, axis.unit, axis.scale] for axis in (figure.x, figure.y)]
    return json.dumps([figure.name, axes, layers, figure.equal_aspect, figure.bare])


def _layer_extra(layer: Any) -> list[Any]:
    if isinstance(layer, Line):
        return [layer.closed, layer.fill, layer.label, [[s.label, s.unit] for s in (layer.x, layer.y, *layer.hover)]]
    if isinstance(layer, Bars):
        return [layer.values.label, layer.values.unit]
    if isinstance(layer, Regions):
        return [layer.opacity, layer.outlined, layer.hatched, layer.label]
    if isinstance(layer, Points):
        return [[s.label, s.unit] for s in (layer.x, layer.y, *layer.hover)]
    return [getattr(layer, "axis", "")]


def columns(layer: Layer, where: dict[str, Any]) -> dict[str, list[Any]]:
    """Return what the data source of a layer holds: lists of numbers, of texts, or of lists of numbers by column.

    `where` holds the limits of the figure: the label of a rule stands at the edge.
    """
    if isinstance(layer, Regions):
        return {"xs": list(map(list, layer.xs)), "ys": list(map(list, layer.ys))}
    if isinstance(layer, Texts):
        return {"x": list(layer.x), "y": list(layer.y), "text": list(layer.texts)}
    if isinstance(layer, Line | Points):
        made: dict[str, list[Any]] = {"x": list(layer.x.values), "y": list(layer.y.values)}
        return made | {f"hover{place}": list(series.values) for place, series in enumerate(layer.hover)}
    if isinstance(layer, Bars):
        texts = layer.texts or tuple(f"{value:.4g}" for value in layer.values.values)
        return {
            "category": categories(layer),
            "start": list(layer.starts or (0.0,) * len(texts)),
            "value": list(layer.values.values),
            "text": list(texts),
        }
    if isinstance(layer, Mark):
        low, high = where["x"]
        late = layer.x > low + 0.7 * (high - low)
        high_up = layer.y > where["y"][0] + 0.85 * (where["y"][1] - where["y"][0])
        side: dict[str, list[Any]] = {
            "align": ["right" if late else "left"],
            "shift": [-9.0 if late else 9.0],
            "lift": [16.0 if high_up else -8.0],
        }
        return {"x": [layer.x], "y": [layer.y], "text": [layer.label], **side}
    edge = where["y" if layer.axis == "x" else "x"]
    return {"at": [layer.at], "edge": [edge[1] if layer.axis == "x" else edge[0]], "text": [layer.label]}


def categories(bars: Bars) -> list[str]:
    """Return the categories of bars as they are shown."""
    return [paint.species(text) for text in bars.categories]


def limits(figure: Figure) -> dict[str, Any]:
    """Return the limits of both axes: two numbers, or the categories of bars from bottom to top."""
    found: dict[str, Any] = {}
    for name, axis in (("x", figure.x), ("y", figure.y)):
        bars = next((layer for layer in figure.layers if isinstance(layer, Bars)), None)
        if bars is not None and name == "y":
            found[name] = list(reversed(categories(bars)))
            continue
        points = [value for layer in figure.layers for value in _extent(layer, name)]
        found[name] = list(round_limits(points, axis.low, axis.high))
    if figure.equal_aspect:
        found = _with_margin(figure)
    return found


def _with_margin(figure: Figure) -> dict[str, Any]:
    """Return limits of a drawing to scale: no rounding, a margin on every side."""
    found = {}
    for name in ("x", "y"):
        points = [value for layer in figure.layers for value in _extent(layer, name)]
        room = 0.06 * (max(points) - min(points))
        found[name] = [min(points) - room, max(points) + room]
    return found


def _extent(layer: Any, axis: str) -> list[float]:
    if isinstance(layer, Line):
        return [value for value in (layer.x if axis == "x" else layer.y).values if value == value]
    if isinstance(layer, Bars):
        return [*(layer.starts or (0.0,)), *layer.values.values, _room_for_texts(layer)] if axis == "x" else []
    if isinstance(layer, Mark):
        return [layer.x if axis == "x" else layer.y]
    if not isinstance(layer, Rule):
        return []
    return [layer.at] if layer.axis == axis and layer.at == layer.at else []


def _room_for_texts(bars: Bars) -> float:
    """Return how far the axis of bars reaches so that long texts at their ends stay inside the frame."""
    longest = max((len(text) for text in bars.texts), default=0)
    low, largest = min(bars.starts, default=0.0), max(bars.values.values, default=0.0)
    return low + (largest - low) / (1.0 - min(0.02 * longest, 0.5)) if longest > LONG_TEXT else largest


def axis_text(axis: Axis) -> str:
    """Return the label of an axis with its unit."""
    unit = units.shown_unit(axis.unit)
    label = axis.label[:1].upper() + axis.label[1:]
    return f"{label} [{unit}]" if unit else label


def build(figure: Figure, *, height: int = HEIGHT, width: int | None = None) -> Plot:
    """Return the Bokeh plot of a neutral figure; it fills its container unless `width` is given.

    Raises
    ------
    MissingExtraError
        When Bokeh is not installed.
    """
    try:
        from bokeh.models import DataRange1d, FactorRange, Range1d
        from bokeh.plotting import figure as bokeh_figure
    except ImportError as error:
        raise MissingExtraError("bokeh", "notebook", "a live plot") from error
    where = limits(figure)
    if figure.equal_aspect:
        ranges: dict[str, Any] = {f"{name}_range": DataRange1d(range_padding=0.06) for name in where}
    else:
        ranges = {f"{name}_range": FactorRange(*ends) if isinstance(ends[0], str) else Range1d(*ends) for name, ends in where.items()}
    sizing: dict[str, Any] = {"sizing_mode": "stretch_width"} if width is None else {"width": width}
    scales = {f"{name}_axis_type": "log" for name, axis in (("x", figure.x), ("y", figure.y)) if axis.scale == "log"}
    options: dict[str, Any] = {**ranges, **scales, **sizing, "title": figure.title, "name": figure.name}
    made: Any = bokeh_figure(height=height, tools=TOOLS, toolbar_location="above", **options)
    made._repr_mimebundle_ = partial(still, figure)
    plot = Plot(made, where, legend=sum(isinstance(layer, Line) and bool(layer.label) for layer in figure.layers) > 1)
    _frame(plot, figure)
    if figure.equal_aspect:
        made.match_aspect, made.aspect_scale = True, 1.0
    for place, layer in enumerate(figure.layers):
        _LAYERS[type(layer)](plot, layer, place)
    return plot


def _frame(plot: Plot, figure: Figure) -> None:
    made = plot.figure
    made.toolbar.logo, made.toolbar.autohide = None, True
    made.xaxis.axis_label, made.yaxis.axis_label = axis_text(figure.x), axis_text(figure.y)
    for part in ("background_fill_color", "border_fill_color", "outline_line_color"):
        setattr(made, part, None)
    plot.paint(made.title, "ink", "text_color")
    made.title.text_font, made.title.text_font_size, made.title.text_font_style = FONT, "13px", "normal"
    for axis in (*made.xaxis, *made.yaxis):
        plot.paint(axis, "ink", "axis_label_text_color", "major_label_text_color")
        plot.paint(axis, "quiet", "axis_line_color", "major_tick_line_color")
        axis.minor_tick_line_color = None
        axis.axis_label_text_font = axis.major_label_text_font = FONT
        axis.axis_label_text_font_style, axis.axis_label_text_font_size, axis.major_label_text_font_size = "normal", "12px", "12px"
        axis.visible = not figure.bare
    for grid in (*made.xgrid, *made.ygrid):
        plot.paint(grid, "hairline", "grid_line_color")
    bars = any(isinstance(layer, Bars) for layer in figure.layers)
    made.ygrid.visible = not bars and not figure.bare
    made.xgrid.visible = not figure.bare
    made.min_border_right = 18


def _source(plot: Plot, layer: Any, place: int) -> Any:
    from bokeh.models import ColumnDataSource

    data: Any = columns(layer, plot.where)
    return ColumnDataSource(data, name=f"layer-{place}")


def _told(series: Series, column: str) -> tuple[str, str]:
    unit = units.shown_unit(series.unit)
    return series.label, f"@{column}{{%.5g}}{f' {unit}' if unit else ''}"


def _hover(plot: Plot, renderer: Any, told: list[tuple[str, str]], formatted: list[str]) -> None:
    from bokeh.models import HoverTool

    formatters: Any = {f"@{column}": "printf" for column in formatted}
    plot.figure.add_tools(HoverTool(renderers=[renderer], tooltips=told, formatters=formatters, visible=False))


def _line(plot: Plot, layer: Line, place: int) -> None:
    source, made = _source(plot, layer, place), plot.figure
    role = paint.role_of(layer.colour)
    if layer.closed or layer.fill:
        shape = made.patch("x", "y", source=source, line_width=1.6, fill_alpha=0.08 if layer.fill else 0.0, line_dash=layer.dash)
        plot.paint(shape.glyph, role, "line_color", "fill_color")
        plain(shape)
        return
    drawn = made.line("x", "y", source=source, line_width=1.2 if layer.colour == "quiet" else 2.0, line_dash=layer.dash)
    plot.paint(drawn.glyph, role, "line_color")
    plain(drawn)
    told = [_told(layer.x, "x")]
    if len(layer.hover) < 2 and layer.colour != "quiet":
        told.append(_told(layer.y, "y"))
    told += [_told(series, f"hover{n}") for n, series in enumerate(layer.hover)]
    catch = made.scatter("x", "y", source=source, size=14, fill_alpha=0.0, line_alpha=0.0)
    _hover(plot, catch, told, ["x", "y", *(f"hover{n}" for n in range(len(layer.hover)))])
    if layer.label and plot.legend:
        _legend(plot, layer, drawn)


def plain(renderer: Any) -> None:
    """Let a glyph look the same when a tool selects or mutes it."""
    renderer.nonselection_glyph = renderer.selection_glyph = None


def _legend(plot: Plot, layer: Line | Regions, drawn: Any) -> None:
    from bokeh.models.annotations import Legend, LegendItem

    made = plot.figure
    if not made.legend:
        look: dict[str, Any] = {"orientation": "horizontal", "location": "top_left", "padding": 2, "spacing": 14, "margin": 0}
        if isinstance(layer, Regions):
            look |= {"orientation": "vertical", "spacing": 1}
        legend: Any = Legend(items=[], **look)
        legend.background_fill_color = legend.border_line_color = None
        legend.label_text_font, legend.label_text_font_size, legend.glyph_width = FONT, "12px", 18
        plot.paint(legend, "ink", "label_text_color")
        made.add_layout(legend, "below")
        made.min_border_bottom = ROOM_BELOW
    if isinstance(layer, Regions):
        made.min_border_bottom = ROOM_BELOW + 19 * len(made.legend[0].items)
    made.legend[0].items.append(LegendItem(label=layer.label, renderers=[drawn]))


def _bars(plot: Plot, layer: Bars, place: int) -> None:
    from bokeh.core.properties import value

    source, made = _source(plot, layer, place), plot.figure
    bar = made.hbar(y="category", right="value", left="start", height=0.62, source=source, line_color=None)
    plot.paint(bar.glyph, paint.role_of(layer.colour), "fill_color")
    plain(bar)
    text = made.text(
        "value", "category", text="text", source=source, x_offset=5, text_baseline="middle", text_font=value(FONT), text_font_size="12px"
    )
    plot.paint(text.glyph, "ink", "text_color")
    _hover(plot, bar, [(layer.values.label, "@text"), ("of", "@category")], [])
    made.min_border_right = 60
    made.yaxis.major_tick_line_color = None


def _mark(plot: Plot, layer: Mark, place: int) -> None:
    from bokeh.core.properties import value

    source, made = _source(plot, layer, place), plot.figure
    role = paint.role_of(layer.colour)
    dot = made.scatter("x", "y", source=source, size=10, line_width=2.0)
    plot.paint(dot.glyph, role, "fill_color")
    plot.paint(dot.glyph, "paper", "line_color")
    plain(dot)
    text = made.text(
        "x",
        "y",
        text="text",
        source=source,
        x_offset="shift",
        y_offset="lift",
        text_align="align",
        text_font=value(FONT),
        text_font_size="12px",
    )
    plot.paint(text.glyph, "ink", "text_color")
    _hover(plot, dot, [("", "@text"), ("x", "@x{%.5g}"), ("y", "@y{%.5g}")], ["x", "y"])


def _rule(plot: Plot, layer: Rule, place: int) -> None:
    from bokeh.core.properties import value
    from bokeh.models.annotations import LabelSet

    source, made = _source(plot, layer, place), plot.figure
    label: Any
    if layer.axis == "x":
        drawn = made.vspan(x="at", source=source, line_width=1.2, line_dash=layer.dash)
        label = LabelSet(x="at", y="edge", text="text", source=source, x_offset=4, y_offset=-4 - 15 * plot.rules, text_baseline="top")
        plot.rules += 1
    else:
        drawn = made.hspan(y="at", source=source, line_width=1.2, line_dash=layer.dash)
        label = LabelSet(x="edge", y="at", text="text", source=source, x_offset=4, y_offset=3)
    plot.paint(drawn.glyph, "quiet", "line_color")
    label.text_font, label.text_font_size = value(FONT), value("12px")
    plot.paint(label, "quiet", "text_color")
    made.add_layout(label)


def _regions(plot: Plot, layer: Regions, place: int) -> None:
    source, made = _source(plot, layer, place), plot.figure
    role = paint.role_of(layer.colour)
    hatch: dict[str, Any] = (
        {"hatch_pattern": "right_diagonal_line", "hatch_alpha": 0.6, "hatch_weight": 0.8, "hatch_scale": 9} if layer.hatched else {}
    )
    drawn = made.patches(
        "xs", "ys", source=source, fill_alpha=layer.opacity, line_width=(1.4 if layer.hatched else 0.6) if layer.outlined else 0.0, **hatch
    )
    plot.paint(drawn.glyph, role, "fill_color", *(("line_color", "hatch_color") if layer.hatched else ()))
    if not layer.hatched:
        plot.paint(drawn.glyph, "quiet", "line_color")
    plain(drawn)
    if layer.label:
        _legend(plot, layer, drawn)


def _texts(plot: Plot, layer: Texts, place: int) -> None:
    from bokeh.core.properties import value

    drawn = plot.figure.text(
        "x",
        "y",
        text="text",
        source=_source(plot, layer, place),
        text_align="center",
        text_baseline="middle",
        text_font=value(FONT),
        text_font_size="11px",
    )
    plot.paint(drawn.glyph, "ink", "text_color")


def _points(plot: Plot, layer: Points, place: int) -> None:
    catch = plot.figure.scatter("x", "y", source=_source(plot, layer, place), size=12, fill_alpha=0.0, line_alpha=0.0)
    told = [_told(layer.x, "x"), _told(layer.y, "y"), *(_told(series, f"hover{n}") for n, series in enumerate(layer.hover))]
    _hover(plot, catch, told, ["x", "y", *(f"hover{n}" for n in range(len(layer.hover)))])


_LAYERS: dict[type, Any] = {Line: _line, Bars: _bars, Mark: _mark, Rule: _rule, Regions: _regions, Texts: _texts, Points: _points}
