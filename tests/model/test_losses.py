"""Losses: the ledger is exact, each loss does what its definition says, estimates are marked, refusals are in words."""

from __future__ import annotations

import math

import numpy as np
import pytest

import propkit as pk
from propkit.model.base import from_recipe

G0 = 9.80665
ASKED = {"two-phase": "1 s", "kinetics": 0.99, "boundary layer": {"ratio": 0.985, "source": "test series of an earlier nozzle"}}


@pytest.fixture(scope="module")
def nozzle(case):
    chamber = pk.Chamber(case, pressure="9.7 MPa", cstar_efficiency=0.97)
    return pk.Nozzle(chamber, area_ratio=35, throat_diameter="0.18 m", contour=pk.Bell(length=0.8))


@pytest.mark.parametrize("ambient", ["sea level", "12 km", "vacuum"])
def test_the_product_of_the_ratios_is_delivered_over_ideal(nozzle, ambient):
    perf = pk.Performance(nozzle, ambient=ambient, losses=ASKED)
    ledger = perf.ledger
    assert list(ledger.index) == ["energy release", "kinetics", "divergence", "boundary layer", "two-phase"]
    assert np.prod(ledger["ratio"]) * perf.ideal.si("specific_impulse") == pytest.approx(perf.si("specific_impulse"), rel=1e-12)
    assert ledger["after"].iloc[-1] == pytest.approx(perf.si("specific_impulse"), rel=1e-12)
    assert ledger["before"].iloc[1:].tolist() == ledger["after"].iloc[:-1].tolist()
    assert ledger["lost"].sum() == pytest.approx(perf.ideal.si("specific_impulse") - perf.si("specific_impulse"), rel=1e-12)
    assert perf.ideal.si("thrust") - ledger["thrust_lost"].sum() == pytest.approx(perf.si("thrust"), rel=1e-12)
    assert ledger.loc["two-phase", "lost"] == pytest.approx(1.0, rel=1e-12)
    assert ledger.loc["boundary layer", "source"] == "test series of an earlier nozzle"


def test_thrust_impulse_and_coefficient_are_of_one_mind(nozzle):
    perf = pk.Performance(nozzle, ambient="12 km", losses=ASKED)
    assert perf.si("thrust") == pytest.approx(perf.si("specific_impulse") * perf.si("mass_flow") * G0, rel=1e-14)
    pressure, area = nozzle.chamber.si("stagnation_pressure"), nozzle.si("throat_area")
    assert perf.thrust_coefficient == pytest.approx(perf.si("thrust") / (pressure * area), rel=1e-14)
    assert perf.si("thrust_vacuum") - perf.si("thrust") == pytest.approx(perf.si("ambient") * nozzle.si("exit_area"), rel=1e-12)


def test_the_ideal_values_are_those_of_the_loss_free_chain(nozzle):
    perf = pk.Performance(nozzle, ambient="12 km", losses=ASKED)
    free = perf.replace({"chamber.cstar_efficiency": None, "nozzle.contour": None, "performance.losses": None})
    for name in ("thrust", "specific_impulse", "thrust_coefficient", "mass_flow", "specific_impulse_vacuum"):
        assert perf.ideal.si(name) == pytest.approx(free.si(name), rel=1e-12), name
    assert perf.ideal.thrust.to("kN").magnitude == pytest.approx(1e-3 * perf.ideal.si("thrust"))


def test_a_contour_brings_divergence_and_nothing_else(nozzle):
    perf = pk.Performance(nozzle.replace({"chamber.cstar_efficiency": None}), ambient="sea level")
    push = (nozzle.exit.si("pressure") - 101325.0) * nozzle.si("exit_area")
    momentum = perf.si("mass_flow") * nozzle.exit.si("velocity")
    assert list(perf.ledger.index) == ["divergence"]
    assert perf.si("thrust") == pytest.approx(nozzle.divergence_factor * momentum + push, rel=1e-13)


def test_energy_release_is_the_efficiency_of_the_chamber(case):
    wide = pk.Nozzle(pk.Chamber(case, pressure="9.7 MPa"), area_ratio=35, throat_diameter="0.18 m")
    given = pk.Performance(wide, ambient="12 km", losses={"energy release": "97 %"})
    known = pk.Performance(wide.replace({"chamber.cstar_efficiency": 0.97}), ambient="12 km")
    for name in ("thrust", "specific_impulse", "mass_flow", "oxidizer_mass_flow", "thrust_coefficient"):
        assert given.si(name) == pytest.approx(known.si(name), rel=1e-13), name
    assert given.ledger["ratio"].tolist() == pytest.approx(known.ledger["ratio"].tolist())
    with pytest.raises(pk.InputError, match="cstar_efficiency"):
        known.replace(losses={"energy release": 0.98})


