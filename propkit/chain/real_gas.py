"""Doubts about a cold gas that is taken as ideal: each with what it costs, through CoolProp where that is installed."""

from __future__ import annotations

import math
from collections.abc import Iterator
from importlib.util import find_spec
from typing import Final

import numpy as np

from propkit.bridge import real_gas
from propkit.chain.nozzle import Expansion
from propkit.chain.warnings import times
from propkit.data.propellant_row import PropellantRow
from propkit.errors import RangeError
from propkit.physics import expansion as flows
from propkit.physics.arrays import Array

NOTED: Final = 0.01
"""Departure of compressibility or mass flow from the ideal gas above which it is worth a warning [1]."""

_POINTS: Final = 40


def inlet_doubts(row: PropellantRow, temperature: float, pressure: float) -> Iterator[tuple[str, str, str]]:
    """Yield text, code and subject of the doubts about a gas at the nozzle inlet.

    Parameters
    ----------
    row : PropellantRow
        The gas.
    temperature, pressure : float
        Stagnation state at the nozzle inlet [K], [Pa].
    """
    reason = _not_known(row)
    if reason:
        yield f"{reason}: neither compressibility nor saturation of {row.name} is known here.", "real-gas", "density"
        return
    try:
        price = real_gas.real_gas_price(row, temperature, pressure)
    except RangeError as error:
        yield f"The real gas is not known at the inlet. {error.message}", "real-gas", "density"
        return
    if abs(price.compressibility - 1.0) > NOTED or abs(price.mass_flow_ratio - 1.0) > NOTED:
        yield (
            f"{row.name} is no ideal gas at the inlet: its compressibility is {price.compressibility:.3f}, and the real gas would pass "
            f"{100.0 * abs(price.mass_flow_ratio - 1.0):.1f} % {'more' if price.mass_flow_ratio > 1.0 else 'less'} mass flow than computed.",
            "real-gas",
            "density",
        )
    if price.saturation_ratio > 1.0:
        yield (
            f"{row.name} is a liquid at the inlet: the pressure is {price.saturation_ratio:.3g} times its vapour pressure at "
            f"{temperature:.5g} K.",
            "saturation",
            "density",
        )


def flow_doubts(row: PropellantRow, found: Expansion) -> Iterator[tuple[str, str, str]]:
    """Yield text, code and subject of the doubt that the gas condenses in the nozzle.

    Parameters
    ----------
    row : PropellantRow
        The gas.
    found : Expansion
        A batch of one.

    Notes
    -----
    The price is the vacuum specific impulse that the expansion earns beyond the place where the vapour is saturated.
    """
    if _not_known(row):
        return
    pressures, temperatures = _along(found)
    ratios = np.array([_saturation(row, t, p) for t, p in zip(temperatures, pressures, strict=True)])
    last = float(ratios[-1])
    if last <= 1.0:
        return
    where = f"At the exit {row.name} is at {float(found.exit.temperature[0]):.4g} K and {times(last)} times its vapour pressure"
    dry = int(np.argmax(ratios > 1.0))
    if dry == 0:
        yield (
            f"{where}, and it is saturated from the inlet on: the flow is not that of a gas.",
            "saturation",
            "stations",
        )
        return
    low, high = np.log(np.maximum(ratios[dry - 1 : dry + 1], 1e-300))
    share = -low / (high - low)
    start = math.exp(math.log(pressures[dry - 1]) + share * math.log(pressures[dry] / pressures[dry - 1]))
    if start >= float(found.throat.pressure[0]):
        yield (
            f"{where}; it is saturated ahead of the throat: the mass flow too rests on its staying a gas.",
            "saturation",
            "stations",
        )
        return
    state = flows.at_pressure(found.isentrope, start, found.throat)
    ratio = float(found.mass_flux[0] / state.mass_flux[0])
    gained = 1.0 - _vacuum_velocity(found, state) / _vacuum_velocity(found, found.exit)
    yield (
        f"{where}. Saturation begins at area ratio {ratio:.3g}; the expansion beyond earns {100.0 * gained:.1f} % of the vacuum specific impulse, "
        f"which rests on the gas not condensing.",
        "saturation",
        "stations",
    )


def _along(found: Expansion) -> tuple[Array, Array]:
    """Return pressures [Pa] and temperatures [K] from the gas at rest to the exit."""
    rest, last = float(found.isentrope.pressure[0]), float(found.exit.pressure[0])
    pressures = np.geomspace(rest, last, _POINTS)
    batch = found.isentrope.take(np.zeros(_POINTS, dtype=np.intp))  # type: ignore[attr-defined]
    states = batch.at_pressure(np.minimum(pressures, rest))
    return pressures, states.temperature


def _saturation(row: PropellantRow, temperature: float, pressure: float) -> float:
    return pressure / real_gas.vapour_pressure(row, float(temperature))


def _vacuum_velocity(found: Expansion, state: flows.FlowState) -> float:
    """Return vacuum thrust over mass flow of a nozzle that ends at a state [m/s]."""
    return float(state.velocity[0] + state.pressure[0] / state.mass_flux[0])


def _not_known(row: PropellantRow) -> str:
    """Return why the real gas is not known, or an empty text."""
    if row.coolprop_fluid is None:
        return f"CoolProp has no equation of state of {row.name}"
    return "" if find_spec("CoolProp") is not None else "CoolProp is not installed (pip install 'propkit[fluids]')"
