"""Reports as text for a terminal."""

from __future__ import annotations

import math
import textwrap
from collections.abc import Iterable
from itertools import zip_longest

from propkit.report import Column, Report, Row, Section, Step, Table
from propkit.sources import reference
from propkit.view import cells, numbers
from propkit.view.symbols import text_species, text_symbol

WIDTH = 80
"""Columns of a terminal that nobody has widened."""
_NARROWEST = 16
"""Columns that text needs at least to be broken into lines."""


def render(report: Report) -> str:
    """Return the report as text for a terminal of 80 columns."""
    title = textwrap.wrap(f"{report.kind}: {report.title}" if report.title else report.kind, WIDTH) or [""]
    lines = [*title, "─" * max(40, *map(len, title))]
    if report.subtitle not in ("", report.title):
        lines += textwrap.wrap(report.subtitle, WIDTH)
    if report.headline:
        lines += ["", *_rows(report.headline)]
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


def _rows(rows: Iterable[Row]) -> list[str]:
    """Return rows with decimal signs in line; texts start where the numbers do."""
    listed = list(rows)
    lined = iter(
        numbers.lined_up(numbers.rounded(row.value, row.digits, row.uncertainty) for row in listed if isinstance(row.value, int | float))
    )
    label = max(len(row.label) for row in listed)
    symbol = max(_width(text_symbol(row.symbol)) for row in listed)
    lines = []
    for row in listed:
        typed = f"   ({row.typed})" if cells.shows_typed(row) else ""
        sure = f" ± {cells.uncertainty_text(row, plain=True)}" if row.uncertainty is not None else ""
        value = next(lined) if isinstance(row.value, int | float) else "not available" if row.value is None else str(row.value)
        value = f"{value.rstrip()}{sure}" if sure else value
        sign = _padded(text_symbol(row.symbol), symbol)
        start = f"  {cells.MARKS[row.kind]} {row.label:<{label}}  {sign}  "
        lines += _broken(start, f"{value} {cells.unit_text(row.unit)}{typed}".rstrip())
        for doubt in row.doubts:
            lines += _bullets([doubt], "! ", "      ")
    return lines


def _broken(start: str, text: str) -> list[str]:
    """Return a line, or several where the text behind its start runs past the edge."""
    if len(start) + len(text) <= WIDTH or WIDTH - len(start) < _NARROWEST:
        return [start + text]
    return textwrap.wrap(text, WIDTH, initial_indent=start, subsequent_indent=" " * len(start))


def _width(text: str) -> int:
    """Return how many columns a text takes: combining marks take none."""
    return sum(1 for letter in text if not 0x300 <= ord(letter) < 0x370)


def _padded(text: str, width: int, right: bool = False) -> str:
    room = " " * (width - _width(text))
    return room + text if right else text + room


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
    """Return a table, in as many blocks of about equal width as its columns need."""
    species = cells.is_species(table.index_label)
    index = [text_species(entry) if species else entry for entry in table.index]
    first = _block(table.index_label, "", index, False)
    blocks = []
    for column in table.columns:
        head = column.label if species and len(table.columns) > 1 else text_symbol(column.symbol) or column.label
        blocks.append(_block(head, cells.unit_text(column.unit), _texts(column), cells.numeric(column)))
    lines: list[str] = []
    for group in _groups(blocks, WIDTH - _width(first[0]) - 4):
        if lines:
            lines.append("")
        if len(group) == 1 and _width(first[0]) + _width(group[0][0]) + 4 > WIDTH:
            lines += _tall(first, group[0])
            continue
        head_rows = (0, 1) if any(block[1].strip() for block in group) else (0,)
        for row in (*head_rows, *range(2, len(first))):
            lines.append("  " + "  ".join(block[row] for block in (first, *group)))
    return lines + (_bullets([table.note], "") if table.note else [])


def _tall(first: list[str], block: list[str]) -> list[str]:
    """Return a column of long texts beside the index, the texts broken into lines."""
    wide = min(_width(first[0]), WIDTH - 2 * _NARROWEST)
    lines = []
    for place, (index, text) in enumerate(zip(first, block, strict=True)):
        left = textwrap.wrap(index, wide) or [""]
        right = textwrap.wrap(text.strip(), WIDTH - wide - 4) or [""]
        if place == 1 and left == right == [""]:
            continue
        rows = zip_longest(left, right, fillvalue="")
        lines += [f"  {_padded(begin, wide)}  {end}" for begin, end in rows]
    return lines


def _texts(column: Column) -> list[str]:
    """Return the cells of a column, numbers with their decimal signs in line."""
    lined = iter(numbers.lined_up(numbers.rounded(v, column.digits) for v in column.values if isinstance(v, int | float)))
    return [next(lined) if isinstance(v, int | float) else v or "" for v in column.values]


def _block(head: str, unit: str, body: list[str], right: bool) -> list[str]:
    """Return a column of a table with all lines of one width."""
    width = max(map(_width, (head, unit, *body)))
    return [_padded(text, width, right) for text in (head, unit, *body)]


def _groups(blocks: list[list[str]], room: int) -> list[list[list[str]]]:
    """Return the columns in groups that fit side by side, the groups about equally full."""
    total = sum(_width(block[0]) + 2 for block in blocks)
    target = total / max(1, math.ceil(total / room))
    groups: list[list[list[str]]] = [[]]
    used = 0
    for block in blocks:
        wide = _width(block[0]) + 2
        if groups[-1] and (used + wide > room or used >= target):
            groups.append([])
            used = 0
        groups[-1].append(block)
        used += wide
    return groups


def _step(step: Step) -> list[str]:
    lines = [f"{step.label}"]
    if step.left is not None and step.right is not None:
        lines += [
            *_labelled("condition", step.text),
            f"  values     {step.left:.10g} = {step.right:.10g}",
            f"  residual   {step.residual:.1e}",
        ]
    else:
        lines += [*_labelled("relation", step.text), *_labelled("numbers", step.numbers)]
        if step.result is not None and isinstance(step.result.value, int | float):
            value = numbers.rounded(step.result.value, step.result.digits)
            lines.append(f"  result     {value} {cells.unit_text(step.result.unit)}")
    if step.source:
        lines += _labelled("source", reference(step.source))
    return lines


def _labelled(label: str, text: str) -> list[str]:
    return textwrap.wrap(text, WIDTH, initial_indent=f"  {label:<11}", subsequent_indent=" " * 13, break_long_words=False)


def _bullets(texts: Iterable[str], mark: str, indent: str = "  ") -> list[str]:
    lines: list[str] = []
    for text in texts:
        lines += textwrap.wrap(text, WIDTH, initial_indent=indent + mark, subsequent_indent=indent + " " * len(mark)) or [indent + mark]
    return lines
