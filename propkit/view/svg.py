"""Static drawings: a neutral Figure as a small SVG, a few kB, the same bytes for the same figure."""

from __future__ import annotations

import base64
import math
from html import escape

from propkit.series import Axis, Bars, Figure, Line, Mark, Rule
from propkit.view import cells, palette
from propkit.view.numbers import pretty
from propkit.view.symbols import text_species, text_symbol

WIDTH, HEIGHT = 360, 220
_FONT = "font-family='Helvetica Neue,Helvetica,Arial,sans-serif'"
_DASH = {"solid": "", "dashed": " stroke-dasharray='6 4'", "dotted": " stroke-dasharray='1.5 3'"}


def draw(figure: Figure, width: int = WIDTH, height: int = HEIGHT) -> str:
    """Return the figure as SVG.

    Parameters
    ----------
    figure : Figure
        The drawing as neutral data.
    width, height : int
        Size in pixels of the light plate it stands on.
    """
    bars = [layer for layer in figure.layers if isinstance(layer, Bars)]
    if bars:
        height = 34 + 26 * len(bars[0].categories)
        body = _bars(bars[0], width, species=figure.name == "composition")
    elif figure.equal_aspect:
        body = _to_scale(figure, width, height)
    else:
        body = _curves(figure, width, height)
    head = (
        f"<svg xmlns='http://www.w3.org/2000/svg' viewBox='0 0 {width} {height}' width='{width}' height='{height}' role='img'>"
        f"<title>{escape(figure.alt)}</title><rect width='{width}' height='{height}' rx='3' fill='{palette.PLATE}'/>"
    )
    return head + _text(12, 18, figure.title, size=11, colour=palette.QUIET) + body + "</svg>"


def data_uri(figure: Figure) -> str:
    """Return the figure as the address of an image that needs no network."""
    return f"data:image/svg+xml;base64,{base64.b64encode(draw(figure).encode()).decode()}"


def _text(
    x: float, y: float, text: str, *, size: int = 10, anchor: str = "start", colour: str = palette.INK, weight: str = ""
) -> str:
    bold = f" font-weight='{weight}'" if weight else ""
    return f"<text x='{_n(x)}' y='{_n(y)}' {_FONT} font-size='{size}' text-anchor='{anchor}' fill='{colour}'{bold}>{escape(text)}</text>"


def _n(value: float) -> str:
    return f"{value:.1f}".removesuffix(".0")


def _path(points: list[tuple[float, float]], closed: bool = False) -> str:
    parts, pen = [], "M"
    for x, y in points:
        if math.isfinite(x) and math.isfinite(y):
            parts.append(f"{pen}{_n(x)} {_n(y)}")
            pen = "L"
        else:
            pen = "M"
    return "".join(parts) + ("Z" if closed else "")


def _bars(bars: Bars, width: int, species: bool) -> str:
    texts = bars.texts or tuple(f"{value:.3g}" for value in bars.values.values)
    names = [text_species(name) if species else name for name in bars.categories]
    left = 18 + 6.0 * max((len(name) for name in names), default=1)
    room = width - left - 18 - 6.2 * max((len(text) for text in texts), default=1)
    largest = max((abs(value) for value in bars.values.values), default=1.0) or 1.0
    out = []
    for position, (name, value, text) in enumerate(zip(names, bars.values.values, texts, strict=True)):
        y = 30 + 26 * position
        long = max(1.0, room * abs(value) / largest)
        colour = palette.colour(bars.colour)
        out.append(_text(left - 8, y + 13, name, anchor="end"))
        out.append(f"<rect x='{_n(left)}' y='{y}' width='{_n(long)}' height='18' fill='{colour}' fill-opacity='.88'/>")
        out.append(_text(left + long + 6, y + 13, text, colour=palette.QUIET))
    return "".join(out)


