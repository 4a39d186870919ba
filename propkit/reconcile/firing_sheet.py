"""A firing as neutral data: doubts in words, tables, and traces with the window marked."""

from __future__ import annotations

import math
from collections.abc import Callable, Iterator
from itertools import pairwise
from typing import TYPE_CHECKING

import numpy as np

from propkit import quantities, units
from propkit.model.doubts import Doubt
from propkit.reconcile.firing_inputs import KNOWN
from propkit.reconcile.firing_results import AMBIENT
from propkit.report import Column, Report, Row, Section, Table, UnitSystem
from propkit.series import Axis, Figure, Line, Rule, Series
from propkit.view.numbers import rounded_together

if TYPE_CHECKING:
    from propkit.reconcile.firing import HotFire

HEADLINE = ("characteristic_velocity", "thrust_coefficient", "specific_impulse")
LOST = 0.1
"""Share of the window without a good reading of a channel that is worth a warning."""
POINTS = 1200
"""Most points of a trace."""

EFFICIENCIES = {
    "cstar_efficiency": "c* efficiency",
    "thrust_coefficient_efficiency": "thrust coefficient efficiency",
    "specific_impulse_efficiency": "specific impulse efficiency",
}


def label_of(name: str) -> str:
    """Return what a person reads for a delivered result."""
    for key, words in EFFICIENCIES.items():
        if name.startswith(f"{key}_"):
            return f"{words}, {name.removeprefix(f'{key}_').replace('_', '-')} reference"
    return _quantity(name).label


def _quantity(name: str) -> quantities.Quantity:
    owner, _, bare = name.rpartition(".")
    return quantities.quantity(bare, owner)


def doubts(firing: HotFire) -> Iterator[Doubt]:
    """Yield what to doubt about recording, window and means."""
    window, recording = firing.window, firing.recording
    inside = recording.within(window.start, window.end)
    for name, channel in recording.channels.items():
        for note in channel.notes(inside):
            yield Doubt(f"{note} in the window.", code="anomaly", about=name)
        lost = float(np.mean(~channel.good[inside]))
        if lost > LOST:
            text = f"{name} has no good reading in {100.0 * lost:.0f} % of the window: its mean is that of the rest."
            yield Doubt(text, code="gap", about=name)
        if np.count_nonzero(channel.saturated & inside):
            text = f"{name} is saturated in the window: what is left is biased, its mean should not be used."
            yield Doubt(text, code="saturated", about=name)
    for name in window.unsteady:
        text = f"{name} changes by {100.0 * window.drift[name]:.2g} % over the window, more than the criterion allows."
        yield Doubt(text, code="unsteady", about=name)
    for name, row in firing.channel_means.items():
        if row.mean.doubtful:
            text = f"{name} has only {row.mean.independent:.1f} independent samples in the window: its uncertainty is doubtful."
            yield Doubt(text, code="few-independent", about=name)
        if row.mean.deviation == 0.0:
            yield Doubt(f"{name} does not move at all in the window.", code="flat", about=name)
        if row.zero is not None and row.zero.drifted:
            share = row.zero.drift / row.value if row.value else math.nan
            text = f"The zero of {name} drifts by {row.zero.drift:.3g} {units.shown_unit(recording.channels[name].unit)} ({100.0 * share:.2g} % of its mean)."
            yield Doubt(text, code="zero-drift", about=name)
        if row.zero is not None and (row.zero.before is None or row.zero.after is None):
            missing = "before" if row.zero.before is None else "after"
            yield Doubt(
                f"The zero of {name} is not known {missing} the firing: a drift is not seen.",
                code="one-zero",
                about=name,
            )
    lows, values = (firing.table[column].to_dict() for column in ("low", "value"))
    if lows.get("cstar_efficiency_shifting", 0.0) > 1.0:
        value = float(values["cstar_efficiency_shifting"])
        text = f"{label_of('cstar_efficiency_shifting')} is {value:.4f}, above 1 by more than its uncertainty: look at flow, pressure and throat."
        yield Doubt(text, code="efficiency", about="cstar_efficiency_shifting")
    means = firing.channel_means
    uncalibrated = [name for name in KNOWN if name in means and name != AMBIENT and not means[name].calibration]
    if uncalibrated:
        text = f"No calibration uncertainty of {', '.join(uncalibrated)} is given: the uncertainties are those of scatter and zero alone, and likely too small."
        yield Doubt(text, code="calibration", about="means")
    if {"mass_flow", "oxidizer_mass_flow", "fuel_mass_flow"} <= set(means):
        total, parts = means["mass_flow"], (means["oxidizer_mass_flow"], means["fuel_mass_flow"])
        gap = total.value - sum(part.value for part in parts)
        allowed = math.hypot(total.standard_uncertainty, *(part.standard_uncertainty for part in parts))
        if abs(gap) > 2.0 * allowed:
            text = f"mass_flow and its parts differ by {gap:.3g} kg/s, {abs(gap) / allowed:.1f} standard uncertainties; the parts are used."
            yield Doubt(text, code="flows", about="mass_flow")


