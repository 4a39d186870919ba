"""The contract of the objects: immutable, equal by recipe, rebuilt from code, pickles and recipes, fresh at every access."""

from __future__ import annotations

import copy
import pickle
import threading

import numpy as np
import pint
import pytest

import propkit as pk
from propkit.model.base import from_recipe


def links(perf):
    return perf.chain()


def test_inputs_are_as_typed_and_read_only(perf):
    assert dict(perf.chamber.inputs)["pressure"] == "9.7 MPa"
    with pytest.raises(TypeError):
        perf.chamber.inputs["pressure"] = 1


def test_text_float_and_quantity_are_equally_good(case):
    quantity = pint.get_application_registry().Quantity(7, "MPa")
    objects = [pk.Chamber(case, pressure=value) for value in ("7 MPa", 7e6, quantity, np.float64(7e6), 7_000_000)]
    assert len({*objects}) == 1
    assert objects[0] == objects[3]
    assert objects[0] != pk.Chamber(case, pressure="7.1 MPa")


def test_the_name_does_not_count(chamber, case):
    named = pk.Chamber(case, pressure="9.7 MPa", name="upper stage")
    assert named == chamber
    assert hash(named) == hash(chamber)
    assert named.name == "upper stage"


def test_copies_are_the_object_and_pickles_hold_the_recipe(perf):
    assert copy.copy(perf) is perf
    assert copy.deepcopy(perf) is perf
    data = pickle.dumps(perf)
    assert b"pint" not in data
    again = pickle.loads(data)
    assert again == perf
    assert again.si("thrust") == perf.si("thrust")


def test_recipes_and_code_rebuild_the_chain(perf):
    varied = [
        perf,
        perf.replace({"nozzle.flow": "frozen", "nozzle.freeze_at": "throat"}),
        perf.replace({"chamber.contraction_ratio": 3, "chamber.cstar_efficiency": "97 %"}),
        pk.Performance(
            pk.Nozzle(
                pk.Chamber.from_gas(pressure="7 MPa", temperature=3000, molar_mass="22 g/mol", isentropic_exponent=1.2),
                area_ratio=9,
                exit_area="0.1 m2",
            ),
            ambient="12 km",
        ),
    ]
    for one in varied:
        assert from_recipe(one.recipe()) == one
        assert eval(repr(one), {"pk": pk}) == one
        space: dict = {}
        exec(one.as_code(), space)
        assert space["performance"] == one


def test_an_own_propellant_survives_recipe_code_and_pickle():
    own = pk.Propellant(
        name="RP-1 lot 7",
        formula="C H1.95",
        enthalpy="-24.717 kJ/mol",
        density="810 kg/m3",
        temperature="298.15 K",
        role="fuel",
    )
    case = pk.PropellantCase("LOX", own, mixture_ratio=2.3)
    assert from_recipe(case.recipe()) == case
    assert pickle.loads(pickle.dumps(case)) == case
    space: dict = {}
    exec(case.as_code(), space)
    assert space["case"] == case


def test_replace_rebuilds_downstream_and_leaves_the_original(perf):
    new = perf.replace({"chamber.pressure": "8 MPa"})
    assert type(new) is pk.Performance
    assert new.chamber.si("pressure") == 8e6
    assert perf.chamber.si("pressure") == 9.7e6
    assert new.case is perf.case
    assert new == perf.replace({"pressure": "8 MPa"}) if False else new == perf.replace(**{"chamber.pressure": "8 MPa"})
    assert perf.replace(ambient="vacuum").si("thrust") == pytest.approx(perf.si("thrust_vacuum"), rel=1e-14)
    assert perf.replace({"mixture_ratio": 3.0}).case.mixture_ratio == 3.0
    assert perf.replace({}) is perf


def test_a_group_member_displaces_the_others(perf, chamber):
    assert perf.replace({"case.equivalence_ratio": 1.2}).case.equivalence_ratio == pytest.approx(1.2)
    nozzle = perf.nozzle.replace(exit_pressure="50 kPa")
    assert "area_ratio" not in nozzle.inputs
    assert nozzle.exit.pressure.to("kPa").magnitude == pytest.approx(50)
    assert set(perf.nozzle.replace(mass_flow="100 kg/s").inputs) == {"chamber", "area_ratio", "mass_flow"}
    sized = pk.Nozzle.sized_for(chamber, thrust="300 kN", ambient="sea level", area_ratio=20)
    assert sized.replace({"chamber.pressure": "8 MPa"}).si("throat_area") > sized.si("throat_area")
    assert "sizing_ambient" not in sized.replace(throat_diameter="0.2 m").inputs
    two = pk.Nozzle(chamber, throat_diameter="0.18 m", exit_diameter="1 m")
    assert set(two.replace(throat_area="0.03 m2").inputs) == {"chamber", "exit_diameter", "throat_area"}
    assert set(two.replace(area_ratio=20).inputs) == {"chamber", "throat_diameter", "area_ratio"}


