"""What a new user gets wrong, and the one clear error that each gives."""

import numpy as np
import pandas as pd
import pint
import pytest

import propkit as pk

GAS = pk.Chamber.from_gas(pressure="7 MPa", temperature="3500 K", molar_mass="22 g/mol", isentropic_exponent=1.2)
PERF = pk.Performance(pk.Nozzle(GAS, area_ratio=20, throat_diameter="0.1 m"), ambient="sea level")
P, R, T = "chamber.pressure", "nozzle.area_ratio", "chamber.temperature"
quantity = pint.get_application_registry().Quantity


@pytest.mark.parametrize(
    ("designs", "words"),
    [
        ({"chamber.presure": [1e6]}, "Did you mean chamber.pressure"),
        ({"thrust": [1e6]}, "is a result of the performance, not an input"),
        ({3: [1.0]}, "`3` is no text"),
        ({}, "without a column"),
        (pd.DataFrame(), "without a column"),
        ([1, 2], "a mapping of paths to lists"),
        ({P: []}, "an empty list"),
        (pd.DataFrame({P: []}), "an empty list"),
        ({P: 7e6}, "a list of values"),
        ({P: "7 MPa"}, "Write [value] for a single one"),
        ({P: {7e6, 8e6}}, "a list of values"),
        ({P: (value for value in (7e6,))}, "a list of values"),
        ({P: {"a": 7e6}}, "a list of values"),
        ({P: [[1e6], [2e6, 3e6]]}, "Ragged or nested"),
        ({P: np.ones((2, 2))}, "shape (2, 2)"),
        ({P: [5e6, float("nan")]}, "nan at place 1"),
        (pd.DataFrame({P: [5e6, np.nan]}), "nan at place 1"),
        (pd.DataFrame({P: ["5 MPa", None]}), "at place 1"),
        (pd.DataFrame({P: pd.array([5, None], dtype="Int64")}), "nan at place 1"),
        (pd.DataFrame([[5e6, 6e6]], columns=[P, P]), "twice"),
        (pd.DataFrame([[1, 2]]), "`0` is no text"),
        ({R: [10.0], "area_ratio": [20.0]}, "a second name of nozzle.area_ratio"),
        ({R: [10.0], "nozzle.exit_pressure": [5e4]}, "one of area_ratio or exit_pressure"),
        ({"nozzle.thrust": ["100 kN"]}, "`sizing_ambient` is missing"),
        ({"nozzle.freeze_at": ["throat"]}, "left out unless flow is 'frozen'"),
        ({"nozzle.flow": ["shifting", "frosen"]}, "Did you mean 'frozen'"),
        ({P: [quantity(7, "K")]}, "of another kind"),
        ({R: [True]}, "True at place 0"),
        ({R: np.array([1 + 1j])}, "(1+1j) at place 0"),
        ({R: [10, "x"]}, "'x' at place 1"),
        ({R: [0.5, 10]}, "0.5 at place 0"),
        ({P: ["7,5 MPa", "hot"]}, "'hot' at place 1"),
        ({"performance.name": ["a"]}, "an input that changes the numbers"),
        ({"nozzle.chamber": [GAS]}, "the object upstream"),
        ({P: np.linspace(1e6, 2e6, 20_000), R: np.linspace(2, 3, 20_000)}, "at most 100000000 designs"),
    ],
)
def test_designs_that_are_none(designs, words):
    with pytest.raises(pk.InputError) as caught:
        pk.Study(PERF, designs)
    assert words in str(caught.value)


def test_every_bad_column_stands_in_one_error():
    with pytest.raises(pk.InputError) as caught:
        pk.Study(PERF, {"chamber.presure": [1e6], R: [], "performance.ambient": ["-1 Pa"]})
    assert len(caught.value.problems) == 3


@pytest.mark.parametrize(
    ("designs", "count"),
    [
        ({P: [quantity(7, "MPa"), "8 MPa", 9e6]}, 3),
        ({P: quantity(np.array([7.0, 8.0]), "MPa")}, 2),
        ({R: np.array([10, 20])}, 2),
        ({R: [np.int64(10), np.int32(20)]}, 2),
        ({R: pd.Series([10, 20])}, 2),
        ({R: range(10, 13)}, 3),
        ({"nozzle.exit_pressure": ["50 kPa", "80 kPa"]}, 2),
        ({"nozzle.thrust": ["100 kN", "200 kN"], "nozzle.sizing_ambient": ["vacuum"]}, 2),
        ({"performance.ambient": ["sea level", "12 km", "vacuum", 5e4]}, 4),
        ({"nozzle.contour": [pk.Bell(length=0.8), None]}, 2),
    ],
)
def test_designs_that_are_some(designs, count):
    frame = pk.Study(PERF, designs).run(progress=False).frame
    assert len(frame) == count
    assert np.isfinite(frame["thrust"]).all()


