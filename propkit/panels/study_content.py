"""What the panel of a study shows, as plain data; and the script that reproduces it."""

from __future__ import annotations

from collections.abc import Iterable
from typing import TYPE_CHECKING, Any

import numpy as np

from propkit.model.base import code_of
from propkit.panels import content, show
from propkit.panels.study_figures import best_row
from propkit.panels.study_plan import StudyPlan
from propkit.plots.study import SEPARATION, result_label
from propkit.report import UnitSystem
from propkit.study.sweep_plan import option_text
from propkit.units import shown_unit
from propkit.view.numbers import grouped

if TYPE_CHECKING:
    from propkit.panels.study_panel import StudyPanel

REASONS = 3
"""Reasons of failed designs that are told."""
LISTED = 14
"""Results of the best design that are listed beside the headline."""


def study_content(panel: StudyPanel) -> dict[str, Any]:
    """Return everything that the panel of a study shows, but its figure."""
    session, system = panel.session, panel.units
    plan: StudyPlan = session.value
    row = best_row(plan)
    pinned = session.pins.get(session.baseline)
    base = None if pinned is None else (pinned.result, best_row(pinned))
    names = _listed(plan)
    return {
        "title": "Study",
        "name": f"{show.sentence(plan.target.title)} over {plan.subtitle()}",
        "subtitle": plan.target.subtitle(),
        "units": system,
        "current": not session.refusals,
        "status": content.status_words(session),
        "sets": [content.control_set(session, face, system) for face in session.faces(plan.kind)],
        "headline": _headline(plan, row, base, system),
        "results": rows(plan.result, row, names, base, system) if row is not None else [],
        "above": _opened(panel, system),
        "stations": None,
        "doubts": doubts(plan, row),
        "facts": facts(plan),
        "actions": [
            ["best", "Open the best design", "Show every result of the best design"],
            *([["close", "Close the design", "Put the opened design away"]] if panel.picked_values else []),
        ],
        "pins": pins(session, names, system),
        "code": code_of_study(plan),
        "undo": bool(session.past or session.refusals),
        "redo": bool(session.future),
    }


# -- the best design -------------------------------------------------------------------------------


def _listed(plan: StudyPlan) -> list[str]:
    """Return the results of the best design that are listed: the limits and the object's own."""
    result = plan.result
    limits = [result.name_of(name) for name in plan.limits if name != SEPARATION]
    own = [name for name in result.results if "." not in name]
    return [name for name in dict.fromkeys([*plan.target.headline, *limits, *own]) if name in result.results and name != plan.result_name][
        :LISTED
    ]


def _headline(plan: StudyPlan, row: int | None, base: Any, system: UnitSystem) -> list[dict[str, Any]]:
    """Return result and axes of the best design."""
    result = plan.result
    if row is None:
        return []
    numbers = [span.path for span in plan.spans if not span.options]
    made = rows(result, row, [plan.result_name, *numbers], base, system)
    made[0]["label"] = f"{'Smallest' if plan.minimum else 'Largest'} {plan.result_labels[plan.result_name]}"
    for span, entry in zip([span for span in plan.spans if not span.options], made[1:], strict=True):
        entry["label"] = f"at {plan.labels[span.path]}"
    for span in plan.spans:
        if span.options:
            shown = _column(result, span.path).shown(np.array([row]))[0]
            made.append(
                {
                    "name": span.path,
                    "label": f"with {plan.labels[span.path]}",
                    "symbol": "",
                    "text": str(option_text(shown)),
                    "unit": "",
                    "kind": "given",
                    "doubts": [],
                }
            )
    return made


def _column(result: Any, path: str) -> Any:
    return next(column for column in result.plan.plan.columns if column.path == path)


