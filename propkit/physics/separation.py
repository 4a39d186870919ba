"""Flow separation in overexpanded nozzles: three criteria side by side, and a thrust estimate.

Each criterion gives the wall pressure at which the boundary layer leaves the wall. They rest on tests of cones and
bells with cold and hot gas and scatter by some 20 %; three numbers beside each other say more than one.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass
from types import MappingProxyType
from typing import Final

import numpy as np

from propkit.physics.arrays import Array, Values, require, values
from propkit.physics.waves import shock_pressure_ratio

SUMMERFIELD_RATIO: Final = 0.4
"""Separation over ambient pressure: Summerfield, Foster & Swan (1954)."""


def _positive(**given: Values) -> list[Array]:
    arrays = []
    for name, value in given.items():
        array = values(value)
        require(array > 0.0, name, array, "above 0")
        arrays.append(array)
    return arrays


def summerfield_pressure(ambient_pressure: Values) -> Array:
    """Return the wall pressure at which the flow separates after Summerfield [Pa].

    Parameters
    ----------
    ambient_pressure : float or array
        Ambient pressure [Pa], 0 or more.

    Returns
    -------
    array
        Separation pressure [Pa].

    Raises
    ------
    InputError
        For a negative pressure.

    Notes
    -----
    ps = 0.4 pa, from hot-gas cones of about 15 degrees and pressure ratios above 20.

    Source
    ------
    Summerfield, Foster & Swan (1954).

    Examples
    --------
    >>> float(summerfield_pressure(100_000.0))
    40000.0
    """
    ambient = values(ambient_pressure)
    require(ambient >= 0.0, "ambient_pressure", ambient, "0 or more")
    return SUMMERFIELD_RATIO * ambient


def kalt_badal_pressure(ambient_pressure: Values, stagnation_pressure: Values) -> Array:
    """Return the wall pressure at which the flow separates after Kalt and Badal [Pa].

    Parameters
    ----------
    ambient_pressure : float or array
        Ambient pressure [Pa], 0 or more.
    stagnation_pressure : float or array
        Stagnation pressure [Pa], above 0.

    Returns
    -------
    array
        Separation pressure [Pa].

    Raises
    ------
    InputError
        Outside the ranges stated.

    Notes
    -----
    ps/pa = 2/3 (p0/pa)^(-0.2).

    Source
    ------
    Kalt & Badal (1965).

    Examples
    --------
    >>> round(float(kalt_badal_pressure(1e5, 32e5)))
    33333
    """
    (p0,) = _positive(stagnation_pressure=stagnation_pressure)
    ambient = values(ambient_pressure)
    require(ambient >= 0.0, "ambient_pressure", ambient, "0 or more")
    return 2.0 / 3.0 * ambient * (ambient / p0) ** 0.2


def schmucker_pressure(ambient_pressure: Values, mach: Values) -> Array:
    """Return the wall pressure at which the flow separates after Schmucker [Pa].

    Parameters
    ----------
    ambient_pressure : float or array
        Ambient pressure [Pa], 0 or more.
    mach : float or array
        Mach number at the wall where the flow separates, 1 or more.

    Returns
    -------
    array
        Separation pressure [Pa].

    Raises
    ------
    InputError
        Outside the ranges stated.

    Notes
    -----
    ps/pa = (1.88 M - 1)^(-0.64).

    Source
    ------
    Schmucker (1973).

    Examples
    --------
    >>> round(float(schmucker_pressure(1e5, 9.0 / 1.88)))
    26425
    """
    ambient, m = values(ambient_pressure), values(mach)
    require(ambient >= 0.0, "ambient_pressure", ambient, "0 or more")
    require(m >= 1.0, "mach", m, "1 or more")
    return ambient * (1.88 * m - 1.0) ** -0.64


def summerfield_ambient(exit_pressure: Values) -> Array:
    """Return the ambient pressure at which the flow separates at the lip after Summerfield [Pa].

    Parameters
    ----------
    exit_pressure : float or array
        Static pressure at the exit [Pa], above 0.

    Returns
    -------
    array
        Ambient pressure [Pa]; above it the flow separates inside the nozzle.

    Raises
    ------
    InputError
        Outside the range stated.

    Notes
    -----
    pa = pe / 0.4.

    Source
    ------
    Summerfield, Foster & Swan (1954).

    Examples
    --------
    >>> float(summerfield_ambient(40_000.0))
    100000.0
    """
    (pe,) = _positive(exit_pressure=exit_pressure)
    return pe / SUMMERFIELD_RATIO


def kalt_badal_ambient(exit_pressure: Values, stagnation_pressure: Values) -> Array:
    """Return the ambient pressure at which the flow separates at the lip after Kalt and Badal [Pa].

    Parameters
    ----------
    exit_pressure : float or array
        Static pressure at the exit [Pa], above 0.
    stagnation_pressure : float or array
        Stagnation pressure [Pa], above 0.

    Returns
    -------
    array
        Ambient pressure [Pa]; above it the flow separates inside the nozzle.

    Raises
    ------
    InputError
        Outside the ranges stated.

    Notes
    -----
    pa = (3/2 pe p0^0.2)^(1/1.2), the criterion solved for pa.

    Source
    ------
    Kalt & Badal (1965).

    Examples
    --------
    >>> round(float(kalt_badal_ambient(1e5 / 3.0, 32e5)))
    100000
    """
    pe, p0 = _positive(exit_pressure=exit_pressure, stagnation_pressure=stagnation_pressure)
    return (1.5 * pe * p0**0.2) ** (1.0 / 1.2)


def schmucker_ambient(exit_pressure: Values, exit_mach: Values) -> Array:
    """Return the ambient pressure at which the flow separates at the lip after Schmucker [Pa].

    Parameters
    ----------
    exit_pressure : float or array
        Static pressure at the exit [Pa], above 0.
    exit_mach : float or array
        Mach number at the exit, 1 or more.

    Returns
    -------
    array
        Ambient pressure [Pa]; above it the flow separates inside the nozzle.

    Raises
    ------
    InputError
        Outside the ranges stated.

    Notes
    -----
    pa = pe (1.88 Me - 1)^0.64, the criterion solved for pa.

    Source
    ------
    Schmucker (1973).

    Examples
    --------
    >>> round(float(schmucker_ambient(26_425.5, 9.0 / 1.88)), -2)
    100000.0
    """
    (pe,) = _positive(exit_pressure=exit_pressure)
    m = values(exit_mach)
    require(m >= 1.0, "exit_mach", m, "1 or more")
    return pe * (1.88 * m - 1.0) ** 0.64


def lip_shock_ambient(exit_pressure: Values, exit_mach: Values, isentropic_exponent: Values) -> Array:
    """Return the ambient pressure that a normal shock at the lip sustains [Pa].

    Parameters
    ----------
    exit_pressure : float or array
        Static pressure at the exit [Pa], above 0.
    exit_mach : float or array
        Mach number at the exit, 1 or more.
    isentropic_exponent : float or array
        Isentropic exponent at the exit, above 1.

    Returns
    -------
    array
        Pressure behind the shock [Pa]; no full flow exists against a higher ambient pressure.

    Raises
    ------
    InputError
        Outside the ranges stated.

    Notes
    -----
    p2 = pe (2 g Me^2 - (g - 1)) / (g + 1).

    Source
    ------
    NACA Report 1135, equation 93.

    Examples
    --------
    >>> round(float(lip_shock_ambient(1e4, 2.0, 1.4)))
    45000
    """
    (pe,) = _positive(exit_pressure=exit_pressure)
    return pe * shock_pressure_ratio(exit_mach, isentropic_exponent)


@dataclass(frozen=True, slots=True)
class Criterion:
    """One separation criterion.

    `pressure(ambient, stagnation, mach)` gives the separation pressure [Pa] at a wall Mach number;
    `ambient(exit_pressure, stagnation, exit_mach)` the ambient pressure [Pa] at which it holds at the lip; `relation`
    is the key of the latter in `RELATIONS`.
    """

    name: str
    title: str
    source: str
    relation: str
    pressure: Callable[[Values, Values, Values], Array]
    ambient: Callable[[Values, Values, Values], Array]


CRITERIA: Final[Mapping[str, Criterion]] = MappingProxyType(
    {
        "summerfield": Criterion(
            "summerfield",
            "Summerfield, Foster and Swan 1954",
            "summerfield-1954",
            "summerfield_ambient",
            lambda ambient, stagnation, mach: summerfield_pressure(ambient),
            lambda exit_pressure, stagnation, exit_mach: summerfield_ambient(exit_pressure),
        ),
        "kalt-badal": Criterion(
            "kalt-badal",
            "Kalt and Badal 1965",
            "kalt-badal-1965",
            "kalt_badal_ambient",
            lambda ambient, stagnation, mach: kalt_badal_pressure(ambient, stagnation),
            lambda exit_pressure, stagnation, exit_mach: kalt_badal_ambient(exit_pressure, stagnation),
        ),
        "schmucker": Criterion(
            "schmucker",
            "Schmucker 1973",
            "schmucker-1973",
            "schmucker_ambient",
            lambda ambient, stagnation, mach: schmucker_pressure(ambient, mach),
            lambda exit_pressure, stagnation, exit_mach: schmucker_ambient(exit_pressure, exit_mach),
        ),
    }
)
"""The criteria by name, in order of their year."""


def separation_share(criterion: Criterion, pressure: Values, mach: Values, ambient_pressure: float, stagnation_pressure: float) -> float:
    """Return where along a row of stations the flow separates, as a fractional index.

    Parameters
    ----------
    criterion : Criterion
        One of `CRITERIA`.
    pressure, mach : array
        Wall pressure [Pa] and Mach number at the stations from the throat (Mach 1 or more) to the exit, in order.
    ambient_pressure : float
        Ambient pressure [Pa].
    stagnation_pressure : float
        Stagnation pressure [Pa].

    Returns
    -------
    float
        Fractional index of the first crossing of wall and separation pressure, linear in their logarithms between
        stations; NaN where the nozzle flows full; 0 where the flow would separate at the first station.

    Source
    ------
    Criterion given.
    """
    p, m = values(pressure), np.maximum(values(mach), 1.0)
    if ambient_pressure <= 0.0:
        return float("nan")
    excess = np.log(p) - np.log(criterion.pressure(ambient_pressure, stagnation_pressure, m))
    below = np.flatnonzero(excess < 0.0)
    if below.size == 0:
        return float("nan")
    after = int(below[0])
    if after == 0:
        return 0.0
    return after - 1 + float(excess[after - 1] / (excess[after - 1] - excess[after]))


def at_share(share: float, column: Values) -> float:
    """Return a positive quantity at a fractional index of a row of stations, linear in its logarithm."""
    data = np.log(values(column))
    return float(np.exp(np.interp(share, np.arange(len(data)), data)))


def separated_thrust(mass_flow: Values, velocity: Values, pressure: Values, ambient_pressure: Values, area: Values) -> Array:
    """Return an estimate of the thrust of a separated nozzle [N].

    Parameters
    ----------
    mass_flow : float or array
        Mass flow [kg/s].
    velocity, pressure, area : float or array
        Delivered velocity [m/s], wall pressure [Pa] and flow area [m2] where the flow leaves the wall.
    ambient_pressure : float or array
        Ambient pressure [Pa].

    Returns
    -------
    array
        Thrust [N].

    Notes
    -----
    F = m' u + (p - pa) A at the separation point: the wall beyond it is taken to be at ambient pressure on both sides.
    The pressure there is really some per cent below ambient and recovers towards the lip: an upper estimate.

    Source
    ------
    Conservation of momentum; the ambient-pressure wall is common practice, no source.

    Examples
    --------
    >>> float(separated_thrust(2.0, 2000.0, 4e4, 1e5, 0.01))
    3400.0
    """
    push = values(mass_flow) * values(velocity)
    return push + (values(pressure) - values(ambient_pressure)) * values(area)
