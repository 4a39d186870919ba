"""What runs in a block of a study: a picklable function that workers rebuild once, not for every block."""

from __future__ import annotations

import hashlib
import pickle
from collections import OrderedDict
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
import numpy.typing as npt

from propkit.errors import PropkitError
from propkit.model import paths
from propkit.model.base import Calculation
from propkit.study.evaluation import ChainFunction
from propkit.study.sweep_plan import Integers, Plan, blocks_of

Array = npt.NDArray[np.float64]

_KEPT: OrderedDict[str, Work] = OrderedDict()
"""Works that this process has unpickled, by digest, so that a worker rebuilds the objects once."""
_MOST_KEPT = 8


@dataclass(frozen=True, slots=True)
class Part:
    """One group of designs: the batch function of its results, or, without one, the object to vary and the choices made."""

    function: ChainFunction | None
    target: Calculation
    chosen: Mapping[str, Any]
    results: tuple[str, ...]

    def __call__(self, inputs: Mapping[str, Array], count: int) -> tuple[dict[str, Array], dict[int, str]]:
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
        return found, reasons


def value_or_nan(made: Calculation, name: str) -> float:
    """Return a result of an object, NaN where this recipe does not have it."""
    try:
        return float(paths.value_of(made, name))
    except (PropkitError, AttributeError, TypeError, ValueError):
        return float("nan")


class Work:
    """Function of a block (group, inputs, count) -> (table of shape (results, designs), reasons); picklable."""

    def __init__(self, parts: Sequence[Part], results: Sequence[str]) -> None:
        self.parts = tuple(parts)
        self.results = tuple(results)
        self._pickled: tuple[bytes, str] | None = None

    def __call__(self, block: tuple[int, dict[str, Array], int]) -> tuple[Array, dict[int, str]]:
        """Return the results of the designs of a block, and why some have none."""
        group, inputs, count = block
        part = self.parts[group]
        found, reasons = part(inputs, count)
        table = np.full((len(self.results), count), np.nan)
        for place, name in enumerate(self.results):
            if name in found:
                table[place] = found[name]
        return table, reasons

    def prepared(self, plan: Plan, groups: Sequence[tuple[Any, Integers]]) -> Work:
        """Return the work with what speeds it up over the designs of a plan."""
        return self

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
