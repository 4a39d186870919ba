"""Panels: every object alive in a notebook, and still a calculation that a line of code reproduces."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from propkit.errors import MissingExtraError

__all__ = ["panel_of", "panel_of_study", "panel_of_uncertainty"]


def _needed() -> None:
    """Refuse where the packages of the ``notebook`` extra are not installed."""
    try:
        import anywidget
        import bokeh
        import ipywidgets
    except ImportError as error:
        raise MissingExtraError(error.name or "ipywidgets", "notebook", "a panel") from error
    del anywidget, bokeh, ipywidgets


def panel_of(calculation: Any) -> Any:
    """Return the panel of an object.

    Raises
    ------
    MissingExtraError
        When the packages of the ``notebook`` extra are not installed.
    """
    _needed()
    if calculation.kind in ("firing", "reconciliation"):
        from propkit.panels.analysis import FiringPanel, ReconciliationPanel

        return (FiringPanel if calculation.kind == "firing" else ReconciliationPanel)(calculation)
    from propkit.panels.panel import Panel

    return Panel(calculation)


def panel_of_study(study: Any, result: str, limits: Mapping[str, tuple[Any, Any]] | None, minimum: bool) -> Any:
    """Return the panel of a study or of its results (see `Study.panel`).

    Raises
    ------
    MissingExtraError
        When the packages of the ``notebook`` extra are not installed.
    """
    _needed()
    from propkit.panels.study_panel import StudyPanel

    return StudyPanel(study, result=result, limits=limits, minimum=minimum)


def panel_of_uncertainty(uncertainty: Any, result: str) -> Any:
    """Return the panel of an uncertainty or of its results (see `Uncertainty.panel`).

    Raises
    ------
    MissingExtraError
        When the packages of the ``notebook`` extra are not installed.
    """
    _needed()
    from propkit.panels.uncertainty_panel import UncertaintyPanel

    return UncertaintyPanel(uncertainty, result=result)
