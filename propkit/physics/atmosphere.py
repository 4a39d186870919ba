"""US Standard Atmosphere 1976 against geometric altitude, from -5 to 150 km.

Up to 86 km: the seven layers of the standard, in closed form. Above: the standard's closed form for the
kinetic temperature, with pressure and mean molar mass carried between printed rows of its table
(recalled, see `UPPER_ROWS`) by the hydrostatic equation.
"""

from __future__ import annotations

from typing import Final

import numpy as np

from propkit.constants import SEA_LEVEL_PRESSURE, STANDARD_GRAVITY
from propkit.errors import RangeError
from propkit.physics.arrays import Array, Values, require, values

EARTH_RADIUS: Final = 6_356_766.0
"""Effective earth radius of the geopotential [m]: US Standard Atmosphere 1976, section 1.2."""

GAS_CONSTANT_1976: Final = 8.31432
"""Molar gas constant of the standard [J/(mol K)]: US Standard Atmosphere 1976, table 2 (not today's value)."""

SEA_LEVEL_MOLAR_MASS: Final = 0.0289644
"""Mean molar mass of air below 80 km [kg/mol]: US Standard Atmosphere 1976, section 1.2."""

HEAT_CAPACITY_RATIO: Final = 1.4
"""Heat capacity ratio of air: US Standard Atmosphere 1976, section 1.3.9."""

LOWEST: Final = -5_000.0
"""Lowest geometric altitude of the functions [m]: the lowest of the standard."""

HIGHEST: Final = 150_000.0
"""Highest geometric altitude of the functions [m]: the last row of `UPPER_ROWS`."""

LAYER_TOP: Final = 86_000.0
"""Geometric altitude up to which the layers hold [m]."""

_R: Final = GAS_CONSTANT_1976 / SEA_LEVEL_MOLAR_MASS
_SEA_LEVEL_TEMPERATURE: Final = 288.15

# Geopotential base [m] and gradient of the molecular-scale temperature [K/m]: US Standard Atmosphere 1976, table 4.
_BASE: Final = np.array([0.0, 11_000.0, 20_000.0, 32_000.0, 47_000.0, 51_000.0, 71_000.0])
_GRADIENT: Final = np.array([-6.5e-3, 0.0, 1.0e-3, 2.8e-3, 0.0, -2.8e-3, -2.0e-3])

UPPER_ROWS: Final = (
    (90_000.0, 1.8359e-1, 3.416e-6),
    (95_000.0, 7.5966e-2, 1.393e-6),
    (100_000.0, 3.2011e-2, 5.604e-7),
    (105_000.0, 1.4477e-2, 2.325e-7),
    (110_000.0, 7.1042e-3, 9.708e-8),
    (115_000.0, 4.0096e-3, 4.289e-8),
    (120_000.0, 2.5382e-3, 2.222e-8),
    (130_000.0, 1.2505e-3, 8.152e-9),
    (140_000.0, 7.2028e-4, 3.831e-9),
    (150_000.0, 4.5422e-4, 2.076e-9),
)
"""Geometric altitude [m], pressure [Pa], density [kg/m3]: US Standard Atmosphere 1976, table I, from memory.

Tests: their molar masses are those printed beside them, and the hydrostatic integral over the closed-form
temperature recovers every pressure to 1.1 %. It cannot do better: the standard adds up partial pressures of
diffusing species there and gives nitrogen the sea-level mean molar mass up to 100 km, which is not hydrostatic.
"""

_NEAR_TOP: Final = (
    (
        80_000.0,
        80_500.0,
        81_000.0,
        81_500.0,
        82_000.0,
        82_500.0,
        83_000.0,
        83_500.0,
        84_000.0,
        84_500.0,
        85_000.0,
        85_500.0,
    ),
    (1.0, 0.999996, 0.999989, 0.999971, 0.999941, 0.999909, 0.999870, 0.999829, 0.999786, 0.999741, 0.999694, 0.999641),
)
# Geometric altitude [m] and M/M0: US Standard Atmosphere 1976, table 8, from memory.


def _layer_bases() -> tuple[Array, Array]:
    """Return temperature [K] and pressure [Pa] at the base of each layer."""
    temperatures, pressures = [_SEA_LEVEL_TEMPERATURE], [SEA_LEVEL_PRESSURE]
    for base, top, gradient in zip(_BASE[:-1], _BASE[1:], _GRADIENT[:-1], strict=True):
        start = temperatures[-1]
        end = start + gradient * (top - base)
        exponent = -STANDARD_GRAVITY / _R
        ratio = (end / start) ** (exponent / gradient) if gradient else np.exp(exponent * (top - base) / start)
        temperatures.append(end)
        pressures.append(pressures[-1] * ratio)
    return np.array(temperatures), np.array(pressures)


