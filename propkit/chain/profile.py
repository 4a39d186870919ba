"""Profile stage: the flow states of one expansion at many local area ratios, as one batch."""

from __future__ import annotations

from dataclasses import fields, is_dataclass, replace
from typing import Any

import numpy as np

from propkit.chain.nozzle import Expansion
from propkit.physics import expansion
from propkit.physics.arrays import Array, Values, values
from propkit.physics.equilibrium import CONVERGED, EquilibriumState
from propkit.physics.expansion import FlowState
from propkit.physics.expansion_parallel import Parallel

ALONG = ("pressure", "temperature", "velocity", "mach", "density", "isentropic_exponent")
"""What is told along a nozzle."""


def along(found: Expansion, area_ratio: Values, *, supersonic: bool, index: int = 0) -> dict[str, Array]:
    """Return the flow along a nozzle at local area ratios on one side of the throat.

    Parameters
    ----------
    found : Expansion
        What the nozzle stage yields.
    area_ratio : float or array
        Local area over effective throat area [1], 1 or more, shape (point,).
    supersonic : bool
        On which side of the throat.
    index : int
        Which case of the batch.

    Returns
    -------
    dict of str to array
        The quantities of `ALONG` in SI, shape (point,); NaN where this flow has no state.
    """
    ratio = np.atleast_1d(values(area_ratio)).astype(float)
    cases = np.full(len(ratio), index)
    isentrope = _repeated(found.isentrope, cases)
    states = expansion.at_area_ratio(isentrope, found.mass_flux[cases], ratio, found.throat.take(cases), supersonic)
    good, at_throat = states.status == CONVERGED, ratio <= 1.0 + 1e-12
    flow = {}
    for name in ALONG:
        there = np.where(good, getattr(states, name), np.nan)
        flow[name] = np.where(at_throat, getattr(found.throat, name)[index], there)
    return flow


def _repeated(part: Any, cases: Array) -> Any:
    """Return a batch object with its cases taken as `cases` says, the parts of an isentrope included."""
    if isinstance(part, EquilibriumState | FlowState):
        return part.take(cases)
    if isinstance(part, np.ndarray):
        return part[cases]
    if isinstance(part, Parallel):
        return part.take(cases.astype(np.intp))
    if is_dataclass(part) and not isinstance(part, type):
        changed = {field.name: _repeated(getattr(part, field.name), cases) for field in fields(part) if field.name != "table"}
        return replace(part, **changed)
    return part


def optimum_area_ratio(found: Expansion, ambient: Values, index: int = 0) -> Array:
    """Return the area ratio whose exit pressure equals each ambient pressure.

    Parameters
    ----------
    found : Expansion
        What the nozzle stage yields.
    ambient : float or array
        Ambient pressure [Pa], above 0, shape (point,).
    index : int
        Which case of the batch.

    Returns
    -------
    array
        Exit area over effective throat area [1]; NaN where the gas has no state at that pressure, 1 where it is above the
        throat pressure.
    """
    pressure = np.atleast_1d(values(ambient)).astype(float)
    cases = np.full(len(pressure), index)
    throat = found.throat.take(cases)
    states = expansion.at_pressure(_repeated(found.isentrope, cases), np.minimum(pressure, throat.pressure), throat)
    ratio = np.where(states.status == CONVERGED, found.mass_flux[cases] / states.mass_flux, np.nan)
    return np.where(pressure >= throat.pressure, 1.0, ratio)
