"""The panel of a study: a map or curves over a grid of designs, solved anew whenever something upstream changes."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import replace
from typing import TYPE_CHECKING, Any

from propkit.errors import InputError, Problem, RangeError
from propkit.panels import study_face
from propkit.panels.last_link_panel import LastLinkPanel, LastLinkSession
from propkit.panels.study_content import code_of_study, study_content
from propkit.panels.study_figures import best_row, figures_of, nearest, titles_of
from propkit.panels.study_plan import Opened, StudyPlan, constants
from propkit.panels.study_solver import SETTLED, Solver
from propkit.study.evaluation import is_enthalpy
from propkit.study.sweep import Study
from propkit.study.sweep_result import StudyResult

if TYPE_CHECKING:
    import pandas as pd

    from propkit.panels.widget import PanelWidget

_ = study_face
"""Imported for the faces that it registers."""


class StudyPanel(LastLinkPanel):
    """Interactive view of a study.

    Parameters
    ----------
    study : Study or StudyResult
        The study to start from; results that are there already are shown as they are.
    result : str
        Result shown first; the first of the object's headline by default.
    limits : mapping of str to (low, high), optional
        Results that must stay inside a range.
    minimum : bool
        Whether the smallest value is the best.
    """

    def __init__(
        self, study: Study | StudyResult, *, result: str = "", limits: Mapping[str, tuple[Any, Any]] | None = None, minimum: bool = False
    ) -> None:
        self.solver = Solver()
        self.picked_values: dict[str, Any] = {}
        opened = self._opened(study, result, minimum, limits or {})
        super().__init__(opened, LastLinkSession(opened))

    # -- the study ---------------------------------------------------------------------------------

    @property
    def study(self) -> Study:
        """The study whose results are shown."""
        found: Study = self.value.plan
        return found

    @property
    def best(self) -> Any:
        """The object with the best value of the result shown, among the designs inside the limits.

        Raises
        ------
        RangeError
            When there is none.
        """
        row = best_row(self.session.value)
        if row is None:
            raise RangeError("no design has that result inside the limits")
        return self.design(row)

    def design(self, number: int) -> Any:
        """Return the object of a design by its number in the table."""
        if not 0 <= number < len(self.study):
            raise InputError(Problem("number", repr(number), f"a design from 0 to {len(self.study) - 1}"))
        return self.study.target.replace(self.study.plan.design(number))

    @property
    def picked(self) -> Any:
        """The object of the design that was clicked last; None where none was."""
        return self.session.value.target.replace(self.picked_values) if self.picked_values else None

    def pick(self, x: float, y: float | None = None) -> Any:
        """Open the design of the grid nearest to a point of the map, given in display units; return the object."""
        row = nearest(self.session.value, self.units, self.figure, x, y)
        return self._open(row)

    def open_best(self) -> Any:
        """Open the best design; return the object."""
        row = best_row(self.session.value)
        if row is None:
            raise RangeError("no design has that result inside the limits")
        return self._open(row)

    def close_picked(self) -> None:
        """Put the opened design away."""
        self.picked_values = {}
        self.session.changed()

    def _open(self, row: int) -> Any:
        made = self.design(row)
        self.picked_values = dict(self.study.plan.design(row))
        self.session.changed()
        return made

    def tap(self, x: float, y: float) -> None:
        """Do what a click on the figure stands for."""
        self.pick(x, y)

    def press(self, what: str) -> None:
        """Do what a button of the panel stands for."""
        {"best": self.open_best, "close": self.close_picked}[what]()

    # -- what a panel has ----------------------------------------------------------------------------

    def close(self) -> None:
        """Close this view; with the last view of a chain its objects are let go."""
        super().close()
        self.solver.forget()

    def comparison(self) -> pd.DataFrame:
        """Return the best design of the study shown and of every pin side by side: SI floats, units in ``attrs["units"]``."""
        import pandas as pd

        frames = {}
        for name, plan in {"current": self.session.value, **self.session.pins}.items():
            row = best_row(plan)
            table = plan.result
            names = [*(column.path for column in table.plan.plan.numbers), *table.results]
            frames[name] = {each: float(table.values(each)[row]) if row is not None else float("nan") for each in names}
        frame = pd.DataFrame(frames)
        frame.index.name = "result"
        known = self.value.units
        frame.attrs["units"] = {str(name): known.get(str(name), "") for name in frame.index}
        return frame

    def as_code(self) -> str:
        """Return the script that reproduces exactly what the panel shows, the run of the study included."""
        return code_of_study(self.session.value)

    def record(self, *, title: str = "", author: str = "", purpose: str = "", notes: str = "") -> Any:
        """Return the record of the study shown: what varied, and a sample of designs that a reviewer recomputes."""
        return self.value.record(title=title, author=author, purpose=purpose, notes=notes)

    def content(self) -> dict[str, Any]:
        """Return what the panel shows, as plain data."""
        return study_content(self)

    def figure_titles(self) -> list[str]:
        """Return the titles of the figures."""
        return titles_of(self.session)

    def figures(self) -> tuple[Any, ...]:
        """Return the figure shown, as neutral data."""
        return figures_of(self.session, self.figure, self.units, self.picked_values)

    @property
    def widget(self) -> PanelWidget:
        """The widget that shows the panel (made on first use)."""
        if self._widget is None:
            from propkit.panels.study_widget import StudyWidget

            self._widget = StudyWidget(self)
        return self._widget

    def twin(self) -> Any:
        """Return the static sheet that stands in for the panel: that of the results, with the figure shown."""
        sheet = self.value.report(self.units)
        return replace(sheet, figures=self.figures())

    def _replace_value(self, value: Any) -> None:
        plan = value.plan if isinstance(value, StudyResult) else value
        if not isinstance(plan, Study):
            raise InputError(Problem("value", repr(value), "a study or its results"))
        now = self.session.value
        self.session.set_value(self._opened(value, now.result_name, now.minimum, now.limits))

    def _opened(self, study: Study | StudyResult, result: str, minimum: bool, limits: Mapping[str, tuple[Any, Any]]) -> StudyPlan:
        """Return the plan of a study, with its results where it has them and they are not too many to draw."""
        plan = study.plan if isinstance(study, StudyResult) else study
        fixed = {path: value for path, value in constants(plan).items() if not is_enthalpy(path)}
        target = plan.target.replace(fixed) if fixed else plan.target
        made = StudyPlan(target, {}, Opened.of(plan, result, minimum, limits), self.solver)
        if isinstance(study, StudyResult) and not study.interrupted and len(study) <= SETTLED["quick"] and _same_designs(plan, made.study):
            made.hold(study)
        return made

    def __repr__(self) -> str:
        return f"<Panel of {self.study!r}>" if self.value is not None else "<Panel, closed>"


def _same_designs(one: Study, other: Study) -> bool:
    """Whether two studies have the same designs in the same order, and the same results."""
    import numpy as np

    return (
        one.target == other.target
        and one.results == other.results
        and one.plan.shape == other.plan.shape
        and all(
            a.path == b.path and len(a.values) == len(b.values) and np.array_equal(a.values, b.values) and str(a.options) == str(b.options)
            for a, b in zip(one.plan.columns, other.plan.columns, strict=True)
        )
    )
