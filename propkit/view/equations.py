"""Equations as SVG images through `ziamath` (extra ``memo``); None where it is not installed, and the text is shown instead."""

from __future__ import annotations

import re
import warnings
from functools import lru_cache

SIZE = 15
_NUMBER = re.compile(r"-?\d+\.\d{3,}")


@lru_cache(maxsize=512)
def svg_of(latex: str) -> str | None:
    """Return an equation as SVG on its own white plate, or None when it cannot be drawn here."""
    with warnings.catch_warnings():
        warnings.simplefilter("ignore", DeprecationWarning)  # the setter reads its fonts in an older way
        try:
            import ziamath.zmath
        except ImportError:
            return None
        try:
            return _slim(str(ziamath.zmath.Latex(latex, size=SIZE).svg()))
        except Exception:  # a symbol the setter does not know: the text says the same
            return None


def _slim(svg: str) -> str:
    """Return the image with coordinates to a hundredth of a pixel, no needless spaces, and a plate behind it."""
    short = _NUMBER.sub(lambda match: f"{float(match[0]):.2f}".rstrip("0").rstrip("."), svg)
    short = re.sub(r'(?<= d=")[^"]*', lambda match: _path(match[0]), short)
    box = re.search(r'viewBox="(\S+) (\S+) (\S+) (\S+)"', short)
    if box is None:
        return short
    plate = f'<rect x="{box[1]}" y="{box[2]}" width="{box[3]}" height="{box[4]}" fill="#fff"/>'
    head, end, rest = short.partition(">")
    return f"{head}{end}{plate}{rest}"


def _path(data: str) -> str:
    return re.sub(r" ?([A-Za-z]) ?", r"\1", data).replace(" -", "-")
