"""A study as its panel sees it: the last link of the chain, whose settings are axes, result, optimum and limits."""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any, ClassVar, Self

import numpy as np
import numpy.typing as npt

from propkit import quantities
from propkit.errors import InputError, Problem
from propkit.model import paths
from propkit.model.declare import Bounds, CustomInput
from propkit.panels.last_link import ChoiceSetting, LastLink, NumberSetting, numeric_inputs, told_apart
from propkit.panels.steps import scale_for
from propkit.plots.study import SEPARATION, result_label
from propkit.study.sweep import Study
from propkit.study.sweep_plan import Column

if TYPE_CHECKING:
    from propkit.panels.study_solver import Solver

Array = npt.NDArray[np.float64]

NONE = "none"
POINTS = 50
MOST_POINTS = 1000
MOST_LIMITS = 3
OPTIMA = {"largest": "the largest value", "smallest": "the smallest value"}


@dataclass(frozen=True, slots=True, eq=False)
class Span:
    """One axis of the map: its path, and the values along it; `options` where it is a choice, `given` as the study gave them."""

    path: str
    values: Array
    options: tuple[Any, ...] = ()
    given: Any = None

    def __len__(self) -> int:
        return len(self.options) or len(self.values)

    def thinned(self, count: int) -> Span:
        """Return the axis with at most `count` values, its ends kept; a choice keeps all."""
        if self.options or count >= len(self.values):
            return self
        if self.given is None:
            return Span(self.path, np.linspace(self.values[0], self.values[-1], count))
        kept = np.unique(np.linspace(0, len(self.values) - 1, count).astype(np.intp))
        return Span(self.path, self.values[kept], given=[float(value) for value in self.values[kept]])

    @property
    def designs(self) -> Any:
        """Values as a study takes them."""
        return list(self.options) if self.options else self.values

    def code(self) -> str:
        """Return a Python expression for the values."""
        if self.options:
            return repr(list(self.options))
        low, high = float(self.values[0]), float(self.values[-1])
        if len(self.values) > 2 and np.array_equal(self.values, np.linspace(low, high, len(self.values))):
            return f"np.linspace({low!r}, {high!r}, {len(self.values)})"
        return repr(self.given if isinstance(self.given, list | tuple) else [float(value) for value in self.values])