def report_of(firing: HotFire, system: UnitSystem, render: Callable[[Report, str], str]) -> Report:
    """Return the report of a firing."""
    window = firing.window
    table = firing.table
    numbers = zip(table.index, table["value"], table["standard_uncertainty"], strict=True)
    rows = {str(name): _row(str(name), float(value), float(doubt), system) for name, value, doubt in numbers}
    how = "found" if window.found else "chosen"
    lines = (
        f"Window {window.start:.4g} s to {window.end:.4g} s ({window.samples} samples), {how}; burn {window.ignition:.4g} s to {window.cutoff:.4g} s.",
        f"Criterion: {window.criterion}.",
        "Means over the window; their standard uncertainties know that neighbouring samples are alike.",
        "c* = p0 At / mass flow and CF = F / (p0 At), with the hot throat area in the middle of the window.",
        "Efficiencies: delivered over ideal at the measured pressure, mixture ratio and ambient pressure.",
    )
    return Report(
        kind="Hot firing",
        title=firing.title,
        subtitle="" if firing.title == firing.target.subtitle() else firing.target.subtitle(),
        units=system,
        headline=tuple(rows[name] for name in HEADLINE if name in rows),
        results=tuple(row for name, row in rows.items() if name not in HEADLINE),
        sections=(
            Section("window", "Window and method", lines=lines),
            _means_section(firing, system),
            *_zero_section(firing, system),
        ),
        doubts=tuple(str(doubt) for doubt in firing.warnings),
        figures=tuple(trace_figure(firing, name, system) for name in firing.recording.channels),
        code=repr(firing),
        render=render,
    )


def _row(name: str, value: float, uncertainty: float, system: UnitSystem) -> Row:
    if "efficiency" in name:
        return Row(name, label_of(name), "", value, "", 4, "computed", source="definition", uncertainty=uncertainty)
    quantity = _quantity(name)
    unit = quantity.shown_in(system, (value,))
    factor = units.convert(1.0, quantity.unit, unit)
    return Row(
        name,
        quantity.label,
        quantity.symbol,
        value * factor,
        unit,
        quantity.digits,
        "computed",
        source="definition",
        uncertainty=uncertainty * factor,
    )


