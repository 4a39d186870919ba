"""Ambient conditions as typed: "sea level", "vacuum", a pressure, or an altitude such as "12 km"."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

from propkit import units
from propkit.constants import SEA_LEVEL_PRESSURE
from propkit.errors import InputError, Problem
from propkit.model.declare import as_text
from propkit.physics import atmosphere

ALLOWED = '"sea level", "vacuum", an absolute pressure such as "80 kPa" or a geometric altitude such as "12 km"'
HIGHEST_PRESSURE = 1e9


@dataclass(frozen=True, slots=True)
class Ambient:
    """Ambient pressure [Pa], the altitude [m] it was asked for by (or None), and what it is called."""

    pressure: float
    altitude: float | None
    text: str

    def __float__(self) -> float:
        return self.pressure


def read_ambient(name: str, value: Any) -> Ambient:
    """Return the ambient condition that `value` says.

    Raises
    ------
    InputError
        For anything that is neither of the forms of `ALLOWED`.
    """
    if isinstance(value, Ambient):
        return value
    if isinstance(value, str):
        word = value.strip().casefold()
        if word == "sea level":
            return Ambient(SEA_LEVEL_PRESSURE, 0.0, "sea level")
        if word == "vacuum":
            return Ambient(0.0, None, "vacuum")
        if word[:1].isalpha():
            raise InputError(Problem(name, as_text(value), ALLOWED))
    pressure, first = _as(name, value, "Pa")
    if pressure is not None:
        return _of_pressure(name, value, pressure)
    altitude, _ = _as(name, value, "m")
    if altitude is None:
        problem = first.problems[0] if first is not None and first.problems else None
        raise InputError(Problem(name, as_text(value), ALLOWED, problem.hint if problem else ""))
    low, high = atmosphere.LOWEST, atmosphere.HIGHEST
    if not low <= altitude <= high:
        raise InputError(
            Problem(
                name,
                as_text(value),
                f"an altitude from {low / 1e3:g} km to {high / 1e3:g} km",
                'Above that, "vacuum" is meant.',
            )
        )
    return Ambient(float(atmosphere.pressure(altitude)), altitude, f"{altitude / 1e3:g} km")


def _of_pressure(name: str, value: Any, pressure: float) -> Ambient:
    if not 0.0 <= pressure <= HIGHEST_PRESSURE:
        raise InputError(Problem(name, as_text(value), f"an absolute pressure from 0 to {HIGHEST_PRESSURE:g} Pa"))
    if pressure == 0.0:
        return Ambient(0.0, None, "vacuum")
    shown = f"{pressure / 1e3:g} kPa" if pressure >= 1e3 else f"{pressure:g} Pa"
    return Ambient(pressure, None, shown)


def _as(name: str, value: Any, unit: str) -> tuple[float | None, InputError | None]:
    try:
        return units.to_si(value, unit, name), None
    except InputError as error:
        return None, error
