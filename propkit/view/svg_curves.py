"""Curves in axes: ticks at round numbers, legend above, rules and marks with their labels kept legible."""

from __future__ import annotations

import math
from dataclasses import dataclass
from html import escape
from itertools import pairwise

from propkit.series import Axis, Figure, Line, Mark, Regions, Rule, Texts
from propkit.view import cells, palette
from propkit.view.numbers import grouped, pretty
from propkit.view.svg_parts import DASH, number, path, symbol, text, width_of


@dataclass(frozen=True, slots=True)
class Scale:
    """One axis on paper: from data to pixels; limits are logarithms on a logarithmic axis."""

    low: float
    high: float
    start: float
    end: float
    log: bool

    def at(self, value: float) -> float:
        """Return the place of a value [px]; NaN where it has none."""
        there = _log(value) if self.log else value
        return self.start + (self.end - self.start) * (there - self.low) / (self.high - self.low)

    def ticks(self) -> list[float]:
        """Return round values inside the limits."""
        if not self.log:
            return ticks(self.low, self.high)
        steps = (1.0,) if self.high - self.low >= 2.0 else (1.0, 2.0, 5.0)
        decades = range(math.floor(self.low), math.ceil(self.high) + 1)
        found = [step * 10.0**decade for decade in decades for step in steps]
        return [value for value in found if self.low - 1e-9 <= _log(value) <= self.high + 1e-9]


def ticks(low: float, high: float, count: int = 5) -> list[float]:
    """Return round numbers between `low` and `high`, about `count` of them."""
    if not high > low:
        return [low]
    raw = (high - low) / count
    power = 10.0 ** math.floor(math.log10(raw))
    step = next(factor * power for factor in (1, 2, 2.5, 5, 10) if factor * power >= raw * 0.999)
    first = math.ceil(low / step - 1e-9)
    return [float(f"{k * step:.12g}") for k in range(first, math.floor(high / step + 1e-9) + 1)]


def curves(figure: Figure, width: int, height: int, top: int) -> tuple[str, int]:
    """Return regions, lines, rules and marks in axes, and the height of the drawing."""
    lines = [layer for layer in figure.layers if isinstance(layer, Line)]
    marks = [layer for layer in figure.layers if isinstance(layer, Mark)]
    rules = [layer for layer in figure.layers if isinstance(layer, Rule) and math.isfinite(layer.at)]
    regions = [layer for layer in figure.layers if isinstance(layer, Regions)]
    named = [line for line in lines if line.label and any(map(math.isfinite, line.y.values))]
    legend, rows = _legend([*(named if len(named) > 1 else []), *(layer for layer in regions if layer.label)], width, top + 6)
    height += 13 * rows
    xs = [x for line in lines for x in line.x.values]
    ys = [y for line in lines for y in line.y.values]
    xs += [mark.x for mark in marks] + [rule.at for rule in rules if rule.axis == "x"]
    ys += [mark.y for mark in marks] + [rule.at for rule in rules if rule.axis == "y"]
    y_top, y_foot = top + 13 * rows + (24.0 if rows else 20.0), height - 34.0
    y_scale = _scale(figure.y, ys, y_foot, y_top, from_zero=True)
    y_texts = [(value, _tick(value)) for value in y_scale.ticks()]
    left = 20.0 + max((width_of(shown, 10) for _, shown in y_texts), default=0.0)
    right = width - 16.0
    x_scale = _scale(figure.x, xs, left, right)
    out = [legend, text(12, y_top - 9, _axis_title(figure.y, 9.5), size=9.5, colour=palette.QUIET)]
    for value, shown in y_texts:
        y = number(y_scale.at(value))
        out.append(f"<path d='M{number(left)} {y}H{number(right)}' stroke='{palette.HAIRLINE}' stroke-width='.6'/>")
        out.append(text(left - 6, y_scale.at(value) + 3.5, shown, anchor="end", colour=palette.QUIET))
    for value in x_scale.ticks():
        x = x_scale.at(value)
        out.append(f"<path d='M{number(x)} {number(y_foot)}v4' stroke='{palette.QUIET}' stroke-width='.8'/>")
        out.append(text(x, y_foot + 15, _tick(value), anchor="middle", colour=palette.QUIET))
    out.append(f"<path d='M{number(left)} {number(y_foot)}H{number(right)}' stroke='{palette.QUIET}' stroke-width='.8'/>")
    out.append(text(right, height - 7, _axis_title(figure.x, 9.5), size=9.5, anchor="end", colour=palette.QUIET))
    out += [_regions(layer, x_scale, y_scale) for layer in regions]
    out += [_texts(layer, x_scale, y_scale) for layer in figure.layers if isinstance(layer, Texts)]
    out += [_rule_line(rule, x_scale, y_scale) for rule in rules]
    out += [_line(line, x_scale, y_scale) for line in lines]
    inked = [point for line in lines for point in _dense(line, x_scale, y_scale)]
    placed = [_mark(mark, x_scale, y_scale, inked) for mark in marks if math.isfinite(mark.x) and math.isfinite(mark.y)]
    taken = [corner for _, box in placed for corner in box]
    out += _rule_texts(rules, x_scale, y_scale, inked + taken)
    out += [drawn for drawn, _ in placed]
    return "".join(out), height


