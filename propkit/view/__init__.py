"""From a neutral report to what a person reads: text, HTML, Markdown, LaTeX; drawings as SVG."""

from __future__ import annotations

import importlib

from propkit.errors import InputError
from propkit.report import Report

MEDIA = ("text", "html", "markdown", "latex")


def render(report: Report, medium: str) -> str:
    """Return the report in a medium.

    Raises
    ------
    InputError
        For a medium that is not in `MEDIA`.
    """
    if medium not in MEDIA:
        raise InputError(f"a report can be shown as {', '.join(MEDIA)}, not {medium!r}")
    rendered: str = importlib.import_module(f"propkit.view.{medium}").render(report)
    return rendered
