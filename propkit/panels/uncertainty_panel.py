"""The panel of an uncertainty: first order redrawn at every move, trials on demand."""

from __future__ import annotations

from dataclasses import replace
from typing import TYPE_CHECKING, Any

from propkit.errors import InputError, Problem
from propkit.model.declare import Bounds
from propkit.panels.faces import Unit, split_text
from propkit.panels.last_link_panel import LastLinkPanel, LastLinkSession
from propkit.panels.session import FACES
from propkit.panels.steps import Scale, scale_for
from propkit.panels.study_face import SettingFace
from propkit.panels.uncertainty_content import code_of_uncertainty, figures_of, uncertainty_content
from propkit.panels.uncertainty_plan import (
    FIRST_ORDER,
    SAMPLES,
    SEED,
    TRIALS,
    Opened,
    SpreadSetting,
    UncertaintyPlan,
    spread_text,
)
from propkit.study.distributions import Empirical
from propkit.study.uncertainty import Uncertainty
from propkit.study.uncertainty_result import UncertaintyResult

if TYPE_CHECKING:
    import pandas as pd


class UncertaintyFace(SettingFace):
    """The result shown, the spread of every uncertain input, and how trials are run."""

    minor = ("method", "samples", "seed", "illegal")

    def is_minor(self, name: str) -> bool:
        """Whether an input stands folded away."""
        return name in self.minor

    def fixed(self, name: str) -> bool:
        """Whether a spread is that of observed values."""
        return isinstance(self.link._values.get(name), Empirical)

    def effective(self, name: str) -> float | None:
        """Return the number of a spread in the unit that it was typed in."""
        if not self._is_spread(name):
            return super().effective(name)
        parts = split_text(self.text_now(name))
        return None if parts is None or self.fixed(name) else float(parts[0])

    def text_now(self, name: str, system: Any = "SI") -> str:
        """Return a spread as it was typed."""
        if not self._is_spread(name):
            return super().text_now(name, system)
        return spread_text(self.link._values[name], self.declared(name).quantity)

    def unit(self, name: str, system: Any) -> Unit:
        """Return the unit of a spread: the one that was typed."""
        if not self._is_spread(name):
            return super().unit(name, system)
        parts = split_text(self.text_now(name))
        return Unit(parts[1] if parts else "")

    def scale(self, name: str, unit: Unit) -> Scale | None:
        """Return the slider of a spread."""
        value = self.effective(name)
        return scale_for(value, Bounds(above=0.0), float) if self._is_spread(name) and value else None

    def read(self, name: str, text: str, system: Any) -> Any:
        """Return the spread that a typed text stands for; a bare number takes the unit that the field has."""
        if not self._is_spread(name):
            return super().read(name, text, system)
        parts = split_text(text.strip())
        return self.unit(name, system).with_number(parts[0]) if parts is not None and not parts[1] else (text.strip() or None)

    def _is_spread(self, name: str) -> bool:
        return isinstance(self.link.declared_inputs.get(name), SpreadSetting)


FACES["uncertainty"] = UncertaintyFace


class UncertaintyPanel(LastLinkPanel):
    """Interactive view of an uncertainty.

    Parameters
    ----------
    uncertainty : Uncertainty or UncertaintyResult
        The uncertainty to start from; results that are there already are shown as they are.
    result : str
        Result shown first; the first of the object's headline by default.
    """

    def __init__(self, uncertainty: Uncertainty | UncertaintyResult, *, result: str = "") -> None:
        plan = _opened(uncertainty, result)
        super().__init__(plan, LastLinkSession(plan))

    @property
    def uncertainty(self) -> Uncertainty:
        """The plan whose results are shown."""
        found: Uncertainty = self.value.plan
        return found

    def run_trials(self) -> None:
        """Run trials of the whole distributions; the number and the seed are settings of the panel."""
        self.set("uncertainty.method", TRIALS)

    def press(self, what: str) -> None:
        """Do what a button of the panel stands for."""
        if what not in (TRIALS, FIRST_ORDER):
            raise InputError(Problem("button", repr(what), f"{TRIALS!r} or {FIRST_ORDER!r}"))
        self.set("uncertainty.method", what)

    def tap(self, x: float, y: float) -> None:
        """Do nothing: a click on a figure stands for nothing here."""

    def comparison(self) -> pd.DataFrame:
        """Return value and standard uncertainty of every result, now and of every pin: SI floats, units in ``attrs["units"]``."""
        import pandas as pd

        columns: dict[tuple[str, str], Any] = {}
        for name, result in {"current": self.value, **self.pins}.items():
            table = result.table
            columns[name, "value"], columns[name, "standard_uncertainty"] = table["value"], table["standard_uncertainty"]
        frame = pd.DataFrame(columns)
        frame.attrs["units"] = self.value.table.attrs["units"]
        return frame

    def as_code(self) -> str:
        """Return the script that reproduces exactly what the panel shows."""
        return code_of_uncertainty(self.session.value)

    def content(self) -> dict[str, Any]:
        """Return what the panel shows, as plain data."""
        return uncertainty_content(self)

    def figure_titles(self) -> list[str]:
        """Return the titles of the figures."""
        return ["Budget and interval"]

    def figures(self) -> tuple[Any, ...]:
        """Return the figures shown, as neutral data."""
        return figures_of(self.session.value, self.units)

    def twin(self) -> Any:
        """Return the static sheet that stands in for the panel: that of the results, with the figures shown."""
        return replace(self.value.report(self.units), figures=self.figures())

    def _replace_value(self, value: Any) -> None:
        if not isinstance(value, Uncertainty | UncertaintyResult):
            raise InputError(Problem("value", repr(value), "an uncertainty or its results"))
        self.session.set_value(_opened(value, ""))

    def __repr__(self) -> str:
        return f"<Panel of {self.uncertainty!r}>" if self.value is not None else "<Panel, closed>"


def _opened(uncertainty: Uncertainty | UncertaintyResult, result: str) -> UncertaintyPlan:
    """Return the plan of an uncertainty, with its results where it has them."""
    solved = uncertainty if isinstance(uncertainty, UncertaintyResult) else None
    plan = solved.plan if solved is not None else uncertainty
    assert isinstance(plan, Uncertainty)
    _, (target, inputs, correlation, results) = plan.__reduce__()
    has_trials = solved is not None and solved.trials is not None
    opened = Opened(
        inputs=inputs,
        correlation=correlation,
        results=tuple(results),
        result=result,
        samples=solved.asked if solved is not None and has_trials else SAMPLES,
        seed=int(solved.seed or 0) if solved is not None and has_trials else SEED,
        illegal=solved._illegal if solved is not None else "refuse",
        method=TRIALS if has_trials else FIRST_ORDER,
    )
    made = UncertaintyPlan(target, {}, opened)
    if solved is not None:
        made.hold(solved)
    return made
