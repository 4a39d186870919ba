"""The figure host: a small widget that shows neutral figures with BokehJS, which it gets from the kernel.

The page asks for BokehJS once for each version, as one binary message; nothing is loaded from a network. BokehJS is
Copyright (c) Anaconda, Inc., and Bokeh Contributors, BSD-3-Clause; the file that is sent carries its notice.
"""

from __future__ import annotations

from collections.abc import Sequence
from functools import lru_cache
from importlib import resources
from typing import Any

import anywidget
import traitlets

from propkit.plots import paint, wire
from propkit.plots.build import structure
from propkit.series import Figure
from propkit.view import palette

STATIC = resources.files("propkit.panels") / "static"


@lru_cache(maxsize=8)
def static_text(*names: str) -> str:
    """Return files of the package one after the other, as one text."""
    return "\n".join((STATIC / name).read_text(encoding="utf-8") for name in names)


def style_sheet() -> str:
    """Return the style sheet with the colours of the palette."""
    colours = {
        "accent": palette.ACCENT,
        "accent-dark": palette.ACCENT_DARK,
        "doubt": palette.DOUBT,
        "doubt-dark": palette.DOUBT_DARK,
        "ink": palette.INK,
        "quiet": palette.QUIET,
        "line": palette.HAIRLINE,
    }
    text = static_text("panel.css")
    for name, colour in colours.items():
        text = text.replace(f"%{name}%", colour)
    return text


@lru_cache(maxsize=1)
def bokeh_script() -> bytes:
    """Return BokehJS, with its notice, as installed beside Bokeh."""
    script = resources.files("bokeh") / "server" / "static" / "js" / "bokeh.min.js"
    return script.read_bytes()


def bokeh_version() -> str:
    """Return the version of BokehJS."""
    import bokeh

    return str(bokeh.__version__)


class Host(anywidget.AnyWidget):
    """Shows figures; `show` updates them in place where only numbers change.

    `plots` holds each plot once (its Bokeh document), `frame` what changes with every calculation, `data` its numbers as
    float64 bytes, `still` a static drawing of each figure for the first paint.
    """

    _esm = static_text("figure.js", "host.js")
    _css = style_sheet()
    bokeh = traitlets.Unicode().tag(sync=True)
    colours = traitlets.Dict().tag(sync=True)
    plots = traitlets.List().tag(sync=True)
    frame = traitlets.List().tag(sync=True)
    data = traitlets.Bytes().tag(sync=True)
    still = traitlets.List().tag(sync=True)

    def __init__(self, **options: Any) -> None:
        super().__init__(bokeh=bokeh_version(), colours=paint.table(), **options)
        self._structures: list[tuple[str, int]] = []
        self.on_msg(self._on_message)

    def __repr__(self) -> str:
        """Return a text without an address, so that an executed notebook repeats."""
        return f"<{type(self).__name__}: live in a notebook with its kernel>"

    def show(self, figures: Sequence[Figure], heights: Sequence[int], *, still: bool = True) -> None:
        """Show figures: new numbers in the plots there are, or new plots where their structure differs."""
        structures = list(zip((structure(figure) for figure in figures), heights, strict=True))
        described, numbers = wire.frame_of(figures)
        with self.hold_sync():
            if structures != self._structures:
                self.plots = [{**wire.plot_json(f, height), "height": height} for f, height in zip(figures, heights, strict=True)]
                self._structures = structures
            self.frame, self.data = described, numbers
            if still:
                self.still = [drawing(figure) for figure in figures]

    def _on_message(self, widget: Any, content: Any, buffers: Any) -> None:
        if isinstance(content, dict) and content.get("ask") == "bokeh":
            self.send({"answer": "bokeh", "version": self.bokeh}, buffers=[bokeh_script()])


def drawing(figure: Figure) -> str:
    """Return a figure as a static SVG drawing; empty where it cannot be drawn."""
    from propkit.view import svg

    return str(svg.draw(figure))


class FigureView:
    """Neutral figures shown live in a notebook.

    Parameters
    ----------
    *figures : Figure
        What to show, one below the other.
    height : int
        Height of each [px].
    """

    def __init__(self, *figures: Figure, height: int = 300) -> None:
        self.height = height
        self.widget = Host()
        self.show(*figures)

    def show(self, *figures: Figure) -> None:
        """Show other figures, or the same with other numbers."""
        self.figures = figures
        self.widget.show(figures, [self.height] * len(figures))

    def close(self) -> None:
        """Let go of the widget."""
        self.widget.close()

    def _repr_mimebundle_(self, **options: Any) -> Any:
        return self.widget._repr_mimebundle_(**options)
