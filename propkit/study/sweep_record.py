"""A study as the last link of a chain, for its record: what varied, and a stated sample of designs that a reviewer recomputes."""

from __future__ import annotations

import math
from typing import TYPE_CHECKING, Any

import numpy as np

from propkit.errors import InputError, Problem, RecordError
from propkit.study.joint import check_seed
from propkit.study.recorded import Recorded, record_of
from propkit.study.sweep_plan import option_text

if TYPE_CHECKING:
    from propkit.study.sweep_result import StudyResult

AGREEMENT = 1e-8
"""Relative difference up to which the recorded sample must agree with the table of the study."""


class RecordedStudy(Recorded):
    """A sample of a study's designs as a link of a chain."""

    kind = "study"
    title = "Study"
    ordered = ("designs",)
    statement = "The designs listed are a sample of a study; each is computed by the damped solver, and agreed with its table to 1e-8."

    def _make(self, options: dict[str, Any]) -> StudyResult:
        import pandas as pd

        from propkit.study.sweep import Study

        if "designs" not in options:
            raise InputError(Problem("options", "without designs", "the inputs of a study by name"))
        table = pd.DataFrame({path: pd.Series(list(values), dtype=object) for path, values in options["designs"].items()})
        return Study(self._values["target"], table, options.get("results")).run(progress=False)

    def _listed(self, analysis: StudyResult) -> dict[str, tuple[float, str]]:
        numbers = self._values["options"].get("rows", range(len(analysis)))
        units = analysis.units
        return {
            f"design {number} {name}": (float(analysis.values(name)[place]), units[name])
            for place, number in enumerate(numbers)
            for name in analysis.results
        }


def record_of_study(result: StudyResult, *, title: str, author: str, purpose: str, notes: str, sample: int, seed: int) -> Any:
    """Return the record of a study (see `StudyResult.record`).

    Raises
    ------
    InputError
        For a sample or a seed that is none.
    RecordError
        When a design of the sample does not agree with the table of the study.
    """
    if isinstance(sample, bool) or not isinstance(sample, int | np.integer) or not 1 <= sample <= 200:
        raise InputError(Problem("sample", repr(sample), "an integer from 1 to 200"))
    plan = result.plan.plan
    done = np.array([row for row in np.flatnonzero(result._done) if int(row) not in result._reasons], dtype=np.intp)
    if not done.size:
        raise RecordError("no design of the study has a result to record")
    chosen = np.random.default_rng(check_seed(seed)).choice(done, min(int(sample), done.size), replace=False)
    rows = [int(row) for row in np.sort(chosen)]
    designs = [plan.design(row) for row in rows]
    options = {
        "designs": {column.path: [design[column.path] for design in designs] for column in plan.columns},
        "rows": rows,
        "seed": seed,
        "count": len(result),
        "failed": len(result._reasons),
        "axes": [_axis(column) for column in plan.columns],
        "results": list(result.results),
    }
    texts = {"title": title, "author": author, "purpose": purpose, "notes": notes}
    record = record_of(RecordedStudy, result.plan.target, options, texts)
    _agreed(result, rows, record)
    return record


def _axis(column: Any) -> list[Any]:
    if column.is_choice:
        return [column.path, [str(option_text(option)) for option in column.options]]
    return [column.path, float(np.min(column.values)), float(np.max(column.values)), len(np.unique(column.values))]


def _agreed(result: StudyResult, rows: list[int], record: Any) -> None:
    """Refuse a record whose recomputed sample is not what the table of the study says."""
    found = record.calculation._outcome.results
    for row in rows:
        for name in result.results:
            mine, theirs = float(result.values(name)[row]), found.get(f"design {row} {name}", math.nan)
            if math.isfinite(mine) and not abs(mine - theirs) <= AGREEMENT * max(abs(mine), abs(theirs), 1e-3):
                raise RecordError(f"design {row} of the study has {name} {mine!r}, recomputed {theirs!r}: they do not agree")
