"""Clean memo markup as neutral blocks that the Typst template sets: plain data, never Typst source."""

from __future__ import annotations

import base64
import re
from html.parser import HTMLParser
from typing import Any

_INLINE = {"b": "b", "strong": "b", "em": "i", "i": "i", "code": "c", "sub": "_", "sup": "^", "small": "q", "var": "i", "cite": "i", "kbd": "c", "samp": "c"}
_BLOCKS = frozenset(("p", "div", "section", "header", "main", "article", "aside", "figure", "figcaption", "blockquote", "li", "dt", "dd", "dl", "caption", "details", "summary"))
_GROUPS = ("figures", "propkit-pic")
_DATA = re.compile(r"data:image/(png|jpeg|gif|webp|svg\+xml);base64,(.*)", re.DOTALL)
_SIZE = re.compile(r'<svg[^>]*?\bwidth="([0-9.]+)(?:px|pt)?"[^>]*?\bheight="([0-9.]+)(?:px|pt)?"', re.DOTALL)
_FONT = re.compile(r"""font-family\s*([:=])\s*(["'])?[^"';>]*(["'])?""")
_SHIFT = re.compile(r"vertical-align:\s*(-?[0-9.]+)px")

Run = dict[str, Any]
Block = dict[str, Any]


class _Reader(HTMLParser):
    """Collects blocks: headings, paragraphs, lists, tables, pictures, printed text."""

    def __init__(self) -> None:
        super().__init__(convert_charrefs=True)
        self.blocks: list[Block] = []
        self.runs: list[Run] = []
        self.styles: list[str] = []
        self.classes: list[str] = []
        self.lists: list[dict[str, Any]] = []
        self.table: Block | None = None
        self.row: list[Block] | None = None
        self.cell: Block | None = None
        self.heading = 0
        self.printed = False
        self.groups: list[int] = []

    # -- the walk -------------------------------------------------------------------------------

    def handle_starttag(self, tag: str, attributes: list[tuple[str, str | None]]) -> None:
        known = {name: value or "" for name, value in attributes}
        kind = known.get("class", "")
        if tag in _INLINE or tag == "span":
            self.styles.append(_INLINE.get(tag, "q" if _quiet(kind) else ""))
        elif tag == "br":
            self._text("\n")
        elif tag == "img":
            self._picture(known)
        elif tag == "pre":
            self._flush()
            self.printed = True
        elif tag in ("ul", "ol"):
            self._flush()
            self.lists.append({"kind": "list", "ordered": tag == "ol", "items": []})
        elif tag == "table":
            self._flush()
            self.table = {"kind": "table", "class": kind, "head": [], "rows": []}
        elif tag == "tr" and self.table is not None:
            self.row = []
        elif tag in ("td", "th") and self.row is not None:
            self._flush_cell()
            number = any(part in ("number", "propkit-n") for part in kind.split())
            self.cell = {"runs": [], "number": number, "head": tag == "th", "span": _span(known)}
            if known.get("class", "") in ("unit", "propkit-u", "quiet"):
                self.styles.append("q")
                self.cell["quiet"] = True
        elif re.fullmatch("h[1-6]", tag):
            self._flush()
            self.heading = int(tag[1])
        elif tag == "hr":
            self._flush()
            self.blocks.append({"kind": "rule"})
        elif tag in _BLOCKS:
            self._flush()
            self.classes.append("caption" if tag == "caption" else kind)
            if kind in _GROUPS:
                self.groups.append(len(self.blocks))

    def handle_startendtag(self, tag: str, attributes: list[tuple[str, str | None]]) -> None:
        self.handle_starttag(tag, attributes)

    def handle_endtag(self, tag: str) -> None:
        if (tag in _INLINE or tag == "span") and self.styles:
            self.styles.pop()
        elif tag == "pre":
            text = "".join(run["t"] for run in self.runs if "t" in run)
            self.runs = []
            self.printed = False
            self.blocks.append({"kind": "printed", "text": text.strip("\n")})
        elif tag in ("ul", "ol") and self.lists:
            self._flush()
            finished = self.lists.pop()
            if self.lists and self.lists[-1]["items"]:
                self.lists[-1]["items"][-1].append(finished)
            else:
                self.blocks.append(finished)
        elif tag in ("td", "th"):
            self._flush_cell()
        elif tag == "tr" and self.table is not None and self.row is not None:
            self._flush_cell()
            self._finish_row()
        elif tag == "table" and self.table is not None:
            if self.table["rows"] or self.table["head"]:
                self.blocks.append(self.table)
            self.table = None
        elif re.fullmatch("h[1-6]", tag):
            self._flush()
            self.heading = 0
        elif tag in _BLOCKS:
            self._flush()
            if self.classes and self.classes.pop() in _GROUPS and self.groups:
                self._gather(self.groups.pop())

    def handle_data(self, data: str) -> None:
        self._text(data if self.printed else re.sub(r"[ \t\r\n]+", " ", data))

    def _gather(self, start: int) -> None:
        """Set the pictures since `start` side by side."""
        inside = self.blocks[start:]
        if len(inside) > 1 and all(block["kind"] == "picture" for block in inside):
            self.blocks[start:] = [{"kind": "pictures", "items": inside}]

    # -- what is collected ----------------------------------------------------------------------

    def _target(self) -> list[Run]:
        return self.cell["runs"] if self.cell is not None else self.runs

    def _text(self, text: str) -> None:
        if self.table is not None and self.cell is None and not text.strip():
            return
        target = self._target()
        if not target and not text.strip(" "):
            return
        style = "".join(dict.fromkeys("".join(self.styles)))
        if target and target[-1].get("s") == style and "t" in target[-1]:
            target[-1]["t"] += text
        elif text:
            target.append({"t": text, "s": style})

    def _picture(self, known: dict[str, str]) -> None:
        match = _DATA.fullmatch(known.get("src", ""))
        if match is None:
            self._text(known.get("alt", ""))
            return
        try:
            data = base64.b64decode(match.group(2), validate=False)
        except ValueError:
            return
        run: Run = {"alt": known.get("alt", ""), "format": {"svg+xml": "svg", "jpeg": "jpg"}.get(match.group(1), match.group(1))}
        if run["format"] == "svg":
            text = data.decode("utf-8", "replace")
            size = _SIZE.search(text)
            run |= {"data": _FONT.sub(_own_font, text)}
            run |= {"width": float(size.group(1)), "height": float(size.group(2))} if size else {}
        else:
            run |= {"bytes": list(data)}
        shift = _SHIFT.search(known.get("style", ""))
        equation = "equation" in known.get("class", "") or any("propkit-eq" in kind for kind in self.classes)
        run["equation"] = equation
        if shift or self.cell is not None:
            run["shift"] = float(shift.group(1)) if shift else 0.0
            self._target().append(run)
        else:
            self._flush()
            self.blocks.append({"kind": "picture", **run})

    def _flush_cell(self) -> None:
        if self.cell is not None and self.row is not None:
            _trim(self.cell["runs"])
            if self.cell.pop("quiet", False) and self.styles:
                self.styles.pop()
            self.row.append(self.cell)
        self.cell = None

    def _finish_row(self) -> None:
        row, table = self.row or [], self.table
        self.row = None
        if table is None or not row:
            return
        head = all(cell["head"] for cell in row) and not table["rows"]
        (table["head"] if head else table["rows"]).append(row)

    def _flush(self) -> None:
        if self.printed or self.cell is not None:
            return
        runs, self.runs = self.runs, []
        _trim(runs)
        if not runs:
            return
        if self.heading:
            self.blocks.append({"kind": "heading", "level": self.heading, "runs": runs})
        elif self.lists:
            self.lists[-1]["items"].append([{"kind": "text", "runs": runs, "class": ""}])
        else:
            self.blocks.append({"kind": "text", "runs": runs, "class": " ".join(part for part in self.classes if part)})


