"""Goal seek and optimum: inputs that give wanted results, or the largest result, with a plain word about bounds and reach."""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass, field
from typing import Any

import numpy as np
import numpy.typing as npt
from scipy import optimize

from propkit.errors import InputError, Problem, PropkitError, RangeError
from propkit.model import paths
from propkit.model.base import Calculation, render
from propkit.model.declare import as_text
from propkit.report import Report, Row, Section, UnitSystem
from propkit.study.evaluation import ChainFunction, function_of, result_name, result_quantity, variable
from propkit.study.sweep import bounds_of, target_values

Array = npt.NDArray[np.float64]

SCAN = 48
"""Points of the first look at a range."""
REACHED = 1e-9
"""Relative miss of a target that counts as reached."""
_AT_BOUND = 1e-6
"""Share of a range that counts as on its end."""
_WIDE = 30.0
"""Factor to both sides of the present value in which a solution is looked for first."""
_BEND_STEP = 4e-3
"""Share of a range over which second derivatives are taken."""
_STEP = 2e-4
"""Share of a range over which derivatives are taken."""


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
    kind: str = field(default="answer", repr=False)

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
            title="Answer" if self.reached else "Nearest design: the target is out of reach",
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
        from propkit import units as unit_text

        known = result_quantity(self.object, path)
        unit = known.shown_in(system, (value,))
        return Row(path, f"{known.label} ({path})", known.symbol, unit_text.convert(value, known.unit, unit), unit, known.digits, kind)

    def __str__(self) -> str:
        return str(self.report())

    def _repr_mimebundle_(self, include: Any = None, exclude: Any = None) -> dict[str, Any]:
        return self.report()._repr_mimebundle_(include, exclude)


def solve_for(
    target: Calculation,
    path: str | Sequence[str],
    wanted: Mapping[str, Any],
    *,
    bounds: Mapping[str, Sequence[Any]] | Sequence[Any] | None = None,
) -> Answer:
    """Return the object whose results have wanted values, one input moved for each.

    Parameters
    ----------
    target : Calculation
        The object to start from.
    path : str or sequence of str
        Inputs that may move, as many as there are wanted values.
    wanted : mapping of str to value
        Result -> value: a text with its unit, a quantity, or a number in SI.
    bounds : (low, high) or mapping of path to (low, high), optional
        Where to look; the legal range by default, the present value's surroundings first.

    Returns
    -------
    Answer
        With ``reached`` false where the target is out of reach: then the nearest design, and the notes say so. Of several
        solutions the one nearest to the present value.

    Raises
    ------
    InputError
        For a path or a result that is none, a range that is none, or unequal numbers of inputs and wanted values.
    RangeError
        When no design in the range has these results at all.

    Examples
    --------
    >>> import propkit as pk
    >>> gas = pk.Chamber.from_gas(
    ...     pressure="7 MPa", temperature="3500 K", molar_mass="22 g/mol", isentropic_exponent=1.2
    ... )
    >>> perf = pk.Performance(pk.Nozzle(gas, area_ratio=20, throat_diameter="0.1 m"), ambient="vacuum")
    >>> answer = pk.solve_for(perf, "nozzle.area_ratio", {"nozzle.exit.pressure": "55 kPa"})
    >>> round(answer.nozzle.exit.pressure.to("kPa").magnitude, 6)
    55.0
    """
    names = (path,) if isinstance(path, str) else tuple(path)
    if not isinstance(wanted, Mapping) or len(names) != len(wanted) or not names:
        raise InputError(
            Problem("wanted", f"{len(wanted) if isinstance(wanted, Mapping) else as_text(wanted)} for {len(names)} inputs",
                    "a mapping with as many results as inputs may move", 'For example {"nozzle.exit.pressure": "55 kPa"}.')
        )  # fmt: skip
    given = {names[0]: bounds} if bounds is not None and not isinstance(bounds, Mapping) else dict(bounds or {})
    search = _Search(target, names, given, tuple(wanted))
    goals = np.array(list(target_values(search.target, wanted).values()))
    return _one(search, goals) if len(names) == 1 else _several(search, goals)


