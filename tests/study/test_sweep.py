"""Studies: designs read and refused, the table and the objects hold the same numbers, choices, failures, executors, exports."""

import os
import pickle
import re
import threading
from collections import OrderedDict
from concurrent.futures import ProcessPoolExecutor, ThreadPoolExecutor
from multiprocessing import get_context

import numpy as np
import pandas as pd
import pytest

import propkit as pk
from propkit.model import paths
from propkit.physics import fast_build
from propkit.study import sweep_plan
from propkit.study.pareto import undominated

CASE = pk.PropellantCase("LOX", "LCH4", mixture_ratio=3.4)
CHAMBER = pk.Chamber(CASE, pressure="9.7 MPa")
NOZZLE = pk.Nozzle(CHAMBER, area_ratio=35, throat_diameter="0.18 m")
PERF = pk.Performance(NOZZLE, ambient="sea level")
GAS = pk.Performance(
    pk.Nozzle(
        pk.Chamber.from_gas(pressure="7 MPa", temperature="3500 K", molar_mass="22 g/mol", isentropic_exponent=1.2),
        area_ratio=20,
        throat_diameter="0.1 m",
    ),
    ambient="sea level",
)


def agree(result, rows, tolerance=1e-8):
    """Compare rows of a study with objects rebuilt from the same inputs, every column."""
    frame = result.frame
    for row in rows:
        made = result.plan.target.replace(result.plan.plan.design(int(row)))
        for name in result.results:
            value = frame.loc[row, name]
            if np.isfinite(value):
                # gas at rest has a velocity of rounding in the objects, and none in a study
                floor = 1e-2 if name.startswith("nozzle.inlet.") and name.endswith(("velocity", "mach")) else 1e-300
                assert value == pytest.approx(paths.value_of(made, name), rel=tolerance, abs=floor), (row, name)


def test_a_grid_varies_its_last_path_fastest_and_has_the_contracted_columns():
    result = pk.Study(PERF, {"chamber.pressure": ["5 MPa", 9e6], "mixture_ratio": [3.0, 3.4, 3.8]}).run(progress=False)
    frame = result.frame
    assert list(frame["case.mixture_ratio"]) == [3.0, 3.4, 3.8] * 2
    assert list(frame["chamber.pressure"]) == [5e6] * 3 + [9e6] * 3
    assert {"thrust", "specific_impulse", "mass_flow", "nozzle.exit.pressure", "chamber.temperature", "nozzle.exit_diameter"} <= set(frame)
    assert "performance.thrust" not in frame
    assert frame["thrust"].dtype == np.float64
    assert frame.attrs["units"]["thrust"] == "N"
    assert frame.attrs["units"]["chamber.pressure"] == "Pa"
    assert len(result.failed) == 0
    agree(result, range(6))


def test_a_frame_is_a_fresh_copy_and_the_result_is_immutable():
    result = pk.Study(GAS, {"area_ratio": [10, 20]}).run(progress=False)
    before = result.frame["thrust"].tolist()
    frame = result.frame
    frame.loc[0, "thrust"] = 0.0
    assert result.frame["thrust"].tolist() == before
    with pytest.raises(AttributeError):
        result.notes = ()
    again = pickle.loads(pickle.dumps(result))
    pd.testing.assert_frame_equal(again.frame, result.frame)


def test_a_table_is_a_list_of_designs_with_choices_mixed():
    designs = pd.DataFrame(
        {
            "chamber.pressure": ["7 MPa", "1015 psi", 8e6, "9 MPa"],
            "nozzle.flow": ["shifting", "frozen", "constant-property", "frozen"],
            "case.fuel": ["LCH4", "RP-1", "LCH4", "LCH4"],
            "performance.ambient": ["vacuum", "12 km", "1 bar", "sea level"],
        }
    )
    result = pk.Study(PERF, designs).run(progress=False)
    assert list(result.frame["case.fuel"]) == ["LCH4", "RP-1", "LCH4", "LCH4"]
    assert result.frame["performance.ambient"].iloc[3] == pytest.approx(101325.0)
    assert result.frame["chamber.pressure"].iloc[1] == pytest.approx(1015 * 6894.757293168361)
    agree(result, range(4))


