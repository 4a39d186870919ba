"""The sheet of a study: what varies, and designs spread evenly over the table."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

import numpy as np
import numpy.typing as npt

from propkit import units
from propkit.report import Column, Section, Table, UnitSystem
from propkit.study.sweep_plan import QUICK, option_text

if TYPE_CHECKING:
    from propkit.study.sweep_result import StudyResult

SHOWN = 12
"""Designs listed on the sheet of a study."""
SHOWN_COLUMNS = 5
"""Results listed there."""


def axes_section(result: StudyResult, system: UnitSystem) -> Section:
    """Return what varies."""
    lines = tuple(_axis_text(result, column, system) for column in result.plan.plan.columns)
    said = tuple(f"{note[:1].upper()}{note[1:]}." for note in result.notes if note.startswith(QUICK))
    return Section("axes", "What varies", lines=(*lines, *said))


def _axis_text(result: StudyResult, column: Any, system: UnitSystem) -> str:
    if column.is_choice:
        return f"{column.path}: {', '.join(str(option_text(option)) for option in column.options)}"
    unit, factor, offset = result.display(column.path, system)
    low, high = (float(end) * factor + offset for end in (np.min(column.values), np.max(column.values)))
    text = units.shown_unit(unit)
    places = len(np.unique(column.values))
    return f"{column.path}: {places} values, {low:.5g} to {high:.5g}{f' {text}' if text else ''}"


def designs_section(result: StudyResult, system: UnitSystem) -> Section:
    """Return designs spread evenly over the table."""
    rows = np.flatnonzero(result._done)
    shown = rows[np.unique(np.linspace(0, len(rows) - 1, min(SHOWN, len(rows))).astype(int))] if len(rows) else rows
    columns = []
    for column in result.plan.plan.columns:
        if column.is_choice:
            columns.append(Column(column.path, column.path, "", "", 0, tuple(str(value) for value in column.shown(shown))))
        else:
            columns.append(_shown_column(result, column.path, shown, system))
    target = result.plan.target
    picked = [name for name in target.headline if name in result._columns]
    picked += [name for name in result._columns if name not in picked]
    columns += [_shown_column(result, name, shown, system) for name in picked[:SHOWN_COLUMNS]]
    note = f"{len(shown)} of {len(rows)} designs, spread evenly; .frame has all of them, with every result in SI."
    return Section(
        "designs", "Designs", table=Table("designs", "Designs", "design", tuple(str(row) for row in shown), tuple(columns), note)
    )


def _shown_column(result: StudyResult, name: str, rows: npt.NDArray[np.intp], system: UnitSystem) -> Column:
    known = result.quantity(name)
    assert known is not None
    unit, factor, offset = result.display(name, system)
    values = result.values(name)[rows] * factor + offset
    return Column(name, name, known.symbol, unit, known.digits, tuple(float(value) if np.isfinite(value) else None for value in values))
