"""Transport properties of the chamber gas at rest: Cantera's, or Bartz's estimate for a gas without composition."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

from propkit.constants import GAS_CONSTANT
from propkit.errors import NotAvailableError
from propkit.physics import heat_transfer

if TYPE_CHECKING:
    from propkit.model.nozzle import Nozzle


@dataclass(frozen=True, slots=True)
class GasAtRest:
    """Viscosity [Pa s], heat capacities [J/(kg K)] and Prandtl number of the gas at rest at the nozzle inlet.

    `equilibrium_specific_heat` is None where the gas has none, `source` says where the numbers come from, `doubt` what to
    doubt of them (empty for nothing).
    """

    viscosity: float
    specific_heat: float
    prandtl: float
    temperature: float
    equilibrium_specific_heat: float | None
    source: str
    doubt: str = ""


def gas_at_rest(nozzle: Nozzle, estimate: bool = False) -> GasAtRest:
    """Return the transport properties of the gas at rest at the nozzle inlet.

    Parameters
    ----------
    nozzle : Nozzle
        The nozzle.
    estimate : bool
        Whether to fall back on Bartz's estimate where the gas has no transport data.

    Raises
    ------
    NotAvailableError
        Where too much of the gas has no transport data and no estimate is wanted.
    """
    reservoir: Any = nozzle.chamber.held
    case = nozzle.chamber.case_or_none
    if case is None:
        return estimated_gas(nozzle)
    rest = reservoir.stagnation
    temperature = float(rest.temperature[0])
    heat = float(rest.specific_heat[0])
    amounts = rest.amounts[0]
    table = reservoir.table
    fractions = {name: float(value) for name, value in zip(table.names, amounts / amounts.sum(), strict=True)}
    from propkit.bridge.transport import SOURCE, mixture_transport

    try:
        found = mixture_transport(temperature, float(rest.pressure[0]), fractions, str(case.si("thermo_basis")))
    except NotAvailableError:
        if not estimate:
            raise
        return estimated_gas(nozzle)
    return GasAtRest(
        found.viscosity, found.specific_heat, found.prandtl, temperature, heat if math.isfinite(heat) else None, SOURCE, found.doubt
    )


def estimated_gas(nozzle: Nozzle) -> GasAtRest:
    """Return Bartz's estimates of the transport properties from molar mass and exponent of the gas at rest."""
    reservoir: Any = nozzle.chamber.held
    rest = getattr(reservoir, "stagnation", None)
    if rest is not None:
        gamma, molar_mass = float(rest.frozen_isentropic_exponent[0]), float(rest.molar_mass[0])
        frozen_heat, heat, temperature = (
            float(getattr(rest, name)[0]) for name in ("frozen_specific_heat", "specific_heat", "temperature")
        )
    else:
        gamma, gas_constant = float(reservoir.isentropic_exponent[0]), float(reservoir.gas_constant[0])
        molar_mass, temperature = GAS_CONSTANT / gas_constant, float(reservoir.temperature[0])
        frozen_heat = heat = gamma / (gamma - 1.0) * gas_constant
    return GasAtRest(
        float(heat_transfer.estimated_viscosity(molar_mass, temperature)),
        frozen_heat,
        float(heat_transfer.estimated_prandtl(gamma)),
        temperature,
        heat if math.isfinite(heat) else None,
        "bartz-1957",
        "Viscosity and Prandtl number are Bartz's estimates from molar mass and exponent: the gas has no transport data.",
    )
