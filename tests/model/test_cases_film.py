"""Core and film: two streams side by side, combined by mass and momentum."""

import pickle

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

import propkit as pk
from propkit.model.base import from_recipe
from propkit.physics import expansion, stoichiometry


def film(**inputs):
    return pk.PropellantCase.with_film("LOX", "RP-1", **{"mixture_ratio": 2.4, "film_fraction": 0.08, "film_mixture_ratio": 0.8, **inputs})


def perf(case, ambient="vacuum", **inputs):
    nozzle = pk.Nozzle(pk.Chamber(case, pressure="7 MPa"), **{"area_ratio": 20, "throat_diameter": "0.1 m", **inputs})
    return pk.Performance(nozzle, ambient=ambient)


@given(st.floats(0.1, 10.0), st.floats(0.001, 0.5), st.floats(0.0, 10.0))
def test_core_and_film_make_up_the_whole(ratio, share, film_ratio):
    core = float(stoichiometry.core_mixture_ratio(ratio, share, film_ratio))
    if not core > 0.0:
        return
    oxidizer = (1 - share) * core / (1 + core) + share * film_ratio / (1 + film_ratio)
    assert oxidizer == pytest.approx(ratio / (1 + ratio), rel=1e-10)


@pytest.mark.parametrize("flow", ["shifting", "frozen", "constant-property"])
def test_each_stream_is_solved_at_its_own_mixture_ratio(flow):
    case = film()
    both = perf(case, flow=flow)
    for place, ratio in enumerate((case.core_mixture_ratio, 0.8)):
        alone = pk.Nozzle(
            pk.Chamber(pk.PropellantCase("LOX", "RP-1", mixture_ratio=ratio), pressure="7 MPa"),
            area_ratio=20,
            throat_diameter=0.1,
            flow=flow,
        )
        assert both.chamber.held.injector.temperature[place] == pytest.approx(alone.chamber.si("temperature"), rel=1e-10)
        for station in ("throat", "exit"):
            state = getattr(both.nozzle.held, station)
            stream = both.nozzle.held.streams_at(state)
            same = alone.at(pressure=float(state.pressure[0]))
            for name in ("temperature", "velocity", "density"):
                assert getattr(stream, name)[place] == pytest.approx(same.si(name), rel=1e-9)


@pytest.mark.parametrize("flow", ["shifting", "frozen", "constant-property"])
def test_mass_and_momentum_of_the_streams_add_up(flow):
    both = perf(film(), ambient="20 kPa", flow=flow)
    nozzle, held = both.nozzle, both.nozzle.held
    shares = np.array([0.92, 0.08])
    for station, area in (("throat", nozzle.si("throat_area")), ("exit", nozzle.si("exit_area"))):
        stream = held.streams_at(getattr(held, station))
        areas = both.si("mass_flow") * shares / (stream.density * stream.velocity)
        assert areas.sum() == pytest.approx(area, rel=1e-11)
        assert np.ptp(stream.pressure) < 1e-13 * stream.pressure[0]
    momentum = both.si("mass_flow") * (shares * stream.velocity).sum()
    pressure = nozzle.exit.si("pressure")
    assert both.si("thrust") == pytest.approx(momentum + (pressure - 20e3) * nozzle.si("exit_area"), rel=1e-11)


def test_the_throat_passes_the_most_and_lies_between_those_of_the_streams():
    held = perf(film()).nozzle.held
    own = held.isentrope.streams.throat().pressure
    assert own.min() < held.throat.pressure[0] < own.max()
    pressures = held.throat.pressure[0] * np.linspace(0.97, 1.03, 61)
    flux = held.isentrope.take(np.zeros(61, dtype=int)).at_pressure(pressures).mass_flux
    assert flux.max() <= held.mass_flux[0] * (1 + 1e-12)
    assert held.throat.mach[0] == pytest.approx(1.0, abs=1e-9)


def test_it_is_near_the_mass_mean_of_separate_nozzles():
    """With a throat of its own each, c* and impulse would be the means over the mass: the difference is of second order."""
    both = perf(film())
    ratios = (both.case.core_mixture_ratio, 0.8)
    alone = [perf(pk.PropellantCase("LOX", "RP-1", mixture_ratio=ratio)) for ratio in ratios]
    for name in ("specific_impulse", "chamber.characteristic_velocity"):
        mean = sum(w * (one.si(name) if "." not in name else one.chamber.si(name[8:])) for w, one in zip((0.92, 0.08), alone, strict=True))
        here = both.si(name) if "." not in name else both.chamber.si(name[8:])
        assert here == pytest.approx(mean, rel=2e-4)


@settings(max_examples=6)
@given(st.floats(0.01, 0.4), st.floats(1.02, 80.0), st.sampled_from(["shifting", "frozen", "constant-property"]))
def test_a_film_like_the_core_is_no_film(share, area_ratio, flow):
    with_film = perf(film(film_fraction=share, film_mixture_ratio=2.4), area_ratio=area_ratio, flow=flow)
    plain = perf(pk.PropellantCase("LOX", "RP-1", mixture_ratio=2.4), area_ratio=area_ratio, flow=flow)
    for name in ("thrust", "mass_flow", "specific_impulse"):
        assert with_film.si(name) == pytest.approx(plain.si(name), rel=1e-9)
    assert with_film.nozzle.exit.si("mach") == pytest.approx(plain.nozzle.exit.si("mach"), rel=1e-7)


