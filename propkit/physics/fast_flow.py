"""Chamber, throat and exit of a block of designs by the quick engine, with the guards that decide which designs it may keep.

Species are dropped for each block and station where the first guesses say that they are below `NEGLIGIBLE`, and every
species left out is verified on every design afterwards, at its solution. A design outside the box of the predictor, one that does not
come to rest in a few steps, and one where a dropped species turns out to matter are marked, for the caller to solve by the
damped iteration.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any, Final

import numpy as np
import numpy.typing as npt

from propkit.constants import GAS_CONSTANT
from propkit.physics.arrays import Array
from propkit.physics.equilibrium_terms import LOWEST_TEMPERATURE
from propkit.physics.fast_newton import PATIENT, RESTED, STEPS, AtFlux, Kernel, Point, Solved, Sonic, solve
from propkit.physics.fast_predictor import Coordinates, Fit

Truth = npt.NDArray[np.bool_]

NEGLIGIBLE: Final = float(np.log(1e-13))
"""ln of the mole fraction, at the first guess, below which a species is left out of a block's station."""

MATTERS: Final = float(np.log(1e-11))
"""ln of the mole fraction, at the solution, from which a species that was left out sends its design to the damped solver."""


@dataclass(frozen=True, slots=True, eq=False)
class Predictor:
    """First guesses over a box of designs.

    Parameters
    ----------
    near, far : Coordinates
        Coordinates of (atoms, enthalpy, ln p), and of the same with ln of the area ratio or of the exit pressure over p.
    first : Fit
        l, ln N, ln T of the chamber; then those of the throat, ln of its pressure over that at rest, and d ln gamma / d ln p there.
    last : Fit or None
        l, ln N, ln T and ln of the pressure over that at rest at the exit; None where no exit is wanted.
    to : str
        ``"area_ratio"`` or ``"exit_pressure"``.
    """

    near: Coordinates
    first: Fit
    far: Coordinates | None = None
    last: Fit | None = None
    to: str = "area_ratio"


@dataclass(slots=True, eq=False)
class Station:
    """The state of each design at one place, shape (case,), SI; `turning` is d(ln N + ln T)/d ln p at constant entropy."""

    pressure: Array
    temperature: Array
    moles: Array
    enthalpy: Array
    turning: Array
    solved: Solved

    @property
    def exponent(self) -> Array:
        """Isentropic exponent with the composition following."""
        return np.asarray(1.0 / (1.0 - self.turning))

    def take(self, cases: Any) -> Station:
        """Return some designs."""
        s = self.solved
        solved = Solved(s.point.take(cases), s.turning[cases], s.heating[cases], s.heat_capacity[cases], s.good[cases], s.steps[cases])
        return Station(self.pressure[cases], self.temperature[cases], self.moles[cases], self.enthalpy[cases], self.turning[cases], solved)


@dataclass(slots=True, eq=False)
class Flow:
    """Chamber and throat of a block, the entropy, and which designs may be kept."""

    chamber: Station
    throat: Station
    entropy: Array
    good: Truth
    kept: npt.NDArray[np.intp]

    def take(self, cases: Any) -> Flow:
        """Return some designs."""
        return Flow(self.chamber.take(cases), self.throat.take(cases), self.entropy[cases], self.good[cases], self.kept)


def select(kernel: Kernel, points: Point) -> npt.NDArray[np.intp]:
    """Return the species that matter at some of the points."""
    highest = np.fmax.reduce(_log_fractions(kernel, _stride(points)), axis=1)  # a point that is none has no say
    return np.flatnonzero(highest > NEGLIGIBLE)


