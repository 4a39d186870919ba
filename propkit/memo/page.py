"""The HTML memo of a notebook: one file, no script, no load from anywhere, readable on a phone and on paper."""

from __future__ import annotations

import base64
import html
import re
from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from functools import cached_property

from propkit.memo import equations
from propkit.memo.blocks import Block
from propkit.memo.clean import clean
from propkit.memo.style import PAGE_STYLE
from propkit.record.build import CAUTIONS
from propkit.record.containers import record_template
from propkit.record.outcome import Verification
from propkit.record.record import Record

_LONGEST_FOOT = 80


@dataclass(frozen=True, slots=True)
class Bound:
    """A record as a memo binds it: the record, its verification, its headline as label, value and unit."""

    record: Record
    verification: Verification
    answers: tuple[tuple[str, str, str], ...]

    @property
    def headline(self) -> str:
        """The answer in one line."""
        return ", ".join(f"{label} {value} {unit}".rstrip() for label, value, unit in self.answers)


@dataclass(frozen=True)
class NotebookMemo:
    """What the memo of an executed notebook says, for its page and for its PDF.

    Parameters
    ----------
    title : str
        Title of the memo.
    source : str
        Name of the notebook.
    blocks : tuple of Block
        What the notebook holds, without its title.
    records : tuple of Bound
        The records that it carries.
    error : str
        What went wrong while it was executed.
    """

    title: str
    source: str
    blocks: tuple[Block, ...]
    records: tuple[Bound, ...]
    error: str = ""

    @cached_property
    def styled_body(self) -> tuple[str, dict[str, None]]:
        """Text and outputs as clean markup, and the style sheets that outputs carry."""
        styles: dict[str, None] = {}
        return "".join(_block(block, styles) for block in self.blocks if block.kind != "code"), styles

    @property
    def body(self) -> str:
        """Text and outputs as clean markup."""
        return self.styled_body[0]

    @property
    def code(self) -> list[Block]:
        """The cells that were executed."""
        return [block for block in self.blocks if block.kind == "code"]

    @property
    def failure(self) -> str:
        """What went wrong as a paragraph; empty where nothing did."""
        return f'<p class="failure">The notebook stopped: {html.escape(self.error)}</p>' if self.error else ""

    @property
    def facts(self) -> list[tuple[str, str]]:
        """The facts of the title block, from the last record."""
        return [("notebook", self.source), *_facts_of(self.records)]


def notebook_page(memo: NotebookMemo) -> str:
    """Return the memo of an executed notebook as a whole page."""
    body, styles = memo.styled_body
    parts = [
        title_block(memo.title, memo.facts),
        memo.failure,
        summary(memo.records),
        f'<main class="narrative">{body}</main>',
        record_section(memo.records, "This page"),
        cautions(CAUTIONS),
        _code_appendix(memo.code),
        "".join(record_template(bound.record) for bound in memo.records),
    ]
    return whole_page(memo.title, "".join(parts), styles)


def whole_page(title: str, body: str, styles: Iterable[str] = ()) -> str:
    """Return a page of a body: language, character set, style sheets."""
    sheets = "\n".join((PAGE_STYLE, *styles, _printed_foot(title)))
    policy = "default-src 'none'; img-src data:; style-src 'unsafe-inline'"
    return (
        '<!doctype html>\n<html lang="en">\n<head>\n<meta charset="utf-8">\n'
        f'<meta http-equiv="Content-Security-Policy" content="{policy}">\n'
        '<meta name="viewport" content="width=device-width, initial-scale=1">\n'
        f'<meta name="generator" content="propkit">\n<title>{html.escape(title)}</title>\n<style>{sheets}</style>\n</head>\n'
        f"<body><article>{body}</article></body>\n</html>\n"
    )


def _printed_foot(title: str) -> str:
    """Return the rule that puts title and page number at the foot of printed pages."""
    shown = title if len(title) <= _LONGEST_FOOT else f"{title[: _LONGEST_FOOT - 1]}…"
    text = "".join(letter if letter == " " or (letter.isascii() and letter.isalnum()) else f"\\{ord(letter):x} " for letter in shown)
    look = "font:8pt sans-serif;color:#5d6b78"
    return f'@page{{@bottom-left{{content:"{text}";{look}}}@bottom-right{{content:"page " counter(page) " of " counter(pages);{look}}}}}'


def title_block(title: str, facts: Iterable[tuple[str, str]]) -> str:
    """Return the title block: title, then facts as pairs."""
    listed = "".join(f"<div><dt>{html.escape(name)}</dt><dd>{html.escape(value)}</dd></div>" for name, value in facts if value)
    return f'<header class="title-block"><h1>{html.escape(title)}</h1><dl>{listed}</dl></header>'


