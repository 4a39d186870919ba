"""The alternatives to the assumptions of a performance, and what each of them changes.

The hardware is held (throat area and area ratio), so that a change shows what the assumption carries and not how a design
would react to it. What the chain can compute goes through one call; the rest has a calculation of its own.
"""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import dataclass, replace
from typing import TYPE_CHECKING, Any

from propkit.chain import alternatives as stage
from propkit.chain import performance as delivery
from propkit.chain.alternatives import Delivered, Gas, Variant
from propkit.errors import NotAvailableError, PropkitError
from propkit.model.contour import Bell, Cone
from propkit.model.doubts import Price

if TYPE_CHECKING:
    from propkit.model.performance import Performance

FINITE_CONTRACTION = 3.0
"""Contraction ratio put beside an infinite one: common practice, no source."""

OTHER_EFFICIENCY, OTHER_DISCHARGE = 0.97, 0.98
"""c* efficiency and discharge coefficient put beside a value of 1: common practice, no source."""

WARMER = 10.0
"""Difference of a propellant temperature [K] whose effect is shown."""

HEAT_SHARE = 0.01
"""Share of the enthalpy drop along the nozzle that is taken as lost to show the effect of heat loss."""

NOISE = 1e-9
"""Relative change below which a difference is rounding of the iterations and counts as none."""

FLOW_WORDS = {"shifting": "shifting", "frozen": "frozen from the inlet", "constant-property": "constant properties"}


@dataclass(frozen=True, slots=True)
class Asked:
    """One alternative to be computed by the chain: the assumption it belongs to, what it is called, and the variant."""

    key: str
    alternative: str
    variant: Variant
    note: str = ""


def base_variant(performance: Performance) -> Variant:
    """Return a performance as the stages of the chain take it, its sizes held."""
    nozzle, chamber = performance.nozzle, performance.chamber
    case = chamber.case_or_none
    source: Any
    if case is None:
        source = Gas(chamber.si("temperature"), chamber.si("gas_constant"), chamber.si("isentropic_exponent"))
    else:
        source = case.held.mixture
    return Variant(
        source=source,
        basis="" if case is None else str(case.si("thermo_basis")),
        pressure=chamber._values["pressure"],
        contraction_ratio=chamber._values["contraction_ratio"],
        pressure_at=chamber._values["pressure_at"],
        cstar_efficiency=chamber.si("cstar_efficiency"),
        flow=nozzle.flow,
        freeze_at=nozzle._values["freeze_at"],
        exponent=nozzle._values["exponent"],
        discharge_coefficient=nozzle.si("discharge_coefficient"),
        throat_area=nozzle.si("throat_area"),
        area_ratio=nozzle.si("area_ratio"),
        ambient=performance.si("ambient"),
        divergence_factor=nozzle.si("divergence_factor") if nozzle.has("divergence_factor") else 1.0,
        losses=performance.resolved_losses.ratios,
    )


def prices(performance: Performance) -> dict[str, list[Price]]:
    """Return what the alternatives to each assumption change, by the key of the assumption."""
    case = performance.chamber.case_or_none
    if case is not None and case.held.mixture.shares is not None:
        return {"film": [_uniform_mixture(performance, case)]}
    base = base_variant(performance)
    asked = list(_asked(performance, base))
    here, *there = stage.evaluate([base, *(entry.variant for entry in asked)])
    found: dict[str, list[Price]] = {}
    for entry, delivered in zip(asked, there, strict=True):
        found.setdefault(entry.key, []).append(_price(entry, here, delivered))
    for key, price in _apart(performance):
        found.setdefault(key, []).append(price)
    return {key: sorted(listed, key=lambda price: -price.size) for key, listed in found.items()}


def _uniform_mixture(performance: Performance, case: Any) -> Price:
    """Return what mixing the film of a case into its core would change; the other assumptions have no price beside a film."""
    other = case.beside_uniform(performance)
    here, there = (Delivered(one.si("mass_flow"), one.si("specific_impulse"), one.si("thrust")) for one in (performance, other))
    return _changes("uniform mixture", here, there, "the film mixed into the core")


