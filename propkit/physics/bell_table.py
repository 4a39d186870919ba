"""Wall angles of Rao's parabolic bells, by area ratio and length.

The table holds readings of the published chart (Rao 1960, reproduced in propulsion handbooks), recalled from memory and
smoothed; a reading is good to about 1 degree. A degree at the lip moves the divergence factor by 0.1 %.
"""

from __future__ import annotations

from typing import Final

import numpy as np

from propkit.errors import InputError, Problem
from propkit.physics.arrays import Array, Values, require, values

AREA_RATIOS: Final = (4.0, 5.0, 10.0, 20.0, 30.0, 40.0, 50.0, 100.0)
"""Area ratios of the columns of the table."""

LENGTH_FRACTIONS: Final = (0.6, 0.7, 0.8, 0.9, 1.0)
"""Lengths over that of a 15 degree cone: the rows of the table."""

THROAT_ANGLES: Final = (
    (26.5, 28.0, 32.0, 35.0, 36.3, 37.2, 38.0, 40.0),
    (23.5, 25.0, 28.8, 31.6, 32.9, 33.8, 34.4, 36.4),
    (21.5, 23.0, 26.3, 28.8, 30.0, 31.0, 31.5, 33.5),
    (20.0, 21.2, 24.4, 27.0, 28.4, 29.3, 30.0, 32.0),
    (18.8, 19.8, 22.8, 25.5, 27.0, 28.0, 28.7, 30.5),
)
"""Wall angle where the parabola starts [deg]: Rao (1960), chart, from memory."""

EXIT_ANGLES: Final = (
    (20.5, 19.5, 16.5, 14.5, 13.7, 13.2, 12.8, 11.5),
    (17.0, 16.0, 13.5, 11.5, 10.8, 10.3, 9.9, 9.0),
    (14.0, 13.0, 10.8, 9.0, 8.4, 8.0, 7.6, 7.0),
    (11.5, 10.5, 8.6, 7.2, 6.7, 6.3, 6.1, 5.7),
    (9.5, 8.6, 6.8, 5.6, 5.1, 4.8, 4.6, 4.3),
)
"""Wall angle at the lip [deg]: Rao (1960), chart, from memory."""


def inside_table(area_ratio: Values) -> Array:
    """Return whether the table covers an area ratio; outside it `bell_angles` continues the last slope."""
    ratio = values(area_ratio)
    return np.asarray((ratio >= AREA_RATIOS[0]) & (ratio <= AREA_RATIOS[-1]))


def bell_angles(area_ratio: Values, length_fraction: Values) -> tuple[Array, Array]:
    """Return the wall angles of a parabolic bell where the parabola starts and at the lip [rad].

    Parameters
    ----------
    area_ratio : float or array
        Exit over throat area, 2 to 400; beyond 4 to 100 the last slope is continued (see `inside_table`).
    length_fraction : float or array
        Length over that of a 15 degree cone of the same area ratio, 0.6 to 1.

    Returns
    -------
    tuple of array
        Throat-side and lip wall angles [rad].

    Raises
    ------
    InputError
        Outside the ranges stated.

    Notes
    -----
    Linear in ln(area ratio) and in length.

    Source
    ------
    Rao (1960), chart of wall angles, from memory (1 degree).

    Examples
    --------
    >>> [round(float(np.degrees(angle)), 1) for angle in bell_angles(10.0, 0.8)]
    [26.3, 10.8]
    """
    ratio, fraction = np.broadcast_arrays(values(area_ratio), values(length_fraction))
    require((ratio >= 2.0) & (ratio <= 400.0), "area_ratio", ratio, "2 to 400 for a bell without given angles")
    low, high = LENGTH_FRACTIONS[0], LENGTH_FRACTIONS[-1]
    if np.any((fraction < low) | (fraction > high)):
        worst = fraction[(fraction < low) | (fraction > high)].flat[0]
        hint = "The table of wall angles covers that; outside it give the throat and exit angle."
        raise InputError(Problem("length", f"{worst:g}", f"{low:g} to {high:g}", hint))
    grid = np.log(AREA_RATIOS)
    column = np.clip(np.searchsorted(grid, np.log(ratio), side="right") - 1, 0, len(grid) - 2)
    across = (np.log(ratio) - grid[column]) / (grid[column + 1] - grid[column])
    steps = np.array(LENGTH_FRACTIONS)
    row = np.clip(np.searchsorted(steps, fraction, side="right") - 1, 0, len(steps) - 2)
    down = (fraction - steps[row]) / (steps[row + 1] - steps[row])

    def read(table: Array) -> Array:
        upper = table[row, column] * (1.0 - across) + table[row, column + 1] * across
        lower = table[row + 1, column] * (1.0 - across) + table[row + 1, column + 1] * across
        return values(np.radians(np.maximum(upper * (1.0 - down) + lower * down, 0.0)))

    return read(np.array(THROAT_ANGLES)), read(np.array(EXIT_ANGLES))
