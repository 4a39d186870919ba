"""Flow separation of an overexpanded nozzle: three criteria side by side, and what a separated nozzle would give."""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

import numpy as np

from propkit import quantities, units
from propkit.chain import profile
from propkit.errors import NotAvailableError, RangeError
from propkit.model.doubts import Doubt
from propkit.physics import atmosphere, separation, wall
from propkit.report import Column, Section, Table, UnitSystem

if TYPE_CHECKING:
    import pandas as pd

    from propkit.model.nozzle import Nozzle
    from propkit.model.performance import Performance

STATIONS = 64
"""Stations between throat and lip at which the criteria are evaluated."""

SONIC = 1.0 + 1e-6
"""Mach number up to which an exit counts as sonic."""

SIDE_LOADS = "Separation is seldom even round the wall: expect side loads while starting, throttling and shutting down."


_ISOTHERMAL = 1.0 + 1e-9
"""Exponent of a shock in a gas that melting or freezing holds at one temperature, where that of the flow falls below 1."""


@dataclass(frozen=True, slots=True)
class Prediction:
    """What one criterion says: pressures [Pa], whether it predicts separation, and where and with what thrust it would be.

    `ambient_limit` is the ambient pressure at which it predicts separation at the lip, `altitude` the altitude [m] from which
    the nozzle flows full (None where it does at every altitude of the standard atmosphere). Place and thrust are those of the
    separated flow, and NaN where the nozzle flows full.
    """

    name: str
    title: str
    source: str
    pressure: float
    ambient_limit: float
    separates: bool
    altitude: float | None
    area_ratio: float = math.nan
    position: float = math.nan
    thrust: float = math.nan


def limits(nozzle: Nozzle) -> dict[str, float]:
    """Return the ambient pressure [Pa] at which each criterion predicts separation at the lip; empty for a subsonic exit."""
    exit_state = nozzle.exit
    mach = exit_state.si("mach")
    if mach <= SONIC:
        return {}
    pressure, stagnation = exit_state.si("pressure"), nozzle.chamber.si("stagnation_pressure")
    return {name: float(entry.ambient(pressure, stagnation, mach)) for name, entry in separation.CRITERIA.items()}


def doubts(nozzle: Nozzle, ambient: float) -> Iterator[Doubt]:
    """Yield what is to be doubted of a full-flowing thrust at an ambient pressure [Pa]."""
    yield from _unchoked(nozzle, ambient)
    exit_state = nozzle.exit
    if exit_state.si("mach") <= SONIC:
        return
    pressure = exit_state.si("pressure")
    exponent = max(exit_state.si("isentropic_exponent"), _ISOTHERMAL)
    shock = float(separation.lip_shock_ambient(pressure, exit_state.si("mach"), exponent))
    if ambient > shock:
        yield Doubt(
            f"The ambient pressure exceeds the {shock / 1e3:.4g} kPa that a normal shock at the lip sustains: the nozzle does not flow full and the value is not delivered.",
            code="shock-inside",
            about="thrust",
        )
    found = limits(nozzle)
    predicted = [separation.CRITERIA[name].title for name, limit in found.items() if ambient > limit]
    if predicted:
        count = f"{len(predicted)} of {len(found)} criteria" if len(predicted) < len(found) else "all three criteria"
        yield Doubt(
            f"Separation is {'likely' if len(predicted) > 1 else 'possible'}: {count} predict it ({'; '.join(predicted)}) with the exit pressure at "
            f"{pressure / ambient:.3g} of the ambient pressure. The thrust is the full-flowing value{'; thrust_separated has an estimate' if len(predicted) > 1 else ''}. {SIDE_LOADS}",
            code="separation",
            about="thrust",
        )


def _unchoked(nozzle: Nozzle, ambient: float) -> Iterator[Doubt]:
    """Yield a doubt where the ambient pressure is above that of a wholly subsonic nozzle with a sonic throat."""
    if ambient <= nozzle.throat.si("pressure"):
        return
    ratio = nozzle.si("area_ratio")
    highest = nozzle.at(area_ratio=max(ratio, 1.0), branch="subsonic").si("pressure")
    if ambient > highest:
        yield Doubt(
            f"The throat is not choked: that needs an ambient pressure below {highest / 1e3:.4g} kPa, at which the whole nozzle is subsonic. "
            "Mass flow, thrust and specific impulse do not hold.",
            code="not-choked",
            about="mass_flow",
        )


def predictions(performance: Performance) -> tuple[Prediction, ...]:
    """Return what the criteria say at the ambient pressure of a performance.

    Raises
    ------
    NotAvailableError
        For a nozzle whose exit is not supersonic.
    """
    nozzle = performance.nozzle
    found = limits(nozzle)
    if not found:
        raise NotAvailableError("the exit is not supersonic: the flow cannot separate like that of an overexpanded nozzle")
    ambient, stagnation = performance.si("ambient"), nozzle.chamber.si("stagnation_pressure")
    mach = nozzle.exit.si("mach")
    made = []
    row = stations(nozzle) if any(ambient > limit for limit in found.values()) else {}
    for name, limit in found.items():
        criterion = separation.CRITERIA[name]
        pressure = float(criterion.pressure(ambient, stagnation, mach))
        there = _separated(performance, criterion, row, ambient, stagnation) if ambient > limit else (math.nan,) * 3
        made.append(
            Prediction(name, criterion.title, criterion.source, pressure, limit, ambient > limit, full_flow_altitude(limit), *there)
        )
    return tuple(made)


