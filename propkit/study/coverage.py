"""What trials say: mean, standard uncertainty, coverage interval, and when enough trials were made."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

Array = npt.NDArray[np.float64]

COVERAGE = 0.95
"""Coverage probability of the intervals."""


@dataclass(frozen=True, slots=True)
class Stability:
    """What an adaptive run reached for one result.

    Parameters
    ----------
    tolerance : float
        Numerical tolerance: half a unit of the last significant digit asked of the standard uncertainty.
    reached : float
        Twice the largest standard deviation among the averages of value, uncertainty and both ends of the interval.
    """

    tolerance: float
    reached: float

    @property
    def stable(self) -> bool:
        """Whether the result is stabilised in the sense of clause 7.9."""
        return self.reached <= self.tolerance


def statistics(values: Array) -> Array:
    """Return mean, standard deviation and both ends of the 95 % interval of each row of trials.

    Parameters
    ----------
    values : array, shape (results, trials)
        Results of the trials; columns with a NaN are left out.

    Returns
    -------
    array, shape (4, results)
        Mean, standard deviation, low and high end.

    Notes
    -----
    Source: JCGM 101:2008, 7.6 and 7.7.
    """
    good = values[:, np.isfinite(values).all(axis=0)]
    count = good.shape[1]
    low, high = interval_ranks(count)
    ordered = np.sort(good, axis=1)
    # deviations from the first trial keep the digits of results whose spread is small
    shifted = good - good[:, :1]
    found: Array = np.array(
        [
            good[:, 0] + shifted.mean(axis=1),
            shifted.std(axis=1, ddof=1),
            ordered[:, low],
            ordered[:, high],
        ]
    )
    return found


def interval_ranks(count: int, coverage: float = COVERAGE) -> tuple[int, int]:
    """Return the places (from 0) of the ends of the probabilistically symmetric interval in ordered trials.

    Parameters
    ----------
    count : int
        Number of trials, at least 2.
    coverage : float
        Coverage probability [1].

    Returns
    -------
    tuple of int
        Places of the low and the high end.

    Notes
    -----
    q = pM where that is whole, else its integer part after adding 1/2; r = (M - q)/2 where whole, else the integer
    part of (M - q + 1)/2; the interval runs from the r-th to the (r + q)-th ordered value.

    Source: JCGM 101:2008, 7.7.1 and 7.7.2.
    """
    product = coverage * count
    held = round(product) if abs(product - round(product)) < 1e-9 * count else int(product + 0.5)
    rest = count - held
    start = rest // 2 if rest % 2 == 0 else (rest + 1) // 2
    low = max(start, 1) - 1
    return low, min(low + held, count - 1)


def tolerance(uncertainty: float, digits: int = 1) -> float:
    """Return the numerical tolerance of a standard uncertainty: half a unit of its last significant digit.

    Parameters
    ----------
    uncertainty : float
        Standard uncertainty, any unit.
    digits : int
        Significant digits that count.

    Returns
    -------
    float
        Tolerance in the same unit; 0 for no uncertainty.

    Notes
    -----
    Source: JCGM 101:2008, 7.9.2.
    """
    if not uncertainty > 0.0:
        return 0.0
    exponent = math.floor(math.log10(uncertainty)) - (digits - 1)
    if round(uncertainty / 10.0**exponent) >= 10**digits:
        exponent += 1
    return 0.5 * 10.0**exponent
