"""Contours: geometry by hand, momentum against wall pressure with real flow, files, chamber size, refusals."""

from __future__ import annotations

import math
import pickle
import sys

import numpy as np
import pandas as pd
import pytest

import propkit as pk
from propkit.model import wall
from propkit.model.base import from_recipe
from propkit.physics import wall as walls

THROAT = 0.09


@pytest.fixture(scope="module")
def chamber(case):
    return pk.Chamber(case, pressure="9.7 MPa", contraction_ratio=3, characteristic_length="1 m")


@pytest.fixture(scope="module")
def belled(chamber):
    return pk.Nozzle(chamber, area_ratio=35, throat_diameter=2 * THROAT, contour=pk.Bell(length=0.8), wall_thickness="3 mm")


@pytest.fixture(scope="module")
def conical(case):
    chamber = pk.Chamber(case, pressure="9.7 MPa")
    return pk.Nozzle(chamber, area_ratio=35, throat_diameter=2 * THROAT, contour=pk.Cone("15 deg"))


@pytest.mark.parametrize("flow", ["shifting", "frozen", "constant-property"])
@pytest.mark.parametrize("contour", [pk.Bell(length=0.8), pk.Cone("20 deg")], ids=["bell", "cone"])
def test_momentum_balances_the_pressure_on_the_wall(chamber, flow, contour):
    """From p + rho u^2 at the nozzle inlet the wall pressure gives the exit momentum: conservation, 1e-6 (quadrature)."""
    nozzle = pk.Nozzle(chamber, area_ratio=35, throat_diameter=2 * THROAT, contour=contour, flow=flow)
    nodes = walls.quadrature(nozzle.geometry.segments)
    force = walls.wall_force(wall.flow_at(nozzle, nodes.x, nodes.r)["pressure"], nodes)
    inlet, lip = nozzle.inlet, nozzle.exit

    def impulse(state, area):
        return (state.si("pressure") + state.si("density") * state.si("velocity") ** 2) * area

    started = impulse(inlet, 3.0 * nozzle.si("throat_area"))
    assert started + force == pytest.approx(impulse(lip, nozzle.si("exit_area")), rel=1e-6)
    vacuum = pk.Performance(nozzle.replace(contour=None), ambient="vacuum").si("thrust")
    assert started + force == pytest.approx(vacuum, rel=1e-6)


def test_the_measures_of_a_cone_are_those_of_elementary_geometry(conical):
    """Arc of 0.382 Rt and a frustum, by hand; the divergence factor is (1 + cos 15 deg)/2 = 0.98296 (Sutton & Biblarz print 0.983)."""
    angle, arc, lip = math.radians(15.0), 0.382 * THROAT, THROAT * math.sqrt(35.0)
    x0, r0 = arc * math.sin(angle), THROAT + arc * (1.0 - math.cos(angle))
    x1 = x0 + (lip - r0) / math.tan(angle)
    assert conical.si("divergent_length") == pytest.approx(x1, rel=1e-12)
    assert conical.si("contour_length") == pytest.approx(x1, rel=1e-12)
    frustum = math.pi / 3.0 * (x1 - x0) * (r0**2 + r0 * lip + lip**2)
    slant = math.pi * (r0 + lip) * math.hypot(x1 - x0, lip - r0)
    turn = np.linspace(0.0, angle, 20001)
    radius = THROAT + arc * (1.0 - np.cos(turn))
    assert conical.si("contour_volume") == pytest.approx(frustum + np.trapezoid(math.pi * radius**2 * arc * np.cos(turn), turn), rel=1e-8)
    assert conical.si("wetted_area") == pytest.approx(slant + np.trapezoid(2.0 * math.pi * radius * arc, turn), rel=1e-8)
    assert conical.divergence_factor == pytest.approx(0.5 * (1.0 + math.cos(angle)), rel=1e-14)
    assert conical.divergence_factor == pytest.approx(0.983, abs=5e-4)


def test_a_bell_has_its_share_of_the_cone_and_the_angles_of_the_chart(belled, conical):
    """Length by definition; angles: chart of Rao (1960) between area ratios 30 and 40 at 80 %: 30.0 to 31.0 and 8.4 to 8.0 deg, from memory (1 deg)."""
    assert belled.si("divergent_length") == pytest.approx(0.8 * conical.si("divergent_length"), rel=1e-12)
    assert math.degrees(belled.si("throat_wall_angle")) == pytest.approx(30.5, abs=1.0)
    assert math.degrees(belled.si("lip_angle")) == pytest.approx(8.2, abs=1.0)
    chord = math.atan2(belled.si("exit_diameter") / 2 - THROAT, belled.si("divergent_length"))
    assert belled.divergence_factor == pytest.approx(0.5 * (1.0 + math.cos(0.5 * (chord + belled.si("lip_angle")))), rel=1e-12)