def _price(entry: Asked, here: Delivered, there: Delivered) -> Price:
    if here.reason or there.reason:
        return Price(entry.alternative, note=here.reason or there.reason)
    return _changes(entry.alternative, here, there, entry.note)


def _changes(alternative: str, here: Delivered, there: Delivered, note: str = "") -> Price:
    return Price(
        alternative,
        mass_flow=_change(here.mass_flow, there.mass_flow),
        specific_impulse=_change(here.specific_impulse, there.specific_impulse),
        thrust=_change(here.thrust, there.thrust),
        note=note,
    )


def _change(here: float, there: float) -> float:
    """Return the change as a share of the size of what it changes: more is more where that is negative too."""
    change = (there - here) / abs(here)
    return change if abs(change) > NOISE else 0.0


# -- what the chain computes ----------------------------------------------------------------------


def _asked(performance: Performance, base: Variant) -> Iterator[Asked]:
    yield from _flow(performance, base)
    yield from _contraction(base)
    yield from _efficiencies(base)
    yield from _divergence(performance, base)
    if isinstance(base.source, Gas):
        stiffer = replace(base.source, isentropic_exponent=1.01 * base.source.isentropic_exponent)
        yield Asked("given-gas", f"exponent {stiffer.isentropic_exponent:.4g}, 1 % higher", replace(base, source=stiffer))
        return
    yield from _substances(performance, base)
    yield from _enthalpies(performance, base)


def _flow(performance: Performance, base: Variant) -> Iterator[Asked]:
    for flow in performance.chamber.flows:
        if flow != base.flow:
            exponent = "equilibrium" if flow == "constant-property" and performance.chamber.chooses_exponent else None
            if flow == "constant-property" and exponent is None and not isinstance(base.source, Gas):
                exponent = "frozen"
            freeze_at = "chamber" if flow == "frozen" else None
            yield Asked("flow", FLOW_WORDS[flow], replace(base, flow=flow, freeze_at=freeze_at, exponent=exponent))
    if base.flow == "frozen" and base.freeze_at == "chamber" and "shifting" in performance.chamber.flows:
        yield Asked("flow", "frozen from the throat", replace(base, freeze_at="throat"))


def _contraction(base: Variant) -> Iterator[Asked]:
    places = {
        "injector": "at the injector",
        "nozzle stagnation": "as stagnation at the inlet",
        "nozzle inlet static": "static at the inlet",
    }
    if math.isinf(base.contraction_ratio):
        for place in ("injector", "nozzle inlet static"):
            variant = replace(base, contraction_ratio=FINITE_CONTRACTION, pressure_at=place)
            yield Asked("contraction", f"ratio {FINITE_CONTRACTION:g}, pressure {places[place]}", variant)
        return
    yield Asked("contraction", "infinite contraction", replace(base, contraction_ratio=math.inf, pressure_at="injector"))
    for place, words in places.items():
        if place != base.pressure_at:
            yield Asked("contraction", f"pressure {words}", replace(base, pressure_at=place))


def _efficiencies(base: Variant) -> Iterator[Asked]:
    for key, field, other in (
        ("cstar-efficiency", "cstar_efficiency", OTHER_EFFICIENCY),
        ("discharge", "discharge_coefficient", OTHER_DISCHARGE),
    ):
        here = getattr(base, field)
        if key == "discharge" and here != 1.0:
            continue
        wanted = other if here == 1.0 else 1.0
        if field == "cstar_efficiency":
            if "energy release" not in base.losses:
                yield Asked(key, f"{wanted:g}", replace(base, cstar_efficiency=wanted))
        else:
            yield Asked(key, f"{wanted:g}", replace(base, discharge_coefficient=wanted))


def _divergence(performance: Performance, base: Variant) -> Iterator[Asked]:
    if performance.nozzle.has("contour"):
        yield Asked("one-dimensional", "axial flow, no divergence", replace(base, divergence_factor=1.0))
        return
    for contour in (Cone("15 deg"), Bell(0.8)):
        try:
            factor = contour.divergence_factor(contour.divergent(1.0, base.area_ratio), 1.0)
        except PropkitError:
            continue
        yield Asked("one-dimensional", contour.text, replace(base, divergence_factor=factor))


