"""Reports as Markdown tables."""

from __future__ import annotations

import re
from collections.abc import Iterable

from propkit.report import Report, Row, Section, Step, Table
from propkit.sources import reference
from propkit.view import cells, numbers
from propkit.view.symbols import text_species, text_symbol

_SPECIAL = re.compile(r"([\\`*_{}\[\]()#+!|<>~&$-])")


def escaped(text: str) -> str:
    """Return a text in which nothing is Markdown or HTML."""
    return _SPECIAL.sub(r"\\\1", text).replace("\\<", "&lt;").replace("\\>", "&gt;").replace("\\&", "&amp;").replace("\n", " ")


def render(report: Report) -> str:
    """Return the report as Markdown without headings."""
    blocks = [f"**{escaped(report.kind)}: {escaped(report.title)}**" if report.title else f"**{escaped(report.kind)}**"]
    if report.subtitle not in ("", report.title):
        blocks.append(escaped(report.subtitle))
    if report.headline:
        blocks.append(_rows(report.headline, "answer"))
    if report.given:
        blocks.append(_rows(report.given, "given"))
    shown = {row.name for row in report.headline}
    rest = [row for row in report.results if row.name not in shown]
    if rest:
        blocks.append(_rows(rest, "result"))
    blocks += [_step(step) for step in report.steps]
    blocks += [_section(section) for section in report.sections]
    if report.doubts:
        blocks.append("\n".join(f"- **warning:** {escaped(doubt)}" for doubt in report.doubts))
    if report.cautions:
        blocks.append("\n".join(f"- caution: {escaped(caution)}" for caution in report.cautions))
    legend = cells.legend_of(report)
    if legend:
        blocks.append("   ".join(f"{cells.MARKS[kind]} {kind}" for kind in legend))
    return "\n\n".join(blocks) + "\n"


def value_text(row: Row) -> str:
    """Return the value of a row as Markdown."""
    if row.value is None:
        return "not available"
    if isinstance(row.value, str):
        return escaped(row.value)
    return numbers.pretty(row.value, row.digits, row.uncertainty)


def _rows(rows: Iterable[Row], head: str) -> str:
    lines = [f"| | {head} | symbol | value | unit |", "|---|---|---|---:|---|"]
    for row in rows:
        typed = f" ({escaped(row.typed)})" if cells.shows_typed(row) else ""
        sure = f" ± {cells.uncertainty_text(row)}" if row.uncertainty is not None else ""
        doubts = "".join(f"<br>⚠ {escaped(doubt)}" for doubt in row.doubts)
        sign = escaped(text_symbol(row.symbol))
        lines.append(
            f"| {cells.MARKS[row.kind]} | {escaped(row.label)}{doubts} | {sign} | {value_text(row)}{sure} | {cells.unit_text(row.unit)}{typed} |"
        )
    return "\n".join(lines)


def _section(section: Section) -> str:
    blocks = [f"*{escaped(section.title)}*"]
    if section.rows:
        blocks.append(_rows(section.rows, "quantity"))
    if section.table is not None:
        blocks.append(_table(section.table))
    if section.lines:
        blocks.append("\n".join(f"- {escaped(line)}" for line in section.lines))
    return "\n\n".join(blocks)


def _table(table: Table) -> str:
    heads = [escaped(table.index_label)]
    for column in table.columns:
        unit = cells.unit_text(column.unit)
        name = text_symbol(column.symbol) if column.symbol and not cells.is_species(table.index_label) else column.label
        heads.append(escaped(name) + (f" [{unit}]" if unit else ""))
    lines = [
        "| " + " | ".join(heads) + " |",
        "|---|" + "|".join("---:" if cells.numeric(column) else "---" for column in table.columns) + "|",
    ]
    for position, entry in enumerate(table.index):
        name = text_species(entry) if cells.is_species(table.index_label) else entry
        row = [escaped(name)]
        for column in table.columns:
            value = column.values[position]
            row.append("" if value is None else escaped(value) if isinstance(value, str) else numbers.pretty(value, column.digits))
        lines.append("| " + " | ".join(row) + " |")
    return "\n".join(lines) + (f"\n\n{escaped(table.note)}" if table.note else "")


def _step(step: Step) -> str:
    lines = [f"*{escaped(step.label)}*", ""]
    if step.left is not None and step.right is not None:
        lines.append(f"- condition: `{step.text}`")
        lines.append(f"- values: {step.left:.10g} = {step.right:.10g}, residual {step.residual:.1e}")
    else:
        lines.append(f"- relation: `{step.text}`")
        lines.append(f"- numbers: `{step.numbers}`")
        if step.result is not None:
            lines.append(f"- result: {value_text(step.result)} {cells.unit_text(step.result.unit)}")
    if step.source:
        lines.append(f"- source: {escaped(reference(step.source))}")
    return "\n".join(lines)
