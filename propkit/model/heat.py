"""Convective heat load on the wall of a nozzle: Bartz's coefficient along the contour, its integral, and a coolant."""

from __future__ import annotations

import math
from collections.abc import Iterator
from functools import partial
from typing import TYPE_CHECKING, Any

import numpy as np

from propkit import quantities, units
from propkit.errors import InputError, NotAvailableError, Problem
from propkit.model.answer import Answer
from propkit.model.declare import as_text
from propkit.model.transport import GasAtRest, gas_at_rest
from propkit.model.wall import POINTS, flow_at, wall_of
from propkit.physics import heat_transfer
from propkit.physics import wall as walls
from propkit.physics.arrays import Array
from propkit.report import Column, Section, Table, UnitSystem
from propkit.series import Axis, Figure, Line, Mark, Series

if TYPE_CHECKING:
    import pandas as pd

    from propkit.model.declare import QuantityLike
    from propkit.model.nozzle import Nozzle

REFERENCE_TEMPERATURE = 298.15
"""Temperature to which the gas would be cooled to give the chamber power [K]."""

LEFT_OUT = (
    "Convection only: radiation of the gas and of particles, film cooling, deposits on the wall and reactions at a cold wall are left out.",
    "Bartz's coefficient is good to some 20 to 30 % at the throat (common practice, no source) and overstates the flux near the injector.",
    "Heat capacity and Prandtl number are those of frozen gas at rest; the equilibrium heat capacity is shown as the price of that.",
)


def heat_flux(
    nozzle: Nozzle,
    wall_temperature: QuantityLike,
    coolant: str | None,
    coolant_pressure: QuantityLike | None,
    coolant_limit: QuantityLike | None,
) -> Answer:
    """Return the heat flux along the contour of a nozzle; see `Nozzle.heat_flux`."""
    wall_kelvin, jacket, limit = _read(nozzle, wall_temperature, coolant, coolant_pressure, coolant_limit)
    geometry = wall_of(nozzle)
    gas = gas_at_rest(nozzle)
    drawn, nodes = walls.draw(geometry.segments, POINTS), walls.quadrature(geometry.segments)
    along, inside = (_along(nozzle, gas, wall, wall_kelvin) for wall in (drawn, nodes))
    load = heat_transfer.heat_load(inside["heat_flux"], nodes)
    peak = int(np.argmax(along["heat_flux"]))
    values = {
        "heat_load": load,
        "peak_heat_flux": float(along["heat_flux"][peak]),
        "peak_position": float(drawn.x[peak]),
        "mean_heat_flux": load / nozzle.si("wetted_area"),
        "heat_share": load / _power(nozzle, gas),
        "viscosity": gas.viscosity,
        "prandtl_number": gas.prandtl,
    }
    absent = {}
    if gas.equilibrium_specific_heat is None:
        absent["peak_heat_flux_equilibrium"] = "the gas has no equilibrium heat capacity"
    else:
        values["peak_heat_flux_equilibrium"] = values["peak_heat_flux"] * gas.equilibrium_specific_heat / gas.specific_heat
    given: dict[str, float | str] = {"wall_temperature": wall_kelvin}
    doubts = [gas.doubt] if gas.doubt else []
    if not geometry.upstream:
        doubts.append(
            "The contraction is infinite: the wall starts at the throat, and chamber and convergent are not in the load. Give the chamber a contraction_ratio."
        )
    elif nozzle.chamber._values["characteristic_length"] is None:
        doubts.append("The chamber has no characteristic_length: its cylinder is not in the load.")
    if coolant is None:
        absent["coolant_temperature_rise"] = 'no coolant was named; coolant="fuel" takes a propellant'
    else:
        given["coolant"] = coolant
        doubts += _coolant(nozzle, coolant, jacket, limit, load, values, given)
    frame = _frame(nozzle, drawn, along)
    return Answer(
        kind="Heat flux",
        title=f"{nozzle.subtitle()}, wall at {wall_kelvin:.5g} K",
        values=values,
        given=given,
        headline=("peak_heat_flux", "heat_load", "heat_share", "coolant_temperature_rise"),
        absent=absent,
        sources={
            "peak_heat_flux": "bartz-1957",
            "heat_load": "bartz-1957",
            "viscosity": gas.source,
            "coolant_temperature_rise": "conservation",
        },
        doubts=tuple(doubts),
        lines=LEFT_OUT,
        table=frame,
        drawn=(partial(_figure, frame),),
        shown=partial(_sections, frame, geometry, nozzle),
    )


