"""Throat and area ratio of flow in equilibrium where liquids and solids may form, melt or vanish on the way.

The sound speed jumps where a phase appears or goes, so Mach 1 may be passed in a jump: the largest mass flux is then at
the boundary itself. Every question is answered by a bracket in ln p, narrowed by Newton's step where that behaves and by
halving where it does not; the throat is the largest of all crossings found by a scan.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace
from typing import TYPE_CHECKING, Final

import numpy as np
import numpy.typing as npt

from propkit.physics import equilibrium, gas_dynamics
from propkit.physics.arrays import Array
from propkit.physics.equilibrium import CONVERGED, NOT_CONVERGED, OUT_OF_RANGE
from propkit.physics.equilibrium_terms import Integers
from propkit.physics.expansion_state import FlowState, choose

if TYPE_CHECKING:
    from propkit.physics.expansion_shifting import Shifting

_SCAN: Final = np.log(np.linspace(0.84, 0.38, 20))
"""ln of pressure over stagnation pressure looked at for the throat, falling."""

_STEPS: Final = 120
_ZERO: Final = 4e-13
_NARROW: Final = 2e-13
_MISSED: Final = 1e-9
_LOWEST_EXPONENT: Final = 1.02
_SLOWEST: Final = 1e-9

Question = Callable[[FlowState, Integers], tuple[Array, Array]]
"""(state, cases) -> (value, slope with ln p); the value is above zero at the low end of the bracket."""


def throat(isentrope: Shifting) -> FlowState:
    """Return the state of largest mass flux, from a scan and a bracket around every passage of Mach 1.

    Parameters
    ----------
    isentrope : Shifting
        The flow.

    Returns
    -------
    FlowState
        The throat. Where Mach 1 is passed in a jump this is the upstream side of it.
    """
    cases, points = isentrope.pressure.size, _SCAN.size
    rows = np.repeat(np.arange(cases), points)
    logs = np.log(isentrope.pressure)[:, None] + _SCAN
    states = isentrope.take(rows).at_pressure(np.exp(logs.ravel()))
    mach, flux = (part.reshape(cases, points) for part in (states.mach, states.mass_flux))
    with np.errstate(invalid="ignore"):
        crossing = (mach[:, :-1] < 1.0) & (mach[:, 1:] >= 1.0)
    best = None
    for number in range(int(crossing.sum(axis=1).max(initial=0))):
        here = (np.cumsum(crossing, axis=1) == number + 1) & crossing
        found_here = here.any(axis=1)
        place = here.argmax(axis=1)
        index = np.arange(cases)
        candidate = _root(isentrope, _sonic, logs[index, place + 1], logs[index, place], np.flatnonzero(found_here))
        best = candidate if best is None else choose_better(best, candidate, found_here)
    if best is None:
        best = isentrope.at_pressure(np.exp(logs[:, points // 2]))
    with np.errstate(invalid="ignore"):
        good = crossing.any(axis=1) & (best.mass_flux >= np.nanmax(flux, axis=1) * (1.0 - _MISSED))
    return replace(best, status=np.where(good | (best.status != CONVERGED), best.status, NOT_CONVERGED))


def choose_better(first: FlowState, second: FlowState, where: npt.NDArray[np.bool_]) -> FlowState:
    """Return `first` with the cases of `where` taken from `second` if their mass flux is larger there."""
    with np.errstate(invalid="ignore"):
        better = where & (second.mass_flux > first.mass_flux)
    return chosen(first, second, better)


def at_mass_flux(isentrope: Shifting, mass_flux: Array, at_throat: FlowState, supersonic: bool) -> FlowState:
    """Return the state at a mass flux on one side of the throat.

    Parameters
    ----------
    isentrope : Shifting
        The flow.
    mass_flux : array
        rho u [kg/(m2 s)].
    at_throat : FlowState
        The throat.
    supersonic : bool
        Which side of the throat.

    Returns
    -------
    FlowState
        The state; status 2 where the throat passes less.
    """
    with np.errstate(divide="ignore", invalid="ignore"):
        ratio = at_throat.mass_flux / mass_flux
    good = np.isfinite(ratio) & (ratio >= 1.0 - 1e-12)
    at_one = good & (ratio <= 1.0 + 1e-12)
    gamma = np.maximum(at_throat.isentropic_exponent, _LOWEST_EXPONENT)
    branch: gas_dynamics.Branch = "supersonic" if supersonic else "subsonic"
    mach = gas_dynamics.mach_from_area_ratio(np.where(good, np.maximum(ratio, 1.0), 1.0), np.where(good, gamma, 1.2), branch)
    middle = np.log(at_throat.pressure)
    guess = middle + np.log(gas_dynamics.pressure_ratio(mach, gamma) / gas_dynamics.pressure_ratio(1.0, gamma))
    goal = np.log(np.where(good, mass_flux, 1.0))
    rows = np.flatnonzero(good & ~at_one)
    if supersonic:
        low, high = _below(isentrope, guess, goal, rows), middle
    else:
        low, high = middle, np.log(isentrope.pressure) + np.log1p(-_SLOWEST / np.maximum(ratio, 1.0) ** 2)
        guess = np.minimum(guess, high)
    sign = -1.0 if supersonic else 1.0

    def question(state: FlowState, cases: Integers) -> tuple[Array, Array]:
        slope = (1.0 - 1.0 / state.mach**2) / state.isentropic_exponent
        return sign * (np.log(state.mass_flux) - goal[cases]), sign * slope

    found = chosen(_root(isentrope, question, low, high, rows, guess), at_throat, at_one)
    return replace(found, status=np.where(good, found.status, OUT_OF_RANGE))


def _sonic(state: FlowState, cases: Integers) -> tuple[Array, Array]:
    """Return ln M^2 and its slope, the change of the isentropic exponent left out of the slope."""
    g = state.isentropic_exponent
    return 2.0 * np.log(state.mach), -2.0 / (g * state.mach**2) - (g - 1.0) / g


def _below(isentrope: Shifting, guess: Array, goal: Array, rows: Integers) -> Array:
    """Return ln p low enough that the mass flux is below its goal."""
    low = guess - 0.3
    left = rows
    for _ in range(30):
        if not left.size:
            break
        flux = isentrope.take(left).at_pressure(np.exp(low[left])).mass_flux
        left = left[np.log(flux) > goal[left]]
        low[left] -= 0.7
    return low


def _root(isentrope: Shifting, question: Question, low: Array, high: Array, rows: Integers, guess: Array | None = None) -> FlowState:
    """Return the state at which a question is answered, for the cases in `rows`; the others are left at the high end."""
    low, high = low.copy(), high.copy()
    x = 0.5 * (low + high) if guess is None else np.clip(guess, low, high)
    result = np.where(np.isfinite(high), high, np.log(isentrope.pressure))
    before = np.full(x.shape, np.inf)
    left, near = rows, None
    settled = np.ones(x.shape, dtype=bool)
    settled[rows] = False
    for _ in range(_STEPS):
        if not left.size:
            break
        state = isentrope.take(left).at_pressure(np.exp(x[left]), near)
        with np.errstate(divide="ignore", invalid="ignore"):
            value, slope = question(state, left)
            newton = x[left] - value / slope
        low[left] = np.where(value > 0.0, x[left], low[left])
        high[left] = np.where(value > 0.0, high[left], x[left])
        halving = 0.5 * (low[left] + high[left])
        good = (newton > low[left]) & (newton < high[left]) & (np.abs(value) < 0.5 * before[left])
        solved = np.abs(value) < _ZERO
        narrow = high[left] - low[left] < _NARROW * np.maximum(1.0, np.abs(x[left]))
        broken = ~np.isfinite(value)
        result[left] = np.where(solved, x[left], high[left])
        settled[left] = (solved | narrow) & ~broken
        before[left] = np.abs(value)
        x[left] = np.where(good, newton, halving)
        keep = ~(solved | narrow | broken)
        left, near = left[keep], state.take(keep)
    found = isentrope.at_pressure(np.exp(result))
    return replace(found, status=np.where(settled, found.status, np.where(found.status == CONVERGED, NOT_CONVERGED, found.status)))


def chosen(first: FlowState, second: FlowState, where: npt.NDArray[np.bool_]) -> FlowState:
    """Return `first` with the cases of `where` taken from `second`, the equilibrium included."""
    if not where.any():
        return first
    merged = choose(first, second, where)
    if first.equilibrium is None or second.equilibrium is None:
        return merged
    return replace(merged, equilibrium=equilibrium.choose(first.equilibrium, second.equilibrium, where))
