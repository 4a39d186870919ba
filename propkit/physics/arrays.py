"""Array types of the physics functions, tangents in them, and the one way in which they refuse an argument.

An array may be complex: its imaginary part is then `TANGENT` times a tangent, the derivative along some direction of the
inputs. Every relation that is analytic carries it, exactly, because the square of `TANGENT` is nothing beside 1; an
iteration carries it where it asks `magnitude`, which sees both parts, whether it has come to rest.

Source: W. Squire, G. Trapp, Using Complex Variables to Estimate Derivatives of Real Functions, SIAM Review 40 (1998) 110.
"""

from __future__ import annotations

from dataclasses import fields, is_dataclass, replace
from typing import Any, Final, TypeVar

import numpy as np
import numpy.typing as npt

from propkit.errors import InputError, Problem

Array = npt.NDArray[np.float64]
Values = float | npt.ArrayLike

TANGENT: Final = 1e-30
"""Imaginary part that stands for a tangent of 1."""

_Batch = TypeVar("_Batch")


def values(given: Values) -> Array:
    """Return `given` as an array of floats, complex where it carries a tangent."""
    found = np.asarray(given)
    return found if found.dtype == np.complex128 else np.asarray(found, dtype=np.float64)


def magnitude(given: Array) -> Array:
    """Return the absolute value of each number; the larger of value and tangent where there is one."""
    if not np.iscomplexobj(given):
        return np.abs(given)
    return np.maximum(np.abs(given.real), np.abs(given.imag) / TANGENT)


def has_tangent(*given: Any) -> bool:
    """Whether one of some arrays carries a tangent."""
    return any(np.iscomplexobj(part) for part in given)


def distinct(*arrays: Array) -> tuple[npt.NDArray[np.intp], npt.NDArray[np.intp]]:
    """Return the cases that stand for all of a batch, and where among them each case is: a single one where all are equal."""
    every = np.arange(len(arrays[0]))
    if all((part == part[:1]).all() for part in arrays):
        return every[:1], np.zeros_like(every)
    return every, every


def plain(batch: _Batch) -> _Batch:
    """Return an array, or a dataclass of arrays and of such dataclasses, without tangents."""
    if isinstance(batch, np.ndarray):
        return batch.real if np.iscomplexobj(batch) else batch  # type: ignore[return-value]
    if not is_dataclass(batch) or isinstance(batch, type):
        return batch
    parts = {part.name: getattr(batch, part.name) for part in fields(batch) if part.init}
    changed = {name: plain(part) for name, part in parts.items() if not hasattr(part, "segments")}
    return replace(batch, **{name: part for name, part in changed.items() if part is not parts[name]})


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
    shown, truth = np.broadcast_arrays(values(given).real, truth)
    first = shown[~truth].flat[0]
    raise InputError(Problem(name, f"{first:g}", allowed, hint))
