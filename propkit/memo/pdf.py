"""PDF by Typst: offline, with propkit's own template and font, PDF/A-2b, the same bytes for the same content."""

from __future__ import annotations

import json
from collections.abc import Sequence
from datetime import UTC, datetime

from propkit.errors import MissingExtraError, RecordError
from propkit.memo.letters import set_whole
from propkit.memo.typeset import shown, typeset_blocks

_PAPERS = {"a4": "a4", "letter": "us-letter"}


def compiled(
    title: str,
    markup: str,
    *,
    author: str,
    date: str,
    digest: str,
    facts: Sequence[tuple[str, str]],
    answers: Sequence[tuple[str, str, str]] = (),
    footer: str,
    paper: str = "a4",
) -> bytes:
    """Return a memo as the bytes of a PDF file.

    Parameters
    ----------
    title, author, date, digest : str
        Title block and document properties; `date` is ``2026-01-31T12:00:00Z``.
    markup : str
        Body as clean HTML.
    facts : sequence of (str, str)
        Lines of the title block.
    answers : sequence of (label, value, unit)
        The headline.
    footer : str
        Text at the foot of every page.
    paper : str
        ``"a4"`` or ``"letter"``.

    Raises
    ------
    MissingExtraError
        Without the typst package.
    RecordError
        When the content cannot be set.
    """
    try:
        import typst
    except ImportError:
        raise MissingExtraError("typst", "memo", "a PDF memo") from None
    stamp = datetime.strptime(date, "%Y-%m-%dT%H:%M:%SZ").replace(tzinfo=UTC)
    data = {
        "title": shown(title),
        "author": shown(author),
        "date": date[:10],
        "digest": digest,
        "facts": [[name, shown(value)] for name, value in facts if value],
        "answers": [{"label": label, "value": value, "unit": unit} for label, value, unit in answers],
        "footer": shown(footer),
        "paper": _PAPERS[paper],
        "blocks": typeset_blocks(markup),
    }
    try:
        made = set_whole(json.dumps(data, ensure_ascii=False), stamp)
    except typst.TypstError as error:
        raise RecordError(f"the memo cannot be set as PDF: {str(error).splitlines()[0][:300]}") from None
    return made
