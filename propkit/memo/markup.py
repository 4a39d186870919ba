"""Rows, tables, workings and drawings as plain HTML for memo pages; the PDF is set from the same markup."""

from __future__ import annotations

import base64
import math
from collections.abc import Iterable, Sequence
from html import escape

from propkit.memo.equations import image_of
from propkit.report import Row, Step, Table
from propkit.series import Figure
from propkit.sources import reference
from propkit.view import cells, numbers, svg
from propkit.view.symbols import html_species, html_symbol

_LOWEST_POWER = -12
_SUPERSCRIPTS = str.maketrans("-0123456789", "⁻⁰¹²³⁴⁵⁶⁷⁸⁹")


def value_text(row: Row) -> str:
    """Return the value of a row as text."""
    if row.value is None:
        return "not available"
    return row.value if isinstance(row.value, str) else numbers.pretty(row.value, row.digits, row.uncertainty)


def aligned(texts: Sequence[str]) -> list[str]:
    """Return numbers padded behind with figure spaces, so that right alignment puts their decimal signs under each other."""
    tails = [len(text.partition(".")[2]) if "." in text else -1 for text in texts]
    widest = max(tails, default=-1)
    if widest < 0:
        return list(texts)
    return [text + ("\u2008" if tail < 0 else "") + "\u2007" * (widest - max(tail, 0)) for text, tail in zip(texts, tails, strict=True)]


def answers(rows: Iterable[Row]) -> str:
    """Return the headline: label, value and unit of each row."""
    made = "".join(
        f'<p class="answer"><span>{escape(row.label)} {html_symbol(row.symbol)}</span> <b>{escape(value_text(row))}{uncertainty(row)}</b> '
        f"<small>{escape(cells.unit_text(row.unit))}</small></p>"
        for row in rows
    )
    return f'<div class="answers">{made}</div>'


def uncertainty(row: Row) -> str:
    """Return the standard uncertainty of a row, where it has one."""
    return f" ± {cells.uncertainty_text(row)}" if row.uncertainty is not None else ""


def rows_table(rows: Sequence[Row], typed: bool = False) -> str:
    """Return rows as a table: mark, label, symbol, value, unit and, for inputs, what was typed."""
    padded = iter(aligned([value_text(row) for row in rows if isinstance(row.value, int | float)]))
    lines = []
    for row in rows:
        value = escape(next(padded) if isinstance(row.value, int | float) else value_text(row))
        last = f"<td>{escape(row.typed) if cells.shows_typed(row) else ''}</td>" if typed else ""
        doubts = "".join(f'<br><span class="doubt">{escape(doubt)}</span>' for doubt in row.doubts)
        lines.append(
            f'<tr><td class="mark">{cells.MARKS[row.kind]}</td><td>{escape(row.label)}{doubts}</td><td>{html_symbol(row.symbol)}</td>'
            f'<td class="number">{value}{uncertainty(row)}</td><td class="unit">{escape(cells.unit_text(row.unit))}</td>{last}</tr>'
        )
    head = f'<tr><th></th><th>quantity</th><th></th><th class="number">value</th><th>unit</th>{"<th>as typed</th>" if typed else ""}</tr>'
    return f'<div class="table-frame"><table class="rows"><thead>{head}</thead><tbody>{"".join(lines)}</tbody></table></div>'


