"""Reports as HTML: a page of a calculation pad, readable with the style sheet stripped, the same bytes for the same report.

No heading, script, external address or random id; everything that a user typed is escaped; drawings and equations are images.
"""

from __future__ import annotations

import base64
from collections.abc import Iterable
from html import escape

from propkit.report import Column, Report, Row, Section, Step, Table
from propkit.sources import reference
from propkit.view import cells, equations, numbers, svg
from propkit.view.style import STYLE
from propkit.view.symbols import html_species, html_symbol

_KIND_TITLES = {"given": "given", "default": "default", "computed": "computed"}


def render(report: Report) -> str:
    """Return the report as an HTML fragment."""
    parts = [f"<div class='propkit-sheet'><style>{STYLE}</style>", _strip(report)]
    if report.headline:
        parts.append(_answers(report.headline))
    parts += [_doubt(doubt) for row in report.headline for doubt in row.doubts]
    parts += [_doubt(doubt) for doubt in report.doubts]
    parts.append(_body(report))
    parts += [_step(step) for step in report.steps if step.left is None]
    parts.append(_conditions([step for step in report.steps if step.left is not None]))
    sections = [_section(section) for section in report.sections]
    if sections:
        parts.append(f"<div class='propkit-parts'>{''.join(sections)}</div>")
    if report.cautions:
        parts.append(
            "<p class='propkit-note'>Cautions. "
            + " ".join(escape(_sentence(line)) for line in report.cautions)
            + "</p>"
        )
    legend = cells.legend_of(report)
    if legend:
        parts.append(
            "<p class='propkit-legend'>" + " &#160; ".join(f"{cells.MARKS[kind]} {kind}" for kind in legend) + "</p>"
        )
    return "".join(parts) + "</div>"


def _sentence(line: str) -> str:
    return line if line.endswith((".", "!")) else f"{line}."


def _strip(report: Report) -> str:
    sub = f"<span class='propkit-sub'>{escape(report.subtitle)}</span>" if report.subtitle else ""
    return f"<p class='propkit-strip'><span class='propkit-kind'>{escape(report.kind)}</span> <span class='propkit-title'>{escape(report.title)}</span> {sub}</p>"


def value_html(row: Row) -> str:
    """Return the value of a row."""
    if row.value is None:
        return "not available"
    if isinstance(row.value, str):
        return escape(row.value)
    return numbers.pretty(row.value, row.digits)


def _uncertainty(row: Row) -> str:
    return f" ± {numbers.pretty(row.uncertainty, 2)}" if row.uncertainty is not None else ""


def _answers(rows: Iterable[Row]) -> str:
    shown = []
    for row in rows:
        sign = f" {html_symbol(row.symbol)}" if row.symbol else ""
        shown.append(
            f"<p class='propkit-answer'><span>{escape(row.label)}{sign}</span><b>{value_html(row)}{_uncertainty(row)}</b> "
            f"<small class='propkit-u'>{escape(cells.unit_text(row.unit))}</small></p>"
        )
    return f"<div class='propkit-answers'>{''.join(shown)}</div>"


def _doubt(text: str) -> str:
    return f"<p class='propkit-doubt'>⚠ {escape(text)}</p>"


def _body(report: Report) -> str:
    shown = {row.name for row in report.headline}
    rest = [row for row in report.results if row.name not in shown]
    columns = []
    if report.given:
        columns.append(f"<div>{_rows(report.given, 'Given')}</div>")
    if rest:
        columns.append(f"<div>{_rows(rest, 'Results')}</div>")
    if report.figures:
        pictures = "".join(
            f"<img src='{svg.data_uri(figure)}' alt='{escape(figure.alt)}'>" for figure in report.figures
        )
        columns.append(f"<div class='propkit-pic'>{pictures}</div>")
    return f"<div class='propkit-body'>{''.join(columns)}</div>" if columns else ""


def _rows(rows: Iterable[Row], caption: str) -> str:
    listed = list(rows)
    padded = iter(numbers.aligned([value_html(row) for row in listed if isinstance(row.value, int | float)]))
    lines = []
    for row in listed:
        value = next(padded) if isinstance(row.value, int | float) else value_html(row)
        typed = f" <span class='propkit-u'>typed {escape(row.typed)}</span>" if cells.shows_typed(row) else ""
        sign = html_symbol(row.symbol)
        doubts = "".join(_doubt(doubt) for doubt in row.doubts)
        wide = " colspan='2'" if not row.unit and isinstance(row.value, str) else ""
        unit = "" if wide else f"<td class='propkit-u'>{escape(cells.unit_text(row.unit))}{typed}</td>"
        lines.append(
            f"<tr class='propkit-{row.kind}'><td class='propkit-m' title='{row.kind}'>{cells.MARKS[row.kind]}</td>"
            f"<th scope='row'>{escape(row.label)}{doubts}</th><td class='propkit-s'>{sign}</td>"
            f"<td class='propkit-n'{wide}>{value}{_uncertainty(row)}{typed if wide else ''}</td>{unit}</tr>"
        )
    return f"<table><caption>{escape(caption)}</caption><tbody>{''.join(lines)}</tbody></table>"


