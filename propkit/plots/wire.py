"""A Bokeh plot and its data as a browser gets them: the plot once, the numbers as float64 bytes at every change."""

from __future__ import annotations

import struct
from collections.abc import Iterable
from itertools import chain
from typing import Any

from propkit.plots.build import Plot, build, columns, limits, structure
from propkit.series import Figure, Points


def plot_json(figure: Figure, height: int) -> dict[str, Any]:
    """Return a plot as BokehJS reads it, with the colour roles of its models.

    Parameters
    ----------
    figure : Figure
        The neutral figure.
    height : int
        Height of the plot [px].
    """
    plot = build(figure, height=height)
    for place, layer in enumerate(figure.layers):
        if isinstance(layer, Points):
            # thousands of designs travel as bytes, not as text in the document as well
            source = plot.figure.select_one({"name": f"layer-{place}"})
            source.data = {column: [] for column in source.data}
    return {
        "key": structure(figure),
        "item": item_of(plot),
        "painted": [[m.id, name, role, _is_vector(m)] for m, name, role in plot.painted],
    }


def _is_vector(model: Any) -> bool:
    """Whether the colours of a model are given by point, and a single one as a value."""
    from bokeh.models.annotations import LabelSet
    from bokeh.models.glyph import Glyph

    return isinstance(model, Glyph | LabelSet)


def item_of(plot: Plot) -> dict[str, Any]:
    """Return the document of a plot in the form that ``Bokeh.embed.embed_item`` takes."""
    from bokeh.document import Document

    document = Document()
    document.add_root(plot.figure)
    content = document.to_json(deferred=False)
    root = plot.figure.id
    document.clear()
    return {"doc": content, "root_id": root, "target_id": None, "version": content["version"]}


def frame_of(figures: Iterable[Figure]) -> tuple[list[dict[str, Any]], bytes]:
    """Return what changes with every calculation: a description of each figure, and all numbers as float64 bytes.

    A column of numbers is described by its place and length in the bytes, a column of lists of numbers by the place and the
    length of each, a column of texts by the texts.
    """
    described: list[dict[str, Any]] = []
    numbers: list[float] = []
    for figure in figures:
        sources, where = [], limits(figure)
        for layer in figure.layers:
            source: dict[str, Any] = {}
            for name, values in columns(layer, where).items():
                if values and isinstance(values[0], str):
                    source[name] = values
                elif values and isinstance(values[0], list):
                    source[name] = {"rows": [len(numbers), *map(len, values)]}
                    numbers.extend(chain.from_iterable(values))
                else:
                    source[name] = [len(numbers), len(values)]
                    numbers.extend(values)
            sources.append(source)
        described.append({"key": structure(figure), "title": figure.title, "alt": figure.alt, "sources": sources, "limits": where})
    return described, struct.pack(f"<{len(numbers)}d", *numbers)
