"""What the panel of an uncertainty shows, as plain data: its figures, its rows, and the script that reproduces it."""

from __future__ import annotations

import math
from typing import TYPE_CHECKING, Any

import numpy as np

from propkit.panels import content, show
from propkit.panels.uncertainty_plan import FIRST_ORDER, TRIALS, UncertaintyPlan
from propkit.report import UnitSystem
from propkit.series import Axis, Figure, Line, Rule, Series
from propkit.units import shown_unit

if TYPE_CHECKING:
    from propkit.panels.uncertainty_panel import UncertaintyPanel

REACH, POINTS = 3.5, 121
"""The curve of a normal distribution: how many standard uncertainties it reaches, and its points."""


def uncertainty_content(panel: UncertaintyPanel) -> dict[str, Any]:
    """Return everything that the panel of an uncertainty shows, but its figures."""
    session, system = panel.session, panel.units
    plan: UncertaintyPlan = session.value
    pinned = session.pins.get(session.baseline)
    base = None if pinned is None else pinned.result
    result = plan.result
    return {
        "title": "Uncertainty",
        "name": f"{show.sentence(plan.target.title)}, uncertain in {plan.subtitle()}",
        "subtitle": plan.target.subtitle(),
        "units": system,
        "current": not session.refusals,
        "status": content.status_words(session),
        "sets": [content.control_set(session, face, system) for face in session.faces(plan.kind)],
        "headline": headline(plan, base, system),
        "results": [row(result, name, plan.result_labels[name], base, system) for name in result.results],
        "above": [],
        "stations": None,
        "doubts": [str(doubt) for doubt in result.warnings],
        "facts": facts(plan),
        "actions": actions(plan),
        "pins": pins(session, system),
        "code": code_of_uncertainty(plan),
        "undo": bool(session.past or session.refusals),
        "redo": bool(session.future),
    }


def actions(plan: UncertaintyPlan) -> list[list[str]]:
    """Return the buttons: trials, or back to first order."""
    samples, _ = plan.trials
    run = [
        TRIALS,
        f"Run {samples} trials" if isinstance(samples, int) else "Run trials until they are enough",
        "Draw every input from its whole distribution (Monte Carlo)",
    ]
    back = [FIRST_ORDER, "Back to first order", "Show the first-order interval again"]
    return [run] if plan.method == FIRST_ORDER else [back]


def facts(plan: UncertaintyPlan) -> list[str]:
    """Return how the uncertainty was found."""
    result = plan.result
    if result.trials is not None:
        return [f"From {result.trials.valid} of {result.samples} trials, seed {result.seed}; 95 % interval probabilistically symmetric."]
    exact = result.first_order.exact if result.first_order is not None else ()
    listed = list(plan.opened.inputs)
    differences = [plan.labels[path] for path in listed if path not in exact]
    how = "sensitivities exact" if not differences else f"sensitivities by differences: {', '.join(differences)}"
    return [f"First order, {how}; 95 % interval of 1.96 standard uncertainties."]


# -- numbers ---------------------------------------------------------------------------------------


def _numbers(result: Any, name: str) -> tuple[float, float, float, float]:
    """Return value, standard uncertainty and the ends of the interval, in SI."""
    place = result.results.index(name)
    value, deviation, low, high = (float(column[place]) for column in result._columns())
    return value, deviation, low, high


def headline(plan: UncertaintyPlan, base: Any, system: UnitSystem) -> list[dict[str, Any]]:
    """Return value, standard uncertainty and interval of the result shown."""
    result, name = plan.result, plan.result_name
    quantity = result._quantity(name)
    unit, factor = result._display(name, system)
    both = result.rounded(name, system)
    decimals = len(both.uncertainty.partition(".")[2])
    value, deviation, low, high = (number * factor for number in _numbers(result, name))
    before = None if base is None or name not in base.results else [number * factor for number in _numbers(base, name)]
    answers = (
        ("value", plan.result_labels[name], both.value, value),
        ("standard_uncertainty", "standard uncertainty", both.uncertainty, deviation),
        ("interval", "95 % interval", f"{low:.{decimals}f} to {high:.{decimals}f}", math.nan),
    )
    made = []
    for place, (key, label, text, number) in enumerate(answers):
        entry = {
            "name": key,
            "label": show.sentence(label),
            "symbol": show.symbol(quantity.symbol) if place == 0 else "",
            "text": text.replace("-", "\N{MINUS SIGN}"),
            "unit": shown_unit(unit),
            "kind": "computed",
            "doubts": [],
        }
        if before is not None and place < 2:
            step = number - before[place]
            entry["difference"] = show.signed(f"{abs(step):.{decimals}f}", step) if step else "±0"
            entry["share"] = f"{100.0 * step / abs(before[place]):+.2f} %".replace("-", "\N{MINUS SIGN}") if before[place] else ""
        made.append(entry)
    return made


