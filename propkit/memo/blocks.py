"""An executed notebook as a list of blocks: what the HTML memo and the PDF memo are both set from."""

from __future__ import annotations

import re
from collections.abc import Iterator, Mapping
from dataclasses import dataclass, field
from typing import Any, Literal

from propkit.record.build import printable

BlockKind = Literal["markdown", "code", "html", "text", "picture", "error"]

_ANSI = re.compile(r"\x1b\[[0-9;?]*[ -/]*[@-~]|\x1b[@-_]")
_LIVE_FIGURE = re.compile(r"(figure|Figure|GridPlot|Row|Column)\(id\s*=")
_LEFT_OUT = ("application/vnd.jupyter.widget-view+json", "application/vnd.bokehjs_load.v0+json")
_SHOWN_LIVE = "application/vnd.bokehjs_exec.v0+json"
_PICTURES = ("image/svg+xml", "image/png", "image/jpeg")
_MARKED = re.compile(r"(?<![\\\w])(\*\*|__|[*_`$])(?=\S)(.+?)(?<=\S)\1(?!\w)")
_ESCAPED = re.compile(r"\\([\\`*_$#+.!(){}\[\]-])")
_LONGEST_TEXT = 200_000


@dataclass(frozen=True, slots=True)
class Block:
    """One block: Markdown, the code of a cell, or one output of it.

    Parameters
    ----------
    kind : str
        ``markdown``, ``code``, ``html``, ``text``, ``picture`` (`text` is base64, or SVG) or ``error``.
    text : str
        The content.
    cell : int
        Number of the code cell it belongs to, from 1; 0 for Markdown.
    media : str
        Media type of a picture.
    others : mapping
        The same output in other media types.
    """

    kind: BlockKind
    text: str
    cell: int = 0
    media: str = ""
    others: Mapping[str, Any] = field(default_factory=dict)


def blocks_of(notebook: Mapping[str, Any]) -> Iterator[Block]:
    """Yield the blocks of a notebook; widget views, widget state and scripts are left out."""
    number = 0
    for cell in notebook["cells"]:
        source = as_text(cell.get("source", ""))
        if cell.get("cell_type") == "markdown":
            yield Block("markdown", source)
        elif cell.get("cell_type") == "code" and source.strip():
            number += 1
            yield Block("code", source.rstrip(), number)
            yield from _outputs(cell.get("outputs", []), number)


def as_text(value: Any) -> str:
    """Return a text that a notebook may hold as a list of lines."""
    return "".join(str(line) for line in value) if isinstance(value, list) else str(value)


def _outputs(outputs: Any, number: int) -> Iterator[Block]:
    stream: list[str] = []
    for output in outputs:
        kind = output.get("output_type")
        if kind == "stream":
            stream.append(as_text(output.get("text", "")))
            continue
        if stream:
            yield Block("text", plain_text("".join(stream)), number)
            stream = []
        if kind == "error":
            yield Block("error", f"{output.get('ename', 'error')}: {output.get('evalue', '')}"[:4000], number)
        elif kind in ("execute_result", "display_data"):
            yield from _displayed(output.get("data", {}), number)
    if stream:
        yield Block("text", plain_text("".join(stream)), number)


def _displayed(data: Mapping[str, Any], number: int) -> Iterator[Block]:
    if any(media in data for media in _LEFT_OUT):
        return
    if _SHOWN_LIVE in data or _LIVE_FIGURE.match(as_text(data.get("text/plain", ""))):
        yield Block(
            "markdown", "*A live figure stands here in the notebook; shown by itself, without show(), it leaves its drawing.*", number
        )
        return
    if "text/html" in data:
        yield Block("html", as_text(data["text/html"]), number, others=data)
        return
    for media in _PICTURES:
        if media in data:
            yield Block("picture", as_text(data[media]), number, media=media)
            return
    for media in ("text/markdown", "text/latex", "text/plain"):
        if media in data and media == "text/markdown":
            yield Block("markdown", as_text(data[media]), number)
            return
        if media in data:
            yield Block("text", plain_text(as_text(data[media])), number)
            return


def plain_text(text: str) -> str:
    """Return a text as a terminal would show it: without escape sequences, carriage returns resolved."""
    text = _ANSI.sub("", text[:_LONGEST_TEXT])
    lines = [line.rstrip("\r").rpartition("\r")[2] for line in text.split("\n")]
    return "".join(character for character in "\n".join(lines).rstrip() if printable(character))


def title_of(blocks: list[Block], fallback: str) -> str:
    """Return the first heading of the notebook in plain text, or `fallback`."""
    for block in blocks:
        if block.kind == "markdown":
            match = re.search(r"^#\s+(.+?)\s*#*\s*$", block.text, re.MULTILINE)
            if match:
                return _ESCAPED.sub(r"\1", _MARKED.sub(r"\2", match.group(1)))
    return fallback


def without_title(blocks: list[Block]) -> list[Block]:
    """Return the blocks without the first heading, which stands in the title block of the memo."""
    made: list[Block] = []
    removed = False
    for block in blocks:
        if block.kind == "markdown" and not removed:
            text, count = re.subn(r"^#\s+.+$", "", block.text, count=1, flags=re.MULTILINE)
            removed = count > 0
            block = Block("markdown", text.strip(), block.cell)
        if block.text.strip():
            made.append(block)
    return made
