"""The states of a nozzle: one station as an object, any place between them, and what they assume."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

import numpy as np

from propkit import units
from propkit.chain import nozzle as stage
from propkit.chain import outcome
from propkit.errors import InputError, Problem
from propkit.model.declare import as_text
from propkit.model.doubts import Assumption
from propkit.model.state import STATE_FIELDS, State

if TYPE_CHECKING:
    from propkit.model.nozzle import Nozzle


def state_of(station: str, flow: Any, expansion: stage.Expansion) -> State:
    """Return the first case of a flow state as an object."""
    values = {name: float(getattr(flow, name)[0]) for name in STATE_FIELDS if getattr(flow, name, None) is not None}
    condensed = expansion.condensed_mass_fraction(flow)
    if condensed is not None:
        values["condensed_mass_fraction"] = condensed
    values = {name: value for name, value in values.items() if np.isfinite(value)}
    return State(station, values, {"condensed_mass_fraction": "only gases are counted (condensed=True on the case changes that)"})


def state_at(nozzle: Nozzle, area_ratio: Any, pressure: Any, branch: str) -> State:
    """Return the flow state at a local area ratio or at a pressure; see `Nozzle.at`."""
    if branch not in ("supersonic", "subsonic"):
        raise InputError(Problem("branch", as_text(branch), "'supersonic' or 'subsonic'"))
    if (area_ratio is None) == (pressure is None):
        raise InputError(
            Problem(
                "area_ratio",
                "missing" if area_ratio is None else "given beside pressure",
                "given, or pressure in its place",
                "Give one of the two.",
            )
        )
    if pressure is not None and branch != "supersonic":
        raise InputError(
            Problem("branch", as_text(branch), "left out beside pressure", "A pressure says on which side of the throat it is.")
        )
    if area_ratio is not None:
        ratio = units.to_si(area_ratio, "", "area_ratio")
        if not 1.0 <= ratio <= 1e6:
            raise InputError(Problem("area_ratio", as_text(area_ratio), "at least 1 and at most 1e+06"))
        flow = stage.state_at(nozzle.held, area_ratio=ratio / nozzle.si("discharge_coefficient"), supersonic=branch == "supersonic")
        label = f"{branch}, area ratio {ratio:g}"
    else:
        wanted = units.to_si(pressure, "Pa", "pressure")
        stagnation = nozzle.chamber.si("stagnation_pressure")
        if not 0.0 < wanted <= stagnation:
            raise InputError(Problem("pressure", as_text(pressure), f"above 0 and at most the stagnation pressure, {stagnation:g} Pa"))
        flow = stage.state_at(nozzle.held, pressure=wanted)
        label = f"pressure {wanted:g} Pa"
    if nozzle.flow == "frozen" and int(flow.status[0]) == outcome.OUT_OF_RANGE:
        name = "pressure" if area_ratio is None else "area_ratio"
        given = as_text(pressure if area_ratio is None else area_ratio)
        raise InputError(
            Problem(
                name,
                given,
                "outside the gap between the freezing point and the frozen sonic point",
                "Frozen flow returns no state there.",
            )
        )
    outcome.raise_for(flow, f"state at {label}")
    return state_of(label, flow, nozzle.held)


def assumptions(nozzle: Nozzle) -> tuple[Assumption, ...]:
    """Return what the flow through a nozzle assumes."""
    words = {
        "shifting": "Composition follows chemical equilibrium through the nozzle (shifting).",
        "frozen": f"Composition is frozen from {_frozen_text(nozzle)}.",
        "constant-property": "Gas constant and isentropic exponent are those of the reservoir throughout.",
    }
    made = [
        Assumption("flow", words[nozzle.flow], nozzle.kind_of("flow"), "mass_flow"),
        Assumption(
            "isentropic",
            "The flow is one-dimensional and isentropic from the nozzle inlet on.",
            "method",
            "specific_impulse",
        ),
    ]
    if nozzle.discharge_coefficient == 1.0:
        made.append(
            Assumption(
                "discharge",
                "The whole throat area passes flow (discharge coefficient 1).",
                nozzle.kind_of("discharge_coefficient"),
                "mass_flow",
            )
        )
    return tuple(made)


def _frozen_text(nozzle: Nozzle) -> str:
    at = nozzle._values["freeze_at"]
    return {"chamber": "the nozzle inlet", "throat": "the throat"}.get(str(at), f"area ratio {at}")