def data_table(table: Table) -> str:
    """Return a table of stations, species or anything else: index down, columns across."""
    species = cells.is_species(table.index_label)
    heads = [f"<th>{escape(table.index_label)}</th>"]
    columns = []
    for column in table.columns:
        sign = html_symbol(column.symbol) if column.symbol and not species else escape(column.label)
        unit = cells.unit_text(column.unit)
        kind = ' class="number"' if cells.numeric(column) else ""
        heads.append(f"<th{kind}>{sign}{f'<br>{escape(unit)}' if unit else ''}</th>")
        shown = [
            "" if value is None else value if isinstance(value, str) else numbers.pretty(value, column.digits) for value in column.values
        ]
        numeric = [isinstance(value, int | float) for value in column.values]
        padded = iter(aligned([text for text, number in zip(shown, numeric, strict=True) if number]))
        written = html_species if column.name == "formula" else escape
        columns.append((kind, [next(padded) if number else written(text) for text, number in zip(shown, numeric, strict=True)]))
    body = "".join(
        f"<tr><td>{html_species(name) if species else escape(name)}</td>"
        + "".join(f"<td{kind}>{texts[place]}</td>" for kind, texts in columns)
        + "</tr>"
        for place, name in enumerate(table.index)
    )
    note = f'<p class="quiet">{escape(table.note)}</p>' if table.note else ""
    return f'<div class="table-frame"><table><thead><tr>{"".join(heads)}</tr></thead><tbody>{body}</tbody></table></div>{note}'


def text_table(heads: Sequence[str], rows: Iterable[Sequence[str]], numeric: Sequence[int] = ()) -> str:
    """Return a table of texts; `numeric` names the columns that hold numbers."""

    def cell(tag: str, place: int, text: str) -> str:
        kind = ' class="number"' if place in numeric else ""
        return f"<{tag}{kind}>{escape(text)}</{tag}>"

    head = "".join(cell("th", place, text) for place, text in enumerate(heads))
    body = "".join(f"<tr>{''.join(cell('td', place, text) for place, text in enumerate(row))}</tr>" for row in rows)
    return f'<div class="table-frame"><table><thead><tr>{head}</tr></thead><tbody>{body}</tbody></table></div>'


def lines_list(lines: Iterable[str]) -> str:
    """Return lines as a list."""
    return f"<ul>{''.join(f'<li>{escape(line)}</li>' for line in lines)}</ul>"


def working(steps: Iterable[Step], untitled: str = "") -> str:
    """Return the working of a result: each relation as a formula, with numbers put in, and its result; `untitled` names a step whose title stands above."""
    listed = list(steps)
    parts = [_step(step, untitled) for step in listed if step.left is None]
    conditions = [step for step in listed if step.left is not None]
    if conditions:
        parts.append(conditions_table(conditions))
    return "".join(parts)


def conditions_table(steps: Iterable[Step]) -> str:
    """Return the conditions that iterated states satisfy: both sides evaluated, and the residual."""
    rows = [
        (
            step.label,
            step.text,
            numbers.grouped(f"{step.left:.9g}"),
            numbers.grouped(f"{step.right:.9g}"),
            power_above(step.residual or 0.0),
        )
        for step in steps
    ]
    return text_table(("condition", "relation", "left side", "right side", "residual below"), rows, (2, 3, 4))


def power_above(value: float) -> str:
    """Return the next power of ten above a residual, at least 1e-12: what is left of an iteration is noise in its digits."""
    power = max(math.ceil(math.log10(abs(value))), _LOWEST_POWER) if value else _LOWEST_POWER
    return f"10{str(power).translate(_SUPERSCRIPTS)}"


def _step(step: Step, untitled: str) -> str:
    title = "" if step.label == untitled else f"<p><b>{escape(step.label)}</b></p>"
    result = ""
    if step.result is not None:
        result = f'<p class="result">= <b>{escape(value_text(step.result))}</b> {escape(cells.unit_text(step.result.unit))}</p>'
    source = f'<p class="quiet">{escape(reference(step.source))}</p>' if step.source else ""
    return f'<div class="formula">{title}{image_of(step.latex)}<p><code>{escape(step.numbers)}</code></p>{result}{source}</div>'


def drawing(figure: Figure) -> str:
    """Return a drawing as a picture with its alternative text."""
    data = base64.b64encode(svg.draw(figure).encode()).decode()
    return f'<figure><img alt="{escape(figure.alt)}" src="data:image/svg+xml;base64,{data}"></figure>'
