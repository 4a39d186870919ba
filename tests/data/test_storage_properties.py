"""Densities, heat capacities, freezing and boiling points of the library against the tables that `chemicals` stores.

Sources: Perry's Chemical Engineers' Handbook 8th ed. and the VDI Heat Atlas (density correlations), the CRC Handbook
(solid densities, heat capacities), all as stored in `chemicals`. Densities agree within 0.6 % (1.5 % for solids, whose
grade differs), heat capacities within 1 %, boiling points within 1 K, freezing points within 2 K; the rest is listed.
"""

import importlib.util
from pathlib import Path

import pytest

from propkit.data.propellants import library

chemicals = pytest.importorskip("chemicals")

_spec = importlib.util.spec_from_file_location("enthalpies", Path(__file__).with_name("test_assigned_enthalpies.py"))
_enthalpies = importlib.util.module_from_spec(_spec)
_spec.loader.exec_module(_enthalpies)
CAS = {name: cas for name, cas in _enthalpies.CAS.items() if library()[name].phase != "gas"}

BOILING = {
    "MMH": (360.8, "chemicals has 356.15 K; 360.8 K (87.6 degC) from memory is the value of propellant handbooks"),
    "paraffin": (None, "it is not boiled; the row has none"),
    "RDX": (None, "it decomposes"),
    "HMX": (None, "it decomposes"),
    "AN": (None, "it decomposes"),
}
FREEZING = {
    "hydrogen peroxide": (272.72, "chemicals 1.5.2 has 252.9 K, the value of a solution; -0.43 degC from memory"),
}
SLOPE = {
    "NTO": (-2.3, "the VDI correlation gives -1.5; 1447 kg/m3 at 20 degC and 1403 at 38 degC (from memory) give -2.4"),
}
"""Rows whose value is not that of the tables: the value, and the reason."""


def densities(cas, temperature):
    """Return the densities of the correlations that know the fluid [kg/m3]."""
    from chemicals import volume

    found = {}
    perry, vdi = volume.rho_data_Perry_8E_105_l, volume.rho_data_VDI_PPDS_2
    if cas in perry.index and cas != "7732-18-5":  # the water row of that table is another equation
        row = perry.loc[cas]
        moles = row.C1 / row.C2 ** (1.0 + (1.0 - temperature / row.C3) ** row.C4)
        found["Perry"] = float(moles) * chemicals.MW(cas) * 1e-3
    if cas in vdi.index:
        row = vdi.loc[cas]
        t = 1.0 - temperature / row["Tc"]
        found["VDI"] = float(row["rhoc"] + row["A"] * t**0.35 + row["B"] * t ** (2 / 3) + row["C"] * t + row["D"] * t ** (4 / 3))
    return found


@pytest.mark.parametrize("name", list(CAS))
def test_density_of_a_liquid(name):
    row = library()[name]
    if row.phase != "liquid":
        return
    for source, density in densities(CAS[name], row.density_temperature or row.temperature).items():
        assert row.density == pytest.approx(density, rel=6e-3), source


def test_enough_densities_are_checked():
    checked = [name for name in CAS if library()[name].phase == "liquid" and densities(CAS[name], 298.15)]
    assert len(checked) >= 14


@pytest.mark.parametrize(("name", "within"), [("AP", 0.015), ("AN", 0.015), ("Al", 0.015)])
def test_density_of_a_solid(name, within):
    from chemicals import volume

    volume_of_a_mole = float(volume.rho_data_CRC_inorg_s_const.loc[CAS[name], "Vm"])
    assert library()[name].density == pytest.approx(chemicals.MW(CAS[name]) * 1e-3 / volume_of_a_mole, rel=within)


@pytest.mark.parametrize("name", [name for name in CAS if library()[name].density_slope])
def test_slope_of_the_density(name):
    """Slopes are recalled; 15 % of them is 0.4 % of the density over 30 K."""
    row = library()[name]
    if name in SLOPE:
        assert row.density_slope == SLOPE[name][0]
        return
    low, high = densities(CAS[name], 288.15), densities(CAS[name], 308.15)
    for source in low:
        assert row.density_slope == pytest.approx((high[source] - low[source]) / 20.0, rel=0.15), source


@pytest.mark.parametrize("name", [name for name in CAS if library()[name].heat_capacity])
def test_heat_capacity(name):
    from chemicals import heat_capacity

    row = library()[name]
    table = heat_capacity.CRC_standard_data
    if CAS[name] not in table.index:
        return
    value = float(table.loc[CAS[name], "Cps" if row.phase == "solid" else "Cpl"])
    if value == value:
        assert row.heat_capacity * row.molar_mass == pytest.approx(value, rel=0.01)


@pytest.mark.parametrize("name", list(CAS))
def test_boiling_point(name):
    row = library()[name]
    if name in BOILING:
        assert row.boiling_point == BOILING[name][0]
    elif (value := chemicals.Tb(CAS[name])) is not None:
        assert row.boiling_point == pytest.approx(value, abs=1.0)


@pytest.mark.parametrize("name", list(CAS))
def test_freezing_point(name):
    row = library()[name]
    value = chemicals.Tm(CAS[name])
    if name in FREEZING:
        assert row.freezing_point == FREEZING[name][0]
    elif value is not None and row.freezing_point is not None:
        assert row.freezing_point == pytest.approx(value, abs=2.0)