def rows(result: Any, row: int, names: Iterable[str], base: Any, system: UnitSystem) -> list[dict[str, Any]]:
    """Return results of a design as texts, with their differences to the best design of a pinned study."""
    made = []
    for name in names:
        quantity = result.quantity(name)
        value = float(result.values(name)[row])
        unit, factor, offset = _shown(quantity, value, system)
        entry = {
            "name": name,
            "label": show.sentence(label_of(result, name)),
            "symbol": show.symbol(quantity.symbol),
            "text": show.value(value * factor + offset, quantity.digits),
            "unit": shown_unit(unit),
            "kind": "computed",
            "doubts": [],
        }
        if base is not None:
            entry["difference"], entry["share"] = _difference(value, factor, offset, quantity.digits, base, name)
        made.append(entry)
    return made


def _shown(quantity: Any, value: float, system: UnitSystem) -> tuple[str, float, float]:
    from propkit import units

    unit = quantity.shown_in(system, (value,))
    zero = units.convert(0.0, quantity.unit, unit)
    return unit, units.convert(1.0, quantity.unit, unit) - zero, zero


def label_of(result: Any, name: str) -> str:
    """Return what a person reads of a column: a result, or an input that varies."""
    if name in result.results:
        return result_label(result.plan.target, name)
    return str(result.quantity(name).label)


def _difference(value: float, factor: float, offset: float, digits: int, base: Any, name: str) -> tuple[str, str]:
    pinned, row = base
    if row is None or not (name in pinned.results or any(column.path == name for column in pinned.plan.plan.numbers)):
        return "", ""
    before = float(pinned.values(name)[row])
    step = (value - before) * factor
    shown_before = before * factor + offset
    share = f"{100.0 * step / abs(shown_before):+.2f} %" if shown_before else ""
    return show.difference(step, value * factor + offset, digits), share.replace("-", "\N{MINUS SIGN}")


def _opened(panel: StudyPanel, system: UnitSystem) -> list[dict[str, Any]]:
    """Return the results of the design that was opened."""
    made = panel.picked
    if made is None:
        return []
    where = ", ".join(
        f"{path.rpartition('.')[2].replace('_', ' ')} {value:.5g}"
        if isinstance(value, float)
        else f"{path.rpartition('.')[2]} {option_text(value)}"
        for path, value in panel.picked_values.items()
    )
    links = reversed(made.chain())
    return [
        {
            "kind": link.kind,
            "title": f"{f'Opened design ({where}): ' if place == 0 else ''}{link.title.lower() if place == 0 else link.title}",
            "rows": content.result_rows(link, content.result_names(link), system, None),
            "open": place == 0,
            "plain": True,
        }
        for place, link in enumerate(links)
    ]


# -- words -----------------------------------------------------------------------------------------


def doubts(plan: StudyPlan, row: int | None) -> list[str]:
    """Return what is to be doubted: failed designs with their reasons, and no design inside the limits."""
    result = plan.result
    found = [str(doubt) + "." for doubt in result.warnings if doubt.code == "failed"]
    if row is None:
        failed = not np.isfinite(result.values(plan.result_name)).any()
        found.append("No design has a result." if failed else "No design lies inside the limits.")
    return found


def facts(plan: StudyPlan) -> list[str]:
    """Return what a reader should know about the designs and how they were solved."""
    result, wanted = plan.result, len(plan.study)
    shape = " × ".join(str(size) for size in result.plan.plan.shape)
    found = [f"{_count(len(result))} designs ({shape}), each solved anew." if result.plan.plan.shape else f"{_count(len(result))} designs."]
    if len(result) < wanted:
        when = "A coarser grid while the slider moves" if plan.unsettled else "A coarser grid than asked for"
        more = "when it is let go" if plan.unsettled else "by the code with more values"
        found.append(f"{when}: {_count(wanted)} designs {more}.")
    found += [f"{show.sentence(note)}." for note in result.notes]
    kinds = [link.kind for link in plan.target.chain()]
    if {"case", "chamber"} <= set(kinds) and not any("quick engine" in note or "one by one" in note for note in result.notes):
        found.append("Solved by the damped solver.")
    found += _left_out(plan)
    return found