def _read(
    nozzle: Nozzle, wall_temperature: Any, coolant: str | None, pressure: Any, limit: Any
) -> tuple[float, float | None, float | None]:
    """Return wall temperature [K], jacket pressure [Pa] and limit [K] of the coolant; every problem in one error."""
    problems: list[Problem] = []
    wanted = (
        ("wall_temperature", wall_temperature, "K", 20.0, 6000.0),
        ("coolant_pressure", pressure, "Pa", 100.0, 1e9),
        ("coolant_limit", limit, "K", 1.0, 6000.0),
    )
    read: list[float | None] = []
    for name, given, unit, low, high in wanted:
        value = None
        if given is not None or name == "wall_temperature":
            try:
                value = units.to_si(given, unit, name)
                if not low <= value <= high:
                    problems.append(Problem(name, as_text(given), f"{low:g} {unit} to {high:g} {unit}"))
            except InputError as error:
                problems += error.problems
            if coolant is None and name != "wall_temperature":
                problems.append(Problem(name, as_text(given), "left out without a coolant", 'coolant="fuel" names one.'))
        read.append(value)
    case = nozzle.chamber.case_or_none
    roles = () if case is None else tuple(role for role in case.roles if role != "gas")
    if coolant is not None and coolant not in roles:
        allowed = " or ".join(map(repr, roles)) or "left out: the gas has no propellants"
        problems.append(Problem("coolant", as_text(coolant), allowed, "The coolant is one of the propellants."))
    if problems or read[0] is None:
        raise InputError(problems)
    return read[0], read[1], read[2]


def _along(nozzle: Nozzle, gas: GasAtRest, wall: walls.Wall, wall_temperature: float) -> dict[str, Array]:
    """Return flow, adiabatic wall temperature, coefficient and flux at points of the wall."""
    flow = flow_at(nozzle, wall.x, wall.r)
    contour = nozzle._values["contour"]
    radius = 0.5 * nozzle.si("throat_diameter")
    arc = 0.5 * (contour.si("upstream_arc") + contour.si("throat_arc")) * radius
    adiabatic = heat_transfer.adiabatic_wall_temperature(flow["temperature"], gas.temperature, gas.prandtl)
    sigma = heat_transfer.property_correction(wall_temperature, gas.temperature, flow["mach"], flow["isentropic_exponent"])
    coefficient = heat_transfer.heat_transfer_coefficient(
        2.0 * radius,
        arc,
        gas.viscosity,
        gas.specific_heat,
        gas.prandtl,
        nozzle.chamber.si("stagnation_pressure"),
        nozzle.si("characteristic_velocity"),
        np.maximum((wall.r / radius) ** 2, 1.0),
        sigma,
    )
    flux = heat_transfer.heat_flux(coefficient, adiabatic, wall_temperature)
    return {**flow, "adiabatic_wall_temperature": adiabatic, "coefficient": coefficient, "heat_flux": flux}


def _power(nozzle: Nozzle, gas: GasAtRest) -> float:
    """Return the power that cooling the gas at rest to 298.15 K at fixed composition would give [W]."""
    reservoir: Any = nozzle.chamber.held
    rest = getattr(reservoir, "stagnation", None)
    if rest is None:
        drop = gas.specific_heat * (gas.temperature - REFERENCE_TEMPERATURE)
    else:
        from propkit.constants import GAS_CONSTANT

        cold = reservoir.table.properties(REFERENCE_TEMPERATURE)
        enthalpy = float(rest.amounts[0] @ cold.enthalpy[0]) * GAS_CONSTANT * REFERENCE_TEMPERATURE
        drop = float(rest.enthalpy[0]) - enthalpy
    if drop <= 0.0:
        raise NotAvailableError("the gas is colder than 298.15 K: there is no chamber power to compare with")
    return nozzle.si("mass_flow") * drop