class _Search:
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
        self.low, self.high = np.array([ranges.get(path, legal) for path, legal in zip(self.paths, self.legal, strict=True)], dtype=np.float64).T
        self.evaluations = 0

    def __call__(self, points: Array) -> Array:
        """Return results of points, shape (point, result); NaN where there is none."""
        self.evaluations += len(points)
        found = self.function({path: np.ascontiguousarray(points[:, place]) for place, path in enumerate(self.paths)})
        return np.stack([np.asarray(found[name], dtype=np.float64) for name in self.results], axis=1)

    def first_ranges(self) -> tuple[Array, Array]:
        """Return where to look first: the range given, else the surroundings of the present value inside what is legal."""
        size = np.where(self.nominal == 0.0, 1.0, np.abs(self.nominal))
        low = np.where(self.given, self.low, np.maximum(self.legal[:, 0], np.where(self.nominal > 0.0, self.nominal / _WIDE, -_WIDE * size)))
        high = np.where(self.given, self.high, np.minimum(self.legal[:, 1], np.where(self.nominal > 0.0, self.nominal * _WIDE, _WIDE * size)))
        return low, high

    def made(self, point: Array) -> Calculation:
        """Return the object of a point; an assigned enthalpy cannot be put back into a recipe."""
        changed = {path: float(value) for path, value in zip(self.paths, point, strict=True)}
        found: Calculation = self.target.replace(changed)
        return found

    def answer(self, point: Array, reached: bool, notes: list[str], low: Array, high: Array) -> Answer:
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
            kind = "range given" if self.given[place] else "legal range" if (low[place], high[place]) == tuple(self.legal[place]) else "range searched"
            notes.append(f"{path} sits on the {end} end of the {kind}: {point[place]:.6g}")
        results = {name: paths.value_of(made, name) for name in self.results}
        variables = {path: float(value) for path, value in zip(self.paths, point, strict=True)}
        return Answer(made, variables, results, reached, on, tuple(notes), self.evaluations)


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


def _spaced(low: float, high: float, count: int) -> Array:
    """Return points over a range, evenly in the logarithm where the range is positive and wide."""
    if low > 0.0 and high / low > 4.0:
        points: Array = np.geomspace(low, high, count)
    else:
        points = np.linspace(low, high, count)
    points[0], points[-1] = low, high
    return points


def _one(search: _Search, goals: Array) -> Answer:
    """Return the answer for one input and one wanted value: a scan for a change of sign, then Brent's method."""
    goal = float(goals[0])
    low, high = search.first_ranges()
    whole = (np.where(np.isfinite(search.low), search.low, low), np.where(np.isfinite(search.high), search.high, high))
    notes: list[str] = []
    tried: list[tuple[float, float]] = [(float(low[0]), float(high[0]))]
    if not search.given[0] and (float(whole[0][0]), float(whole[1][0])) != tried[0]:
        tried.append((float(whole[0][0]), float(whole[1][0])))
    best = None
    for ends in tried:
        points = _spaced(*ends, SCAN)
        if ends[0] < search.nominal[0] < ends[1]:
            points = np.unique(np.append(points, search.nominal[0]))
        miss = search(points[:, None])[:, 0] - goal
        usable = np.isfinite(miss)
        if usable.any():
            nearest = int(np.nanargmin(np.abs(miss)))
            if best is None or abs(miss[nearest]) < abs(best[1]):
                best = (points[nearest], miss[nearest], ends)
        crossings = np.flatnonzero(usable[:-1] & usable[1:] & (np.sign(miss[:-1]) * np.sign(miss[1:]) <= 0.0))
        if len(crossings):
            return _bracketed(search, goal, points, crossings, ends, notes)
    if best is None:
        raise RangeError(f"no design with {search.paths[0]} from {tried[-1][0]:.6g} to {tried[-1][1]:.6g} has a {search.results[0]}")
    return _nearest(search, goal, best, notes)


