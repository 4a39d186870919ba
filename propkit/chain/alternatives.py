"""Alternatives stage: the same hardware under other assumptions, in as few batches as the assumptions allow.

Variants that share species data and the meaning of the chamber pressure burn in one batch; those that also share a flow
model expand in one.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace
from typing import Any

import numpy as np

from propkit.chain import chamber, nozzle, performance
from propkit.chain.case import Mixture
from propkit.chain.chamber import Combustion
from propkit.chain.outcome import CONVERGED
from propkit.errors import PropkitError
from propkit.physics.arrays import Array
from propkit.physics.expansion_state import take_cases


@dataclass(frozen=True, slots=True)
class Gas:
    """A gas of constant properties: temperature at rest [K], gas constant [J/(kg K)], isentropic exponent."""

    temperature: float
    gas_constant: float
    isentropic_exponent: float


@dataclass(frozen=True, slots=True, eq=False)
class Variant:
    """One chain as its stages take it: what burns, how the pressure is read, how the gas flows, and the hardware.

    `source` is a mixture of one case with a basis, or a gas of constant properties. Areas are geometric [m2]; `losses` as for
    `performance.deliver`.
    """

    source: Mixture | Gas
    basis: str
    pressure: float
    contraction_ratio: float
    pressure_at: str
    cstar_efficiency: float
    flow: str
    freeze_at: str | float | None
    exponent: str | None
    discharge_coefficient: float
    throat_area: float
    area_ratio: float
    ambient: float
    divergence_factor: float
    losses: Mapping[str, float]


@dataclass(frozen=True, slots=True)
class Delivered:
    """What a variant delivers in SI, with its exit and stagnation pressure [Pa] and exit Mach number, or why not."""

    mass_flow: float
    specific_impulse: float
    thrust: float
    reason: str = ""
    thrust_coefficient: float = float("nan")
    exit_pressure: float = float("nan")
    exit_mach: float = float("nan")
    stagnation_pressure: float = float("nan")


def evaluate(variants: Sequence[Variant]) -> list[Delivered]:
    """Return what every variant delivers, in the order given; one without a solution says so and stops no other.

    Parameters
    ----------
    variants : sequence of Variant
        The alternatives.

    Returns
    -------
    list of Delivered
        SI values; NaN with a reason where a variant has no solution.
    """
    found: list[Delivered | None] = [None] * len(variants)
    for rows in _groups(variants, _burns_with):
        try:
            reservoir, good = _reservoir([variants[row] for row in rows])
        except PropkitError as error:
            _fail(found, rows, error.message)
            continue
        _fail(found, [row for row, fine in zip(rows, good, strict=True) if not fine], "the chamber has no solution")
        for part in _groups([variants[row] for row in rows], _flows_with):
            kept = [place for place in part if good[place]]
            if kept:
                members = [rows[place] for place in kept]
                try:
                    _expand([variants[row] for row in members], _take(reservoir, kept), members, found)
                except PropkitError as error:
                    _fail(found, members, error.message)
    return [entry if entry is not None else _nothing("not computed") for entry in found]


def _nothing(reason: str) -> Delivered:
    return Delivered(float("nan"), float("nan"), float("nan"), reason)


def _fail(found: list[Delivered | None], rows: Sequence[int], reason: str) -> None:
    for row in rows:
        found[row] = _nothing(reason)


def _groups(variants: Sequence[Variant], key: Any) -> list[list[int]]:
    groups: dict[Any, list[int]] = {}
    for row, variant in enumerate(variants):
        groups.setdefault(key(variant), []).append(row)
    return list(groups.values())


def _burns_with(variant: Variant) -> tuple[Any, ...]:
    source = variant.source
    if isinstance(source, Gas):
        return (variant.pressure_at,)
    held = tuple(source.composition) if source.composition is not None else None
    wide = np.isinf(variant.contraction_ratio)
    return (variant.basis, source.symbols, source.condensed, held, "" if wide else variant.pressure_at)


def _flows_with(variant: Variant) -> tuple[Any, ...]:
    freeze_at = variant.freeze_at
    if isinstance(freeze_at, float):
        freeze_at /= variant.discharge_coefficient
    return (variant.flow, freeze_at, variant.exponent)


def _column(variants: Sequence[Variant], name: str) -> Array:
    return np.array([getattr(variant, name) for variant in variants], dtype=np.float64)


def _reservoir(variants: Sequence[Variant]) -> tuple[Any, Array]:
    """Return the reservoirs of variants that burn together, and where there is one."""
    pressure, ratio = _column(variants, "pressure"), _column(variants, "contraction_ratio")
    pressure_at = variants[0].pressure_at
    sources = [variant.source for variant in variants]
    if isinstance(sources[0], Gas):
        properties = {name: np.array([getattr(source, name) for source in sources]) for name in Gas.__slots__}
        gas = chamber.given_gas(pressure=pressure, contraction_ratio=ratio, pressure_at=pressure_at, **properties)
        return gas, np.ones(len(variants), dtype=bool)
    mixtures = [source for source in sources if isinstance(source, Mixture)]
    found = chamber.combust(_joined(mixtures), variants[0].basis, pressure=pressure, contraction_ratio=ratio, pressure_at=pressure_at)
    status = (found.injector.status, found.stagnation.status, found.throat.status)
    good = np.all([np.asarray(part) == CONVERGED for part in status], axis=0)
    return replace(found, watched=None), good


def _joined(mixtures: Sequence[Mixture]) -> Mixture:
    first = mixtures[0]
    composition = None
    if first.composition is not None:
        composition = {
            name: np.concatenate([np.atleast_1d((mixture.composition or {})[name]) for mixture in mixtures]) for name in first.composition
        }
    columns = [np.concatenate([getattr(mixture, name) for mixture in mixtures]) for name in ("atoms", "enthalpy", "density")]
    return replace(first, atoms=columns[0], enthalpy=columns[1], density=columns[2], composition=composition)


def _take(reservoir: Any, places: Sequence[int]) -> Any:
    return take_cases(reservoir, np.array(places)) if isinstance(reservoir, Combustion) else _take_gas(reservoir, places)


def _take_gas(gas: chamber.GivenGas, places: Sequence[int]) -> chamber.GivenGas:
    rows = np.array(places)
    return replace(gas, **{name: getattr(gas, name)[rows] for name in type(gas).__slots__})


def _expand(variants: Sequence[Variant], reservoir: Any, rows: Sequence[int], found: list[Delivered | None]) -> None:
    flow, freeze_at, exponent = _flows_with(variants[0])
    discharge, ratio = _column(variants, "discharge_coefficient"), _column(variants, "area_ratio")
    throat_area, efficiency = _column(variants, "throat_area"), _column(variants, "cstar_efficiency")
    made = nozzle.expand(reservoir, flow=flow, freeze_at=freeze_at, exponent=exponent, area_ratio=ratio / discharge)
    good = (made.throat.status == CONVERGED) & (made.exit.status == CONVERGED)
    stagnation = reservoir.stagnation.pressure if isinstance(reservoir, Combustion) else reservoir.stagnation_pressure
    for place, row in enumerate(rows):
        if not good[place]:
            found[row] = _nothing("the expansion has no solution")
            continue
        one = variants[place]
        delivered = performance.deliver(
            mass_flow=discharge[place] * made.mass_flux[place] * throat_area[place] / efficiency[place],
            exit_velocity=made.exit.velocity[place],
            exit_pressure=made.exit.pressure[place],
            exit_area=throat_area[place] * ratio[place],
            throat_area=throat_area[place],
            stagnation_pressure=stagnation[place],
            ambient=one.ambient,
            cstar_efficiency=efficiency[place],
            divergence_factor=one.divergence_factor,
            losses=one.losses,
        )
        found[row] = Delivered(
            mass_flow=float(delivered.mass_flow),
            specific_impulse=float(delivered.specific_impulse),
            thrust=float(delivered.thrust),
            thrust_coefficient=float(delivered.thrust_coefficient),
            exit_pressure=float(made.exit.pressure[place]),
            exit_mach=float(made.exit.mach[place]),
            stagnation_pressure=float(stagnation[place]),
        )