def _left_out(plan: StudyPlan) -> list[str]:
    """Return what of the study is not in the figure: further axes, lists of designs."""
    opened, shown = plan.opened, {span.path for span in plan.spans}
    found = []
    if not opened.is_grid:
        found.append(f"The study is a list of {_count(opened.count)} designs; the panel shows a grid over their ranges.")
    spans = {span.path: span for span in plan.spans}
    if any(path in spans and not column.is_choice and not np.isfinite(column.values).all() for path, column in opened.columns.items()):
        found.append("Infinite values of an axis are left out.")
    held = [plan.labels[path] for path in opened.columns if path not in shown]
    if held:
        found.append(f"Held at the value of the object: {', '.join(held)}. Choose it as an axis to vary it.")
    return found


def _count(number: int) -> str:
    return grouped(str(number))


def pins(session: Any, names: list[str], system: UnitSystem) -> dict[str, Any]:
    """Return the pins, and the best designs of all of them side by side."""
    if not session.pins:
        return {"names": [], "baseline": "", "rows": []}
    plans = [session.value, *session.pins.values()]
    best = [(plan.result, best_row(plan)) for plan in plans]
    result = plans[0].result
    made = []
    for name in dict.fromkeys([plans[0].result_name, *(span.path for span in plans[0].spans if not span.options), *names]):
        quantity = result.quantity(name)
        values = [_value(found, name, row) for found, row in best]
        largest = max((abs(value) for value in values if np.isfinite(value)), default=0.0)
        unit, factor, offset = _shown(quantity, largest, system)
        texts = [show.value(value * factor + offset, quantity.digits) for value in values]
        made.append(
            {
                "label": show.sentence(label_of(result, name)),
                "symbol": show.symbol(quantity.symbol),
                "unit": shown_unit(unit),
                "texts": texts,
            }
        )
    return {"names": list(session.pins), "baseline": session.baseline, "rows": made}


def _value(result: Any, name: str, row: int | None) -> float:
    known = name in result.results or any(column.path == name for column in result.plan.plan.numbers)
    return float(result.values(name)[row]) if known and row is not None else float("nan")


# -- code ------------------------------------------------------------------------------------------


def code_of_study(plan: StudyPlan) -> str:
    """Return the script that runs the study shown, draws its figure and builds its best design."""
    result = plan.result
    kind = plan.target.kind
    shape = result.plan.plan.shape
    spans = [span.thinned(size) for span, size in zip(plan.spans, shape, strict=True)]
    axes = "".join(f"        {span.path!r}: {span.code()},\n" for span in spans)
    listed = f", {list(plan.opened.results)!r}" if plan.opened.results is not None else ""
    numpy = "import numpy as np\n" if "np." in axes else ""
    lines = [f"{numpy}{plan.target.as_code()}", f"study = pk.Study(\n    {kind},\n    {{\n{axes}    }}{listed},\n)", "result = study.run()"]
    words = f"{plan.result_name!r}"
    if plan.y is None or plan.y.options:
        by = "" if plan.y is None else f", by={plan.y.path!r}"
        lines.append(f"figure = result.plot({plan.x.path!r}, {words}{by})")
    else:
        limits = "".join(f"        {name!r}: ({_code(low)}, {_code(high)}),\n" for name, (low, high) in plan.limits.items())
        more = f",\n    limits={{\n{limits}    }}" if limits else ""
        least = ",\n    minimum=True" if plan.minimum else ""
        lines.append(f"figure = result.map(\n    {words},\n    x={plan.x.path!r},\n    y={plan.y.path!r}{more}{least},\n)")
    row = best_row(plan)
    if row is not None:
        design = "".join(f"    {path!r}: {_code(value)},\n" for path, value in result.plan.plan.design(row).items())
        lines.append(f"best = {kind}.replace({{\n{design}}})")
    return "\n".join(lines) + "\n"


def _code(value: Any) -> str:
    return "None" if value is None else code_of(value)
