"""A study: an object over many designs, through the same stages that the object itself uses."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from typing import TYPE_CHECKING, Any

import numpy as np

from propkit import units
from propkit.errors import InputError, Problem, PropkitError
from propkit.model import paths
from propkit.model.base import Calculation, reach
from propkit.model.declare import as_text
from propkit.study.batch import batch_names
from propkit.study.evaluation import ChainFunction, result_name
from propkit.study.executors import Failed, run_blocks
from propkit.study.joint import check_seed
from propkit.study.sweep_plan import QUICK, Plan, read_plan, templates, unit_of, units_of
from propkit.study.sweep_result import StudyResult
from propkit.study.sweep_work import ENOUGH, Blocks, Part, Work

if TYPE_CHECKING:
    import pandas as pd

LARGEST = 100_000_000
"""Designs in one study."""


class Study:
    """An object over a grid or a list of designs: an immutable plan; `run` computes.

    Parameters
    ----------
    target : Calculation
        The object whose results are wanted, usually a `Performance`.
    designs : mapping or DataFrame
        A mapping of paths to lists is a grid, its last path varying fastest; a DataFrame is a list of designs, one column for
        each path. Numbers, texts with units and quantities are equally good; choices (flow, basis, propellants) may vary too.
        Naming one member of a group (`exit_pressure` for `area_ratio`) displaces the others.
    results : sequence of str, optional
        Results wanted, upstream ones with their prefix; every result of the chain by default.

    Raises
    ------
    InputError
        Listing every path that is unknown or ambiguous (with candidates), every empty or ragged column, and every value that
        is not legal.

    Examples
    --------
    >>> import propkit as pk
    >>> gas = pk.Chamber.from_gas(
    ...     pressure="7 MPa", temperature="3500 K", molar_mass="22 g/mol", isentropic_exponent=1.2
    ... )
    >>> nozzle = pk.Nozzle(gas, area_ratio=20, throat_diameter="0.1 m")
    >>> found = pk.Study(pk.Performance(nozzle, ambient="vacuum"), {"nozzle.area_ratio": [10, 20, 40]}).run()
    >>> len(found.frame)
    3
    >>> bool(found.frame["specific_impulse"].is_monotonic_increasing)
    True
    """

    __slots__ = ("_blocks", "_designs", "_plan", "_results", "_target", "_units", "_work")

    _blocks: Blocks
    _designs: Any
    _plan: Plan
    _results: tuple[str, ...] | None
    _target: Calculation
    _units: dict[str, str]
    _work: Work

    def __init__(
        self, target: Calculation, designs: Mapping[str, Sequence[Any]] | pd.DataFrame, results: Sequence[str] | None = None
    ) -> None:
        if not isinstance(target, Calculation):
            raise InputError(Problem("target", as_text(target), "a propkit object, such as a pk.Performance"))
        if results is not None and not len(results):
            raise InputError(Problem("results", as_text(results), "a list of names, one at least", "Leave it out for every result."))
        if isinstance(results, str):
            raise InputError(Problem("results", repr(results), "a list of names", f"Write [{results!r}] for a single one."))
        plan = read_plan(target, designs)
        if plan.count > LARGEST:
            raise InputError(Problem("designs", f"a grid of {plan.count} designs", f"at most {LARGEST} designs"))
        groups = plan.groups()
        made = list(templates(target, plan, groups))
        refused = [found for found in made if isinstance(found, InputError)]
        if len(refused) == len(made):
            raise refused[0]
        names = None if results is None else _wanted(target, made, results)
        parts = [
            _part(target, found if isinstance(found, Calculation) else None, chosen, plan, names)
            for found, (chosen, _) in zip(made, groups, strict=True)
        ]
        every = tuple(dict.fromkeys(name for part in parts for name in part.results)) if names is None else names
        hold = object.__setattr__
        hold(self, "_target", target)
        kept: Any = designs
        hold(self, "_designs", kept.copy() if hasattr(kept, "iloc") else dict(kept))
        hold(self, "_plan", plan)
        hold(self, "_results", names)
        hold(self, "_blocks", Blocks(plan, groups))
        hold(self, "_work", Work(parts, every))
        hold(self, "_units", {column.path: column.unit for column in plan.numbers} | units_of(target, every))

    def __setattr__(self, name: str, value: Any) -> None:
        raise AttributeError("a Study is immutable; make another one")

    def __reduce__(self) -> tuple[Any, ...]:
        return Study, (self._target, self._designs, self._results)

    def __repr__(self) -> str:
        axes = ", ".join(f"{column.path} ({len(column.values)})" for column in self._plan.columns)
        return f"<Study of {self._plan.count} designs over {axes}>"

    @classmethod
    def sample(
        cls,
        target: Calculation,
        ranges: Mapping[str, Sequence[Any]],
        count: int,
        *,
        seed: int,
        results: Sequence[str] | None = None,
    ) -> Study:
        """Return a study over a Latin hypercube: each input is spread evenly over its range, together they fill the box.

        Parameters
        ----------
        target : Calculation
            The object.
        ranges : mapping of str to (low, high) or list of choices
            Range of each number; for a choice the options, each as often as the others.
        count : int
            Number of designs, at least 2.
        seed : int
            Seed of the design, at least 0; required.
        results : sequence of str, optional
            Results wanted; every one by default.

        Raises
        ------
        InputError
            For a range that is none, a count or a seed that is none, and as `Study`.

        Notes
        -----
        Latin hypercube sampling. Source: McKay, Beckman & Conover, Technometrics 21 (1979) 239.
        """
        return cls(target, _hypercube(target, ranges, count, check_seed(seed)), results)

    # -- what it is ------------------------------------------------------------------------------

    @property
    def target(self) -> Calculation:
        """The object whose results are wanted."""
        return self._target

    @property
    def plan(self) -> Plan:
        """The designs."""
        return self._plan

    @property
    def results(self) -> tuple[str, ...]:
        """Names of the results, as columns of the frame."""
        return self._work.results

    @property
    def units(self) -> dict[str, str]:
        """SI unit of every column of the frame that is a number."""
        return dict(self._units)

    def __len__(self) -> int:
        return self._plan.count

    @property
    def one_by_one(self) -> int:
        """Designs whose recipe has no batch form: they are rebuilt one object at a time."""
        return sum(
            len(rows)
            for part, (_, rows) in zip(self._work.parts, self._blocks.groups, strict=True)
            if part.function is None or not part.function.batched
        )

    @property
    def work(self) -> Work:
        """What runs in a block."""
        return self._work

    @property
    def template(self) -> Calculation:
        """The object that the first group of designs is a variation of: every path that varies is one of its given inputs."""
        part = self._work.parts[0]
        return part.target if part.function is None else part.function.template

    # -- the run ---------------------------------------------------------------------------------

    def run(self, executor: Any = None, progress: bool | Callable[[int, int, float], None] = True) -> StudyResult:
        """Return the results at every design.

        Parameters
        ----------
        executor : executor, dask client or None
            Where the blocks run: any ``concurrent.futures`` executor or a ``dask.distributed`` client; threads on the cores of
            this machine by default. The results are the same bit for bit.
        progress : bool or callable
            Whether to show a bar for a run of more than a second; or a callable of (done, total, seconds).

        Returns
        -------
        StudyResult
            Table, best design, exports. A run that is interrupted gives the designs finished so far, and says so.

        Raises
        ------
        InputError
            For an executor that is none.
        """
        return self.run_with(self._work.prepared(self._plan, self._blocks.groups), executor, progress)

    def run_with(self, work: Work, executor: Any = None, progress: bool | Callable[[int, int, float], None] = True) -> StudyResult:
        """Return the results at every design, by a work made ready beforehand (`Work.guided`); else as `run`."""
        count, blocks = self._plan.count, self._blocks
        columns = {name: np.empty(count) for name in work.results}
        done = np.zeros(count, dtype=bool)
        reasons: dict[int, str] = {}
        counts = [0, 0]

        def keep(index: int, answer: Any) -> None:
            rows = blocks.rows(index)
            where: Any = slice(int(rows[0]), int(rows[-1]) + 1) if rows[-1] - rows[0] + 1 == len(rows) else rows
            if isinstance(answer, Failed):
                reasons.update(dict.fromkeys(rows.tolist(), f"the block failed: {type(answer.error).__name__}: {answer.error}"))
                for column in columns.values():
                    column[where] = np.nan
            else:
                for name, values in zip(columns, answer.table, strict=True):
                    columns[name][where] = values
                reasons.update({int(rows[place]): text for place, text in answer.reasons.items()})
                counts[0] += answer.quick
                counts[1] += answer.slow
            done[where] = True

        how = run_blocks(work, blocks, keep, executor=executor, progress=progress, sizes=blocks.sizes, keep_failures=True)
        notes = list(how.notes)
        if self.one_by_one:
            notes.append(f"{self.one_by_one} designs have no batch form and were rebuilt one by one: slower, the same numbers")
        damped = sum(
            len(rows)
            for part, (_, rows) in zip(work.parts, blocks.groups, strict=True)
            if part.function is not None and part.function.batched and part.function.quick is None and len(rows) >= ENOUGH and part.burns
        )
        if damped:
            notes.append(f"the quick engine does not serve {damped} designs (their recipe, or too wide a box): the damped solver took them")
        if counts[0]:
            left = f"{counts[1]} of them" if counts[1] else "none"
            notes.append(f"{QUICK} {counts[0]} designs and left {left} to the damped solver")
        return StudyResult(self, columns, done, reasons, tuple(notes), how.interrupted, how.seconds)

    def panel(self, result: str | None = None, *, limits: Mapping[str, tuple[Any, Any]] | None = None, minimum: bool = False) -> Any:
        """Return the interactive panel: a map or curves, solved anew while sliders move (extra ``notebook``).

        Parameters
        ----------
        result : str, optional
            Result shown first; the first of the object's headline by default.
        limits : mapping of str to (low, high), optional
            Results that must stay inside a range, None for no limit, as for `StudyResult.map`.
        minimum : bool
            Whether the smallest value is the best.
        """
        return reach("study_panel")(self, "" if result is None else _wanted(self._target, [self.template], [result])[0], limits, minimum)


def _wanted(target: Calculation, made: Sequence[Any], names: Sequence[str]) -> tuple[str, ...]:
    """Return results as columns are called; every bad name in one error."""
    objects = [found for found in made if isinstance(found, Calculation)] or [target]
    problems: list[Problem] = []
    found: list[str] = []
    for name in names:
        error: InputError | None = None
        for candidate in objects:
            try:
                found.append(result_name(candidate, name))
                break
            except InputError as refused:
                error = refused
        else:
            assert error is not None
            problems.extend(error.problems or (Problem(str(name), "not understood", "a path of a result", str(error)),))
    if problems:
        raise InputError(problems)
    return tuple(dict.fromkeys(found))


def _part(target: Calculation, template: Calculation | None, chosen: Mapping[str, Any], plan: Plan, names: tuple[str, ...] | None) -> Part:
    """Return how one group of designs is computed: as a batch where that is known to give the object's own numbers."""
    if template is None:
        return Part(None, target, chosen, names if names is not None else _every_result(target, plan))
    known = batch_names(template)
    own = f"{template.kind}."
    varied = {column.path for column in plan.columns}
    batched = tuple(path.removeprefix(own) for path in _in_order(template, known) if path not in varied)
    listed = _every_result(template, plan)
    wanted = names if names is not None else (batched or listed)
    available = {path.removeprefix(own) for path in known} | known
    if not known or (names is not None and not available.issuperset(name for name in names if name in listed)):
        return Part(None, target, chosen, wanted)
    results = tuple(name for name in wanted if name in available)
    paths_varied = tuple(column.path for column in plan.numbers)
    return Part(ChainFunction(template, paths_varied, results), target, chosen, results)


