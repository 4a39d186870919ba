"""Equations as SVG images through `ziamath` (extra ``memo``); None where it is not installed, and the text is shown instead."""

from __future__ import annotations

from functools import lru_cache

SIZE = 15


@lru_cache(maxsize=512)
def svg_of(latex: str) -> str | None:
    """Return an equation as SVG, or None when it cannot be drawn here."""
    try:
        import ziamath
    except ImportError:
        return None
    try:
        return str(ziamath.Latex(latex, size=SIZE).svg())
    except Exception:  # a symbol the setter does not know: the text says the same
        return None
