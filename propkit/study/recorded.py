"""Analyses as links of a chain, so that a record holds them and a reviewer recomputes them like everything else.

A reconciliation, a firing or an uncertainty is no object of the chain: it works on one. For its record it becomes the
last link: its inputs in plain data, its results one by one.
"""

from __future__ import annotations

import math
from collections.abc import Mapping
from types import MappingProxyType
from typing import TYPE_CHECKING, Any, ClassVar

import numpy as np

from propkit.errors import InputError, Problem
from propkit.model.base import Calculation, Outcome, reach
from propkit.model.declare import CustomInput, Result, as_text, as_typed
from propkit.model.doubts import Assumption
from propkit.quantities import NUMBER, Kind, Quantity

if TYPE_CHECKING:
    from propkit.study.uncertainty_result import UncertaintyResult


class PlainResult(Result):
    """A result that is named after a figure or channel, with its unit."""

    def __init__(self, name: str, unit: str) -> None:
        super().__init__(relation="", source="")
        self.name, self.owner, self._unit = name, "", unit

    @property
    def quantity(self) -> Quantity:
        """A row made for this result."""
        kind = Kind("recorded", self._unit, (self._unit,), (self._unit,)) if self._unit else NUMBER
        return Quantity(self.name, kind, "", self.name, self.name, 5)


def _read_calculation(name: str, value: Any) -> Calculation:
    if isinstance(value, Calculation):
        return value
    raise InputError(Problem(name, as_text(value), "a propkit object"))


def _read_plain(name: str, value: Any) -> Any:
    return value


def plain_data(value: Any) -> Any:
    """Return an input as plain data: quantities as texts, tuples as lists, arrays as lists with None for NaN."""
    if isinstance(value, Mapping):
        return {str(key): plain_data(entry) for key, entry in value.items()}
    if isinstance(value, np.ndarray) and value.ndim:
        return [None if isinstance(entry, float) and math.isnan(entry) else entry for entry in value.tolist()]
    if isinstance(value, list | tuple):
        return [plain_data(entry) for entry in value]
    return as_typed(value)


class Recorded(Calculation):
    """An analysis as the last link of a chain. Subclasses make the analysis and list its results."""

    upstream_input = "target"
    statement: ClassVar[str] = ""
    ordered: ClassVar[tuple[str, ...]] = ()
    """Options that are mappings; they are held as lists of pairs, because files do not keep the order of a mapping."""

    target: CustomInput = CustomInput(doc="the object", reader=_read_calculation, kw_only=False, quantity="name")
    options: CustomInput = CustomInput(doc="inputs of the analysis as plain data", reader=_read_plain, quantity="name")

    if TYPE_CHECKING:
        analysis: Any

    def _make(self, options: dict[str, Any]) -> Any:
        raise NotImplementedError

    def _listed(self, analysis: Any) -> dict[str, tuple[float, str]]:
        """Return name -> (value, unit) of every result."""
        raise NotImplementedError

    def _calculate(self) -> Outcome:
        given = self._values["options"]
        if not isinstance(given, Mapping):
            raise InputError(Problem("options", as_text(given), "the inputs of the analysis by name"))
        try:
            options = {key: dict(value) if key in self.ordered else value for key, value in given.items()}
        except (TypeError, ValueError):
            raise InputError(Problem("options", as_text(given), "lists of pairs for mappings")) from None
        analysis = self._make(options)
        listed = self._listed(analysis)
        hold = object.__setattr__
        hold(self, "analysis", analysis)
        declared = {name: PlainResult(name, unit) for name, (_, unit) in listed.items()}
        hold(self, "declared_results", MappingProxyType(declared))
        results = {name: value for name, (value, _) in listed.items() if math.isfinite(value)}
        absent = {name: "nothing determines it here" for name in listed if name not in results}
        return Outcome(results, absent, tuple(analysis.warnings))

    def _own_assumptions(self) -> tuple[Assumption, ...]:
        return (Assumption(self.kind, self.statement, "method", ""),)

    def input_text(self, name: str) -> str:
        """Return the inputs of the analysis as a text of bounded length."""
        if name == self.upstream_input:
            return str(self._values[name].subtitle())
        text = ", ".join(f"{key}: {brief(value)}" for key, value in sorted(self._values[name].items()))
        return text if len(text) <= 1900 else f"{text[:1900]}…"

    def subtitle(self) -> str:
        """Return what is analysed."""
        above = self.upstream
        return f"{self.title} of {above.subtitle() if above is not None else ''}"

    def report(self, units: Any = "SI") -> Any:
        """Return the sheet of the analysis."""
        return self.analysis.report(units=units)


def brief(value: Any) -> str:
    """Return an input in a bounded number of characters; whole numbers alike whether they are floats or not."""
    text = _text(value)
    return text if len(text) <= 600 else f"{text[:600]}…"


def _text(value: Any) -> str:
    if hasattr(value, "recipe"):
        return _text(value.recipe())
    if isinstance(value, Mapping):
        return "{" + ", ".join(f"{key}: {_text(entry)}" for key, entry in sorted(value.items())) + "}"
    if isinstance(value, list | tuple):
        return "[" + ", ".join(map(_text, value)) + "]"
    if isinstance(value, int | float) and not isinstance(value, bool):
        return f"{value:.12g}"
    return str(value)


class RecordedUncertainty(Recorded):
    """An uncertainty run as a link of a chain."""

    kind = "uncertainty"
    title = "Uncertainty"
    ordered = ("inputs",)
    statement = "Uncertainties are propagated in first order (GUM) and, with trials, by Monte Carlo (supplement 1)."

    def _make(self, options: dict[str, Any]) -> UncertaintyResult:
        from propkit.study.uncertainty import Uncertainty

        pairs = {(first, second): value for first, second, value in options.pop("correlation", [])}
        plan = Uncertainty(self._values["target"], options.pop("inputs"), pairs, options.pop("results", None))
        return plan.run(progress=False, **options)

    def _listed(self, analysis: UncertaintyResult) -> dict[str, tuple[float, str]]:
        table = analysis.table
        listed = {}
        for name in table.index:
            for column in table.columns:
                listed[f"{name} {column}"] = (float(table.loc[name, column]), table.attrs["units"][name])
        return listed


def record_of(kind: type[Recorded], target: Calculation, options: Mapping[str, Any], texts: Mapping[str, str]) -> Any:
    """Return the record of an analysis (see `Calculation.record`)."""
    given = {
        key: [[name, entry] for name, entry in value.items()] if key in kind.ordered else value
        for key, value in options.items()
        if value is not None
    }
    link = kind(target=target, options=plain_data(given))  # type: ignore[call-arg]
    return reach("record")(link, **texts)