def _stride(points: Point) -> Point:
    count = points.log_moles.size
    return points if count < 64 else points.take(slice(None, None, max(1, count // 320)))


def _log_fractions(kernel: Kernel, points: Point, species: Any = slice(None)) -> npt.NDArray[np.float32]:
    """Return ln of the mole fraction of species, shape (species, case), in single precision (good to 1e-3)."""
    stacked = points.stacked()
    stacked[kernel.elements] = -points.log_pressure
    intervals = np.searchsorted(kernel.breakpoints, stacked[kernel.elements + 2], side="right")
    single = stacked.astype(np.float32)
    first = int(intervals[0])
    if (intervals == first).all():
        return np.asarray(kernel.single_rows[first, species] @ single)
    logs = np.empty((len(kernel.composition[species]), stacked.shape[1]), dtype=np.float32)
    for number in np.unique(intervals):
        which = np.flatnonzero(intervals == number)
        logs[:, which] = kernel.single_rows[number, species] @ single[:, which]
    return logs


def _verified(kernel: Kernel, kept: npt.NDArray[np.intp], points: Point) -> Truth:
    """Return which designs have no species left out that matters at the solution."""
    count = len(kernel.composition)
    if len(kept) == count:
        return np.ones(points.log_moles.size, dtype=bool)
    left = np.setdiff1d(np.arange(count), kept, assume_unique=True)
    return np.asarray(_log_fractions(kernel, points, left).max(axis=0) < MATTERS)


def _station(
    kernel: Kernel, elements: Array, target: Array, guess: Point, entropy: bool, condition: Any, keep: bool, coarse: bool
) -> tuple[Solved, Truth, npt.NDArray[np.intp]]:
    kept = select(kernel, guess)
    # amounts that are kept are those before the last step
    found = solve(
        kernel.take(kept), elements, target, guess, entropy=entropy, condition=condition, keep_amounts=keep,
        steps=PATIENT if coarse else STEPS, rested=RESTED if keep else None,
    )  # fmt: skip
    inside = np.exp(found.point.log_temperature) > LOWEST_TEMPERATURE
    return found, found.good & inside & (coarse or _verified(kernel, kept, found.point)), kept


def _dot(a: Array, b: Array) -> Array:
    found: Array = np.einsum("ij,ij->j", a, b)
    return found


def at_rest(
    kernel: Kernel, elements: Array, enthalpy: Array, log_pressure: Array, guess: Point, *, keep: bool = False, coarse: bool = False
) -> tuple[Station, Array, Truth, npt.NDArray[np.intp]]:
    """Return the burnt gas at rest, its entropy [J/(kg K)], which designs were found, and the species kept; arguments as below."""
    found, good, kept = _station(kernel, elements, enthalpy, guess, False, None, keep, coarse)
    point = found.point
    temperature, moles = np.exp(point.log_temperature), np.exp(point.log_moles)
    entropy = enthalpy / temperature - GAS_CONSTANT * _dot(point.potentials, elements)
    pressure = kernel.reference_pressure * np.exp(log_pressure)
    return Station(pressure, temperature, moles, enthalpy, found.turning, found), entropy, good, kept


def chamber_and_throat(
    kernel: Kernel,
    elements: Array,
    enthalpy: Array,
    log_pressure: Array,
    guess: tuple[Point, Point, Array],
    *,
    keep: bool = False,
    coarse: bool = False,
) -> Flow:
    """Return chamber and throat from first guesses of both.

    Parameters
    ----------
    kernel : Kernel
        All gas species.
    elements : array
        Moles of atoms [mol/kg], shape (element, case).
    enthalpy, log_pressure : array
        h [J/kg], and ln of p over the reference pressure.
    guess : tuple
        Unknowns at the chamber, at the throat, and d ln gamma / d ln p there.
    keep : bool
        Whether the amounts of the species in the chamber are kept.
    coarse : bool
        Whether the solutions serve a predictor only: more steps are allowed, and species left out are not verified.
    """
    chamber, entropy, good, kept = at_rest(kernel, elements, enthalpy, log_pressure, guess[0], keep=keep, coarse=coarse)
    throat, fine, _ = _station(kernel, elements, entropy, guess[1], True, Sonic(enthalpy, guess[2]), False, coarse)
    return Flow(chamber, _at(kernel, elements, entropy, throat), entropy, good & fine, kept)


def as_guessed(kernel: Kernel, elements: Array, enthalpy: Array, guess: tuple[Point, Point, Array]) -> Flow:
    """Return chamber and throat as they are guessed, for what only needs them nearly."""
    point, count = guess[0], enthalpy.size
    temperature = np.exp(point.log_temperature)
    entropy = enthalpy / temperature - GAS_CONSTANT * _dot(point.potentials, elements)
    blank = np.zeros(count)
    solved = [Solved(part, blank, blank, blank, np.ones(count, dtype=bool), np.zeros(count, dtype=np.intp)) for part in guess[:2]]
    chamber = Station(
        kernel.reference_pressure * np.exp(point.log_pressure), temperature, np.exp(point.log_moles), enthalpy, blank, solved[0]
    )
    throat = _at(kernel, elements, entropy, solved[1])
    return Flow(chamber, throat, entropy, np.isfinite(throat.enthalpy), np.arange(0))


def _at(kernel: Kernel, elements: Array, entropy: Array, found: Solved) -> Station:
    point = found.point
    temperature, moles = np.exp(point.log_temperature), np.exp(point.log_moles)
    enthalpy = temperature * (entropy + GAS_CONSTANT * _dot(point.potentials, elements))
    return Station(kernel.reference_pressure * np.exp(point.log_pressure), temperature, moles, enthalpy, found.turning, found)


def shifting_exit(
    kernel: Kernel, elements: Array, flow: Flow, guess: Point, log_area_ratio: Array | None, *, coarse: bool = False
) -> tuple[Station, Truth]:
    """Return the exit of flow in equilibrium, at an area ratio, or at the pressure of the guess where that is None."""
    condition = None if log_area_ratio is None else _passing(kernel, flow, log_area_ratio)
    found, good, _ = _station(kernel, elements, flow.entropy, guess, True, condition, False, coarse)
    station = _at(kernel, elements, flow.entropy, found)
    fine = good & (station.pressure <= flow.throat.pressure * (1.0 + 1e-9))
    return station, fine


def _passing(kernel: Kernel, flow: Flow, log_area_ratio: Array) -> AtFlux:
    """Return the condition of an area ratio over the throat."""
    throat = flow.throat
    head = np.sqrt(np.maximum(2.0 * (flow.chamber.enthalpy - throat.enthalpy), 0.0))
    thermal = GAS_CONSTANT * throat.moles * throat.temperature
    log_flux = np.log(throat.pressure / kernel.reference_pressure * head / thermal) - log_area_ratio
    return AtFlux(flow.chamber.enthalpy, log_flux)


def nozzle_inlet(
    kernel: Kernel, elements: Array, flow: Flow, guess: Point, log_area_ratio: Array, *, keep: bool = False
) -> tuple[Station, Truth, npt.NDArray[np.intp]]:
    """Return the state of flow in equilibrium at a subsonic area ratio, which designs were found, and the species kept."""
    found, good, kept = _station(kernel, elements, flow.entropy, guess, True, _passing(kernel, flow, log_area_ratio), keep, False)
    station = _at(kernel, elements, flow.entropy, found)
    return station, good & (station.pressure > flow.throat.pressure) & (station.pressure < flow.chamber.pressure), kept


def guesses(predictor: Predictor, elements: Array, enthalpy: Array, log_pressure: Array) -> tuple[tuple[Point, Point, Array], Truth]:
    """Return first guesses of chamber and throat, and which designs lie inside the box."""
    place, inside = predictor.near(elements, enthalpy, log_pressure[None])
    count = len(elements)
    table = predictor.first(place)
    chamber = Point(table[:count], table[count], table[count + 1], log_pressure)
    rest = table[count + 2 :]
    throat = Point(rest[:count], rest[count], rest[count + 1], log_pressure + rest[count + 2])
    return (chamber, throat, rest[count + 3]), inside


def exit_guess(predictor: Predictor, elements: Array, enthalpy: Array, log_pressure: Array, log_exit: Array) -> tuple[Point, Truth]:
    """Return the first guess of the exit, and which designs lie inside the box.

    `log_exit` is ln of the area ratio, or ln of the exit pressure over that at rest.
    """
    assert predictor.far is not None
    assert predictor.last is not None
    place, inside = predictor.far(elements, enthalpy, np.stack([log_pressure, log_exit]))
    count = len(elements)
    table = predictor.last(place)
    pressure = log_pressure + (log_exit if predictor.to == "exit_pressure" else table[count + 2])
    return Point(table[:count], table[count], table[count + 1], pressure), inside
