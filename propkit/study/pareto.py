"""Designs that none other beats in everything at once."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt

Array = npt.NDArray[np.float64]


def undominated(table: Array) -> npt.NDArray[np.intp]:
    """Return the rows of a table that no other row equals or exceeds in every column at once.

    Parameters
    ----------
    table : array
        Values to be large, shape (row, column).

    Returns
    -------
    array of int
        Row numbers, ascending. Of equal rows the first is kept.
    """
    order = np.lexsort(tuple(-table[:, place] for place in reversed(range(table.shape[1]))))
    kept: list[int] = []
    front = np.empty((0, table.shape[1]))
    for row in order:
        if not (front >= table[row]).all(axis=1).any():
            kept.append(int(row))
            front = np.vstack([front, table[row]])
    return np.array(sorted(kept), dtype=np.intp)
