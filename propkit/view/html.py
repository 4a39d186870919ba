"""Reports as HTML: a page of a calculation pad, readable with the style sheet stripped, the same bytes for the same report.

No heading, script, external address or random id; everything that a user typed is escaped; drawings and equations are images.
"""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from html import escape

from propkit.report import Report, Row, Section, Step
from propkit.series import Figure
from propkit.sources import reference
from propkit.view import cells, svg
from propkit.view.html_tables import (
    conditions_html,
    doubt_html,
    equation_html,
    is_wide,
    rows_html,
    table_html,
    uncertainty_html,
    unit_html,
    value_html,
)
from propkit.view.style import STYLE
from propkit.view.symbols import html_symbol

_BESIDE = 3
"""With fewer given rows than this the drawing stands under them, and the sheet has two columns instead of three."""
_LONG = 5
"""More lines than this take the full width, in two columns."""
_TALL = 14
"""A composition of more species than this stands below, where it has a neighbour, instead of beside the results."""


def render(report: Report) -> str:
    """Return the report as an HTML fragment."""
    relations = [step for step in report.steps if step.left is None]
    conditions = [step for step in report.steps if step.left is not None]
    beside = _drawn_section(report)
    parts = [
        f"<style>{STYLE}</style>",
        _strip(report),
        _answers(report.headline),
        _doubts(report),
        _body(report, beside),
        *(_step(step) for step in relations),
        conditions_html(conditions),
        _sections([section for section in report.sections if section is not beside]),
        _cautions(report.cautions),
        _legend(report),
    ]
    return f"<div class='propkit-sheet'>{''.join(parts)}</div>"


def _strip(report: Report) -> str:
    title = f" <b class='propkit-title'>{escape(report.title)}</b>" if report.title else ""
    below = f" <span class='propkit-sub'>{escape(report.subtitle)}</span>" if report.subtitle not in ("", report.title) else ""
    return f"<p class='propkit-strip'><span class='propkit-kind'>{escape(report.kind)}</span>{title}{below}</p>"


def _answers(rows: Iterable[Row]) -> str:
    shown = []
    for row in rows:
        sign = f" {html_symbol(row.symbol)}" if row.symbol else ""
        doubt = " <span class='propkit-flag' title='see the warning'>⚠</span>" if row.doubts else ""
        shown.append(
            f"<p class='propkit-answer'><span>{escape(row.label)}{sign}</span> <b>{value_html(row)}{_sure(row)}</b>"
            f" <small class='propkit-u'>{unit_html(row.unit)}</small>{doubt}</p>"
        )
    return f"<div class='propkit-answers'>{''.join(shown)}</div>" if shown else ""


def _sure(row: Row) -> str:
    return f"<small>{uncertainty_html(row)}</small>" if row.uncertainty is not None else ""


def _doubts(report: Report) -> str:
    """Return the doubts of the answers, each once with all that it is about, and those of the whole object."""
    about: dict[str, list[str]] = {}
    for row in report.headline:
        for doubt in row.doubts:
            about.setdefault(doubt, []).append(row.label)
    for doubt in report.doubts:
        about.setdefault(doubt, [])
    return "".join(doubt_html(doubt, ", ".join(labels)) for doubt, labels in about.items())


def _drawn_section(report: Report) -> Section | None:
    """Return the table of one composition that is drawn as well: its bars stand in the table, which takes the drawing's place."""
    drawn = {figure.name for figure in report.figures}
    for section in report.sections:
        table = section.table
        if table is None or not cells.is_species(table.index_label) or table.name not in drawn:
            continue
        if len(table.columns) == 1 and len(table.index) <= _TALL:
            return section
    return None


def _body(report: Report, beside: Section | None) -> str:
    """Return what was given on the left, what follows on the right, the drawings beside them or under the shorter one."""
    answered = {row.name for row in report.headline}
    rest = [row for row in report.results if row.name not in answered]
    columns = []
    if report.given:
        columns.append(f"<div class='propkit-left'>{rows_html(report.given, 'Given')}</div>")
    if rest:
        columns.append(f"<div class='propkit-right'>{rows_html(rest, 'Results')}</div>")
    replaced = beside.table.name if beside is not None and beside.table is not None else ""
    pictures = [_picture(figure) for figure in report.figures if figure.name != replaced]
    if beside is not None:
        pictures.append(_section(beside))
    if pictures:
        columns.append(f"<div class='propkit-pic'>{''.join(pictures)}</div>")
    if not columns:
        return ""
    form = ["propkit-body"]
    if not report.given and not rest:
        form.append("propkit-alone")
    elif len(report.given) >= len(rest):
        form.append("propkit-picright")
    if min(len(report.given), len(rest)) < _BESIDE:
        form.append("propkit-two")
    return f"<div class='{' '.join(form)}'>{''.join(columns)}</div>"


def _picture(figure: Figure) -> str:
    return f"<img src='{svg.data_uri(figure)}' alt='{escape(figure.alt)}'>"


def _sections(sections: Sequence[Section]) -> str:
    """Return the sections two abreast; one without a neighbour, or too wide for half the page, takes the whole of it."""
    shown, lonely = [], ""
    for section in sections:
        table = section.table is not None and is_wide(section.table)
        if table or (len(section.lines) > _LONG and not lonely):
            shown += [_section(section, full=True)] if not lonely else [lonely, _section(section, full=True)]
            lonely = ""
        elif lonely:
            shown += [lonely, _section(section)]
            lonely = ""
        else:
            lonely = _section(section)
    if lonely:
        last = sections[-1]
        shown.append(_section(last, full=bool(last.lines) and not last.rows and last.table is None))
    return f"<div class='propkit-parts'>{''.join(shown)}</div>" if shown else ""


def _section(section: Section, full: bool = False) -> str:
    inner = []
    if section.rows:
        inner.append(rows_html(section.rows, section.title))
    if section.table is not None:
        inner.append(table_html(section.table))
    if section.lines:
        if not inner:
            inner.append(f"<p class='propkit-caption'>{escape(section.title)}</p>")
        long = " propkit-long" if full and len(section.lines) > _LONG else ""
        inner.append(f"<ul class='propkit-lines{long}'>{''.join(f'<li>{escape(line)}</li>' for line in section.lines)}</ul>")
    return f"<div{' class=propkit-full' if full else ''}>{''.join(inner)}</div>" if inner else ""


def _step(step: Step) -> str:
    numbers_in = equation_html(step.numbers_latex, step.numbers) if step.numbers_latex else f"<p><code>{escape(step.numbers)}</code></p>"
    result = ""
    if step.result is not None:
        result = f"<p>= <b>{value_html(step.result)}</b> <span class='propkit-u'>{unit_html(step.result.unit)}</span></p>"
    source = f"<p class='propkit-note'>{escape(reference(step.source))}</p>" if step.source else ""
    return (
        f"<div class='propkit-step'><p class='propkit-steptitle'>{escape(step.label)}</p>"
        f"{equation_html(step.latex, step.text)}{numbers_in}{result}{source}</div>"
    )


def _cautions(lines: Sequence[str]) -> str:
    if not lines:
        return ""
    said = " ".join(escape(line if line.endswith((".", "!")) else f"{line}.") for line in lines)
    return f"<p class='propkit-note propkit-cautions'><b>Cautions.</b> {said}</p>"


def _legend(report: Report) -> str:
    kinds = cells.legend_of(report)
    shown = " &#160; ".join(f"{cells.MARKS[kind]} {kind}" for kind in kinds)
    return f"<p class='propkit-legend'>{shown}</p>" if len(kinds) > 1 else ""
