"""How far a gas is from the ideal gas that the chain takes it for: compressibility, choked flow, saturation.

CoolProp's equation of state supplies the numbers; they are the price of the ideal-gas assumption of a cold gas.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Any

from propkit.bridge.stored_state import open_fluid
from propkit.constants import GAS_CONSTANT
from propkit.data.propellant_row import PropellantRow
from propkit.errors import RangeError

_SCANNED = 60
_LOWEST_RATIO = 0.25
_VANISHING_PRESSURE = 10.0


@dataclass(frozen=True, slots=True)
class RealGasPrice:
    """What the ideal-gas assumption costs at the inlet of a nozzle.

    Parameters
    ----------
    compressibility : float
        p M / (rho R T) at the inlet [1]; 1 for the ideal gas.
    mass_flow_ratio : float
        Choked mass flux of the real gas over that of the ideal gas with the same heat capacities [1].
    saturation_ratio : float
        Inlet pressure over vapour pressure [1]; above 1 the gas would condense. 0 above the critical temperature.
    """

    compressibility: float
    mass_flow_ratio: float
    saturation_ratio: float


def real_gas_price(row: PropellantRow, temperature: float, pressure: float) -> RealGasPrice:
    """Return what taking a gas as ideal costs.

    Parameters
    ----------
    row : PropellantRow
        A gas that CoolProp has.
    temperature, pressure : float
        Stagnation state at the nozzle inlet [K], [Pa].

    Returns
    -------
    RealGasPrice
        Compressibility, ratio of the choked mass fluxes, saturation ratio.

    Raises
    ------
    RangeError
        When CoolProp has no state there.
    MissingExtraError
        When CoolProp is not installed.

    Notes
    -----
    The choked mass flux is the maximum of rho u along the isentrope, u from the enthalpy: homogeneous flow, a state
    inside the two-phase dome in equilibrium. The ideal gas is the same calculation at 10 Pa, scaled with pressure.
    """
    fluid = open_fluid(row)
    real, compressibility = _real_mass_flux(fluid, row, temperature, pressure)
    ideal = _real_mass_flux(fluid, row, temperature, _VANISHING_PRESSURE)[0] * pressure / _VANISHING_PRESSURE
    return RealGasPrice(compressibility, real / ideal, pressure / vapour_pressure(row, temperature))


def vapour_pressure(row: PropellantRow, temperature: float) -> float:
    """Return the vapour pressure of a fluid.

    Parameters
    ----------
    row : PropellantRow
        A propellant that CoolProp has.
    temperature : float
        Temperature [K].

    Returns
    -------
    float
        Vapour pressure [Pa]; infinite above the critical temperature. Below the range of the equation of state it is
        extrapolated by Clausius-Clapeyron from the two lowest temperatures (over the supercooled liquid).

    Notes
    -----
    ln p is linear in 1/T between nearby states: the slope there is the heat of vaporisation over R.
    """
    import CoolProp

    fluid = open_fluid(row)
    if temperature >= fluid.T_critical():
        return math.inf
    lowest = max(fluid.Ttriple(), fluid.Tmin())
    if temperature >= lowest:
        fluid.update(CoolProp.QT_INPUTS, 0.0, temperature)
        return float(fluid.p())
    ends = []
    for point in (lowest * 1.0001, lowest * 1.05):
        fluid.update(CoolProp.QT_INPUTS, 0.0, point)
        ends.append((1.0 / point, math.log(fluid.p())))
    slope = (ends[1][1] - ends[0][1]) / (ends[1][0] - ends[0][0])
    return math.exp(ends[0][1] + slope * (1.0 / temperature - ends[0][0]))


def _real_mass_flux(fluid: Any, row: PropellantRow, temperature: float, pressure: float) -> tuple[float, float]:
    """Return the largest rho u along the isentrope [kg/(m2 s)] and the compressibility at the inlet."""
    import CoolProp

    try:
        fluid.update(CoolProp.PT_INPUTS, pressure, temperature)
    except ValueError as error:
        raise RangeError(
            f"{row.name} has no state at {temperature:g} K and {pressure / 1e5:.4g} bar: CoolProp says: {error}.",
            temperature=temperature,
            pressure=pressure,
        ) from error
    enthalpy, entropy = fluid.hmass(), fluid.smass()
    compressibility = pressure * fluid.molar_mass() / (fluid.rhomass() * GAS_CONSTANT * temperature)
    fluxes = []
    for step in range(1, _SCANNED + 1):
        ratio = 1.0 - (1.0 - _LOWEST_RATIO) * step / _SCANNED
        try:
            fluid.update(CoolProp.PSmass_INPUTS, ratio * pressure, entropy)
        except ValueError:
            break
        fluxes.append(fluid.rhomass() * math.sqrt(max(2.0 * (enthalpy - fluid.hmass()), 0.0)))
    largest = _peak(fluxes)
    if largest is None:
        raise RangeError(f"The isentrope of {row.name} leaves CoolProp's range before the throat.", temperature=temperature)
    return largest, float(compressibility)


def _peak(values: list[float]) -> float | None:
    """Return the maximum of evenly spaced values, by a parabola through the largest three; None at an end."""
    at = max(range(len(values)), key=values.__getitem__, default=-1)
    if at < 1 or at == len(values) - 1:
        return None
    left, middle, right = values[at - 1 : at + 2]
    bend = left - 2.0 * middle + right
    return middle - (right - left) ** 2 / (8.0 * bend) if bend < 0.0 else middle
