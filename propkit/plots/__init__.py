"""Live plots: neutral figures as Bokeh figures."""

from __future__ import annotations

from typing import Any

from propkit.plots.build import build
from propkit.plots.suited import live_figures
from propkit.report import UnitSystem

__all__ = ["live_figures", "plot_of"]


def plot_of(calculation: Any, units: UnitSystem = "SI") -> Any:
    """Return a plain Bokeh figure of an object: the first of those that its panel shows."""
    _, make = live_figures(calculation)[0]
    return build(make(calculation, units)[0]).figure
