"""Panels: every object alive in a notebook, and still a calculation that a line of code reproduces."""

from __future__ import annotations

from typing import Any

from propkit.errors import MissingExtraError

__all__ = ["panel_of"]


def panel_of(calculation: Any) -> Any:
    """Return the panel of an object.

    Raises
    ------
    MissingExtraError
        When the packages of the ``notebook`` extra are not installed.
    """
    try:
        import anywidget
        import bokeh
        import ipywidgets
    except ImportError as error:
        raise MissingExtraError(error.name or "ipywidgets", "notebook", "a panel") from error
    del anywidget, bokeh, ipywidgets
    if calculation.kind in ("firing", "reconciliation"):
        from propkit.panels.analysis import FiringPanel, ReconciliationPanel

        return (FiringPanel if calculation.kind == "firing" else ReconciliationPanel)(calculation)
    from propkit.panels.panel import Panel

    return Panel(calculation)
