"""The price of the ideal gas: compressibility, choked flow and saturation of stored gases."""

import sys

import pytest

from propkit.bridge.real_gas import real_gas_price, vapour_pressure
from propkit.data.propellants import library
from propkit.errors import InputError, MissingExtraError, RangeError

pytest.importorskip("CoolProp")
ROWS = library()
GASES = [name for name, row in ROWS.items() if "cold gas" in row.roles and row.phase == "gas" and row.coolprop_fluid != "Air"]


@pytest.mark.parametrize("name", GASES)
def test_at_low_pressure_a_gas_is_ideal(name):
    price = real_gas_price(ROWS[name], 298.15, 1000.0)
    assert price.compressibility == pytest.approx(1.0, abs=4e-4)
    assert price.mass_flow_ratio == pytest.approx(1.0, abs=2e-4)


@pytest.mark.parametrize(("name", "exponent"), [("GHe", 5 / 3), ("argon", 5 / 3), ("GN2", 1.4)])
def test_the_choked_flux_is_that_of_gas_dynamics(name, exponent):
    """Constant exponent: monatomic 5/3 exactly, nitrogen 1.400 near room temperature."""
    import math

    from propkit.bridge.real_gas import _real_mass_flux
    from propkit.bridge.stored_state import open_fluid

    row = ROWS[name]
    flux, _ = _real_mass_flux(open_fluid(row), row, 298.15, 1e3)
    critical = (2 / (exponent + 1)) ** ((exponent + 1) / (2 * (exponent - 1)))
    expected = 1e3 / math.sqrt(8.314462618 / row.molar_mass * 298.15) * math.sqrt(exponent) * critical
    assert flux == pytest.approx(expected, rel=1e-4)


@pytest.mark.parametrize(
    ("name", "temperature", "pressure", "compressibility", "tolerance"),
    [  # second virial coefficients from memory: N2 -4.7, Ar -15.8, He +11.7, CO2 -124 cm3/mol at 298.15 K
        ("GN2", 298.15, 1e6, 1.0 - 4.7e-6 * 1e6 / (8.314462618 * 298.15), 6e-4),
        ("argon", 298.15, 1e6, 1.0 - 15.8e-6 * 1e6 / (8.314462618 * 298.15), 6e-4),
        ("GHe", 298.15, 1e6, 1.0 + 11.7e-6 * 1e6 / (8.314462618 * 298.15), 6e-4),
        ("CO2", 298.15, 1e5, 1.0 - 124e-6 * 1e5 / (8.314462618 * 298.15), 2e-4),
    ],
)
def test_compressibility_follows_the_second_virial_coefficient(name, temperature, pressure, compressibility, tolerance):
    assert real_gas_price(ROWS[name], temperature, pressure).compressibility == pytest.approx(compressibility, abs=tolerance)


def test_a_full_bottle_is_not_ideal():
    nitrogen = real_gas_price(ROWS["GN2"], 293.15, 20e6)
    assert nitrogen.compressibility == pytest.approx(1.05, abs=0.02)
    assert nitrogen.mass_flow_ratio > 1.04
    assert nitrogen.saturation_ratio == 0.0
    nitrous = real_gas_price(ROWS["N2O-gas"], 293.15, 4e6)
    assert nitrous.compressibility == pytest.approx(0.71, abs=0.02)
    assert 0.7 < nitrous.saturation_ratio < 0.9


@pytest.mark.parametrize(
    ("name", "temperature", "pressure", "within"),
    [  # handbook values from memory: normal boiling points, CO2 at 20 degC 57.3 bar, water at 25 degC 3.169 kPa
        ("GN2", 77.355, 101_325.0, 1e-3), ("argon", 87.302, 101_325.0, 1e-3), ("CO2", 293.15, 57.3e5, 2e-3),
        ("water", 298.15, 3169.0, 2e-3), ("N2O-gas", 293.15, 50.6e5, 5e-3),
    ],
)  # fmt: skip
def test_vapour_pressure(name, temperature, pressure, within):
    assert vapour_pressure(ROWS[name], temperature) == pytest.approx(pressure, rel=within)


@pytest.mark.parametrize("name", [name for name in GASES if name != "GHe"])
def test_vapour_pressure_goes_on_smoothly_below_the_range(name):
    row = ROWS[name]
    lowest = row.freezing_point
    just_above, just_below = vapour_pressure(row, lowest + 0.02), vapour_pressure(row, lowest - 0.02)
    assert just_below < just_above
    assert just_below == pytest.approx(just_above, rel=0.05)
    assert 0.0 < vapour_pressure(row, 0.6 * lowest) < just_below


def test_above_the_critical_temperature_nothing_condenses():
    assert vapour_pressure(ROWS["GN2"], 300.0) == float("inf")


def test_states_that_do_not_exist_are_refused():
    with pytest.raises(RangeError, match="GN2 has no state at 30 K"):
        real_gas_price(ROWS["GN2"], 30.0, 1e5)


def test_a_gas_without_an_equation_of_state_or_without_coolprop(monkeypatch):
    with pytest.raises(InputError, match="a fluid that CoolProp knows"):
        real_gas_price(ROWS["natural gas"], 300.0, 1e6)
    monkeypatch.setitem(sys.modules, "CoolProp.CoolProp", None)
    with pytest.raises(MissingExtraError):
        real_gas_price(ROWS["GN2"], 300.0, 1e6)