def _log(value: float) -> float:
    return math.log10(value) if value > 0 else float("nan")


def _scale(axis: Axis, values: list[float], start: float, end: float, from_zero: bool = False) -> Scale:
    """Return the axis on paper: the limits asked for, or those of the data with some room."""
    log = axis.scale == "log"
    known = [_log(value) if log else value for value in values]
    finite = [value for value in known if math.isfinite(value)]
    asked_low, asked_high = (None if limit is None else _log(limit) if log else limit for limit in (axis.low, axis.high))
    low = asked_low if asked_low is not None else min(finite, default=0.0)
    high = asked_high if asked_high is not None else max(finite, default=1.0)
    if from_zero and not log and asked_low is None and 0.0 < low < 0.5 * high:
        low = 0.0
    if high <= low:
        low, high = low - 0.5 * abs(low or 1.0), high + 0.5 * abs(high or 1.0)
    room = 0.06 * (high - low)
    low -= room if asked_low is None and low != 0.0 else 0.0
    high += room if asked_high is None else 0.0
    return Scale(low, high, start, end, log)


def _tick(value: float) -> str:
    size = abs(value)
    return grouped(f"{value:.10g}") if value == 0.0 or 1e-4 <= size < 1e7 else pretty(value, 1)


def _axis_title(axis: Axis, size: float) -> str:
    unit = cells.unit_text(axis.unit)
    sign = f" {symbol(axis.symbol, size)}" if axis.symbol else ""
    return f"{escape(axis.label)}{sign}{f' [{escape(unit)}]' if unit else ''}"


def _line(line: Line, x: Scale, y: Scale) -> str:
    points = [(x.at(a), y.at(b)) for a, b in zip(line.x.values, line.y.values, strict=True)]
    fill = f"fill='{palette.colour(line.colour)}' fill-opacity='.12'" if line.fill else "fill='none'"
    return (
        f"<path d='{path(points, line.closed)}' {fill} stroke='{palette.colour(line.colour)}' stroke-width='1.8' "
        f"stroke-linejoin='round'{DASH[line.dash]}/>"
    )


def _regions(layer: Regions, x: Scale, y: Scale) -> str:
    """Return regions laid over each other, holes left open; hatched where nothing is allowed."""
    colour = palette.colour(layer.colour)
    edge = colour if layer.hatched else palette.QUIET
    stroke = f"stroke='{edge}' stroke-width='{1.2 if layer.hatched else 0.5}'" if layer.outlined else ""
    out = [_hatch(layer)] if layer.hatched and any(layer.xs) else []
    for xs, ys in zip(layer.xs, layer.ys, strict=True):
        if not xs:
            continue
        data = path((x.at(a), y.at(b)) for a, b in zip(xs, ys, strict=True))
        out.append(f"<path d='{data}' fill='{colour}' fill-opacity='{layer.opacity:g}' fill-rule='evenodd' {stroke}/>")
        if layer.hatched:
            out.append(f"<path d='{data}' fill='url(#pk-hatch-{layer.colour})' fill-rule='evenodd'/>")
    return "".join(out)


def _hatch(layer: Regions) -> str:
    colour = palette.colour(layer.colour)
    return (
        f"<defs><pattern id='pk-hatch-{layer.colour}' width='6' height='6' patternUnits='userSpaceOnUse'>"
        f"<path d='M-1 7L7 -1M-1 1L1 -1M5 7L7 5' stroke='{colour}' stroke-width='.7' stroke-opacity='.6'/></pattern></defs>"
    )


def _texts(layer: Texts, x: Scale, y: Scale) -> str:
    """Return texts centred on their points."""
    placed = zip(layer.x, layer.y, layer.texts, strict=True)
    return "".join(
        text(x.at(a), y.at(b) + 3.0, escape(shown), size=8.5, anchor="middle", halo=True)
        for a, b, shown in placed
        if math.isfinite(a) and math.isfinite(b)
    )


