"""What it costs to take a burnt gas as ideal: the same expansion with a cubic equation of state, at frozen composition.

Cantera's Redlich-Kwong phase, with the critical properties that Cantera ships, is put beside its ideal-gas phase of the same
species and data. Species without critical properties (radicals) are left out and the rest is scaled up. Every call makes
its own phases, so threads share nothing.
"""

from __future__ import annotations

import math
from collections.abc import Collection, Mapping
from dataclasses import dataclass
from typing import Any, Final

from scipy.optimize import brentq, minimize_scalar

from propkit.bridge.basis import load_basis
from propkit.constants import GAS_CONSTANT
from propkit.errors import NotAvailableError

REFUSE_ABOVE: Final = 0.30
"""Mole fraction of species without critical properties above which there is no answer."""

_TRACE: Final = 1e-4

CRITICAL: Final[Mapping[str, tuple[float, float]]] = {
    "Ar": (150.69, 4.863e6),
    "CH4": (190.56, 4.599e6),
    "C2H4": (282.35, 5.042e6),
    "CO": (132.86, 3.498e6),
    "CO2": (304.13, 7.377e6),
    "Cl2": (416.9, 7.99e6),
    "F2": (144.41, 5.240e6),
    "H2": (33.14, 1.296e6),
    "H2O": (647.10, 22.064e6),
    "HCl": (324.68, 8.314e6),
    "HF": (461.0, 6.48e6),
    "He": (5.2, 0.2283e6),
    "N2": (126.19, 3.396e6),
    "N2O": (309.52, 7.245e6),
    "NH3": (405.56, 11.363e6),
    "NO": (180.0, 6.48e6),
    "O2": (154.6, 5.046e6),
    "SO2": (430.64, 7.887e6),
}
"""Critical temperature [K] and pressure [Pa]: as in CoolProp's fluids to the digits given; Cl2, HF and NO from memory."""


@dataclass(frozen=True, slots=True)
class Departure:
    """How far a burnt gas is from ideal.

    Parameters
    ----------
    compressibility : float
        p M/(rho R T) at rest [1].
    mass_flow_ratio, velocity_ratio, exit_pressure_ratio : float
        Real over ideal: choked mass flow, velocity and pressure at the area ratio [1].
    left_out : float
        Mole fraction without critical properties.
    """

    compressibility: float
    mass_flow_ratio: float
    velocity_ratio: float
    exit_pressure_ratio: float
    left_out: float


def departure(
    temperature: float,
    pressure: float,
    mole_fractions: Mapping[str, float],
    area_ratio: float,
    thermo_basis: str,
    elements: tuple[str, ...],
) -> Departure:
    """Return what the ideal-gas assumption costs along a nozzle.

    Parameters
    ----------
    temperature, pressure : float
        Gas at rest [K], [Pa].
    mole_fractions : mapping
        Species key -> mole fraction.
    area_ratio : float
        Exit area over effective throat area [1], above 1.
    thermo_basis : str
        Name of the thermodynamic basis.
    elements : tuple of str
        Chemical symbols of the case.

    Returns
    -------
    Departure
        Real over ideal, both with composition held and the enthalpy of the ideal gas at rest.

    Raises
    ------
    NotAvailableError
        Where too much of the gas has no critical properties, or the cubic equation has no solution.

    Notes
    -----
    Against reference equations of state at 1000 to 2000 K and 20 MPa the departure Z - 1 of CO2, H2O, N2, O2 and H2 comes out
    with its sign and to some 40 % of its size: enough to say what the assumption costs, not to correct for it.

    Source
    ------
    O. Redlich, J. N. S. Kwong, Chem. Rev. 44 (1949) 233; Cantera.
    """
    shares = {key: share for key, share in mole_fractions.items() if share > _TRACE and key in CRITICAL}
    left_out = 1.0 - sum(shares.values())
    if left_out > REFUSE_ABOVE:
        raise NotAvailableError(f"{100.0 * left_out:.0f} % of the gas by moles has no critical properties for an equation of state")
    import cantera

    try:
        ideal, real = (
            _expand(_phase(kind, thermo_basis, elements, shares), temperature, pressure, shares, area_ratio)
            for kind in ("ideal-gas", "Redlich-Kwong")
        )
    except (cantera.CanteraError, ValueError) as error:
        raise NotAvailableError("the cubic equation of state has no solution along this nozzle") from error
    flow, velocity, exit_pressure = (theirs / ours for theirs, ours in zip(real[1:], ideal[1:], strict=True))
    return Departure(real[0], flow, velocity, exit_pressure, float(left_out))


def _phase(kind: str, thermo_basis: str, elements: tuple[str, ...], keys: Collection[str]) -> Any:
    """Return a fresh phase of the species with the thermodynamics of a basis and their critical properties."""
    import cantera

    made = []
    for plain in load_basis(thermo_basis).cantera_species(elements):
        if plain.name in keys:
            temperature, pressure = CRITICAL[plain.name]
            entry: Any = {
                "name": plain.name,
                "composition": dict(plain.composition),
                "critical-parameters": {"critical-temperature": temperature, "critical-pressure": pressure, "acentric-factor": 0.0},
            }
            coefficients = [float(value) for value in plain.thermo.coeffs]
            entry["thermo"] = {
                "model": "NASA7",
                "temperature-ranges": [plain.thermo.min_temp, coefficients[0], plain.thermo.max_temp],
                "data": [coefficients[8:15], coefficients[1:8]],
                "reference-pressure": plain.thermo.reference_pressure,
            }
            made.append(cantera.Species.from_dict(entry))
    return cantera.Solution(thermo=kind, kinetics="none", species=made)


def _expand(phase: Any, temperature: float, pressure: float, shares: Mapping[str, float], area_ratio: float) -> tuple[float, ...]:
    """Return compressibility at rest, choked mass flux, and velocity and pressure at the area ratio."""
    enthalpy = _enthalpy(phase, temperature, shares)
    phase.TPX = temperature, pressure, shares
    phase.HP = enthalpy, pressure
    entropy = phase.entropy_mass
    compressibility = pressure * phase.mean_molecular_weight * 1e-3 / (phase.density * GAS_CONSTANT * phase.T)

    def flux(log_ratio: float) -> float:
        phase.SP = entropy, pressure * math.exp(log_ratio)
        return float(phase.density * math.sqrt(max(2.0 * (enthalpy - phase.enthalpy_mass), 0.0)))

    throat = minimize_scalar(lambda x: -flux(x), bounds=(-1.1, -0.25), method="bounded", options={"xatol": 1e-7})
    largest = -float(throat.fun)
    there = brentq(lambda x: math.log(flux(x) * area_ratio / largest), float(throat.x), -4.0 - 2.2 * math.log(area_ratio), xtol=1e-9)
    phase.SP = entropy, pressure * math.exp(there)
    return compressibility, largest, math.sqrt(2.0 * (enthalpy - phase.enthalpy_mass)), float(phase.P)


def _enthalpy(phase: Any, temperature: float, shares: Mapping[str, float]) -> float:
    """Return the enthalpy of the gas where it is ideal [J/kg]."""
    phase.TPX = temperature, 1.0, shares
    return float(phase.enthalpy_mass)
