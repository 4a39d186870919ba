"""Cold exits and held compositions: no overflow on the way to a doubt, and no doubt about next to nothing."""

from __future__ import annotations

import pytest

import propkit as pk


@pytest.mark.parametrize("area_ratio", [50, 10_000])
def test_a_trace_of_carbon_vapour_in_a_held_composition_is_no_doubt(area_ratio):
    chamber = pk.Chamber(pk.PropellantCase("NTO", "MMH", mixture_ratio=1.9), pressure="2.4 MPa")
    nozzle = pk.Nozzle(chamber, area_ratio=area_ratio, throat_diameter="0.05 m", flow="frozen")
    doubts = [entry for entry in nozzle.warnings if entry.code == "supersaturation"]
    assert not [entry for entry in doubts if "carbon" in entry]
    # a third of the gas is water, and at 116 K its vapour pressure is next to nothing
    assert bool(doubts) is (area_ratio == 10_000)


def test_a_branch_beside_a_pressure_is_not_ignored():
    chamber = pk.Chamber(pk.PropellantCase("LOX", "LH2", mixture_ratio=5.5), pressure="7 MPa")
    nozzle = pk.Nozzle(chamber, area_ratio=20, throat_diameter="0.1 m")
    with pytest.raises(pk.InputError, match="`branch` is 'subsonic'"):
        nozzle.at(pressure="100 kPa", branch="subsonic")