def _quiet(kind: str) -> bool:
    return any(part in ("quiet", "propkit-u", "propkit-sub", "propkit-kind") for part in kind.split())


def _own_font(match: re.Match[str]) -> str:
    quote = match.group(2) or ""
    return f"font-family{match.group(1)}{quote}Propkit Sans{match.group(3) or ''}"


def _span(known: dict[str, str]) -> int:
    text = known.get("colspan", "1")
    return min(int(text), 50) if text.isdigit() and int(text) > 0 else 1


def _trim(runs: list[Run]) -> None:
    """Take blank text off both ends."""
    while runs and "t" in runs[0]:
        runs[0]["t"] = runs[0]["t"].lstrip(" \n")
        if runs[0]["t"]:
            break
        runs.pop(0)
    while runs and "t" in runs[-1]:
        runs[-1]["t"] = runs[-1]["t"].rstrip(" \n")
        if runs[-1]["t"]:
            break
        runs.pop()


def typeset_blocks(markup: str) -> list[Block]:
    """Return clean HTML as blocks for the template.

    Parameters
    ----------
    markup : str
        HTML as `propkit.memo.clean.clean` leaves it, or made by propkit.

    Returns
    -------
    list of dict
        Headings, texts, lists, tables, pictures and printed text as plain values.
    """
    reader = _Reader()
    reader.feed(markup)
    reader.close()
    reader._flush()
    for block in reader.blocks:
        if block["kind"] == "table":
            _square(block)
    return reader.blocks


def _square(table: Block) -> None:
    """Give every row as many columns as the widest, so that the template sets a grid."""
    rows = [*table["head"], *table["rows"]]
    widest = max(sum(cell["span"] for cell in row) for row in rows)
    for row in rows:
        lacking = widest - sum(cell["span"] for cell in row)
        row += [{"runs": [], "number": False, "head": row[-1]["head"], "span": 1} for _ in range(lacking)]
    table["columns"] = widest
    table["numbers"] = [False] * widest
    for row in table["rows"]:
        place = 0
        for cell in row:
            if cell["number"]:
                table["numbers"][place] = True
            place += cell["span"]
