"""A reconciliation as neutral data: doubts in words, tables, and the interval drawing of its routes."""

from __future__ import annotations

import math
from collections.abc import Callable, Iterator
from typing import TYPE_CHECKING

from propkit import quantities, units
from propkit.model.doubts import Doubt
from propkit.reconcile.adjustment import LARGE_RESIDUAL, NOT_CHECKABLE
from propkit.report import Column, Report, Row, Section, Table, UnitSystem
from propkit.series import Axis, Figure, Line, Mark, Series
from propkit.view.numbers import rounded_together

if TYPE_CHECKING:
    from propkit.reconcile.reconciliation import Reconciliation

SHOWN_ROUTES = ("mass_flow", "throat_diameter", "specific_impulse", "specific_impulse_vacuum")


SMALLEST = 1e-15
"""Probability below which only that is said."""


def _chance(probability: float) -> float | str:
    return probability if probability >= SMALLEST else f"below {SMALLEST:g}"


def doubts(fit: Reconciliation) -> Iterator[Doubt]:
    """Yield what to doubt about figures and adjustment."""
    found = fit.adjustment
    inferred = [name for name, figure in fit.figures.items() if figure.inferred]
    if inferred:
        text = f"The uncertainty of {', '.join(inferred)} is inferred from the printed digits; the real one is likely larger."
        yield Doubt(text, code="inferred", about="figures")
    hidden = [name for name, good in zip(found.names, found.checkable, strict=True) if not good]
    if hidden:
        text = f"Not checkable by the other figures (redundancy below {NOT_CHECKABLE:g}): {', '.join(hidden)}."
        yield Doubt(text, code="not-checkable", about="residuals")
    if found.degrees_of_freedom == 0:
        yield Doubt("There are as many unknowns as figures: nothing is checked.", code="no-redundancy", about="p_value")
    if not found.consistent:
        first = found.suspects[0] if found.suspects else "none that can be checked"
        chance = f"p = {found.p_value:.2g}" if found.p_value >= SMALLEST else f"p below {SMALLEST:g}"
        text = f"The figures contradict each other ({chance}); most suspect: {first}."
        yield Doubt(text, code="inconsistent", about="p_value")
        for group in found.twins:
            if set(group) & set(found.suspects):
                text = f"An error in one of {', '.join(group)} cannot be told from one in another of them."
                yield Doubt(text, code="twins", about="suspects")
    for path in found.on_bound:
        yield Doubt(f"{path} sits on an end of its legal range.", code="on-bound", about=path)
    held = [
        name
        for name, figure in fit.figures.items()
        if figure.key.rpartition(".")[2] in ("mixture_ratio", "equivalence_ratio", "cstar_efficiency", "discharge_coefficient")
        and figure.key not in fit.free
    ]
    if held:
        text = f"{', '.join(held)} is quoted but was not freed: the model keeps its own value."
        yield Doubt(text, code="held", about="figures")


def report_of(fit: Reconciliation, system: UnitSystem, render: Callable[[Report, str], str]) -> Report:
    """Return the report of a reconciliation."""
    found = fit.adjustment
    probability = None if math.isnan(found.p_value) else _chance(found.p_value)
    suspects = ", ".join(fit.suspects) or "none"
    headline = (
        _plain("p_value", "probability of the contradictions by chance", probability),
        _plain("chi_square", "chi-square", found.chi_square),
        _plain("degrees_of_freedom", "figures beyond unknowns", float(found.degrees_of_freedom)),
        _plain("suspects", "suspect figures, the first first", suspects),
    )
    sections = (*_route_sections(fit, system), _figure_section(fit, system), _unknown_section(fit, system))
    strikes = _strike_section(fit)
    drawn = tuple(interval_figure(fit, name, system) for name in SHOWN_ROUTES if len(fit.route_values(name)) > 1)
    return Report(
        kind="Reconciliation",
        title=fit.title,
        subtitle=f"{len(fit.figures)} figure{'s' if len(fit.figures) > 1 else ''}, free: {', '.join(fit.free)}",
        units=system,
        headline=headline,
        sections=(*sections, *((strikes,) if strikes is not None else ())),
        doubts=tuple(str(doubt) for doubt in fit.warnings),
        figures=drawn,
        code=repr(fit),
        render=render,
    )


def _plain(name: str, label: str, value: float | str | None) -> Row:
    return Row(name, label, "", value, "", 3, "computed", source="vdi2048")


def _shown(fit: Reconciliation, name: str, value: float, uncertainty: float, system: UnitSystem) -> tuple[str, str, str]:
    quantity = fit.quantity_of(name)
    unit = quantity.shown_in(system, (value,))
    zero = units.convert(0.0, quantity.unit, unit)
    pair = rounded_together(units.convert(value, quantity.unit, unit), units.convert(uncertainty, quantity.unit, unit) - zero)
    return pair.value, pair.uncertainty, units.shown_unit(unit)