def _in_order(template: Calculation, known: frozenset[str]) -> list[str]:
    """Return the paths of results to be listed: the object's own first, then from the first object of the chain on."""
    own = template.chain()[-1]
    return [
        f"{link.kind}.{name}"
        for link in (own, *template.chain()[:-1])
        for name in (*link.declared_results, *link.resolved(), *link.state_paths())
        if f"{link.kind}.{name}" in known
    ]


def _every_result(template: Calculation, plan: Plan) -> tuple[str, ...]:
    """Return the names of all results of a chain that are numbers."""
    varied = {column.path for column in plan.columns}
    own = template.chain()[-1]
    found = []
    for link in (own, *template.chain()[:-1]):
        for name in (*link.declared_results, *link.resolved(), *link.state_paths()):
            path = f"{link.kind}.{name}"
            if path in varied or not _is_number(link, name):
                continue
            found.append(name if link is own else path)
    return tuple(dict.fromkeys(found))


def _is_number(link: Calculation, name: str) -> bool:
    try:
        return bool(np.isfinite(float(link.si_of(name))))
    except (PropkitError, AttributeError, TypeError, ValueError):
        return False


def _hypercube(target: Calculation, ranges: Mapping[str, Sequence[Any]], count: int, seed: int) -> dict[str, Any] | Any:
    import pandas as pd

    if isinstance(count, bool) or not isinstance(count, int | np.integer) or not 2 <= count <= LARGEST:
        raise InputError(Problem("count", repr(count), f"an integer from 2 to {LARGEST}"))
    if not isinstance(ranges, Mapping) or not ranges:
        raise InputError(
            Problem("ranges", as_text(ranges), "a mapping of paths to ranges", 'For example {"chamber.pressure": ("5 MPa", "9 MPa")}.')
        )
    draw = np.random.default_rng(seed)
    places = np.stack([(draw.permutation(count) + draw.random(count)) / count for _ in ranges], axis=1)
    columns: dict[str, Any] = {}
    problems: list[Problem] = []
    for number, (path, ends) in enumerate(ranges.items()):
        try:
            columns[path] = _spread(target, path, ends, places[:, number])
        except InputError as error:
            problems.extend(error.problems or (Problem(str(path), "not understood", "a path of an input", str(error)),))
    if problems:
        raise InputError(problems)
    return pd.DataFrame(columns)


