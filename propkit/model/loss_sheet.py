"""The ledger of losses as a sheet shows it: a table, and the steps from ideal to delivered drawn."""

from __future__ import annotations

import math
from typing import TYPE_CHECKING

from propkit import quantities, sources, units
from propkit.model import losses
from propkit.report import Column, Section, Table, UnitSystem
from propkit.series import Axis, Bars, Figure, Series

if TYPE_CHECKING:
    from propkit.model.performance import Performance


def section(performance: Performance, system: UnitSystem) -> Section:
    """Return the ledger as a section: losses down in their order, ratio, Isp and thrust lost, Isp after, source."""
    listed = list(losses.thrust_lost(performance))
    force = quantities.quantity("thrust")
    unit = force.shown_in(system, [lost for _, lost in listed])
    ideal = listed[0][0].before
    names = ("ideal", *(f"{entry.name}{' (estimate)' if entry.estimate else ''}" for entry, _ in listed), "delivered")
    total = listed[-1][0].after
    lost = [units.convert(value, force.unit, unit) for _, value in listed]
    columns = (
        Column("ratio", "ratio of specific impulse", r"\eta", "", 5, (None, *(entry.ratio for entry, _ in listed), total / ideal)),
        Column("lost", "specific impulse lost", r"\Delta I_{sp}", "s", 4, (None, *(entry.decrement for entry, _ in listed), ideal - total)),
        Column("after", "specific impulse after", "I_{sp}", "s", 5, (ideal, *(entry.after for entry, _ in listed), total)),
        Column("thrust_lost", "thrust lost", r"\Delta F", unit, 4, (None, *lost, sum(lost))),
        Column("source", "source", "", "", 0, ("", *(_short(entry.source) for entry, _ in listed), "")),
    )
    how = "; ".join(f"{name}: {words}" for name, words in performance.resolved_losses.estimates.items())
    note = (
        f"At {performance.input_text('ambient')}, in the fixed order of the bookkeeping; the product of the ratios is delivered over ideal."
    )
    if how:
        note += f" Estimates: {how}."
    return Section("losses", "From ideal to delivered", table=Table("losses", "From ideal to delivered", "loss", names, columns, note))


def _short(key: str) -> str:
    words = {
        "given": "given",
        "common-practice": "common practice",
        "cpia-246": "integral method; CPIA 246",
        "conservation": "momentum balance",
        "sutton-biblarz": "Sutton & Biblarz",
        "rao-1960": "Rao 1960",
    }
    return words.get(key, sources.reference(key))


def figure(performance: Performance) -> Figure:
    """Return the steps from ideal to delivered specific impulse, in their order: each bar takes up where the one above ends."""
    ideal, listed = losses.entries(performance)
    total = listed[-1].after
    names = ("ideal", *(f"{entry.name}{' (estimate)' if entry.estimate else ''}" for entry in listed), "delivered")
    steps = tuple(f"−{entry.decrement:.1f} s ({100.0 * (1.0 - entry.ratio):.1f} %)" for entry in listed)
    texts = (f"{ideal:.1f} s", *steps, f"{total:.1f} s ({100.0 * total / ideal:.1f} %)")
    values = Series("specific impulse", (ideal, *(entry.before for entry in listed), total), "s", "I_{sp}")
    low = _floor(total, ideal)
    starts = (low, *(entry.after for entry in listed), low)
    alt = f"Specific impulse from {ideal:.1f} s ideal to {total:.1f} s delivered: " + ", ".join(
        f"{n} {t}" for n, t in zip(names, texts, strict=True)
    )
    title = f"From {ideal:.1f} s ideal to {total:.1f} s delivered"
    return Figure(
        "ledger", title, alt, Axis("specific impulse", "s", "I_{sp}", low=low), Axis(""), (Bars(names, values, texts, starts=starts),)
    )


def _floor(total: float, ideal: float) -> float:
    """Return a round value below the delivered one from which the axis of the steps begins, so that the steps are seen."""
    span = max(ideal - total, 1e-6 * abs(ideal))
    step = 10.0 ** math.floor(math.log10(span))
    low = step * math.floor((total - 0.4 * span) / step)
    return max(low, 0.0) if total > 0.0 else low