def full_flow_altitude(limit: float) -> float | None:
    """Return the altitude [m] of the standard atmosphere from which the ambient pressure is below a limit; None where it is everywhere."""
    if limit >= float(atmosphere.pressure(0.0)):
        return None
    try:
        return float(atmosphere.altitude_of_pressure(limit))
    except RangeError:
        return atmosphere.HIGHEST


def stations(nozzle: Nozzle) -> dict[str, Any]:
    """Return area ratio, axial position [m] (NaN without a contour) and the flow at stations from throat to lip."""
    ratio, discharge = nozzle.si("area_ratio"), nozzle.si("discharge_coefficient")
    if nozzle.has("contour"):
        points = wall.draw(nozzle.geometry.divergent, STATIONS // 2)
        position, area = points.x, (2.0 * points.r / nozzle.si("throat_diameter")) ** 2
    else:
        area = np.exp(np.linspace(0.0, math.log(ratio), STATIONS))
        position = np.full(STATIONS, math.nan)
    flow = profile.along(nozzle.held, np.maximum(area / discharge, 1.0), supersonic=True)
    good = np.isfinite(flow["pressure"])
    return {"area_ratio": area[good], "position": position[good], **{name: column[good] for name, column in flow.items()}}


def _separated(
    performance: Performance, criterion: separation.Criterion, row: dict[str, Any], ambient: float, stagnation: float
) -> tuple[float, float, float]:
    """Return area ratio, position and thrust where a criterion predicts separation."""
    share = separation.separation_share(criterion, row["pressure"], row["mach"], ambient, stagnation)
    if not math.isfinite(share):
        return math.nan, math.nan, math.nan
    nozzle = performance.nozzle
    area_ratio = separation.at_share(share, row["area_ratio"])
    position = float(np.interp(share, np.arange(len(row["position"])), row["position"]))
    velocity = separation.at_share(share, row["velocity"]) * performance.velocity_efficiency
    thrust = separation.separated_thrust(
        performance.si("mass_flow"), velocity, separation.at_share(share, row["pressure"]), ambient, area_ratio * nozzle.si("throat_area")
    )
    return area_ratio, position, float(thrust)


def separated_thrust(performance: Performance) -> float:
    """Return the middle of the three thrusts [N], a criterion that predicts full flow counting with the full-flowing value.

    Raises
    ------
    NotAvailableError
        Where fewer than two criteria predict separation.
    """
    found = predictions(performance)
    if sum(entry.separates for entry in found) < 2:
        raise NotAvailableError(
            "fewer than two of three criteria predict separation here: the nozzle is taken to flow full", name="thrust_separated"
        )
    full = performance.si("thrust")
    return float(np.median([entry.thrust if math.isfinite(entry.thrust) else full for entry in found]))


def frame(performance: Performance) -> pd.DataFrame:
    """Return the criteria as a table: index criterion; SI floats, units in ``attrs["units"]``."""
    import pandas as pd

    found = predictions(performance)
    columns = ("separates", "pressure", "ambient_limit", "altitude", "area_ratio", "position", "thrust", "source")
    made = pd.DataFrame(
        {name: [0.0 if name == "altitude" and entry.altitude is None else getattr(entry, name) for entry in found] for name in columns},
        index=pd.Index([entry.name for entry in found], name="criterion"),
    )
    made.attrs["units"] = {"pressure": "Pa", "ambient_limit": "Pa", "altitude": "m", "area_ratio": "", "position": "m", "thrust": "N"}
    return made


def section(performance: Performance, system: UnitSystem) -> Section | None:
    """Return the criteria as a section of the sheet, or None where the exit is not supersonic."""
    try:
        found = predictions(performance)
    except NotAvailableError:
        return None

    def column(name: str, label: str, symbol: str, quantity: str, raw: list[float | None]) -> Column:
        row = quantities.quantity(quantity)
        unit = row.shown_in(system, [value for value in raw if value is not None])
        shown = tuple(None if value is None else units.convert(value, row.unit, unit) for value in raw)
        return Column(name, label, symbol, unit, 4, shown)

    verdict = Column("verdict", "verdict", "", "", 0, tuple("separates" if entry.separates else "flows full" for entry in found))
    columns = [
        verdict,
        column("exit_pressure", "exit pressure", "p_{e}", "pressure", [performance.nozzle.exit.si("pressure")] * len(found)),
        column("pressure", "separation pressure at the lip", "p_{sep}", "pressure", [entry.pressure for entry in found]),
        column(
            "ambient_limit", "ambient pressure at which it separates", "p_{a,sep}", "pressure", [entry.ambient_limit for entry in found]
        ),
        column("altitude", "flows full from", "h", "altitude", [entry.altitude or 0.0 for entry in found]),
    ]
    if any(entry.separates for entry in found):
        columns.append(
            Column(
                "area_ratio",
                "area ratio where it leaves the wall",
                r"\epsilon_{sep}",
                "",
                4,
                tuple(_finite(entry.area_ratio) for entry in found),
            )
        )
        columns.append(column("thrust", "thrust, separated (estimate)", "F_{sep}", "thrust", [_finite(entry.thrust) for entry in found]))
    note = "From tests of cones and bells, good to some 20 %. "
    note += "Separated thrust is an estimate: the wall beyond takes ambient pressure. " if any(entry.separates for entry in found) else ""
    note += SIDE_LOADS if any(entry.separates for entry in found) else "Flows full from: altitude of the standard atmosphere."
    place = performance.input_text("ambient")
    title = f"Separation {'in' if place == 'vacuum' else 'at'} {place}"
    return Section(
        "separation",
        "Separation",
        table=Table("separation", title, "criterion", tuple(entry.title for entry in found), tuple(columns), note),
    )


def _finite(value: float) -> float | None:
    return value if math.isfinite(value) else None
