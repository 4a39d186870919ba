"""The small parts of which drawings are made: numbers, paths, texts with symbols, extents."""

from __future__ import annotations

import math
import re
from collections.abc import Iterable
from dataclasses import dataclass

from propkit.series import Line
from propkit.view import palette
from propkit.view.symbols import html_symbol

DASH = {"solid": "", "dashed": " stroke-dasharray='6 4'", "dotted": " stroke-dasharray='1.5 3'"}
_NARROW, _BROAD = frozenset("iljtfr.,:;'|!()[] ·"), frozenset("mwMW%@")
_PART = re.compile(r"<(?P<close>/?)(?P<tag>i|sub|sup)>|(?P<text>[^<]+)")
_SHIFT = {"sub": 2.6, "sup": -3.4}


def number(value: float) -> str:
    """Return a coordinate to a tenth of a pixel."""
    shown = f"{value:.1f}".removesuffix(".0")
    return "0" if shown == "-0" else shown


def width_of(plain: str, size: float) -> float:
    """Return about how wide a text is in a common sans font [px]."""
    widths = (0.31 if c in _NARROW else 0.88 if c in _BROAD else 0.7 if c.isupper() else 0.57 for c in plain)
    return sum(widths) * size


def text(
    x: float,
    y: float,
    markup: str,
    *,
    size: float = 10,
    anchor: str = "start",
    colour: str = palette.INK,
    weight: str = "",
    halo: bool = False,
) -> str:
    """Return a text element; `markup` is escaped already; a halo keeps it legible where it crosses a line."""
    bold = f" font-weight='{weight}'" if weight else ""
    around = f" stroke='{palette.PLATE}' stroke-width='3' stroke-linejoin='round' paint-order='stroke'" if halo else ""
    at = "" if anchor == "start" else f" text-anchor='{anchor}'"
    return f"<text x='{number(x)}' y='{number(y)}' font-size='{size:g}'{at} fill='{colour}'{bold}{around}>{markup}</text>"


def symbol(latex: str, size: float) -> str:
    """Return a symbol as text spans: letters in italics, subscripts lowered."""
    out: list[str] = []
    italic, shift, owed = False, 0.0, 0.0
    for match in _PART.finditer(html_symbol(latex)):
        if match["text"]:
            style = " font-style='italic'" if italic else ""
            small = f" font-size='{0.75 * size:g}'" if shift else ""
            move = shift - owed
            lift = f" dy='{move:g}'" if move else ""
            owed = shift
            out.append(f"<tspan{style}{small}{lift}>{match['text']}</tspan>")
        elif match["tag"] == "i":
            italic = not match["close"]
        else:
            shift = 0.0 if match["close"] else _SHIFT[match["tag"]]
    return "".join(out) + (f"<tspan dy='{-owed:g}'>\u200b</tspan>" if owed else "")


def path(points: Iterable[tuple[float, float]], closed: bool = False) -> str:
    """Return the data of a path through points, with a gap at each that is not finite."""
    parts, pen = [], "M"
    for x, y in points:
        if math.isfinite(x) and math.isfinite(y):
            parts.append(f"{pen}{number(x)} {number(y)}")
            pen = "L"
        else:
            pen = "M"
    return "".join(parts) + ("Z" if closed else "")


@dataclass(frozen=True, slots=True)
class Box:
    """Extent of lines in the units of the data."""

    left: float
    right: float
    bottom: float
    top: float

    @property
    def width(self) -> float:
        """Extent along x."""
        return self.right - self.left

    @property
    def height(self) -> float:
        """Extent along y."""
        return self.top - self.bottom

    @classmethod
    def around(cls, lines: Iterable[Line]) -> Box:
        """Return the extent of lines; a unit square where there is none."""
        listed = list(lines)
        xs = [x for line in listed for x in line.x.values if math.isfinite(x)] or [0.0, 1.0]
        ys = [y for line in listed for y in line.y.values if math.isfinite(y)] or [0.0, 1.0]
        return cls(min(xs), max(xs), min(ys), max(ys))
