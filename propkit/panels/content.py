"""What a panel shows, as plain data: controls, results, differences to a pin, pins side by side, code."""

from __future__ import annotations

from collections.abc import Iterable
from typing import Any

from propkit.errors import PropkitError
from propkit.model import sheet
from propkit.model.declare import NumberInput, QuantityInput
from propkit.panels import show
from propkit.panels.faces import Face, Group, Unit
from propkit.panels.session import Session, face_of
from propkit.report import Row, UnitSystem
from propkit.units import shown_unit


def content(session: Session, kind: str, system: UnitSystem) -> dict[str, Any]:
    """Return everything that the panel of the object of `kind` shows, but its figures."""
    link = session.link(kind)
    base = _baseline(session, kind)
    links = [*link.chain()]
    return {
        "title": link.title,
        "name": link.given_name() or link.subtitle(),
        "subtitle": link.subtitle() if link.given_name() else "",
        "units": system,
        "current": not session.refusals,
        "status": status_words(session),
        "sets": [control_set(session, face, system) for face in session.faces(kind)],
        "headline": result_rows(link, [n for n in link.headline if link.has(n)], system, base),
        "results": result_rows(link, result_names(link), system, base),
        "above": [
            {"kind": up.kind, "title": up.title, "rows": result_rows(up, result_names(up), system, _baseline(session, up.kind))}
            for up in reversed(links[:-1])
        ],
        "stations": stations(link, system),
        "doubts": [str(doubt) for doubt in link.warnings],
        "pins": pins(session, kind, system),
        "code": link.as_code(),
        "undo": bool(session.past or session.refusals),
        "redo": bool(session.future),
    }


def status_words(session: Session) -> str:
    """Return in words whether the results are those of what the controls show."""
    count = len(session.refusals)
    if not count:
        return ""
    what = "an input is" if count == 1 else f"{count} inputs are"
    return f"Not current: {what} refused. The results are those of the last accepted values."


def _baseline(session: Session, kind: str) -> Any:
    pinned = session.pins.get(session.baseline)
    return None if pinned is None else next((link for link in pinned.chain() if link.kind == kind), None)


# -- controls --------------------------------------------------------------------------------------


def control_set(session: Session, face: Face, system: UnitSystem) -> dict[str, Any]:
    """Return the controls of one object of the chain."""
    grouped: dict[str, Group] = {group.member: group for group in face.groups()}
    made = [(name, control(session, face, name, grouped.get(name), system)) for name in face.names()]
    return {
        "kind": face.kind,
        "title": face.title,
        # a refused control is never folded away
        "controls": [entry for name, entry in made if not face.is_minor(name) or entry["error"]],
        "minor": [entry for name, entry in made if face.is_minor(name) and not entry["error"]],
    }


def control(session: Session, face: Face, name: str, group: Group | None, system: UnitSystem) -> dict[str, Any]:
    """Return one control: what it shows, where its slider stands, what was refused."""
    entry, path = face.declared(name), face.path(name)
    quantity = entry.quantity
    refusal = session.refusals.get(path)
    given = name in face.link.inputs
    style = face.style(name)
    text = face.text_now(name, system)
    made: dict[str, Any] = {
        "path": path,
        "label": show.sentence(face.label(name)),
        "symbol": show.symbol(quantity.symbol),
        "doc": show.sentence(entry.doc) + ".",
        "style": style,
        "text": refusal.text if refusal else text,
        "placeholder": face.placeholder(name),
        "kind": "given" if given else "default",
        "note": note(face, name, system, text),
        "error": refusal.words if refusal else "",
        "reset": reset_label(session, face, name, group),
        "suggestions": list(face.suggestions(name)),
    }
    if style == "choice":
        made["choices"] = [[value, label] for value, label in (face.choices(name) or {}).items()]
        made["choice"] = refusal.text if refusal else face.choice_now(name)
    slider = slider_of(session, face, name, system)
    if slider:
        made["slider"] = slider
    if group is not None:
        labels = [[member, show.sentence(face.declared(member).quantity.label)] for member in group.members]
        made["group"] = {"key": group.key, "label": show.sentence(group.label), "members": labels, "member": group.member}
        stuck = session.refusals.get(group.key)
        if stuck is not None and not made["error"]:
            made["error"] = stuck.words
    return made


def slider_of(session: Session, face: Face, name: str, system: UnitSystem) -> dict[str, Any] | None:
    """Return the slider of a control; its range stays as long as it reaches the value."""
    unit = face.unit(name, system)
    position = face.position(name, unit)
    if position is None:
        return None
    key = (face.path(name), unit.text)
    scale = session.ranges.get(key)
    if scale is None or not scale.holds(position):
        scale = face.scale(name, unit)
        if scale is None:
            return None
        session.ranges[key] = scale
    return {"low": scale.low, "high": scale.high, "step": scale.step, "at": min(max(position, scale.low), scale.high)}


def note(face: Face, name: str, system: UnitSystem, text: str) -> str:
    """Return the value in the display's unit where it was typed in another one."""
    entry = face.declared(name)
    value = face.effective(name)
    if told := face.told(name, system):
        return told
    if value is None or not isinstance(entry, NumberInput | QuantityInput) or not entry.quantity.unit or not text:
        return ""
    shown, unit = sheet.in_display(entry.quantity, value, system)
    here = face.unit(name, system)
    if not isinstance(shown, float) or here.text == shown_unit(unit) or same_unit(here, unit, entry.quantity.unit):
        return ""
    return f"= {show.value(shown, entry.quantity.digits)} {shown_unit(unit)}"


