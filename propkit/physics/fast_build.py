"""How the predictor of the quick engine is made: a coarse solution by the damped iteration, refined, then fitted."""

from __future__ import annotations

import math
from collections import OrderedDict
from collections.abc import Callable
from typing import Any, Final

import numpy as np

from propkit.physics import equilibrium, expansion, gas_dynamics
from propkit.physics.arrays import Array
from propkit.physics.fast_flow import (
    Flow,
    Predictor,
    as_guessed,
    chamber_and_throat,
    guesses,
    shifting_exit,
)
from propkit.physics.fast_newton import Kernel, Point, Solved, solve
from propkit.physics.fast_predictor import NODES_PER_TERM, Coordinates, Fit, nodes, terms
from propkit.physics.thermodynamics import SpeciesTable

SEEDS_LEAST: Final = 6
"""Designs solved by the damped iteration, beyond 1.4 for each term of a cubic."""

NEAR: Final = (5, 12, 7)
FAR: Final = (5, 7, 5)
"""Pieces and degrees of the polynomials for chamber and throat, and for the exit, over a wide box."""

_WIDE: Final = 0.45
"""Range of the first direction of (atoms, enthalpy), each over its size, that counts as wide."""

_WIDE_LOG: Final = 2.0
_FIRST: Final = (0.02, 0.2, 0.7)
"""First places in ln p of a march along an isentrope, from which the later ones are seen."""

_STRIDE: Final = 1.0
"""Longest step in ln p along an isentrope beyond them."""

_BACK: Final = 4
"""Places passed that the next one is guessed from."""

_NEARLY: Final = 1e-2
"""Largest step of the unknowns at rest on the way; the step itself is still taken."""

_NUDGE: Final = 0.01
_ENOUGH: Final = 0.9


def build(
    table: SpeciesTable,
    kernel: Kernel,
    elements: Array,
    enthalpy: Array,
    log_pressure: Array,
    log_exit: Array | None = None,
    to: str = "area_ratio",
    fineness: float = 1.0,
) -> Predictor | None:
    """Return a predictor over the box of some designs; None where the box has no solutions to fit.

    Parameters
    ----------
    table : SpeciesTable
        All species.
    kernel : Kernel
        The same as the quick engine holds them.
    elements : array
        Moles of atoms of the designs [mol/kg], shape (element, design).
    enthalpy, log_pressure : array
        h [J/kg], and ln of p over the reference pressure.
    log_exit : array, optional
        ln of the area ratio, or of the exit pressure over that at rest.
    to : str
        Which of the two: ``"area_ratio"`` or ``"exit_pressure"``.
    fineness : float
        Factor on the degrees of the polynomials.

    Returns
    -------
    Predictor or None
        The predictor.
    """
    near = Coordinates.of(elements, enthalpy, log_pressure[None])
    first = _kept_first(table, kernel, near, log_pressure, fineness)
    if first is None or log_exit is None:
        return None if first is None else Predictor(near, first)
    further = np.stack([log_pressure, log_exit])
    far = Coordinates.of(elements, enthalpy, further)
    return _with_exit(kernel, Predictor(near, first), far, further, to, fineness)


Start = Callable[[Array, Array, Array], Array]
"""(atoms, enthalpy, further logarithms) -> unknowns with ln of the pressure over that at rest, shape (element + 3, case)."""

_KEPT: OrderedDict[tuple[Any, ...], Fit] = OrderedDict()
_MOST_KEPT: Final = 16


def _kept_first(table: SpeciesTable, kernel: Kernel, near: Coordinates, log_pressure: Array, fineness: float) -> Fit | None:
    """Return the fit of chamber and throat, that of an earlier study where the species and the box are the same to the bit."""
    box = (near.centre, near.directions, near.size, near.low, near.high, near.used, log_pressure[:1])
    key = (table.names, table.coefficients_high.tobytes(), fineness, *(part.tobytes() for part in box))
    found = _KEPT.get(key)
    if found is None:
        coarse = _coarse(table, kernel, near, log_pressure)
        found = None if coarse is None else _first(kernel, near, log_pressure, coarse, fineness)
        if found is not None:
            _KEPT[key] = found
            while len(_KEPT) > _MOST_KEPT:
                _KEPT.popitem(last=False)
    return found


def _few(box: Coordinates) -> Array:
    """Return the nodes of a coarse solution, enough for a cubic."""
    return nodes(SEEDS_LEAST + int(1.4 * len(terms((3,) * box.count))), box.count)