def test_naming_a_member_of_a_group_displaces_the_others():
    result = pk.Study(PERF, {"nozzle.exit_pressure": ["20 kPa", "80 kPa"], "nozzle.mass_flow": [50.0, 100.0]}).run(progress=False)
    assert list(result.frame["nozzle.exit.pressure"]) == pytest.approx([2e4, 2e4, 8e4, 8e4], rel=1e-9)
    assert list(result.frame["mass_flow"]) == pytest.approx([50.0, 100.0] * 2, rel=1e-12)
    agree(result, range(4))
    sized = pk.Nozzle.sized_for(CHAMBER, thrust="400 kN", ambient="sea level", area_ratio=20)
    again = pk.Study(pk.Performance(sized, ambient="sea level"), {"chamber.pressure": [6e6, 9e6]}).run(progress=False)
    assert list(again.frame["thrust"]) == pytest.approx([4e5, 4e5], rel=1e-9)
    assert again.frame["nozzle.throat_area"].nunique() == 2


def test_failed_designs_are_kept_with_their_reason():
    study = pk.Study(PERF, {"nozzle.exit_pressure": ["50 kPa", "8 MPa"], "performance.ambient": ["sea level", "50 MPa"]})
    result = study.run(progress=False)
    assert list(result.failed.index) == [1, 2, 3]
    assert "throat pressure" in result.failed.loc[2, "reason"]
    assert "stagnation pressure" in result.failed.loc[1, "reason"]
    assert np.isnan(result.frame.loc[1:, "thrust"]).all()
    assert np.isfinite(result.frame.loc[0, "thrust"])
    assert any("3 of 4 designs" in str(doubt) for doubt in result.warnings)


def test_bad_plans_are_refused_with_candidates_and_all_at_once():
    with pytest.raises(pk.InputError) as caught:
        pk.Study(PERF, {"chamber.presure": [1e6], "temperature": [300.0], "case.mixture_ratio": [], "area_ratio": [0.5, 10.0]})
    text = str(caught.value)
    assert "chamber.pressure" in text
    assert "empty" in text
    assert "area_ratio" in text
    assert "0.5" in text
    assert len(caught.value.problems) == 4
    with pytest.raises(pk.InputError, match=r"chamber\.pressure, .*nozzle\.exit\.pressure"):
        pk.Study(PERF, {"area_ratio": [10.0]}, results=["pressure"])
    with pytest.raises(pk.InputError, match=r"nozzle\.thrust can be set"):
        pk.Study(PERF, {"thrust": [1e5]})
    for what in ({}, 3.0, {"area_ratio": 10.0}, {"area_ratio": "10"}, {"area_ratio": [[1, 2], [3]]}, {"area_ratio": np.ones((2, 2))}):
        with pytest.raises(pk.InputError):
            pk.Study(PERF, what)
    with pytest.raises(pk.InputError, match="second name"):
        pk.Study(PERF, {"area_ratio": [10.0], "nozzle.area_ratio": [20.0]})
    with pytest.raises(pk.InputError, match="one of area_ratio or exit_pressure"):
        pk.Study(PERF, {"area_ratio": [10.0], "exit_pressure": [5e4]})
    with pytest.raises(pk.InputError, match="shifting"):
        pk.Study(PERF, {"nozzle.flow": ["shiftin"]})
    with pytest.raises(pk.InputError, match="thrust"):
        pk.Study(PERF, {"area_ratio": [10.0]}, results=["thrus"])
    with pytest.raises(pk.InputError, match="twice"):
        pk.Study(PERF, pd.DataFrame([[10.0, 20.0]], columns=["area_ratio", "area_ratio"]))
    with pytest.raises(pk.InputError, match="executor"):
        pk.Study(GAS, {"area_ratio": [10.0]}).run(executor=3)


