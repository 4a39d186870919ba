"""The stages of a chain over a batch of cases, just as the objects call them, and which recipes they cover.

A batch gives every result of the chain by whole path, and says for each case why it has none.
"""

from __future__ import annotations

import math
from collections import OrderedDict
from collections.abc import Mapping, Sequence
from types import MappingProxyType
from typing import Any

import numpy as np
import numpy.typing as npt

from propkit.chain import accelerated, sizing
from propkit.chain import case as case_stage
from propkit.chain import chamber as chamber_stage
from propkit.chain import nozzle as nozzle_stage
from propkit.chain import performance as performance_stage
from propkit.chain.accelerated import Accelerator
from propkit.constants import GAS_CONSTANT
from propkit.errors import NotAvailableError, PropkitError
from propkit.model import wall
from propkit.model.base import Calculation
from propkit.model.chamber import Chamber, GasChamber
from propkit.model.declare import NumberInput, QuantityInput
from propkit.model.nozzle import SIZES, Nozzle
from propkit.model.performance import Performance
from propkit.model.propellant_case import ROLES, PropellantCase
from propkit.model.state import STATE_FIELDS
from propkit.physics import balances, thrust
from propkit.physics.arrays import has_tangent, values

Array = npt.NDArray[np.float64]

ENTHALPY = "enthalpy"
"""Name of the assigned molar enthalpy of a propellant, in paths."""

WALL_SIZES = ("chamber_volume", "chamber_length", "stay_time", "characteristic_length", "wall_thickness", "wall_density")
BATCHED = (PropellantCase, Chamber, GasChamber, Nozzle, Performance)


def has_stage(link: Calculation, variables: Sequence[str] = ()) -> bool:
    """Whether the stages can take an object as arrays: a case of one stream only as it is, core and film never."""
    if type(link) in BATCHED:
        return True
    varied = any(path.startswith(f"{link.kind}.") for path in variables)
    return isinstance(link, PropellantCase) and link.held.mixture.shares is None and not varied


