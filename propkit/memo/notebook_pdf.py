"""The memo of an executed notebook as PDF: its text, sheets, tables and pictures, then records, cautions and code."""

from __future__ import annotations

from datetime import UTC, datetime
from html import escape

from propkit.memo.page import NotebookMemo, cautions, record_section
from propkit.memo.pdf import compiled
from propkit.record.build import CAUTIONS
from propkit.record.canonical import text_digest

_EPOCH = datetime(2000, 1, 1, tzinfo=UTC)


def notebook_pdf(memo: NotebookMemo, paper: str = "a4") -> bytes:
    """Return the memo of an executed notebook as the bytes of a PDF file.

    Parameters
    ----------
    memo : NotebookMemo
        What it says.
    paper : {"a4", "letter"}
        Size of the sheets.

    Raises
    ------
    RecordError
        When the content cannot be set.
    MissingExtraError
        Without the typst package.
    """
    code = "".join(f"<p class='caption'>cell {block.cell}</p><pre>{escape(block.text)}</pre>" for block in memo.code)
    parts = [
        memo.failure,
        memo.body,
        record_section(memo.records, "The page of HTML beside this document"),
        cautions(CAUTIONS),
        f"<h2>Code</h2>{code}" if code else "",
    ]
    last = memo.records[-1].record if memo.records else None
    return compiled(
        memo.title,
        "".join(parts),
        author=last.content["author"] if last else "",
        date=last.provenance["time"] if last else _EPOCH.strftime("%Y-%m-%dT%H:%M:%SZ"),
        digest=last.digest if last else text_digest("".join(block.text for block in memo.blocks)),
        facts=memo.facts,
        answers=memo.records[-1].answers if memo.records else (),
        footer=f"{memo.source} · {f'record {last.digest[:27]}… · ' if last else ''}preliminary analysis, not a release of hardware",
        paper=paper,
    )