def test_results_may_be_chosen():
    study = pk.Study(PERF, {"area_ratio": [10.0, 20.0]}, results=["thrust", "nozzle.exit.temperature"])
    assert study.results == ("thrust", "nozzle.exit.temperature")
    assert list(study.run(progress=False).frame.columns) == ["nozzle.area_ratio", "thrust", "nozzle.exit.temperature"]


def test_recipes_without_a_batch_form_are_rebuilt_one_by_one_with_the_same_numbers():
    cone = PERF.replace({"nozzle.contour": pk.Cone("15 deg")})
    result = pk.Study(cone, {"area_ratio": [10.0, 20.0]}).run(progress=False)
    agree(result, range(2), 1e-12)


def test_latin_hypercube_fills_every_stratum_once_and_is_seeded():
    ranges = {"chamber.pressure": ("5 MPa", "9 MPa"), "area_ratio": (10, 60), "nozzle.flow": ["shifting", "frozen"]}
    study = pk.Study.sample(PERF, ranges, 40, seed=3, results=["thrust"])
    first, again = study.run(progress=False).frame, pk.Study.sample(PERF, ranges, 40, seed=3, results=["thrust"]).run(progress=False).frame
    pd.testing.assert_frame_equal(first, again)
    strata = np.floor((first["nozzle.area_ratio"] - 10.0) / 50.0 * 40).astype(int)
    assert sorted(strata) == list(range(40))
    assert (first["nozzle.flow"] == "frozen").sum() == 20
    with pytest.raises(pk.InputError):
        pk.Study.sample(PERF, {"area_ratio": (60, 10)}, 40, seed=3)
    with pytest.raises(pk.InputError):
        pk.Study.sample(PERF, {"area_ratio": (10, 60)}, 1, seed=3)
    with pytest.raises(pk.InputError, match="seed"):
        pk.Study.sample(PERF, {"area_ratio": (10, 60)}, 10, seed=None)


def test_best_is_refined_between_the_designs():
    result = pk.Study(GAS, {"chamber.pressure": ["5 MPa", "7 MPa"], "nozzle.area_ratio": np.linspace(3, 40, 8)}).run(progress=False)
    coarse, fine = result.best("specific_impulse", refine=False), result.best("specific_impulse")
    assert fine.si("specific_impulse") > coarse.si("specific_impulse")
    # optimum expansion: the exit pressure is the ambient one (thrust equation, any text on propulsion)
    assert fine.nozzle.exit.si("pressure") == pytest.approx(101325.0, rel=1e-4)
    least = result.best("specific_impulse", minimum=True)
    assert least.si("specific_impulse") <= result.frame["specific_impulse"].min()
    with pytest.raises(pk.InputError, match="specific_impulse"):
        result.best("specific_impuls")


def test_pareto_keeps_what_nothing_else_beats():
    rng = np.random.default_rng(1)
    table = rng.random((200, 3))
    kept = set(undominated(table).tolist())
    for row in range(200):
        beaten = ((table >= table[row]).all(axis=1) & (table > table[row]).any(axis=1)).any()
        assert (row in kept) == (not beaten)
    result = pk.Study(PERF, {"case.mixture_ratio": np.linspace(2.6, 3.8, 9)}).run(progress=False)
    front = result.pareto("specific_impulse_vacuum", minimum=["chamber.temperature"])
    assert 0 < len(front) < 9
    assert front["specific_impulse_vacuum"].is_monotonic_decreasing
    assert front["chamber.temperature"].is_monotonic_decreasing


def test_tables_for_people_have_units_in_their_titles():
    result = pk.Study(GAS, {"chamber.pressure": ["5 MPa", "7 MPa"]}).run(progress=False)
    shown = result.display_frame("US")
    assert any(title.startswith("thrust [lb") for title in shown)
    assert shown.filter(like="chamber.pressure").iloc[0, 0] == pytest.approx(5e6 / 6894.757293168361, rel=1e-3)
    assert "MPa" in str(result)
    with pytest.raises(pk.InputError):
        result.display_frame("metric")