class Batch:
    """The stages of a chain over a batch; `results` by whole path, `good` where every stage has a solution."""

    def __init__(self, target: Calculation, inputs: Mapping[str, Array], count: int, quick: Accelerator | None = None) -> None:
        self.inputs, self.count, self.quick = inputs, count, quick
        self.target = target
        self.quick_cases = self.slow_cases = 0
        self.good = np.ones(count, dtype=bool)
        self.reasons: dict[int, str] = {}
        self.results: dict[str, Any] = {}
        self.mixture: case_stage.Mixture | None = None
        self.ratio: Array | None = None
        stages = {PropellantCase: self._case, Chamber: self._chamber, GasChamber: self._gas, Nozzle: self._nozzle}
        for link in target.chain():
            for name in link.declared_inputs:
                if f"{link.kind}.{name}" in inputs:
                    self.results[f"{link.kind}.{name}"] = inputs[f"{link.kind}.{name}"]
            other = self._single_case if isinstance(link, PropellantCase) else self._performance
            stages.get(type(link), other)(link)

    def require(self, condition: Any, reason: str) -> None:
        """Note the cases that fail a condition, with the first reason of each."""
        fails = self.good & ~np.asarray(condition)
        if fails.any():
            self.reasons.update(dict.fromkeys(np.flatnonzero(fails).tolist(), reason))
            self.good &= ~fails

    def value(self, link: Calculation, name: str) -> Any:
        """Return an input as an array where it varies, else as the object has it."""
        return self.inputs.get(f"{link.kind}.{name}", link._values[name])

    def array(self, link: Calculation, name: str) -> Array:
        """Return an input as an array."""
        return np.array(np.broadcast_to(values(self.value(link, name)), (self.count,)))

    def untouched(self, given: Any) -> Any:
        """Return an input of what knows no tangents, without them; cases that have one there have no derivative."""
        if not has_tangent(given):
            return given
        self.require(given.imag == 0.0, "no exact derivative passes through tabulated data")
        return given.real

    def keep(self, link: Calculation, results: Mapping[str, Any]) -> None:
        """Note results of an object."""
        self.results.update({f"{link.kind}.{name}": values for name, values in results.items()})

    def _single_case(self, link: Calculation) -> None:
        self.mixture = case_stage.repeated(link.held.mixture, self.count)
        self.keep(link, {name: link.si(name) for name in link.declared_results if link.has(name)})

    def _case(self, link: Calculation) -> None:
        oxidizer, fuel = (self._stream(link, role) for role in ROLES)
        given = next(name for name in case_stage.AMOUNTS if name in link.inputs)
        self.ratio = np.broadcast_to(case_stage.mixture_ratio_from(oxidizer, fuel, given, self.array(link, given)), (self.count,))
        self.additive_fraction = link.additive_fraction  # type: ignore[attr-defined]
        self.mixture = case_stage.two_streams(oxidizer, fuel, self.ratio, link.held.additives, link.held.mixture.condensed)
        self.keep(
            link,
            {
                **case_stage.amounts_of(oxidizer, fuel, self.ratio),
                "enthalpy": self.mixture.enthalpy,
                "bulk_density": self.mixture.density,
                "oxygen_balance": case_stage.oxygen_balance(self.mixture),
            },
        )

    def _stream(self, link: Calculation, role: str) -> case_stage.Stream:
        stream: case_stage.Stream = getattr(link.held, role)
        enthalpy: Any = stream.enthalpy
        density: Any = stream.density
        stored = [f"{link.kind}.{role}_{name}" for name in ("temperature", "pressure")]
        if any(path in self.inputs for path in stored):
            temperature, pressure = (self.untouched(self.value(link, f"{role}_{name}")) for name in ("temperature", "pressure"))
            enthalpy, density = self._stored(link._values[role], temperature, pressure, role)
        assigned = self.inputs.get(f"case.{role}.{ENTHALPY}")
        if assigned is not None:
            molar_mass = float(link._values[role].row.molar_mass)
            enthalpy = enthalpy + (assigned / molar_mass - float(getattr(link.held, role).enthalpy))
        return case_stage.Stream(stream.elements, enthalpy, density)

    def _stored(self, propellant: Any, temperature: Any, pressure: Any, role: str) -> tuple[Array, Array]:
        columns = [
            [None] * self.count if value is None else np.broadcast_to(value, (self.count,)).tolist() for value in (temperature, pressure)
        ]
        known: dict[tuple[Any, Any], tuple[float, float]] = {}
        for pair in zip(*columns, strict=True):
            if pair not in known:
                try:
                    stream, _ = propellant.stream(*pair, role)
                    known[pair] = (float(stream.enthalpy), float(stream.density))
                except PropkitError:
                    known[pair] = (math.nan, math.nan)
        pairs = np.array([known[pair] for pair in zip(*columns, strict=True)])
        nominal = propellant.stream(None, None, role)[0]
        bad = ~np.isfinite(pairs[:, 0])
        self.require(~bad, f"the {role} has no data at that temperature and pressure")
        return np.where(bad, float(nominal.enthalpy), pairs[:, 0]), pairs[:, 1]

    def _chamber(self, link: Calculation) -> None:
        assert self.mixture is not None
        ratio, pressure = self.array(link, "contraction_ratio"), self.array(link, "pressure")
        if self.quick is not None and self.quick.serves(self.mixture, ratio):
            frozen = any(below._values.get("flow") == "frozen" for below in self.target.chain())
            at = link._values["pressure_at"]
            self.reservoir: Any = self.quick.combust(self.mixture, pressure, contraction_ratio=ratio, pressure_at=at, keep=frozen)
            self.quick_cases, self.slow_cases = self.count, len(self.reservoir.slow)
        else:
            self.quick = None
            self.reservoir = chamber_stage.combust(
                self.mixture,
                self._basis(link),
                pressure=pressure,
                contraction_ratio=ratio,
                pressure_at=link._values["pressure_at"],
            )
        face, rest = self.reservoir.injector, self.reservoir.stagnation
        self.require(face.status != 2, "the combustion has no solution inside the range of the species data")
        self.require(face.status == 0, "the combustion at the injector face did not converge")
        self.require(rest.status == 0, "the stagnation state at the nozzle inlet did not converge")
        self.require(self.reservoir.throat.status == 0, "the throat of shifting flow did not converge")
        self.rest_pressure, self.efficiency = rest.pressure, self.array(link, "cstar_efficiency")
        self.keep(link, {name: getattr(face, name) for name in chamber_stage.INJECTOR_RESULTS})
        self.keep(
            link,
            {
                "stagnation_pressure": rest.pressure,
                "characteristic_velocity": self.reservoir.characteristic_velocity,
                "cstar_efficiency": self.efficiency,
                "contraction_ratio": self.reservoir.contraction_ratio,
            },
        )

    def _basis(self, link: Calculation) -> str:
        return str(link.upstream.si("thermo_basis"))  # type: ignore[union-attr]

    def _gas(self, link: Calculation) -> None:
        given = link._values["gas_constant"] is not None
        gas_constant = self.array(link, "gas_constant") if given else GAS_CONSTANT / self.array(link, "molar_mass")
        self.reservoir = chamber_stage.given_gas(
            pressure=self.array(link, "pressure"),
            temperature=self.array(link, "temperature"),
            gas_constant=gas_constant,
            isentropic_exponent=self.array(link, "isentropic_exponent"),
            contraction_ratio=self.array(link, "contraction_ratio"),
            pressure_at=link._values["pressure_at"],
        )
        gas = self.reservoir
        self.rest_pressure, self.efficiency = gas.stagnation_pressure, self.array(link, "cstar_efficiency")
        self.keep(
            link,
            {
                "pressure": gas.injector_pressure,
                "temperature": gas.temperature,
                "density": gas.injector_pressure / (gas_constant * gas.temperature),
                "sound_speed": np.sqrt(gas.isentropic_exponent * gas_constant * gas.temperature),
                "isentropic_exponent": gas.isentropic_exponent,
                "gas_constant": gas_constant,
                "molar_mass": GAS_CONSTANT / gas_constant,
                "stagnation_pressure": gas.stagnation_pressure,
                "characteristic_velocity": gas.characteristic_velocity,
                "cstar_efficiency": self.efficiency,
                "contraction_ratio": gas.contraction_ratio,
            },
        )

    def _asked(self, link: Calculation) -> tuple[Array | None, Array | None]:
        """Return the geometric area ratio or the exit pressure asked for."""
        given = [name for name in ("area_ratio", "exit_pressure") if name in link.inputs]
        if given == ["exit_pressure"]:
            ratio, pressure = None, self.array(link, "exit_pressure")
        else:
            ratio, pressure = (self.array(link, "area_ratio") if given else self._size_ratio(link)), None
            possible = (ratio >= 1.0) & (ratio <= 1e4)
            self.require(possible, "the area ratio is not between 1 and 10 000")
            ratio = np.where(possible, ratio, 10.0)
        return ratio, pressure

    def _expanded(self, link: Calculation, area_ratio: Array | None, pressure: Array | None) -> nozzle_stage.Expansion:
        values = link._values
        if self.quick is not None:
            found = self.quick.expand(
                self.reservoir, flow=values["flow"], exponent=values["exponent"], area_ratio=area_ratio, exit_pressure=pressure
            )
            self.slow_cases = found.slow
            return found.expansion
        return nozzle_stage.expand(
            self.reservoir,
            flow=values["flow"],
            freeze_at=values["freeze_at"],
            exponent=values["exponent"],
            area_ratio=area_ratio,
            exit_pressure=pressure,
        )

    def _nozzle(self, link: Calculation) -> None:
        discharge = self.array(link, "discharge_coefficient")
        ratio, pressure = self._asked(link)
        expansion = self._expanded(link, None if ratio is None else ratio / discharge, pressure)
        if pressure is not None:
            self.require(pressure <= expansion.throat.pressure, "the exit pressure is above the throat pressure")
        for place in ("throat", "exit", "inlet"):
            status = getattr(expansion, place).status
            self.require(status != 2, f"the {place} of the nozzle has no solution inside the range of the data")
            self.require(status == 0, f"the {place} of the nozzle did not converge")
        geometric = ratio if ratio is not None else expansion.area_ratio * discharge
        self._sized(link, expansion, geometric, discharge)

    def _size_ratio(self, link: Calculation) -> Array:
        lip, throat = (
            next(sizing.area_of(name, self.array(link, name)) for name in group if name in link.inputs)
            for group in (sizing.EXIT_SIZES, sizing.THROAT_SIZES)
        )
        ratio: Array = np.asarray(lip) / np.asarray(throat)
        return ratio

    def _sized(self, link: Calculation, expansion: nozzle_stage.Expansion, ratio: Array, discharge: Array) -> None:
        name = next(name for name in SIZES if name in link.inputs)
        ambient = link._values["sizing_ambient"]
        self.divergence = self._divergence(link, ratio)
        self.require(np.isfinite(self.divergence), "the contour does not fit that area ratio")
        sizes = sizing.size(
            name,
            self.array(link, name),
            mass_flux=expansion.mass_flux,
            area_ratio=ratio,
            exit_velocity=expansion.exit.velocity,
            exit_pressure=expansion.exit.pressure,
            ambient=ambient.pressure if ambient is not None else 0.0,
            discharge_coefficient=discharge,
            cstar_efficiency=self.efficiency,
            divergence_factor=self.divergence if name == "thrust" else 1.0,
        )
        self.require(sizes.throat_area > 0.0, "no size delivers that thrust at that ambient pressure")
        self.expansion, self.sizes = expansion, sizes
        self.keep(
            link,
            {
                "throat_area": sizes.throat_area,
                "exit_area": sizes.exit_area,
                "throat_diameter": np.sqrt(4.0 * sizes.throat_area / math.pi),
                "exit_diameter": np.sqrt(4.0 * sizes.exit_area / math.pi),
                "area_ratio": ratio,
                "mass_flow": sizes.mass_flow,
                "exit_pressure": expansion.exit.pressure,
                "characteristic_velocity": self.rest_pressure * sizes.throat_area / sizes.mass_flow,
            },
        )
        if name == "thrust":
            self.keep(link, {"thrust": self.array(link, name)})
        for place in ("inlet", "throat", "exit"):
            state = getattr(expansion, place)
            fields = {f"{place}.{name}": getattr(state, name, None) for name in STATE_FIELDS}
            self.keep(link, {name: values for name, values in fields.items() if values is not None})

    def _divergence(self, link: Calculation, ratio: Array) -> Array:
        """Return the divergence factor of the contour at each area ratio; 1 without a contour, NaN where none fits."""
        contour = link._values["contour"]
        if contour is None:
            return np.ones(self.count)
        factors: dict[float, float] = {}
        ratio = self.untouched(ratio)
        for each in np.unique(ratio).tolist():
            try:
                factors[each] = wall.divergence_factor(contour, each)
            except PropkitError:
                factors[each] = math.nan
        return np.array([factors[each] for each in ratio.tolist()])

    def _performance(self, link: Calculation) -> None:
        exit_state, sizes = self.expansion.exit, self.sizes
        given = self.inputs.get("performance.ambient")
        ambient = np.broadcast_to(link._values["ambient"].pressure if given is None else given, (self.count,))
        self.require(ambient < self.rest_pressure, "the ambient pressure is not below the stagnation pressure")
        lowest = link._values["minimum_pressure"]
        if lowest is not None:
            self.require(self.results["chamber.pressure"] >= lowest, "the chamber pressure is below the minimum_pressure")
        losses = link.resolved_losses.ratios  # type: ignore[attr-defined]
        delivered = performance_stage.deliver(
            mass_flow=sizes.mass_flow,
            exit_velocity=exit_state.velocity,
            exit_pressure=exit_state.pressure,
            exit_area=sizes.exit_area,
            throat_area=sizes.throat_area,
            stagnation_pressure=self.rest_pressure,
            ambient=ambient,
            cstar_efficiency=self.efficiency,
            divergence_factor=self.divergence,
            losses=losses,
        )
        self.keep(link, {name: getattr(delivered, name) for name in performance_stage.Delivery.__slots__})
        self.keep(link, {"ambient": ambient})
        if self.mixture is not None and np.isfinite(self.mixture.density).all():
            density_impulse = thrust.density_impulse(delivered.specific_impulse, self.mixture.density)
            self.keep(link, {"density_impulse": density_impulse})
        if self.ratio is not None:
            self.keep(
                link,
                {
                    "oxidizer_mass_flow": balances.oxidizer_mass_flow(delivered.mass_flow, self.ratio, self.additive_fraction),
                    "fuel_mass_flow": balances.fuel_mass_flow(delivered.mass_flow, self.ratio, self.additive_fraction),
                },
            )