def test_the_contour_is_a_table_from_the_injector_face_to_the_lip(belled):
    frame = belled.contour
    assert list(frame.columns) == ["x", "r"]
    assert frame.attrs["units"] == {"x": "m", "r": "m"}
    assert (np.diff(frame["x"]) > 0.0).all()
    assert frame["r"].iloc[0] == pytest.approx(THROAT * math.sqrt(3.0), rel=1e-12)
    assert frame["r"].iloc[-1] == pytest.approx(belled.si("exit_diameter") / 2, rel=1e-9)
    narrowest = frame.loc[frame["r"].idxmin()]
    assert narrowest["x"] == pytest.approx(0.0, abs=1e-12)
    assert narrowest["r"] == pytest.approx(THROAT, rel=1e-12)
    frame.loc[0, "r"] = -1.0
    assert belled.contour["r"].iloc[0] > 0.0


def test_the_flow_along_the_wall_is_that_of_the_stations(belled):
    flow = belled.wall_flow
    assert np.isfinite(flow.drop(columns="x").to_numpy(dtype=float)).all()
    assert (np.diff(flow["pressure"]) <= 1e-6 * flow["pressure"].to_numpy()[:-1]).all()
    for place, state in ((0, belled.inlet), (int(flow["r"].idxmin()), belled.throat), (len(flow) - 1, belled.exit)):
        for name in ("pressure", "temperature", "mach", "isentropic_exponent"):
            assert flow[name].iloc[place] == pytest.approx(state.si(name), rel=1e-7), name


def test_the_chamber_holds_its_characteristic_length(belled, chamber):
    """L* = V/At and stay time V rho/m' (Sutton & Biblarz, chapter 8)."""
    assert belled.si("chamber_volume") == pytest.approx(1.0 * math.pi * THROAT**2, rel=1e-12)
    assert walls.volume(belled.geometry.upstream) == pytest.approx(belled.si("chamber_volume"), rel=1e-10)
    assert belled.si("contour_length") == pytest.approx(belled.si("chamber_length") + belled.si("divergent_length"), rel=1e-12)
    by_hand = belled.si("chamber_volume") * chamber.si("density") / belled.si("mass_flow")
    assert chamber.si("stay_time") == pytest.approx(by_hand, rel=1e-9)
    slower = chamber.replace(cstar_efficiency=0.9)
    assert slower.si("stay_time") == pytest.approx(0.9 * by_hand, rel=1e-9)


def test_a_thin_wall_weighs_its_area_times_its_thickness(belled):
    thin = belled.replace(wall_thickness="10 um", wall_density="1000 kg/m3")
    assert thin.si("wall_mass") == pytest.approx(1000.0 * 1e-5 * belled.si("wetted_area"), rel=1e-3)
    assert belled.wall_density.to("kg/m^3").magnitude == 8900.0
    assert belled.kind_of("wall_density") == "default"


def test_csv_and_dxf_hold_the_wall(belled, tmp_path):
    ezdxf = pytest.importorskip("ezdxf")
    table = pd.read_csv(belled.export_contour(tmp_path / "wall.csv"))
    assert list(table.columns) == ["x [m]", "r [m]"]
    assert np.allclose(table.to_numpy(), belled.contour.to_numpy(), rtol=1e-12, atol=1e-15)
    drawing = ezdxf.readfile(belled.export_contour(tmp_path / "wall.dxf"))
    assert drawing.header["$INSUNITS"] == 4
    space = drawing.modelspace()
    arcs, splines = list(space.query("ARC")), list(space.query("SPLINE"))
    assert sorted(arc.dxf.radius for arc in arcs) == pytest.approx([1e3 * f * THROAT for f in (0.382, 1.0, 1.5)])
    (bell,) = splines
    assert bell.dxf.degree == 2
    assert tuple(bell.control_points[-1])[:2] == pytest.approx((1e3 * belled.si("divergent_length"), 0.5e3 * belled.si("exit_diameter")))
    throat_arc = min(arcs, key=lambda arc: arc.dxf.radius)
    ends = [(p.x, p.y) for p in (throat_arc.start_point, throat_arc.end_point)]
    assert min(math.hypot(x, y - 1e3 * THROAT) for x, y in ends) == pytest.approx(0.0, abs=1e-9)


