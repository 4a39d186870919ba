"""Separation: the criteria by hand, the altitude of full flow, and an estimate that is marked as one."""

from __future__ import annotations

import math

import numpy as np
import pytest

import propkit as pk
from propkit.physics import atmosphere


@pytest.fixture(scope="module")
def perf(case):
    nozzle = pk.Nozzle(pk.Chamber(case, pressure="9.7 MPa"), area_ratio=60, throat_diameter="0.18 m", contour=pk.Bell(length=0.8))
    return pk.Performance(nozzle, ambient="sea level")


def test_three_criteria_stand_side_by_side(perf):
    """Summerfield et al. (1954): 0.4 pa; Kalt & Badal (1965): 2/3 pa (p0/pa)^-0.2; Schmucker (1973): pa (1.88 M - 1)^-0.64."""
    table, pa, lip = perf.separation, 101325.0, perf.nozzle.exit
    by_hand = {
        "summerfield": 0.4 * pa,
        "kalt-badal": 2.0 / 3.0 * pa * (9.7e6 / pa) ** -0.2,
        "schmucker": pa * (1.88 * lip.si("mach") - 1.0) ** -0.64,
    }
    assert list(table.index) == list(by_hand)
    for name, pressure in by_hand.items():
        assert table.loc[name, "pressure"] == pytest.approx(pressure, rel=1e-12), name
        assert table.loc[name, "separates"] == (lip.si("pressure") < pressure)


def test_at_its_ambient_limit_a_criterion_is_just_met(perf):
    for name, limit in perf.separation["ambient_limit"].items():
        for factor, separates in ((0.999, False), (1.001, True)):
            there = perf.replace(ambient=factor * limit).separation
            assert bool(there.loc[name, "separates"]) is separates, name
        at = perf.replace(ambient=limit).separation
        assert at.loc[name, "pressure"] == pytest.approx(perf.nozzle.exit.si("pressure"), rel=1e-9)


def test_the_nozzle_flows_full_from_the_altitude_of_that_pressure(perf):
    for limit, altitude in zip(perf.separation["ambient_limit"], perf.separation["altitude"], strict=True):
        assert float(atmosphere.pressure(altitude)) == pytest.approx(limit, rel=1e-6)


def test_the_thrust_stays_full_flowing_and_the_estimate_is_marked(perf):
    doubts = {doubt.code: doubt for doubt in perf.own_warnings}
    assert "all three criteria" in doubts["separation"]
    assert "side loads" in doubts["separation"]
    assert doubts["separation"].about == "thrust"
    lip, nozzle = perf.nozzle.exit, perf.nozzle
    full = nozzle.divergence_factor * perf.si("mass_flow") * lip.si("velocity") + (lip.si("pressure") - 101325.0) * nozzle.si("exit_area")
    assert perf.si("thrust") == pytest.approx(full, rel=1e-12)
    separated = perf.thrust_separated.to("N").magnitude
    assert perf.si("thrust") < separated < perf.si("thrust_vacuum")
    assert separated == pytest.approx(float(np.median(perf.separation["thrust"])), rel=1e-12)
    assert "estimate" in str(perf)


def test_the_place_of_separation_is_where_wall_and_separation_pressure_meet(perf):
    """With the contour the place is on the wall; without it the area ratio is the same to the spacing of the stations."""
    table = perf.separation
    bare = perf.replace({"nozzle.contour": None}).separation
    for name in table.index:
        ratio, x = table.loc[name, "area_ratio"], table.loc[name, "position"]
        state = perf.nozzle.at(area_ratio=ratio)
        wanted = {
            "summerfield": 0.4 * 101325.0,
            "kalt-badal": table.loc[name, "pressure"],
            "schmucker": 101325.0 * (1.88 * state.si("mach") - 1.0) ** -0.64,
        }[name]
        assert state.si("pressure") == pytest.approx(wanted, rel=1e-3), name
        wall = perf.nozzle.contour
        radius = float(np.interp(x, wall["x"], wall["r"]))
        assert (radius / 0.09) ** 2 == pytest.approx(ratio, rel=2e-3), name
        assert bare.loc[name, "area_ratio"] == pytest.approx(ratio, rel=2e-3), name
        assert math.isnan(bare.loc[name, "position"])


def test_where_most_criteria_find_full_flow_there_is_no_separated_thrust(perf):
    for ambient in ("vacuum", "20 km"):
        high = perf.replace(ambient=ambient)
        assert not [doubt for doubt in high.own_warnings if doubt.code == "separation"]
        assert not high.separation["separates"].any()
        with pytest.raises(pk.NotAvailableError, match="flow full"):
            _ = high.thrust_separated


def test_one_criterion_of_three_makes_it_possible(case):
    nozzle = pk.Nozzle(pk.Chamber(case, pressure="9.7 MPa"), exit_pressure="38 kPa", throat_diameter="0.18 m")
    perf = pk.Performance(nozzle, ambient="sea level")
    (doubt,) = [doubt for doubt in perf.own_warnings if doubt.code == "separation"]
    assert doubt.startswith("Separation is possible: 1 of 3 criteria")


def test_an_exit_that_is_not_supersonic_has_no_such_separation():
    chamber = pk.Chamber.from_gas(pressure="2 bar", temperature=300, molar_mass="28 g/mol", isentropic_exponent=1.4)
    perf = pk.Performance(pk.Nozzle(chamber, area_ratio=1, throat_diameter="1 cm"), ambient="sea level")
    with pytest.raises(pk.NotAvailableError, match="not supersonic"):
        _ = perf.separation
    assert "Separation at" not in str(perf)


@pytest.mark.parametrize(("exponent", "ratio"), [(1.2, 2.0), (1.4, 2.0), (1.4, 2.5), (1.25, 1.0)])
def test_a_throat_that_is_not_choked_is_a_doubt_about_the_mass_flow(exponent, ratio):
    # first critical pressure ratio from the area law of NACA Report 1135, equations 44 and 80, solved by hand here
    from scipy.optimize import brentq

    def area(mach):
        inside = 2.0 / (exponent + 1.0) * (1.0 + 0.5 * (exponent - 1.0) * mach**2)
        return inside ** (0.5 * (exponent + 1.0) / (exponent - 1.0)) / mach

    mach = brentq(lambda m: area(m) - ratio, 1e-6, 1.0) if ratio > 1.0 else 1.0
    critical = (1.0 + 0.5 * (exponent - 1.0) * mach**2) ** (-exponent / (exponent - 1.0))
    gas = {"temperature": "1200 K", "molar_mass": "20 g/mol", "isentropic_exponent": exponent}
    for factor, choked in ((1.01, True), (0.99, False)):
        chamber = pk.Chamber.from_gas(pressure=factor * 101325.0 / critical, **gas)
        perf = pk.Performance(pk.Nozzle(chamber, area_ratio=ratio, throat_diameter="0.1 m"), ambient="sea level")
        assert any(doubt.code == "not-choked" for doubt in perf.warnings) is not choked