_NO_METALS = {"C", "H", "N", "O"}
"""Elements whose liquids and solids (graphite, water) the saturation warnings watch."""


def _substances(performance: Performance, base: Variant) -> Iterator[Asked]:
    assert not isinstance(base.source, Gas)
    from propkit.bridge.basis import BASES

    for basis in BASES:
        if basis != base.basis:
            yield Asked("basis", basis, replace(base, basis=basis))
    if base.source.composition is not None:
        loose = replace(base.source, composition=None)
        yield Asked("fixed-composition", "full chemical equilibrium in the chamber", replace(base, source=loose))
        return
    if base.source.condensed:
        yield Asked("condensation", "gases only", replace(base, source=replace(base.source, condensed=False)))
    else:
        # Below saturation at every station the gas is the equilibrium with liquids and solids too: no second solution is needed.
        dry = set(base.source.symbols) <= _NO_METALS and not any(doubt.code == "supersaturation" for doubt in performance.warnings)
        source = base.source if dry else replace(base.source, condensed=True)
        yield Asked("no-condensation", "liquids and solids may form", replace(base, source=source))


def _enthalpies(performance: Performance, base: Variant) -> Iterator[Asked]:
    """Yield warmer propellants, and heat lost from the gas."""
    assert not isinstance(base.source, Gas)
    case = performance.case
    for role in case.roles:
        made = _warmer(case, role)
        if made is not None:
            words, enthalpy = made
            source = replace(base.source, enthalpy=base.source.enthalpy + enthalpy)
            key = f"{role}-state" if role != "gas" else "no-combustion"
            yield Asked(key, words, replace(base, source=source))
    if base.source.composition is None:
        drop = 0.5 * performance.nozzle.exit.si("velocity") ** 2
        source = replace(base.source, enthalpy=base.source.enthalpy - HEAT_SHARE * drop)
        yield Asked(
            "equilibrium",
            f"{HEAT_SHARE * drop / 1e3:.3g} kJ/kg, {100.0 * HEAT_SHARE:g} % of the enthalpy drop",
            replace(base, source=source),
        )


def _warmer(case: Any, role: str) -> tuple[str, float] | None:
    """Return what a warmer propellant is called, and by how much it raises the enthalpy of the mixture [J/kg]."""
    propellant = case._values[role]
    field, pressure = ("temperature", None) if role == "gas" else (f"{role}_temperature", case._values.get(f"{role}_pressure"))
    here = case._values.get(field) or propellant.row.temperature
    share = 1.0
    if case.has("mixture_ratio") and role in ("oxidizer", "fuel"):
        ratio = case.si("mixture_ratio")
        share = (ratio if role == "oxidizer" else 1.0) / (1.0 + ratio)
    for step in (WARMER, -WARMER):
        try:
            both = [float(propellant.stream(temperature, pressure, role)[0].enthalpy) for temperature in (here, here + step)]
        except PropkitError:
            continue
        return f"{here + step:.5g} K", share * (both[1] - both[0])
    return None


# -- what has a calculation of its own ------------------------------------------------------------


def _apart(performance: Performance) -> Iterator[tuple[str, Price]]:
    for key, made in (("ideal-gas", _real_gas), ("isentropic", _friction), ("full-flow", _separated), ("losses", _lossless)):
        try:
            price = made(performance)
        except NotAvailableError as error:
            price = Price(_UNPRICED.get(key, ""), note=error.message)
        if price is not None:
            yield key, price


_UNPRICED = {"ideal-gas": "real gas", "isentropic": "boundary layer", "full-flow": "separated flow"}