def _figure_section(fit: Reconciliation, system: UnitSystem) -> Section:
    found = fit.adjustment
    rows = []
    for place, figure in enumerate(found.figures):
        given = _shown(fit, figure.name, figure.value, figure.uncertainty, system)
        best = _shown(fit, figure.name, float(found.adjusted[place]), float(found.adjusted_uncertainty[place]), system)
        quoted = fit.figures.get(figure.name)
        mark = "prior" if quoted is None else quoted.level + (", inferred" if quoted.inferred else "")
        normalised = float(found.normalised[place])
        verdict = "not checkable" if not found.checkable[place] else ("suspect" if figure.name in fit.suspects else "")
        rows.append(
            (
                *given[:2],
                *best,
                None if math.isnan(normalised) else normalised,
                float(found.redundancy[place]),
                mark,
                verdict,
            )
        )
    heads = (
        ("given", "given"),
        ("given_uncertainty", "± given"),
        ("adjusted", "adjusted"),
        ("uncertainty", "± adjusted"),
        ("unit", "unit"),
        ("normalised", "normalised residual"),
        ("redundancy", "redundancy"),
        ("level", "level"),
        ("verdict", "verdict"),
    )
    columns = tuple(Column(name, label, "", "", 3, tuple(row[place] for row in rows)) for place, (name, label) in enumerate(heads))
    note = "Uncertainties are standard ones. Redundancy: variance of the residual over variance of the figure."
    return Section("figures", "Figures", table=Table("figures", "Figures", "figure", found.names, columns, note))


def _unknown_section(fit: Reconciliation, system: UnitSystem) -> Section:
    frame = fit.unknowns
    rows = [
        _shown(fit, f"prior of {path}", value, uncertainty, system) if uncertainty > 0.0 else (f"{value:.6g}", "held by its range", "")
        for path, value, uncertainty in zip(fit.free, frame["value"], frame["standard_uncertainty"], strict=True)
    ]
    columns = tuple(
        Column(name, label, "", "", 3, tuple(row[place] for row in rows))
        for place, (name, label) in enumerate((("value", "value"), ("uncertainty", "standard uncertainty"), ("unit", "unit")))
    )
    return Section("unknowns", "Free inputs", table=Table("unknowns", "Free inputs", "input", fit.free, columns))


def _route_sections(fit: Reconciliation, system: UnitSystem) -> Iterator[Section]:
    for name in SHOWN_ROUTES:
        values = fit.route_values(name)
        if len(values) < 2:
            continue
        quantity = quantities.quantity(name)
        unit = quantity.shown_in(system, [entry.value for entry in values])
        factor = units.convert(1.0, quantity.unit, unit)
        pairs: list[tuple[str, str | None]] = []
        for entry in values:
            pair = rounded_together(entry.value * factor, entry.standard_uncertainty * factor)
            alone = not entry.figures
            pairs.append((f"{entry.value * factor:.5g}", None) if alone else (pair.value, pair.uncertainty))
        columns = (
            Column("value", quantity.label, quantity.symbol, unit, 5, tuple(pair[0] for pair in pairs)),
            Column("uncertainty", "standard uncertainty", "", unit, 2, tuple(pair[1] for pair in pairs)),
        )
        title = f"Routes to the {quantity.label}"
        index = tuple(entry.words for entry in values)
        note = "At chamber level; each route uses the quoted figures it names and the model for the rest."
        yield Section(f"routes-{name}", title, table=Table(f"routes-{name}", title, "route", index, columns, note))


def _strike_section(fit: Reconciliation) -> Section | None:
    if fit.adjustment.consistent:
        return None
    frame = fit.strikes
    if frame.empty:
        return None
    columns = (
        Column("chi_square", "chi-square of the rest", "", "", 3, tuple(map(float, frame["chi_square"]))),
        Column("p_value", "probability", "", "", 3, tuple(_chance(float(value)) for value in frame["p_value"])),
        Column("restores", "consistent then", "", "", 0, tuple("yes" if good else "no" for good in frame["restores"])),
    )
    table = Table("strikes", "If one figure is struck out", "struck out", tuple(map(str, frame.index)), columns)
    return Section("strikes", "If one figure is struck out", table=table)


def interval_figure(fit: Reconciliation, name: str, system: UnitSystem) -> Figure:
    """Return the routes to a quantity as 95 % intervals, one under the other."""
    values = fit.route_values(name)
    quantity = quantities.quantity(name)
    unit = quantity.shown_in(system, [entry.value for entry in values])
    factor = units.convert(1.0, quantity.unit, unit)
    layers: list[Line | Mark] = []
    words = []
    for place, entry in enumerate(values):
        half = LARGE_RESIDUAL * entry.standard_uncertainty * factor
        centre, height = entry.value * factor, float(len(values) - place)
        x = Series(quantity.label, (centre - half, centre + half), unit, quantity.symbol)
        layers.append(Line(x, Series("", (height, height)), colour="ink"))
        layers.append(Mark(centre, height, entry.words))
        words.append(f"{entry.words} {centre:.5g} ± {half:.2g}")
    title = f"Routes to the {quantity.label}"
    alt = f"{title} with 95 % intervals in {units.shown_unit(unit) or '1'}: {'; '.join(words)}"
    rows = Axis("", low=0.0, high=len(values) + 1.0)
    return Figure(f"routes-{name}", title, alt, Axis(quantity.label, unit, quantity.symbol), rows, tuple(layers))
