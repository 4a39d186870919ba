"""Results of a question put to an object (heat flux, burn, throttle map): immutable values that show themselves like a sheet."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import TYPE_CHECKING, Any

from propkit import quantities, units
from propkit.errors import NotAvailableError
from propkit.model import sheet
from propkit.report import Report, Row, RowKind, Section, UnitSystem
from propkit.series import Figure

if TYPE_CHECKING:
    import pandas as pd

Drawer = Any


@dataclass(frozen=True, eq=False)
class Answer:
    """Named values in SI, what was given for them, a table, drawings and doubts.

    Reading a name gives a fresh quantity (a float for a pure number); `si(name)` the SI float; `frame` a copy of the table.
    """

    kind: str
    title: str
    values: Mapping[str, float]
    given: Mapping[str, float | str] = field(default_factory=dict)
    headline: tuple[str, ...] = ()
    absent: Mapping[str, str] = field(default_factory=dict)
    sources: Mapping[str, str] = field(default_factory=dict)
    doubts: tuple[str, ...] = ()
    lines: tuple[str, ...] = ()
    table: Any = field(default=None, repr=False)
    drawn: tuple[Drawer, ...] = field(default=(), repr=False)
    shown: Any = field(default=None, repr=False)

    @property
    def frame(self) -> pd.DataFrame:
        """The table (SI floats, units in ``attrs["units"]``)."""
        if self.table is None:
            raise NotAvailableError(f"the {self.kind.lower()} has no table", name="frame")
        return self.table.copy()  # type: ignore[no-any-return]

    @property
    def warnings(self) -> tuple[str, ...]:
        """What to doubt about the answer, in words."""
        return self.doubts

    def si(self, name: str) -> float:
        """Return a value as an SI float; NotAvailableError with the reason where there is none."""
        if name not in self.values:
            raise NotAvailableError(self.absent.get(name, f"the {self.kind.lower()} has no {name}"), name=name)
        return self.values[name]

    def __getattr__(self, name: str) -> Any:
        if name.startswith("_"):
            raise AttributeError(name)
        unit = quantities.quantity(name, "answer").unit if name in self.values else ""
        value = self.si(name)
        return units.quantity(value, unit) if unit else value

    def report(self, units: UnitSystem = "SI") -> Report:
        """Return what the answer shows, as neutral data that displays itself."""
        from propkit.model.base import render

        rows = {name: self._row(name, value, units, "computed") for name, value in self.values.items()}
        sections = [section for section in (self.shown(units) if self.shown is not None else ()) if section is not None]
        if self.lines:
            sections.append(Section("notes", "What is in it and what is not", lines=self.lines))
        return Report(
            kind=self.kind,
            title=self.title,
            subtitle="",
            units=units,
            headline=tuple(rows[name] for name in self.headline if name in rows),
            given=tuple(self._row(name, value, units, "given") for name, value in self.given.items()),
            results=tuple(row for name, row in rows.items() if name not in self.headline),
            sections=tuple(sections),
            doubts=self.doubts,
            figures=self.figures(units),
            render=render,
        )

    def figures(self, units: UnitSystem = "SI") -> tuple[Figure, ...]:
        """Return the drawings as neutral data."""
        return tuple(draw(units) for draw in self.drawn)

    def _row(self, name: str, value: float | str, system: UnitSystem, kind: RowKind) -> Row:
        entry = quantities.quantity(name, "answer")
        shown, unit = sheet.in_display(entry, value, system)
        return Row(name, entry.label, entry.symbol, shown, unit, entry.digits, kind, source=self.sources.get(name, ""))

    def __str__(self) -> str:
        return str(self.report())

    def _repr_mimebundle_(self, include: Any = None, exclude: Any = None) -> dict[str, str]:
        return self.report()._repr_mimebundle_(include, exclude)
