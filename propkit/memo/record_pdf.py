"""The memo of one record as PDF."""

from __future__ import annotations

from propkit.memo import markup
from propkit.memo.chapters import Material, chapters
from propkit.memo.pdf import compiled
from propkit.record.record import Record
from propkit.view import cells


def record_pdf(record: Record, paper: str = "a4") -> bytes:
    """Return the memo of a record as the bytes of a PDF file; the same record gives the same bytes.

    Parameters
    ----------
    record : Record
        The record.
    paper : {"a4", "letter"}
        Size of the sheets.

    Raises
    ------
    RecordError
        When the record does not verify.
    MissingExtraError
        Without the typst package.
    """
    material = Material(record)
    body = "".join(f"<h2>{number}. {title}</h2>{text}" for number, (title, text) in enumerate(chapters(material), 1))
    answers = [
        (row.label, f"{markup.value_text(row)}{markup.uncertainty(row)}", cells.unit_text(row.unit)) for row in material.last.headline
    ]
    return compiled(
        record.title,
        body,
        author=material.content["author"],
        date=record.provenance["time"],
        digest=record.digest,
        facts=material.facts(),
        answers=answers,
        footer=f"record {record.digest[:27]}… · preliminary analysis, not a release of hardware",
        paper=paper,
    )
