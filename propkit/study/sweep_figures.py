"""Figures of a study as neutral data: a result over a path, one curve for each value of another."""

from __future__ import annotations

from typing import Any

import numpy as np
import numpy.typing as npt

from propkit import units as unit_text
from propkit.errors import InputError, Problem
from propkit.report import UnitSystem
from propkit.series import Axis, Figure, Line, Series

Array = npt.NDArray[np.float64]

MOST_CURVES = 6
"""Curves of one figure; of more values that many are shown, evenly spread."""
ROUNDING = 1e-7
"""Relative range below which a result counts as one that does not vary."""


def shown_axis(result: Any, name: str, system: UnitSystem) -> Axis:
    """Return the axis of a column: its label, display unit and symbol."""
    known = result.quantity(name)
    return Axis(known.label, result.display(name, system)[0], known.symbol)


def shown_values(result: Any, name: str, system: UnitSystem) -> Array:
    """Return a column in its display unit."""
    _, factor, offset = result.display(name, system)
    return np.asarray(result.values(name) * factor + offset, dtype=np.float64)


def curves(result: Any, x: str | None, y: str | None, *, by: str | None, units: UnitSystem = "SI") -> Figure:
    """Return a result over a path as neutral data, one curve for each value of another path.

    Raises
    ------
    InputError
        Where nothing varies along the axis, or a name is none.
    """
    plan = result.plan.plan
    along = path_of(result, x, longest=True)
    name = result.name_of(y) if y is not None else headline(result)
    others = [column for column in plan.columns if column.path != along]
    split = next((column for column in plan.columns if column.path == _any_path(result, by)), None) if by is not None else None
    if split is None and others:
        split = max(
            (column for column in others if len(np.unique(column.values)) > 1),
            key=lambda column: len(np.unique(column.values)),
            default=None,
        )
    xs, ys = shown_values(result, along, units), shown_values(result, name, units)
    rows = np.arange(plan.count)
    keep = np.isfinite(xs)
    for column in others:
        if column is not split:
            values = column.at(rows)
            keep &= values == values[0]
    axis_x, axis_y = shown_axis(result, along, units), shown_axis(result, name, units)
    lines = []
    for place, (label, chosen) in enumerate(_kinds(result, split, rows[keep], units)):
        order = chosen[np.argsort(xs[chosen], kind="stable")]
        lines.append(
            Line(
                Series(axis_x.label, tuple(map(float, xs[order])), axis_x.unit, axis_x.symbol),
                Series(axis_y.label, tuple(map(float, ys[order])), axis_y.unit, axis_y.symbol),
                colour=place,
                label=label,
            )
        )
    title = f"{axis_y.label[:1].upper()}{axis_y.label[1:]} over {axis_x.label}"
    if split is not None:
        known = result.quantity(split.path)
        title += f", one curve for each {known.label if known is not None else split.path}"
    return Figure("study-curves", title, f"{title}, {len(lines)} curves", axis_x, axis_y, tuple(lines))


def _kinds(result: Any, split: Any, rows: npt.NDArray[np.intp], system: UnitSystem) -> list[tuple[str, npt.NDArray[np.intp]]]:
    """Return label and designs of each curve, at most `MOST_CURVES` of them, evenly spread."""
    if split is None:
        return [("", rows)]
    values = split.at(rows)
    kinds = np.unique(values)
    if len(kinds) > MOST_CURVES:
        kinds = kinds[np.unique(np.linspace(0, len(kinds) - 1, MOST_CURVES).astype(int))]
    if split.is_choice:
        return [(str(split.shown(rows[values == kind][:1])[0]), rows[values == kind]) for kind in kinds]
    unit, factor, offset = result.display(split.path, system)
    text = unit_text.shown_unit(unit)
    return [(f"{float(kind) * factor + offset:.4g}{f' {text}' if text else ''}", rows[values == kind]) for kind in kinds]


def headline(result: Any) -> str:
    """Return the result that is shown where none is named: the first of the object's headline that varies, else the first."""
    named = [*(name for name in result.plan.target.headline if name in result.results), *result.results]
    return str(next((name for name in named if _varies(result.values(name))), named[0]))


def _varies(values: Any) -> bool:
    finite = values[np.isfinite(values)]
    return bool(len(finite)) and float(np.ptp(finite)) > ROUNDING * float(np.abs(finite).max())


def _any_path(result: Any, name: str) -> str:
    found = [column.path for column in result.plan.plan.columns if column.path == name or column.path.endswith(f".{name}")]
    if len(found) != 1:
        listed = ", ".join(column.path for column in result.plan.plan.columns)
        raise InputError(Problem("path", repr(name), f"one of {listed}"))
    return str(found[0])


def path_of(result: Any, name: str | None, *, longest: bool = False, but: str = "") -> str:
    """Return the path of a number that varies: the one named, or the first (or longest) other than `but`."""
    numbers = [column for column in result.plan.plan.numbers if len(np.unique(column.values)) > 1 and column.path != but]
    if name is not None:
        path = _any_path(result, name)
        if path not in {column.path for column in numbers}:
            raise InputError(Problem("path", repr(name), "a number that varies in this study"))
        return path
    if not numbers:
        raise InputError(
            Problem(
                "designs",
                "without a number that varies" if not but else "with a single number that varies",
                "a study that varies another number",
            )
        )
    return str((max(numbers, key=lambda column: len(np.unique(column.values))) if longest else numbers[0]).path)
