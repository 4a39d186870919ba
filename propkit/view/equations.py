"""Equations as SVG through `ziamath` (extra ``memo``); None where it cannot set them, and the text is shown instead."""

from __future__ import annotations

import warnings
from functools import lru_cache

LONGEST = 2000


@lru_cache(maxsize=512)
def svg_of(latex: str, size: float = 15.0, inline: bool = False) -> tuple[str, float] | None:
    """Return an equation as SVG and its depth below the baseline [px], or None where it cannot be set here.

    Parameters
    ----------
    latex : str
        LaTeX without dollar signs, at most `LONGEST` characters.
    size : float
        Font size [px].
    inline : bool
        Whether it stands in a line of text.
    """
    if len(latex) > LONGEST:
        return None
    with warnings.catch_warnings():
        warnings.simplefilter("ignore", DeprecationWarning)  # the setter reads its fonts in an older way
        try:
            import ziamath.zmath

            picture = ziamath.zmath.Latex(latex, size=size, inline=inline)
            return str(picture.svg()), float(picture.getyofst())
        except Exception:  # not installed, or any refusal of the setter: the text says the same
            return None
