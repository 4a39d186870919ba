"""Static drawings: a neutral Figure as a small SVG, a few kB, the same bytes for the same figure."""

from __future__ import annotations

import base64
from html import escape

from propkit.series import Bars, Figure, Line, Mark, Regions
from propkit.view import palette
from propkit.view.svg_curves import curves
from propkit.view.svg_parts import DASH, Box, number, path, text, width_of
from propkit.view.symbols import text_species

WIDTH, HEIGHT, MAP_HEIGHT = 360, 220, 300
_TITLE = 28
_BAR, _PITCH = 13, 22


def draw(figure: Figure, width: int = WIDTH, height: int = HEIGHT) -> str:
    """Return the figure as SVG.

    Parameters
    ----------
    figure : Figure
        The drawing as neutral data.
    width, height : int
        Size [px] of the light plate it stands on; bars and drawings to scale take the height that they need.
    """
    bars = [layer for layer in figure.layers if isinstance(layer, Bars)]
    if bars:
        low = figure.x.low if bars[0].starts and figure.x.low is not None else 0.0
        body, height = _bars(bars[0], width, low, species=figure.name == "composition")
    elif figure.equal_aspect:
        body, height = _to_scale(figure, width, height)
    else:
        is_map = any(isinstance(layer, Regions) for layer in figure.layers)
        body, height = curves(figure, width, max(height, MAP_HEIGHT) if is_map else height, _TITLE)
    head = (
        f"<svg xmlns='http://www.w3.org/2000/svg' viewBox='0 0 {width} {height}' width='{width}' height='{height}' role='img'>"
        f"<title>{escape(figure.alt)}</title><rect width='{width}' height='{height}' rx='3' fill='{palette.PLATE}'/>"
        "<g font-family='Helvetica Neue,Helvetica,Arial,sans-serif'>"
    )
    return f"{head}{text(12, 18, escape(figure.title), size=11, colour=palette.INK)}{body}</g></svg>"


def data_uri(figure: Figure) -> str:
    """Return the figure as the address of an image that needs no network."""
    return f"data:image/svg+xml;base64,{base64.b64encode(draw(figure).encode()).decode()}"


def _bars(bars: Bars, width: int, low: float, species: bool) -> tuple[str, int]:
    """Return horizontal bars on an axis from `low`, and the height that they need."""
    texts = bars.texts or tuple(f"{value:.3g}" for value in bars.values.values)
    names = [text_species(name) if species else name for name in bars.categories]
    left = 20 + max((width_of(name, 10) for name in names), default=0.0)
    left = min(left, 0.5 * width)
    room = width - left - 20 - max((width_of(entry, 10) for entry in texts), default=0.0)
    starts = bars.starts or (low,) * len(names)
    largest = max((abs(value - low) for value in bars.values.values), default=0.0) or 1.0
    out = []
    for position, (name, start, value, entry) in enumerate(zip(names, starts, bars.values.values, texts, strict=True)):
        y = _TITLE + 6 + _PITCH * position
        begin = left + room * (start - low) / largest
        long = max(1.0, room * abs(value - start) / largest)
        out.append(text(left - 8, y + 10, escape(_fitting(name, left - 16)), anchor="end"))
        out.append(f"<rect x='{number(begin)}' y='{y}' width='{number(long)}' height='{_BAR}' fill='{palette.colour(bars.colour)}'/>")
        if bars.starts and low != 0.0 and start == low:
            out.append(_cut(begin + 7, y))
        out.append(text(begin + long + 6, y + 10, escape(entry), colour=palette.QUIET))
    return "".join(out), _TITLE + 10 + _PITCH * len(names)


def _cut(x: float, y: float) -> str:
    """Return the sign that a bar is cut off: a slanted gap across it."""
    slant = f"M{number(x)} {y - 1}l-3 {_BAR + 2}h3l3 {-_BAR - 2}z"
    return f"<path d='{slant}' fill='{palette.PLATE}'/>"


def _fitting(name: str, room: float) -> str:
    """Return a name cut with an ellipsis where it is too long for its place."""
    while len(name) > 4 and width_of(name, 10) > room:
        name = name[:-2] + "…"
    return name


def _to_scale(figure: Figure, width: int, height: int) -> tuple[str, int]:
    """Return a drawing with both axes to one scale, its axis of symmetry, and its marks as dimensions below it."""
    lines = [layer for layer in figure.layers if isinstance(layer, Line)]
    marks = [layer for layer in figure.layers if isinstance(layer, Mark)]
    box = Box.around(lines)
    side, top, foot = 16, _TITLE + 8, 28 if marks else 12
    scale = min((width - 2 * side) / max(box.width, 1e-12), (height - top - foot) / max(box.height, 1e-12))
    height = round(top + foot + scale * box.height)
    x0 = (width - scale * (box.left + box.right)) / 2
    y0 = top + scale * box.top

    def place(x: float, y: float) -> tuple[float, float]:
        return x0 + scale * x, y0 - scale * y

    out = []
    for line in lines:
        points = [place(x, y) for x, y in zip(line.x.values, line.y.values, strict=True)]
        fill = f"fill='{palette.SERIES[0]}' fill-opacity='.1'" if line.fill else "fill='none'"
        out.append(
            f"<path d='{path(points, line.closed)}' {fill} stroke='{palette.colour(line.colour)}' stroke-width='1.4' "
            f"stroke-linejoin='round'{DASH[line.dash]}/>"
        )
    left, right = place(box.left, 0)[0] - 7, place(box.right, 0)[0] + 7
    out.append(
        f"<path d='M{number(left)} {number(y0)}H{number(right)}' stroke='{palette.QUIET}' stroke-width='.7' stroke-dasharray='9 3 2 3'/>"
    )
    marks.sort(key=lambda each: each.x)
    lefts = _side_by_side([place(mark.x, 0.0)[0] for mark in marks], [width_of(mark.label, 10) for mark in marks], width)
    for mark, left in zip(marks, lefts, strict=True):
        x, high = place(mark.x, mark.y)
        out.append(_dimension(mark, x, high, place(mark.x, -mark.y)[1], height, left))
    return "".join(out), height


def _side_by_side(centres: list[float], widths: list[float], width: int) -> list[float]:
    """Return where texts begin that are to stand under `centres`, clear of each other and inside the drawing."""
    lefts: list[float] = []
    end = 0.0
    for centre, wide in zip(centres, widths, strict=True):
        lefts.append(max(centre - wide / 2, end + 10.0))
        end = lefts[-1] + wide
    end = float(width)
    for place in reversed(range(len(lefts))):
        lefts[place] = min(lefts[place], end - 10.0 - widths[place])
        end = lefts[place]
    return lefts


def _dimension(mark: Mark, x: float, high: float, low: float, height: int, left: float) -> str:
    """Return a mark as a dimension line across the body with its text below, which begins at `left`."""
    colour = palette.colour(mark.colour)
    base = height - 9
    at = number(x)
    arrows = "".join(f"<path d='M{at} {number(y)}l-2.4 {6 * way}h4.8z' fill='{colour}'/>" for y, way in ((high, 1), (low, -1)))
    inside = arrows if low - high > 16 else ""
    return (
        f"<path d='M{at} {number(high)}V{number(low)}' stroke='{colour}' stroke-width='1'/>{inside}"
        f"<path d='M{at} {number(low)}V{base - 11}' stroke='{colour}' stroke-width='.6' stroke-dasharray='1.5 2'/>"
        + text(left, base, escape(mark.label), colour=colour)
    )
