"""Equations as pictures: LaTeX set as SVG by ziamath, so that no script and no network is needed."""

from __future__ import annotations

import base64
import html
import re

from propkit.view.equations import svg_of

_PATTERN = re.compile(
    r"(?P<code>```.*?```|~~~.*?~~~|`[^`\n]+`)"
    r"|\$\$(?P<block>.+?)\$\$"
    r"|\\\[(?P<block2>.+?)\\\]"
    r"|(?<![\\$\w])\$(?!\s)(?P<line>[^$\n]+?)(?<![\s\\])\$(?!\d)",
    re.DOTALL,
)

_BOX = re.compile(r'viewBox="\S+ (\S+) \S+ (\S+)"')
_LONGEST = 2000


def image_of(latex: str, inline: bool = False) -> str:
    """Return an equation as an ``img`` element with its source as the alternative text, or the source as code."""
    text = latex.strip()
    shown = html.escape(text)
    found = svg_of(text) if text and len(text) <= _LONGEST else None
    if found is None:
        return f"<code>{shown}</code>"
    data = base64.b64encode(found.encode()).decode()
    box = _BOX.search(found)
    depth = float(box[1]) + float(box[2]) if box is not None else 0.0
    style = f' style="vertical-align:{-depth:.2f}px"' if inline else ""
    picture = f'<img class="equation" alt="{shown}"{style} src="data:image/svg+xml;base64,{data}">'
    return picture if inline else f'<div class="display">{picture}</div>'


def take_out(markdown: str) -> tuple[str, list[tuple[str, bool]]]:
    """Return Markdown with a mark in place of each equation, and the equations as LaTeX and whether inline."""
    found: list[tuple[str, bool]] = []

    def mark(match: re.Match[str]) -> str:
        if match.group("code"):
            return match.group("code")
        block = match.group("block") or match.group("block2")
        found.append((block or match.group("line"), block is None))
        text = f"propkitequation{len(found) - 1}mark"
        return f"\n\n{text}\n\n" if block is not None and match.start() == 0 else text

    return _PATTERN.sub(mark, markdown), found


def put_back(page: str, equations: list[tuple[str, bool]]) -> str:
    """Return a page with a picture in place of each mark."""

    def picture(match: re.Match[str]) -> str:
        place = int(match.group(1))
        return image_of(*equations[place]) if place < len(equations) else match.group()

    return re.sub(r"propkitequation(\d{1,6})mark", picture, page)