def _to_scale(figure: Figure, width: int, height: int) -> str:
    lines = [layer for layer in figure.layers if isinstance(layer, Line)]
    xs = [x for line in lines for x in line.x.values]
    ys = [y for line in lines for y in line.y.values]
    low_x, high_x, low_y, high_y = min(xs), max(xs), min(ys), max(ys)
    top, bottom, side = 34, 22, 16
    scale = min((width - 2 * side) / max(high_x - low_x, 1e-12), (height - top - bottom) / max(high_y - low_y, 1e-12))
    x0 = (width - scale * (high_x - low_x)) / 2 - scale * low_x
    y0 = top + (height - top - bottom) / 2 + scale * (high_y + low_y) / 2

    def place(x: float, y: float) -> tuple[float, float]:
        return x0 + scale * x, y0 - scale * y

    out = []
    for line in lines:
        points = [place(x, y) for x, y in zip(line.x.values, line.y.values, strict=True)]
        fill = palette.SERIES[0] if line.fill else "none"
        opacity = " fill-opacity='.10'" if line.fill else ""
        out.append(
            f"<path d='{_path(points, line.closed)}' fill='{fill}'{opacity} stroke='{palette.colour(line.colour)}' stroke-width='1.4' stroke-linejoin='round'{_DASH[line.dash]}/>"
        )
    left, right = place(low_x, 0)[0], place(high_x, 0)[0]
    out.append(
        f"<path d='M{_n(left - 6)} {_n(y0)}H{_n(right + 6)}' stroke='{palette.QUIET}' stroke-width='.8' stroke-dasharray='9 3 2 3'/>"
    )
    for mark in (layer for layer in figure.layers if isinstance(layer, Mark)):
        x, y = place(mark.x, mark.y)
        low = place(mark.x, -mark.y)[1]
        out.append(f"<path d='M{_n(x)} {_n(y)}V{_n(low)}' stroke='{palette.colour(mark.colour)}' stroke-width='1'/>")
        out.append(
            f"<circle cx='{_n(x)}' cy='{_n(y)}' r='2.2' fill='{palette.colour(mark.colour)}'/><circle cx='{_n(x)}' cy='{_n(low)}' r='2.2' fill='{palette.colour(mark.colour)}'/>"
        )
        half = 3.0 * len(mark.label)
        at = min(max(x, half + 8), width - half - 8)
        out.append(
            _text(at, min(low + 14, height - 6), mark.label, anchor="middle", colour=palette.colour(mark.colour))
        )
    return "".join(out)


def ticks(low: float, high: float, count: int = 5) -> list[float]:
    """Return round numbers between `low` and `high`, about `count` of them."""
    if not high > low:
        return [low]
    raw = (high - low) / count
    power = 10.0 ** math.floor(math.log10(raw))
    step = next(factor * power for factor in (1, 2, 2.5, 5, 10) if factor * power >= raw * 0.999)
    first = math.ceil(low / step - 1e-9)
    return [round(k * step, 12) for k in range(first, math.floor(high / step + 1e-9) + 1)]


def _limits(axis: Axis, values: list[float], zero: bool) -> tuple[float, float]:
    finite = [value for value in values if math.isfinite(value)]
    low = axis.low if axis.low is not None else min(finite, default=0.0)
    high = axis.high if axis.high is not None else max(finite, default=1.0)
    if zero and axis.low is None and low > 0 and low < 0.5 * high:
        low = 0.0
    if high <= low:
        low, high = low - 0.5 * abs(low or 1.0), high + 0.5 * abs(high or 1.0)
    pad = 0.06 * (high - low)
    return (low if axis.low is not None or low == 0.0 else low - pad), (high if axis.high is not None else high + pad)


def _axis_title(axis: Axis) -> str:
    unit = cells.unit_text(axis.unit)
    sign = text_symbol(axis.symbol)
    return f"{axis.label}{f' {sign}' if sign else ''}{f' [{unit}]' if unit else ''}"