def _coarse(table: SpeciesTable, kernel: Kernel, near: Coordinates, log_pressure: Array) -> tuple[Start, ...] | None:
    """Return cubic first guesses of chamber and throat from a few designs solved by the damped iteration."""
    at = _few(near)
    b, h, logs = near.back(at, log_pressure[None])
    pressure = kernel.reference_pressure * np.exp(logs[0])
    rest = equilibrium.solve(table, b.T, pressure=pressure, enthalpy=h)
    throat = expansion.throat(expansion.shifting(table, b.T, rest))
    assert throat.equilibrium is not None
    fine = (rest.status == 0) & (throat.status == 0)
    found: list[Start] = []
    for state in (rest, throat.equilibrium):
        values = np.vstack(
            [state.element_potentials.T, np.log(state.gas_moles), np.log(state.temperature), np.log(state.pressure / pressure)]
        )
        fit = Fit.of(at[:, fine], values[:, fine], (3,) * near.count)
        if fit is None:
            return None
        found.append(_start(near, fit))
    return tuple(found)


def _coarse_exit(kernel: Kernel, predictor: Predictor, far: Coordinates, further: Array, to: str) -> Start | None:
    """Return a cubic first guess of the exit from a few designs followed from the throat."""
    at = _few(far)
    b, h, logs = far.back(at, further)
    guess, _ = guesses(predictor, b, h, logs[0])
    point = _marched(kernel, b, as_guessed(kernel, b, h, guess), logs, to)
    values = np.vstack([point.potentials, point.log_moles, point.log_temperature, point.log_pressure - logs[0]])
    fine = np.isfinite(values).all(axis=0)
    fit = Fit.of(at[:, fine], values[:, fine], (3,) * far.count)
    return None if fit is None else _start(far, fit)


def _start(box: Coordinates, fit: Fit) -> Start:
    return lambda b, h, logs: fit(box(b, h, logs)[0])


def _first(kernel: Kernel, near: Coordinates, log_pressure: Array, coarse: tuple[Start, ...], fineness: float) -> Fit | None:
    """Return the fit of chamber and throat."""
    pieces, degrees = _shape(near, NEAR, fineness)
    at = nodes(int(NODES_PER_TERM * len(terms(degrees))) + 4, near.count, pieces)
    b, h, logs = near.back(at, log_pressure[None])
    starts = [_point(start(b, h, logs), len(b), logs[0]) for start in coarse[:2]]
    starts[0].log_pressure = logs[0]
    flow = chamber_and_throat(kernel, b, h, logs[0], (starts[0], starts[1], np.zeros(len(h))), coarse=True)
    there = flow.throat.solved.point
    nudged = Point(there.potentials, there.log_moles, there.log_temperature, there.log_pressure + _NUDGE)
    other = solve(kernel, b, flow.entropy, nudged, entropy=True)
    change = (np.log(1.0 - flow.throat.turning) - np.log(1.0 - other.turning)) / _NUDGE
    good = flow.good & other.good & np.isfinite(change)
    if good.mean() < _ENOUGH:
        return None
    fall = there.log_pressure - logs[0]
    values = np.vstack([_unknowns(flow.chamber.solved), _unknowns(flow.throat.solved), fall[None], change[None]])
    return Fit.of(at[:, good], values[:, good], degrees, pieces)


def _shape(box: Coordinates, full: tuple[int, int, int], fineness: float) -> tuple[int, tuple[int, ...]]:
    """Return pieces along the first coordinate, and degrees within a piece, for a box of a size.

    `full` has the pieces for a wide range of the first direction of (atoms, enthalpy), the degree along it within one
    piece, and the degree along everything else.
    """
    if not box.count:
        return 1, ()
    width = box.high - box.low
    found = []
    pieces = 1
    for place in range(box.count):
        if place == 0 and len(box.directions):
            pieces = max(1, min(3 * full[0], round(full[0] * width[0] / _WIDE * fineness)))
            found.append(full[1] if width[0] > 0.1 * _WIDE else max(3, full[1] - 2))
        else:
            share = (width[place] / (_WIDE if place < len(box.directions) else _WIDE_LOG)) ** 0.5
            found.append(max(2, round(full[2] * min(1.5, max(0.4, share)))))
    return pieces, tuple(found)


def _unknowns(found: Solved) -> Array:
    return np.vstack([found.point.potentials, found.point.log_moles, found.point.log_temperature])


