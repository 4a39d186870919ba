"""How a performance changes in operation: with altitude, with throttling, and what a burn needs."""

from __future__ import annotations

import math
from collections.abc import Iterator, Sequence
from dataclasses import replace
from functools import partial
from typing import TYPE_CHECKING, Any

import numpy as np

from propkit import quantities, units
from propkit.chain import alternatives as stage
from propkit.chain import profile
from propkit.constants import SEA_LEVEL_PRESSURE, STANDARD_GRAVITY
from propkit.errors import InputError, Problem, PropkitError
from propkit.model import separation
from propkit.model.alternatives import base_variant
from propkit.model.answer import Answer
from propkit.model.declare import as_text
from propkit.physics import atmosphere
from propkit.physics import separation as criteria
from propkit.physics.arrays import Array
from propkit.report import Column, Section, Table, UnitSystem
from propkit.series import Axis, Figure, Line, Rule, Series

if TYPE_CHECKING:
    import pandas as pd

    from propkit.model.declare import NumberLike, QuantityLike
    from propkit.model.performance import Performance

HIGHEST, STEP = 100e3, 1e3
ULLAGE, RESIDUALS = 0.03, 0.01
"""Shares that a burn takes where none are given: common practice, no source."""

MOST_CASES = 5000


def altitude_profile(performance: Performance) -> pd.DataFrame:
    """Return the performance from sea level to 100 km; see `Performance.altitude_profile`."""
    import pandas as pd

    altitude = np.arange(0.0, HIGHEST + 0.5 * STEP, STEP)
    ambient = atmosphere.pressure(altitude)
    nozzle = performance.nozzle
    thrust = performance.si("thrust") - (ambient - performance.si("ambient")) * nozzle.si("exit_area")
    limits = separation.limits(nozzle)
    count = sum(((ambient > limit).astype(int) for limit in limits.values()), np.zeros(len(altitude), dtype=int))
    frame = pd.DataFrame(
        {
            "ambient_pressure": ambient,
            "thrust": thrust,
            "specific_impulse": thrust / (performance.si("mass_flow") * STANDARD_GRAVITY),
            "thrust_coefficient": thrust / (nozzle.chamber.si("stagnation_pressure") * nozzle.si("throat_area")),
            "separation_criteria": count,
            "flows_full": count < 2,
            "optimum_area_ratio": profile.optimum_area_ratio(nozzle.held, ambient) * nozzle.si("discharge_coefficient"),
        },
        index=pd.Index(altitude, name="altitude"),
    )
    frame.attrs["units"] = {
        "altitude": "m",
        "ambient_pressure": "Pa",
        "thrust": "N",
        "specific_impulse": "s",
        "thrust_coefficient": "",
        "optimum_area_ratio": "",
    }
    return frame


# -- throttling -----------------------------------------------------------------------------------


def throttle_map(performance: Performance, pressure: Any, mixture_ratio: Any, minimum_pressure: QuantityLike | None) -> Answer:
    """Return the performance over chamber pressures and mixture ratios; see `Performance.throttle_map`."""
    nominal = performance.chamber.si("pressure")
    lowest = (
        performance._values["minimum_pressure"] if minimum_pressure is None else units.to_si(minimum_pressure, "Pa", "minimum_pressure")
    )
    if lowest is not None and not lowest > 0.0:
        raise InputError(Problem("minimum_pressure", as_text(minimum_pressure), "above 0"))
    default = np.linspace(max(0.3 * nominal, lowest or 0.0), max(nominal, lowest or 0.0), 15)
    pressures = default if pressure is None else _list("pressure", pressure, "Pa", 100.0, 1e8)
    if lowest is not None:
        bad = [value for value in pressures if value < lowest * (1.0 - 1e-12)]
        if bad:
            hint = "Below it the chamber is not known to run: leave the lower pressures out, or state another minimum."
            raise InputError(Problem("pressure", f"{min(bad):g} Pa", f"at least the minimum_pressure of {lowest:g} Pa", hint))
    streams = performance.chamber.case_or_none
    joint = streams is None or len(streams.held.mixture.atoms) == 1
    sources = _sources(performance, mixture_ratio)
    if len(pressures) * len(sources) > MOST_CASES:
        raise InputError(
            Problem("pressure", f"{len(pressures) * len(sources)} cases", f"at most {MOST_CASES} cases with the mixture ratios")
        )
    base = base_variant(performance)
    search = np.geomspace(0.02, 3.0, 36 if joint else 12) * nominal
    if joint:
        wanted = [replace(base, source=source, pressure=float(p)) for source in sources.values() for p in pressures]
        wanted += [replace(base, pressure=float(p), ambient=0.0) for p in search]
        found = stage.evaluate(wanted)
    else:
        own = next(iter(sources)) if mixture_ratio is None else math.nan
        places = [(float(p), math.nan if ratio == own else ratio, base.ambient) for ratio in sources for p in pressures]
        found = [_single(performance, *place) for place in (*places, *((float(p), math.nan, 0.0) for p in search))]
    grid, ladder = found[: len(pressures) * len(sources)], found[len(pressures) * len(sources) :]
    frame = _map_frame(performance, pressures, list(sources), grid)
    full = {name: _crossing(name, search, ladder) for name in criteria.CRITERIA}
    known = [value for value in full.values() if value is not None]
    values, absent = {}, {}
    if len(known) == len(full):
        values["full_flow_pressure"] = float(np.median(known))
    else:
        absent["full_flow_pressure"] = (
            "no chamber pressure up to three times this one is the limit of full flow at sea level for every criterion"
        )
    doubts = []
    if performance.resolved_losses.estimates or performance.resolved_losses.ratios:
        doubts.append("The losses are held at their ratios of this performance.")
    failed = sum(bool(entry.reason) for entry in grid)
    if failed:
        doubts.append(f"{failed} of {len(grid)} cases have no solution and are left empty.")
    return Answer(
        kind="Throttle map",
        title=performance.subtitle(),
        values=values,
        given={} if lowest is None else {"minimum_pressure": lowest},
        headline=("full_flow_pressure",),
        absent=absent,
        sources={"full_flow_pressure": "summerfield-1954, kalt-badal-1965, schmucker-1973"},
        doubts=tuple(doubts),
        lines=(
            *_limit_lines(full),
            "The hardware is held: throat area and area ratio. Thrust is the full-flowing value.",
            separation.SIDE_LOADS,
        ),
        table=frame,
        drawn=(partial(_throttle_figure, frame, values.get("full_flow_pressure"), lowest),),
        shown=partial(_throttle_sections, frame),
    )


