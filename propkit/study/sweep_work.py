"""What runs in a block of a study: a picklable function that workers rebuild once, not for every block."""

from __future__ import annotations

import hashlib
import pickle
from collections import OrderedDict
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace
from typing import Any

import numpy as np
import numpy.typing as npt

from propkit.errors import PropkitError
from propkit.model import paths
from propkit.model.base import Calculation
from propkit.study.evaluation import ChainFunction, Explained
from propkit.study.sweep_plan import Integers, Plan, blocks_of

Array = npt.NDArray[np.float64]

_KEPT: OrderedDict[str, Work] = OrderedDict()
"""Works that this process has unpickled, by digest, so that a worker rebuilds the objects once."""
_MOST_KEPT = 8
ENOUGH = 600
"""Designs of one choice from which making a predictor for the quick engine pays."""
SAMPLE = 400
"""Designs that a predictor is made for, beside those at the ends."""


@dataclass(frozen=True, slots=True)
class Part:
    """One group of designs: the batch function of its results, or, without one, the object to vary and the choices made."""

    function: ChainFunction | None
    target: Calculation
    chosen: Mapping[str, Any]
    results: tuple[str, ...]

    @property
    def burns(self) -> bool:
        """Whether the chain starts with propellants."""
        return self.target.chain()[0].kind == "case"

    def __call__(self, inputs: Mapping[str, Array], count: int) -> Explained:
        """Return results by name, NaN where a design has none, and why."""
        if self.function is not None:
            return self.function.explained(inputs, count)
        found = {name: np.full(count, np.nan) for name in self.results}
        reasons: dict[int, str] = {}
        for place in range(count):
            changed = {**self.chosen, **{path: float(values[place]) for path, values in inputs.items()}}
            try:
                made = self.target.replace(changed)
            except PropkitError as error:
                reasons[place] = str(error)
                continue
            for name in self.results:
                found[name][place] = value_or_nan(made, name)
        return Explained(found, reasons)


def value_or_nan(made: Calculation, name: str) -> float:
    """Return a result of an object, NaN where this recipe does not have it."""
    try:
        return float(paths.value_of(made, name))
    except (PropkitError, AttributeError, TypeError, ValueError):
        return float("nan")


@dataclass(frozen=True, slots=True)
class Answered:
    """Results of a block (result, design), why a design has none, designs by the quick engine, and those it left."""

    table: Array
    reasons: dict[int, str]
    quick: int = 0
    slow: int = 0


def spanning(plan: Plan, rows: Integers) -> Integers:
    """Return designs that span those of a group: some spread evenly, and those at the ends of each column."""
    some = rows[np.unique(np.linspace(0, len(rows) - 1, min(SAMPLE, len(rows))).astype(np.intp))]
    ends = []
    for column in plan.numbers:
        values = column.at(rows)
        ends += [rows[int(np.argmin(values))], rows[int(np.argmax(values))]]
    return np.unique(np.concatenate([some, np.array(ends, dtype=np.intp)]))


class Work:
    """Function of a block (group, inputs, count) -> (table of shape (results, designs), reasons); picklable."""

    def __init__(self, parts: Sequence[Part], results: Sequence[str]) -> None:
        self.parts = tuple(parts)
        self.results = tuple(results)
        self._pickled: tuple[bytes, str] | None = None

    def __call__(self, block: tuple[int, dict[str, Array], int]) -> Answered:
        """Return the results of the designs of a block, and why some have none."""
        group, inputs, count = block
        part = self.parts[group]
        found = part(inputs, count)
        table = np.full((len(self.results), count), np.nan)
        for place, name in enumerate(self.results):
            if name in found.results:
                table[place] = found.results[name]
        return Answered(table, found.reasons, found.quick, found.slow)

    def prepared(self, plan: Plan, groups: Sequence[tuple[Any, Integers]]) -> Work:
        """Return the work with what speeds it up over the designs of a plan."""
        parts = []
        for part, (_, rows) in zip(self.parts, groups, strict=True):
            function = part.function
            if function is not None and len(rows) >= ENOUGH:
                places = spanning(plan, rows)
                function = function.prepared(plan.inputs(places), len(places))
            parts.append(Part(function, part.target, part.chosen, part.results))
        return Work(parts, self.results)

    def guided(self, quick: Sequence[Any]) -> Work:
        """Return the work with a quick engine for each part that was made earlier (None for none): its guards still hold."""
        parts = [
            Part(None if part.function is None else replace(part.function, quick=engine), part.target, part.chosen, part.results)
            for part, engine in zip(self.parts, quick, strict=True)
        ]
        return Work(parts, self.results)

    def __reduce__(self) -> tuple[Any, ...]:
        if self._pickled is None:
            data = pickle.dumps((self.parts, self.results))
            self._pickled = (data, hashlib.sha256(data).hexdigest())
        return _work, self._pickled


def _work(data: bytes, digest: str) -> Work:
    if digest not in _KEPT:
        parts, results = pickle.loads(data)
        _KEPT[digest] = Work(parts, results)
        while len(_KEPT) > _MOST_KEPT:
            _KEPT.popitem(last=False)
    return _KEPT[digest]


class Blocks(Sequence[tuple[int, dict[str, Array], int]]):
    """The blocks of a plan in order, each made when it is asked for."""

    def __init__(self, plan: Plan, groups: Sequence[tuple[Any, Integers]]) -> None:
        self.plan = plan
        self.groups = groups
        self.places = blocks_of(groups)

    def __len__(self) -> int:
        return len(self.places)

    def __getitem__(self, index: Any) -> Any:
        group, _, _ = self.places[index]
        rows = self.rows(index)
        return group, self.plan.inputs(rows), len(rows)

    def rows(self, index: int) -> Integers:
        """Return the designs of a block."""
        group, first, last = self.places[index]
        return self.groups[group][1][first:last]

    @property
    def sizes(self) -> list[int]:
        """Designs in each block."""
        return [last - first for _, first, last in self.places]