def _point(table: Array, elements: int, log_pressure: Array) -> Point:
    return Point(table[:elements], table[elements], table[elements + 1], log_pressure + table[elements + 2])


def _with_exit(kernel: Kernel, predictor: Predictor, far: Coordinates, further: Array, to: str, fineness: float) -> Predictor | None:
    """Return the predictor with the fit of the exit."""
    coarse = _coarse_exit(kernel, predictor, far, further, to)
    if coarse is None:
        return None
    pieces, degrees = _shape(far, FAR, fineness)
    at = nodes(int(NODES_PER_TERM * len(terms(degrees))) + 4, far.count, pieces)
    b, h, logs = far.back(at, further)
    guess, _ = guesses(predictor, b, h, logs[0])
    flow = as_guessed(kernel, b, h, guess)
    start = _point(coarse(b, h, logs), len(b), logs[0])
    if to == "exit_pressure":
        start.log_pressure = logs[0] + logs[1]
    ratio = logs[1] if to == "area_ratio" else None
    station, good = shifting_exit(kernel, b, flow, start, ratio, coarse=True)
    values = np.vstack([_unknowns(station.solved), (station.solved.point.log_pressure - logs[0])[None]])
    left = np.flatnonzero(flow.good & ~good)
    if left.size:
        part = flow.take(left)
        guess_left = _marched(kernel, b[:, left], part, logs[:, left], to)
        again, fine = shifting_exit(kernel, b[:, left], part, guess_left, None if ratio is None else ratio[left], coarse=True)
        values[:, left] = np.vstack([_unknowns(again.solved), (again.solved.point.log_pressure - logs[0, left])[None]])
        good[left] = fine
    good &= flow.good
    if good.mean() < _ENOUGH:
        return None
    last = Fit.of(at[:, good], values[:, good], degrees, pieces)
    return None if last is None else Predictor(predictor.near, predictor.first, far, last, to)


def _marched(kernel: Kernel, b: Array, flow: Flow, logs: Array, to: str) -> Point:
    """Return first guesses of the exit of a few nodes, followed from the throat along the isentrope in short steps."""
    gamma = np.full(len(flow.good), 1.18)
    point = flow.throat.solved.point
    if to == "area_ratio":
        mach = gas_dynamics.mach_from_area_ratio(np.exp(np.maximum(logs[1], 0.0)), gamma, "supersonic")
        fall = np.log(gas_dynamics.pressure_ratio(mach, gamma) / gas_dynamics.pressure_ratio(1.0, gamma))
    else:
        fall = logs[0] + logs[1] - point.log_pressure
    reached = _stepped(kernel, b, flow.entropy, point, fall, _STRIDE, _BACK)
    lost = np.flatnonzero(flow.good & ~np.isfinite(reached.log_pressure))
    if lost.size:
        _put(reached, lost, _stepped(kernel, b[:, lost], flow.entropy[lost], point.take(lost), fall[lost], 0.5 * _STRIDE, 2))
    return reached


def _stepped(kernel: Kernel, b: Array, entropy: Array, start: Point, fall: Array, stride: float, back: int) -> Point:
    """Return the points a fall in ln p below others on their isentropes, step by step."""
    far = max(float(np.abs(fall).max()), _NUDGE)
    first = [place for place in _FIRST if place < far]
    begun = first[-1] if first else 0.0
    passed = [(0.0, start)]
    for place in [*first, *np.linspace(begun, far, 1 + math.ceil((far - begun) / stride))[1:].tolist()]:
        ahead = _ahead(passed[-back:], place)
        ahead.log_pressure = start.log_pressure + place / far * fall
        found = solve(kernel, b, entropy, ahead, entropy=True, rested=_NEARLY)
        passed.append((place, found.point))
    return passed[-1][1]


def _put(points: Point, cases: Any, other: Point) -> None:
    """Overwrite some cases."""
    points.potentials[:, cases] = other.potentials
    for name in ("log_moles", "log_temperature", "log_pressure"):
        getattr(points, name)[cases] = getattr(other, name)


def _ahead(passed: list[tuple[float, Point]], place: float) -> Point:
    """Return a point ahead on the curve through points passed (Lagrange's polynomial)."""
    weights = [math.prod((place - other) / (own - other) for other, _ in passed if other != own) for own, _ in passed]

    def along(name: str) -> Array:
        return np.asarray(sum(weight * getattr(point, name) for weight, (_, point) in zip(weights, passed, strict=True)))

    return Point(along("potentials"), along("log_moles"), along("log_temperature"), along("log_pressure"))
