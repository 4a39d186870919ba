"""Replacing inputs by path: what names one input twice, or an object that is displaced, is refused."""

from __future__ import annotations

import pytest

import propkit as pk


@pytest.fixture(scope="module")
def perf():
    case = pk.PropellantCase("LOX", "LCH4", mixture_ratio=3.4)
    nozzle = pk.Nozzle(pk.Chamber(case, pressure="7 MPa"), area_ratio=20, throat_diameter="0.1 m")
    return pk.Performance(nozzle, ambient="vacuum")


def test_one_input_under_two_paths_is_refused(perf):
    with pytest.raises(pk.InputError, match="same input"):
        perf.replace({"chamber.pressure": "8 MPa", "pressure": "9 MPa"})


def test_a_change_to_an_object_that_is_itself_replaced_is_refused(perf):
    other = pk.Chamber(perf.nozzle.chamber.case, pressure="5 MPa")
    with pytest.raises(pk.InputError, match="displaces"):
        perf.replace({"nozzle.chamber": other, "chamber.pressure": "8 MPa"})
    both = perf.replace({"nozzle.chamber": other, "ambient": "sea level"})
    assert both.nozzle.chamber == other
    assert both.inputs["ambient"] == "sea level"