def test_kinetics_is_estimated_between_shifting_and_frozen(nozzle):
    def ratio(value):
        return pk.Performance(nozzle, ambient="vacuum", losses={"kinetics": value}).ledger.loc["kinetics", "ratio"]

    plain = pk.Performance(nozzle.replace({"chamber.cstar_efficiency": None, "nozzle.contour": None}), ambient="vacuum")
    frozen = plain.replace({"nozzle.flow": "frozen"}).si("specific_impulse") / plain.si("specific_impulse")
    assert ratio({"share": 1.0}) == pytest.approx(frozen, rel=1e-9)
    assert ratio({"share": 0.0}) == 1.0
    assert frozen < ratio("estimate") < 1.0
    perf = pk.Performance(nozzle, ambient="vacuum", losses={"kinetics": "estimate"})
    assert bool(perf.ledger.loc["kinetics", "estimate"])
    assert [doubt.code for doubt in perf.own_warnings] == ["estimate"]
    assert "kinetics (estimate)" in str(perf)


def test_the_boundary_layer_is_estimated_along_the_contour(nozzle):
    """Common practice, no source: 0.5 to 2 % for a thrust chamber of this size; it grows as the throat shrinks."""

    def lost(one, value="estimate"):
        return 1.0 - pk.Performance(one, ambient="vacuum", losses={"boundary layer": value}).ledger.loc["boundary layer", "ratio"]

    assert 0.004 < lost(nozzle) < 0.02
    assert lost(nozzle.replace(throat_diameter="0.018 m")) == pytest.approx(lost(nozzle) * 10.0**0.2, rel=0.05)
    assert lost(nozzle, {"wall_temperature": "800 K"}) > lost(nozzle)
    with pytest.raises(pk.InputError, match="contour"):
        pk.Performance(nozzle.replace(contour=None), ambient="vacuum", losses={"boundary layer": "estimate"})


def test_particles_that_lag_take_their_share_of_the_momentum():
    propellant = pk.blend({"AP": 0.70, "Al": 0.18, "HTPB": 0.12}, by="mass")
    case = pk.PropellantCase.monopropellant(propellant, condensed=True)
    nozzle = pk.Nozzle(pk.Chamber(case, pressure="7 MPa"), area_ratio=10, throat_diameter="0.1 m")
    perf = pk.Performance(nozzle, ambient="sea level", losses={"two-phase": {"velocity_lag": 0.05}})
    fraction = nozzle.exit.si("condensed_mass_fraction")
    assert 0.25 < fraction < 0.40
    lost = 0.05 * fraction * perf.si("mass_flow") * nozzle.exit.si("velocity")
    assert perf.ideal.si("thrust") - perf.si("thrust") == pytest.approx(lost, rel=1e-10)


def test_losses_are_part_of_the_recipe(nozzle):
    perf = pk.Performance(nozzle, ambient="12 km", losses=ASKED)
    assert from_recipe(perf.recipe()) == perf
    assert eval(repr(perf), {"pk": pk}) == perf
    assert perf == perf.replace(losses=dict(reversed(ASKED.items())))
    assert pk.Performance(nozzle, ambient=0.0, losses={"kinetics": "99 %"}) == pk.Performance(
        nozzle, ambient=0.0, losses={"kinetics": 0.99}
    )
    assert perf.losses["kinetics"] == 0.99
    assert perf.record(title="losses").verify().ok


def test_the_working_evaluates_the_ledger(nozzle):
    perf = pk.Performance(nozzle, ambient="12 km", losses={"kinetics": "estimate"})
    steps = {step.name: step for step in perf.working("specific_impulse").steps}
    assert steps["ledger"].residual < 1e-12
    assert steps["kinetics_ratio"].result.value == pytest.approx(perf.ledger.loc["kinetics", "ratio"], rel=1e-12)
    assert "divergence_ratio" in steps


