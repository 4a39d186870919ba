"""Named arrays with units, and figures made of them: what a drawing or a plot shows, as neutral data.

The same figure feeds the static SVG of a sheet and the live plot, so both hold the same numbers.
Values are in display units already; `unit` says which.
"""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import Literal, TypeAlias


@dataclass(frozen=True, slots=True)
class Series:
    """A named array of numbers in one unit.

    Parameters
    ----------
    label : str
        What a person reads.
    values : tuple of float
        Numbers in `unit`; NaN makes a gap.
    unit : str
        Unit in pint's spelling; ``""`` for a pure number.
    symbol : str
        Symbol in the LaTeX subset of the catalogue; may be empty.
    """

    label: str
    values: tuple[float, ...]
    unit: str = ""
    symbol: str = ""


@dataclass(frozen=True, slots=True)
class Axis:
    """One axis: label, symbol, unit, scale and, where wanted, fixed limits."""

    label: str
    unit: str = ""
    symbol: str = ""
    scale: Literal["linear", "log"] = "linear"
    low: float | None = None
    high: float | None = None


@dataclass(frozen=True, slots=True)
class Line:
    """A line through points; `fill` closes it to the axis, `closed` makes it an outline (a wall, a body).

    `hover` holds further series over the same points, which a live plot tells under the pointer and a drawing leaves out.
    """

    x: Series
    y: Series
    colour: int | Literal["ink", "accent", "quiet"] = 0
    dash: Literal["solid", "dashed", "dotted"] = "solid"
    closed: bool = False
    fill: bool = False
    label: str = ""
    hover: tuple[Series, ...] = ()


@dataclass(frozen=True, slots=True)
class Bars:
    """Horizontal bars, one per category, in the order given; `texts` are written at their ends.

    A bar reaches from its entry of `starts`, else from zero, to its value. With `starts`, those that begin at the low end of
    the axis are cut off there, and are drawn so.
    """

    categories: tuple[str, ...]
    values: Series
    texts: tuple[str, ...] = ()
    colour: int | Literal["ink", "accent", "quiet"] = 0
    starts: tuple[float, ...] = ()


@dataclass(frozen=True, slots=True)
class Mark:
    """A marked point with a short label: the current design on a curve, a station on a wall."""

    x: float
    y: float
    label: str
    colour: int | Literal["ink", "accent", "quiet"] = "accent"


@dataclass(frozen=True, slots=True)
class Rule:
    """A thin line across the figure at one value of one axis, with a label (the stoichiometric ratio)."""

    axis: Literal["x", "y"]
    at: float
    label: str
    dash: Literal["solid", "dashed", "dotted"] = "dotted"


@dataclass(frozen=True, slots=True)
class Regions:
    """Regions of the plane, one laid over the other; each is rings of points with NaN between two rings.

    The `hatched` ones stand for what is not allowed; a legend tells their `label`.
    """

    xs: tuple[tuple[float, ...], ...]
    ys: tuple[tuple[float, ...], ...]
    colour: int | Literal["ink", "accent", "quiet"] = 0
    opacity: float = 0.1
    outlined: bool = True
    hatched: bool = False
    label: str = ""


@dataclass(frozen=True, slots=True)
class Texts:
    """Short texts centred on points: the values of contours."""

    x: tuple[float, ...]
    y: tuple[float, ...]
    texts: tuple[str, ...]


@dataclass(frozen=True, slots=True)
class Points:
    """Points that a live plot tells of under the pointer, each with the numbers of `hover`; a drawing leaves them out."""

    x: Series
    y: Series
    hover: tuple[Series, ...] = ()


Layer: TypeAlias = Line | Bars | Mark | Rule | Regions | Texts | Points


@dataclass(frozen=True, slots=True)
class Figure:
    """One figure: axes and layers, with a text that replaces it for those who cannot see it.

    `equal_aspect` draws both axes to one scale (a nozzle to scale). `bare` hides axes and ticks.
    """

    name: str
    title: str
    alt: str
    x: Axis
    y: Axis
    layers: tuple[Layer, ...] = field(default_factory=tuple)
    equal_aspect: bool = False
    bare: bool = False
