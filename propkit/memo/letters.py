"""The template compiled with a font for every letter: propkit's own, else those of this computer, else a box in its place.

PDF/A asks for a glyph for every letter. With propkit's own font the same memo gives the same bytes everywhere; a text in another script
takes the fonts that the computer has, and a letter that none of them has is shown as a box, so that a memo can always be made.
"""

from __future__ import annotations

import re
import warnings
from datetime import datetime
from importlib import resources
from typing import Any

BOX = "\u25a1"
_LACKING = re.compile(r"the text `\"(.+?)\"` could not be displayed", re.DOTALL)
_FIRST_DOUBTFUL = "\u0250"
_MOST_TRIED = 300
_SPECIMEN = '#set text(font: ("Propkit Sans", "New Computer Modern Math", "DejaVu Sans Mono"))\n#sys.inputs.memo'


def set_whole(memo: str, stamp: datetime) -> bytes:
    """Return the PDF of a memo.

    Parameters
    ----------
    memo : str
        What the template sets, as JSON.
    stamp : datetime
        Time of the document.

    Raises
    ------
    typst.TypstError
        When the content cannot be set for another reason than a lacking letter.
    """
    import typst

    template = resources.files("propkit.memo").joinpath("memo.typ").read_text(encoding="utf-8")
    try:
        return _compiled(template, memo, stamp, own_fonts=True)
    except typst.TypstError as error:
        if _LACKING.search(str(error)) is None:
            raise
    lacking = _lacking(memo, stamp)
    return _compiled(template, memo.translate(dict.fromkeys(map(ord, lacking), BOX)), stamp, own_fonts=False)


def _lacking(memo: str, stamp: datetime) -> set[str]:
    """Return the letters of a text that no font here has."""
    import typst

    doubtful = {letter for letter in memo if letter >= _FIRST_DOUBTFUL}
    lacking: set[str] = set()
    for _ in range(_MOST_TRIED):
        left = "\n".join(sorted(doubtful - lacking))
        try:
            _compiled(_SPECIMEN, left, stamp, own_fonts=False)
        except typst.TypstError as error:
            match = _LACKING.search(str(error))
            if match is None:
                raise
            lacking |= set(match.group(1)) & doubtful
        else:
            return lacking
    return doubtful


def _compiled(source: str, memo: str, stamp: datetime, own_fonts: bool) -> bytes:
    import typst

    options: dict[str, Any] = {"ignore_system_fonts": own_fonts, "sys_inputs": {"memo": memo}, "timestamp": stamp}
    with resources.as_file(resources.files("propkit.memo").joinpath("fonts")) as fonts, warnings.catch_warnings():
        warnings.simplefilter("ignore")
        made: bytes = typst.compile(source.encode(), font_paths=[str(fonts)], format="pdf", pdf_standards=["a-2b"], **options)
    return made