def _coolant(
    nozzle: Nozzle,
    coolant: str,
    pressure: float | None,
    limit: float | None,
    load: float,
    values: dict[str, float],
    given: dict[str, float | str],
) -> Iterator[str]:
    """Add what the coolant takes up to `values` and `given`, and yield doubts."""
    from propkit.bridge.coolant import warmed

    case: Any = nozzle.chamber.case_or_none
    share = 1.0
    if case.has("mixture_ratio") and coolant in ("oxidizer", "fuel"):
        ratio = case.si("mixture_ratio")
        share = (1.0 - case.additive_fraction) * (ratio if coolant == "oxidizer" else 1.0) / (1.0 + ratio)
    flow = share * nozzle.si("mass_flow")
    row = case._values[coolant].row
    start = case._values.get(f"{coolant}_temperature") or row.temperature
    jacket = nozzle.chamber.si("pressure") if pressure is None else pressure
    after = warmed(row, start, jacket, load / flow)
    values |= {
        "coolant_mass_flow": flow,
        "coolant_pressure": jacket,
        "coolant_temperature_rise": after.temperature - start,
        "coolant_temperature": after.temperature,
    }
    known = after.boiling_temperature if limit is None else limit
    label = case._values[coolant].label
    if known is None:
        yield f"No limit of {label} as a coolant is known here (it has no boiling point at {jacket / 1e6:.3g} MPa, or no equation of state); give coolant_limit, for instance where it cokes or decomposes."
        return
    given["coolant_limit"] = known
    if after.temperature > known:
        what = "boils" if limit is None else "reaches its limit"
        yield f"The whole {coolant} flow cannot take up the load below its limit: it {what} at {known:.5g} K and would leave at {after.temperature:.5g} K ({after.source})."


_FRAME_UNITS = {
    "x": "m", "r": "m", "pressure": "Pa", "temperature": "K", "adiabatic_wall_temperature": "K", "coefficient": "W/(m**2*K)", "heat_flux": "W/m**2",
}  # fmt: skip


def _frame(nozzle: Nozzle, wall: walls.Wall, along: dict[str, Array]) -> pd.DataFrame:
    import pandas as pd

    columns = {"x": wall.x, "r": wall.r, "area_ratio": math.pi * wall.r**2 / nozzle.si("throat_area")}
    columns |= {name: along[name] for name in ("mach", "pressure", "temperature", "adiabatic_wall_temperature", "coefficient", "heat_flux")}
    frame = pd.DataFrame(columns)
    frame.attrs["units"] = {name: _FRAME_UNITS.get(name, "") for name in frame.columns}
    return frame


def _sections(frame: pd.DataFrame, geometry: Any, nozzle: Nozzle, system: UnitSystem) -> Iterator[Section]:
    """Yield the flux at the ends of the segments and at the throat."""
    places: list[tuple[str, int]] = []
    start = 0
    for segment in geometry.segments:
        places.append((f"{segment.name}, start", start))
        start += POINTS - 1
    places.append(("lip", start))
    rows = [place for _, place in places]
    columns = []
    shown = (
        ("x", "divergent_length", "axial position", "x"),
        ("area_ratio", "area_ratio", "local area ratio", r"\epsilon"),
        ("temperature", "temperature", "gas temperature", "T"),
        ("adiabatic_wall_temperature", "temperature", "adiabatic wall temperature", "T_{aw}"),
        ("coefficient", "heat_transfer_coefficient", "heat transfer coefficient", "h"),
        ("heat_flux", "peak_heat_flux", "heat flux", "q"),
    )
    for name, key, label, symbol in shown:
        entry = quantities.quantity(key)
        raw = [float(frame[name].iloc[row]) for row in rows]
        unit = entry.shown_in(system, raw)
        columns.append(Column(name, label, symbol, unit, 4, tuple(units.convert(value, entry.unit, unit) for value in raw)))
    yield Section(
        "flux", "Along the wall", table=Table("flux", "Along the wall", "place", tuple(name for name, _ in places), tuple(columns))
    )


def _figure(frame: pd.DataFrame, system: UnitSystem) -> Figure:
    """Return the flux along the axis, with its largest value marked."""
    entry = quantities.quantity("peak_heat_flux")
    length = "m" if system == "SI" else "inch"
    unit = entry.shown_in(system, [float(frame["heat_flux"].max())])
    xs = tuple(units.convert(float(value), "m", length) for value in frame["x"])
    ys = tuple(units.convert(float(value), entry.unit, unit) for value in frame["heat_flux"])
    top = int(np.argmax(ys))
    line = Line(Series("axial position", xs, length, "x"), Series("heat flux", ys, unit, "q"), colour="accent")
    mark = Mark(xs[top], ys[top], f"{ys[top]:.3g} {units.shown_unit(unit)}")
    alt = f"Convective heat flux along the wall: largest {ys[top]:.4g} {units.shown_unit(unit)} near the throat"
    return Figure(
        "heat_flux",
        "Convective heat flux along the wall",
        alt,
        Axis("axial position", length, "x"),
        Axis("heat flux", unit, "q", low=0.0),
        (line, mark),
    )