def _facts_of(records: Sequence[Bound]) -> list[tuple[str, str]]:
    if not records:
        return []
    last = records[-1].record
    content, provenance = last.content, last.provenance
    return [
        ("author", content["author"]),
        ("purpose", content["purpose"]),
        ("date", provenance["time"].replace("T", " ").replace("Z", " UTC")),
        ("computed with", f"propkit {provenance['versions']['propkit']}"),
        ("record", f"{last.digest[7:19]} ({last.digest[:6]}, first 12 digits)"),
    ]


def summary(records: Sequence[Bound]) -> str:
    """Return the answer that the analyst came for, from the last record."""
    if not records:
        return ""
    last = records[-1]
    shown = "".join(
        f'<p class="answer"><span>{html.escape(label)}</span> <b>{html.escape(value)}</b> <small>{html.escape(unit)}</small></p>'
        for label, value, unit in last.answers
    )
    return f'<section class="summary"><div class="answers">{shown}</div><p class="quiet">{html.escape(last.record.content["description"])}</p></section>'


def record_section(records: Sequence[Bound], carried_by: str) -> str:
    """Return the records with their digests and what recomputing them gave; `carried_by` says where they are."""
    if not records:
        return "<section><h2>Records</h2><p>This notebook shows no object that carries a record.</p></section>"
    rows = "".join(
        f"<tr><td>{html.escape(bound.record.title)}</td><td class='digest'>{bound.record.digest[7:]}</td>"
        f"<td>{html.escape(bound.verification.status)}, {len(bound.verification.leaves)} values</td></tr>"
        for bound in records
    )
    return (
        "<section><h2>Records</h2><p>Each record was recomputed from its inputs when this memo was written, and compared value by value. "
        f"{html.escape(carried_by)} carries them: <code>propkit verify</code> on it does the same again.</p>"
        f'<table class="records"><thead><tr><th>record</th><th>SHA-256</th><th>outcome</th></tr></thead><tbody>{rows}</tbody></table></section>'
    )


def cautions(lines: Iterable[str]) -> str:
    """Return the cautions."""
    listed = "".join(f"<li>{html.escape(line)}</li>" for line in lines)
    return f'<section class="cautions"><h2>Cautions</h2><ul>{listed}</ul></section>'


def _code_appendix(code: Sequence[Block]) -> str:
    if not code:
        return ""
    cells = "".join(f'<div class="cell"><span class="number">{block.cell}</span>{highlighted(block.text)}</div>' for block in code)
    return f'<section class="appendix"><h2>Code</h2><p class="quiet">What was executed, in this order.</p>{cells}</section>'


def highlighted(code: str) -> str:
    """Return Python code with its comments, names and texts told apart."""
    try:
        from pygments import highlight  # type: ignore[import-untyped, unused-ignore]
        from pygments.formatters import HtmlFormatter  # type: ignore[import-untyped, unused-ignore]
        from pygments.lexers import PythonLexer  # type: ignore[import-untyped, unused-ignore]
    except ImportError:
        return f"<pre>{html.escape(code)}</pre>"
    made: str = highlight(code, PythonLexer(), HtmlFormatter(nowrap=True))
    return f"<pre>{made}</pre>"


def _block(block: Block, styles: dict[str, None]) -> str:
    if block.kind == "markdown":
        return f'<div class="prose">{markdown_html(block.text)}</div>'
    if block.kind == "html":
        text, sheets = clean(block.text)
        styles.update(dict.fromkeys(sheets))
        return f'<div class="output">{text}</div>'
    if block.kind == "picture":
        return f'<div class="output">{_picture(block)}</div>'
    if block.kind == "error":
        return f'<p class="failure">{html.escape(block.text)}</p>'
    return f'<div class="output"><pre class="printed">{html.escape(block.text)}</pre></div>'


def _picture(block: Block) -> str:
    data = base64.b64encode(block.text.encode()).decode() if block.media == "image/svg+xml" else re.sub(r"[^A-Za-z0-9+/=]", "", block.text)
    return f'<img alt="figure of cell {block.cell}" src="data:{block.media};base64,{data}">'


def markdown_html(text: str) -> str:
    """Return Markdown as clean HTML with its equations as pictures."""
    import mistune

    marked, found = equations.take_out(text)
    render = mistune.create_markdown(escape=False, plugins=["table", "strikethrough", "footnotes", "def_list"])
    made, _ = clean(str(render(marked)))
    return equations.put_back(made, found)
