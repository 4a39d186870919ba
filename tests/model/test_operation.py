"""Operation: the altitude profile, the throttle map and the burn against objects and arithmetic of their own."""

from __future__ import annotations

import numpy as np
import pytest

import propkit as pk

G0 = 9.80665


@pytest.fixture(scope="module")
def perf(case):
    nozzle = pk.Nozzle(pk.Chamber(case, pressure="9.7 MPa"), area_ratio=20, throat_diameter="0.18 m", contour=pk.Bell())
    return pk.Performance(nozzle, ambient="sea level", losses={"kinetics": 0.99})


def test_the_altitude_profile_is_continuous_and_rises_to_vacuum(perf):
    profile = perf.altitude_profile()
    assert profile.index[0] == 0.0
    assert profile.index[-1] == 100e3
    assert profile["thrust"].iloc[0] == pytest.approx(perf.si("thrust"), rel=1e-12)
    assert profile["thrust"].iloc[-1] == pytest.approx(perf.si("thrust_vacuum"), rel=1e-6)
    for name in ("thrust", "specific_impulse", "thrust_coefficient"):
        steps = np.diff(profile[name])
        assert (steps > 0.0).all(), name
        assert (steps[1:] < 1.02 * steps[:-1]).all(), name
    log = np.log(profile["optimum_area_ratio"].dropna())
    assert (np.diff(log) > 0.0).all()
    assert np.abs(np.diff(log, 2)).max() < 0.05
    assert profile.attrs["units"]["thrust"] == "N"


def test_the_profile_is_that_of_performances_at_those_altitudes(perf):
    """Losses cost the same thrust at every altitude, so the loss-free nozzle is compared with objects of its own."""
    free = perf.replace(losses=None)
    profile = free.altitude_profile()
    for kilometres in (0, 7, 12, 40, 86):
        other = free.replace(ambient=f"{kilometres} km")
        row = profile.loc[1e3 * kilometres]
        for name in ("thrust", "specific_impulse", "thrust_coefficient"):
            assert row[name] == pytest.approx(other.si(name), rel=1e-9), (kilometres, name)
        if kilometres <= 40:
            fitted = other.replace({"nozzle.contour": None, "nozzle.area_ratio": row["optimum_area_ratio"]})
            assert fitted.nozzle.exit.si("pressure") == pytest.approx(row["ambient_pressure"], rel=1e-6)


def test_the_optimum_area_ratio_gives_most_thrust(perf):
    best = perf.altitude_profile().loc[10e3, "optimum_area_ratio"]
    there = perf.replace({"performance.losses": None, "nozzle.contour": None, "performance.ambient": "10 km"})
    thrusts = [there.replace({"nozzle.area_ratio": factor * best}).si("thrust") for factor in (0.8, 1.0, 1.25)]
    assert thrusts[1] == max(thrusts)


def test_the_throttle_map_is_that_of_objects_with_the_same_hardware(perf):
    free = perf.replace(losses=None)
    found = free.throttle_map(pressure=["4 MPa", "9.7 MPa"], mixture_ratio=[3.0, 3.4]).frame
    assert len(found) == 4
    for _, row in found.iterrows():
        other = free.replace({"chamber.pressure": row["pressure"], "case.mixture_ratio": row["mixture_ratio"]})
        for name in ("thrust", "specific_impulse", "mass_flow", "thrust_coefficient"):
            assert row[name] == pytest.approx(other.si(name), rel=1e-8), name
        assert row["exit_pressure"] == pytest.approx(other.nozzle.exit.si("pressure"), rel=1e-8)
    assert found["thrust_share"].iloc[-1] == pytest.approx(1.0, rel=1e-9)


def test_the_full_flow_pressure_is_where_the_middle_criterion_turns(perf):
    found = perf.throttle_map()
    limit = found.si("full_flow_pressure")
    at = perf.replace({"chamber.pressure": limit}).separation["ambient_limit"]
    assert float(np.median(at)) == pytest.approx(101325.0, rel=1e-3)
    table = found.frame
    assert (table["flows_full_at_sea_level"] == (table["pressure"] >= limit)).all()
    assert found.full_flow_pressure.to("MPa").magnitude == pytest.approx(1e-6 * limit)


