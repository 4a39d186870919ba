"""What goes into the evaluation of a firing: channels by name, means with the parts of their uncertainty, measured pairs."""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

from propkit import quantities, units
from propkit.errors import InputError, Problem, near_matches
from propkit.reconcile.firing_results import AMBIENT, FLOW, FUEL, OXIDIZER, PRESSURE, THRUST
from propkit.reconcile.firing_statistics import Mean, Zero
from propkit.study.distributions import Distribution, spread

KNOWN = (PRESSURE, OXIDIZER, FUEL, FLOW, THRUST, AMBIENT)
"""Channels that results are computed from; others are only averaged."""


@dataclass(frozen=True, slots=True)
class ChannelMean:
    """Mean of a channel over the window, corrected for its zero, with the parts of its standard uncertainty."""

    mean: Mean
    zero: Zero | None
    calibration: float

    @property
    def value(self) -> float:
        """Corrected mean [SI]."""
        return self.mean.value - (self.zero.correction if self.zero is not None else 0.0)

    @property
    def standard_uncertainty(self) -> float:
        """Combined standard uncertainty [SI]."""
        return math.hypot(self.mean.standard_uncertainty, self.zero_uncertainty, self.calibration)

    @property
    def zero_uncertainty(self) -> float:
        """Standard uncertainty of the zero correction [SI]."""
        return self.zero.standard_uncertainty if self.zero is not None else 0.0


def quantity_of(channel: str) -> quantities.Quantity:
    """Return the catalogue row of a channel.

    Raises
    ------
    InputError
        For a channel whose last name is no quantity of the catalogue.
    """
    owner, _, name = channel.rpartition(".")
    try:
        return quantities.quantity(name, owner.rpartition(".")[2])
    except KeyError as error:
        near = near_matches(name, KNOWN)
        hint = f"Did you mean {' or '.join(near)}?" if near else ""
        raise InputError(Problem("channels", repr(channel), "named by a quantity, such as 'chamber.pressure' or 'thrust'", hint)) from error


def result_unit(name: str) -> str:
    """Return the SI unit of a delivered result."""
    return "" if "efficiency" in name else quantity_of(name).unit


def require_channels(channels: Mapping[str, str]) -> None:
    """Refuse channels from which nothing can be computed; every problem in one error."""
    problems = []
    if PRESSURE not in channels:
        problems.append(Problem(PRESSURE, "missing", "among the channels", "It tells the burn from the rest and is the reference of c*."))
    if not {FLOW, OXIDIZER, FUEL, THRUST} & set(channels):
        problems.append(Problem("channels", ", ".join(channels) or "empty", "with a flow or the thrust besides the pressure"))
    if (OXIDIZER in channels) != (FUEL in channels) and FLOW not in channels:
        problems.append(Problem("channels", "with one of two propellant flows", "with both flows, or with mass_flow"))
    if problems:
        raise InputError(problems)


def calibration_of(given: Any, value: float, unit: str, name: str) -> float:
    """Return the standard uncertainty of a calibration [unit]; 0 where none is given."""
    if given is None:
        return 0.0
    if isinstance(given, Distribution):
        return given.resolve(value, unit, f"calibration of {name}").standard_uncertainty
    return spread(given, value, unit, f"calibration of {name}")


def stretch_of(name: str, given: Any) -> tuple[float, float]:
    """Return a stretch of time in seconds."""
    try:
        start, end = given
    except (TypeError, ValueError):
        allowed = 'a pair of times: (start, end), in seconds or with units such as ("6 s", "10 s")'
        raise InputError(Problem(name, repr(given), allowed)) from None
    return units.to_si(start, "s", name), units.to_si(end, "s", name)


def measured(name: str, given: Any, unit: str) -> tuple[float, float]:
    """Return a measured value and its standard uncertainty in SI."""
    if not isinstance(given, tuple | list) or len(given) != 2:
        raise InputError(Problem(name, f"{given!r}", "a pair: (value, standard uncertainty)", "For example ('180.2 mm', '0.05 mm')."))
    value = units.to_si(given[0], unit, name)
    return value, spread(given[1], value, unit, name)
