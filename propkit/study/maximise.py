"""Optimum: the inputs inside ranges that give the largest or smallest result, within limits on others."""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping, Sequence
from typing import Any

import numpy as np
import numpy.typing as npt
from scipy import optimize

from propkit.errors import InputError, Problem, PropkitError, RangeError
from propkit.model import paths
from propkit.model.base import Calculation
from propkit.model.declare import as_text
from propkit.study.differences import stencil
from propkit.study.evaluation import result_name
from propkit.study.search import Answer, Search, slopes_of
from propkit.study.sweep import target_values

Array = npt.NDArray[np.float64]

_BEND_STEP = 4e-3
"""Share of a range over which second derivatives are taken."""


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
    search = Search(target, tuple(over), over, (result, *limits))
    return _climb(search, list(limits.values()), -1.0 if minimum else 1.0, None)


def _limits(target: Calculation, subject_to: Mapping[str, Sequence[Any]]) -> dict[str, tuple[float, float]]:
    problems: list[Problem] = []
    found = {}
    for name, ends in subject_to.items():
        if isinstance(ends, str) or not isinstance(ends, Sequence) or len(ends) != 2:
            problems.append(Problem(name, as_text(ends), "a pair (low, high), None for no limit"))
            continue
        if all(end is None for end in ends):
            problems.append(
                Problem(name, as_text(ends), "a pair with a limit on one side at least", "Leave the result out if it has none.")
            )
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


def _climb(search: Search, limits: list[tuple[float, float]], sign: float, start: Array | None) -> Answer:
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
    if search.results[0] in search.idle(table):
        notes.append(f"{search.results[0]} does not depend on {', '.join(search.paths)}: every design in the ranges is as good")
    return search.answer(low + best_share * span, reached, notes, search.low, search.high, "the limits cannot be met")


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
        return np.asarray(slopes_of(lambda points: -sign * values(points)[:, :1] / scale, np.clip(share, 0.0, 1.0))[0])

    conditions: Any = []
    if count:
        finite = np.isfinite(np.concatenate([bounds[:, 0], bounds[:, 1]]))

        def left(share: Array) -> Array:
            found: Array = np.asarray(room(values(np.clip(share, 0.0, 1.0)[None, :]))[0])[finite]
            return np.asarray(np.nan_to_num(found, nan=-1e3))

        def left_slope(share: Array) -> Array:
            return slopes_of(lambda points: np.asarray(room(values(points)))[:, finite], np.clip(share, 0.0, 1.0))

        conditions = [{"type": "ineq", "fun": left, "jac": left_slope}]
    found: Any = optimize.minimize(
        loss,
        start,
        jac=slope,
        method="SLSQP",
        bounds=[(0.0, 1.0)] * len(start),
        constraints=conditions,
        options={"ftol": 1e-13, "maxiter": 80},
    )
    best = np.clip(np.asarray(found.x, dtype=np.float64), 0.0, 1.0)
    return best if count else _polished(lambda points: -sign * values(points)[:, :1] / scale, best)


def _polished(loss: Callable[[Array], Array], point: Array) -> Array:
    """Return a minimum of `loss` with Newton steps in each coordinate that bends upward inside the box: its slope vanishes there."""
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
    search = Search(made, tuple(free), free, (result,))
    sign = -1.0 if minimum else 1.0
    try:
        answer = _climb(search, [], sign, search.nominal)
    except PropkitError:
        return made
    before, after = paths.value_of(made, result), paths.value_of(answer.object, result)
    return answer.object if sign * after > sign * before else made