def row(result: Any, name: str, label: str, base: Any, system: UnitSystem) -> dict[str, Any]:
    """Return a result with its standard uncertainty, and its difference to the pinned one."""
    quantity = result._quantity(name)
    unit, factor = result._display(name, system)
    value, deviation, _, _ = _numbers(result, name)
    share = f"{100.0 * deviation / abs(value):.2g} %" if value else ""
    made = {
        "name": name,
        "label": show.sentence(label),
        "symbol": show.symbol(quantity.symbol),
        "text": f"{result.rounded(name, system)}".replace("-", "\N{MINUS SIGN}"),
        "unit": f"{shown_unit(unit)}{f'  ({share})' if share and base is None else ''}",
        "kind": "computed",
        "doubts": [str(doubt) for doubt in result.warnings if doubt.about == name],
    }
    if base is not None and name in base.results:
        before = _numbers(base, name)
        step = (value - before[0]) * factor
        made["difference"] = show.difference(step, value * factor, quantity.digits)
        made["share"] = ""
    return made


def pins(session: Any, system: UnitSystem) -> dict[str, Any]:
    """Return the pins, and values with their uncertainties of all of them side by side."""
    if not session.pins:
        return {"names": [], "baseline": "", "rows": []}
    results = [plan.result for plan in (session.value, *session.pins.values())]
    made = []
    for name in results[0].results:
        quantity, (unit, _) = results[0]._quantity(name), results[0]._display(name, system)
        texts = [f"{result.rounded(name, system)}" if name in result.results else show.ABSENT for result in results]
        made.append(
            {
                "label": show.sentence(session.value.result_labels[name]),
                "symbol": show.symbol(quantity.symbol),
                "unit": shown_unit(unit),
                "texts": texts,
            }
        )
    return {"names": list(session.pins), "baseline": session.baseline, "rows": made}


# -- figures -----------------------------------------------------------------------------------------


def figures_of(plan: UncertaintyPlan, system: UnitSystem) -> tuple[Figure, ...]:
    """Return the budget of the result shown, and its distribution."""
    result, name = plan.result, plan.result_name
    budget = (result.tornado(name, system),) if result.first_order is not None else ()
    spread = result.histogram(name, system) if result.trials is not None else normal_curve(plan, system)
    return (*budget, *((spread,) if spread is not None else ()))


def normal_curve(plan: UncertaintyPlan, system: UnitSystem) -> Figure | None:
    """Return the normal distribution that first order stands for, with the 95 % interval; None for a result without spread."""
    result, name = plan.result, plan.result_name
    quantity = result._quantity(name)
    unit, factor = result._display(name, system)
    value, deviation, low, high = (number * factor for number in _numbers(result, name))
    deviation = abs(deviation)
    if deviation == 0.0 or not math.isfinite(deviation):
        return None
    steps = np.linspace(-REACH, REACH, POINTS)
    density = np.exp(-0.5 * steps**2) / (deviation * math.sqrt(2.0 * math.pi))
    line = Line(
        Series(quantity.label, tuple((value + steps * deviation).tolist()), unit, quantity.symbol),
        Series("density", tuple(density.tolist())),
        fill=True,
    )
    rules = tuple(Rule("x", place, text) for place, text in ((value, "nominal"), (low, "2.5 %"), (high, "97.5 %")))
    title = f"{show.sentence(quantity.label)}: normal, of the first-order standard uncertainty"
    alt = f"{title}: {value:.6g}, 95 % between {low:.6g} and {high:.6g} {shown_unit(unit)}"
    return Figure(
        f"interval-{name}", title, alt, Axis(quantity.label, unit, quantity.symbol), Axis("probability density", low=0.0), (line, *rules)
    )


# -- code --------------------------------------------------------------------------------------------


def code_of_uncertainty(plan: UncertaintyPlan) -> str:
    """Return the script that finds the uncertainty shown and draws its budget."""
    kind, found = plan.target.kind, plan.uncertainty
    listed = "".join(f"        {path!r}: {entry!r},\n" for path, entry in found.inputs.items())
    pairs = f"    correlation={dict(plan.opened.correlation)!r},\n" if plan.opened.correlation else ""
    lines = [
        plan.target.as_code(),
        f"uncertainty = pk.Uncertainty(\n    {kind},\n    {{\n{listed}    }},\n{pairs}    results={list(plan.opened.results)!r},\n)",
    ]
    if plan.method == FIRST_ORDER:
        lines.append("result = uncertainty.run()")
    else:
        samples, seed = plan.trials
        more = f", illegal={plan.si('illegal')!r}" if plan.si("illegal") != "refuse" else ""
        lines.append(f"result = uncertainty.run(samples={samples!r}, seed={seed}{more})")
    drawn = "tornado" if plan.result.first_order is not None else "histogram"
    lines.append(f"figure = result.plot({plan.result_name!r}, {drawn!r})")
    return "\n".join(lines) + "\n"
