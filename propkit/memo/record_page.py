"""The memo of one record as an HTML page that carries the record itself."""

from __future__ import annotations

from propkit.memo import markup
from propkit.memo.chapters import Material, chapters
from propkit.memo.page import title_block, whole_page
from propkit.record.containers import record_template
from propkit.record.record import Record


def record_body(material: Material) -> str:
    """Return the body of the memo: title block, answer, chapters."""
    parts = [
        title_block(material.record.title, material.facts()),
        f'<section class="summary">{markup.answers(material.last.headline)}</section>',
    ]
    parts += [f"<section><h2>{number}. {title}</h2>{body}</section>" for number, (title, body) in enumerate(chapters(material), 1)]
    return "".join(parts)


def record_page(record: Record) -> bytes:
    """Return the memo of a record as the bytes of an HTML file.

    Raises
    ------
    RecordError
        When the record does not verify.
    """
    material = Material(record)
    return whole_page(record.title, record_body(material) + record_template(record)).encode()