_BASE_TEMPERATURE, _BASE_PRESSURE = _layer_bases()


def geopotential_altitude(altitude: Values) -> Array:
    """Geopotential altitude [m] of a geometric altitude.

    Parameters
    ----------
    altitude : float or array
        Geometric altitude [m].

    Returns
    -------
    array
        Geopotential altitude [m], shape of `altitude`.

    Notes
    -----
    H = r0 Z / (r0 + Z).

    Source
    ------
    US Standard Atmosphere 1976, equation 18.

    Examples
    --------
    >>> round(float(geopotential_altitude(86_000.0)))
    84852
    """
    height = values(altitude)
    return EARTH_RADIUS * height / (EARTH_RADIUS + height)


def geometric_altitude(geopotential: Values) -> Array:
    """Geometric altitude [m] of a geopotential altitude [m]: Z = r0 H / (r0 - H).

    Parameters
    ----------
    geopotential : float or array
        Geopotential altitude [m].

    Returns
    -------
    array
        Geometric altitude [m], shape of `geopotential`.

    Source
    ------
    US Standard Atmosphere 1976, equation 19.

    Examples
    --------
    >>> round(float(geometric_altitude(11_000.0)), 1)
    11019.1
    """
    height = values(geopotential)
    return EARTH_RADIUS * height / (EARTH_RADIUS - height)


def _checked(altitude: Values) -> Array:
    height = values(altitude)
    require(np.isfinite(height), "altitude", height, "a finite number")
    if np.any((height < LOWEST) | (height > HIGHEST)):
        worst = float(height.flat[np.argmax(np.abs(height - 0.5 * (LOWEST + HIGHEST)))])
        advice = "Above it the ambient pressure is below 0.5 mPa: ask for vacuum." if worst > HIGHEST else ""
        raise RangeError(
            f"`altitude` is {worst / 1000.0:g} km; the standard atmosphere here covers {LOWEST / 1000.0:g} to "
            f"{HIGHEST / 1000.0:g} km (geometric). {advice}".rstrip(),
            altitude=worst,
        )
    return height


def _layer_state(height: Array) -> tuple[Array, Array]:
    """Molecular-scale temperature [K] and pressure [Pa] by the layers at geometric altitude [m]."""
    level = geopotential_altitude(height)
    layer = np.clip(np.searchsorted(_BASE, level, side="right") - 1, 0, len(_BASE) - 1)
    base, gradient = _BASE[layer], _GRADIENT[layer]
    temperature = _BASE_TEMPERATURE[layer] + gradient * (level - base)
    exponent = STANDARD_GRAVITY / _R
    isothermal = gradient == 0.0
    safe = np.where(isothermal, 1.0, gradient)
    logarithm = np.where(
        isothermal,
        -exponent * (level - base) / _BASE_TEMPERATURE[layer],
        -exponent / safe * np.log(temperature / _BASE_TEMPERATURE[layer]),
    )
    return temperature, _BASE_PRESSURE[layer] * np.exp(logarithm)


def _upper_kinetic_temperature(height: Array) -> Array:
    """Kinetic temperature [K] from 86 to 150 km: US Standard Atmosphere 1976, equations 25, 27, 29, 31."""
    kilometres = height / 1000.0
    arc = 263.1905 - 76.3232 * np.sqrt(np.maximum(1.0 - ((kilometres - 91.0) / 19.9429) ** 2, 0.0))
    line = 240.0 + 12.0 * (kilometres - 110.0)
    radius = EARTH_RADIUS / 1000.0
    reduced = (kilometres - 120.0) * (radius + 120.0) / (radius + kilometres)
    asymptote = 1000.0 - 640.0 * np.exp(-0.01875 * reduced)
    return np.select(
        [kilometres <= 91.0, kilometres <= 110.0, kilometres <= 120.0],
        [np.full_like(height, 186.8673), arc, line],
        asymptote,
    )


def _upper_nodes() -> tuple[Array, Array, Array]:
    """Return altitude [m], ln pressure and molar mass over the sea-level one at the nodes, 86 km first."""
    rows = np.array(UPPER_ROWS)
    first_temperature, first_pressure = _layer_state(np.array([LAYER_TOP]))
    first_ratio = _upper_kinetic_temperature(np.array([LAYER_TOP])) / first_temperature
    height, pressure, density = rows.T
    ratio = density * _R * _upper_kinetic_temperature(height) / pressure
    return (
        np.concatenate([[LAYER_TOP], height]),
        np.log(np.concatenate([first_pressure, pressure])),
        np.concatenate([first_ratio, ratio]),
    )


