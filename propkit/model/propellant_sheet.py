"""What the sheet of a propellant shows beyond its numbers: its state and sources, what others give, its elements."""

from __future__ import annotations

from typing import TYPE_CHECKING

from propkit import quantities, units
from propkit.data.atomic_weights import ATOMIC_WEIGHTS
from propkit.data.propellant_row import PropellantRow
from propkit.model.sheet import row_of
from propkit.report import Column, Section, Table, UnitSystem
from propkit.series import Axis, Bars, Figure, Series

if TYPE_CHECKING:
    from propkit.model.propellant import Propellant


def limits(propellant: Propellant, names: tuple[str, ...], system: UnitSystem) -> Section:
    """Return the state of the data and the storage limits, as far as known."""
    shown = [name for name in names if name in propellant.declared_inputs and propellant.has(name)]
    shown = [name for name in shown if name not in propellant.inputs]
    return Section("storage", "State and storage limits", rows=tuple(row_of(propellant, name, system) for name in shown))


def about(row: PropellantRow) -> Section:
    """Return state, roles and sources of a propellant in lines."""
    lines = [f"Formula {row.formula}. State: {row.state_text}."]
    if row.roles:
        lines.append(f"Serves as {', '.join(row.roles)}.")
    if row.density is not None:
        at = f" at {row.density_temperature:g} K" if row.density_temperature else ""
        lines.append(f"Density{at}: {row.density_source or 'no source stated'}.")
    lines.append(f"Enthalpy: {row.source}.{f' Trust: {row.trust}.' if row.trust else ''}")
    if row.heat_capacity is not None and row.heat_capacity_range is not None:
        low, high = row.heat_capacity_range
        lines.append(f"Specific heat, {low:g} to {high:g} K: {row.heat_capacity_source or 'no source stated'}.")
    lines += [f"{text.rstrip('.')}." for text in (row.note, row.impulse_note) if text]
    return Section("about", "About these data", lines=tuple(lines))


def other_values(row: PropellantRow, system: UnitSystem) -> Section:
    """Return the assigned enthalpies that other sources give, with their difference, as a table."""
    quantity = quantities.quantity("molar_enthalpy")
    listed = (row.molar_enthalpy, *(other.molar_enthalpy for other in row.other_values))
    unit = quantity.shown_in(system, listed)
    values = tuple(units.convert(value, quantity.unit, unit) for value in listed)
    table = Table(
        "sources",
        "What the sources say",
        "source",
        ("used here", *(other.source for other in row.other_values)),
        (
            Column("molar_enthalpy", quantity.label, quantity.symbol, unit, quantity.digits, values),
            Column("difference", "difference", "", unit, 3, tuple(value - values[0] for value in values)),
        ),
    )
    return Section("sources", table.title, table=table)


def element_bars(row: PropellantRow) -> Figure:
    """Return the mass fraction of each element, the largest first."""
    parts = {symbol: count * ATOMIC_WEIGHTS[symbol] * 1e-3 / row.molar_mass for symbol, count in row.element_counts}
    ordered = dict(sorted(parts.items(), key=lambda item: -item[1]))
    percent = tuple(100.0 * value for value in ordered.values())
    texts = tuple(f"{value:.1f} %" for value in percent)
    bars = Bars(tuple(ordered), Series("mass fraction", percent, "percent"), texts, colour="accent")
    alt = "Mass fractions: " + ", ".join(f"{symbol} {text}" for symbol, text in zip(ordered, texts, strict=True))
    axes = Axis("mass fraction", "percent", low=0.0, high=100.0), Axis("")
    return Figure("elements", "What it is made of", alt, *axes, layers=(bars,))
