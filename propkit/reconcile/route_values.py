"""The routes of a reconciliation: what its quoted figures and its model give for a quantity, each way by itself."""

from __future__ import annotations

from collections.abc import Mapping
from typing import TYPE_CHECKING

import numpy as np

from propkit.reconcile.figures import QuotedFigure
from propkit.reconcile.model import EXTRA_UNKNOWNS, LEVELLED, FigureModel, name_of
from propkit.reconcile.routes import RouteValue, routes_to
from propkit.study.evaluation import variable

if TYPE_CHECKING:
    from propkit.reconcile.reconciliation import Reconciliation


def route_values(fit: Reconciliation, quantity: str) -> tuple[RouteValue, ...]:
    """Return the routes to a quantity from the quoted figures, at chamber level."""
    target = fit.target
    nozzle, chamber = target.nozzle, target.nozzle.chamber
    rest = chamber.si("stagnation_pressure")
    model = {
        "model.pressure_ratio": rest / float(variable(target, "chamber.pressure").nominal),
        "model.characteristic_velocity": nozzle.si("characteristic_velocity"),
        "model.thrust_coefficient": target.si("thrust_coefficient"),
        "model.thrust_coefficient_vacuum": target.si("thrust_coefficient_vacuum"),
        "model.specific_impulse": target.si("specific_impulse"),
        "model.specific_impulse_vacuum": target.si("specific_impulse_vacuum"),
    }
    chosen: dict[str, QuotedFigure] = {}
    for figure in fit.figures.values():
        if figure.key not in chosen or figure.level == "chamber":
            chosen[figure.key] = figure
    return routes_to(quantity, chosen, model, _to_chamber(fit, chosen))


def _to_chamber(fit: Reconciliation, figures: Mapping[str, QuotedFigure]) -> dict[str, float]:
    keys = [key for key, figure in figures.items() if figure.level == "engine" and key in LEVELLED]
    if not keys:
        return {}
    values = {key: value for key, value in zip(fit.free, fit.adjustment.estimate, strict=True) if key in EXTRA_UNKNOWNS}
    asked = tuple((key, level) for key in keys for level in ("engine", "chamber"))
    fixed = {**fit._model.fixed, **{key: float(value) for key, value in values.items()}}
    model = FigureModel(fit.target, (), asked, fixed)
    found = model({"burn_time": np.array([fixed.get("burn_time", 1.0)])})
    return {key: float(found[name_of(key, "chamber")][0] / found[name_of(key, "engine")][0]) for key in keys}
