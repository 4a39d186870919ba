"""Chambers of finite contraction ratio by the quick engine: the same conservation laws as `propkit.physics.combustor`.

The stagnation pressure at the nozzle inlet is corrected by the pressure quoted over the one found, which hardly depends on it; each
round starts from the solution before.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final

import numpy as np
import numpy.typing as npt

from propkit.constants import GAS_CONSTANT
from propkit.physics import combustor
from propkit.physics.arrays import Array
from propkit.physics.fast_flow import (
    Flow,
    Predictor,
    Station,
    Truth,
    at_rest,
    chamber_and_throat,
    guesses,
    nozzle_inlet,
)
from propkit.physics.fast_newton import Kernel, Point

TYPICAL_EXPONENT: Final = 1.18
"""Isentropic exponent of the first guess of the stagnation pressure."""

_ROUNDS: Final = 8
_SETTLED: Final = 1e-12
_ACCEPTED: Final = 1e-11


@dataclass(slots=True, eq=False)
class Contracted:
    """Chamber of a block: at rest at the face, flowing at the nozzle inlet, at rest there; `kept` are the species of `inlet`."""

    face: Station
    face_entropy: Array
    inlet: Station
    inlet_velocity: Array
    flow: Flow
    log_pressure: Array
    good: Truth
    kept: npt.NDArray[np.intp]


def typical_pressures(pressure: Array, contraction_ratio: Array, pressure_at: str) -> tuple[Array, Array]:
    """Return pressures near those at the face and at rest at the nozzle inlet [Pa]."""
    return combustor.constant_property_pressures(pressure, TYPICAL_EXPONENT, contraction_ratio, pressure_at)


def contracted(
    kernel: Kernel,
    predictor: Predictor,
    elements: Array,
    enthalpy: Array,
    pressure: Array,
    contraction_ratio: Array,
    pressure_at: str,
    *,
    keep: bool = False,
) -> Contracted:
    """Return chambers of finite contraction ratio.

    Parameters
    ----------
    kernel, predictor
        Species, and first guesses over the box.
    elements : array
        Moles of atoms [mol/kg], shape (element, case).
    enthalpy, pressure, contraction_ratio : array
        h [J/kg], quoted pressure [Pa], chamber area over throat area [1].
    pressure_at : str
        Where the quoted pressure holds, one of `propkit.physics.combustor.PRESSURES`.
    keep : bool
        Whether the amounts of the species at the nozzle inlet are kept.

    Returns
    -------
    Contracted
        The states; `good` says which designs may be kept.
    """
    log_ratio, reference = np.log(contraction_ratio), kernel.reference_pressure
    p0 = typical_pressures(pressure, contraction_ratio, pressure_at)[1]
    place = _share(p0, contraction_ratio)
    before: tuple[Flow, Station] | None = None
    for _ in range(_ROUNDS):
        log_p0 = np.log(p0 / reference)
        guess, inside = guesses(predictor, elements, enthalpy, log_p0)
        flow = chamber_and_throat(kernel, elements, enthalpy, log_p0, guess)
        near = _between(flow, place) if before is None else _carried(*before, flow)
        inlet, fine, kept = nozzle_inlet(kernel, elements, flow, near, log_ratio, keep=keep)
        throat = flow.throat
        flux = (
            throat.pressure
            / (GAS_CONSTANT * throat.moles * throat.temperature)
            * np.sqrt(2.0 * np.maximum(enthalpy - throat.enthalpy, 0.0))
        )
        density = inlet.pressure / (GAS_CONSTANT * inlet.moles * inlet.temperature)
        velocity = flux / contraction_ratio / density
        face = inlet.pressure + density * velocity**2
        found = {"injector": face, "nozzle stagnation": p0, "nozzle inlet static": inlet.pressure}[pressure_at]
        error = pressure / found
        miss = np.abs(error - 1.0)
        if not (miss > _SETTLED).any():
            break
        usable = np.isfinite(error)
        step = np.where(usable, np.log(np.where(usable, error, 1.0)), 0.0)
        p0 = p0 * np.exp(step)
        before = flow, inlet
    good = inside & flow.good & fine & (miss <= _ACCEPTED)
    at_face = pressure if pressure_at == "injector" else np.where(good, face, p0)
    log_face = np.log(at_face / reference)
    first, there = guesses(predictor, elements, enthalpy, log_face)
    rest, entropy, solved, _ = at_rest(kernel, elements, enthalpy, log_face, first[0])
    return Contracted(rest, entropy, inlet, velocity, flow, log_p0, good & there & solved, kept)


def _share(p0: Array, contraction_ratio: Array) -> Array:
    """Return how far the nozzle inlet lies from rest to throat, in ln p."""
    _, static = combustor.constant_property_pressures(np.ones_like(p0), TYPICAL_EXPONENT, contraction_ratio, "nozzle inlet static")
    _, throat = combustor.constant_property_pressures(1.0, TYPICAL_EXPONENT, 1.0 + 1e-9, "nozzle inlet static")
    return np.asarray(np.log(static) / np.log(throat))


def _between(flow: Flow, share: Array) -> Point:
    """Return points between rest and throat."""
    return _along(flow.chamber.solved.point, flow.chamber.solved.point, flow.throat.solved.point, share)


def _carried(before: Flow, inlet: Station, flow: Flow) -> Point:
    """Return points at the nozzle inlet, moved as the gas at rest has moved."""
    return _along(inlet.solved.point, before.chamber.solved.point, flow.chamber.solved.point, 1.0)


def _along(base: Point, start: Point, end: Point, share: Array | float) -> Point:
    """Return points moved by a share of the way from a start to an end."""

    def part(name: str) -> Array:
        return np.asarray(getattr(base, name) + share * (getattr(end, name) - getattr(start, name)))

    return Point(part("potentials"), part("log_moles"), part("log_temperature"), part("log_pressure"))