def test_dxf_without_its_package_names_the_install_line(belled, tmp_path, monkeypatch):
    monkeypatch.setitem(sys.modules, "ezdxf", None)
    with pytest.raises(pk.MissingExtraError, match=r"propkit\[cad\]"):
        belled.export_contour(tmp_path / "wall.dxf")
    with pytest.raises(pk.InputError, match=r"\.csv or \.dxf"):
        belled.export_contour(tmp_path / "wall.step")
    with pytest.raises(pk.StorageError):
        belled.export_contour(tmp_path / "missing" / "wall.csv")


def test_a_nozzle_sized_for_thrust_counts_the_divergence(case):
    chamber = pk.Chamber(case, pressure="9.7 MPa")
    nozzle = pk.Nozzle.sized_for(chamber, thrust="400 kN", ambient="sea level", area_ratio=20, contour=pk.Cone("15 deg"))
    assert pk.Performance(nozzle, ambient="sea level").si("thrust") == pytest.approx(400e3, rel=1e-12)


def test_contours_are_plain_values(belled):
    assert from_recipe(belled.recipe()) == belled
    assert pickle.loads(pickle.dumps(belled)) == belled
    assert eval(repr(belled), {"pk": pk}) == belled
    assert pk.Cone("15 deg") == pk.Cone(math.radians(15.0))
    assert belled.inputs["contour"] == pk.Bell(0.8)
    assert "bell of 80 % length" in str(belled)
    bare = belled.replace(contour=None, wall_thickness=None)
    with pytest.raises(pk.NotAvailableError, match="no contour"):
        _ = bare.contour
    with pytest.raises(pk.NotAvailableError, match="contour"):
        _ = bare.wall_mass
    assert not bare.has("divergence_factor")


def test_a_bell_beyond_the_chart_says_so(case):
    chamber = pk.Chamber(case, pressure="9.7 MPa")
    nozzle = pk.Nozzle(chamber, area_ratio=150, throat_diameter=0.1, contour=pk.Bell())
    assert [doubt.code for doubt in nozzle.own_warnings if doubt.about == "contour"] == ["contour-chart"]
    given = pk.Bell(length=0.8, throat_angle="34 deg", exit_angle="7 deg")
    assert not [doubt for doubt in nozzle.replace(contour=given).own_warnings if doubt.about == "contour"]


@pytest.mark.parametrize(
    ("changes", "words"),
    [
        ({"area_ratio": 1.05, "contour": pk.Cone("60 deg")}, "area_ratio"),
        ({"area_ratio": 500, "contour": pk.Bell()}, "2 to 400"),
        ({"contour": pk.Bell(length=0.3)}, "0.6 to 1"),
        ({"contour": "bell"}, "pk.Cone"),
        ({"contour": pk.Bell(), "wall_thickness": "-1 mm"}, "wall_thickness"),
        ({"contour": pk.Bell(), "wall_thickness": "200 mm"}, "wall_thickness"),
        ({"wall_thickness": "1 mm"}, "left out unless contour"),
        ({"contour": pk.Bell(), "wall_density": 8000}, "left out unless wall_thickness"),
    ],
)
def test_impossible_walls_are_refused_in_words(case, changes, words):
    typed = {"area_ratio": 35, "throat_diameter": 0.18, **changes}
    with pytest.raises(pk.InputError, match=words):
        pk.Nozzle(pk.Chamber(case, pressure="9.7 MPa"), **typed)


def test_impossible_contours_are_refused_in_words(chamber):
    with pytest.raises(pk.InputError, match="15 deg"):
        pk.Cone(15)
    with pytest.raises(pk.InputError, match="below the throat angle"):
        pk.Bell(throat_angle="10 deg", exit_angle="20 deg")
    with pytest.raises(TypeError, match="half_angle"):
        pk.Cone(half_angel="15 deg")
    with pytest.raises(pk.InputError, match="the convergent alone holds"):
        pk.Nozzle(chamber.replace(characteristic_length="5 cm"), area_ratio=35, throat_diameter=0.18, contour=pk.Bell())
