"""Both data bases on the chambers of every pair of propellants."""

from __future__ import annotations

import chemicals
import numpy as np
import pytest

from propkit.bridge.basis import load_basis
from propkit.constants import GAS_CONSTANT
from propkit.data.enthalpy_updates import enthalpy_updates
from propkit.physics import equilibrium

UPDATES = {update.species: update for update in enthalpy_updates()}

CAS = {
    "H2O": "7732-18-5", "CO": "630-08-0", "CO2": "124-38-9", "CH4": "74-82-8", "NO": "10102-43-9", "NO2": "10102-44-0",
    "HO2": "3170-83-0", "O": "17778-80-2", "H": "12385-13-6", "N": "17778-88-0", "C2H4": "74-85-1", "C2H6": "74-84-0",
    "C2H2 (acetylene)": "74-86-2", "HCO": "2597-44-6", "HNO2": "7782-77-6", "O3": "10028-15-6", "C": "7440-44-0",
    **{species: update.cas for species, update in UPDATES.items()},
}  # fmt: skip
NOT_IN_THE_TABLES = {"H2", "O2", "N2", "C5", "C6H2", "C4N2", "C4", "C2H2 (vinylidene)", "CH3CN", "CNC", "COOH", "HCOOH",
                     "C3H5 (allyl)"}  # fmt: skip
"""Elements in their reference state, and species that the package has no ATcT value for."""


def test_the_list_is_complete(random_cases) -> None:  # type: ignore[no-untyped-def]
    """Every C/H/O/N gas above 1e-5 in some chamber of the pairs is within 0.3 kJ/mol of ATcT, or is in the list."""
    base = load_basis("tm4513")
    for symbols, cases in random_cases(1500, 8, (1e5, 3e7), (0.3, 3.0)).items():
        table = base.table(symbols)
        state = equilibrium.solve(table, cases.atoms, pressure=cases.pressure, enthalpy=cases.enthalpy)
        largest = state.mole_fractions.max(axis=0)
        enthalpy = table.properties(298.15).enthalpy[0] * GAS_CONSTANT * 298.15
        for row in np.flatnonzero(largest > 1e-5):
            present = {symbol for symbol, count in zip(symbols, table.composition[row], strict=True) if count}
            name = table.names[row]
            if present <= set("CHON") and name not in UPDATES and name not in NOT_IN_THE_TABLES:
                tables = chemicals.Hfg(CAS[name], method="ATCT_G")
                assert enthalpy[row] == pytest.approx(tables, abs=300.0), name


@pytest.mark.parametrize(("name", "temperature"), [("tm4513", 3728.58), ("tm4513+atct", 3723.88)])
def test_both_bases_on_a_known_case(mixed, name: str, temperature: float) -> None:  # type: ignore[no-untyped-def]
    """LOX/RP-1 at 10 MPa and 2.6. Source: the project's SCIENCE page, computed independently. Tolerance: its digits."""
    atoms, enthalpy = mixed("LOX", "RP-1", 2.6)
    table = load_basis(name).table(("C", "H", "O"))
    state = equilibrium.solve(table, [[atoms[symbol] for symbol in "CHO"]], pressure=1e7, enthalpy=enthalpy)
    assert state.temperature[0] == pytest.approx(temperature, abs=0.02)