def _bracketed(search: _Search, goal: float, points: Array, crossings: Any, ends: tuple[float, float], notes: list[str]) -> Answer:
    middle = 0.5 * (points[crossings] + points[crossings + 1])
    chosen = int(crossings[np.argmin(np.abs(np.log(middle / search.nominal[0])) if (middle > 0).all() and search.nominal[0] > 0.0
                                     else np.abs(middle - search.nominal[0]))])  # fmt: skip

    def miss(x: float) -> float:
        return float(search(np.array([[x]]))[0, 0]) - goal

    root = float(optimize.brentq(miss, points[chosen], points[chosen + 1], xtol=1e-300, rtol=4e-15, maxiter=100))
    if len(crossings) > 1:
        notes.append(f"{len(crossings)} designs in the range have that {search.results[0]}; this is the one nearest to the present value")
    left = miss(root)
    reached = abs(left) <= REACHED * max(abs(goal), 1e-300) or (goal == 0.0 and abs(left) < 1e-6)
    if not reached:
        notes.append(f"the result jumps over the wanted value: it misses it by {left:.3g}")
    return search.answer(np.array([root]), reached, notes, np.array([ends[0]]), np.array([ends[1]]))


def _nearest(search: _Search, goal: float, best: tuple[Any, Any, tuple[float, float]], notes: list[str]) -> Answer:
    point, _, ends = best
    points = _spaced(*ends, SCAN)
    place = int(np.argmin(np.abs(points - point)))
    inner = (float(points[max(place - 1, 0)]), float(points[min(place + 1, len(points) - 1)]))

    def distance(x: float) -> float:
        found = abs(float(search(np.array([[x]]))[0, 0]) - goal)
        return found if math.isfinite(found) else 1e300

    closer = float(optimize.minimize_scalar(distance, bounds=inner, method="bounded", options={"xatol": 1e-7 * (inner[1] - inner[0])}).x)
    found = min((distance(x), x) for x in (closer, float(point), *inner))
    if found[0] <= REACHED * abs(goal):  # a maximum or minimum that just touches the target
        return search.answer(np.array([found[1]]), True, notes, np.array([ends[0]]), np.array([ends[1]]))
    notes.insert(0, f"the target is out of reach: {search.results[0]} comes no nearer to {goal:.6g} than by {found[0]:.4g} in the range searched, {ends[0]:.6g} to {ends[1]:.6g}")
    return search.answer(np.array([found[1]]), False, notes, np.array([ends[0]]), np.array([ends[1]]))


def _several(search: _Search, goals: Array) -> Answer:
    """Return the answer for several inputs and wanted values, by bounded least squares on relative misses."""
    low, high = search.first_ranges()
    scale = np.where(goals == 0.0, 1.0, np.abs(goals))
    span = high - low

    def misses(share: Array) -> Array:
        found = (search((low + share * span)[None, :])[0] - goals) / scale
        return np.where(np.isfinite(found), found, 1e3)

    def slopes(share: Array) -> Array:
        return _slopes(lambda points: (search(low + points * span) - goals) / scale, share)

    start = np.clip((search.nominal - low) / span, 0.0, 1.0)
    found = optimize.least_squares(misses, start, jac=slopes, bounds=(0.0, 1.0), xtol=1e-15, ftol=1e-15, gtol=1e-15, x_scale=0.1, max_nfev=200)
    left = np.abs(misses(found.x))
    reached = bool((left <= 1e-8).all())
    notes = []
    if not reached:
        told = ", ".join(f"{name} by {100.0 * miss:.3g} %" for name, miss in zip(search.results, left, strict=True) if miss > 1e-8)
        notes.append(f"the targets are out of reach in the range searched: the nearest design misses {told}")
    return search.answer(low + found.x * span, reached, notes, low, high)


def _slopes(function: Callable[[Array], Array], point: Array) -> Array:
    """Return derivatives, shape (result, input), by differences of fourth order inside the unit box, in one evaluation."""
    from propkit.study.differences import stencil

    count = len(point)
    around = stencil(point, np.full(count, _STEP), np.zeros(count), np.ones(count))
    table = function(around.points).T
    return np.where(np.isfinite(slopes := around.slopes(table)), slopes, 0.0)


