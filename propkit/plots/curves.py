"""Curves that suit an object, as neutral figures: what its live plot and the drawing of the same name show.

They call the stages of `propkit.chain` in one batch each, so a curve passes through the object's own value.
"""

from __future__ import annotations

import math
from functools import lru_cache
from typing import Any

import numpy as np

from propkit import quantities, units
from propkit.chain import case as case_stage
from propkit.chain import chamber as chamber_stage
from propkit.chain import profile
from propkit.constants import STANDARD_GRAVITY
from propkit.physics import atmosphere, gas_dynamics, ideal_nozzle, separation, thrust
from propkit.report import UnitSystem
from propkit.series import Axis, Figure, Line, Mark, Rule, Series

REFERENCE_PRESSURE = 7e6
"""Chamber pressure of the mixture-ratio curve of a case, which has no chamber yet [Pa]."""

POINTS = 33
HIGHEST_ALTITUDE = 40e3
LOWEST_SHOWN = 1.0
"""Heights below this count as the ground [m]."""


def shown(name: str, values: Any, system: UnitSystem, owner: str = "") -> Series:
    """Return SI `values` of a catalogued quantity as a series in its display unit."""
    row = quantities.quantity(name, owner)
    listed = [float(value) for value in np.atleast_1d(values)]
    unit = row.shown_in(system, [value for value in listed if math.isfinite(value)])
    return Series(row.label, tuple(units.convert(value, row.unit, unit) for value in listed), unit, row.symbol)


def axis_of(series: Series, low: float | None = None) -> Axis:
    """Return the axis of a series."""
    return Axis(series.label, series.unit, series.symbol, low=low)


# -- mixture ratio ---------------------------------------------------------------------------------


def mixture_figure(case: Any, name: str, system: UnitSystem, chamber: Any = None) -> Figure:
    """Return a result of the chamber against mixture ratio, with the case marked.

    Parameters
    ----------
    case : PropellantCase
        A case of an oxidizer and a fuel.
    name : str
        ``"characteristic_velocity"`` or ``"temperature"``.
    system : str
        Display units.
    chamber : Chamber, optional
        The chamber that says the pressure; without one the curve holds at `REFERENCE_PRESSURE`.
    """
    ratios, curves = _mixture_curve(*_curve_key(case, chamber))
    ratio = case.si("mixture_ratio")
    pressure = REFERENCE_PRESSURE if chamber is None else chamber.si("pressure")
    here = _mixture_point(case, pressure)[name] if chamber is None else chamber.si(name)
    y = shown(name, [*curves[name], here], system, "chamber")
    curve, at = Series(y.label, y.values[:-1], y.unit, y.symbol), y.values[-1]
    x = Series("mixture ratio", tuple(ratios), "", "r")
    line = Line(x, curve, colour="accent", label=curve.label)
    layers: list[Any] = [line]
    if case.has("stoichiometric_mixture_ratio"):
        layers.append(Rule("x", case.si("stoichiometric_mixture_ratio"), "stoichiometric"))
    layers.append(Mark(ratio, at, f"{ratio:.4g}"))
    shown_pressure = shown("pressure", [pressure], system, "chamber")
    quoted = f"{shown_pressure.values[0]:.4g} {units.shown_unit(shown_pressure.unit)}"
    where = f"at {quoted}" + ("" if chamber is not None else " (reference)")
    title = f"{curve.label[:1].upper()}{curve.label[1:]} against mixture ratio {where}"
    alt = f"{title}: {at:.5g} {units.shown_unit(curve.unit)} at mixture ratio {ratio:.4g}; largest {np.nanmax(curve.values):.5g}"
    return Figure(f"mixture-{name}", title, alt, Axis("mixture ratio", "", "r"), axis_of(curve), tuple(layers))


