import pytest

import propkit as pk


@pytest.fixture(scope="session")
def perf():
    case = pk.PropellantCase("LOX", "LCH4", mixture_ratio=3.4)
    chamber = pk.Chamber(case, pressure="9.7 MPa", contraction_ratio=3)
    nozzle = pk.Nozzle(chamber, area_ratio=35, throat_diameter="0.18 m")
    return pk.Performance(nozzle, ambient="sea level", name="Test engine")


@pytest.fixture(scope="session")
def record(perf):
    return perf.record(title="Test engine, first estimate", author="A. Analyst", purpose="To be recomputed", notes="None.")


@pytest.fixture(scope="session")
def gas_record():
    chamber = pk.Chamber.from_gas(pressure="2 MPa", temperature="3000 K", molar_mass="22 g/mol", isentropic_exponent=1.2)
    return pk.Performance(pk.Nozzle(chamber, exit_pressure="20 kPa", mass_flow="3 kg/s"), ambient="12 km").record()
