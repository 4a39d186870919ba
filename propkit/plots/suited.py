"""Which live figures suit an object."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

from propkit.plots import curves
from propkit.report import UnitSystem
from propkit.series import Figure

Maker = Callable[[Any, UnitSystem], tuple[Figure, ...]]


def live_figures(calculation: Any) -> tuple[tuple[str, Maker], ...]:
    """Return the live figures that suit an object: a title, and a function of (object, unit system) for each.

    Nothing is computed before the function is called. The first is the one shown first.
    """
    found = tuple(_SUITED.get(calculation.kind, _drawings)(calculation))
    return found or _drawings(calculation)


def _drawings(calculation: Any) -> tuple[tuple[str, Maker], ...]:
    return tuple((figure.title, _drawing(place)) for place, figure in enumerate(calculation.figures("SI")))


def _drawing(place: int) -> Maker:
    def make(calculation: Any, system: UnitSystem) -> tuple[Figure, ...]:
        return (calculation.figures(system)[place],)

    return make


def _has_ratio(case: Any) -> bool:
    return case is not None and case.has("mixture_ratio") and case.held.mixture.shares is None


def _of_case(case: Any) -> tuple[tuple[str, Maker], ...]:
    curve = (
        ("Temperature", lambda c, system: (curves.mixture_figure(c, "temperature", system),)),
        ("c* and mixture ratio", lambda c, system: (curves.mixture_figure(c, "characteristic_velocity", system),)),
    )
    return (*(curve if _has_ratio(case) else ()), *_drawings(case))


def _of_chamber(chamber: Any) -> tuple[tuple[str, Maker], ...]:
    if chamber.case_or_none is None:
        return (("Expansion", lambda c, system: (curves.gas_figure(c, system),)),)
    curve = (
        ("Composition", _drawing(0)),
        ("c* and mixture ratio", lambda c, system: (curves.mixture_figure(c.case, "characteristic_velocity", system, c),)),
        ("Temperature", lambda c, system: (curves.mixture_figure(c.case, "temperature", system, c),)),
    )
    return curve if _has_ratio(chamber.case_or_none) else curve[:1]


def _of_nozzle(nozzle: Any) -> tuple[tuple[str, Maker], ...]:
    return (("Nozzle and flow", curves.nozzle_figures), *_above("chamber", _of_chamber(nozzle.chamber)))


def _of_performance(performance: Any) -> tuple[tuple[str, Maker], ...]:
    return (
        ("Altitude", lambda p, system: tuple(curves.altitude_figure(p, name, system) for name in ("thrust", "specific_impulse"))),
        *_above("nozzle", _of_nozzle(performance.nozzle)),
    )


def _above(link: str, listed: tuple[tuple[str, Maker], ...]) -> tuple[tuple[str, Maker], ...]:
    """Return the figures of the object upstream, as figures of the object that has it as attribute `link`."""

    def of_link(make: Maker) -> Maker:
        return lambda calculation, system: make(getattr(calculation, link), system)

    return tuple((title, of_link(make)) for title, make in listed)


_SUITED: dict[str, Callable[[Any], tuple[tuple[str, Maker], ...]]] = {
    "case": _of_case,
    "chamber": _of_chamber,
    "nozzle": _of_nozzle,
    "performance": _of_performance,
}
