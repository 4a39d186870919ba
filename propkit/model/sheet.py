"""From an object and its declarations to a neutral report and a table."""

from __future__ import annotations

from collections.abc import Callable, Iterable
from typing import TYPE_CHECKING, Any

from propkit import quantities, units
from propkit.model.declare import CustomInput, Declared, Input, Result
from propkit.report import Column, Report, Row, Section, Table, UnitSystem

if TYPE_CHECKING:
    import pandas as pd

    from propkit.model.base import Calculation
    from propkit.model.state import State


def row_of(calculation: Calculation, name: str, system: UnitSystem) -> Row:
    """Return the row of an input or result of an object."""
    entry: Declared = calculation.declared_inputs.get(name) or calculation.declared_results[name]
    quantity = entry.quantity
    kind: Any = calculation.kind_of(name)
    typed = calculation.inputs.get(name, "")
    relation, source = (entry.relation, entry.source) if isinstance(entry, Result) else ("", "")
    doubts = tuple(str(doubt) for doubt in calculation.own_warnings if doubt.about == name)
    value = calculation.given_or_result(name)
    if isinstance(entry, CustomInput) and not isinstance(value, float):
        value = calculation.input_text(name)
    shown, unit = in_display(quantity, value, system)
    return Row(
        name=name,
        label=quantity.label,
        symbol=quantity.symbol,
        value=shown,
        unit=unit,
        digits=quantity.digits,
        kind=kind,
        typed=calculation.typed_text(name) if typed != "" else "",
        relation=relation,
        source=source,
        doubts=doubts,
    )


def in_display(quantity: quantities.Quantity, value: Any, system: UnitSystem) -> tuple[float | str | None, str]:
    """Return a value and its display unit; texts and None pass through."""
    if isinstance(value, bool):
        return ("yes" if value else "no"), ""
    if value is None or isinstance(value, str):
        return value, ""
    if not isinstance(value, int | float):
        return str(value), ""
    if value == float("inf"):
        return "infinite", ""
    unit = quantity.shown_in(system, (value,))
    return units.convert(float(value), quantity.unit, unit), unit


def report_of(calculation: Calculation, system: UnitSystem, render: Callable[[Report, str], str]) -> Report:
    """Return the report of an object: headline, given, results, sections, doubts, drawings."""
    upstream = calculation.upstream_input
    given = [
        row_of(calculation, name, system)
        for name in calculation.declared_inputs
        if name not in (upstream, "name") and calculation.shows_input(name)
    ]
    named = {row.name for row in given}
    listed = [name for name in calculation.resolved() if name not in named]
    listed += [name for name, entry in calculation.declared_results.items() if entry.shown and name not in named]
    results = [row_of(calculation, name, system) for name in listed if calculation.has(name)]
    headline = [row_of(calculation, name, system) for name in calculation.headline if calculation.has(name)]
    whole = tuple(str(doubt) for doubt in calculation.own_warnings if not doubt.about)
    above = calculation.upstream.warnings if calculation.upstream is not None else ()
    return Report(
        kind=calculation.title,
        title=calculation.given_name() or calculation.subtitle(),
        subtitle=calculation.subtitle() if calculation.given_name() else "",
        units=system,
        headline=tuple(headline),
        given=tuple(given),
        results=tuple(results),
        sections=tuple(calculation.sections(system)),
        doubts=(*whole, *(str(doubt) for doubt in above)),
        figures=calculation.figures(system),
        cautions=calculation.cautions(),
        code=repr(calculation),
        render=render,
    )


def frame_of(calculation: Calculation, system: UnitSystem) -> pd.DataFrame:
    """Return inputs and results as a table with the public name as index."""
    import pandas as pd

    report = report_of(calculation, system, lambda report, medium: "")
    rows: dict[str, Row] = {row.name: row for row in (*report.given, *report.headline, *report.results)}
    frame = pd.DataFrame(
        {
            "symbol": [row.symbol for row in rows.values()],
            "value": pd.Series([row.value for row in rows.values()], dtype=object, index=list(rows)),
            "unit": [units.shown_unit(row.unit) for row in rows.values()],
            "kind": [row.kind for row in rows.values()],
            "relation": [row.relation for row in rows.values()],
            "source": [row.source for row in rows.values()],
        },
        index=pd.Index(list(rows), name="name"),
    )
    return frame


def station_table(states: Iterable[State], columns: Iterable[str], system: UnitSystem, title: str = "Stations") -> Section:
    """Return the stations as a section: stations down, quantities across."""
    listed = list(states)
    made = []
    for name in columns:
        quantity = quantities.quantity(name)
        raw = [state.si(name) if name in state.names() else None for state in listed]
        if all(value is None for value in raw):
            continue
        unit = quantity.shown_in(system, [value for value in raw if value is not None])
        shown = tuple(None if value is None else units.convert(value, quantity.unit, unit) for value in raw)
        made.append(Column(name, quantity.label, quantity.symbol, unit, quantity.digits, shown))
    table = Table("stations", title, "station", tuple(state.station for state in listed), tuple(made))
    return Section("stations", title, table=table)


def composition_table(fractions: Iterable[tuple[str, float]], note: str = "") -> Section:
    """Return mole fractions, the largest first, as a section with a table named ``composition``."""
    listed = list(fractions)
    column = Column("composition", "mole fraction", "x", "", 5, tuple(value for _, value in listed))
    table = Table("composition", "Composition", "species", tuple(name for name, _ in listed), (column,), note)
    return Section("composition", "Composition", table=table)


def composition_along(stations: list[tuple[str, list[tuple[str, float]]]], smallest: float = 1e-4) -> Section | None:
    """Return mole fractions with stations across, species down, the largest at the first station first; None without composition."""
    if not stations:
        return None
    shown: dict[str, None] = {}
    for _, pairs in stations:
        shown.update({name: None for name, value in pairs if value >= smallest})
    first = dict(stations[0][1])
    names = sorted(shown, key=lambda name: -first[name])
    columns = tuple(Column(station, station, "x", "", 4, tuple(dict(pairs)[name] for name in names)) for station, pairs in stations)
    note = f"Mole fractions, species of {smallest:g} and above at some station."
    return Section("composition", "Composition", table=Table("composition", "Composition", "species", tuple(names), columns, note))


def assumption_section(calculation: Calculation) -> Section:
    """Return the assumptions in words."""
    lines = tuple(f"{entry.statement}{' (default)' if entry.origin == 'default' else ''}" for entry in calculation.assumptions)
    return Section("assumptions", "Assumptions", lines=lines)


def declared_unit(entry: Input | Result) -> str:
    """Return the SI unit of a declared input or result."""
    return entry.quantity.unit
