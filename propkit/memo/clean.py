"""HTML from a notebook, made safe to keep: no scripts, no network loads, only elements that set text, tables and pictures."""

from __future__ import annotations

import html
import re
from html.parser import HTMLParser

_KEPT = frozenset(
    [
        "a",
        "abbr",
        "article",
        "aside",
        "b",
        "blockquote",
        "br",
        "caption",
        "cite",
        "code",
        "col",
        "colgroup",
        "dd",
        "del",
        "details",
        "dfn",
        "div",
        "dl",
        "dt",
        "em",
        "figcaption",
        "figure",
        "h1",
        "h2",
        "h3",
        "h4",
        "h5",
        "h6",
        "hr",
        "i",
        "img",
        "ins",
        "kbd",
        "li",
        "mark",
        "ol",
        "p",
        "pre",
        "q",
        "s",
        "samp",
        "section",
        "small",
        "span",
        "strong",
        "sub",
        "summary",
        "sup",
        "table",
        "tbody",
        "td",
        "tfoot",
        "th",
        "thead",
        "tr",
        "u",
        "ul",
        "var",
    ]
)
_VOID = frozenset(("br", "hr", "img", "col"))
_DROPPED_WHOLE = frozenset(
    ("script", "iframe", "object", "embed", "noscript", "template", "textarea", "title", "select", "svg", "math", "video", "audio", "head")
)
_ATTRIBUTES = frozenset(
    [
        "align",
        "alt",
        "aria-hidden",
        "aria-label",
        "class",
        "colspan",
        "dir",
        "headers",
        "height",
        "href",
        "id",
        "lang",
        "open",
        "role",
        "rowspan",
        "scope",
        "span",
        "src",
        "start",
        "style",
        "title",
        "type",
        "value",
        "width",
    ]
)
_LINK = re.compile(r"(https?://|mailto:|#)", re.IGNORECASE)
_PICTURE = re.compile(r"data:image/(png|jpeg|gif|webp|svg\+xml);base64,[A-Za-z0-9+/=\s]*", re.IGNORECASE)
_RISKY_STYLE = re.compile(r"@import|@charset|@namespace|expression\s*\(|behavio[u]?r\s*:|-moz-binding|javascript:|<|\\", re.IGNORECASE)
_URL = re.compile(r"(?:url|image-set|image|src)\s*\(\s*(?!['\"]?data:image/)", re.IGNORECASE)


class _Cleaner(HTMLParser):
    """Parser that writes back what is allowed."""

    def __init__(self) -> None:
        super().__init__(convert_charrefs=True)
        self.parts: list[str] = []
        self.styles: list[str] = []
        self._open: list[str] = []
        self._skipping = ""
        self._depth = 0
        self._style: list[str] | None = None

    def handle_starttag(self, tag: str, attributes: list[tuple[str, str | None]]) -> None:
        if self._skipping:
            self._depth += tag == self._skipping
        elif tag == "style":
            self._style = []
        elif tag in _DROPPED_WHOLE:
            self._skipping, self._depth = tag, 1
        elif tag in _KEPT:
            self.parts.append(f"<{tag}{''.join(_attribute(tag, name, value or '') for name, value in attributes)}>")
            if tag not in _VOID:
                self._open.append(tag)

    def handle_startendtag(self, tag: str, attributes: list[tuple[str, str | None]]) -> None:
        if tag in _VOID:
            self.handle_starttag(tag, attributes)
        elif tag in _KEPT and not self._skipping:
            self.handle_starttag(tag, attributes)
            self.handle_endtag(tag)

    def handle_endtag(self, tag: str) -> None:
        if self._skipping:
            self._depth -= tag == self._skipping
            if self._depth <= 0:
                self._skipping = ""
        elif tag == "style" and self._style is not None:
            sheet = "".join(self._style)
            if not _RISKY_STYLE.search(sheet) and not _URL.search(sheet):
                self.styles.append(sheet)
            self._style = None
        elif tag in self._open:
            while self._open:
                closed = self._open.pop()
                self.parts.append(f"</{closed}>")
                if closed == tag:
                    break

    def handle_data(self, data: str) -> None:
        if self._style is not None:
            self._style.append(data)
        elif not self._skipping:
            self.parts.append(html.escape(data, quote=False))

    def finish(self) -> str:
        self.close()
        while self._open:
            self.parts.append(f"</{self._open.pop()}>")
        return "".join(self.parts)


def _attribute(tag: str, name: str, value: str) -> str:
    if name not in _ATTRIBUTES:
        return ""
    if name == "href" and not (tag == "a" and _LINK.match(value.strip())):
        return ""
    if name == "src" and not (tag == "img" and _PICTURE.fullmatch(value.strip())):
        return ""
    if name == "style" and (_RISKY_STYLE.search(value) or _URL.search(value)):
        return ""
    return f' {name}="{html.escape(value)}"'


def clean(text: str) -> tuple[str, list[str]]:
    """Return HTML reduced to what a memo may hold, and the style sheets that it carried.

    Parameters
    ----------
    text : str
        HTML, from anywhere.

    Returns
    -------
    str, list of str
        HTML without scripts, handlers, frames, forms and loads from outside, every element closed; style sheets without loads.
    """
    cleaner = _Cleaner()
    cleaner.feed(text)
    return cleaner.finish(), cleaner.styles
