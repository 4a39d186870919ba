"""The ledger from ideal to delivered specific impulse, after the JANNAF bookkeeping.

Each loss is a ratio of specific impulse after it to that before it, at its place in a fixed order, so that the product
of the ratios is the delivered over the ideal value exactly. A loss known as a decrement is converted at its place.
"""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass
from typing import Final

import numpy as np

from propkit.errors import InputError, Problem
from propkit.physics.arrays import Array, Values, require, values

ORDER: Final = ("energy release", "kinetics", "divergence", "boundary layer", "two-phase")
"""Names of the losses in their order: CPIA Publication 246."""

KINETICS_SHARE: Final = 1.0 / 3.0
"""Default share of the shifting-to-frozen difference lost to finite reaction rates: common practice, no source."""


@dataclass(frozen=True, slots=True)
class Loss:
    """One loss as asked for: a ratio, or a decrement of specific impulse [s] in its place.

    Parameters
    ----------
    name : str
        One of `ORDER`.
    ratio : float or None
        Specific impulse after over before it.
    decrement : float or None
        Specific impulse lost [s].
    source : str
        Key of `propkit.sources`, or the reference in words.
    estimate : bool
        Whether the number is an estimate rather than a result or a given value.
    """

    name: str
    ratio: float | None = None
    decrement: float | None = None
    source: str = ""
    estimate: bool = False


@dataclass(frozen=True, slots=True)
class Entry:
    """One line of the ledger: the loss as ratio and decrement [s], with specific impulse [s] before and after it."""

    name: str
    ratio: float
    decrement: float
    before: float
    after: float
    source: str
    estimate: bool


def ledger(ideal: float, losses: Iterable[Loss]) -> tuple[Entry, ...]:
    """Return the losses in their order with the specific impulse carried through.

    Parameters
    ----------
    ideal : float
        Ideal specific impulse [s], above 0.
    losses : iterable of Loss
        At most one of each name.

    Returns
    -------
    tuple of Entry
        In the order of `ORDER`; `after` of the last is the delivered specific impulse.

    Raises
    ------
    InputError
        For an unknown or repeated name, a ratio outside 0 to 1, or a decrement below 0 or above what is left.

    Source
    ------
    CPIA Publication 246.

    Examples
    --------
    >>> [round(entry.after, 6) for entry in ledger(400.0, [Loss("divergence", 0.99), Loss("energy release", 0.95)])]
    [380.0, 376.2]
    """
    require(ideal > 0.0, "specific_impulse", ideal, "above 0")
    asked: dict[str, Loss] = {}
    problems = []
    for loss in losses:
        if loss.name not in ORDER:
            problems.append(Problem("losses", repr(loss.name), "one of " + ", ".join(map(repr, ORDER))))
        elif loss.name in asked:
            problems.append(Problem("losses", f"{loss.name!r} twice", "given once"))
        elif (loss.ratio is None) == (loss.decrement is None):
            problems.append(Problem("losses", f"{loss.name!r}", "given as a ratio or as a decrement, one of the two"))
        asked.setdefault(loss.name, loss)
    if problems:
        raise InputError(problems)
    entries = []
    before = float(ideal)
    for name in ORDER:
        if name in asked:
            entries.append(_entry(asked[name], before))
            before = entries[-1].after
    return tuple(entries)


def _entry(loss: Loss, before: float) -> Entry:
    ratio = ratio_of_decrement(loss.decrement, before) if loss.decrement is not None else loss.ratio
    if ratio is None or not 0.0 < float(ratio) <= 1.0:
        shown = f"{ratio:g}" if ratio is not None else "missing"
        raise InputError(Problem(f"losses: {loss.name}", shown, "above 0 and at most 1", "It is the Isp ratio: 0.98 is a loss of 2 %."))
    after = before * float(ratio)
    return Entry(loss.name, float(ratio), before - after, before, after, loss.source, loss.estimate)