def _means_section(firing: HotFire, system: UnitSystem) -> Section:
    frame = firing.means
    rows = []
    for name in frame.index:
        quantity = _quantity(str(name))
        value = float(frame.loc[name, "value"])
        unit = quantity.shown_in(system, (value,))
        zero = units.convert(0.0, quantity.unit, unit)
        parts = [units.convert(float(frame.loc[name, key]), quantity.unit, unit) - zero for key in ("random", "zero", "calibration")]
        pair = rounded_together(units.convert(value, quantity.unit, unit), math.hypot(*parts))
        drift = firing.window.drift.get(str(name))
        rows.append(
            (
                pair.value,
                pair.uncertainty,
                *parts,
                units.shown_unit(unit),
                str(frame.loc[name, "samples"]),
                float(frame.loc[name, "independent"]),
                None if drift is None else 100.0 * drift,
            )
        )
    heads = (
        ("value", "mean", "", 5),
        ("uncertainty", "standard uncertainty", "", 2),
        ("random", "random part", "", 2),
        ("zero", "zero part", "", 2),
        ("calibration", "calibration part", "", 2),
        ("unit", "unit", "", 0),
        ("samples", "samples", "", 6),
        ("independent", "independent", "", 3),
        ("drift", "drift", "percent", 2),
    )
    columns = tuple(
        Column(name, label, "", unit, digits, tuple(row[k] for row in rows)) for k, (name, label, unit, digits) in enumerate(heads)
    )
    table = Table("means", "Channels", "channel", tuple(map(str, frame.index)), columns)
    return Section("means", "Channels", table=table)


def _zero_section(firing: HotFire, system: UnitSystem) -> Iterator[Section]:
    frame = firing.zeros
    if frame.empty:
        return
    rows = []
    for name in frame.index:
        quantity = _quantity(str(name))
        unit = quantity.shown_in(system, (float(firing.channel_means[str(name)].value),))
        factor = units.convert(1.0, quantity.unit, unit)
        values = [float(frame.loc[name, key]) * factor for key in ("expected", "before", "after", "drift")]
        rows.append(
            (
                *(None if math.isnan(value) else value for value in values),
                units.shown_unit(unit),
                "yes" if frame.loc[name, "drifted"] else "no",
            )
        )
    heads = ("expected", "before", "after", "drift", "unit", "significant")
    columns = tuple(Column(head, head, "", "", 3, tuple(row[k] for row in rows)) for k, head in enumerate(heads))
    table = Table("zeros", "Zeros", "channel", tuple(map(str, frame.index)), columns, "Zeros are subtracted from the means.")
    yield Section("zeros", "Zeros", table=table)


def trace_figure(firing: HotFire, name: str, system: UnitSystem) -> Figure:
    """Return a channel over time, thinned to its envelope, with burn and window marked."""
    channel, time = firing.recording.channels[name], firing.recording.time
    quantity = _quantity(name)
    mean = firing.channel_means[name].value
    unit = quantity.shown_in(system, (mean,))
    places = thinned(channel.values)
    values = tuple(
        units.convert(float(value), quantity.unit, unit) if math.isfinite(value) else math.nan for value in channel.values[places]
    )
    x = Series("time", tuple(map(float, time[places])), "s", "t")
    line = Line(x, Series(quantity.label, values, unit, quantity.symbol))
    window = firing.window
    marked = (
        Rule("x", window.start, "window from"),
        Rule("x", window.end, "window to"),
        Rule("x", window.ignition, "ignition", "dashed"),
        Rule("x", window.cutoff, "cutoff", "dashed"),
    )
    shown = units.convert(mean, quantity.unit, unit)
    title = f"{quantity.label.capitalize()} over time"
    alt = f"{title}: mean {shown:.5g} {units.shown_unit(unit)} between {window.start:.4g} s and {window.end:.4g} s"
    return Figure(
        f"trace-{name}",
        title,
        alt,
        Axis("time", "s", "t"),
        Axis(quantity.label, unit, quantity.symbol),
        (line, *marked),
    )


def thinned(
    values: np.ndarray[tuple[int, ...], np.dtype[np.float64]], most: int = POINTS
) -> np.ndarray[tuple[int, ...], np.dtype[np.int64]]:
    """Return places that keep the envelope of a long trace: the smallest and the largest sample of each piece."""
    count = len(values)
    if count <= most:
        return np.arange(count)
    edges = np.linspace(0, count, most // 2 + 1).astype(np.int64)
    kept: set[int] = set()
    for low, high in pairwise(edges):
        piece = values[low:high]
        if np.isfinite(piece).any():
            kept.update((low + int(np.nanargmin(piece)), low + int(np.nanargmax(piece))))
        else:
            kept.add(int(low))
    return np.array(sorted(kept))