def maximise(
    target: Calculation,
    result: str,
    over: Mapping[str, Sequence[Any]],
    *,
    subject_to: Mapping[str, Sequence[Any]] | None = None,
    minimum: bool = False,
) -> Answer:
    """Return the object with the largest value of a result, inputs varied inside ranges.

    Parameters
    ----------
    target : Calculation
        The object to start from.
    result : str
        What is to be large.
    over : mapping of path to (low, high)
        Inputs that may move, and their ranges.
    subject_to : mapping of result to (low, high), optional
        Results that must stay inside a range; None for no limit on that side.
    minimum : bool
        Whether the smallest value is wanted.

    Returns
    -------
    Answer
        With ``on_bounds`` naming the inputs that sit on an end of their range, and ``reached`` false where no design found
        meets the limits.

    Raises
    ------
    InputError
        For a path, result, range or limit that is none.
    RangeError
        When no design in the ranges has that result.

    Notes
    -----
    A scrambled Sobol design over the box finds the neighbourhood, sequential quadratic programming (Kraft, DFVLR-FB 88-28,
    1988, as in scipy) the optimum; the search is deterministic.
    """
    if not isinstance(over, Mapping) or not over:
        raise InputError(Problem("over", as_text(over), "a mapping of paths to ranges", 'For example {"case.mixture_ratio": (2, 4)}.'))
    limits = _limits(target, subject_to or {})
    search = _Search(target, tuple(over), over, (result, *limits))
    return _climb(search, list(limits.values()), -1.0 if minimum else 1.0, None)


def _limits(target: Calculation, subject_to: Mapping[str, Sequence[Any]]) -> dict[str, tuple[float, float]]:
    problems: list[Problem] = []
    found = {}
    for name, ends in subject_to.items():
        if isinstance(ends, str) or not isinstance(ends, Sequence) or len(ends) != 2:
            problems.append(Problem(name, as_text(ends), "a pair (low, high), None for no limit"))
            continue
        read = [target_values(target, {name: end}) if end is not None else None for end in ends]
        whole = result_name(target, name)
        low, high = (-math.inf if read[0] is None else read[0][whole]), (math.inf if read[1] is None else read[1][whole])
        if low > high:
            problems.append(Problem(name, as_text(ends), "a pair (low, high), the lower first"))
        found[whole] = (low, high)
    if problems:
        raise InputError(problems)
    return found


def _climb(search: _Search, limits: list[tuple[float, float]], sign: float, start: Array | None) -> Answer:
    low, span = search.low, search.high - search.low
    bounds = np.array(limits, dtype=np.float64).reshape(-1, 2)
    size = np.array([max(abs(end) for end in pair if math.isfinite(end)) or 1.0 for pair in limits])

    def values(shares: Array) -> Array:
        return search(low + shares * span)

    def room(found: Array) -> Array:
        """Return how far each limit is away, over its size, shape (point, 2 limits); negative where it is broken."""
        rest = found[:, 1:]
        return np.concatenate([(rest - bounds[:, 0]) / size, (bounds[:, 1] - rest) / size], axis=1)

    shares = _first_look(len(search.paths)) if start is None else ((start - low) / span)[None, :]
    if start is None:
        shares = np.vstack([shares, np.clip((search.nominal - low) / span, 0.0, 1.0)])
    table = values(shares)
    usable = np.isfinite(table).all(axis=1)
    if not usable.any():
        raise RangeError(f"no design in the ranges has a {search.results[0]}", evaluations=search.evaluations)
    broken = np.where(usable, np.maximum(-np.nan_to_num(room(table), posinf=1.0, neginf=-1e3), 0.0).max(axis=1, initial=0.0), np.inf)
    order = np.lexsort((np.where(usable, -sign * table[:, 0], np.inf), np.round(broken, 9)))
    scale = max(float(np.ptp(table[usable, 0])), 1e-6 * abs(float(table[order[0], 0])), 1e-300)
    best_share, best = shares[order[0]], table[order[0]]
    for first in order[: 3 if start is None else 1]:
        found = _local(values, room, shares[first], sign, scale, len(limits), bounds)
        row = values(found[None, :])[0]
        if not np.isfinite(row).all():
            continue
        fine = float(np.min(room(row[None, :]), initial=np.inf)) >= -1e-7
        was_fine = float(np.min(room(best[None, :]), initial=np.inf)) >= -1e-7
        if (fine and not was_fine) or (fine == was_fine and sign * row[0] > sign * best[0]):
            best_share, best = found, row
    reached = float(np.min(room(best[None, :]), initial=np.inf)) >= -1e-6
    notes = [] if reached else ["no design in the ranges meets every limit; this one breaks them least"]
    return search.answer(low + best_share * span, reached, notes, search.low, search.high)


