"""The live figures of a study's panel, its best design, and the design nearest to a point of a figure."""

from __future__ import annotations

from dataclasses import replace
from typing import Any

import numpy as np
import numpy.typing as npt

from propkit.errors import InputError, Problem
from propkit.plots.study import allowed, map_figure
from propkit.report import UnitSystem
from propkit.series import Mark
from propkit.study.sweep_figures import MOST_CURVES, shown_values
from propkit.units import shown_unit

Array = npt.NDArray[np.float64]

MAP, CURVES = "Map", "Curves"


def titles_of(session: Any) -> list[str]:
    """Return the titles of the figures: map, curves, and the map less the pinned one where both have one grid."""
    plan = session.value
    if plan.y is None or plan.y.options:
        return [CURVES]
    pinned = session.pins.get(session.baseline)
    less = [f"Map less {session.baseline}"] if pinned is not None and _comparable(plan, pinned) else []
    return [MAP, CURVES, *less]


def _comparable(plan: Any, pinned: Any) -> bool:
    return [span.path for span in plan.spans] == [span.path for span in pinned.spans] and all(
        np.array_equal(one.values, other.values) for one, other in zip(plan.spans, pinned.spans, strict=True)
    )


def figures_of(session: Any, at: int, units: UnitSystem, picked: dict[str, Any]) -> tuple[Any, ...]:
    """Return the figure at a place of `titles_of`."""
    plan, titles = session.value, titles_of(session)
    title = titles[min(at, len(titles) - 1)]
    result = plan.result
    if title == CURVES:
        drawn = result.curves(plan.x.path, plan.result_name, by=None if plan.y is None else plan.y.path, units=units)
        return (replace(drawn, layers=(*drawn.layers, _best_on_curves(plan, units))),)
    options: dict[str, Any] = {"x": plan.x.path, "y": plan.y.path, "limits": plan.limits, "minimum": plan.minimum, "units": units}
    if title != MAP:
        pinned = session.pins[session.baseline]
        result, base = _on_one_grid(plan, pinned)
        options["less"] = base
    drawn = map_figure(result, plan.result_name, **options)
    return (replace(drawn, layers=(*drawn.layers, _picked(result, plan, picked, units))),)


def _picked(result: Any, plan: Any, picked: dict[str, Any], units: UnitSystem) -> Mark:
    """Return the mark of the opened design; nowhere where none is, where it is off the map, or where it is the best."""
    places = []
    best = best_row(plan)
    if best is not None and result.plan.plan.design(best) == picked:
        picked = {}
    for span in plan.spans:
        value = picked.get(span.path)
        inside = value is not None and span.values[0] <= value <= span.values[-1]
        _, factor, offset = result.display(span.path, units)
        places.append(value * factor + offset if inside and value is not None else float("nan"))
    there = bool(np.isfinite(places).all())
    return Mark(*(places if there else (float("nan"), float("nan"))), "opened" if there else "", colour="ink")


def _best_on_curves(plan: Any, units: UnitSystem) -> Mark:
    """Return the mark of the best design on its curve; nowhere where there is none, or its curve is not among those drawn."""
    result, row = plan.result, best_row(plan)
    shown = plan.y is None or len(plan.y) <= MOST_CURVES
    if row is None or not shown:
        return Mark(float("nan"), float("nan"), "")
    x, value = (float(shown_values(result, name, units)[row]) for name in (plan.x.path, plan.result_name))
    unit = shown_unit(result.display(plan.result_name, units)[0])
    return Mark(x, value, f"{'smallest' if plan.minimum else 'largest'} {value:.5g}{f' {unit}' if unit else ''}")


def _on_one_grid(plan: Any, pinned: Any) -> tuple[Any, Any]:
    """Return both results on one grid; the pinned one is solved again where the other is a coarse one."""
    result, base = plan.result, pinned.result
    if len(result) == len(base):
        return result, base
    return result, pinned.study_of(len(result)).run(progress=False)


def best_row(plan: Any) -> int | None:
    """Return the number of the best design inside the limits; None where there is none."""
    return plan.kept("best", lambda: _best_row(plan))  # type: ignore[no-any-return]


def _best_row(plan: Any) -> int | None:
    result = plan.result
    values = result.values(plan.result_name)
    good = np.isfinite(values)
    for _, room in allowed(result, plan.limits):
        good &= room >= 0.0
    if not good.any():
        return None
    worst = np.inf if plan.minimum else -np.inf
    kept = np.where(good, values, worst)
    return int(np.argmin(kept) if plan.minimum else np.argmax(kept))


def nearest(plan: Any, units: UnitSystem, at: int, x: float, y: float | None) -> int:
    """Return the number of the design nearest to a point of the figure, given in display units."""
    result = plan.result
    is_map = at != 1 and plan.y is not None and not plan.y.options
    across = _shares(result, plan.x.path, x, units)
    up = np.zeros_like(across) if y is None else _shares(result, plan.y.path if is_map else plan.result_name, y, units)
    distance = across**2 + up**2
    if not np.isfinite(distance).any():
        raise InputError(Problem("x", f"{x}", "a point of the figure"))
    return int(np.nanargmin(distance))


def _shares(result: Any, name: str, point: float, units: UnitSystem) -> Array:
    """Return how far each design is from a point, as a share of the range."""
    _, factor, offset = result.display(name, units)
    values = result.values(name) * factor + offset
    extent = float(np.nanmax(values) - np.nanmin(values)) or 1.0
    return np.asarray((values - point) / extent, dtype=np.float64)
