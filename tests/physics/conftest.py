"""Random combustion cases over every pair of the library, for the tests of the engine."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass, field

import numpy as np
import pytest

from propkit.data.propellants import library

VALENCES = {"C": 4.0, "H": 1.0, "Al": 3.0, "O": -2.0, "F": -1.0, "Cl": -1.0}


@dataclass
class Cases:
    """Cases that share their elements."""

    labels: list[str] = field(default_factory=list)
    atoms: list[list[float]] = field(default_factory=list)
    enthalpy: list[float] = field(default_factory=list)
    pressure: list[float] = field(default_factory=list)


def _atoms(name: str) -> tuple[dict[str, float], float]:
    row = library()[name]
    return {symbol: count / row.molar_mass for symbol, count in row.element_counts}, row.molar_enthalpy / row.molar_mass


def mixture(oxidizer: str, fuel: str, ratio: float) -> tuple[dict[str, float], float]:
    """Return atoms [mol/kg] and enthalpy [J/kg] of a mixture by mass."""
    share = ratio / (1.0 + ratio)
    atoms: dict[str, float] = {}
    enthalpy = 0.0
    for name, part in ((oxidizer, share), (fuel, 1.0 - share)):
        counts, h = _atoms(name)
        enthalpy += part * h
        for symbol, count in counts.items():
            atoms[symbol] = atoms.get(symbol, 0.0) + part * count
    return atoms, enthalpy


def stoichiometric(oxidizer: str, fuel: str) -> float:
    """Return the stoichiometric mixture ratio from valences."""
    need, supply = (sum(VALENCES.get(symbol, 0.0) * count for symbol, count in _atoms(name)[0].items()) for name in (fuel, oxidizer))
    return -need / supply


def draw(count: int, seed: int, pressure: tuple[float, float], equivalence: tuple[float, float]) -> Mapping[tuple[str, ...], Cases]:
    """Return random cases, log-uniform in pressure and equivalence ratio, by the elements they hold."""
    rows = library()
    oxidizers = [name for name, row in rows.items() if row.role == "oxidizer"]
    fuels = [name for name, row in rows.items() if row.role in ("fuel", "monopropellant")]
    random = np.random.default_rng(seed)
    found: dict[tuple[str, ...], Cases] = {}
    for _ in range(count):
        oxidizer, fuel = oxidizers[random.integers(len(oxidizers))], fuels[random.integers(len(fuels))]
        phi = float(np.exp(random.uniform(*np.log(equivalence))))
        atoms, enthalpy = mixture(oxidizer, fuel, stoichiometric(oxidizer, fuel) / phi)
        symbols = tuple(sorted(symbol for symbol, amount in atoms.items() if amount > 0.0))
        cases = found.setdefault(symbols, Cases())
        cases.labels.append(f"{oxidizer}/{fuel} at {phi:.3g}")
        cases.atoms.append([atoms[symbol] for symbol in symbols])
        cases.enthalpy.append(enthalpy)
        cases.pressure.append(float(np.exp(random.uniform(*np.log(pressure)))))
    return found


@pytest.fixture(scope="session")
def random_cases() -> Callable[..., Mapping[tuple[str, ...], Cases]]:
    return draw


@pytest.fixture(scope="session")
def mixed() -> Callable[[str, str, float], tuple[dict[str, float], float]]:
    return mixture