def test_a_sized_nozzle_keeps_its_size_when_throttled(case):
    nozzle = pk.Nozzle.sized_for(pk.Chamber(case, pressure="9.7 MPa"), thrust="400 kN", ambient="sea level", area_ratio=20)
    row = pk.Performance(nozzle, ambient="sea level").throttle_map(pressure="5 MPa").frame.iloc[0]
    fixed = pk.Nozzle(pk.Chamber(case, pressure="5 MPa"), area_ratio=20, throat_area=nozzle.si("throat_area"))
    assert row["thrust"] == pytest.approx(pk.Performance(fixed, ambient="sea level").si("thrust"), rel=1e-8)


def test_below_its_minimum_pressure_a_chamber_is_refused(perf):
    known = perf.replace(minimum_pressure="3 MPa")
    assert known.minimum_pressure.to("MPa").magnitude == 3.0
    with pytest.raises(pk.InputError, match="minimum_pressure"):
        known.replace({"chamber.pressure": "2.9 MPa"})
    with pytest.raises(pk.InputError, match="minimum_pressure"):
        known.throttle_map(pressure=["2 MPa", "5 MPa"])
    with pytest.raises(pk.InputError, match="minimum_pressure"):
        perf.throttle_map(pressure=["2 MPa"], minimum_pressure="3 MPa")
    assert known.throttle_map().frame["pressure"].min() >= 3e6


def test_a_burn_by_hand(perf):
    burn = perf.burn(duration="150 s", ullage="5 %", residuals="2 %")
    flow = perf.si("mass_flow")
    loaded = 150.0 * flow / 0.98
    assert burn.si("propellant_mass") == pytest.approx(loaded, rel=1e-13)
    assert burn.si("oxidizer_mass") == pytest.approx(loaded * 3.4 / 4.4, rel=1e-12)
    assert burn.si("oxidizer_mass") + burn.si("fuel_mass") == pytest.approx(loaded, rel=1e-13)
    density = float(perf.case.held.fuel.density)
    assert burn.si("fuel_tank_volume") == pytest.approx(loaded / 4.4 / density / 0.95, rel=1e-12)
    assert burn.si("total_impulse") == pytest.approx(150.0 * perf.si("specific_impulse") * flow * G0, rel=1e-12)
    again = perf.burn(total_impulse=burn.total_impulse, ullage=0.05, residuals=0.02)
    assert again.duration.to("s").magnitude == pytest.approx(150.0, rel=1e-12)
    assert burn.propellant_mass.to("kg").magnitude == pytest.approx(loaded)
    assert "fuel tank volume" in str(burn)
    assert "text/html" in burn._repr_mimebundle_()


def test_a_burn_of_one_propellant_has_one_tank():
    case = pk.PropellantCase.monopropellant("hydrazine", ammonia_dissociation=0.6)
    perf = pk.Performance(pk.Nozzle(pk.Chamber(case, pressure="2 MPa"), area_ratio=50, throat_diameter="5 mm"), ambient="vacuum")
    burn = perf.burn(duration="100 s", ullage=0, residuals=0)
    assert burn.si("propellant_tank_volume") == pytest.approx(100.0 * perf.si("mass_flow") / case.si("bulk_density"), rel=1e-12)
    with pytest.raises(pk.NotAvailableError):
        _ = burn.fuel_mass
    with pytest.raises(pk.InputError, match="mixture ratio"):
        perf.throttle_map(mixture_ratio=[1.0])


@pytest.mark.parametrize(
    ("ask", "words"),
    [
        (lambda perf: perf.burn(), "Give one of the two"),
        (lambda perf: perf.burn(duration="1 s", total_impulse="1 kN*s"), "Give one of the two"),
        (lambda perf: perf.burn(duration="-1 s"), "above 0"),
        (lambda perf: perf.burn(duration="1 s", ullage=0.7), "ullage"),
        (lambda perf: perf.throttle_map(pressure=[]), "at least one"),
        (lambda perf: perf.throttle_map(pressure="1 Pa"), "pressure"),
        (lambda perf: perf.throttle_map(mixture_ratio=-2), "mixture_ratio"),
        (lambda perf: perf.throttle_map(pressure=np.linspace(1e6, 2e6, 6000)), "at most 5000"),
    ],
)
def test_impossible_questions_are_refused_in_words(perf, ask, words):
    with pytest.raises(pk.InputError, match=words):
        ask(perf)