@pytest.mark.parametrize(
    ("results", "words"),
    [
        ("thrust", "Write ['thrust']"),
        ([], "one at least"),
        (["thrst", "exit.presure"], "Did you mean"),
        ([None], "a path of a result"),
    ],
)
def test_results_that_are_none(results, words):
    with pytest.raises(pk.InputError) as caught:
        pk.Study(PERF, {P: [7e6]}, results=results)
    assert words in str(caught.value)
    with pytest.raises(pk.InputError) as caught:
        pk.Uncertainty(PERF, {P: "1 %"}, results=results)
    assert words in str(caught.value)


@pytest.mark.parametrize(
    ("ask", "words"),
    [
        (lambda found: found.best("thrst"), "Did you mean thrust"),
        (lambda found: found.best(P), "a numeric result"),
        (lambda found: found.values("x"), "a numeric result"),
        (lambda found: found.pareto({"thrust": "max"}), "a numeric result"),
        (lambda found: found.pareto("thrust"), "two results or more"),
        (lambda found: found.display_frame("imperial"), "'SI' or 'US'"),
        (lambda found: found.plot("thrst"), "one of chamber.pressure"),
        (lambda found: found.map("thrust"), "another number"),
    ],
)
def test_questions_to_a_result_that_are_none(ask, words):
    found = pk.Study(PERF, {P: [6e6, 7e6]}).run(progress=False)
    with pytest.raises(pk.InputError) as caught:
        ask(found)
    assert words in str(caught.value)


THREE = {P: "1 %", T: "1 %", R: "1 %"}


@pytest.mark.parametrize(
    ("inputs", "correlation", "words"),
    [
        ({P: "0 %"}, None, "Leave the input out if it is certain"),
        ({P: pk.Normal(0.0)}, None, "above 0"),
        ({P: "-1 %"}, None, "above 0"),
        ({P: pk.Normal(float("nan"))}, None, "a finite number"),
        ({P: "1 K"}, None, "a unit of another kind"),
        ({P: pk.Uniform("hot")}, None, "'hot'"),
        ({"nozzle.flow": "1 %"}, None, "a choice"),
        ({"chamber.contraction_ratio": "1 %"}, None, "finite"),
        (["chamber.pressure"], None, "a mapping of paths"),
        (THREE, {(P, T): 0.9, (P, R): 0.9, (T, R): -0.9}, "contradict each other"),
        (THREE, {(P, T): 1.5}, "between -1 and 1"),
        (THREE, {(P, T): float("nan")}, "between -1 and 1"),
        (THREE, {(P, T): "0.5"}, "a number between -1 and 1"),
        (THREE, {(P, T): None}, "a number between -1 and 1"),
        (THREE, {(P, T): 0.5, (T, P): -0.5}, "given twice"),
        (THREE, {(P, P): 0.5}, "between two of the uncertain inputs"),
        (THREE, {(P, "nozzle.throat_diameter"): 0.5}, "between two of the uncertain inputs"),
        (THREE, {P: 0.5}, "given for pairs of paths"),
        (THREE, [1], "a mapping of pairs of paths"),
    ],
)
def test_uncertainties_that_are_none(inputs, correlation, words):
    with pytest.raises(pk.InputError) as caught:
        pk.Uncertainty(PERF, inputs, correlation)
    assert words in str(caught.value)


def test_a_percentage_of_nothing_says_nothing():
    vacuum = PERF.replace({"ambient": "vacuum"})
    with pytest.raises(pk.InputError, match="in units"):
        pk.Uncertainty(vacuum, {"performance.ambient": "1 %"})
    found = pk.Uncertainty(vacuum, {"performance.ambient": pk.Normal("10 Pa")}, results=["thrust"]).run()
    # F = m' u + (pe - pa) Ae: the thrust falls by the exit area times the ambient pressure
    assert found.first_order.derivatives[0, 0] == pytest.approx(-vacuum.nozzle.si("exit_area"), rel=1e-12)


