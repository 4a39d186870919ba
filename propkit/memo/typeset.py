"""Clean memo markup as neutral blocks that the Typst template sets: plain data, never Typst source."""

from __future__ import annotations

import base64
import re
from html.parser import HTMLParser
from typing import Any

from propkit.record.build import printable

_INLINE = {
    "b": "b",
    "strong": "b",
    "em": "i",
    "i": "i",
    "code": "c",
    "sub": "_",
    "sup": "^",
    "small": "q",
    "var": "i",
    "cite": "i",
    "kbd": "c",
    "samp": "c",
}
_BLOCKS = frozenset(
    (
        "p",
        "div",
        "section",
        "header",
        "main",
        "article",
        "aside",
        "figure",
        "figcaption",
        "blockquote",
        "li",
        "dt",
        "dd",
        "dl",
        "caption",
        "details",
        "summary",
    )
)
_SIDE_BY_SIDE = {"figures": False, "propkit-body": False, "propkit-answers": True, "answers": True}
"""Class of an element whose children stand side by side -> whether its columns are only as wide as they need."""
_KEPT_WHOLE = frozenset(("formula", "cautions"))
"""Classes of elements that stay on one page."""
_DATA = re.compile(r"data:image/(png|jpeg|gif|webp|svg\+xml);base64,(.*)", re.DOTALL)
_SIZE = re.compile(r'<svg[^>]*?\bwidth="([0-9.]+)(?:px|pt)?"[^>]*?\bheight="([0-9.]+)(?:px|pt)?"', re.DOTALL)
_FONT = re.compile(r"""font-family\s*([:=])\s*(["'])?[^"';>]*(["'])?""")
_INDENT = re.compile(r"padding-left:\s*([0-9.]+)em")
_NUMBER = re.compile(r"[-+\u2212]?[0-9][0-9 ,_.\u2007\u202f]*(?:[eE][-+]?[0-9]+)?|NaN|None|[-+]?inf|True|False|<NA>|NaT")
_SHORT = 400
_BOLD = 1.1
_DIGEST = re.compile(r"([0-9a-f]{32})([0-9a-f]{32})")
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
        self.starts: list[int] = []

    # -- the walk -------------------------------------------------------------------------------

    def handle_starttag(self, tag: str, attributes: list[tuple[str, str | None]]) -> None:
        known = {name: value or "" for name, value in attributes}
        kind = known.get("class", "")
        if tag == "b" and self.classes and self.classes[-1].endswith("answer"):
            self._text("\n")
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
            if kind == "digest":
                self.cell["digest"] = True
            if (indent := _INDENT.search(known.get("style", ""))) is not None:
                self.cell["indent"] = float(indent.group(1))
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
            self.starts.append(len(self.blocks))

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
            if self.classes:
                self._close_block(self.classes.pop(), self.starts.pop())

    def handle_data(self, data: str) -> None:
        self._text(data if self.printed else re.sub(r"[ \t\r\n]+", " ", data))

    def _close_block(self, kind: str, start: int) -> None:
        """Gather what an element held: a column where its parent sets columns, or the columns that it sets itself."""
        inside = self.blocks[start:]
        if inside and _KEPT_WHOLE & set(kind.split()):
            inside = self.blocks[start:] = [{"kind": "whole", "blocks": inside}]
        outer, own = _sides(self.classes[-1]) if self.classes else None, _sides(kind)
        if inside and outer is not None:
            self.blocks[start:] = [{"kind": "column", "blocks": inside}]
        elif inside and own is not None:
            columns = [block["blocks"] if block["kind"] == "column" else [block] for block in inside]
            self.blocks[start:] = [{"kind": "columns", "narrow": own, "items": columns}]

    # -- what is collected ----------------------------------------------------------------------

    def _target(self) -> list[Run]:
        return self.cell["runs"] if self.cell is not None else self.runs

    def _text(self, text: str) -> None:
        if self.table is not None and self.cell is None and not text.strip():
            return
        text = shown(text)
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
        run: Run = {"alt": shown(known.get("alt", "")), "format": {"svg+xml": "svg", "jpeg": "jpg"}.get(match.group(1), match.group(1))}
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
            if self.cell.pop("digest", False) and self.cell["runs"] and "t" in self.cell["runs"][0]:
                self.cell["runs"][0]["t"] = _DIGEST.sub(r"\1\n\2", self.cell["runs"][0]["t"])
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


def shown(text: str) -> str:
    """Return a text without control characters, which no font has."""
    return "".join(filter(printable, text))


