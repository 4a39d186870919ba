"""Reports as text for a terminal."""

from __future__ import annotations

import textwrap
from collections.abc import Iterable

from propkit.report import Report, Row, Section, Step, Table
from propkit.sources import reference
from propkit.view import cells, numbers
from propkit.view.symbols import text_species, text_symbol

WIDTH = 100


def render(report: Report) -> str:
    """Return the report as text, at most about 100 columns wide."""
    title = f"{report.kind}: {report.title}" if report.title else report.kind
    lines = [title, "─" * min(WIDTH, max(len(title), 40))]
    if report.subtitle:
        lines.append(report.subtitle)
    if report.headline:
        lines += ["", *_rows(report.headline, bold=True)]
    if report.given:
        lines += ["", "Given", *_rows(report.given)]
    shown = {row.name for row in report.headline}
    rest = [row for row in report.results if row.name not in shown]
    if rest:
        lines += ["", "Results", *_rows(rest)]
    for step in report.steps:
        lines += ["", *_step(step)]
    for section in report.sections:
        lines += ["", *_section(section)]
    if report.doubts:
        lines += ["", "Warnings", *_bullets(report.doubts, "! ")]
    if report.cautions:
        lines += ["", "Cautions", *_bullets(report.cautions, "· ")]
    legend = cells.legend_of(report)
    if legend:
        lines += ["", "   ".join(f"{cells.MARKS[kind]} {kind}" for kind in legend)]
    return "\n".join(line.rstrip() for line in lines)


def _rows(rows: Iterable[Row], bold: bool = False) -> list[str]:
    listed = list(rows)
    values = _value_texts(listed)
    label = max(len(row.label) for row in listed)
    symbol = max(len(text_symbol(row.symbol)) for row in listed)
    width = max(len(value) for value in values)
    lines = []
    for row, value in zip(listed, values, strict=True):
        typed = f"   ({row.typed})" if cells.shows_typed(row) else ""
        sure = f" ± {numbers.rounded(row.uncertainty, 2)}" if row.uncertainty is not None else ""
        sign = text_symbol(row.symbol)
        lines.append(
            f"  {cells.MARKS[row.kind]} {row.label:<{label}}  {sign:<{symbol + _marks(sign)}}  {value:>{width}}{sure} {cells.unit_text(row.unit)}{typed}"
        )
        for doubt in row.doubts:
            lines += _bullets([doubt], "! ", "      ")
    return lines


def _marks(text: str) -> int:
    """Return how many combining marks a text has: they take no room."""
    return sum(1 for letter in text if 0x300 <= ord(letter) < 0x370)


def _value_texts(rows: list[Row]) -> list[str]:
    texts = []
    for row in rows:
        if row.value is None:
            texts.append("not available")
        elif isinstance(row.value, str):
            texts.append(row.value)
        else:
            texts.append(numbers.rounded(row.value, row.digits))
    return texts


def _section(section: Section) -> list[str]:
    lines = [section.title]
    if section.rows:
        lines += _rows(section.rows)
    if section.table is not None:
        lines += _table(section.table)
    for line in section.lines:
        lines += _bullets([line], "· ")
    return lines


def _table(table: Table) -> list[str]:
    index = [text_species(entry) if cells.is_species(table.index_label) else entry for entry in table.index]
    first = [table.index_label, "", *index]
    blocks = [first]
    for column in table.columns:
        head = text_symbol(column.symbol) or column.label
        if cells.is_species(table.index_label) and len(table.columns) > 1:
            head = column.label
        body = [
            "" if value is None else value if isinstance(value, str) else numbers.rounded(value, column.digits)
            for value in column.values
        ]
        blocks.append([head, cells.unit_text(column.unit), *body])
    lines: list[str] = []
    start = 1
    while start < len(blocks) or start == 1:
        chosen = [0]
        used = max(map(len, blocks[0])) + 2
        while start < len(blocks) and (used + max(map(len, blocks[start])) + 2 <= WIDTH or len(chosen) == 1):
            used += max(map(len, blocks[start])) + 2
            chosen.append(start)
            start += 1
        widths = [max(len(text) - _marks(text) for text in blocks[k]) for k in chosen]
        for row in range(len(first)):
            parts = []
            for k, width in zip(chosen, widths, strict=True):
                text = blocks[k][row]
                wide = width + _marks(text)
                parts.append(
                    f"{text:<{wide}}" if k == 0 or not cells.numeric(table.columns[k - 1]) else f"{text:>{wide}}"
                )
            lines.append("  " + "  ".join(parts))
        if start >= len(blocks):
            break
    if table.note:
        lines += _bullets([table.note], "")
    return lines


def _step(step: Step) -> list[str]:
    lines = [f"{step.label}"]
    if step.left is not None and step.right is not None:
        lines += [
            f"  condition  {step.text}",
            f"  values     {step.left:.10g} = {step.right:.10g}",
            f"  residual   {step.residual:.1e}",
        ]
    else:
        lines += [f"  relation   {step.text}", f"  numbers    {step.numbers}"]
        if step.result is not None and isinstance(step.result.value, int | float):
            value = numbers.rounded(step.result.value, step.result.digits)
            lines.append(f"  result     {value} {cells.unit_text(step.result.unit)}")
    if step.source:
        lines += textwrap.wrap(
            f"source     {reference(step.source)}", WIDTH - 2, initial_indent="  ", subsequent_indent=" " * 13
        )
    return lines


def _bullets(texts: Iterable[str], mark: str, indent: str = "  ") -> list[str]:
    lines: list[str] = []
    for text in texts:
        lines += textwrap.wrap(
            text, WIDTH - len(indent), initial_indent=indent + mark, subsequent_indent=indent + " " * len(mark)
        ) or [indent + mark]
    return lines