@pytest.mark.parametrize(
    ("options", "words"),
    [
        ({"samples": 1000}, "`seed` is missing"),
        ({"samples": 1000, "seed": -1}, "at least 0"),
        ({"samples": 1000, "seed": 1.5}, "an integer"),
        ({"samples": 10, "seed": 1}, "at least 100"),
        ({"samples": 1e4, "seed": 1}, "an integer"),
        ({"samples": 1000, "seed": 1, "illegal": "ignore"}, "'refuse' or 'leave out'"),
        ({"samples": 1000, "seed": 1, "executor": "threads"}, "dask"),
    ],
)
def test_runs_that_are_none(options, words):
    with pytest.raises(pk.InputError) as caught:
        pk.Uncertainty(PERF, {P: "1 %"}).run(progress=False, **options)
    assert words in str(caught.value)


def test_sheets_are_in_one_of_two_systems():
    with pytest.raises(pk.InputError, match="'SI' or 'US'"):
        pk.Uncertainty(PERF, {P: "1 %"}).run().rounded("thrust", "imperial")


# -- searches -------------------------------------------------------------------------------------------


def test_a_result_that_nothing_moves_is_said_and_the_present_design_kept():
    answer = pk.solve_for(PERF, R, {T: "3000 K"})
    assert not answer.reached
    assert answer.notes == ("chamber.temperature does not depend on nozzle.area_ratio: it cannot become 3000 K that way",)
    assert answer.variables[R] == 20.0
    assert pk.solve_for(PERF, R, {T: "3500 K"}).reached
    best = pk.maximise(PERF, T, over={R: (3, 30)})
    assert "chamber.temperature does not depend on nozzle.area_ratio: every design in the ranges is as good" in best.notes


def test_a_target_out_of_reach_is_told_with_units():
    answer = pk.solve_for(PERF, R, {"nozzle.exit.pressure": "55 MPa"})
    assert answer.notes[0].startswith("the target is out of reach: nozzle.exit.pressure comes no nearer to 55 MPa than 3.9")
    assert answer.notes[1] == "nozzle.area_ratio sits on the lower end of the legal range: 1"


def test_limits_that_cannot_be_met_are_said():
    answer = pk.maximise(PERF, "specific_impulse", over={R: (2, 100)}, subject_to={"nozzle.exit.pressure": ("50 MPa", None)})
    assert not answer.reached
    assert "the limits cannot be met" in str(answer)
    assert answer.on_bounds == (R,)


@pytest.mark.parametrize(
    ("ask", "words"),
    [
        (lambda: pk.solve_for(PERF, R, {}), "as many results as inputs"),
        (lambda: pk.solve_for(PERF, R, "thrust"), "as many results as inputs"),
        (lambda: pk.solve_for(PERF, R, {"nozzle.exit.presure": 1.0}), "Did you mean nozzle.exit.pressure"),
        (lambda: pk.solve_for(PERF, "nozzle.arearatio", {"thrust": 1e5}), "Did you mean nozzle.area_ratio"),
        (lambda: pk.solve_for(PERF, "nozzle.flow", {"thrust": 1e5}), "a choice"),
        (lambda: pk.solve_for(PERF, R, {"thrust": float("nan")}), "a finite number"),
        (lambda: pk.maximise(PERF, "thrust", over={}), "a mapping of paths to ranges"),
        (lambda: pk.maximise(PERF, "thrust", over={R: 3}), "a pair (low, high)"),
        (lambda: pk.maximise(PERF, "thrust", over={R: (30, 3)}), "the lower first"),
        (lambda: pk.maximise(PERF, ["thrust"], over={R: (3, 30)}), "a path is a text"),
        (lambda: pk.maximise(PERF, "thrust", over={R: (3, 30)}, subject_to={"nozzle.exit.pressure": "50 kPa"}), "None for no limit"),
        (lambda: pk.maximise(PERF, "thrust", over={R: (3, 30)}, subject_to={"nozzle.exit.pressure": (None, None)}), "on one side at least"),
        (lambda: pk.maximise(PERF, "thrust", over={R: (3, 30)}, subject_to={"nozzle.exit.pressure": (5e4, 4e4)}), "the lower first"),
    ],
)
def test_searches_that_are_none(ask, words):
    with pytest.raises(pk.InputError) as caught:
        ask()
    assert words in str(caught.value)