_NODE_HEIGHT, _NODE_LOG_PRESSURE, _NODE_RATIO = _upper_nodes()


def _molar_mass_ratio(height: Array) -> Array:
    """Mean molar mass over that at sea level: 1 below 80 km, between the rows above."""
    heights = np.concatenate([_NEAR_TOP[0], _NODE_HEIGHT])
    return values(np.interp(height, heights, np.concatenate([_NEAR_TOP[1], _NODE_RATIO])))


def _gravity(height: Array) -> Array:
    return STANDARD_GRAVITY * (EARTH_RADIUS / (EARTH_RADIUS + height)) ** 2


def _slope(height: Array, ratio: Array) -> Array:
    """D ln p / d altitude [1/m] of the hydrostatic equation."""
    return -_gravity(height) * ratio / (_R * _upper_kinetic_temperature(height))


_NODE_SLOPE: Final = _slope(_NODE_HEIGHT, _NODE_RATIO)


def _upper_log_pressure(height: Array) -> Array:
    """Cubic Hermite interpolation of ln p with the hydrostatic slope at each node."""
    left = np.clip(np.searchsorted(_NODE_HEIGHT, height, side="right") - 1, 0, len(_NODE_HEIGHT) - 2)
    step = _NODE_HEIGHT[left + 1] - _NODE_HEIGHT[left]
    t = (height - _NODE_HEIGHT[left]) / step
    return (
        (1.0 + 2.0 * t) * (1.0 - t) ** 2 * _NODE_LOG_PRESSURE[left]
        + t**2 * (3.0 - 2.0 * t) * _NODE_LOG_PRESSURE[left + 1]
        + t * (1.0 - t) ** 2 * step * _NODE_SLOPE[left]
        + t**2 * (t - 1.0) * step * _NODE_SLOPE[left + 1]
    )


def temperature(altitude: Values) -> Array:
    """Molecular-scale temperature of the standard atmosphere [K]: kinetic temperature times M0/M.

    Parameters
    ----------
    altitude : float or array
        Geometric altitude [m], -5 to 150 km.

    Returns
    -------
    array
        Molecular-scale temperature [K], shape of `altitude`. Below 80 km it is the temperature.

    Raises
    ------
    RangeError
        Outside -5 to 150 km.

    Notes
    -----
    Layers of table 4 up to 86 km; above, the closed forms of section 1.2.5 over the molar mass ratio.

    Source
    ------
    US Standard Atmosphere 1976, equations 23, 25-31.

    Examples
    --------
    >>> round(float(temperature(11_000.0)), 3)
    216.774
    """
    height = _checked(altitude)
    lower, _ = _layer_state(np.minimum(height, LAYER_TOP))
    upper = np.maximum(height, LAYER_TOP)
    return np.where(height <= LAYER_TOP, lower, _upper_kinetic_temperature(upper) / np.interp(upper, _NODE_HEIGHT, _NODE_RATIO))


def kinetic_temperature(altitude: Values) -> Array:
    """Kinetic temperature of the standard atmosphere [K].

    Parameters
    ----------
    altitude : float or array
        Geometric altitude [m], -5 to 150 km.

    Returns
    -------
    array
        Kinetic temperature [K], shape of `altitude`.

    Raises
    ------
    RangeError
        Outside -5 to 150 km.

    Source
    ------
    US Standard Atmosphere 1976, equations 23, 25-31.

    Examples
    --------
    >>> round(float(kinetic_temperature(100_000.0)), 2)
    195.08
    """
    height = _checked(altitude)
    return temperature(height) * _molar_mass_ratio(height)


def pressure(altitude: Values) -> Array:
    """Pressure of the standard atmosphere [Pa].

    Parameters
    ----------
    altitude : float or array
        Geometric altitude [m], -5 to 150 km.

    Returns
    -------
    array
        Pressure [Pa], shape of `altitude`; continuous, falling everywhere.

    Raises
    ------
    RangeError
        Outside -5 to 150 km.

    Notes
    -----
    Equations 33a and 33b in the layers; above 86 km printed rows joined in ln p with the hydrostatic slope.

    Source
    ------
    US Standard Atmosphere 1976, equations 33a, 33b and table I (rows above 86 km from memory).

    Examples
    --------
    >>> f"{float(pressure(5_000.0)):.1f}"
    '54048.3'
    """
    height = _checked(altitude)
    _, lower = _layer_state(np.minimum(height, LAYER_TOP))
    return np.where(height <= LAYER_TOP, lower, np.exp(_upper_log_pressure(np.maximum(height, LAYER_TOP))))