class StudyPlan(LastLink):
    """A study over one or two inputs of a chain.

    Parameters
    ----------
    target : Calculation
        The object whose results are wanted.
    typed : mapping
        Settings as given: x, x_low, x_high, x_points, y.., result, optimum, limit, limit_low, limit_high, limit_2..
    opened : Opened
        The study that the panel was opened on.
    solver : Solver
        What solves it.
    """

    kind: ClassVar[str] = "study"
    title: ClassVar[str] = "Study"

    def __init__(self, target: Any, typed: Mapping[str, Any], opened: Opened, solver: Solver) -> None:
        self.opened, self.solver = opened, solver
        super().__init__(target, typed)

    # -- settings ----------------------------------------------------------------------------------

    def declare(self) -> None:
        """Declare axes, result, optimum and limits."""
        self.axes_known = numeric_inputs(self.target)
        known = {**self.axes_known, **{path: self.axes_known.get(path, path) for path in self.opened.columns}}
        numbers = {path: label for path, label in known.items() if not self.opened.is_choice(path)}
        x = self.setting(ChoiceSetting("x", "across", "the input that varies across the map", numbers, self.opened.first(numbers)))
        self.labels = known
        self.x = self._span("x", x)
        others = {path: label for path, label in known.items() if path != x}
        y = self.setting(
            ChoiceSetting(
                "y",
                "upwards",
                "the input that varies upwards, or makes the curves",
                {NONE: "nothing: one curve", **others},
                self.opened.second(others),
            )
        )
        self.y = None if y == NONE else self._span("y", y)
        self.study = self.study_of(None)
        results = self.study.results
        self.result_labels = told_apart({name: result_label(self.target, name) for name in results})
        shown = (
            self.opened.result
            if self.opened.result in self.result_labels
            else next((n for n in self.target.headline if n in results), results[0])
        )
        self.setting(ChoiceSetting("result", "result shown", "the result whose contours or curves are drawn", self.result_labels, shown))
        self.setting(
            ChoiceSetting(
                "optimum",
                "best design has",
                "which value of the result is the best",
                OPTIMA,
                "smallest" if self.opened.minimum else "largest",
            )
        )
        first = {name: self.declared_inputs.pop(name) for name in ("result", "optimum")}
        self.declared_inputs = {**first, **self.declared_inputs}
        self._declare_limits()

    def _span(self, axis: str, path: str) -> Span:
        """Return an axis: the values of the study, or as many as wanted between two ends."""
        column = self.opened.columns.get(path)
        if column is not None and column.is_choice:
            return Span(path, np.empty(0), column.options)
        low, high, count, quantity, bounds = self._room(path, column)
        label = self.labels[path]
        ends = [
            self.setting(NumberSetting(f"{axis}_{end}", quantity, said, f"the {word} {label} of the axis", value, bounds))
            for end, said, word, value in (("low", "from", "lowest", low), ("high", "to", "highest", high))
        ]
        number = quantities.Quantity("points", quantities.NUMBER, "", "points", "number of values along the axis", 4)
        points = self.setting(
            NumberSetting(
                f"{axis}_points",
                number,
                "points",
                "the number of values along the axis",
                float(count),
                Bounds(at_least=2, at_most=MOST_POINTS),
                whole=True,
            )
        )
        edited = any(f"{axis}_{end}" in self._typed for end in ("low", "high", "points"))
        if column is not None and not edited:
            values = column.values.astype(np.float64)
            return Span(path, np.unique(values[np.isfinite(values)]), given=self.opened.given(path))
        if not ends[0] < ends[1]:
            given = {name: self._typed.get(name) for name in (f"{axis}_low", f"{axis}_high")}
            name = next((name for name, value in given.items() if value is not None), f"{axis}_low")
            raise InputError(
                Problem(name, str(given[name]), f"{'below the highest' if name.endswith('low') else 'above the lowest'} {label}")
            )
        return Span(path, np.linspace(ends[0], ends[1], int(points)))

    def _room(self, path: str, column: Column | None) -> tuple[float, float, int, quantities.Quantity, Bounds]:
        """Return ends, number of points, catalogue row and legal range of an axis."""
        if path.endswith(".enthalpy") and path.count(".") == 2:
            quantity, bounds = quantities.quantity("molar_enthalpy"), Bounds()
        else:
            place = paths.resolve(self.target, path, results=False)
            entry = self.target.chain()[place.position].declared_inputs[place.name]
            quantity, bounds = entry.quantity, Bounds(at_least=0.0) if isinstance(entry, CustomInput) else entry.bounds
        if column is not None:
            finite = column.values[np.isfinite(column.values)]
            return float(np.min(finite)), float(np.max(finite)), max(len(finite), 2), quantity, bounds
        from propkit.study.evaluation import variable

        nominal = variable(self.target, path).nominal
        scale = scale_for(nominal, bounds, float, spread=1.1 if quantity.unit == "K" else 1.6)
        return scale.low, scale.high, POINTS, quantity, bounds

    def _declare_limits(self) -> None:
        """Declare limits: as many as are set, and one more."""
        options = {NONE: "no limit", **({SEPARATION: "margin against separation"} if self._separates() else {}), **self.result_labels}
        given = list(self.opened.limits.items())
        for number in range(MOST_LIMITS):
            name = "limit" if number == 0 else f"limit_{number + 1}"
            label = "limit on" if number == 0 else f"limit {number + 1} on"
            first = given[number] if number < len(given) else (NONE, (None, None))
            chosen = self.setting(
                ChoiceSetting(name, label, "a result that must stay inside a range", options, first[0] if first[0] in options else NONE)
            )
            if chosen == NONE:
                break
            quantity, unit = self._limited(chosen)
            for place, (end, word) in enumerate((("low", "at least"), ("high", "at most"))):
                opened = first[1][place] if chosen == first[0] else None
                value = None if opened is None else _si(opened, unit, name)
                if chosen == SEPARATION and end == "low" and first[0] != SEPARATION:
                    value = 1.0
                self.setting(
                    NumberSetting(f"{name}_{end}", quantity, word, "designs outside are hatched and do not count for the best", value)
                )

    def _separates(self) -> bool:
        needed = {"nozzle.exit.pressure", "chamber.stagnation_pressure", "nozzle.exit.mach"}
        return self.target.kind == "performance" and needed <= set(self.study.results)

    def _limited(self, name: str) -> tuple[quantities.Quantity, str]:
        if name == SEPARATION:
            return quantities.Quantity(
                name, quantities.NUMBER, "", "margin against separation", "ambient pressure at separation over ambient pressure", 3
            ), ""
        from propkit.study.evaluation import result_quantity

        quantity = result_quantity(self.target, name)
        return quantity, quantity.unit

    @property
    def limits(self) -> dict[str, tuple[Any, Any]]:
        """Limits as `StudyResult.map` takes them: as typed, the value in SI where none was typed."""
        found: dict[str, tuple[Any, Any]] = {}
        for number in range(MOST_LIMITS):
            name = "limit" if number == 0 else f"limit_{number + 1}"
            if self._values.get(name, NONE) == NONE:
                break
            chosen = self._values[name]
            given = list(self.opened.limits.items())[number : number + 1]
            before = given[0][1] if given and given[0][0] == chosen else (None, None)
            low, high = (
                self._typed.get(f"{name}_{end}", self._values.get(f"{name}_{end}") if there is None else there)
                for end, there in zip(("low", "high"), before, strict=True)
            )
            if (low, high) != (None, None):
                found[chosen] = (low, high)
        return found

    @property
    def minimum(self) -> bool:
        """Whether the smallest value is the best."""
        return bool(self._values["optimum"] == "smallest")

    @property
    def result_name(self) -> str:
        """Result that is shown."""
        return str(self._values["result"])

    @property
    def spans(self) -> tuple[Span, ...]:
        """The axes there are."""
        return (self.x,) if self.y is None else (self.x, self.y)

    @property
    def varied(self) -> frozenset[str]:
        """Whole paths of inputs that have no control: those that vary, and those that these displace."""
        given = {f"{link.kind}.{name}" for link in self.target.chain() for name in link.inputs}
        kept = {f"{link.kind}.{name}" for link in self.study.template.chain() for name in link.inputs}
        return frozenset({span.path for span in self.spans} | (given - kept))

    def tidied(self, typed: dict[str, Any], changes: Mapping[str, Any]) -> dict[str, Any]:
        """Drop the ends of an axis that is another one now; an axis chosen twice swaps the two."""
        before = {axis: self._values[axis] for axis in ("x", "y")}
        for axis, other in (("x", "y"), ("y", "x")):
            if axis not in changes or changes[axis] == before[axis]:
                continue
            for end in ("low", "high"):
                typed.pop(f"{axis}_{end}", None)
            if (
                changes[axis] == before[other]
                and before[axis] != NONE
                and not self.opened.is_choice(changes[axis] if axis == "x" else before[axis])
            ):
                typed[other] = before[axis]
                for end in ("low", "high"):
                    for to, since in ((axis, other), (other, axis)):
                        value = self._typed.get(f"{since}_{end}")
                        typed[f"{to}_{end}"] = value
        for name in changes:
            if name.startswith("limit") and not name.endswith(("_low", "_high")) and name not in ("limit_low", "limit_high"):
                typed.pop(f"{name}_low", None)
                typed.pop(f"{name}_high", None)
        return typed

    def rebuilt(self, target: Any, typed: Mapping[str, Any]) -> Self:
        """Return the same study of another target, with other settings, solved."""
        made = type(self)(target, typed, self.opened, self.solver)
        _ = made.result
        return made

    # -- designs and results -----------------------------------------------------------------------

    def study_of(self, most: int | None) -> Study:
        """Return the study, on a coarser grid where it has more designs than `most`."""
        count = math.prod(map(len, self.spans))
        spans = self.spans
        if most is not None and count > most:
            numbers = [span for span in spans if not span.options]
            share = (most / count) ** (1.0 / len(numbers)) if numbers else 1.0
            spans = tuple(span if span.options else span.thinned(max(2, int(len(span) * share + 1e-9))) for span in spans)
        return Study(self.target, {span.path: span.designs for span in spans}, self.opened.results)

    def solved(self) -> Any:
        """Return the results; a moving slider may have them on a coarser grid."""
        self.unsettled = self.solver.moving
        return self.solver.solve(self)

    def subtitle(self) -> str:
        """Return what varies, in a line."""
        return " and ".join(self.labels[span.path] for span in self.spans)


