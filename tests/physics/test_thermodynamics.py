"""Species properties against Cantera's own evaluation, and what holds outside their range."""

from __future__ import annotations

import cantera
import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from propkit.bridge.basis import load_basis
from propkit.constants import GAS_CONSTANT

TABLE = load_basis("tm4513").table(("C", "H", "N", "O"))


@pytest.mark.parametrize("temperature", [200.0, 298.15, 999.0, 1001.0, 3000.0, 5000.0])
def test_properties_are_those_of_cantera_inside_the_range(temperature: float) -> None:
    """Source: Cantera's evaluation of the same coefficients. Tolerance: rounding of sums with terms near 1e2."""
    properties = TABLE.properties(temperature)
    inside = (TABLE.temperature_low <= temperature) & (temperature <= TABLE.temperature_high)
    for row, species in enumerate(load_basis("tm4513").cantera_species(TABLE.elements)):
        if inside[row]:
            thermo = species.thermo
            assert properties.heat_capacity[0, row] == pytest.approx(thermo.cp(temperature) / cantera.gas_constant, rel=1e-12)
            enthalpy = thermo.h(temperature) / cantera.gas_constant / temperature
            assert properties.enthalpy[0, row] == pytest.approx(enthalpy, rel=1e-12, abs=1e-12)
            assert properties.entropy[0, row] == pytest.approx(thermo.s(temperature) / cantera.gas_constant, rel=1e-12)


def test_steam_has_the_tabulated_entropy_at_one_bar() -> None:
    """Source: JANAF tables, H2O(g) 298.15 K, 0.1 MPa: 188.834 J/(mol K) (from memory). Tolerance: its last digits."""
    entropy = TABLE.properties(298.15).entropy[0, TABLE.names.index("H2O")] * GAS_CONSTANT
    assert entropy == pytest.approx(188.834, abs=0.01)


@settings(deadline=None, max_examples=60)
@given(st.floats(20.0, 9000.0))
def test_identities_hold_inside_and_outside_the_range(temperature: float) -> None:
    """dh = cp dT and ds = cp dT/T, from central differences; tolerance: their truncation and rounding.

    The polynomials of big molecules jump by up to 1e-4 of R T where their halves meet, so steps across an edge are left out.
    """
    step = 1e-4 * temperature
    if np.abs(TABLE.breakpoints - temperature).min() < 2.0 * step:
        return
    low, here, high = (TABLE.properties(temperature + shift) for shift in (-step, 0.0, step))
    dh = (high.enthalpy * (temperature + step) - low.enthalpy * (temperature - step)) / (2.0 * step)
    ds = (high.entropy - low.entropy) / (2.0 * step) * temperature
    np.testing.assert_allclose(dh, here.heat_capacity, rtol=1e-6, atol=1e-6)
    np.testing.assert_allclose(ds, here.heat_capacity, rtol=1e-6, atol=1e-6)
    np.testing.assert_allclose(here.gibbs_energy, here.enthalpy - here.entropy, atol=1e-12)


def test_heat_capacity_is_held_outside_the_range() -> None:
    at_limit, below = TABLE.properties(TABLE.temperature_low.max()), TABLE.properties(50.0)
    oxygen = TABLE.names.index("O2")
    assert below.heat_capacity[0, oxygen] == TABLE.properties(200.0).heat_capacity[0, oxygen]
    high = TABLE.properties(9000.0)
    assert high.heat_capacity[0, oxygen] == pytest.approx(TABLE.properties(6000.0).heat_capacity[0, oxygen], rel=1e-12)
    edges = TABLE.temperature_low
    assert np.all(np.diff([TABLE.properties(t).enthalpy[0, oxygen] * t for t in np.linspace(20.0, 400.0, 200)]) > 0.0)
    assert at_limit.heat_capacity.shape == (1, edges.size)


def test_a_batch_equals_its_single_cases() -> None:
    temperatures = np.array([60.0, 250.0, 999.9, 1000.1, 2500.0, 5500.0, 8000.0])
    whole = TABLE.properties(temperatures)
    for row, temperature in enumerate(temperatures):
        for part, single in zip(whole, TABLE.properties(temperature), strict=True):
            np.testing.assert_allclose(part[row], single[0], rtol=1e-13, atol=1e-13)


def test_part_keeps_the_species_that_can_form() -> None:
    part, rows = TABLE.part(np.array([False, True, False, True]))
    assert part.elements == ("H", "O")
    assert set(part.names) == {"H", "H2", "HO2", "H2O", "H2O2", "O", "OH", "O2", "O3"}
    assert [TABLE.names[row] for row in rows] == list(part.names)
    assert TABLE.part(np.array([False, True, False, True]))[0] is part


def test_arrays_cannot_be_written() -> None:
    with pytest.raises(ValueError, match="read-only"):
        TABLE.segments[0, 0, 0] = 1.0