def ratio_of_decrement(decrement: Values, before: Values) -> Array:
    """Return the ratio that a decrement of specific impulse is in its place.

    Parameters
    ----------
    decrement : float or array
        Specific impulse lost [s], 0 or more and below `before`.
    before : float or array
        Specific impulse before the loss [s], above 0.

    Returns
    -------
    array
        Ratio 1 - decrement/before.

    Raises
    ------
    InputError
        Outside the ranges stated.

    Source
    ------
    CPIA Publication 246.

    Examples
    --------
    >>> float(ratio_of_decrement(4.0, 400.0))
    0.99
    """
    lost, left = values(decrement), values(before)
    require((lost >= 0.0) & (lost < left), "decrement", lost, "0 or more and below the specific impulse left")
    return 1.0 - lost / left


def cone_divergence_factor(half_angle: Values) -> Array:
    """Return the share of the momentum of a conical source flow that is along the axis.

    Parameters
    ----------
    half_angle : float or array
        Half-angle of the cone [rad], 0 to pi/2.

    Returns
    -------
    array
        Divergence factor, applied to momentum thrust only.

    Raises
    ------
    InputError
        Outside the range stated.

    Notes
    -----
    lambda = (1 + cos a)/2.

    Source
    ------
    Sutton & Biblarz, chapter 3: 0.983 at 15 degrees (from memory).

    Examples
    --------
    >>> round(float(cone_divergence_factor(np.radians(15.0))), 4)
    0.983
    """
    angle = values(half_angle)
    require((angle >= 0.0) & (angle <= 0.5 * np.pi), "half_angle", np.degrees(angle), "0 to 90 degrees")
    return 0.5 * (1.0 + np.cos(angle))


def bell_divergence_factor(throat_to_lip_angle: Values, lip_angle: Values) -> Array:
    """Return the divergence factor of a bell: that of a cone of the mean of two angles.

    Parameters
    ----------
    throat_to_lip_angle : float or array
        Angle of the line from the throat's wall to the lip [rad], 0 to pi/2.
    lip_angle : float or array
        Wall angle at the lip [rad], 0 to pi/2.

    Returns
    -------
    array
        Divergence factor, applied to momentum thrust only.

    Raises
    ------
    InputError
        Outside the ranges stated.

    Notes
    -----
    lambda = (1 + cos((a + b)/2))/2.

    Source
    ------
    Rao (1960) as used in propulsion handbooks; area ratio 25, 80 % bell: 0.987 (from memory).

    Examples
    --------
    >>> round(float(bell_divergence_factor(np.radians(18.5), np.radians(8.0))), 3)
    0.987
    """
    chord, lip = values(throat_to_lip_angle), values(lip_angle)
    require((lip >= 0.0) & (lip <= 0.5 * np.pi), "lip_angle", np.degrees(lip), "0 to 90 degrees")
    return cone_divergence_factor(0.5 * (chord + lip))


def divergence_ratio(divergence_factor: Values, momentum_thrust: Values, pressure_thrust: Values) -> Array:
    """Return the specific-impulse ratio of divergence.

    Parameters
    ----------
    divergence_factor : float or array
        Factor on the momentum thrust, above 0 and at most 1.
    momentum_thrust : float or array
        m' u without divergence [N].
    pressure_thrust : float or array
        (pe - pa) Ae [N].

    Returns
    -------
    array
        Ratio of thrust with to thrust without divergence at the same mass flow.

    Raises
    ------
    InputError
        For a factor outside its range, or thrust of 0 or less.

    Notes
    -----
    (lambda m' u + (pe - pa) Ae)/(m' u + (pe - pa) Ae).

    Source
    ------
    Sutton & Biblarz, chapter 3.

    Examples
    --------
    >>> float(divergence_ratio(0.98, 900.0, 100.0))
    0.982
    """
    factor, momentum, pressure = values(divergence_factor), values(momentum_thrust), values(pressure_thrust)
    require((factor > 0.0) & (factor <= 1.0), "divergence_factor", factor, "above 0 and at most 1")
    require(momentum + pressure > 0.0, "thrust", momentum + pressure, "above 0 for a ratio of specific impulse")
    return (factor * momentum + pressure) / (momentum + pressure)