def _single(performance: Performance, pressure: float, mixture_ratio: float, ambient: float) -> stage.Delivered:
    """Return one case of a gas that burns as several streams, as an object of its own on the same hardware."""
    nozzle = performance.nozzle
    changes: dict[str, Any] = {
        "chamber.pressure": pressure,
        "nozzle.throat_area": nozzle.si("throat_area"),
        "nozzle.area_ratio": nozzle.si("area_ratio"),
        "performance.ambient": ambient,
        "performance.losses": dict(performance.resolved_losses.ratios) or None,
        "performance.minimum_pressure": None,
    }
    if mixture_ratio == mixture_ratio:
        changes["case.mixture_ratio"] = mixture_ratio
    try:
        other = performance.replace(changes)
    except PropkitError as error:
        return stage.Delivered(math.nan, math.nan, math.nan, error.message)
    return stage.Delivered(
        mass_flow=other.si("mass_flow"),
        specific_impulse=other.si("specific_impulse"),
        thrust=other.si("thrust"),
        thrust_coefficient=other.thrust_coefficient,
        exit_pressure=other.nozzle.exit.si("pressure"),
        exit_mach=other.nozzle.exit.si("mach"),
        stagnation_pressure=other.chamber.si("stagnation_pressure"),
    )


def _list(name: str, given: Any, unit: str, low: float, high: float) -> Array:
    listed = (
        [given] if isinstance(given, str | int | float) or (hasattr(given, "magnitude") and np.ndim(given.magnitude) == 0) else list(given)
    )
    read = [units.to_si(value, unit, name) for value in listed]
    if not read:
        raise InputError(Problem(name, "empty", "at least one value"))
    for value, shown in zip(read, listed, strict=True):
        if not low <= value <= high:
            raise InputError(Problem(name, as_text(shown), f"{low:g} to {high:g} {unit}".rstrip()))
    return np.array(read)


def _sources(performance: Performance, mixture_ratio: Any) -> dict[float, Any]:
    """Return the mixture by mixture ratio; the ratio is NaN for a gas without one."""
    case = performance.chamber.case_or_none
    own = base_variant(performance).source
    has = case is not None and case.has("mixture_ratio")
    if mixture_ratio is None:
        return {case.si("mixture_ratio") if case is not None and has else math.nan: own}
    if case is None or not has:
        raise InputError(Problem("mixture_ratio", as_text(mixture_ratio), "left out: the gas has no mixture ratio"))
    ratios = _list("mixture_ratio", mixture_ratio, "", 1e-3, 1e3)
    return {float(ratio): case.replace(mixture_ratio=float(ratio)).held.mixture for ratio in ratios}


_MAP_UNITS = {
    "pressure": "Pa",
    "mixture_ratio": "",
    "thrust": "N",
    "specific_impulse": "s",
    "mass_flow": "kg/s",
    "thrust_coefficient": "",
    "exit_pressure": "Pa",
}


