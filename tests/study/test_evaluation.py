"""A chain as a batch function: the same numbers as the objects, case by case."""

import pickle

import numpy as np
import pytest

import propkit as pk
from propkit.errors import InputError, NotAvailableError
from propkit.model import paths
from propkit.study.evaluation import ChainFunction, function_of, own_results, result_name, variable

CASE = pk.PropellantCase("LOX", "LCH4", mixture_ratio=3.4)
CHAMBER = pk.Chamber(CASE, pressure="9.7 MPa", cstar_efficiency=0.97)
NOZZLE = pk.Nozzle(CHAMBER, area_ratio=35, throat_diameter="0.18 m")
PERF = pk.Performance(NOZZLE, ambient="sea level")
GAS = pk.Performance(
    pk.Nozzle(
        pk.Chamber.from_gas(pressure="7 MPa", temperature="3500 K", molar_mass="22 g/mol", isentropic_exponent=1.2, contraction_ratio=3),
        area_ratio=20,
        throat_diameter="0.1 m",
    ),
    ambient="40 kPa",
)
SIZED = pk.Performance(pk.Nozzle.sized_for(CHAMBER, thrust="400 kN", ambient="sea level", area_ratio=20), ambient="vacuum")
FROZEN = PERF.replace({"nozzle.flow": "frozen", "nozzle.freeze_at": "throat"})
TWO_SIZES = pk.Performance(pk.Nozzle(CHAMBER, throat_diameter="0.18 m", exit_diameter="1 m"), ambient="vacuum")
CONTRACTED = PERF.replace({"chamber.contraction_ratio": 2.5})


@pytest.mark.parametrize(
    ("target", "inputs"),
    [
        (PERF, ("chamber.pressure", "case.mixture_ratio", "nozzle.area_ratio", "performance.ambient")),
        (PERF, ("nozzle.exit_pressure", "nozzle.mass_flow", "chamber.cstar_efficiency")),
        (PERF, ("case.equivalence_ratio", "nozzle.discharge_coefficient", "nozzle.exit_area")),
        (GAS, ("chamber.pressure", "chamber.temperature", "chamber.molar_mass", "chamber.isentropic_exponent")),
        (GAS, ("chamber.gas_constant", "chamber.contraction_ratio")),
        (SIZED, ("nozzle.thrust", "chamber.pressure")),
        (FROZEN, ("chamber.pressure", "case.mixture_ratio")),
        (TWO_SIZES, ("nozzle.exit_diameter", "nozzle.throat_diameter")),
        (CONTRACTED, ("chamber.pressure", "chamber.contraction_ratio")),
        (NOZZLE, ("chamber.pressure", "nozzle.throat_area")),
        (CHAMBER, ("pressure", "mixture_ratio")),
        (CASE, ("mixture_ratio",)),
    ],
)
def test_batch_agrees_with_objects(target, inputs):
    names = [name for name in own_results(target) if isinstance(target.si(name), float)]
    upstream = ["chamber.temperature", "nozzle.exit.pressure", "nozzle.throat.velocity"] if target.kind == "performance" else []
    function = pickle.loads(pickle.dumps(function_of(target, inputs, [*names, *upstream])))
    assert function.batched
    rng = np.random.default_rng(5)
    known = [variable(target, path) for path in function.variables]
    drawn = {}
    for entry in known:
        values = entry.nominal * (1.0 + 0.05 * rng.uniform(-1.0, 1.0, 5))
        drawn[entry.path] = np.clip(values, entry.low, entry.high)
    found = function(drawn)
    assert set(found) == set(function.results)
    for place in range(5):
        made = target.replace({path: float(values[place]) for path, values in drawn.items()})
        for name, values in found.items():
            expected = paths.value_of(made, name)
            # both run the same solver to the same tolerance; a batch may take one Newton step more
            assert values[place] == pytest.approx(expected, rel=1e-9, abs=1e-12), name


def test_cases_that_the_object_refuses_are_no_numbers():
    function = function_of(PERF, ["performance.ambient", "nozzle.exit_pressure"], ["thrust"])
    found = function({"performance.ambient": np.array([0.0, 2e7, 0.0]), "nozzle.exit_pressure": np.array([5e4, 5e4, 9e6])})["thrust"]
    assert np.isfinite(found).tolist() == [True, False, False]


def test_stored_temperature_and_assigned_enthalpy():
    function = function_of(CHAMBER, ["case.fuel_temperature"], ["temperature"]) if CASE.has("fuel_temperature") else None
    assert function is None
    warm = CHAMBER.replace({"case.fuel_temperature": "110 K"})
    found = function_of(warm, ["fuel_temperature"], ["temperature"])({"case.fuel_temperature": np.array([100.0, 110.0])})
    assert found["temperature"][0] == pytest.approx(warm.replace(fuel_temperature=100.0).si("temperature"), rel=1e-9)
    assert found["temperature"][1] > found["temperature"][0]
    # 10 kJ/mol more in the fuel is the same as a propellant of one's own with that enthalpy
    nominal = variable(CHAMBER, "case.fuel.enthalpy").nominal
    shifted = function_of(CHAMBER, ["case.fuel.enthalpy"], ["temperature"])({"case.fuel.enthalpy": np.array([nominal + 1e4])})
    own = pk.Propellant(
        name="fuel of the test", formula="C H4", enthalpy=f"{nominal + 1e4:.10g} J/mol", density="422 kg/m3",
        temperature="111.6 K", role="fuel",
    )  # fmt: skip
    expected = pk.Chamber(pk.PropellantCase("LOX", own, mixture_ratio=3.4), pressure="9.7 MPa", cstar_efficiency=0.97)
    assert shifted["temperature"][0] == pytest.approx(expected.si("temperature"), rel=1e-7)


def test_recipes_without_a_batch_form_are_rebuilt_one_by_one(monkeypatch):
    from propkit.study import batch

    batched = function_of(GAS, ["chamber.pressure"], ["thrust"])
    monkeypatch.setattr(batch, "BATCHED", ())
    slow = ChainFunction(GAS, batched.variables, batched.results)
    assert not slow.batched
    drawn = {"chamber.pressure": np.array([6e6, 7e6, 1e12])}
    one, other = slow(drawn)["thrust"], batched({"chamber.pressure": np.array([6e6, 7e6])})["thrust"]
    np.testing.assert_allclose(one[:2], other, rtol=1e-12)
    assert np.isnan(one[2])


@pytest.mark.parametrize(
    ("path", "word"),
    [
        ("chamber.presure", "Did you mean"),
        ("pressure", "chamber.pressure"),
        ("nozzle.flow", "number"),
        ("thrust", "result of the performance"),
        ("nozzle.thrust", "not part of this recipe"),
        ("chamber.contraction_ratio", "finite"),
        ("case.fuel.density", "no input"),
    ],
)
def test_paths_that_cannot_vary(path, word):
    if path == "pressure":
        assert variable(PERF, path).path == "chamber.pressure"
        return
    with pytest.raises(InputError, match=word):
        variable(PERF, path)


def test_results_are_named_as_in_tables():
    assert result_name(PERF, "thrust") == "thrust"
    assert result_name(PERF, "performance.thrust") == "thrust"
    assert result_name(PERF, "exit.pressure") == "nozzle.exit.pressure"
    with pytest.raises(InputError, match="ambiguous"):
        result_name(PERF, "temperature")
    with pytest.raises((InputError, NotAvailableError)):
        result_name(GAS, "oxidizer_mass_flow")
