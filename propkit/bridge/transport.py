"""Viscosity, conductivity and Prandtl number of a burnt gas, by Cantera's mixture-averaged model.

The transport data are those that Cantera ships with `gri30.yaml` (C, H, O, N and argon species); the heat capacities
are those of the thermodynamic basis. Species without transport data are left out and the rest is scaled up: a small
share of them is a doubt, a large share a refusal. Every call makes its own Cantera phase, so threads share nothing.
"""

from __future__ import annotations

import re
from collections.abc import Mapping
from dataclasses import dataclass
from functools import lru_cache
from typing import Any, Final

from propkit.errors import InputError, NotAvailableError, Problem

WARN_ABOVE: Final = 0.02
"""Mole fraction of species without transport data above which the answer carries a doubt."""

REFUSE_ABOVE: Final = 0.10
"""Mole fraction of species without transport data above which there is no answer."""

SOURCE: Final = "Cantera, mixture-averaged transport, with the species data of gri30.yaml (GRI-Mech 3.0 transport database)."

_OTHER_NAMES: Final = {
    "Ar": "AR",
    "C2H2 (acetylene)": "C2H2",
    "C2H3 (vinyl)": "C2H3",
    "C3H7 (n-propyl)": "C3H7",
    "C3H7 (i-propyl)": "C3H7",
    "CH2CO (ketene)": "CH2CO",
    "CHCO (ketyl)": "HCCO",
    "CH3CHO (ethanal)": "CH3CHO",
    "HCHO (formaldehyde)": "CH2O",
}
"""Species key -> name in the transport data, where the two differ."""

_NUMBERS: Final = (
    "diameter",
    "well_depth",
    "rotational_relaxation",
    "dipole",
    "polarizability",
    "acentric_factor",
    "dispersion_coefficient",
    "quadrupole_polarizability",
)
"""The numbers of one species' transport data, as Cantera names them, SI units."""

_TRACE: Final = 1e-9
"""Mole fraction below which a species is passed over."""


@dataclass(frozen=True, slots=True)
class Transport:
    """Transport properties of a gas at one state.

    Parameters
    ----------
    viscosity : float
        Dynamic viscosity [Pa s].
    conductivity : float
        Thermal conductivity at frozen composition [W/(m K)].
    specific_heat : float
        Frozen heat capacity of the species that have transport data [J/(kg K)].
    prandtl : float
        mu cp/k with that heat capacity.
    left_out : float
        Mole fraction of species without transport data.
    left_out_species : tuple of str
        Their keys, the most abundant first.
    """

    viscosity: float
    conductivity: float
    specific_heat: float
    prandtl: float
    left_out: float
    left_out_species: tuple[str, ...]

    @property
    def doubt(self) -> str:
        """What to say beside the number; empty where next to nothing is left out."""
        if self.left_out <= WARN_ABOVE:
            return ""
        return (
            f"Transport properties leave out {100.0 * self.left_out:.1f} % of the gas by moles, which has no transport "
            f"data: {', '.join(self.left_out_species[:4])}."
        )