def _map_frame(performance: Performance, pressures: Array, ratios: Sequence[float], found: Sequence[stage.Delivered]) -> pd.DataFrame:
    import pandas as pd

    rows: list[dict[str, Any]] = []
    places = [(ratio, pressure) for ratio in ratios for pressure in pressures.tolist()]
    for (ratio, pressure), entry in zip(places, found, strict=True):
        row: dict[str, Any] = {"pressure": pressure, "mixture_ratio": ratio}
        row |= {name: getattr(entry, name) for name in list(_MAP_UNITS)[2:]}
        row["thrust_share"] = entry.thrust / performance.si("thrust")
        row["flows_full"] = None if entry.reason else sum(performance.si("ambient") > limit for limit in _limits(entry)) < 2
        row["flows_full_at_sea_level"] = None if entry.reason else sum(limit < SEA_LEVEL_PRESSURE for limit in _limits(entry)) < 2
        rows.append(row)
    frame = pd.DataFrame(rows)
    frame.attrs["units"] = {**_MAP_UNITS, "thrust_share": ""}
    return frame


def _limits(entry: stage.Delivered) -> list[float]:
    if entry.exit_mach < 1.0:
        return []
    return [float(one.ambient(entry.exit_pressure, entry.stagnation_pressure, entry.exit_mach)) for one in criteria.CRITERIA.values()]


def _crossing(name: str, pressures: Array, found: Sequence[stage.Delivered]) -> float | None:
    """Return the chamber pressure at which a criterion puts separation at sea level, by interpolation in logarithms; None outside."""
    one = criteria.CRITERIA[name]
    good = [(p, entry) for p, entry in zip(pressures.tolist(), found, strict=True) if not entry.reason and entry.exit_mach >= 1.0]
    if len(good) < 2:
        return None
    limit = np.log([float(one.ambient(entry.exit_pressure, entry.stagnation_pressure, entry.exit_mach)) for _, entry in good])
    goal = math.log(SEA_LEVEL_PRESSURE)
    if not limit[0] < goal < limit[-1]:
        return None
    return float(np.exp(np.interp(goal, limit, np.log([p for p, _ in good]))))


def _limit_lines(full: dict[str, float | None]) -> Iterator[str]:
    for name, value in full.items():
        title = criteria.CRITERIA[name].title
        if value is None:
            yield f"{title}: no limit of full flow at sea level between 2 % and 300 % of this chamber pressure."
        else:
            yield f"{title}: flows full at sea level above a chamber pressure of {value / 1e6:.4g} MPa."


def _throttle_sections(frame: pd.DataFrame, system: UnitSystem) -> Iterator[Section]:
    rows = frame if len(frame) <= 24 else frame.iloc[np.linspace(0, len(frame) - 1, 24).astype(int)]
    columns = []
    shown = (
        ("mixture_ratio", "mixture_ratio"),
        ("thrust", "thrust"),
        ("specific_impulse", "specific_impulse"),
        ("mass_flow", "mass_flow"),
        ("exit_pressure", "exit_pressure"),
    )
    for name, key in shown:
        entry = quantities.quantity(key, "performance")
        raw = rows[name].tolist()
        if all(value != value for value in raw):
            continue
        unit = entry.shown_in(system, [value for value in raw if value == value])
        columns.append(
            Column(
                name,
                entry.label,
                entry.symbol,
                unit,
                4,
                tuple(None if value != value else units.convert(value, entry.unit, unit) for value in raw),
            )
        )
    words = {True: "full", False: "separates", None: "no solution"}
    columns.append(
        Column(
            "sea_level",
            "at sea level",
            "",
            "",
            0,
            tuple(words[None if value is None else bool(value)] for value in rows["flows_full_at_sea_level"]),
        )
    )
    pressure = quantities.quantity("pressure", "chamber")
    unit = pressure.shown_in(system, rows["pressure"].tolist())
    index = tuple(f"{units.convert(value, pressure.unit, unit):.4g} {units.shown_unit(unit)}" for value in rows["pressure"])
    note = "" if len(rows) == len(frame) else f"{len(rows)} of {len(frame)} cases; frame has all."
    yield Section("map", "Throttle map", table=Table("map", "Throttle map", "chamber pressure", index, tuple(columns), note))


