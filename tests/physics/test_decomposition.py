"""Decomposed hydrazine: atoms, and the temperatures that Cantera finds for its composition."""

import cantera as ct
import pytest
from hypothesis import given
from hypothesis import strategies as st

from propkit.data.propellants import library
from propkit.errors import InputError
from propkit.physics.decomposition import hydrazine_products


@given(st.floats(0.0, 1.0))
def test_atoms_are_those_of_hydrazine(x):
    made = hydrazine_products(x)
    nitrogen = made.get("NH3", 0.0) + 2.0 * made["N2"]
    hydrogen = 3.0 * made.get("NH3", 0.0) + 2.0 * made.get("H2", 0.0)
    assert nitrogen == pytest.approx(2.0, rel=1e-12)
    assert hydrogen == pytest.approx(4.0, rel=1e-12)


@pytest.mark.parametrize(("x", "temperature"), [(0.0, 1646.0), (0.6, 1187.0), (1.0, 868.0)])
def test_adiabatic_temperature(x, temperature):
    """Cantera's nasa_gas.yaml at the enthalpy of liquid hydrazine at 298.15 K; 10 K: common practice, no source."""
    wanted = ("NH3", "N2", "H2")
    species = [entry for entry in ct.Species.list_from_file("nasa_gas.yaml") if entry.name in wanted]
    gas = ct.Solution(thermo="ideal-gas", species=species)
    gas.TPX = 1000.0, 2e6, hydrazine_products(x)
    gas.HP = library()["hydrazine"].specific_enthalpy, 2e6
    found = gas.T
    assert found == pytest.approx(temperature, abs=10.0)


@pytest.mark.parametrize("x", [-0.1, 1.1, float("nan")])
def test_fraction_outside_is_refused(x):
    with pytest.raises(InputError, match="ammonia_dissociation"):
        hydrazine_products(x)