def _section(section: Section) -> str:
    wide = (section.table is not None and len(section.table.columns) > 4) or len(section.lines) > 5
    inner = []
    if section.rows:
        inner.append(_rows(section.rows, section.title))
    if section.table is not None:
        inner.append(_table(section.table))
    if section.lines:
        items = "".join(f"<li>{escape(line)}</li>" for line in section.lines)
        inner.append(
            f"<table role='presentation'><caption>{escape(section.title)}</caption></table><ul class='propkit-lines'>{items}</ul>"
        )
    return f"<div{' class=propkit-full' if wide else ''}>{''.join(inner)}</div>"


def _table(table: Table) -> str:
    species = cells.is_species(table.index_label)
    bars = species and len(table.columns) == 1
    heads = [f"<th scope='col'>{escape(table.index_label)}</th>"]
    for column in table.columns:
        heads.append(_head(column, species))
    if bars:
        heads.append("<th class='propkit-barcell'></th>")
    texts = [_column_texts(column) for column in table.columns]
    largest = (
        max((value for value in table.columns[0].values if isinstance(value, int | float)), default=1.0)
        if bars
        else 1.0
    )
    body = []
    for position, entry in enumerate(table.index):
        name = html_species(entry) if species else escape(entry)
        row = [f"<th scope='row'>{name}</th>"]
        for column, shown in zip(table.columns, texts, strict=True):
            kind = " class='propkit-n'" if cells.numeric(column) else ""
            row.append(f"<td{kind}>{shown[position]}</td>")
        if bars:
            value = table.columns[0].values[position]
            share = 100.0 * float(value) / float(largest) if isinstance(value, int | float) and largest else 0.0
            row.append(
                f"<td class='propkit-barcell' aria-hidden='true'><span class='propkit-bar' style='width:{share:.1f}%'></span></td>"
            )
        body.append(f"<tr>{''.join(row)}</tr>")
    note = f"<p class='propkit-note'>{escape(table.note)}</p>" if table.note else ""
    return (
        f"<div class='propkit-wide'><table><caption>{escape(table.title)}</caption><thead><tr>{''.join(heads)}</tr></thead>"
        f"<tbody>{''.join(body)}</tbody></table></div>{note}"
    )


def _head(column: Column, species: bool) -> str:
    unit = cells.unit_text(column.unit)
    shown = f"<br><span class='propkit-u'>{escape(unit)}</span>" if unit else ""
    sign = html_symbol(column.symbol) if column.symbol and not species else escape(column.label)
    kind = " class='propkit-n'" if cells.numeric(column) else ""
    return f"<th scope='col'{kind} title='{escape(column.label)}'>{sign}{shown}</th>"


def _column_texts(column: Column) -> list[str]:
    written = html_species if column.name == "formula" else escape
    plain = [
        "" if value is None else written(value) if isinstance(value, str) else numbers.pretty(value, column.digits)
        for value in column.values
    ]
    numeric = [isinstance(value, int | float) for value in column.values]
    padded = iter(numbers.aligned([text for text, number in zip(plain, numeric, strict=True) if number]))
    return [next(padded) if number else text for text, number in zip(plain, numeric, strict=True)]


def _equation(latex: str, text: str) -> str:
    drawn = equations.svg_of(latex)
    if drawn is None:
        return f"<p><code>{escape(text)}</code></p>"
    source = base64.b64encode(drawn[0].encode()).decode()
    return f"<p class='propkit-eq'><img src='data:image/svg+xml;base64,{source}' alt='{escape(text)}'></p>"


def _step(step: Step) -> str:
    parts = [f"<p class='propkit-steptitle'>{escape(step.label)}</p>", _equation(step.latex, step.text)]
    parts.append(
        _equation(step.numbers_latex, step.numbers)
        if step.numbers_latex
        else f"<p><code>{escape(step.numbers)}</code></p>"
    )
    if step.result is not None:
        parts.append(
            f"<p>= <b>{value_html(step.result)}</b> <span class='propkit-u'>{escape(cells.unit_text(step.result.unit))}</span></p>"
        )
    if step.source:
        parts.append(f"<p class='propkit-note'>{escape(reference(step.source))}</p>")
    return f"<div class='propkit-step'>{''.join(parts)}</div>"


def _conditions(steps: list[Step]) -> str:
    """Return the conditions that iterated states satisfy as one table, both sides evaluated."""
    if not steps:
        return ""
    sides = [
        numbers.aligned([numbers.grouped(f"{getattr(step, side):.9g}") for step in steps]) for side in ("left", "right")
    ]
    rows = []
    for step, left, right in zip(steps, *sides, strict=True):
        rows.append(
            f"<tr><th scope='row'>{escape(step.label)}</th><td>{_equation(step.latex, step.text)}</td><td class='propkit-n'>{left}</td>"
            f"<td class='propkit-n'>{right}</td><td class='propkit-n'>{numbers.pretty(step.residual or 0.0, 2)}</td></tr>"
        )
    sources = "; ".join(dict.fromkeys(reference(step.source).rstrip(".") for step in steps if step.source))
    return (
        "<div class='propkit-wide'><table><caption>Conditions that the states satisfy</caption><thead><tr><th scope='col'>condition</th>"
        "<th scope='col'>relation</th><th scope='col' class='propkit-n'>left side</th><th scope='col' class='propkit-n'>right side</th>"
        f"<th scope='col' class='propkit-n'>residual</th></tr></thead><tbody>{''.join(rows)}</tbody></table></div>"
        f"<p class='propkit-note'>{escape(sources)}.</p>"
    )
