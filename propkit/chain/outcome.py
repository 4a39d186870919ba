"""From the status of a batch to an error that carries the state: a case that does not converge is never a number."""

from __future__ import annotations

from typing import Any

import numpy as np

from propkit.errors import ConvergenceError, RangeError

CONVERGED, NOT_CONVERGED, OUT_OF_RANGE = 0, 1, 2
COLD = 250.0
"""Temperature [K] below which a search that ended outside the data ended at their cold end."""


_UNITS = {"pressure": " Pa", "temperature": " K"}


def raise_for(state: Any, what: str, index: int = 0, cold_hint: str = "") -> None:
    """Raise when a case of a batch has no solution.

    Parameters
    ----------
    state : EquilibriumState or FlowState
        Batch with `status` and, where it has them, `iterations` and `residual`.
    what : str
        What was being solved, for the message.
    index : int
        Case of the batch.
    cold_hint : str
        What to try where the enthalpy is lower than gases can hold; of gases in general by default.

    Raises
    ------
    RangeError
        When there is no solution inside the range of the data.
    ConvergenceError
        When the iteration did not converge.
    """
    status = int(np.atleast_1d(state.status)[index])
    if status == CONVERGED:
        return
    carried = {
        name: _scalar(getattr(state, name), index)
        for name in ("pressure", "temperature", "iterations", "residual")
        if getattr(state, name, None) is not None
    }
    reached = ", ".join(f"{name} {value:.6g}{_UNITS.get(name, '')}" for name, value in carried.items() if np.isfinite(value))
    if status == OUT_OF_RANGE:
        raise RangeError(
            f"The {what} has no solution inside the range of the species data (state reached: {reached}). {_hint(carried, cold_hint)}",
            **carried,
        )
    raise ConvergenceError(
        f"The {what} did not converge (state reached: {reached}). Nothing is returned rather than a doubtful number.",
        **carried,
    )


def _hint(state: dict[str, float], cold_hint: str) -> str:
    """Return what to look at, by the end of the range that was reached."""
    if state.get("temperature", COLD) < COLD:
        return cold_hint or (
            "The enthalpy is lower than gases can hold there: check mixture ratio and propellant enthalpies; where "
            "products condense, condensed=True may have a solution."
        )
    return "The enthalpy is higher than the data reach: check mixture ratio and propellant enthalpies."


def _scalar(values: Any, index: int) -> float:
    return float(np.atleast_1d(values)[index])
