"""The tables of an HTML sheet: rows of quantities, stations and species, conditions; numbers stand with their decimal signs in line."""

from __future__ import annotations

import base64
from collections.abc import Iterable, Sequence
from html import escape

from propkit.report import Column, Row, Step, Table
from propkit.sources import reference
from propkit.view import cells, equations, numbers
from propkit.view.symbols import html_species, html_symbol

BAR_COLUMNS = 4
"""Composition is drawn as bars beside the numbers up to this many stations."""

_UNBROKEN = 12
"""Letters up to which a word in a cell is not broken."""


def lined_up(texts: Iterable[str]) -> list[str]:
    """Return numbers with the part behind the decimal sign in a box of one width, so that right alignment lines them up."""
    listed = list(texts)
    room = numbers.room(listed)
    if not room:
        return listed
    cut = [numbers.split(text) for text in listed]
    return [f"{head}<span style='width:{room}ch'>{tail}</span>" for head, tail in cut]


def value_html(row: Row) -> str:
    """Return the value of a row, escaped."""
    if row.value is None:
        return "not available"
    if isinstance(row.value, str):
        return html_species(row.value) if row.name == "formula" else escape(row.value)
    return numbers.pretty(row.value, row.digits, row.uncertainty)


def uncertainty_html(row: Row) -> str:
    """Return the standard uncertainty of a row behind its value."""
    return f" ± {cells.uncertainty_text(row)}" if row.uncertainty is not None else ""


def unit_html(unit: str) -> str:
    """Return a unit, escaped."""
    return escape(cells.unit_text(unit))


def doubt_html(text: str, about: str = "") -> str:
    """Return a doubt as a line of its own, with what it is about."""
    named = f"<b>{escape(about)}:</b> " if about else ""
    return f"<p class='propkit-doubt'>⚠ {named}{escape(text)}</p>"


def rows_html(rows: Iterable[Row], caption: str) -> str:
    """Return rows of quantities as a table: mark, label, symbol, value, unit; doubts under their number."""
    listed = list(rows)
    set_numbers = iter(lined_up(value_html(row) for row in listed if isinstance(row.value, int | float)))
    doubted = [row for row in listed if row.uncertainty is not None]
    sure = dict(zip(map(id, doubted), lined_up(uncertainty_html(row).strip() for row in doubted), strict=True))
    lines = []
    for row in listed:
        number = isinstance(row.value, int | float)
        beside = f"<td class='propkit-n'>{sure.get(id(row), '')}</td>" if doubted else ""
        lines.append(_row(row, next(set_numbers) if number else value_html(row), number, beside))
    return f"<table><caption>{escape(caption)}</caption><tbody>{''.join(lines)}</tbody></table>"


def _row(row: Row, value: str, number: bool, beside: str) -> str:
    """Return a row; `beside` is the cell of its uncertainty where the table has such a column."""
    more = 1 if beside else 0
    typed = f" <small class='propkit-u'>{escape(_unbroken(f'({row.typed})'))}</small>" if cells.shows_typed(row) else ""
    sign = html_symbol(row.symbol)
    head = (
        f"<tr class='propkit-{row.kind}'><td class='propkit-m' title='{row.kind}'>{cells.MARKS[row.kind]}</td>"
        f"<th scope='row'>{escape(row.label)}{typed}</th>"
    )
    if number:
        rest = (
            f"<td class='propkit-s'>{sign}</td><td class='propkit-n'>{value}</td>{beside}<td class='propkit-u'>{unit_html(row.unit)}</td>"
        )
    elif sign:
        rest = f"<td class='propkit-s'>{sign}</td><td class='propkit-t' colspan='{2 + more}'>{value}</td>"
    else:
        rest = f"<td class='propkit-t' colspan='{3 + more}'>{value}</td>"
    doubts = "".join(doubt_html(doubt) for doubt in row.doubts)
    below = f"<tr><td></td><td colspan='{4 + more}'>{doubts}</td></tr>" if doubts else ""
    return f"{head}{rest}</tr>{below}"


def _unbroken(text: str) -> str:
    """Return a short text that no line break divides."""
    return text.replace(" ", "\u00a0") if len(text) <= 24 else text


def is_wide(table: Table) -> bool:
    """Whether a table needs the full width of the sheet."""
    if cells.is_species(table.index_label):
        return len(table.columns) > 1
    longest = max((len(value) for column in table.columns for value in column.values if isinstance(value, str)), default=0)
    return len(table.columns) > 4 or longest > 40