def test_every_legal_size_gives_the_same_nozzle(chamber, nozzle):
    thrust = pk.Performance(nozzle, ambient="5 km").thrust
    same = [
        {"area_ratio": 35, "throat_area": nozzle.throat_area},
        {"area_ratio": 35, "exit_diameter": nozzle.exit_diameter},
        {"area_ratio": 35, "exit_area": nozzle.exit_area},
        {"area_ratio": 35, "mass_flow": nozzle.mass_flow},
        {"area_ratio": 35, "thrust": thrust, "sizing_ambient": "5 km"},
        {"exit_pressure": nozzle.exit.pressure, "throat_diameter": "0.18 m"},
        {"exit_pressure": nozzle.exit.pressure, "mass_flow": nozzle.mass_flow},
        {"throat_diameter": "0.18 m", "exit_area": nozzle.exit_area},
        {"throat_area": nozzle.throat_area, "exit_diameter": nozzle.exit_diameter},
    ]
    for inputs in same:
        other = pk.Nozzle(chamber, **inputs)
        for name in (
            "throat_area",
            "exit_area",
            "area_ratio",
            "mass_flow",
            "throat_diameter",
            "exit_diameter",
            "exit_pressure",
        ):
            assert other.si(name) == pytest.approx(nozzle.si(name), rel=1e-10), (inputs, name)


def test_every_access_builds_a_fresh_value(perf):
    first = perf.thrust
    first *= 2
    assert perf.thrust.magnitude == perf.si("thrust")
    frame = perf.nozzle.stations
    frame.iloc[0, 0] = -1
    assert perf.nozzle.stations.iloc[0, 0] > 0
    assert frame.attrs["units"]["pressure"] == "Pa"
    composition = perf.chamber.composition
    composition.iloc[0] = 9
    assert perf.chamber.composition.iloc[0] < 1


def test_quantities_belong_to_the_application_registry(perf):
    registry = pint.get_application_registry()
    assert (perf.thrust + registry.Quantity(1, "kN")).to("N").magnitude == pytest.approx(perf.si("thrust") + 1e3)


def test_results_and_frames_agree(perf):
    frame = perf.to_frame()
    assert list(frame.columns) == ["symbol", "value", "unit", "kind", "relation", "source"]
    assert frame.loc["thrust", "value"] == pytest.approx(perf.thrust.to("kN").magnitude)
    assert frame.loc["thrust", "unit"] == "kN"
    assert perf.to_frame(units="US").loc["thrust", "value"] == pytest.approx(perf.thrust.to("lbf").magnitude)
    with pytest.raises(pk.InputError, match="'SI' or 'US'"):
        perf.to_frame(units="metric")


def test_lazy_results_are_safe_in_threads(case):
    perf = pk.Performance(pk.Nozzle(pk.Chamber(case, pressure="5 MPa"), area_ratio=20, throat_diameter=0.1), ambient="vacuum")
    seen, start = [], threading.Barrier(6)

    def look():
        start.wait()
        seen.append((perf.nozzle.throat, perf.nozzle.exit.si("temperature")))

    threads = [threading.Thread(target=look) for _ in range(6)]
    for thread in threads:
        thread.start()
    for thread in threads:
        thread.join()
    assert len({id(throat) for throat, _ in seen}) == 1


def test_a_recipe_that_names_anything_else_is_refused():
    for recipe in (
        {},
        {"object": "os.system", "inputs": {}},
        {"object": "Chamber", "inputs": []},
        {"object": "Chamber", "inputs": {"bad": 1}},
        7,
    ):
        with pytest.raises(pk.RecordError):
            from_recipe(recipe)


def test_every_result_has_a_working_that_holds(perf):
    contracted = perf.replace({"chamber.contraction_ratio": 2.5, "chamber.cstar_efficiency": 0.96, "nozzle.discharge_coefficient": 0.98})
    for one in (
        perf,
        contracted,
        contracted.replace({"nozzle.flow": "frozen"}),
        perf.replace({"nozzle.flow": "constant-property"}),
    ):
        for link in one.chain():
            for name in (*link.declared_results, *link.resolved()):
                if not link.has(name):
                    continue
                working = one.working(f"{link.kind}.{name}")
                assert working.steps, name
                for step in working.steps:
                    if step.residual is not None:
                        assert step.residual < 1e-9, (name, step)
                first = working.steps[0]
                if first.result is not None and first.result.name == name:
                    assert first.result.value == working.headline[0].value


def test_the_written_relation_gives_the_result(perf):
    from propkit.model import terms
    from propkit.physics.relations import RELATIONS

    one = perf.replace({"chamber.contraction_ratio": 2.5, "chamber.cstar_efficiency": 0.96, "nozzle.discharge_coefficient": 0.98})
    checked = 0
    for link in one.chain():
        for name in (*link.declared_results, *link.resolved()):
            key = terms.key_for(link, name)
            if link.has(name) and key in RELATIONS:
                assert RELATIONS[key].evaluate(terms.values_for(link, key, name)) == pytest.approx(link.si(name), rel=1e-12), (
                    link.kind,
                    name,
                )
                checked += 1
    assert checked >= 22
