"""Identities that hold in every chain, evaluated from its numbers: conservation and definitions across objects."""

from __future__ import annotations

from collections.abc import Iterator
from typing import Any

from propkit.constants import STANDARD_GRAVITY
from propkit.model.base import Calculation
from propkit.model.conditions import condition
from propkit.report import Step


def identities(links: tuple[Calculation, ...]) -> Iterator[Step]:
    """Yield the identities of a chain with both sides evaluated.

    Parameters
    ----------
    links : tuple of Calculation
        The chain, first object first.
    """
    chain: dict[str, Any] = {link.kind: link for link in links}
    if "nozzle" in chain:
        yield from _nozzle(chain["nozzle"])
    if "performance" in chain:
        yield from _performance(chain["performance"])


def _nozzle(nozzle: Any) -> Iterator[Step]:
    exit_state, throat = nozzle.exit, nozzle.throat
    efficiency, discharge = nozzle.chamber.si("cstar_efficiency"), nozzle.si("discharge_coefficient")
    flow = nozzle.si("mass_flow") * efficiency
    for state, area in ((throat, nozzle.si("throat_area") * discharge), (exit_state, nozzle.si("exit_area"))):
        if state is exit_state or nozzle.flow != "frozen" or nozzle.freeze_at == "chamber":
            passed = state.si("density") * state.si("velocity") * area
            yield condition(
                f"mass_{state.station}",
                f"mass flow through the {state.station} [kg/s]",
                "rho u A = mass flow times c* efficiency",
                "",
                passed,
                flow,
                "conservation",
            )
    if "enthalpy" in exit_state.names():
        out, into = (state.si("enthalpy") + 0.5 * state.si("velocity") ** 2 for state in (exit_state, nozzle.inlet))
        scale = throat.si("pressure") / throat.si("density")
        yield condition(
            "energy",
            "stagnation enthalpy, exit and inlet [J/kg]",
            "h + u^2/2 at the exit = at the inlet",
            "",
            out,
            into,
            "conservation",
            scale,
        )
    if "entropy" in exit_state.names():
        scale = throat.si("pressure") / (throat.si("density") * throat.si("temperature"))
        out, into = exit_state.si("entropy"), nozzle.inlet.si("entropy")
        yield condition(
            "entropy", "entropy, exit and inlet [J/(kg K)]", "s at the exit = at the inlet", "", out, into, "conservation", scale
        )


def _performance(performance: Any) -> Iterator[Step]:
    nozzle = performance.nozzle
    force = performance.si("thrust_coefficient") * nozzle.chamber.si("stagnation_pressure") * nozzle.si("throat_area")
    yield condition("thrust", "thrust [N]", "F = CF p0 At", "", performance.si("thrust"), force, "definition")
    impulse = nozzle.si("characteristic_velocity") * performance.si("thrust_coefficient") / STANDARD_GRAVITY
    yield condition("impulse", "specific impulse [s]", "Isp = c* CF / g0", "", performance.si("specific_impulse"), impulse, "definition")
    ambient = performance.si("ambient") * nozzle.si("exit_area")
    yield condition(
        "vacuum",
        "thrust in vacuum [N]",
        "F vac = F + pa Ae",
        "",
        performance.si("thrust_vacuum"),
        performance.si("thrust") + ambient,
        "conservation",
    )