@pytest.mark.parametrize(
    ("losses", "words"),
    [
        ({"kinetics": 1.2}, "at most 1"),
        ({"kinetics": 0.0}, "above 0"),
        ({"kinetic": 0.99}, "Did you mean 'kinetics'"),
        ({"divergence": 0.98}, "contour"),
        ({"kinetics": "-3 s"}, "0 s or more"),
        ({"kinetics": "900 s"}, "specific impulse that is left"),
        ({"kinetics": {"ratio": 0.99, "decrement": "1 s"}}, "one of"),
        ({"kinetics": {"part": 0.99}}, "one of"),
        ({"energy release": "estimate"}, "given as a number"),
        ({"two-phase": "estimate"}, "velocity_lag"),
        ({"two-phase": {"velocity_lag": 0.1}}, "without liquids and solids"),
        (0.98, "a dict"),
    ],
)
def test_impossible_losses_are_refused_in_words(case, losses, words):
    nozzle = pk.Nozzle(pk.Chamber(case, pressure="9.7 MPa"), area_ratio=35, throat_diameter="0.18 m")
    with pytest.raises(pk.InputError, match=words):
        pk.Performance(nozzle, ambient="vacuum", losses=losses)
    with pytest.raises(pk.InputError) as caught:
        pk.Performance(nozzle, ambient="vacuum", losses={"kinetics": 2, "boundary layer": math.pi})
    assert len(caught.value.problems) == 2


@pytest.mark.parametrize(
    "losses", [ASKED | {"two-phase": 0.999}, {"kinetics": "estimate"}, {"kinetics": "3 s"}], ids=["ratios", "estimate", "decrement"]
)
def test_a_batch_takes_the_losses_as_single_objects_do(nozzle, losses):
    from propkit.study.evaluation import function_of

    perf = pk.Performance(nozzle, ambient="12 km", losses=losses)
    ratios, pressures = np.array([10.0, 35.0, 60.0]), np.array([5e6, 9.7e6, 12e6])
    function = function_of(perf, ["nozzle.area_ratio", "chamber.pressure"], ["thrust", "specific_impulse", "nozzle.mass_flow"])
    found = function({"nozzle.area_ratio": ratios, "chamber.pressure": pressures})
    for place in range(3):
        one = perf.replace({"nozzle.area_ratio": ratios[place], "chamber.pressure": pressures[place]})
        assert found["thrust"][place] == pytest.approx(one.si("thrust"), rel=1e-8)
        assert found["specific_impulse"][place] == pytest.approx(one.si("specific_impulse"), rel=1e-8)
        assert found["nozzle.mass_flow"][place] == pytest.approx(one.nozzle.si("mass_flow"), rel=1e-8)


def test_a_batch_is_sized_with_the_divergence(case):
    from propkit.study.evaluation import function_of

    chamber = pk.Chamber(case, pressure="9.7 MPa")
    nozzle = pk.Nozzle.sized_for(chamber, thrust="400 kN", ambient="sea level", area_ratio=20, contour=pk.Cone("15 deg"))
    function = function_of(nozzle, ["chamber.pressure"], ["throat_area", "wetted_area"])
    batch = function_of(nozzle, ["chamber.pressure"], ["throat_area"])
    pressures = np.array([8e6, 11e6])
    found, quick = function({"chamber.pressure": pressures}), batch({"chamber.pressure": pressures})
    assert not function.batched
    assert batch.batched
    for place, pressure in enumerate(pressures):
        one = nozzle.replace({"chamber.pressure": pressure})
        assert quick["throat_area"][place] == pytest.approx(one.si("throat_area"), rel=1e-8)
        assert found["wetted_area"][place] == pytest.approx(one.si("wetted_area"), rel=1e-12)


def test_an_energy_release_among_the_losses_is_not_contradicted_by_the_assumptions(nozzle):
    nozzle = nozzle.replace({"chamber.cstar_efficiency": 1.0})
    perf = pk.Performance(nozzle, ambient="vacuum", losses={"energy release": 0.97})
    assert "energy release among the losses" in perf.assumptions.of("cstar-efficiency").statement
    assert "Nothing is lost in the chamber" not in str(perf)
    without = pk.Performance(nozzle, ambient="vacuum")
    assert "Nothing is lost in the chamber" in without.assumptions.of("cstar-efficiency").statement


def test_the_drawn_ledger_goes_from_an_ideal_bar_to_a_delivered_bar_each_taking_up_where_the_last_ended(nozzle):
    perf = pk.Performance(nozzle, ambient="vacuum", losses={"kinetics": 0.99, "boundary layer": 0.985})
    figure = next(figure for figure in perf.figures() if figure.name == "ledger")
    bars = figure.layers[0]
    assert bars.categories[0] == "ideal"
    assert bars.categories[-1] == "delivered"
    assert bars.values.values[0] == perf.ideal.si("specific_impulse")
    assert bars.values.values[-1] == pytest.approx(perf.si("specific_impulse"), rel=1e-12)
    assert bars.values.values[1:-1] == (perf.ideal.si("specific_impulse"), *bars.starts[1:-2])
    assert bars.starts[-2] == pytest.approx(perf.si("specific_impulse"), rel=1e-12)
    assert bars.starts[0] == bars.starts[-1] == figure.x.low < bars.starts[-2]