def _first_look(count: int) -> Array:
    from scipy.stats import qmc

    if count == 1:
        return np.linspace(0.0, 1.0, 33)[:, None]
    inside: Array = qmc.Sobol(count, scramble=False).random_base2(min(7 + count // 2, 10))
    return inside


def _local(values: Any, room: Any, start: Array, sign: float, scale: float, count: int, bounds: Array) -> Array:
    """Return where sequential quadratic programming leads from a start, in shares of the ranges."""

    def loss(share: Array) -> float:
        found = float(values(np.clip(share, 0.0, 1.0)[None, :])[0, 0])
        return -sign * found / scale if math.isfinite(found) else 1e6

    def slope(share: Array) -> Array:
        return np.asarray(_slopes(lambda points: -sign * values(points)[:, :1] / scale, np.clip(share, 0.0, 1.0))[0])

    conditions: Any = []
    if count:
        finite = np.isfinite(np.concatenate([bounds[:, 0], bounds[:, 1]]))

        def left(share: Array) -> Array:
            found: Array = np.asarray(room(values(np.clip(share, 0.0, 1.0)[None, :]))[0])[finite]
            return np.asarray(np.nan_to_num(found, nan=-1e3))

        def left_slope(share: Array) -> Array:
            return _slopes(lambda points: np.asarray(room(values(points)))[:, finite], np.clip(share, 0.0, 1.0))

        conditions = [{"type": "ineq", "fun": left, "jac": left_slope}]
    found: Any = optimize.minimize(
        loss, start, jac=slope, method="SLSQP", bounds=[(0.0, 1.0)] * len(start), constraints=conditions, options={"ftol": 1e-13, "maxiter": 80}
    )
    best = np.clip(np.asarray(found.x, dtype=np.float64), 0.0, 1.0)
    return best if count else _polished(lambda points: -sign * values(points)[:, :1] / scale, best)


def _polished(loss: Callable[[Array], Array], point: Array) -> Array:
    """Return a minimum of `loss` with Newton steps in each coordinate that bends upward inside the box: its slope vanishes there."""
    from propkit.study.differences import stencil

    count = len(point)
    for _ in range(3):
        around = stencil(point, np.full(count, _BEND_STEP), np.zeros(count), np.ones(count))
        table = loss(around.points).T
        slopes, bends = around.slopes(table)[0], around.bends(table)[0]
        inside = (point > 0.0) & (point < 1.0) & np.isfinite(slopes) & (bends > 0.0)
        step = np.where(inside, -slopes / np.where(bends > 0.0, bends, 1.0), 0.0)
        point = np.clip(point + np.clip(step, -_BEND_STEP, _BEND_STEP), 0.0, 1.0)
    return point


def refined(made: Calculation, result: str, free: Mapping[str, tuple[float, float]], minimum: bool) -> Calculation:
    """Return the best object near one that is the best of a study; that object itself where the search finds none better."""
    free = {path: ends for path, ends in free.items() if not path.endswith((".oxidizer.enthalpy", ".fuel.enthalpy"))}
    if not free:
        return made
    search = _Search(made, tuple(free), free, (result,))
    sign = -1.0 if minimum else 1.0
    try:
        answer = _climb(search, [], sign, search.nominal)
    except PropkitError:
        return made
    before, after = paths.value_of(made, result), paths.value_of(answer.object, result)
    return answer.object if sign * after > sign * before else made
