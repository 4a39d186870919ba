"""What an object shows, as neutral data: text, HTML, Markdown, LaTeX, Typst, JSON and panels render this one thing."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from dataclasses import dataclass, field
from typing import Any, Literal

from propkit.series import Figure

RowKind = Literal["given", "default", "computed"]
UnitSystem = Literal["SI", "US"]


@dataclass(frozen=True, slots=True)
class Row:
    """One number or choice with everything a reader needs beside it.

    Parameters
    ----------
    name : str
        Public name (``mass_flow``); the path that `working` and studies understand.
    label, symbol : str
        What a person reads; symbol in the LaTeX subset of the catalogue, may be empty.
    value : float, str or None
        Number in `unit`, or a text (a choice, a propellant). None: not available, the reason is in `doubts`.
    unit : str
        Display unit in pint's spelling; ``""`` for a pure number or a text.
    digits : int
        Significant digits to show.
    kind : str
        ``given``, ``default`` or ``computed``.
    typed : str
        The input as it was typed, when it differs from what is shown ("1015 psia").
    relation, source : str
        Key of the relation and of the source; may be empty.
    uncertainty : float or None
        Standard uncertainty in `unit`.
    doubts : tuple of str
        Warnings that belong to this number.
    """

    name: str
    label: str
    symbol: str
    value: float | str | None
    unit: str
    digits: int
    kind: RowKind
    typed: str = ""
    relation: str = ""
    source: str = ""
    uncertainty: float | None = None
    doubts: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True)
class Column:
    """A column of a table: quantity, unit, digits, and its values (None where it does not apply)."""

    name: str
    label: str
    symbol: str
    unit: str
    digits: int
    values: tuple[float | str | None, ...]


@dataclass(frozen=True, slots=True)
class Table:
    """A table of stations, species or cases: `index` down, columns across."""

    name: str
    title: str
    index_label: str
    index: tuple[str, ...]
    columns: tuple[Column, ...]
    note: str = ""


@dataclass(frozen=True, slots=True)
class Section:
    """A titled group of rows, a table, or lines of text."""

    name: str
    title: str
    rows: tuple[Row, ...] = ()
    table: Table | None = None
    lines: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True)
class Step:
    """One step of a working: relation, the same with numbers, result, source.

    `latex` and `text` are the relation; `numbers` and `numbers_latex` have values put in. A condition of an iterated result has both
    sides evaluated in `left` and `right` and their relative difference in `residual`.
    """

    name: str
    label: str
    text: str
    latex: str
    numbers: str
    result: Row | None = None
    source: str = ""
    left: float | None = None
    right: float | None = None
    residual: float | None = None
    numbers_latex: str = ""


@dataclass(frozen=True, slots=True)
class Report:
    """What an object shows.

    `headline` holds the answer that the analyst came for (one to four rows); `given` the inputs; `results` what follows;
    `sections` the rest (stations, composition, assumptions, checks); `doubts` the warnings that belong to the object as a whole;
    `figures` the drawings; `cautions` the hazard lines.
    """

    kind: str
    title: str
    subtitle: str
    units: UnitSystem
    headline: tuple[Row, ...] = ()
    given: tuple[Row, ...] = ()
    results: tuple[Row, ...] = ()
    sections: tuple[Section, ...] = ()
    steps: tuple[Step, ...] = ()
    doubts: tuple[str, ...] = ()
    figures: tuple[Figure, ...] = ()
    cautions: tuple[str, ...] = ()
    code: str = ""
    render: Callable[[Report, str], str] | None = field(default=None, compare=False, repr=False)

    def rows(self) -> Iterator[Row]:
        """Yield every row: headline, given, results, then those of the sections."""
        yield from (*self.headline, *self.given, *self.results)
        for section in self.sections:
            yield from section.rows

    def __str__(self) -> str:
        return self._as("text")

    def _as(self, medium: str) -> str:
        if self.render is None:
            return f"{self.kind}: {self.title}"
        return self.render(self, medium)

    def _repr_mimebundle_(self, include: Any = None, exclude: Any = None) -> dict[str, str]:
        media = {"text/plain": "text", "text/html": "html", "text/markdown": "markdown", "text/latex": "latex"}
        wanted = {mime for mime in media if (not include or mime in include) and (not exclude or mime not in exclude)}
        return {mime: self._as(medium) for mime, medium in media.items() if mime in wanted}