def test_exports_keep_every_digit(tmp_path):
    result = pk.Study(GAS, {"area_ratio": [10.0, 20.0], "performance.ambient": ["vacuum", "50 MPa"]}).run(progress=False)
    back = pd.read_csv(result.to_csv(tmp_path / "a.csv"), index_col="design")
    assert (
        f"{result.frame['thrust'][0]!r}" in (tmp_path / "a.csv").read_text() or back["thrust [N]"].tolist()[0] == result.frame["thrust"][0]
    )
    assert "stagnation pressure" in back["failed"][1]
    with pytest.raises(pk.StorageError):
        result.to_csv(tmp_path / "none" / "a.csv")
    parquet = pytest.importorskip("pyarrow.parquet")
    table = parquet.read_table(result.to_parquet(tmp_path / "a.parquet"))
    assert table.column("thrust").to_pylist()[0] == result.frame["thrust"][0]
    assert b'"thrust": "N"' in table.schema.metadata[b"propkit.units"]


# -- where it runs --------------------------------------------------------------------------------


RANGES = {"chamber.pressure": ("3 MPa", "20 MPa"), "case.mixture_ratio": (2.6, 3.8), "nozzle.area_ratio": (5, 60)}


def same_bits(one, other):
    assert len(one) == len(other)
    for name in one.results:
        assert np.array_equal(one.values(name), other.values(name), equal_nan=True), name


@pytest.fixture(scope="module")
def quick():
    """A study of three blocks of full size, which the quick engine solves but for a few designs; and its results in one thread."""
    results = ["thrust", "specific_impulse", "chamber.temperature", "nozzle.exit.pressure", "nozzle.throat.sound_speed"]
    ranges = {"chamber.pressure": (3e6, 2e7), "case.mixture_ratio": (3.0, 3.5), "nozzle.exit_pressure": (1e3, 1e5)}
    study = pk.Study.sample(PERF, ranges, 6_000, seed=3, results=results)
    here = study.run(executor=ThreadPoolExecutor(1), progress=False)
    said = re.search(r"quick engine solved 6000 designs and left (\d+) of them", " ".join(here.notes))
    assert said
    assert 0 < int(said[1]) < 300
    return study, here


def test_the_quick_engine_gives_the_same_bits_in_threads(quick):
    study, here = quick
    same_bits(here, study.run(executor=ThreadPoolExecutor(3), progress=False))
    same_bits(here, study.run(progress=False))


def test_the_quick_engine_gives_the_same_bits_in_processes(quick):
    study, here = quick
    with ProcessPoolExecutor(2, mp_context=get_context("spawn")) as pool:
        there = study.run(executor=pool, progress=False)
    assert there.notes == here.notes
    same_bits(here, there)


def test_the_quick_engine_gives_the_same_bits_on_a_cluster(quick):
    distributed = pytest.importorskip("distributed")
    study, here = quick
    with (
        distributed.LocalCluster(n_workers=1, threads_per_worker=2, processes=False, dashboard_address=None) as cluster,
        distributed.Client(cluster) as client,
    ):
        there = study.run(executor=client, progress=False)
    assert there.notes == here.notes
    same_bits(here, there)


def test_what_ran_before_does_not_change_a_bit(monkeypatch):
    """The first guesses of a box are kept for the next study of the same box: they follow from the box alone."""
    kept = OrderedDict()
    monkeypatch.setattr(fast_build, "_KEPT", kept)
    first = pk.Study.sample(PERF, RANGES, 700, seed=2)
    fresh = first.run(progress=False)
    for other in (RANGES | {"chamber.pressure": ("3 MPa", "21 MPa")}, RANGES | {"nozzle.area_ratio": (6, 50)}):
        pk.Study.sample(PERF, other, 700, seed=2).run(progress=False)
    same_bits(fresh, first.run(progress=False))
    assert 0 < len(kept) <= fast_build._MOST_KEPT
    axes = {"chamber.pressure": np.linspace(5e6, 9e6, 25), "case.mixture_ratio": np.linspace(3.0, 3.6, 28)}
    maps = [pk.Study(PERF.replace({"nozzle.area_ratio": ratio}), axes, results=["thrust"]) for ratio in (20.0, 21.0)]
    after = [made.run(progress=False) for made in maps]
    kept.clear()
    same_bits(after[1], maps[1].run(progress=False))