def _legend(lines: list[Line | Regions], width: int, y: float) -> tuple[str, int]:
    """Return the names of lines and regions with a sample of each, and how many rows they take."""
    out, at, row = [], 12.0, 0
    for line in lines:
        wide = 20 + width_of(line.label, 9.5) + 14
        if at > 12.0 and at + wide > width - 8:
            at, row = 12.0, row + 1
        down = y + 6 + 13 * row
        look = f"stroke-width='2'{DASH[line.dash]}" if isinstance(line, Line) else "stroke-width='8' stroke-opacity='.35'"
        out.append(f"<path d='M{number(at)} {number(down - 3)}h15' stroke='{palette.colour(line.colour)}' {look}/>")
        out.append(text(at + 20, down, escape(line.label), size=9.5, colour=palette.QUIET))
        at += wide
    return "".join(out), row + 1 if lines else 0


def _rule_line(rule: Rule, x: Scale, y: Scale) -> str:
    if rule.axis == "x":
        data = f"M{number(x.at(rule.at))} {number(y.end)}V{number(y.start)}"
    else:
        data = f"M{number(x.start)} {number(y.at(rule.at))}H{number(x.end)}"
    return f"<path d='{data}' stroke='{palette.QUIET}' stroke-width='1'{DASH[rule.dash]}/>"


def _rule_texts(rules: list[Rule], x: Scale, y: Scale, inked: list[tuple[float, float]]) -> list[str]:
    """Return the labels of rules: level ones at their end; upright ones near the top or the foot, where least is drawn."""
    out: list[str] = []
    inked = list(inked)
    for rule in rules:
        wide = width_of(rule.label, 9)
        if rule.axis == "y":
            spots = [(x.end - wide, y.at(rule.at) - 4)]
        else:
            at = x.at(rule.at)
            left = at - 4 - wide if at + 4 + wide > x.end else at + 4
            rows = [y.end + 9 + 12 * row for row in range(3)] + [y.start - 5 - 12 * row for row in range(3)]
            spots = [(left, base) for base in rows]
        hits = [_hits(left, base, wide, inked) for left, base in spots]
        best = spots[hits.index(min(hits))]
        inked += [(best[0] + share * wide, best[1] - 4) for share in (0.0, 0.25, 0.5, 0.75, 1.0)]
        out.append(text(*best, escape(rule.label), size=9, colour=palette.QUIET, halo=True))
    return out


def _hits(left: float, base: float, wide: float, inked: list[tuple[float, float]]) -> int:
    """Return how many drawn points lie under a label."""
    return sum(left - 3 <= x <= left + wide + 3 and base - 11 <= y <= base + 4 for x, y in inked)


def _dense(line: Line, x: Scale, y: Scale) -> list[tuple[float, float]]:
    """Return points closely along a line, where labels had better not stand."""
    ends = [(x.at(a), y.at(b)) for a, b in zip(line.x.values, line.y.values, strict=True)]
    out = list(ends)
    for (x0, y0), (x1, y1) in pairwise(ends):
        out += [(x0 + share * (x1 - x0), y0 + share * (y1 - y0)) for share in (0.2, 0.4, 0.6, 0.8)]
    return out


def _mark(mark: Mark, x: Scale, y: Scale, inked: list[tuple[float, float]]) -> tuple[str, list[tuple[float, float]]]:
    """Return a marked point with its label on the side where least is drawn, and points of the label."""
    at, level = x.at(mark.x), y.at(mark.y)
    wide = width_of(mark.label, 10.5)
    inside = max(x.start, min(at - 0.5 * wide, x.end - wide))
    best, score = (at + 8, level - 7), math.inf
    for left, base in (
        (at + 8, level - 7),
        (at + 8, level + 15),
        (at - 8 - wide, level - 7),
        (at - 8 - wide, level + 15),
        (inside, level - 9),
        (inside, level + 17),
    ):
        outside = 1000 * (left < x.start - 30 or left + wide > x.end + 12 or base - 9 < y.end - 4 or base > y.start - 2)
        hits = outside + _hits(left, base, wide, inked)
        if hits < score:
            best, score = (left, base), hits
    colour = palette.colour(mark.colour)
    drawn = f"<circle cx='{number(at)}' cy='{number(level)}' r='3.6' fill='{colour}' stroke='{palette.PLATE}' stroke-width='1.2'/>" + text(
        *best, escape(mark.label), colour=colour, weight="bold", halo=True
    )
    return drawn, [(best[0] + share * wide, best[1] - 4) for share in (0.0, 0.25, 0.5, 0.75, 1.0)] + [(at, level)]
