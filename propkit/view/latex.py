r"""Reports as LaTeX: plain ``tabular`` and ``\paragraph``-free, to be put into a document.

They need the packages ``fontenc`` (T1) and ``amsmath``; letters of other scripts than the Latin and the Greek need LuaLaTeX.
"""

from __future__ import annotations

from collections.abc import Iterable

from propkit.report import Report, Row, Section, Step, Table
from propkit.sources import reference
from propkit.view import cells, numbers
from propkit.view.symbols import latex_species

_ESCAPES = {
    "\\": r"\textbackslash{}", "&": r"\&", "%": r"\%", "$": r"\$", "#": r"\#", "_": r"\_", "{": r"\{", "}": r"\}",
    "~": r"\textasciitilde{}", "^": r"\textasciicircum{}", "<": r"\textless{}", ">": r"\textgreater{}", "\n": " ",
}  # fmt: skip
_GREEK = dict(zip(
    "αβγδεζηθικλμνξπρστυφχψωΓΔΘΛΞΠΣΥΦΨΩ",
    ["alpha", "beta", "gamma", "delta", "epsilon", "zeta", "eta", "theta", "iota", "kappa", "lambda", "mu", "nu", "xi", "pi", "rho", "sigma", "tau", "upsilon", "phi", "chi", "psi", "omega", "Gamma", "Delta", "Theta", "Lambda", "Xi", "Pi", "Sigma", "Upsilon", "Phi", "Psi", "Omega"],
    strict=True,
))  # fmt: skip
_MARKS = {"given": r"$\bullet$", "default": r"$\circ$", "computed": "="}
_LETTERS = str.maketrans({
    "°": r"$^\circ$", "²": "$^2$", "³": "$^3$", "·": r"$\cdot$", "−": "--", "×": r"$\times$", "±": r"$\pm$", "→": r"$\rightarrow$",
    "≤": r"$\leq$", "≥": r"$\geq$", "≈": r"$\approx$", "≠": r"$\neq$", "∞": r"$\infty$", "√": r"$\surd$",
    "\u2003": r"\quad{}", "\u2007": "~", "\u2008": "~", "\u2009": r"\,", "\u202f": r"\,", "\u200b": "", "\t": " ",
    **{chr(0x2080 + figure): f"$_{figure}$" for figure in range(10)},
    **{letter: rf"$\{name}$" for letter, name in _GREEK.items()},
})  # fmt: skip
_LONG = 40
"""Longest text of a column that is set in one line."""
_MANY = 7
"""Columns of a table from which it is set small."""


def escaped(text: str) -> str:
    """Return a text in which nothing is a LaTeX command."""
    return "".join(_ESCAPES.get(letter, letter) for letter in text).translate(_LETTERS)


def unit_text(unit: str) -> str:
    """Return a unit for LaTeX text."""
    return escaped(cells.unit_text(unit)) if unit else ""


def render(report: Report) -> str:
    """Return the report as LaTeX."""
    head = rf"\textbf{{{escaped(report.kind)}}}: {escaped(report.title)}" if report.title else rf"\textbf{{{escaped(report.kind)}}}"
    blocks = [head]
    if report.subtitle not in ("", report.title):
        blocks.append(escaped(report.subtitle))
    for rows in (report.headline, report.given):
        if rows:
            blocks.append(_rows(rows))
    shown = {row.name for row in report.headline}
    rest = [row for row in report.results if row.name not in shown]
    if rest:
        blocks.append(_rows(rest))
    blocks += [_step(step) for step in report.steps]
    blocks += [_section(section) for section in report.sections]
    for title, lines in (("Warnings", report.doubts), ("Cautions", report.cautions)):
        if lines:
            blocks.append(_items(title, lines))
    return "\n\n".join(blocks) + "\n"


def _value(row: Row) -> str:
    if row.value is None:
        return "not available"
    if isinstance(row.value, str):
        return escaped(row.value)
    return f"${numbers.latex(row.value, row.digits, row.uncertainty)}$"


def _rows(rows: Iterable[Row]) -> str:
    lines = [r"\begin{tabular}{cllrl}"]
    for row in rows:
        sign = f"${row.symbol}$" if row.symbol else ""
        typed = f" ({escaped(row.typed)})" if cells.shows_typed(row) else ""
        lines.append(rf"{_MARKS[row.kind]} & {escaped(row.label)}{typed} & {sign} & {_value(row)} & {unit_text(row.unit)} \\")
        for doubt in row.doubts:
            lines.append(rf"& \multicolumn{{4}}{{p{{0.8\linewidth}}}}{{\emph{{{escaped(doubt)}}}}} \\")
    return "\n".join([*lines, r"\end{tabular}"])


def _section(section: Section) -> str:
    blocks = [rf"\textit{{{escaped(section.title)}}}"]
    if section.rows:
        blocks.append(_rows(section.rows))
    if section.table is not None:
        blocks.append(_table(section.table))
    if section.lines:
        blocks.append(_items("", section.lines))
    return "\n\n".join(blocks)


def _items(title: str, lines: Iterable[str]) -> str:
    body = "\n".join(rf"\item {escaped(line)}" for line in lines)
    head = rf"\textit{{{title}}}" + "\n\n" if title else ""
    return rf"{head}\begin{{itemize}}" + f"\n{body}\n" + r"\end{itemize}"


def _table(table: Table) -> str:
    form = _form(table.index) + "".join("r" if cells.numeric(column) else _form(column.values) for column in table.columns)
    heads = [escaped(table.index_label)]
    for column in table.columns:
        name = f"${column.symbol}$" if column.symbol and not cells.is_species(table.index_label) else escaped(column.label)
        unit = unit_text(column.unit)
        heads.append(f"{name} [{unit}]" if unit else name)
    lines = [rf"\begin{{tabular}}{{{form}}}", " & ".join(heads) + r" \\ \hline"]
    for position, entry in enumerate(table.index):
        row = [f"${latex_species(entry)}$" if cells.is_species(table.index_label) else escaped(entry)]
        for column in table.columns:
            value = column.values[position]
            row.append("" if value is None else escaped(value) if isinstance(value, str) else f"${numbers.latex(value, column.digits)}$")
        lines.append(" & ".join(row) + r" \\")
    lines.append(r"\end{tabular}")
    if len(table.columns) >= _MANY:
        lines = [r"{\footnotesize\setlength{\tabcolsep}{3pt}", *lines, "}"]
    note = f"\n\n{escaped(table.note)}" if table.note else ""
    return "\n".join(lines) + note


def _form(values: Iterable[object]) -> str:
    """Return the form of a column of texts: paragraphs where some are long."""
    return r"p{0.34\linewidth}" if any(len(value) > _LONG for value in values if isinstance(value, str)) else "l"


def _step(step: Step) -> str:
    lines = [rf"\textit{{{escaped(step.label)}}}", f"\\[ {step.latex} \\]"]
    if step.left is not None and step.right is not None:
        lines.append(rf"\[ {numbers.latex(step.left, 10)} = {numbers.latex(step.right, 10)} \]")
        lines.append(f"residual ${numbers.latex(step.residual or 0.0, 2)}$")
    else:
        lines.append(rf"\[ {step.numbers_latex} \]")
        if step.result is not None:
            lines.append(f"{_value(step.result)} {unit_text(step.result.unit)}")
    if step.source:
        lines.append(escaped(reference(step.source)))
    return "\n\n".join(lines)
