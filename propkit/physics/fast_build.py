"""How the predictor of the quick engine is made: a coarse solution by the damped iteration, refined, then fitted."""

from __future__ import annotations

from typing import Final

import numpy as np

from propkit.physics import equilibrium, expansion
from propkit.physics.arrays import Array
from propkit.physics.fast_flow import (
    Flow,
    Predictor,
    chamber_and_throat,
    exit_guess,
    guesses,
    shifting_exit,
)
from propkit.physics.fast_newton import Kernel, Point, Solved, solve
from propkit.physics.fast_predictor import NODES_PER_TERM, Coordinates, Fit, nodes, terms
from propkit.physics.thermodynamics import SpeciesTable

SEEDS: Final = 10
"""Designs solved by the damped iteration, for each coordinate beyond the first."""

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
    degrees = _degrees(near, 16, 6, fineness)
    at = nodes(int(NODES_PER_TERM * len(terms(degrees))) + 4, near.count)
    b, h, logs = near.back(at, log_pressure[None])
    flow, change = _first_solutions(table, kernel, b, h, logs[0], at)
    good = flow.good & np.isfinite(change)
    if good.mean() < _ENOUGH:
        return None
    values = np.vstack([_unknowns(flow.chamber.solved), _unknowns(flow.throat.solved), (flow.throat.solved.point.log_pressure - logs[0])[None], change[None]])
    first = Fit.of(at[:, good], values[:, good], degrees)
    predictor = Predictor(near, first)
    if log_exit is None:
        return predictor
    return _with_exit(table, kernel, predictor, elements, enthalpy, np.stack([log_pressure, log_exit]), to, fineness)


def _degrees(box: Coordinates, first: int, further: int, fineness: float) -> tuple[int, ...]:
    """Return the degree along each coordinate: the first direction of (atoms, enthalpy) bends most."""
    width = box.high - box.low
    found = []
    for place in range(box.count):
        if place < len(box.directions):
            bend = first if place == 0 else further
            share = min(1.0, (width[place] / 0.5) ** 0.5)
        else:
            bend, share = further, min(1.6, max(0.4, (width[place] / 1.5) ** 0.5))
        found.append(max(2, round(bend * max(share, 0.2) * fineness)))
    return tuple(found)


def _unknowns(found: Solved) -> Array:
    return np.vstack([found.point.potentials, found.point.log_moles, found.point.log_temperature])


def _first_solutions(
    table: SpeciesTable, kernel: Kernel, b: Array, h: Array, log_pressure: Array, at: Array
) -> tuple[Flow, Array]:
    """Return chamber and throat at the nodes, and d ln gamma / d ln p at the throat."""
    seeds = min(len(h), SEEDS * max(1, at.shape[0]))
    rest = equilibrium.solve(table, b[:, :seeds].T, pressure=kernel.reference_pressure * np.exp(log_pressure[:seeds]), enthalpy=h[:seeds])
    throat = expansion.throat(expansion.shifting(table, b[:, :seeds].T, rest))
    assert throat.equilibrium is not None
    fits = []
    for state in (rest, throat.equilibrium):
        fine = (rest.status == 0) & (throat.status == 0)
        values = np.vstack([state.element_potentials.T, np.log(state.gas_moles), np.log(state.temperature), np.log(state.pressure / kernel.reference_pressure) - log_pressure[:seeds]])
        fits.append(Fit.of(at[:, :seeds][:, fine], values[:, fine], (2,) * at.shape[0])(at))
    count = len(b)
    starts = [Point(fit[:count], fit[count], fit[count + 1], log_pressure + fit[count + 2]) for fit in fits]
    starts[0].log_pressure = log_pressure
    flow = chamber_and_throat(kernel, b, h, log_pressure, (starts[0], starts[1], np.zeros(len(h))), whole=True)
    there = flow.throat.solved.point
    nudged = Point(there.potentials, there.log_moles, there.log_temperature, there.log_pressure + _NUDGE)
    other = solve(kernel, b, flow.entropy, nudged, entropy=True)
    change = (np.log(1.0 - flow.throat.turning) - np.log(1.0 - other.turning)) / _NUDGE
    return flow, np.where(other.good, change, np.nan)


def _with_exit(
    table: SpeciesTable, kernel: Kernel, predictor: Predictor, elements: Array, enthalpy: Array, logs: Array, to: str, fineness: float
) -> Predictor | None:
    far = Coordinates.of(elements, enthalpy, logs)
    degrees = _degrees(far, 14, 7, fineness)
    at = nodes(int(NODES_PER_TERM * len(terms(degrees))) + 4, far.count)
    b, h, found = far.back(at, logs)
    guess, _ = guesses(predictor, b, h, found[0])
    flow = chamber_and_throat(kernel, b, h, found[0], guess, whole=True)
    seeds = min(len(h), 2 * SEEDS * max(1, far.count - 1))
    rest = equilibrium.solve(table, b[:, :seeds].T, pressure=kernel.reference_pressure * np.exp(found[0, :seeds]), enthalpy=h[:seeds])
    isentrope = expansion.shifting(table, b[:, :seeds].T, rest)
    if to == "area_ratio":
        throat = expansion.throat(isentrope)
        state = expansion.at_area_ratio(isentrope, throat.mass_flux, np.exp(found[1, :seeds]), throat)
    else:
        state = expansion.at_pressure(isentrope, rest.pressure * np.exp(found[1, :seeds]))
    assert state.equilibrium is not None
    fine = (rest.status == 0) & (state.status == 0)
    if fine.sum() < SEEDS:
        return None
    log_ratio = np.log(state.pressure / rest.pressure)
    values = np.vstack([state.equilibrium.element_potentials.T, np.log(state.equilibrium.gas_moles), np.log(state.temperature), log_ratio])
    coarse = Fit.of(at[:, :seeds][:, fine], values[:, fine], (2,) * far.count)
    rough = Predictor(predictor.near, predictor.first, far, coarse, to)
    start, _ = exit_guess(rough, b, h, found[0], found[1])
    station, good = shifting_exit(kernel, b, flow, start, found[1] if to == "area_ratio" else None, whole=True)
    good &= flow.good
    if good.mean() < _ENOUGH:
        return None
    point = station.solved.point
    values = np.vstack([_unknowns(station.solved), (point.log_pressure - found[0])[None]])
    return Predictor(predictor.near, predictor.first, far, Fit.of(at[:, good], values[:, good], degrees), to)
