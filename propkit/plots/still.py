"""The still twin of a live plot: what a notebook that shows the plot keeps of it, and what a memo sets."""

from __future__ import annotations

from html import escape
from typing import Any

from propkit.series import Figure
from propkit.view import svg


def still(figure: Figure, include: Any = None, exclude: Any = None) -> dict[str, str]:
    """Return the display of a plot where no BokehJS runs: its static drawing, from the same neutral figure.

    Parameters
    ----------
    figure : Figure
        What the plot shows.
    include, exclude : container of str, optional
        Media types that are wanted, or not.
    """
    drawn = f'<img class="propkit-still" alt="{escape(figure.alt)}" src="{svg.data_uri(figure)}">'
    media = {"text/html": drawn, "text/plain": f"{figure.title} (a live plot: bokeh.io.show shows it)"}
    return {name: text for name, text in media.items() if (not include or name in include) and (not exclude or name not in exclude)}