def _throttle_figure(frame: pd.DataFrame, full: float | None, lowest: float | None, system: UnitSystem) -> Figure:
    pressure, force = quantities.quantity("pressure", "chamber"), quantities.quantity("thrust")
    x_unit = pressure.shown_in(system, frame["pressure"].tolist())
    y_unit = force.shown_in(system, frame["thrust"].dropna().tolist())
    layers: list[Line | Rule] = []
    for place, (ratio, part) in enumerate(frame.groupby("mixture_ratio", dropna=False)):
        xs = tuple(units.convert(float(value), "Pa", x_unit) for value in part["pressure"])
        ys = tuple(units.convert(float(value), "N", y_unit) for value in part["thrust"])
        label = f"r = {float(ratio):.3g}" if float(ratio) == float(ratio) else ""  # type: ignore[arg-type]
        layers.append(
            Line(Series("chamber pressure", xs, x_unit, "p_{c}"), Series("thrust", ys, y_unit, "F"), colour=place % 6, label=label)
        )
    for at, label in ((full, "flows full at sea level"), (lowest, "minimum pressure")):
        if at is not None and float(frame["pressure"].min()) <= at <= float(frame["pressure"].max()):
            layers.append(Rule("x", units.convert(at, "Pa", x_unit), label))
    alt = f"Thrust against chamber pressure, {len(layers)} lines"
    return Figure(
        "throttle",
        "Thrust against chamber pressure",
        alt,
        Axis("chamber pressure", x_unit, "p_{c}"),
        Axis("thrust", y_unit, "F"),
        tuple(layers),
    )


# -- a burn ---------------------------------------------------------------------------------------


def burn(
    performance: Performance,
    duration: QuantityLike | None,
    total_impulse: QuantityLike | None,
    ullage: NumberLike | None,
    residuals: NumberLike | None,
) -> Answer:
    """Return what a burn needs; see `Performance.burn`."""
    if (duration is None) == (total_impulse is None):
        shown = "missing" if duration is None else "given beside total_impulse"
        raise InputError(Problem("duration", shown, "given, or total_impulse in its place", "Give one of the two."))
    thrust, flow = performance.si("thrust"), performance.si("mass_flow")
    problems: list[Problem] = []
    if duration is not None:
        time = _positive("duration", duration, "s", problems)
    else:
        impulse = _positive("total_impulse", total_impulse, "N*s", problems)
        if thrust <= 0.0:
            problems.append(
                Problem("total_impulse", as_text(total_impulse), "left out: the thrust is not positive at this ambient pressure")
            )
        time = impulse / thrust if thrust > 0.0 else 1.0
    shares = {}
    for name, value, default in (("ullage", ullage, ULLAGE), ("residuals", residuals, RESIDUALS)):
        try:
            shares[name] = default if value is None else units.to_si(value, "", name)
        except InputError as error:
            problems += error.problems
            continue
        if not 0.0 <= shares[name] < 0.5:
            problems.append(Problem(name, as_text(value), "0 or more and below 0.5", "It is a share: 0.03 is 3 %."))
    if problems:
        raise InputError(problems)
    loaded = flow * time / (1.0 - shares["residuals"])
    values = {"duration": time, "total_impulse": thrust * time, "propellant_mass": loaded, "consumed_mass": flow * time}
    absent: dict[str, str] = {}
    _tanks(performance, time, shares, values, absent)
    given: dict[str, float | str] = dict(shares)
    return Answer(
        kind="Burn",
        title=f"{performance.subtitle()}, {time:.4g} s",
        values=values,
        given=given,
        headline=("duration", "total_impulse", "propellant_mass"),
        absent=absent,
        sources={"propellant_mass": "conservation", "total_impulse": "definition"},
        lines=(
            "Steady burning at this thrust and mass flow: start, shutdown and the flows for cooling, pressurization and turbines are left out.",
            "Loaded mass is burnt mass over one less the residuals; tank volume is loaded volume over one less the ullage"
            + (" (shares not given: common practice, no source)." if ullage is None or residuals is None else "."),
        ),
    )


def _positive(name: str, value: Any, unit: str, problems: list[Problem]) -> float:
    try:
        read = units.to_si(value, unit, name)
    except InputError as error:
        problems += error.problems
        return 1.0
    if not 0.0 < read < 1e12:
        problems.append(Problem(name, as_text(value), "above 0"))
        return 1.0
    return read


def _tanks(performance: Performance, time: float, shares: dict[str, float], values: dict[str, float], absent: dict[str, str]) -> None:
    """Add masses and tank volumes of the propellants."""
    case = performance.chamber.case_or_none
    left, room = 1.0 - shares["residuals"], 1.0 - shares["ullage"]
    if performance.has("oxidizer_mass_flow"):
        for role in ("oxidizer", "fuel"):
            mass = performance.si(f"{role}_mass_flow") * time / left
            values[f"{role}_mass"] = mass
            density = float(getattr(case.held, role).density) if case is not None else math.nan
            if math.isfinite(density):
                values[f"{role}_tank_volume"] = mass / density / room
            else:
                absent[f"{role}_tank_volume"] = f"the density of the {role} is not known"
    elif case is not None and case.has("bulk_density"):
        values["propellant_tank_volume"] = values["propellant_mass"] / case.si("bulk_density") / room
    else:
        absent["propellant_tank_volume"] = "the density of the propellant is not known"