@pytest.fixture
def many(monkeypatch):
    """A study of several blocks, made quick by small blocks of a gas of given properties and of a burnt one."""
    monkeypatch.setattr(sweep_plan, "BLOCK", 40)
    return pk.Study(PERF, {"chamber.pressure": np.linspace(4e6, 9e6, 20), "area_ratio": np.linspace(5, 50, 10)})


def test_results_are_the_same_bits_wherever_they_run(many):
    here = many.run(executor=ThreadPoolExecutor(1), progress=False)
    threads = many.run(executor=ThreadPoolExecutor(3), progress=False)
    with ProcessPoolExecutor(2, mp_context=get_context("spawn")) as pool:
        processes = many.run(executor=pool, progress=False)
    for other in (threads, processes, many.run(progress=False)):
        for name in here.results:
            assert np.array_equal(here.values(name), other.values(name), equal_nan=True), name


def test_a_dask_cluster_gives_the_same_bits(many):
    distributed = pytest.importorskip("distributed")
    here = many.run(executor=ThreadPoolExecutor(1), progress=False)
    with (
        distributed.LocalCluster(n_workers=1, threads_per_worker=1, processes=False, dashboard_address=None) as cluster,
        distributed.Client(cluster) as client,
    ):
        there = many.run(executor=client, progress=False)
    assert np.array_equal(here.values("thrust"), there.values("thrust"))


def test_a_broken_pool_is_noted_and_the_rest_runs_here(many):
    with ProcessPoolExecutor(1, mp_context=get_context("spawn")) as pool:
        pool.submit(os._exit, 1)
        found = many.run(executor=pool, progress=False)
    assert len(found) == 200
    assert np.isfinite(found.frame["thrust"]).all()
    assert any("executor broke" in note for note in found.notes)


def test_an_interruption_leaves_a_partial_result_that_says_so(many):
    seen = threading.Event()

    def stop(done, total, seconds):
        if done >= 80:
            seen.set()
            raise KeyboardInterrupt

    found = many.run(executor=ThreadPoolExecutor(1), progress=stop)
    assert seen.is_set()
    assert found.interrupted
    assert len(found) in (40, 80)
    assert len(found.frame) == len(found)
    assert any("interrupted" in note for note in found.notes)
    assert np.isfinite(found.best("thrust", refine=False).si("thrust"))


def test_a_failing_block_is_kept_with_its_error(many, monkeypatch):
    from propkit.study.sweep_work import Work

    plain = Work.__call__

    def fails(self, block):
        if block[1]["chamber.pressure"][0] > 8e6:
            raise ArithmeticError("a block without a solution")
        return plain(self, block)

    monkeypatch.setattr(Work, "__call__", fails)
    found = many.run(executor=ThreadPoolExecutor(1), progress=False)
    assert len(found.failed) == 40
    assert "a block without a solution" in found.failed["reason"].iloc[0]


@pytest.mark.full
def test_five_hundred_random_designs_equal_the_objects():
    ranges = {
        "chamber.pressure": ("2 MPa", "25 MPa"),
        "case.mixture_ratio": (2.0, 5.0),
        "nozzle.area_ratio": (4.0, 120.0),
        "chamber.cstar_efficiency": (0.9, 1.0),
        "nozzle.flow": ["shifting", "frozen", "constant-property"],
    }
    result = pk.Study.sample(PERF, ranges, 500, seed=11).run(progress=False)
    assert len(result.failed) == 0
    agree(result, range(500))


def test_random_designs_equal_the_objects():
    ranges = {
        "chamber.pressure": ("2 MPa", "25 MPa"),
        "case.mixture_ratio": (2.0, 5.0),
        "nozzle.area_ratio": (4.0, 120.0),
        "chamber.cstar_efficiency": (0.9, 1.0),
    }
    result = pk.Study.sample(PERF, ranges, 600, seed=12).run(progress=False)
    assert len(result.failed) == 0
    agree(result, np.random.default_rng(1).choice(600, 12, replace=False))