def _curves(figure: Figure, width: int, height: int) -> str:
    lines = [layer for layer in figure.layers if isinstance(layer, Line)]
    marks = [layer for layer in figure.layers if isinstance(layer, Mark)]
    rules = [layer for layer in figure.layers if isinstance(layer, Rule)]
    xs = (
        [x for line in lines for x in line.x.values]
        + [mark.x for mark in marks]
        + [rule.at for rule in rules if rule.axis == "x"]
    )
    ys = (
        [y for line in lines for y in line.y.values]
        + [mark.y for mark in marks]
        + [rule.at for rule in rules if rule.axis == "y"]
    )
    log_x, log_y = figure.x.scale == "log", figure.y.scale == "log"
    low_x, high_x = _limits(figure.x, [_log(x, log_x) for x in xs], False)
    low_y, high_y = _limits(figure.y, [_log(y, log_y) for y in ys], not log_y)
    left, right, top, bottom = 52, width - 16, 46, height - 36

    def place(x: float, y: float) -> tuple[float, float]:
        return (
            left + (right - left) * (_log(x, log_x) - low_x) / (high_x - low_x),
            bottom - (bottom - top) * (_log(y, log_y) - low_y) / (high_y - low_y),
        )

    out = []
    for tick in ticks(low_y, high_y):
        y = place(low_x if not log_x else 10**low_x, 10**tick if log_y else tick)[1]
        out.append(f"<path d='M{left} {_n(y)}H{right}' stroke='{palette.HAIRLINE}' stroke-width='.6'/>")
        out.append(_text(left - 6, y + 3.5, _tick(tick, log_y), anchor="end", colour=palette.QUIET))
    for tick in ticks(low_x, high_x):
        x = place(10**tick if log_x else tick, low_y if not log_y else 10**low_y)[0]
        out.append(f"<path d='M{_n(x)} {bottom}v4' stroke='{palette.QUIET}' stroke-width='.8'/>")
        out.append(_text(x, bottom + 15, _tick(tick, log_x), anchor="middle", colour=palette.QUIET))
    out.append(f"<path d='M{left} {bottom}H{right}' stroke='{palette.QUIET}' stroke-width='.8'/>")
    out.append(_text((left + right) / 2, height - 6, _axis_title(figure.x), anchor="middle", colour=palette.QUIET))
    out.append(_text(left - 40, top - 12, _axis_title(figure.y), colour=palette.QUIET))
    for rule in rules:
        out.append(_rule(rule, place, left, right, top, bottom, width))
    for line in lines:
        points = [place(x, y) for x, y in zip(line.x.values, line.y.values, strict=True)]
        out.append(
            f"<path d='{_path(points, line.closed)}' fill='none' stroke='{palette.colour(line.colour)}' stroke-width='1.8' stroke-linejoin='round'{_DASH[line.dash]}/>"
        )
    named = [line for line in lines if line.label]
    for position, line in enumerate(named if len(named) > 1 else []):
        out.append(
            f"<path d='M{right - 88} {top + 4 + 13 * position}h14' stroke='{palette.colour(line.colour)}' stroke-width='2'{_DASH[line.dash]}/>"
        )
        out.append(_text(right - 70, top + 7.5 + 13 * position, line.label, size=9, colour=palette.QUIET))
    for mark in marks:
        out.append(_mark(mark, place, right, top))
    return "".join(out)


def _log(value: float, log: bool) -> float:
    if not log:
        return value
    return math.log10(value) if value > 0 else float("nan")


def _tick(value: float, log: bool) -> str:
    return pretty(10**value, 1) if log else f"{value:g}".replace("-", "\u2212")


def _rule(rule: Rule, place: object, left: int, right: int, top: int, bottom: int, width: int) -> str:
    dash = _DASH[rule.dash]
    if rule.axis == "x":
        x = place(rule.at, 0)[0]  # type: ignore[operator]
        near = "end" if x > width * 0.7 else "start"
        shift = -4 if near == "end" else 4
        return f"<path d='M{_n(x)} {top}V{bottom}' stroke='{palette.QUIET}' stroke-width='1'{dash}/>" + _text(
            x + shift, top + 9, rule.label, size=9, anchor=near, colour=palette.QUIET
        )
    y = place(0, rule.at)[1]  # type: ignore[operator]
    return f"<path d='M{left} {_n(y)}H{right}' stroke='{palette.QUIET}' stroke-width='1'{dash}/>" + _text(
        right, y - 4, rule.label, size=9, anchor="end", colour=palette.QUIET
    )


def _mark(mark: Mark, place: object, right: int, top: int) -> str:
    x, y = place(mark.x, mark.y)  # type: ignore[operator]
    colour = palette.colour(mark.colour)
    near = "end" if x > right - 80 else "start"
    shift = -8 if near == "end" else 8
    above = y + 14 if y < top + 12 else y - 7
    return (
        f"<circle cx='{_n(x)}' cy='{_n(y)}' r='4' fill='{colour}' stroke='{palette.PLATE}' stroke-width='1.2'/>"
        + _text(x + shift, above, mark.label, anchor=near, colour=colour, weight="bold")
    )
