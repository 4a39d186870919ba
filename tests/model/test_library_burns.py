"""Every row of the library with a role in combustion solves, at low and high pressure."""

import pytest

import propkit as pk
from propkit.data.propellants import library

ROWS = library()
OXIDIZERS = [name for name, row in ROWS.items() if "oxidizer" in row.roles and row.role != "ingredient"]
FUELS = [name for name, row in ROWS.items() if "fuel" in row.roles and row.role != "ingredient"]
OTHERS = ["AP", "AN", "RDX", "HMX", "isopropyl nitrate", "n-propyl nitrate"]
COLD = {"air": 2000.0}  # dilution by nitrogen keeps the flame of kerosene and air below the others [K]


def chamber(oxidizer, fuel, pressure, **amount):
    return pk.Chamber(pk.PropellantCase(oxidizer, fuel, **amount), pressure=pressure)


@pytest.mark.parametrize("pressure", ["1 MPa", "10 MPa"])
@pytest.mark.parametrize("name", OXIDIZERS)
def test_oxidizer_burns(name, pressure):
    temperature = chamber(name, "RP-1", pressure, equivalence_ratio=1.1).temperature.magnitude
    assert COLD.get(name, 2200.0) < temperature < 5200.0


@pytest.mark.parametrize("pressure", ["1 MPa", "10 MPa"])
@pytest.mark.parametrize("name", FUELS)
def test_fuel_burns(name, pressure):
    assert 2700.0 < chamber("LOX", name, pressure, equivalence_ratio=1.1).temperature.magnitude < 4500.0


@pytest.mark.parametrize("pressure", ["1 MPa", "10 MPa"])
@pytest.mark.parametrize("name", OTHERS)
def test_ingredient_burns(name, pressure):
    if "oxidizer" in ROWS[name].roles:
        made = chamber(pk.Propellant.from_library(name), "HTPB", pressure, equivalence_ratio=1.5)
    else:
        made = chamber("LOX", pk.Propellant.from_library(name).replace(role="fuel"), pressure, mixture_ratio=0.5)
    assert 1500.0 < made.temperature.magnitude < 4500.0


def test_a_heated_feed_is_hotter():
    pytest.importorskip("CoolProp")
    cold = chamber("LOX", "LCH4", "7 MPa", mixture_ratio=3.2)
    case = pk.PropellantCase("LOX", "LCH4", mixture_ratio=3.2, fuel_temperature="300 K", fuel_pressure="15 MPa")
    warm = pk.Chamber(case, pressure="7 MPa")
    assert 10.0 < warm.temperature.magnitude - cold.temperature.magnitude < 80.0
    assert any("supercritical" in text for text in case.warnings)


def test_own_propellant_equals_the_row():
    row = pk.Propellant.from_library("RP-1")
    own = pk.Propellant(formula="C H1.95", enthalpy="-24.717 kJ/mol", density="806 kg/m3", role="fuel")
    one, other = (chamber("LOX", fuel, "7 MPa", mixture_ratio=2.4) for fuel in (row, own))
    assert one.temperature.magnitude == pytest.approx(other.temperature.magnitude, rel=1e-12)