def _spread(target: Calculation, path: str, ends: Any, share: Any) -> Any:
    read = read_plan(target, {path: list(ends) if isinstance(ends, tuple) else ends}).columns[0]
    if read.is_choice:
        options = np.empty(len(read.options), dtype=object)
        options[:] = list(read.options)
        return options[np.minimum((share * len(options)).astype(int), len(options) - 1)]
    if len(read.values) != 2 or not (np.isfinite(read.values).all() and read.values[0] < read.values[1]):
        raise InputError(Problem(path, as_text(ends), "a pair (low, high) of finite values, the lower first"))
    return read.values[0] + share * (read.values[1] - read.values[0])


def bounds_of(target: Calculation, path: str, ends: Any) -> tuple[str, float, float]:
    """Return whole path and legal range in SI of an input that is to be searched.

    Raises
    ------
    InputError
        For a range that is none, or reaches beyond what is legal.
    """
    try:
        column = read_plan(target, {path: list(ends)}).columns[0]
    except TypeError:
        raise InputError(Problem(path, as_text(ends), "a pair (low, high)")) from None
    if column.is_choice or len(column.values) != 2 or not column.values[0] < column.values[1] or not np.isfinite(column.values).all():
        raise InputError(Problem(path, as_text(ends), "a pair (low, high) of finite values, the lower first"))
    return column.path, float(column.values[0]), float(column.values[1])


def target_values(target: Calculation, wanted: Mapping[str, Any]) -> dict[str, float]:
    """Return wanted values of results in SI by the name of the result."""
    problems: list[Problem] = []
    found = {}
    for name, value in wanted.items():
        try:
            whole = result_name(target, name)
            place = paths.resolve(target, name)
            found[whole] = units.to_si(value, unit_of(target, place.path), whole)
        except InputError as error:
            problems.extend(error.problems or (Problem(str(name), "not understood", "a path of a result", str(error)),))
        except PropkitError as error:
            problems.append(Problem(str(name), "not available", "a result of this recipe", str(error)))
    if problems:
        raise InputError(problems)
    return found
