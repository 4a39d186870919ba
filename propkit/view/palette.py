"""Colours of the project: one accent and a colour-blind-safe set for series, the same in SVG, Bokeh, panel and PDF."""

from __future__ import annotations

from typing import Final

INK: Final = "#1d2733"
QUIET: Final = "#5d6b78"
HAIRLINE: Final = "#c9d1d8"
PLATE: Final = "#fcfbf8"
ACCENT: Final = "#b3481b"
"""Burnt sienna: given values, the current design, nothing else."""
DOUBT: Final = "#8a6100"

INK_DARK: Final = "#e4e8ec"
QUIET_DARK: Final = "#a7b2bd"
HAIRLINE_DARK: Final = "#46525e"
PLATE_DARK: Final = "#15191e"
ACCENT_DARK: Final = "#f0905f"
DOUBT_DARK: Final = "#e9bd57"
BAR_DARK: Final = "#7fb0dd"

SERIES: Final = ("#2f5d8a", "#b3481b", "#3d8c7d", "#c79a2b", "#a678ad", "#8f9aa3")
"""Slate blue, sienna, sea green, ochre, mallow, grey: told apart by lightness too, and with the usual colour deficiencies."""


def colour(which: int | str) -> str:
    """Return the colour of a series number, or of ``ink``, ``accent``, ``quiet``."""
    named = {"ink": INK, "accent": ACCENT, "quiet": QUIET}
    return named[which] if isinstance(which, str) else SERIES[which % len(SERIES)]