class Probe(Batch):
    """The inputs of the quick engine over a sample of cases: nothing is solved."""

    basis = ""
    pressure: Array | None = None
    asked: tuple[Array | None, Array | None] = (None, None)
    served = True
    flow = ""
    contraction: Mapping[str, Any] = MappingProxyType({})

    def _chamber(self, link: Calculation) -> None:
        self.served &= type(link) is Chamber
        self.basis, self.pressure = self._basis(link), self.array(link, "pressure")
        self.contraction = {"contraction_ratio": self.array(link, "contraction_ratio"), "pressure_at": link._values["pressure_at"]}

    def _nozzle(self, link: Calculation) -> None:
        values = link._values
        self.flow = values["flow"]
        late = values["flow"] == "frozen" and values["freeze_at"] != "chamber"
        self.served &= values["flow"] in accelerated.FLOWS and not late
        ratio, pressure = self._asked(link)
        self.asked = (None if ratio is None else ratio / self.array(link, "discharge_coefficient"), pressure)

    def _gas(self, link: Calculation) -> None:
        self.served = False

    def _performance(self, link: Calculation) -> None:
        """Do nothing: it needs no guess."""

    def accelerator(self) -> Accelerator | None:
        """Return the quick engine for the box of these cases; None where it does not serve."""
        if not self.served or self.mixture is None or self.pressure is None or getattr(self, "additive_fraction", 0.0) is None:
            return None
        ratio, pressure = self.asked if self.flow == "shifting" else (None, None)
        return accelerated.prepare(self.mixture, self.basis, self.pressure, area_ratio=ratio, exit_pressure=pressure, **self.contraction)