def test_a_subsonic_state_and_every_size_close_the_loop():
    nozzle = perf(film()).nozzle
    flux = nozzle.throat.si("density") * nozzle.throat.si("velocity")
    for ratio, branch in (
        (1.0001, "subsonic"),
        (3.0, "subsonic"),
        (1.0, "supersonic"),
        (1.5, "supersonic"),
        (300.0, "supersonic"),
    ):
        state = nozzle.at(area_ratio=ratio, branch=branch)
        assert state.si("density") * state.si("velocity") * ratio == pytest.approx(flux, rel=1e-9)
    same = nozzle.replace(exit_pressure=nozzle.exit.pressure)
    assert same.si("area_ratio") == pytest.approx(20.0, rel=1e-9)


def test_the_price_against_the_uniform_mixture_is_on_the_sheets():
    both = perf(film())
    uniform = perf(pk.PropellantCase("LOX", "RP-1", mixture_ratio=2.4))
    beside = both.case.beside_uniform(both)
    assert beside.si("specific_impulse") == pytest.approx(uniform.si("specific_impulse"), rel=1e-12)
    lost = both.chamber.si("characteristic_velocity") / uniform.chamber.si("characteristic_velocity") - 1.0
    assert lost < -0.01
    assert f"(−{-100 * lost:.2f} %)" in str(both.chamber)
    assert "uniform mixture" in str(both)
    assert "do not mix" in str(both)


def test_whole_flow_results_are_of_the_whole():
    case, plain = film(), pk.PropellantCase("LOX", "RP-1", mixture_ratio=2.4)
    for name in ("enthalpy", "bulk_density", "oxygen_balance", "equivalence_ratio", "oxidizer_percent"):
        assert case.si(name) == pytest.approx(plain.si(name), rel=1e-12)
    assert case.elements.to_numpy() == pytest.approx(plain.elements.to_numpy(), rel=1e-12)
    assert perf(case).si("oxidizer_mass_flow") / perf(case).si("fuel_mass_flow") == pytest.approx(2.4, rel=1e-12)


def test_what_a_film_cannot_have_is_refused_in_words():
    case = film()
    with pytest.raises(TypeError, match="film_fraction"):
        pk.PropellantCase("LOX", "RP-1", mixture_ratio=2.4, film_fraction=0.1)  # no silent uniform mixture
    with pytest.raises(pk.InputError, match=r"contraction_ratio.*left out beside a film"):
        pk.Chamber(case, pressure="7 MPa", contraction_ratio=3)
    with pytest.raises(pk.InputError, match="freeze_at"):
        perf(case, flow="frozen", freeze_at="throat")
    with pytest.raises(pk.InputError, match="more of one propellant than there is"):
        film(film_fraction=0.5, film_mixture_ratio=0.0)
    with pytest.raises(pk.InputError, match="film_fraction"):
        film(film_fraction=0.0)
    with pytest.raises(pk.RangeError, match="film"):
        pk.Chamber(pk.PropellantCase.with_film("LOX", "LH2", mixture_ratio=6, film_fraction=0.03), pressure="7 MPa")


def test_recipe_code_pickle_and_workings():
    both = perf(film(condensed=True))
    assert from_recipe(both.recipe()) == both
    assert eval(repr(both), {"pk": pk}) == both
    assert pickle.loads(pickle.dumps(both)) == both
    space: dict = {}
    exec(both.as_code(), space)
    assert space["performance"] == both
    assert isinstance(both.case, pk.PropellantCase)
    more = both.replace({"case.film_fraction": 0.12})
    assert more.si("specific_impulse") < both.si("specific_impulse")
    for link in both.chain():
        assert "<table" in link.report()._repr_mimebundle_()["text/html"]
        for name in (*link.declared_results, *link.resolved()):
            if link.has(name):
                steps = both.working(f"{link.kind}.{name}").steps
                assert steps, name
                assert all(step.residual is None or step.residual < 1e-8 for step in steps), name


def test_doubts_about_the_film_are_told():
    codes = {entry.code for entry in perf(film()).warnings}
    assert {"fuel-rich", "supersaturation"} <= codes
    assert any("film" in entry for entry in perf(film()).warnings)


def test_a_batch_of_designs_equals_its_single_ones():
    held = perf(film()).nozzle.held
    many = held.isentrope.take(np.zeros(4, dtype=int))
    ratios = np.array([1.5, 5.0, 20.0, 80.0])
    throat = many.throat()
    states = expansion.at_area_ratio(many, throat.mass_flux, ratios, throat)
    for place, ratio in enumerate(ratios):
        one = expansion.at_area_ratio(held.isentrope, held.mass_flux, np.array([ratio]), held.throat)
        assert states.velocity[place] == pytest.approx(one.velocity[0], rel=1e-10)
