"""How the predictor of the quick engine is made: a coarse solution by the damped iteration, refined, then fitted."""

from __future__ import annotations

from typing import Final

import numpy as np

from propkit.physics import equilibrium, expansion, gas_dynamics
from propkit.physics.arrays import Array
from propkit.physics.equilibrium_newton import Integers
from propkit.physics.fast_flow import (
    Flow,
    Predictor,
    chamber_and_throat,
    guesses,
    shifting_exit,
)
from propkit.physics.fast_newton import Kernel, Point, Solved, solve
from propkit.physics.fast_predictor import NODES_PER_TERM, Coordinates, Fit, nodes, terms
from propkit.physics.thermodynamics import SpeciesTable

SEEDS: Final = 5
"""Designs solved by the damped iteration, for each coordinate."""

MARCHED: Final = 10
"""Designs followed along their isentrope to the exit, for each coordinate."""

NEAR: Final = (3, 8, 5)
FAR: Final = (5, 7, 5)
"""Pieces and degrees of the polynomials for chamber and throat, and for the exit, over a wide box."""

_WIDE: Final = 0.45
"""Range of the first direction of (atoms, enthalpy), each over its size, that counts as wide."""

_WIDE_LOG: Final = 2.0
_STRIDE: Final = 0.5
"""Longest step in ln p along an isentrope."""

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
    pieces, degrees = _shape(near, NEAR, fineness)
    at = nodes(int(NODES_PER_TERM * len(terms(degrees))) + 4, near.count, pieces)
    b, h, logs = near.back(at, log_pressure[None])
    made = _first_solutions(table, kernel, b, h, logs[0], at)
    if made is None:
        return None
    flow, change = made
    good = flow.good & np.isfinite(change)
    if good.mean() < _ENOUGH:
        return None
    fall = flow.throat.solved.point.log_pressure - logs[0]
    values = np.vstack([_unknowns(flow.chamber.solved), _unknowns(flow.throat.solved), fall[None], change[None]])
    first = Fit.of(at[:, good], values[:, good], degrees, pieces)
    if first is None:
        return None
    predictor = Predictor(near, first)
    if log_exit is None:
        return predictor
    return _with_exit(kernel, predictor, elements, enthalpy, np.stack([log_pressure, log_exit]), to, fineness)


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


def _first_solutions(
    table: SpeciesTable, kernel: Kernel, b: Array, h: Array, log_pressure: Array, at: Array
) -> tuple[Flow, Array] | None:
    """Return chamber and throat at the nodes, and d ln gamma / d ln p at the throat, from a coarse damped solution."""
    some = _spread(len(h), SEEDS * max(1, at.shape[0]))
    pressure = kernel.reference_pressure * np.exp(log_pressure[some])
    rest = equilibrium.solve(table, b[:, some].T, pressure=pressure, enthalpy=h[some])
    throat = expansion.throat(expansion.shifting(table, b[:, some].T, rest))
    assert throat.equilibrium is not None
    fine = (rest.status == 0) & (throat.status == 0)
    starts = []
    for state in (rest, throat.equilibrium):
        fall = np.log(state.pressure / pressure)
        values = np.vstack([state.element_potentials.T, np.log(state.gas_moles), np.log(state.temperature), fall])
        fit = Fit.of(at[:, some][:, fine], values[:, fine], (2,) * at.shape[0])
        if fit is None:
            return None
        starts.append(_point(fit(at), len(b), log_pressure))
    flow = chamber_and_throat(kernel, b, h, log_pressure, (starts[0], starts[1], np.zeros(len(h))), whole=True)
    there = flow.throat.solved.point
    nudged = Point(there.potentials, there.log_moles, there.log_temperature, there.log_pressure + _NUDGE)
    other = solve(kernel, b, flow.entropy, nudged, entropy=True)
    change = (np.log(1.0 - flow.throat.turning) - np.log(1.0 - other.turning)) / _NUDGE
    return flow, np.where(other.good, change, np.nan)


def _spread(count: int, wanted: int) -> Integers:
    return np.unique(np.linspace(0, count - 1, min(count, wanted)).astype(np.intp))


def _point(table: Array, elements: int, log_pressure: Array) -> Point:
    return Point(table[:elements], table[elements], table[elements + 1], log_pressure + table[elements + 2])


def _with_exit(
    kernel: Kernel, predictor: Predictor, elements: Array, enthalpy: Array, logs: Array, to: str, fineness: float
) -> Predictor | None:
    far = Coordinates.of(elements, enthalpy, logs)
    pieces, degrees = _shape(far, FAR, fineness)
    at = nodes(int(NODES_PER_TERM * len(terms(degrees))) + 4, far.count, pieces)
    b, h, found = far.back(at, logs)
    guess, _ = guesses(predictor, b, h, found[0])
    flow = chamber_and_throat(kernel, b, h, found[0], guess, whole=True)
    start = _marched(kernel, b, flow, found, to, at)
    if start is None:
        return None
    station, good = shifting_exit(kernel, b, flow, start, found[1] if to == "area_ratio" else None, whole=True)
    good &= flow.good
    if good.mean() < _ENOUGH:
        return None
    values = np.vstack([_unknowns(station.solved), (station.solved.point.log_pressure - found[0])[None]])
    last = Fit.of(at[:, good], values[:, good], degrees, pieces)
    return None if last is None else Predictor(predictor.near, predictor.first, far, last, to)


def _ahead(before: Point, here: Point, share: float) -> Point:
    """Return a point further along the line from `before` through `here`."""
    return Point(
        here.potentials + share * (here.potentials - before.potentials),
        here.log_moles + share * (here.log_moles - before.log_moles),
        here.log_temperature + share * (here.log_temperature - before.log_temperature),
        here.log_pressure,
    )


def _marched(kernel: Kernel, b: Array, flow: Flow, logs: Array, to: str, at: Array) -> Point | None:
    """Return first guesses of the exit at the nodes: some nodes are followed from the throat along the isentrope, the rest fitted."""
    some = _spread(at.shape[1], MARCHED * max(1, at.shape[0]))
    good = flow.good[some]
    throat = flow.throat
    gamma = np.clip(throat.exponent[some], 1.05, 1.6)
    point = throat.solved.point.take(some)
    if to == "area_ratio":
        mach = gas_dynamics.mach_from_area_ratio(np.exp(np.maximum(logs[1, some], 0.0)), gamma, "supersonic")
        fall = np.log(gas_dynamics.pressure_ratio(mach, gamma) / gas_dynamics.pressure_ratio(1.0, gamma))
    else:
        fall = logs[0, some] + logs[1, some] - point.log_pressure
    b, entropy = b[:, some], flow.entropy[some]
    first = _NUDGE / max(float(np.abs(fall).max()), _NUDGE)
    shares = np.concatenate([[first], np.full(steps := int(np.ceil(np.abs(fall).max() / _STRIDE)), (1.0 - first) / steps)])
    before, last = point, first
    for number, share in enumerate(shares):
        ahead = _ahead(before, point, 0.0 if number == 0 else share / last)
        ahead.log_pressure = point.log_pressure + share * fall
        found = solve(kernel, b, entropy, ahead, entropy=True)
        good &= found.good
        before, point, last = point, found.point, share
    values = np.vstack([point.potentials, point.log_moles, point.log_temperature, point.log_pressure - logs[0, some]])
    fit = Fit.of(at[:, some][:, good], values[:, good], (2,) * at.shape[0])
    if fit is None:
        return None
    start = _point(fit(at), len(b), logs[0])
    if to == "exit_pressure":
        start.log_pressure = logs[0] + logs[1]
    return start