def _curve_key(case: Any, chamber: Any) -> tuple[Any, ...]:
    """Return what the curve depends on: everything but the mixture ratio of the case itself."""
    ratio = case.si("mixture_ratio")
    centre = case.si("stoichiometric_mixture_ratio") if case.has("stoichiometric_mixture_ratio") else ratio
    low, high = 0.25 * centre, 1.75 * centre
    if not low <= ratio <= high:
        low, high = min(low, 0.5 * ratio), max(high, 1.5 * ratio)
    streams = _Streams(case.held)
    if chamber is None:
        return (streams, case.si("thermo_basis"), REFERENCE_PRESSURE, math.inf, "injector", low, high)
    typed = (chamber.si("contraction_ratio"), chamber.si("pressure_at"))
    return (streams, case.si("thermo_basis"), chamber._values["pressure"], *typed, low, high)


class _Streams:
    """What a case mixes, as a key: equal when every number in it is."""

    def __init__(self, held: Any) -> None:
        self.oxidizer, self.fuel, self.additives = held.oxidizer, held.fuel, held.additives
        self.condensed = held.mixture.condensed
        parts = [(self.oxidizer, 0.0), (self.fuel, 0.0), *self.additives]
        told = tuple((tuple(sorted(s.elements.items())), float(s.enthalpy), repr(float(s.density)), share) for s, share in parts)
        self.key = (told, self.condensed)

    def __eq__(self, other: object) -> bool:
        return isinstance(other, _Streams) and self.key == other.key

    def __hash__(self) -> int:
        return hash(self.key)


def _combust(streams: _Streams, basis: str, pressure: float, contraction: float, place: str, ratios: np.ndarray[Any, Any]) -> Any:
    mixture = case_stage.two_streams(streams.oxidizer, streams.fuel, ratios, streams.additives, streams.condensed)
    return chamber_stage.combust(mixture, basis, pressure=pressure, contraction_ratio=contraction, pressure_at=place)


def _values_of(found: Any) -> dict[str, tuple[float, ...]]:
    good = (found.injector.status == 0) & (found.throat.status == 0)
    pairs = {"characteristic_velocity": found.characteristic_velocity, "temperature": found.injector.temperature}
    return {name: tuple(np.where(good, array, np.nan).tolist()) for name, array in pairs.items()}