_COVERED: OrderedDict[tuple[Any, ...], frozenset[str]] = OrderedDict()
_MOST_COVERED = 64


def batch_names(target: Calculation) -> frozenset[str]:
    """Return the whole paths of the results that the batch form of an object has; empty where it has none.

    They are compared with the object's own numbers first: where any differs, the batch form does not cover this recipe. The
    comparison is made once for each recipe: objects that differ in numbers only share it.
    """
    key = tuple((type(link).__qualname__, tuple((name, _told(link, name)) for name in link.inputs)) for link in target.chain())
    found = _COVERED.get(key)
    if found is None:
        found = _COVERED[key] = frozenset(_checked_batch(target))
        while len(_COVERED) > _MOST_COVERED:
            _COVERED.popitem(last=False)
    return found


def _told(link: Calculation, name: str) -> str:
    """Return what of an input makes a recipe another one: not the value of a number."""
    value, entry = link._values[name], link.declared_inputs[name]
    if isinstance(value, Calculation):
        return "upstream"
    if isinstance(entry, QuantityInput | NumberInput) and isinstance(value, int | float):
        return "infinite" if math.isinf(value) else "a number"
    return repr(link.inputs[name])


_AGREEMENT = 1e-9


def _checked_batch(target: Calculation) -> dict[str, float]:
    if not all(has_stage(link) for link in target.chain()):
        return {}
    try:
        with np.errstate(all="ignore"):
            batch = Batch(target, {}, 1)
    except (PropkitError, AttributeError, KeyError, TypeError):
        return {}
    found: dict[str, float] = {}
    if not batch.good.all():
        return {}
    links = {link.kind: link for link in target.chain()}
    for path, column in batch.results.items():
        kind, _, name = path.partition(".")
        value = float(np.broadcast_to(column, (1,))[0])
        try:
            known: Any = links[kind].si_of(name)
        except (NotAvailableError, AttributeError):
            continue
        known = getattr(known, "pressure", known)
        if known is None or not math.isfinite(value):
            continue
        if abs(value - float(known)) > _AGREEMENT * max(abs(value), abs(float(known)), 1e-300):
            return {}
        found[path] = value
    return found
