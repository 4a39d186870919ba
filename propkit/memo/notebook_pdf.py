"""The memo of an executed notebook as PDF: its text, sheets, tables and pictures, then records, cautions and code."""

from __future__ import annotations

from collections.abc import Sequence
from datetime import UTC, datetime
from html import escape

from propkit.memo.blocks import Block
from propkit.memo.page import Bound, body_of, cautions, facts_of, record_section
from propkit.memo.pdf import compiled
from propkit.record.build import CAUTIONS
from propkit.record.canonical import text_digest

_EPOCH = datetime(2000, 1, 1, tzinfo=UTC)


def notebook_pdf(title: str, source: str, blocks: Sequence[Block], records: Sequence[Bound], error: str = "") -> bytes:
    """Return the memo of an executed notebook as the bytes of a PDF file.

    Parameters
    ----------
    title : str
        Title of the memo.
    source : str
        Name of the notebook.
    blocks : sequence of Block
        What the notebook holds.
    records : sequence of Bound
        The records that it carries.
    error : str
        What went wrong while it was executed.

    Raises
    ------
    RecordError
        When the content cannot be set.
    MissingExtraError
        Without the typst package.
    """
    styles: dict[str, None] = {}
    body = body_of(blocks, styles)
    code = "".join(f"<p class='caption'>cell {block.cell}</p><pre>{escape(block.text)}</pre>" for block in blocks if block.kind == "code")
    parts = [
        f"<p class='failure'>The notebook stopped: {escape(error)}</p>" if error else "",
        body,
        record_section(records),
        cautions(CAUTIONS),
        f"<h2>Code</h2>{code}" if code else "",
    ]
    last = records[-1].record if records else None
    digest = last.digest if last else text_digest("".join(block.text for block in blocks))
    return compiled(
        title,
        "".join(parts),
        author=last.content["author"] if last else "",
        date=last.provenance["time"] if last else _EPOCH.strftime("%Y-%m-%dT%H:%M:%SZ"),
        digest=digest,
        facts=[("notebook", source), *facts_of(records)],
        answers=records[-1].answers if records else (),
        footer=f"{source} · {f'record {digest[:27]}… · ' if last else ''}preliminary analysis, not a release of hardware",
    )
