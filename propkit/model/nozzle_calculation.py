"""The calculation of a nozzle: the expansion asked for, the sizes that follow, and what to doubt."""

from __future__ import annotations

import math
from collections.abc import Iterator
from typing import TYPE_CHECKING

from propkit.chain import nozzle as stage
from propkit.chain import outcome, sizing
from propkit.errors import InputError, Problem, RangeError
from propkit.model import nozzle_sizes
from propkit.model import wall as wall_of_nozzle
from propkit.model.base import Outcome
from propkit.model.declare import as_text
from propkit.model.doubts import Doubt
from propkit.model.nozzle_sizes import SIZES

if TYPE_CHECKING:
    from propkit.model.chamber import Chamber
    from propkit.model.nozzle import Nozzle


def calculate(nozzle: Nozzle) -> Outcome:
    """Return results, doubts and the expansion of a nozzle; the choices that follow from its chamber are filled in."""
    chamber: Chamber = nozzle._values["chamber"]
    flow = nozzle.flow_model()
    nozzle._values["flow"] = flow
    if flow == "frozen":
        nozzle._values["freeze_at"] = nozzle._values["freeze_at"] or "chamber"
    if flow == "constant-property" and chamber.chooses_exponent:
        nozzle._values["exponent"] = nozzle._values["exponent"] or "equilibrium"
    discharge = nozzle._values["discharge_coefficient"]
    ratio, pressure = nozzle._values["area_ratio"], nozzle._values["exit_pressure"]
    if ratio is None and pressure is None:
        ratio = nozzle_sizes.size_ratio(nozzle._typed, nozzle._values)
    freeze_at = nozzle._values["freeze_at"]
    expansion = stage.expand(
        chamber.held,
        flow=flow,
        freeze_at=freeze_at / discharge if isinstance(freeze_at, float) else freeze_at,
        exponent=nozzle._values["exponent"],
        area_ratio=None if ratio is None else ratio / discharge,
        exit_pressure=pressure,
    )
    _refuse(nozzle, expansion, pressure)
    geometric = ratio if ratio is not None else float(expansion.area_ratio[0]) * discharge
    return _sized(nozzle, chamber, expansion, geometric)


def _refuse(nozzle: Nozzle, expansion: stage.Expansion, pressure: float | None) -> None:
    throat_pressure = float(expansion.throat.pressure[0])
    if pressure is not None and pressure > throat_pressure:
        raise InputError(
            Problem(
                "exit_pressure",
                f"{pressure:g} Pa",
                f"at most the throat pressure, {throat_pressure:g} Pa",
                "A nozzle with an exit accelerates the gas beyond its throat.",
            )
        )
    frozen_late = isinstance(nozzle._values["freeze_at"], float)
    if frozen_late and outcome.OUT_OF_RANGE in (int(expansion.exit.status[0]), int(expansion.throat.status[0])):
        raise InputError(
            Problem(
                "freeze_at",
                as_text(nozzle._typed["freeze_at"]),
                "an area ratio beyond the frozen sonic point",
                "Take a larger area ratio, or 'throat'.",
            )
        )
    expansion.raise_for_status(nozzle.kind)


def _sized(nozzle: Nozzle, chamber: Chamber, expansion: stage.Expansion, ratio: float) -> Outcome:
    name = next(name for name in SIZES if name in nozzle._typed)
    ambient = nozzle._values["sizing_ambient"]
    sizes = sizing.size(
        name,
        nozzle._values[name],
        mass_flux=expansion.mass_flux,
        area_ratio=ratio,
        exit_velocity=expansion.exit.velocity,
        exit_pressure=expansion.exit.pressure,
        ambient=ambient.pressure if ambient is not None else 0.0,
        discharge_coefficient=nozzle._values["discharge_coefficient"],
        cstar_efficiency=chamber.si("cstar_efficiency"),
        divergence_factor=wall_of_nozzle.divergence_factor(nozzle._values["contour"], ratio) if name == "thrust" else 1.0,
    )
    throat_area, exit_area, mass_flow = (float(getattr(sizes, field)[0]) for field in ("throat_area", "exit_area", "mass_flow"))
    if not (throat_area > 0.0 and math.isfinite(throat_area)):
        raise RangeError(
            f"No size gives a thrust of {nozzle._values['thrust']:g} N at an ambient pressure of {ambient.pressure:g} Pa: this expansion "
            f"delivers no thrust there (exit pressure {float(expansion.exit.pressure[0]):g} Pa). Choose a smaller area_ratio.",
            throat_area=throat_area,
        )
    area = {"throat": throat_area, "exit": exit_area}
    results = {f"{where}_area": value for where, value in area.items()}
    results |= {f"{where}_diameter": math.sqrt(4.0 * value / math.pi) for where, value in area.items()}
    results |= {"area_ratio": ratio, "mass_flow": mass_flow, "exit_pressure": float(expansion.exit.pressure[0])}
    results["characteristic_velocity"] = chamber.si("stagnation_pressure") * throat_area / mass_flow
    if name in nozzle._typed:
        results[name] = nozzle._values[name]
    if ambient is not None:
        results["sizing_ambient"] = ambient.pressure
    shape = nozzle.shape(results)
    results |= shape.results
    absent = {
        **shape.absent,
        "contour": wall_of_nozzle.NO_CONTOUR,
        "thrust": "the nozzle was not sized for a thrust; pk.Performance(nozzle, ambient=...).thrust has the thrust",
        "sizing_ambient": "the nozzle was not sized for a thrust",
        "freeze_at": "only frozen flow freezes its composition",
        "exponent": "only constant-property flow of a chamber gas chooses its exponent",
    }
    doubts = [*_doubts(nozzle, expansion), *(Doubt(text, code="contour-chart", about="contour") for text in shape.doubts)]
    return Outcome(results, absent, tuple(doubts), expansion)


def _doubts(nozzle: Nozzle, expansion: stage.Expansion) -> Iterator[Doubt]:
    for text, code, about in expansion.doubts():
        yield Doubt(text, code=code, about=about)
    case = nozzle._values["chamber"].case_or_none
    if case is not None:
        yield from case.flow_doubts(expansion)
    late, ratio = nozzle._values["freeze_at"], float(expansion.area_ratio[0]) * nozzle._values["discharge_coefficient"]
    if isinstance(late, float) and late >= ratio:
        text = f"The composition freezes at area ratio {late:g}, beyond the exit at {ratio:.4g}: the flow is shifting all the way."
        yield Doubt(text, code="freezes-beyond-exit", about="flow")