def _real_gas(performance: Performance) -> Price | None:
    """Return the price of the ideal gas: Redlich-Kwong at frozen composition, or CoolProp for a cold gas."""
    chamber, nozzle = performance.chamber, performance.nozzle
    case = chamber.case_or_none
    if case is None:
        return None
    rest = chamber.held.stagnation
    temperature, pressure = float(rest.temperature[0]), float(rest.pressure[0])
    if case.roles == ("gas",):
        from propkit.bridge.real_gas import real_gas_price

        try:
            found = real_gas_price(case._values["gas"].row, temperature, pressure)
        except (PropkitError, ValueError) as error:
            raise NotAvailableError(str(error)) from error
        return Price(
            f"real gas, Z = {found.compressibility:.4g}", found.mass_flow_ratio - 1.0, note="choked flow by CoolProp's equation of state"
        )
    from propkit.bridge.real_products import departure

    table, amounts = chamber.held.table, rest.amounts[0]
    fractions = dict(zip(table.names, (amounts / amounts.sum()).tolist(), strict=True))
    ratio = nozzle.si("area_ratio") / nozzle.si("discharge_coefficient")
    gone = departure(temperature, pressure, fractions, ratio, str(case.si("thermo_basis")), table.elements)
    flow = performance.si("mass_flow") * gone.mass_flow_ratio
    push = (nozzle.exit.si("pressure") * gone.exit_pressure_ratio - performance.si("ambient")) * nozzle.si("exit_area")
    thrust = flow * performance.delivered_velocity * gone.velocity_ratio + push
    here = performance.si("thrust")
    impulse = _change(here / performance.si("mass_flow"), thrust / flow)
    note = f"frozen composition; {100.0 * gone.left_out:.2g} % of the gas (radicals) left out"
    return Price(f"Redlich-Kwong, Z = {gone.compressibility:.4f}", gone.mass_flow_ratio - 1.0, impulse, _change(here, thrust), note)


def _friction(performance: Performance) -> Price | None:
    """Return the price of frictionless flow: a boundary layer along the contour, or along a 15 degree cone without one."""
    taken_off = performance.resolved_losses.ratios.get("boundary layer")
    if taken_off is not None:
        change = 1.0 / taken_off - 1.0
        return Price("no boundary layer loss", 0.0, change, change)
    from propkit.model import friction

    nozzle = performance.nozzle
    if performance.si("thrust") <= 0.0 or nozzle.si("area_ratio") <= 1.0:
        raise NotAvailableError("there is no divergent, or no thrust, to take a loss from")
    if nozzle.has("contour"):
        segments, words = nozzle.geometry.segments, nozzle.input_text("contour")
    else:
        cone = Cone("15 deg")
        words = cone.text
        try:
            segments = cone.divergent(nozzle.si("throat_diameter") / 2.0, nozzle.si("area_ratio"))
        except PropkitError as error:
            raise NotAvailableError(f"no {words} fits this area ratio") from error
    lost, _ = friction.along(nozzle, segments, None, quick=True)
    change = -lost / performance.si("thrust")
    return Price(f"boundary layer, {words}, hot wall", 0.0, change, change, note="integral method, an estimate")


def _separated(performance: Performance) -> Price:
    """Return the price of full flow: the separated thrust, or nothing where the nozzle flows full."""
    from propkit.model import separation

    try:
        thrust = performance.lazily("thrust_separated", lambda: separation.separated_thrust(performance))
    except NotAvailableError:
        found = [entry for entry in separation.predictions(performance) if not entry.separates]
        return Price("separated flow", 0.0, 0.0, 0.0, note=f"{len(found)} of 3 criteria find it flowing full")
    change = _change(performance.si("thrust"), thrust)
    return Price("separated flow", 0.0, change, change, note="middle of three criteria, an estimate")


def _lossless(performance: Performance) -> Price | None:
    """Return the price of the losses that were given: the same nozzle without them."""
    if not performance.resolved_losses.ratios:
        return None
    free = stage.evaluate([replace(base_variant(performance), losses=delivery.NO_LOSSES)])[0]
    here = Delivered(performance.si("mass_flow"), performance.si("specific_impulse"), performance.si("thrust"))
    return _changes("none of these losses", here, free)