def kinetics_ratio(shifting: Values, frozen: Values, share: Values = KINETICS_SHARE) -> Array:
    """Return an estimate of the specific-impulse ratio of finite reaction rates, between shifting and frozen flow.

    Parameters
    ----------
    shifting : float or array
        Specific impulse with equilibrium composition [s], above 0.
    frozen : float or array
        Specific impulse with frozen composition [s], at most `shifting`.
    share : float or array
        Share of the difference that is lost, 0 (equilibrium) to 1 (frozen).

    Returns
    -------
    array
        Ratio against shifting flow; an estimate.

    Raises
    ------
    InputError
        Outside the ranges stated.

    Notes
    -----
    1 - share (1 - frozen/shifting). The share falls with pressure and size.

    Source
    ------
    Common practice, no source.

    Examples
    --------
    >>> float(kinetics_ratio(400.0, 388.0, 0.5))
    0.985
    """
    best, worst, part = values(shifting), values(frozen), values(share)
    require(best > 0.0, "shifting", best, "above 0")
    require((worst > 0.0) & (worst <= best), "frozen", worst, "above 0 and at most the shifting value")
    require((part >= 0.0) & (part <= 1.0), "share", part, "0 to 1")
    return 1.0 - part * (1.0 - worst / best)


def boundary_layer_ratio(drag: Values, thrust: Values) -> Array:
    """Return the specific-impulse ratio of a boundary layer.

    Parameters
    ----------
    drag : float or array
        Thrust lost [N], 0 or more and below `thrust`; see `propkit.physics.boundary_layer`.
    thrust : float or array
        Thrust before the loss [N], above 0.

    Returns
    -------
    array
        Ratio 1 - drag/thrust.

    Raises
    ------
    InputError
        Outside the ranges stated.

    Source
    ------
    CPIA Publication 246.

    Examples
    --------
    >>> float(boundary_layer_ratio(10.0, 1000.0))
    0.99
    """
    lost, whole = values(drag), values(thrust)
    require((lost >= 0.0) & (lost < whole), "drag", lost, "0 or more and below the thrust")
    return 1.0 - lost / whole


def two_phase_ratio(condensed_mass_fraction: Values, velocity_lag: Values, momentum_share: Values = 1.0) -> Array:
    """Return the specific-impulse ratio of particles that leave slower than the gas.

    Parameters
    ----------
    condensed_mass_fraction : float or array
        Mass of liquids and solids over total mass at the exit, 0 to 1.
    velocity_lag : float or array
        Share of the gas velocity by which the particles lag, 0 (none) to 1 (they stand still).
    momentum_share : float or array
        Momentum thrust over thrust, above 0.

    Returns
    -------
    array
        Ratio of specific impulse; the heat that lagging particles keep is not in it.

    Raises
    ------
    InputError
        Outside the ranges stated.

    Notes
    -----
    1 - share w lag: momentum balance with the gas expansion unchanged.

    Source
    ------
    Conservation of momentum.

    Examples
    --------
    >>> round(float(two_phase_ratio(0.3, 0.05)), 6)
    0.985
    """
    w, lag, share = values(condensed_mass_fraction), values(velocity_lag), values(momentum_share)
    require((w >= 0.0) & (w <= 1.0), "condensed_mass_fraction", w, "0 to 1")
    require((lag >= 0.0) & (lag <= 1.0), "velocity_lag", lag, "0 to 1")
    require(share > 0.0, "momentum_share", share, "above 0")
    ratio = 1.0 - share * w * lag
    require(ratio > 0.0, "velocity_lag", lag, "small enough to leave some thrust")
    return ratio
