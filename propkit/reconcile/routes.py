"""Independent routes: each way of getting mass flow, throat or specific impulse from the quoted figures.

The model supplies what no figure does (theoretical c* and thrust coefficient, times the efficiencies it has); everything
is compared at the level of the chamber, engine figures being brought there with the dump flow of the model.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping
from dataclasses import dataclass

from propkit.constants import STANDARD_GRAVITY
from propkit.errors import InputError, near_matches
from propkit.reconcile.figures import QuotedFigure

Numbers = Mapping[str, float]


@dataclass(frozen=True, slots=True)
class Route:
    """One way to a quantity: what it is called, the figures it needs, and how they make it."""

    words: str
    needs: tuple[str, ...]
    make: Callable[[Numbers], float]


@dataclass(frozen=True, slots=True)
class RouteValue:
    """What a route gives, with the standard uncertainty that the figures leave."""

    words: str
    value: float
    standard_uncertainty: float
    figures: tuple[str, ...]


def _circle(diameter: float) -> float:
    return math.pi / 4.0 * diameter**2


_MASS_FLOW = (
    Route("as quoted", ("mass_flow",), lambda q: q["mass_flow"]),
    Route(
        "thrust over specific impulse",
        ("thrust", "specific_impulse"),
        lambda q: q["thrust"] / (STANDARD_GRAVITY * q["specific_impulse"]),
    ),
    Route(
        "vacuum thrust over vacuum specific impulse",
        ("thrust_vacuum", "specific_impulse_vacuum"),
        lambda q: q["thrust_vacuum"] / (STANDARD_GRAVITY * q["specific_impulse_vacuum"]),
    ),
    Route(
        "sea-level thrust over sea-level specific impulse",
        ("thrust_sea_level", "specific_impulse_sea_level"),
        lambda q: q["thrust_sea_level"] / (STANDARD_GRAVITY * q["specific_impulse_sea_level"]),
    ),
    Route(
        "oxidizer and fuel flow",
        ("oxidizer_mass_flow", "fuel_mass_flow"),
        lambda q: q["oxidizer_mass_flow"] + q["fuel_mass_flow"],
    ),
    Route(
        "oxidizer flow and mixture ratio",
        ("oxidizer_mass_flow", "case.mixture_ratio"),
        lambda q: q["oxidizer_mass_flow"] * (1.0 + 1.0 / q["case.mixture_ratio"]),
    ),
    Route(
        "fuel flow and mixture ratio",
        ("fuel_mass_flow", "case.mixture_ratio"),
        lambda q: q["fuel_mass_flow"] * (1.0 + q["case.mixture_ratio"]),
    ),
    Route(
        "propellant mass over burn time",
        ("propellant_mass", "burn_time"),
        lambda q: q["propellant_mass"] / q["burn_time"],
    ),
    Route(
        "chamber pressure, throat and quoted c*",
        ("chamber.pressure", "throat_area", "nozzle.characteristic_velocity"),
        lambda q: q["model.pressure_ratio"] * q["chamber.pressure"] * q["throat_area"] / q["nozzle.characteristic_velocity"],
    ),
    Route(
        "chamber pressure, throat and c* of the model",
        ("chamber.pressure", "throat_area"),
        lambda q: q["model.pressure_ratio"] * q["chamber.pressure"] * q["throat_area"] / q["model.characteristic_velocity"],
    ),
)

_SPECIFIC_IMPULSE = (
    Route("as quoted", ("specific_impulse",), lambda q: q["specific_impulse"]),
    Route("thrust over mass flow", ("thrust", "mass_flow"), lambda q: q["thrust"] / (STANDARD_GRAVITY * q["mass_flow"])),
    Route(
        "thrust over oxidizer and fuel flow",
        ("thrust", "oxidizer_mass_flow", "fuel_mass_flow"),
        lambda q: q["thrust"] / (STANDARD_GRAVITY * (q["oxidizer_mass_flow"] + q["fuel_mass_flow"])),
    ),
    Route(
        "total impulse over propellant mass",
        ("total_impulse", "propellant_mass"),
        lambda q: q["total_impulse"] / (STANDARD_GRAVITY * q["propellant_mass"]),
    ),
    Route(
        "quoted c* and thrust coefficient",
        ("nozzle.characteristic_velocity", "thrust_coefficient"),
        lambda q: q["nozzle.characteristic_velocity"] * q["thrust_coefficient"] / STANDARD_GRAVITY,
    ),
    Route("the model alone", (), lambda q: q["model.specific_impulse"]),
)

_VACUUM_IMPULSE = (
    Route("as quoted", ("specific_impulse_vacuum",), lambda q: q["specific_impulse_vacuum"]),
    Route(
        "vacuum thrust over mass flow",
        ("thrust_vacuum", "mass_flow"),
        lambda q: q["thrust_vacuum"] / (STANDARD_GRAVITY * q["mass_flow"]),
    ),
    Route("the model alone", (), lambda q: q["model.specific_impulse_vacuum"]),
)

_THROAT_AREA = (
    Route("as quoted", ("throat_area",), lambda q: q["throat_area"]),
    Route(
        "exit area over area ratio",
        ("exit_area", "nozzle.area_ratio"),
        lambda q: q["exit_area"] / q["nozzle.area_ratio"],
    ),
    Route(
        "mass flow, chamber pressure and c* of the model",
        ("mass_flow", "chamber.pressure"),
        lambda q: q["mass_flow"] * q["model.characteristic_velocity"] / (q["model.pressure_ratio"] * q["chamber.pressure"]),
    ),
    Route(
        "thrust, chamber pressure and thrust coefficient of the model",
        ("thrust", "chamber.pressure"),
        lambda q: q["thrust"] / (q["model.thrust_coefficient"] * q["model.pressure_ratio"] * q["chamber.pressure"]),
    ),
    Route(
        "vacuum thrust, chamber pressure and thrust coefficient of the model",
        ("thrust_vacuum", "chamber.pressure"),
        lambda q: q["thrust_vacuum"] / (q["model.thrust_coefficient_vacuum"] * q["model.pressure_ratio"] * q["chamber.pressure"]),
    ),
)


def _diameters(routes: tuple[Route, ...]) -> tuple[Route, ...]:
    def diameter(route: Route) -> Callable[[Numbers], float]:
        return lambda q: math.sqrt(4.0 / math.pi * route.make(q))

    return tuple(Route(route.words, route.needs, diameter(route)) for route in routes)


ROUTES: dict[str, tuple[Route, ...]] = {
    "mass_flow": _MASS_FLOW,
    "specific_impulse": _SPECIFIC_IMPULSE,
    "specific_impulse_vacuum": _VACUUM_IMPULSE,
    "throat_area": _THROAT_AREA,
    "throat_diameter": _diameters(_THROAT_AREA),
}
"""Quantity -> the ways to it."""


def routes_to(
    wanted: str,
    figures: Mapping[str, QuotedFigure],
    model: Numbers,
    to_chamber: Mapping[str, float],
) -> tuple[RouteValue, ...]:
    """Return what each way to a quantity gives.

    Parameters
    ----------
    wanted : str
        One of `ROUTES`.
    figures : mapping of str to QuotedFigure
        Figures by key.
    model : mapping of str to float
        What the model supplies, by ``model.<name>``.
    to_chamber : mapping of str to float
        Key -> factor that brings an engine figure to the chamber.

    Returns
    -------
    tuple of RouteValue
        The ways for which every figure is there; uncertainties in first order, figures independent.

    Raises
    ------
    InputError
        For a quantity to which no routes are known.
    """
    if wanted not in ROUTES:
        near = near_matches(wanted, ROUTES)
        hint = f" Did you mean {' or '.join(near)}?" if near else f" Known are {', '.join(ROUTES)}."
        raise InputError(f"no routes to {wanted!r} are known.{hint}", candidates=list(ROUTES))
    known: dict[str, tuple[float, float, str]] = {}
    for key, figure in figures.items():
        factor = to_chamber.get(key, 1.0)
        known[key] = (figure.value * factor, figure.uncertainty * factor, figure.name)
        for place in ("throat", "exit"):
            if key == f"nozzle.{place}_area":
                known[f"{place}_area"] = known[key]
            if key == f"nozzle.{place}_diameter" and f"nozzle.{place}_area" not in figures:
                area = _circle(figure.value)
                known[f"{place}_area"] = (area, 2.0 * area * figure.uncertainty / figure.value, figure.name)
    return tuple(_value(route, known, model) for route in ROUTES[wanted] if all(need in known for need in route.needs))


def _value(route: Route, known: Mapping[str, tuple[float, float, str]], model: Numbers) -> RouteValue:
    values = {key: entry[0] for key, entry in known.items()} | dict(model)
    centre = route.make(values)
    variance = 0.0
    for need in route.needs:
        step = 1e-5 * abs(values[need])
        ends = [route.make({**values, need: values[need] + sign * step}) for sign in (1.0, -1.0)]
        variance += ((ends[0] - ends[1]) / (2.0 * step) * known[need][1]) ** 2
    return RouteValue(route.words, centre, math.sqrt(variance), tuple(known[need][2] for need in route.needs))