@dataclass(frozen=True, slots=True, eq=False)
class Opened:
    """The study that a panel was opened on: its columns, the results it lists, and what was to be shown."""

    columns: Mapping[str, Column]
    designs: Any
    is_grid: bool
    count: int
    results: tuple[str, ...] | None
    result: str = ""
    minimum: bool = False
    limits: Mapping[str, tuple[Any, Any]] = ()  # type: ignore[assignment]

    @classmethod
    def of(cls, study: Study, result: str, minimum: bool, limits: Mapping[str, tuple[Any, Any]] | None) -> Opened:
        """Return what a panel needs to know of a study."""
        plan = study.plan
        _, (_, designs, results) = study.__reduce__()
        columns = {column.path: column if plan.shape else _as_axis(column) for column in plan.columns}
        columns = {path: column for path, column in columns.items() if _varies(column)}
        return cls(columns, designs, bool(plan.shape), plan.count, results, result, minimum, dict(limits or {}))

    def is_choice(self, path: str) -> bool:
        """Whether a path is a choice of the study."""
        column = self.columns.get(path)
        return column is not None and column.is_choice

    def given(self, path: str) -> Any:
        """Return the values of an axis as they were given, where they ascend; None to write them in SI."""
        if not self.is_grid:
            return None
        column = self.columns[path]
        listed = next((values for name, values in self.designs.items() if path == name or path.endswith(f".{name}")), None)
        ascending = bool((np.diff(column.values) > 0.0).all()) and bool(np.isfinite(column.values).all())
        return list(listed) if ascending and isinstance(listed, list | tuple) else None

    def first(self, numbers: Mapping[str, str]) -> str:
        """Return the path across where none is chosen."""
        varied = [path for path, column in self.columns.items() if not column.is_choice and path in numbers]
        return varied[0] if varied else next(iter(numbers))

    def second(self, others: Mapping[str, str]) -> str:
        """Return the path upwards where none is chosen."""
        return next(
            (path for path, column in self.columns.items() if path in others and not column.is_choice),
            next((path for path in self.columns if path in others), NONE),
        )


def _varies(column: Column) -> bool:
    """Whether a column has more than one choice, or more than one finite number."""
    return len(column.options) > 1 if column.is_choice else len(np.unique(column.values[np.isfinite(column.values)])) > 1


def constants(study: Study) -> dict[str, Any]:
    """Return the inputs that a study sets to one value throughout."""
    same = {
        column.path
        for column in study.plan.columns
        if (len(column.options) == 1 if column.is_choice else len(np.unique(column.values)) == 1)
    }
    return {path: value for path, value in study.plan.design(0).items() if path in same}


def _as_axis(column: Column) -> Column:
    """Return a column of a list of designs as an axis over its range."""
    if column.is_choice:
        return Column(column.path, column.unit, np.arange(len(column.options)), 1, column.options)
    low, high = float(np.min(column.values)), float(np.max(column.values))
    return Column(column.path, column.unit, np.linspace(low, high, POINTS) if low < high else np.array([low]), 1)


def _si(value: Any, unit: str, name: str) -> float:
    from propkit import units

    return float(units.to_si(value, unit, name))