def mixture_transport(
    temperature: float, pressure: float, mole_fractions: Mapping[str, float], thermo_basis: str = "tm4513+atct"
) -> Transport:
    """Return viscosity, conductivity and Prandtl number of a gas of given composition.

    Parameters
    ----------
    temperature : float
        Temperature [K], above 0.
    pressure : float
        Pressure [Pa], above 0.
    mole_fractions : mapping
        Species key (as in a chamber's composition) -> mole fraction, 0 or more; condensed species count as left out.
    thermo_basis : str
        Name of the thermodynamic basis of the heat capacities.

    Returns
    -------
    Transport
        The properties, with what was left out.

    Raises
    ------
    InputError
        For a temperature, pressure or composition that is none.
    NotAvailableError
        Where more than a tenth of the gas has no transport data.

    Notes
    -----
    Wilke's rule for viscosity and Mathur's for conductivity, as Cantera implements them; pressure does not matter.
    The model's conductivity of steam is 23 % above the reference correlation at 1000 K (viscosity within 8 %), so
    Prandtl numbers of gases rich in steam come out low and Bartz's coefficient up to some 10 % high.

    Source
    ------
    Cantera; GRI-Mech 3.0 transport data; 2 % and 10 % are limits of this toolkit.
    """
    total = _checked_total(temperature, pressure, mole_fractions)
    shares = {key: float(share) / total for key, share in mole_fractions.items() if share > _TRACE * total}
    missing = {key: share for key, share in shares.items() if _name(key) not in _parameters()}
    left_out = sum(missing.values())
    ordered = tuple(sorted(missing, key=lambda key: -missing[key]))
    if left_out > REFUSE_ABOVE:
        raise NotAvailableError(
            f"{100.0 * left_out:.1f} % of the gas by moles has no transport data ({', '.join(ordered[:4])}); above "
            f"{100.0 * REFUSE_ABOVE:g} % there are no transport properties and no heat flux. Data exist for carbon, "
            "hydrogen, oxygen, nitrogen and argon species only.",
            left_out=left_out,
            species=ordered,
        )
    kept = {key: share for key, share in shares.items() if key not in missing}
    phase = _phase(tuple(kept), thermo_basis)
    phase.TPX = temperature, pressure, kept
    viscosity, conductivity, heat = float(phase.viscosity), float(phase.thermal_conductivity), float(phase.cp_mass)
    return Transport(viscosity, conductivity, heat, viscosity * heat / conductivity, left_out, ordered)


def _checked_total(temperature: float, pressure: float, mole_fractions: Mapping[str, float]) -> float:
    problems = []
    if not 0.0 < temperature < 1e5:
        problems.append(Problem("temperature", f"{temperature:g} K", "above 0"))
    if not 0.0 < pressure < 1e12:
        problems.append(Problem("pressure", f"{pressure:g} Pa", "above 0"))
    total = float(sum(mole_fractions.values()))
    if not 0.0 < total < 1e12 or any(not share >= 0.0 for share in mole_fractions.values()):
        problems.append(Problem("mole_fractions", f"with sum {total:g}", "0 or more each, above 0 in all"))
    if problems:
        raise InputError(problems)
    return total


def _name(key: str) -> str:
    return _OTHER_NAMES.get(key, key)


@lru_cache(maxsize=1)
def _parameters() -> Mapping[str, tuple[str, tuple[float, ...]]]:
    """Return geometry and numbers of the transport data by species name; numbers only, no Cantera object is kept."""
    import cantera

    found = {}
    for species in cantera.Species.list_from_file("gri30.yaml"):
        data = species.transport
        if data is not None:
            found[species.name] = (str(data.geometry), tuple(float(getattr(data, name)) for name in _NUMBERS))
    return found


def _phase(keys: tuple[str, ...], thermo_basis: str) -> Any:
    """Return a fresh Cantera phase of the species with the thermodynamics of a basis and the transport data."""
    import cantera

    from propkit.bridge.basis import load_basis

    basis = load_basis(thermo_basis)
    species = basis.cantera_species(_elements(keys))
    chosen = [each for each in species if each.name in keys]
    make: Any = cantera.GasTransportData
    for each in chosen:
        geometry, numbers = _parameters()[_name(each.name)]
        each.transport = make(geometry=geometry, **dict(zip(_NUMBERS, numbers, strict=True)))
    return cantera.Solution(thermo="ideal-gas", transport_model="mixture-averaged", species=chosen)


def _elements(keys: tuple[str, ...]) -> tuple[str, ...]:
    """Return the chemical symbols that occur in formula keys."""
    symbols = {symbol for key in keys for symbol in re.findall(r"[A-Z][a-z]?", key.split(" (")[0])}
    return tuple(sorted(symbols))