def table_html(table: Table) -> str:
    """Return a table of stations, species or cases: the index down, quantities across; species with bars."""
    species = cells.is_species(table.index_label)
    bars = species and len(table.columns) <= BAR_COLUMNS
    heads = "".join(_head(column, species, bars) for column in table.columns)
    largest = max(
        (abs(value) for column in table.columns for value in column.values if isinstance(value, int | float)),
        default=0.0,
    )
    columns = [_cells(column, largest if bars else 0.0) for column in table.columns]
    body = []
    for position, entry in enumerate(table.index):
        name = html_species(entry) if species else escape(entry)
        body.append(f"<tr><th scope='row'>{name}</th>{''.join(column[position] for column in columns)}</tr>")
    note = f"<p class='propkit-note'>{escape(table.note)}</p>" if table.note else ""
    slim = " class='propkit-slim'" if len(table.columns) < 3 and not bars and not is_wide(table) else ""
    return (
        f"<div class='propkit-wide'><table{slim}><caption>{escape(table.title)}</caption><thead><tr>"
        f"<th scope='col'>{escape(table.index_label)}</th>{heads}</tr></thead><tbody>{''.join(body)}</tbody></table></div>{note}"
    )


def _head(column: Column, species: bool, bars: bool) -> str:
    unit = unit_html(column.unit).replace("/", "/<wbr>")
    shown = f"<br><span class='propkit-u'>{unit}</span>" if unit else ""
    sign = html_symbol(column.symbol) if column.symbol and not species else escape(column.label)
    kind = " class='propkit-n'" if cells.numeric(column) and not bars else ""
    span = " colspan='2'" if bars else ""
    return f"<th scope='col'{span}{kind} title='{escape(column.label)}'>{sign}{shown}</th>"


def _cells(column: Column, largest: float) -> list[str]:
    """Return the cells of a column; with bars against `largest` where that is not zero."""
    written = html_species if column.name == "formula" else escape
    set_numbers = iter(lined_up(numbers.pretty(value, column.digits) for value in column.values if isinstance(value, int | float)))
    out = []
    for value in column.values:
        if isinstance(value, int | float):
            bar = _bar(100.0 * abs(value) / largest) if largest else ""
            out.append(f"<td class='propkit-n'>{next(set_numbers)}</td>{bar}")
        else:
            short = len(value or "") <= _UNBROKEN and " " not in (value or "")
            kind = " class='propkit-n'" if cells.numeric(column) else " class='propkit-s'" if short else " class='propkit-t'"
            out.append(f"<td{kind}>{written(value) if value else ''}</td>" + ("<td></td>" if largest else ""))
    return out


def _bar(percent: float) -> str:
    drawn = f"<span style='width:{percent:.1f}%'></span>" if percent >= 0.5 else ""
    return f"<td class='propkit-bar' aria-hidden='true'>{drawn}</td>"


def equation_html(latex: str, text: str) -> str:
    """Return an equation as an image with its text as the alternative; the text where it cannot be set."""
    drawn = equations.svg_of(latex)
    if drawn is None:
        return f"<p><code>{escape(text)}</code></p>"
    source = base64.b64encode(drawn.encode()).decode()
    return f"<p class='propkit-eq'><img src='data:image/svg+xml;base64,{source}' alt='{escape(text)}'></p>"


def conditions_html(steps: Sequence[Step]) -> str:
    """Return the conditions that iterated states satisfy as one table, both sides evaluated."""
    if not steps:
        return ""
    left, right = (lined_up(numbers.pretty(float(getattr(step, side) or 0.0), 10) for step in steps) for side in ("left", "right"))
    rows = []
    for position, step in enumerate(steps):
        rows.append(
            f"<tr><th scope='row'>{escape(step.label)}</th><td>{equation_html(step.latex, step.text)}</td>"
            f"<td class='propkit-n'>{left[position]}</td><td class='propkit-n'>{right[position]}</td>"
            f"<td class='propkit-n'>{numbers.pretty(step.residual or 0.0, 2)}</td></tr>"
        )
    sources = "; ".join(dict.fromkeys(reference(step.source).rstrip(".") for step in steps if step.source))
    heads = "".join(f"<th scope='col' class='propkit-n'>{head}</th>" for head in ("left side", "right side", "residual"))
    return (
        "<div class='propkit-wide'><table class='propkit-mid'><caption>Conditions that the states satisfy</caption><thead><tr>"
        f"<th scope='col'>condition</th><th scope='col'>relation</th>{heads}</tr></thead>"
        f"<tbody>{''.join(rows)}</tbody></table></div><p class='propkit-note'>{escape(sources)}.</p>"
    )