def density(altitude: Values) -> Array:
    """Density of the standard atmosphere [kg/m3].

    Parameters
    ----------
    altitude : float or array
        Geometric altitude [m], -5 to 150 km.

    Returns
    -------
    array
        Density [kg/m3], shape of `altitude`.

    Raises
    ------
    RangeError
        Outside -5 to 150 km.

    Notes
    -----
    rho = p M0 / (R* T_M), T_M the molecular-scale temperature.

    Source
    ------
    US Standard Atmosphere 1976, equation 42.

    Examples
    --------
    >>> f"{float(density(0.0)):.4f}"
    '1.2250'
    """
    return pressure(altitude) / (_R * temperature(altitude))


def sound_speed(altitude: Values) -> Array:
    """Speed of sound of the standard atmosphere [m/s]; nominal above 86 km, where it loses its meaning.

    Parameters
    ----------
    altitude : float or array
        Geometric altitude [m], -5 to 150 km.

    Returns
    -------
    array
        Speed of sound [m/s], shape of `altitude`.

    Raises
    ------
    RangeError
        Outside -5 to 150 km.

    Notes
    -----
    a = sqrt(1.4 R* T_M / M0).

    Source
    ------
    US Standard Atmosphere 1976, equation 50.

    Examples
    --------
    >>> f"{float(sound_speed(0.0)):.2f}"
    '340.29'
    """
    return np.sqrt(HEAT_CAPACITY_RATIO * _R * temperature(altitude))


def altitude_of_pressure(pressure: Values) -> Array:
    """Geometric altitude at which the standard atmosphere has a pressure [m]; the inverse of `pressure`.

    Parameters
    ----------
    pressure : float or array
        Pressure [Pa], from that at 150 km (0.454 mPa) to that at -5 km (177.8 kPa).

    Returns
    -------
    array
        Geometric altitude [m], shape of `pressure`.

    Raises
    ------
    RangeError
        Outside the pressures of -5 to 150 km.

    Notes
    -----
    Closed form in the layers, bisection of the interpolant above 86 km.

    Source
    ------
    US Standard Atmosphere 1976, equations 33a, 33b solved for the altitude.

    Examples
    --------
    >>> round(float(altitude_of_pressure(101_325.0)), 6)
    0.0
    """
    wanted = values(pressure)
    require(np.isfinite(wanted), "pressure", wanted, "a finite number")
    highest, lowest = _PRESSURE_RANGE
    if np.any((wanted > highest) | (wanted < lowest)):
        worst = float(wanted[(wanted > highest) | (wanted < lowest)].flat[0])
        raise RangeError(
            f"`pressure` is {worst:g} Pa; the standard atmosphere from {LOWEST / 1000.0:g} to {HIGHEST / 1000.0:g} km "
            f"has {lowest:.4g} to {highest:.6g} Pa.",
            pressure=worst,
        )
    found = _layer_altitude(wanted)
    upper = wanted < _TOP_PRESSURE
    return np.where(upper, _upper_altitude(np.minimum(wanted, _TOP_PRESSURE)), found) if upper.any() else found


def _layer_altitude(wanted: Array) -> Array:
    layer = np.clip(np.searchsorted(-_BASE_PRESSURE, -wanted, side="right") - 1, 0, len(_BASE) - 1)
    logarithm = np.log(wanted / _BASE_PRESSURE[layer])
    start, gradient = _BASE_TEMPERATURE[layer], _GRADIENT[layer]
    scale = _R / STANDARD_GRAVITY
    isothermal = gradient == 0.0
    safe = np.where(isothermal, 1.0, gradient)
    rise = np.where(isothermal, -start * scale * logarithm, start / safe * np.expm1(-safe * scale * logarithm))
    return geometric_altitude(_BASE[layer] + rise)


def _upper_altitude(wanted: Array) -> Array:
    goal = np.log(wanted)
    low, high = np.full_like(goal, LAYER_TOP), np.full_like(goal, HIGHEST)
    for _ in range(60):
        middle = 0.5 * (low + high)
        above = _upper_log_pressure(middle) < goal
        low, high = np.where(above, low, middle), np.where(above, middle, high)
    return 0.5 * (low + high)


_TOP_PRESSURE: Final = float(_layer_state(np.array(LAYER_TOP))[1])
_PRESSURE_RANGE: Final = (float(_layer_state(np.array(LOWEST))[1]), UPPER_ROWS[-1][1])
