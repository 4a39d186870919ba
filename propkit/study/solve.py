"""Goal seek: the inputs that give results wanted values, with a plain word about bounds and reach."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from typing import Any

import numpy as np
import numpy.typing as npt
from scipy import optimize

from propkit.errors import InputError, Problem, RangeError
from propkit.model.base import Calculation
from propkit.model.declare import as_text
from propkit.study.search import Answer, Search, slopes_of
from propkit.study.sweep import target_values

Array = npt.NDArray[np.float64]

SCAN = 48
"""Points of the first look at a range."""
REACHED = 1e-9
"""Relative miss of a target that counts as reached."""


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
    search = Search(target, names, given, tuple(wanted))
    goals = np.array(list(target_values(search.target, wanted).values()))
    return _one(search, goals) if len(names) == 1 else _several(search, goals)


def _spaced(low: float, high: float, count: int) -> Array:
    """Return points over a range, evenly in the logarithm where the range is positive and wide."""
    if low > 0.0 and high / low > 4.0:
        points: Array = np.geomspace(low, high, count)
    else:
        points = np.linspace(low, high, count)
    points[0], points[-1] = low, high
    return points


def _one(search: Search, goals: Array) -> Answer:
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
        if search.idle(miss[:, None] + goal) and abs(float(miss[usable][0])) > REACHED * abs(goal):
            return _idle(search, goal)
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


def _bracketed(search: Search, goal: float, points: Array, crossings: Any, ends: tuple[float, float], notes: list[str]) -> Answer:
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
        notes.append(f"the result jumps over the wanted value: it is {search.told(search.results[0], goal + left)} there")
    return search.answer(np.array([root]), reached, notes, np.array([ends[0]]), np.array([ends[1]]))


def _nearest(search: Search, goal: float, best: tuple[Any, Any, tuple[float, float]], notes: list[str]) -> Answer:
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
    name, path = search.results[0], search.paths[0]
    near, first, last = search.told(name, float(search(np.array([[found[1]]]))[0, 0])), *(search.told(path, end) for end in ends)
    notes.insert(
        0,
        f"the target is out of reach: {name} comes no nearer to {search.told(name, goal)} than {near} in the range searched, {first} to {last}",
    )
    return search.answer(np.array([found[1]]), False, notes, np.array([ends[0]]), np.array([ends[1]]))


def _idle(search: Search, goal: float) -> Answer:
    """Return the present design where the result does not depend on what moves."""
    name, point = search.results[0], np.clip(search.nominal, search.low, search.high)
    notes = [f"{name} does not depend on {search.paths[0]}: it cannot become {search.told(name, goal)} that way"]
    return search.answer(point, False, notes, np.full(1, -np.inf), np.full(1, np.inf))


def _several(search: Search, goals: Array) -> Answer:
    """Return the answer for several inputs and wanted values, by bounded least squares on relative misses."""
    low, high = search.first_ranges()
    scale = np.where(goals == 0.0, 1.0, np.abs(goals))
    span = high - low

    def misses(share: Array) -> Array:
        found = (search((low + share * span)[None, :])[0] - goals) / scale
        return np.where(np.isfinite(found), found, 1e3)

    def slopes(share: Array) -> Array:
        return slopes_of(lambda points: (search(low + points * span) - goals) / scale, share)

    start = np.clip((search.nominal - low) / span, 0.0, 1.0)
    found = optimize.least_squares(
        misses, start, jac=slopes, bounds=(0.0, 1.0), xtol=1e-15, ftol=1e-15, gtol=1e-15, x_scale=0.1, max_nfev=200
    )
    left = np.abs(misses(found.x))
    reached = bool((left <= 1e-8).all())
    notes = []
    if not reached:
        told = ", ".join(f"{name} by {100.0 * miss:.3g} %" for name, miss in zip(search.results, left, strict=True) if miss > 1e-8)
        notes.append(f"the targets are out of reach in the range searched: the nearest design misses {told}")
    return search.answer(low + found.x * span, reached, notes, low, high)
