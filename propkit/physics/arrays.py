"""Array types of the physics functions, and the one way in which they refuse an argument."""

from __future__ import annotations

from typing import Any

import numpy as np
import numpy.typing as npt

from propkit.errors import InputError, Problem

Array = npt.NDArray[np.float64]
Values = float | npt.ArrayLike


def values(given: Values) -> Array:
    """Return `given` as an array of floats."""
    return np.asarray(given, dtype=np.float64)


def require(good: Any, name: str, given: Values, allowed: str, hint: str = "") -> None:
    """Raise an InputError that shows the first offending value unless `good` is true everywhere.

    Parameters
    ----------
    good : bool or array of bool
        Truth of the demand, one for each value of `given` (or broadcast over it).
    name : str
        Name of the argument.
    given : float or array
        The values given.
    allowed : str
        What is allowed, as a clause that follows "it must be".
    hint : str
        What to try.

    Raises
    ------
    InputError
        Where `good` is false somewhere.
    """
    truth = np.asarray(good, dtype=bool)
    if truth.all():
        return
    shown, truth = np.broadcast_arrays(np.asarray(given, dtype=np.float64), truth)
    first = shown[~truth].flat[0]
    raise InputError(Problem(name, f"{first:g}", allowed, hint))