def _sides(kind: str) -> bool | None:
    """Return whether the columns that an element of these classes sets are narrow; None where it sets none."""
    return next((_SIDE_BY_SIDE[part] for part in kind.split() if part in _SIDE_BY_SIDE), None)


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
    _finish(reader.blocks)
    return reader.blocks


def _finish(blocks: list[Block]) -> None:
    """Make every table square, set drawings that follow each other side by side, and keep a short text with the table that it leads to."""
    _gather_drawings(blocks)
    for block, following in zip(blocks, [*blocks[1:], {"kind": ""}], strict=True):
        if block["kind"] == "text" and following["kind"] in ("table", "heading" if _is_legend(block) else ""):
            block["leads"] = sum(len(run.get("t", "")) for run in block["runs"]) <= _SHORT
        if block["kind"] == "table":
            _square(block)
        for inside in block.get("items", ()) if block["kind"] in ("columns", "list") else ():
            _finish(inside)
        if block["kind"] == "whole":
            _finish(block["blocks"])


def _is_legend(block: Block) -> bool:
    return "quiet" in block["class"]


def _gather_drawings(blocks: list[Block]) -> None:
    place = 0
    while place < len(blocks):
        end = place
        while end < len(blocks) and blocks[end]["kind"] == "picture" and not blocks[end]["equation"]:
            end += 1
        if end - place > 1:
            blocks[place:end] = [{"kind": "gallery", "pictures": blocks[place:end]}]
        place += 1


def _square(table: Block) -> None:
    """Give every row as many columns as the widest, so that the template sets a grid."""
    rows = [*table["head"], *table["rows"]]
    widest = max(sum(cell["span"] for cell in row) for row in rows)
    for row in rows:
        lacking = widest - sum(cell["span"] for cell in row)
        row += [{"runs": [], "number": False, "head": row[-1]["head"], "span": 1} for _ in range(lacking)]
    table["columns"] = widest
    table["numbers"] = [False] * widest
    if "dataframe" in table["class"].split():
        _find_numbers(table)
    table["demand"] = sum(max((_longest_word(cell) for cell in column), default=0.0) for column in _columns(rows, widest))
    for row in table["rows"]:
        place = 0
        for cell in row:
            if cell["number"]:
                table["numbers"][place] = True
            place += cell["span"]
    for place in range(widest):
        if table["numbers"][place] and all(sum(cell["span"] for cell in row) == len(row) for row in table["rows"]):
            _align([row[place]["runs"] for row in table["rows"]])


def _columns(rows: list[list[Block]], count: int) -> list[list[Block]]:
    """Return the cells of each column of a square table, those that span several left out."""
    made: list[list[Block]] = [[] for _ in range(count)]
    for row in rows:
        place = 0
        for cell in row:
            if cell["span"] == 1:
                made[place].append(cell)
            place += cell["span"]
    return made


def _longest_word(cell: Block) -> float:
    """Return how many letters wide the widest part of a cell is that no line break divides; a number is one part."""
    text = "".join(run.get("t", "\u2003" if "width" not in run else "m" * round(run["width"] / 8)) for run in cell["runs"])
    parts = text.split("\n") if cell["number"] else text.split()
    return max((len(part) for part in parts), default=0) * (_BOLD if cell["head"] else 1.0)


def _find_numbers(table: Block) -> None:
    """Mark the columns of a data frame that hold numbers and nothing else, heads included."""
    plain = [row for row in table["rows"] if all(cell["span"] == 1 for cell in row)]
    for place in range(1, table["columns"]):
        texts = ["".join(run.get("t", "") for run in row[place]["runs"]).strip() for row in plain]
        if any(texts) and all(_NUMBER.fullmatch(text) for text in texts if text):
            for row in plain:
                row[place]["number"] = True


def _align(column: list[list[Run]]) -> None:
    """Pad plain numbers behind with figure spaces, so that right alignment puts their decimal signs under each other."""
    texts = ["".join(run.get("t", "") for run in runs) for runs in column]
    if any("\u2007" in text or "×" in text for text in texts):
        return
    tails = [len(text.partition(".")[2]) if "." in text else -1 for text in texts]
    widest = max(tails, default=-1)
    for runs, tail in zip(column, tails, strict=True):
        if runs and widest >= 0 and tail < widest:
            runs.append({"t": ("\u2008" if tail < 0 else "") + "\u2007" * (widest - max(tail, 0)), "s": ""})