@lru_cache(maxsize=16)
def _mixture_curve(
    streams: _Streams, basis: str, pressure: float, contraction: float, place: str, low: float, high: float
) -> tuple[tuple[float, ...], dict[str, tuple[float, ...]]]:
    ratios = np.linspace(low, high, POINTS if math.isinf(contraction) else POINTS // 3)
    return tuple(ratios.tolist()), _values_of(_combust(streams, basis, pressure, contraction, place, ratios))


def _mixture_point(case: Any, pressure: float) -> dict[str, float]:
    streams = _Streams(case.held)
    found = _combust(streams, case.si("thermo_basis"), pressure, math.inf, "injector", np.array([case.si("mixture_ratio")]))
    return {name: values[0] for name, values in _values_of(found).items()}


def gas_figure(chamber: Any, system: UnitSystem) -> Figure:
    """Return velocity against pressure on the isentrope of a gas given by its properties, with the throat marked."""
    held = chamber.held
    gamma, gas, rest = (float(getattr(held, name)[0]) for name in ("isentropic_exponent", "gas_constant", "temperature"))
    pressure = chamber.si("stagnation_pressure")
    throat = float(gas_dynamics.pressure_ratio(1.0, gamma))
    ratios = np.geomspace(1e-3, 0.999, POINTS)
    speeds = ideal_nozzle.exhaust_velocity([*ratios, throat], rest, gas, gamma)
    y = shown("velocity", speeds, system)
    x = shown("pressure", [*(ratios * pressure), throat * pressure], system)
    line = Line(Series(x.label, x.values[:-1], x.unit, "p"), Series(y.label, y.values[:-1], y.unit, "u"), "accent", label="velocity")
    alt = f"Velocity against pressure on the isentrope: {y.values[-1]:.5g} {units.shown_unit(y.unit)} at the throat"
    x_axis = Axis(x.label, x.unit, "p", scale="log", low=min(x.values), high=max(x.values))
    return Figure(
        "expansion", "Velocity against pressure", alt, x_axis, axis_of(y, low=0.0), (line, Mark(x.values[-1], y.values[-1], "throat"))
    )


# -- along the nozzle --------------------------------------------------------------------------------


def nozzle_figures(nozzle: Any, system: UnitSystem) -> tuple[Figure, Figure]:
    """Return the nozzle to scale with the flow told under the pointer, and Mach number and ratios along it."""
    outline = nozzle.figures(system)[0]
    position, flow = _profile(nozzle, outline)
    length = outline.x.unit
    x = Series("axial position", tuple(units.convert(value, "m", length) for value in position), length, "x")
    hover = tuple(shown(name, flow[name], system) for name in ("pressure", "temperature", "velocity", "mach"))
    axis = Line(x, Series("axis", (0.0,) * len(position), length), colour="quiet", dash="dashed", hover=hover)
    drawing = Figure(outline.name, outline.title, outline.alt, outline.x, outline.y, (*outline.layers, axis), equal_aspect=True)
    ratios = (
        ("mach", "Mach number", flow["mach"], 0),
        ("temperature", "temperature over its value at rest", flow["temperature"] / flow["rest_temperature"], 1),
        ("pressure", "pressure over its value at rest", flow["pressure"] / flow["rest_pressure"], 2),
    )
    lines = tuple(
        Line(x, Series(label, tuple(values.tolist()), ""), colour=colour, label=label, hover=(hover[_PLACES[name]],))
        for name, label, values, colour in ratios
    )
    alt = f"Flow along the nozzle: Mach number {flow['mach'][-1]:.4g} at the exit, pressure {hover[0].values[-1]:.4g} {units.shown_unit(hover[0].unit)}"
    low, high = min(x.values), max(x.values)
    room = 0.06 * (high - low)
    along_axis = Axis(outline.x.label, length, "x", low=low - room, high=high + room)
    along = Figure(
        "flow", "Flow along the nozzle", alt, along_axis, Axis("Mach number and ratios", low=0.0), (*lines, Rule("x", 0.0, "throat"))
    )
    return drawing, along


_PLACES = {"pressure": 0, "temperature": 1, "velocity": 2, "mach": 3}


def _profile(nozzle: Any, outline: Figure) -> tuple[list[float], dict[str, Any]]:
    """Return axial positions [m] and the flow there, from the wall as it is drawn."""
    body = outline.layers[0]
    assert isinstance(body, Line)
    half = len(body.x.values) // 2
    scale = units.convert(1.0, "m", body.x.unit)
    x, r = (np.array(series.values[:half]) / scale for series in (body.x, body.y))
    throat = nozzle.si("throat_diameter") / 2.0
    places = np.unique(np.concatenate([np.linspace(min(x[0], 0.0), 0.0, 12), x[-1] * np.linspace(0.0, 1.0, 22) ** 1.5]))
    ratio = (np.interp(places, x, r) / throat) ** 2 / nozzle.si("discharge_coefficient")
    ratio = np.where(places == 0.0, 1.0, np.maximum(ratio, 1.0))
    before = places < 0.0
    flow: dict[str, Any] = {}
    parts = [profile.along(nozzle.held, ratio[where], supersonic=side) for where, side in ((before, False), (~before, True)) if where.any()]
    for name in parts[0]:
        flow[name] = np.concatenate([part[name] for part in parts])
    flow["rest_pressure"] = nozzle.chamber.si("stagnation_pressure")
    flow["rest_temperature"] = _rest_temperature(nozzle)
    return [float(place) for place in places], flow


def _rest_temperature(nozzle: Any) -> float:
    held = nozzle.chamber.held
    rest = getattr(held, "stagnation", held)
    return float(rest.temperature[0])


# -- altitude ------------------------------------------------------------------------------------------


def altitude_figure(performance: Any, name: str, system: UnitSystem) -> Figure:
    """Return a result of the performance against altitude, with the ambient condition and predicted separation marked.

    The line is dashed below the lowest altitude at which any criterion predicts separation at the lip: the values there are
    the full-flowing ones. What is not predicted stays among the layers as NaN: a live plot then changes its data only.
    """
    heights = np.linspace(0.0, HIGHEST_ALTITUDE, 81)
    y = shown(name, [*_delivered(performance, atmosphere.pressure(heights), name), performance.si(name)], system)
    curve, here = Series(y.label, y.values[:-1], y.unit, y.symbol), y.values[-1]
    scale, unit = (1e3, "km") if system == "SI" else (304.8, "kft")
    predicted = separation_altitudes(performance)
    limits = {criterion: height for criterion, height in predicted.items() if height > LOWEST_SHOWN}
    highest = max(limits.values(), default=0.0)
    full = heights >= highest
    x = tuple((heights / scale).tolist())
    below = np.where(full, np.nan, curve.values)
    if not full.all():
        below[int(full.argmax())] = curve.values[int(full.argmax())]
    layers: list[Any] = [
        _line(x, below, curve, unit, "dashed", "below a limit of separation"),
        _line(x, np.where(full, curve.values, np.nan), curve, unit, "solid", curve.label),
        *(Rule("x", limits.get(criterion, np.nan) / scale, f"{criterion} limit") for criterion in predicted),
    ]
    ambient = performance._values["ambient"]
    at = _altitude(ambient)
    layers.append(Mark(at / scale, here, ambient.text))
    title = f"{curve.label[:1].upper()}{curve.label[1:]} against altitude"
    words = ", ".join(f"{criterion} {height / scale:.3g} {unit}" for criterion, height in limits.items())
    alt = f"{title}: {here:.5g} {units.shown_unit(curve.unit)} at {ambient.text}" + (
        f"; separation predicted below: {words}" if words else ""
    )
    return Figure(
        f"altitude-{name}",
        title,
        alt,
        Axis("altitude", unit, "z", low=-0.015 * HIGHEST_ALTITUDE / scale, high=HIGHEST_ALTITUDE / scale),
        axis_of(curve),
        tuple(layers),
    )


def _line(x: tuple[float, ...], values: Any, curve: Series, unit: str, dash: Any, label: str) -> Line:
    return Line(
        Series("altitude", x, unit, "z"),
        Series(curve.label, tuple(float(v) for v in values), curve.unit, curve.symbol),
        "accent",
        dash,
        label=label,
    )


def _delivered(performance: Any, ambient: Any, name: str) -> Any:
    """Return thrust or specific impulse at ambient pressures: losses taken off, the thrust falls by pressure times exit area."""
    force = performance.si("thrust_vacuum") - ambient * performance.nozzle.si("exit_area")
    if name == "thrust":
        return force
    return thrust.specific_impulse(force, performance.si("mass_flow"), STANDARD_GRAVITY)


def _altitude(ambient: Any) -> float:
    if ambient.altitude is not None:
        return float(min(ambient.altitude, HIGHEST_ALTITUDE))
    if ambient.pressure <= float(atmosphere.pressure(HIGHEST_ALTITUDE)):
        return HIGHEST_ALTITUDE
    return max(0.0, float(atmosphere.altitude_of_pressure(ambient.pressure))) if ambient.pressure < 101_325.0 else 0.0


def separation_altitudes(performance: Any) -> dict[str, float]:
    """Return the altitude [m] below which each published criterion predicts separation at the lip; 0 where it predicts none."""
    found: dict[str, float] = performance.lazily("separation altitudes", lambda: _separation_altitudes(performance))
    return found


def _separation_altitudes(performance: Any) -> dict[str, float]:
    state = performance.nozzle.exit
    pressure, mach = state.si("pressure"), state.si("mach")
    if mach <= 1.0:
        return {}
    reservoir = performance.nozzle.chamber.si("stagnation_pressure")
    limits = {
        "Summerfield": separation.summerfield_ambient(pressure),
        "Schmucker": separation.schmucker_ambient(pressure, mach),
        "Kalt and Badal": separation.kalt_badal_ambient(pressure, reservoir),
    }
    ground, top = (float(atmosphere.pressure(height)) for height in (0.0, HIGHEST_ALTITUDE))
    inside = np.clip([float(limit) for limit in limits.values()], top, ground)
    heights = atmosphere.altitude_of_pressure(inside)
    return {name: float(min(max(height, 0.0), HIGHEST_ALTITUDE)) for name, height in zip(limits, heights, strict=True)}