def same_unit(here: Unit, unit: str, si_unit: str) -> bool:
    """Whether a typed unit and a display unit are one and the same."""
    from propkit import units

    try:
        return abs(units.convert(here.factor + here.offset, si_unit, unit) - 1.0) < 1e-12
    except PropkitError:
        return False


def reset_label(session: Session, face: Face, name: str, group: Group | None) -> str:
    """Return what resetting does; empty where the control stands there already."""
    entry = face.declared(name)
    opened = next((link for link in session.opened.chain() if link.kind == face.kind), None)
    if f"{face.kind}.{name}" in session.refusals:
        return "Back to the last accepted value"
    if not entry.required and group is None:
        return f"Reset to the default ({_default_text(face, name)})" if name in face.link.inputs else ""
    before = None if opened is None else opened.inputs.get(name)
    if before is None or before == face.link.inputs.get(name):
        return ""
    return f"Reset to {face_of(opened).text_now(name)}, as the panel was opened"


def _default_text(face: Face, name: str) -> str:
    default = face.declared(name).default
    if default is None:
        return "not given"
    return "infinite" if default == float("inf") else f"{default}" or "empty"


# -- results ---------------------------------------------------------------------------------------


def result_names(link: Any) -> list[str]:
    """Return the results of an object in the order of its sheet."""
    names = [name for name in link.resolved() if name not in link.inputs]
    names += [name for name, entry in link.declared_results.items() if entry.shown and name not in names]
    return [name for name in names if link.has(name)]


def result_rows(link: Any, names: Iterable[str], system: UnitSystem, base: Any) -> list[dict[str, Any]]:
    """Return results as texts with their differences to the pinned object."""
    return [result_row(sheet.row_of(link, name, system), base, system) for name in names]


def result_row(row: Row, base: Any, system: UnitSystem) -> dict[str, Any]:
    """Return one result: number and unit as texts, its doubts, and the difference to the pinned object."""
    made = {
        "name": row.name,
        "label": show.sentence(row.label),
        "symbol": show.symbol(row.symbol),
        "text": show.value(row.value, row.digits),
        "unit": shown_unit(row.unit),
        "kind": row.kind,
        "doubts": list(row.doubts),
    }
    if base is not None:
        made["difference"], made["share"] = difference(row, base, system)
    return made


def difference(row: Row, base: Any, system: UnitSystem) -> tuple[str, str]:
    """Return the difference of a row to the same result of another object, in its unit and as a share."""
    from propkit import units

    if not isinstance(row.value, float) or not base.has(row.name):
        return "", ""
    entry = base.declared_results.get(row.name) or base.declared_inputs[row.name]
    before = units.convert(float(base.given_or_result(row.name)), entry.quantity.unit, row.unit)
    step = row.value - before
    share = f"{100.0 * step / abs(before):+.2f} %" if before else ""
    return show.difference(step, row.value, row.digits), share.replace("-", "\N{MINUS SIGN}")


def stations(link: Any, system: UnitSystem) -> dict[str, Any] | None:
    """Return the stations of the nozzle as texts: stations down, quantities across."""
    nozzle = link if link.kind == "nozzle" else getattr(link, "nozzle", None)
    if nozzle is None:
        return None
    names = ("pressure", "temperature", "density", "velocity", "mach", "isentropic_exponent")
    table = sheet.station_table(nozzle.all_states(), names, system).table
    assert table is not None
    columns = [
        {
            "label": show.sentence(column.label),
            "symbol": show.symbol(column.symbol),
            "unit": shown_unit(column.unit),
            "texts": [show.value(value, column.digits) for value in column.values],
        }
        for column in table.columns
    ]
    return {"title": table.title, "index": [show.sentence(name) for name in table.index], "columns": columns}


def pins(session: Session, kind: str, system: UnitSystem) -> dict[str, Any]:
    """Return the pins, which of them is the baseline, and the results of all of them side by side."""
    names = list(session.pins)
    if not names:
        return {"names": [], "baseline": "", "rows": []}
    here = session.link(kind)
    others = [next(link for link in session.pins[name].chain() if link.kind == kind) for name in names]
    rows = []
    for name in result_names(here):
        row = sheet.row_of(here, name, system)
        values = [_in_unit(other, name, row) for other in (here, *others)]
        if any(isinstance(value, float) for value in values):
            texts = [show.value(value, row.digits) for value in values]
            rows.append(
                {"label": show.sentence(row.label), "symbol": show.symbol(row.symbol), "unit": shown_unit(row.unit), "texts": texts}
            )
    return {"names": names, "baseline": session.baseline, "rows": rows}


def _in_unit(link: Any, name: str, row: Row) -> float | str | None:
    from propkit import units

    value = link.given_or_result(name) if link.has(name) else None
    if not isinstance(value, int | float):
        return value if isinstance(value, str) else None
    entry = link.declared_results.get(name) or link.declared_inputs[name]
    return units.convert(float(value), entry.quantity.unit, row.unit)
