"""What goal seek and optimum share: the batch function of a search, its ranges, and the answer that it gives."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass, field
from typing import Any

import numpy as np
import numpy.typing as npt

from propkit import units as unit_text
from propkit.errors import InputError, Problem
from propkit.model import paths
from propkit.model.base import Calculation, render
from propkit.model.declare import as_text
from propkit.report import Report, Row, Section, UnitSystem
from propkit.study.differences import stencil
from propkit.study.evaluation import ChainFunction, function_of, result_name, result_quantity, variable
from propkit.study.sweep import bounds_of

Array = npt.NDArray[np.float64]

_AT_BOUND = 1e-6
"""Share of a range that counts as on its end."""
_WIDE = 30.0
"""Factor to both sides of the present value in which a solution is looked for first."""
_STEP = 2e-4
"""Share of a range over which derivatives are taken."""
_STIRS = 1e-12
"""Relative change of a result below which it does not depend on what moves."""


@dataclass(frozen=True, slots=True)
class Answer:
    """What a search found; immutable.

    Parameters
    ----------
    object : Calculation
        The object found: that which meets the targets, or comes nearest to them, or is the best.
    variables : mapping
        Value in SI of each input that was free, by whole path.
    results : mapping
        Value in SI of each result that was asked about.
    reached : bool
        Whether every target is met, or the optimum is one that meets every limit.
    on_bounds : tuple of str
        Paths that sit on an end of their range: a wider range may hold a better answer.
    notes : tuple of str
        What a reader should know, in words.
    evaluations : int
        Designs that were computed.
    missed : str
        What it means that the answer is not reached.

    Notes
    -----
    Every other attribute is that of the object: ``answer.nozzle.exit_diameter`` works.
    """

    object: Calculation
    variables: Mapping[str, float]
    results: Mapping[str, float]
    reached: bool
    on_bounds: tuple[str, ...] = ()
    notes: tuple[str, ...] = ()
    evaluations: int = 0
    missed: str = field(default="the target is out of reach", repr=False)

    def __getattr__(self, name: str) -> Any:
        if name.startswith("_"):
            raise AttributeError(name)
        return getattr(self.object, name)

    def report(self, units: UnitSystem = "SI") -> Report:
        """Return the answer as a sheet: what was varied, what came out, and every reservation."""
        rows = [self._row(path, value, "given", units) for path, value in self.variables.items()]
        found = [self._row(name, value, "computed", units) for name, value in self.results.items()]
        return Report(
            kind="answer",
            title="Answer" if self.reached else f"Nearest design: {self.missed}",
            subtitle=self.object.subtitle(),
            units=units,
            headline=tuple((*rows, *found)[:4]),
            given=tuple(rows),
            results=tuple(found),
            sections=(Section("notes", "How it was found", lines=(*self.notes, f"{self.evaluations} designs were computed.")),),
            doubts=() if self.reached and not self.on_bounds else self.notes,
            cautions=self.object.cautions(),
            render=render,
        )

    def _row(self, path: str, value: float, kind: Any, system: UnitSystem) -> Row:
        known = result_quantity(self.object, path)
        unit = known.shown_in(system, (value,))
        return Row(path, f"{known.label} ({path})", known.symbol, unit_text.convert(value, known.unit, unit), unit, known.digits, kind)

    def __str__(self) -> str:
        return str(self.report())

    def _repr_mimebundle_(self, include: Any = None, exclude: Any = None) -> dict[str, Any]:
        return self.report()._repr_mimebundle_(include, exclude)


class Search:
    """The batch function of the results asked about over the inputs that may move, with their ranges and counts."""

    def __init__(self, target: Calculation, names: Sequence[str], bounds: Mapping[str, Any], results: Sequence[str]) -> None:
        if not isinstance(target, Calculation):
            raise InputError(Problem("target", as_text(target), "a propkit object, such as a pk.Performance"))
        known = [variable(target, name) for name in names]
        self.paths = tuple(entry.path for entry in known)
        if len(set(self.paths)) < len(self.paths):
            raise InputError(Problem("path", ", ".join(self.paths), "different inputs"))
        ranges = dict(bounds_of_all(target, bounds))
        strange = [path for path in ranges if path not in self.paths]
        if strange:
            raise InputError(Problem(strange[0], "given a range", "an input that may move, one of " + ", ".join(self.paths)))
        self.function: ChainFunction = function_of(target, self.paths, results)
        self.target = self.function.template
        self.results = tuple(result_name(self.target, name) for name in results)
        self.nominal = np.array([entry.nominal for entry in known])
        self.legal = np.array([(entry.low, entry.high) for entry in known], dtype=np.float64)
        self.given = np.array([path in ranges for path in self.paths])
        self.low, self.high = np.array(
            [ranges.get(path, legal) for path, legal in zip(self.paths, self.legal, strict=True)], dtype=np.float64
        ).T
        self.evaluations = 0

    def __call__(self, points: Array) -> Array:
        """Return results of points, shape (point, result); NaN where there is none."""
        self.evaluations += len(points)
        found = self.function({path: np.ascontiguousarray(points[:, place]) for place, path in enumerate(self.paths)})
        return np.stack([np.asarray(found[name], dtype=np.float64) for name in self.results], axis=1)

    def first_ranges(self) -> tuple[Array, Array]:
        """Return where to look first: the range given, else the surroundings of the present value inside what is legal."""
        size = np.where(self.nominal == 0.0, 1.0, np.abs(self.nominal))
        low = np.where(
            self.given, self.low, np.maximum(self.legal[:, 0], np.where(self.nominal > 0.0, self.nominal / _WIDE, -_WIDE * size))
        )
        high = np.where(
            self.given, self.high, np.minimum(self.legal[:, 1], np.where(self.nominal > 0.0, self.nominal * _WIDE, _WIDE * size))
        )
        return low, high

    def made(self, point: Array) -> Calculation:
        """Return the object of a point; an assigned enthalpy cannot be put back into a recipe."""
        changed = {path: float(value) for path, value in zip(self.paths, point, strict=True)}
        found: Calculation = self.target.replace(changed)
        return found

    def told(self, path: str, value: float) -> str:
        """Return a value of an input or a result with its display unit."""
        known = result_quantity(self.target, path)
        unit = known.shown_in("SI", (value,))
        return f"{unit_text.convert(value, known.unit, unit):.6g} {unit_text.shown_unit(unit)}".rstrip()

    def idle(self, table: Array) -> tuple[str, ...]:
        """Return the results that do not change over a table of them, shape (point, result): nothing that moves has a say in them."""
        usable = table[np.isfinite(table).all(axis=1)]
        if len(usable) < 2:
            return ()
        still = np.ptp(usable, axis=0) <= _STIRS * np.abs(usable).max(axis=0)
        return tuple(name for name, same in zip(self.results, still, strict=True) if same)

    def answer(
        self, point: Array, reached: bool, notes: list[str], low: Array, high: Array, missed: str = "the target is out of reach"
    ) -> Answer:
        """Return the answer at a point, with what it sits on."""
        span = np.where(high > low, high - low, 1.0)
        at_low, at_high = point - low < _AT_BOUND * span, high - point < _AT_BOUND * span
        near = at_low | at_high
        point = np.where(at_low, low, np.where(at_high, high, point))
        made = self.made(point)
        on = tuple(path for path, edge in zip(self.paths, near, strict=True) if edge)
        for path in on:
            place = self.paths.index(path)
            end = "lower" if point[place] - low[place] < high[place] - point[place] else "upper"
            legal = point[place] in self.legal[place]
            kind = "range given" if self.given[place] else "legal range" if legal else "range searched"
            notes.append(f"{path} sits on the {end} end of the {kind}: {self.told(path, float(point[place]))}")
        results = {name: paths.value_of(made, name) for name in self.results}
        variables = {path: float(value) for path, value in zip(self.paths, point, strict=True)}
        return Answer(made, variables, results, reached, on, tuple(notes), self.evaluations, missed)


def bounds_of_all(target: Calculation, bounds: Mapping[str, Any]) -> dict[str, tuple[float, float]]:
    """Return ranges in SI by whole path; every bad one in one error."""
    problems: list[Problem] = []
    found = {}
    for name, ends in bounds.items():
        try:
            path, low, high = bounds_of(target, name, ends)
            found[path] = (low, high)
        except InputError as error:
            problems.extend(error.problems or (Problem(str(name), "not understood", "a path of an input", str(error)),))
    if problems:
        raise InputError(problems)
    return found


def slopes_of(function: Callable[[Array], Array], point: Array) -> Array:
    """Return derivatives, shape (result, input), by differences of fourth order inside the unit box, in one evaluation."""
    count = len(point)
    around = stencil(point, np.full(count, _STEP), np.zeros(count), np.ones(count))
    table = function(around.points).T
    return np.where(np.isfinite(found := around.slopes(table)), found, 0.0)
