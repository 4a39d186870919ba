"""Numbers of a control: range and step of its slider, the text of a slider position, the text of a value.

The slider is advisory. It never limits what may be typed, and its range follows a value that was typed outside it.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass

from propkit.model.declare import Bounds

STEPS = 500
SPREAD = 2.5
NARROW = 20.0
"""Legal ranges whose ends differ by less than this factor are shown whole."""


@dataclass(frozen=True, slots=True)
class Scale:
    """Range and step of a slider, in the unit of the control."""

    low: float
    high: float
    step: float

    def holds(self, value: float) -> bool:
        """Whether the slider reaches the value."""
        return self.low - 1e-9 * self.step <= value <= self.high + 1e-9 * self.step

    @property
    def decimals(self) -> int:
        """Decimals that the step needs."""
        return max(0, -math.floor(math.log10(self.step) + 1e-9))

    def text(self, value: float) -> str:
        """Return the number at a slider position, snapped to the step: 45, never 45.00000000000001."""
        inside = min(max(value, self.low), self.high)
        return f"{round(inside / self.step) * self.step:.{self.decimals}f}"


def scale_for(value: float, bounds: Bounds, convert: Callable[[float], float], *, spread: float = SPREAD) -> Scale:
    """Return the slider of a control.

    Parameters
    ----------
    value : float
        Value now, in SI.
    bounds : Bounds
        Legal range in SI.
    convert : function
        From SI to the unit of the control.
    spread : float
        How far the slider reaches, as a factor on the value.
    """
    legal_low, low_open = _end(bounds.at_least, bounds.above, convert, -math.inf)
    legal_high, high_open = _end(bounds.at_most, bounds.below, convert, math.inf)
    lowest = bounds.at_least if bounds.at_least is not None else bounds.above
    highest = bounds.at_most if bounds.at_most is not None else bounds.below
    if lowest and highest and lowest > 0.0 and highest / lowest < NARROW:
        low, high = legal_low, legal_high
    elif value > 0.0:
        low, high = convert(value / spread), convert(value * spread)
    else:
        low, high = convert(min(-1.0, 2.0 * value)), convert(max(1.0, -2.0 * value))
    step = _down((high - low) / STEPS)
    coarse = 10.0 * step
    low, high = coarse * math.floor(low / coarse + 1e-9), coarse * math.ceil(high / coarse - 1e-9)
    low = _inside(low, legal_low, low_open, step, up=True)
    high = _inside(high, legal_high, high_open, step, up=False)
    return Scale(_tidy(low, step), _tidy(high, step), step)


def _end(closed: float | None, opened: float | None, convert: Callable[[float], float], none: float) -> tuple[float, bool]:
    if closed is not None:
        return convert(closed), False
    return (convert(opened), True) if opened is not None else (none, False)


def _inside(value: float, legal: float, opened: bool, step: float, *, up: bool) -> float:
    if up and value <= legal:
        first = step * math.ceil(legal / step - 1e-9)
        return first + step if opened and first <= legal else first
    if not up and value >= legal:
        last = step * math.floor(legal / step + 1e-9)
        return last - step if opened and last >= legal else last
    return value


def _down(size: float) -> float:
    """Return 1, 2 or 5 times a power of ten, at most `size`."""
    power = 10.0 ** math.floor(math.log10(size))
    return next(factor * power for factor in (5.0, 2.0, 1.0) if factor * power <= size * (1.0 + 1e-12))


def _tidy(value: float, step: float) -> float:
    decimals = max(0, -math.floor(math.log10(step) + 1e-9))
    return round(value, decimals)


def value_text(value: float, digits: int = 6) -> str:
    """Return a number for a text field: at most `digits` significant digits, no needless zeros."""
    if value == 0.0:
        return "0"
    places = digits - 1 - math.floor(math.log10(abs(value)))
    if -8 <= places <= 12:
        text = f"{value:.{max(0, places)}f}"
        return text.rstrip("0").rstrip(".") if "." in text else text
    return f"{value:.{digits - 1}e}"
