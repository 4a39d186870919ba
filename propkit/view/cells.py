"""What stands in the cells of a report, shared by every medium: values, units, marks, legends."""

from __future__ import annotations

from propkit import units
from propkit.report import Column, Report, Row
from propkit.view import numbers

MARKS = {"given": "●", "default": "○", "computed": "="}
"""How given, default and computed are told apart without colour."""

LEGEND = (("given", "given"), ("default", "default"), ("computed", "computed"))


def unit_text(unit: str) -> str:
    """Return a unit as a person reads it."""
    shown = units.shown_unit(unit)
    for plain, nice in (("liter", "L"), ("inch", "in"), ("foot", "ft")):
        shown = shown.replace(plain, nice)
    return shown


def uncertainty_text(row: Row, *, plain: bool = False) -> str:
    """Return the standard uncertainty of a row as it stands behind the value; plain in a terminal."""
    if row.uncertainty is None or isinstance(row.value, str) or row.value is None:
        return ""
    return numbers.beside(row.value, row.uncertainty).uncertainty if plain else numbers.pretty_uncertainty(row.value, row.uncertainty)


def shows_typed(row: Row) -> bool:
    """Whether the input as typed adds something to the value shown (another unit, another spelling)."""
    if not row.typed or row.value is None:
        return False
    if isinstance(row.value, str):
        return row.typed != row.value
    compact = row.typed.replace(" ", "")
    return compact not in (f"{row.value:g}{row.unit}", f"{row.value!r}{row.unit}", f"{row.value:g}", f"{row.value!r}")


def legend_of(report: Report) -> list[str]:
    """Return the kinds of rows that the report has, for the legend of the marks."""
    present = {row.kind for row in report.rows()}
    return [kind for kind, _ in LEGEND if kind in present]


def is_species(index_label: str) -> bool:
    """Whether the index of a table holds chemical formulas."""
    return index_label == "species"


def numeric(column: Column) -> bool:
    """Whether a column holds numbers."""
    return any(isinstance(value, int | float) for value in column.values)
