"""`pk.HotFire` on made-up firings with known truth."""

import math
import pickle

import numpy as np
import pandas as pd
import pytest

import propkit as pk
from propkit.errors import InputError, NotAvailableError, RangeError
from propkit.reconcile.firing_demo import CALIBRATION, HEADERS, demo_firing, demo_target, main

G0 = 9.80665
TARGET = demo_target()
CHANNELS = {name: header.partition(" [")[0] for name, header in HEADERS.items()}
MEASURED = (
    "characteristic_velocity",
    "thrust_coefficient",
    "specific_impulse",
    "mass_flow",
    "mixture_ratio",
    "throat_area",
)


def fire(seed=1, target=TARGET, **changes):
    made = demo_firing(target, seed)
    options = {
        "throat_before": made.throat_before,
        "throat_after": made.throat_after,
        "throat_growth": made.throat_growth,
        "calibration": {name: f"{100.0 * share:g} %" for name, share in CALIBRATION.items()},
        "name": f"Firing {seed}",
    }
    return pk.HotFire(target, made.table, CHANNELS, **{**options, **changes}), made.truth


FIRING, TRUTH = fire()


def test_delivered_results_by_hand():
    p, ox, fuel, force = (FIRING.means.loc[name, "value"] for name in HEADERS)
    diameter, _ = FIRING.throat_diameter
    area, flow = math.pi / 4.0 * diameter**2, ox + fuel
    table = FIRING.table["value"]
    # infinite contraction: the stagnation pressure is the measured one
    assert table["characteristic_velocity"] == pytest.approx(p * area / flow, rel=1e-12)
    assert table["thrust_coefficient"] == pytest.approx(force / (p * area), rel=1e-12)
    assert table["specific_impulse"] == pytest.approx(force / (flow * G0), rel=1e-12)
    assert table["mixture_ratio"] == pytest.approx(ox / fuel, rel=1e-12)


def test_uncertainty_of_cstar_by_hand():
    rows = FIRING.means
    p, ox, fuel = (rows.loc[name] for name in ("chamber.pressure", "oxidizer_mass_flow", "fuel_mass_flow"))
    diameter, doubt = FIRING.throat_diameter
    flow = ox["value"] + fuel["value"]
    relative = [
        p["standard_uncertainty"] / p["value"],
        2.0 * doubt / diameter,
        ox["standard_uncertainty"] / flow,
        fuel["standard_uncertainty"] / flow,
    ]
    row = FIRING.table.loc["characteristic_velocity"]
    assert row["standard_uncertainty"] / row["value"] == pytest.approx(math.sqrt(sum(r**2 for r in relative)), rel=1e-4)
    budget = FIRING.budget("characteristic_velocity")
    assert budget["share"].sum() == pytest.approx(1.0)
    assert budget.loc["chamber.pressure", "share"] == pytest.approx(relative[0] ** 2 / sum(r**2 for r in relative), rel=1e-3)


def test_efficiencies_against_objects_at_the_measured_conditions():
    means, (diameter, _) = FIRING.means["value"], FIRING.throat_diameter
    for flow in ("shifting", "frozen"):
        case = pk.PropellantCase("LOX", "LCH4", mixture_ratio=means["oxidizer_mass_flow"] / means["fuel_mass_flow"])
        chamber = pk.Chamber(case, pressure=means["chamber.pressure"])
        nozzle = pk.Nozzle(chamber, throat_diameter=diameter, exit_area=TARGET.nozzle.si("exit_area"), flow=flow)
        ideal = pk.Performance(nozzle, ambient="sea level")
        value = FIRING.table["value"]
        expected = value["characteristic_velocity"] / nozzle.si("characteristic_velocity")
        assert value[f"cstar_efficiency_{flow}"] == pytest.approx(expected, rel=1e-8)
        expected = value["thrust_coefficient"] / ideal.si("thrust_coefficient")
        assert value[f"thrust_coefficient_efficiency_{flow}"] == pytest.approx(expected, rel=1e-8)
        expected = value["specific_impulse"] / ideal.si("specific_impulse")
        assert value[f"specific_impulse_efficiency_{flow}"] == pytest.approx(expected, rel=1e-8)


def check_coverage(seeds, low, high):
    inside = dict.fromkeys((*MEASURED, "cstar_efficiency_shifting", "thrust_coefficient_efficiency_shifting"), 0)
    for seed in range(seeds):
        found, truth = fire(100 + seed)
        known = {**truth, "cstar_efficiency_shifting": 0.965, "thrust_coefficient_efficiency_shifting": 0.975}
        for name in inside:
            row = found.table.loc[name]
            inside[name] += row["low"] <= known[name] <= row["high"]
    assert all(low * seeds <= count <= high * seeds for count in inside.values()), inside


def test_intervals_cover_the_truth():
    # 95 % of 50 within three binomial standard deviations
    check_coverage(50, 0.86, 1.0)


@pytest.mark.full
def test_intervals_cover_the_truth_in_200_seeds():
    check_coverage(200, 0.91, 0.99)


def test_anomalies_are_left_out_and_said():
    spoiled = FIRING.means["left_out"]
    assert (spoiled >= 4).all()
    assert spoiled["fuel_mass_flow"] >= 25
    notes = [str(doubt) for doubt in FIRING.warnings]
    assert any("fuel_mass_flow: 25 dropouts left out" in note for note in notes)
    clean = demo_firing(TARGET, 1, anomalies=False)
    other = FIRING.replace(recording=clean.table)
    assert (other.means["left_out"] == 0).all()
    np.testing.assert_allclose(other.means["value"], FIRING.means["value"], rtol=1e-3)


def test_saturated_channel_is_said():
    made = demo_firing(TARGET, 2, anomalies=False)
    frame = made.table.copy()
    level = frame[HEADERS["thrust"]].quantile(0.7)
    frame[HEADERS["thrust"]] = frame[HEADERS["thrust"]].clip(upper=level)
    found = pk.HotFire(TARGET, frame, CHANNELS)
    assert any(doubt.code == "saturated" and doubt.about == "thrust" for doubt in found.warnings)


def test_zeros_are_found_and_subtracted():
    raw = FIRING.replace(correct_zero=False)
    assert raw.zeros.empty
    shift = raw.means["value"] - FIRING.means["value"]
    zeros = FIRING.zeros
    expected = 0.5 * (zeros["before"] + zeros["after"]) - zeros["expected"]
    np.testing.assert_allclose(shift[expected.index], expected, rtol=1e-9)
    assert zeros.loc["chamber.pressure", "expected"] == 101325.0
    assert zeros.loc["thrust", "expected"] == 0.0


def test_chosen_window_and_immutability():
    other = FIRING.replace(window=(6.0, 12.0))
    assert (other.window.start, other.window.end, other.window.found) == (6.0, 12.0, False)
    assert FIRING.window.found
    assert (other.means["samples"] + other.means["left_out"] == 1201).all()
    with pytest.raises(AttributeError):
        FIRING.window = None
    with pytest.raises(TypeError, match="windw"):
        FIRING.replace(windw=(1, 2))
    again = pickle.loads(pickle.dumps(FIRING))
    assert again.table.equals(FIRING.table)


def test_several_firings_in_one_table():
    second, _ = fire(2)
    table = pk.HotFire.together([FIRING, second])
    assert list(table.index) == ["Firing 1", "Firing 2"]
    assert table.loc["Firing 2", ("specific_impulse", "value")] == second.table.loc["specific_impulse", "value"]
    with pytest.raises(InputError, match="no firings"):
        pk.HotFire.together([])


def test_sheet_and_figures():
    text = str(FIRING)
    for word in ("Firing 1", "characteristic velocity", "Criterion: the longest stretch", "Zeros", "dropouts left out"):
        assert word in text
    figure = FIRING.trace("thrust")
    assert len(figure.layers[0].x.values) <= 2500
    assert max(value for value in figure.layers[0].y.values if value == value) == pytest.approx(
        np.nanmax(FIRING.recording.channels["thrust"].values) / 1e3
    )
    with pytest.raises(InputError, match="no channel"):
        FIRING.trace("thrst")
    assert FIRING._repr_mimebundle_()["text/html"]


def test_means_feed_a_reconciliation():
    fit = pk.Reconciliation(
        TARGET,
        FIRING.as_figures(),
        free=[
            "chamber.pressure",
            "throat_diameter",
            "mixture_ratio",
            "cstar_efficiency",
            "thrust_coefficient_efficiency",
        ],
    )
    assert fit.degrees_of_freedom == 0
    row = fit.unknowns.loc["chamber.cstar_efficiency"]
    assert row["value"] == pytest.approx(FIRING.table.loc["cstar_efficiency_shifting", "value"], rel=1e-6)


def test_gas_of_given_properties_and_total_flow():
    gas = pk.Chamber.from_gas(pressure="2 MPa", temperature="300 K", molar_mass="28 g/mol", isentropic_exponent=1.4)
    target = pk.Performance(pk.Nozzle(gas, area_ratio=5, throat_diameter="20 mm"), ambient="sea level")
    rng = np.random.default_rng(0)
    time = np.arange(3000) * 0.01
    shape = ((time > 8.0) & (time < 22.0)).astype(float)
    frame = pd.DataFrame({"t [s]": time})
    for header, level in (
        ("p [MPa]", 2.0),
        ("flow [kg/s]", target.si("mass_flow")),
        ("thrust [N]", target.si("thrust")),
    ):
        base = 0.101325 if header == "p [MPa]" else 0.0
        frame[header] = base + (level - base) * shape + 1e-3 * level * rng.standard_normal(3000)
    found = pk.HotFire(target, frame, {"chamber.pressure": "p", "mass_flow": "flow", "thrust": "thrust"})
    table = found.table
    assert table.loc["cstar_efficiency_constant_property", "value"] == pytest.approx(1.0, abs=3e-3)
    assert table.loc["thrust_coefficient_efficiency_constant_property", "value"] == pytest.approx(1.0, abs=3e-3)
    assert "mixture_ratio" not in table.index
    with pytest.raises(NotAvailableError, match="not among the results"):
        found.budget("mixture_ratio")


def test_script_writes_a_recording(tmp_path):
    assert main([str(tmp_path / "run.csv"), "--seed", "1"]) == 0
    found = pk.HotFire(TARGET, tmp_path / "run.csv", CHANNELS)
    # without calibration and throat the means are those of the table, to the digits written
    np.testing.assert_allclose(found.means["value"], FIRING.means["value"], rtol=1e-5)


@pytest.mark.parametrize(
    ("change", "words"),
    [
        ({"throat_before": ("80 mm", "0 mm")}, "above 0"),
        ({"throat_before": "80 mm"}, "pair"),
        ({"throat_after": ("40 mm", "0.1 mm")}, "radius"),
        ({"throat_growth": 1.002}, "share of the diameter"),
        ({"calibration": {"mass_flow": "1 %"}}, "for channels of the recording"),
        ({"window": (1.0, 1.02)}, "at least 20"),
        ({"zero_before": (0.0, 0.01)}, "good samples"),
        ({"channels": {"thrust": "thrust"}}, "chamber.pressure"),
        ({"channels": {"chamber.pressure": "chamber pressure"}}, "with a flow or the thrust"),
        ({"channels": {**CHANNELS, "flow of things": "thrust"}}, "named by a quantity"),
    ],
)
def test_refusals(change, words):
    with pytest.raises(InputError, match=words):
        FIRING.replace(**change)


def test_recording_without_a_burn():
    made = demo_firing(TARGET, 1, anomalies=False).table
    quiet = made[made["time [s]"] < 2.9].reset_index(drop=True)
    with pytest.raises((RangeError, InputError)):
        FIRING.replace(recording=quiet)


def _plain_firing(perf, ramp, seconds=20.0, noise=0.0, seed=0):
    """A recording whose truth is the performance itself, times `ramp` of time (0 cold, 1 burning)."""
    rng = np.random.default_rng(seed)
    time = np.arange(0.0, seconds, 0.01)
    share = ramp(time)
    scatter = rng.normal(0.0, noise, (4, time.size)) if noise else np.zeros((4, time.size))
    pressure = 101325.0 + (perf.chamber.si("pressure") - 101325.0) * share
    table = pd.DataFrame(
        {
            "time [s]": time,
            "pc [Pa]": pressure * (1.0 + scatter[0]),
            "ox [kg/s]": perf.si("oxidizer_mass_flow") * share * (1.0 + scatter[1]),
            "fu [kg/s]": perf.si("fuel_mass_flow") * share * (1.0 + scatter[2]),
            "F [N]": perf.si("thrust") * share * (1.0 + scatter[3]),
        }
    )
    channels = {
        "chamber.pressure": "pc [Pa]",
        "oxidizer_mass_flow": "ox [kg/s]",
        "fuel_mass_flow": "fu [kg/s]",
        "thrust": "F [N]",
    }
    return table, channels


@pytest.fixture(scope="module")
def stand():
    case = pk.PropellantCase("LOX", "LCH4", mixture_ratio=3.0)
    nozzle = pk.Nozzle(pk.Chamber(case, pressure="3 MPa"), area_ratio=6, throat_diameter="50 mm")
    return pk.Performance(nozzle, ambient="sea level")


def _burn(start, end):
    return lambda time: np.clip((time - start) / 0.5, 0.0, 1.0) * np.clip((end - time) / 0.5, 0.0, 1.0)


def test_a_long_gap_in_the_pressure_leaves_the_results_right_and_says_so(stand):
    table, channels = _plain_firing(stand, _burn(3.0, 15.0), noise=1e-3)
    table.loc[400:1300, "pc [Pa]"] = np.nan
    firing = pk.HotFire(stand, table, channels)
    assert firing.table.loc["specific_impulse", "value"] == pytest.approx(stand.si("specific_impulse"), rel=1e-3)
    assert firing.table.loc["cstar_efficiency_shifting", "value"] == pytest.approx(1.0, abs=2e-3)
    assert any(doubt.code == "gap" and "chamber.pressure" in doubt for doubt in firing.warnings)
    assert not any(doubt.code == "zero-drift" for doubt in firing.warnings)


def test_zeros_leave_out_another_burn_of_the_same_recording(stand):
    first, second = _burn(3.0, 15.0), _burn(22.0, 28.0)
    table, channels = _plain_firing(stand, lambda time: first(time) + second(time), seconds=40.0, noise=1e-3)
    firing = pk.HotFire(stand, table, channels)
    assert firing.zeros["drift"].abs().max() < 100.0
    assert firing.table.loc["thrust", "value"] == pytest.approx(stand.si("thrust"), rel=1e-3)


def test_a_recording_in_which_nothing_burns_is_refused(stand):
    table, channels = _plain_firing(stand, lambda time: 0.0 * time + 1e-6, noise=1e-3)
    with pytest.raises(pk.RangeError, match="nothing burns"):
        pk.HotFire(stand, table, channels)


def test_an_efficiency_within_its_uncertainty_of_one_is_no_doubt_and_a_frozen_reference_never_is(stand):
    table, channels = _plain_firing(stand, _burn(3.0, 15.0), noise=1e-3)
    firing = pk.HotFire(stand, table, channels)
    assert firing.table.loc["cstar_efficiency_frozen", "value"] > 1.0
    assert not any(doubt.code == "efficiency" for doubt in firing.warnings)
    low = pk.HotFire(stand, table, channels, throat_before=("52 mm", "0.01 mm"))
    assert any(doubt.code == "efficiency" for doubt in low.warnings)


def test_a_missing_calibration_is_a_doubt(stand):
    table, channels = _plain_firing(stand, _burn(3.0, 15.0), noise=1e-3)
    whole = dict.fromkeys(channels, "0.3 %")
    assert any(doubt.code == "calibration" for doubt in pk.HotFire(stand, table, channels).warnings)
    assert not any(d.code == "calibration" for d in pk.HotFire(stand, table, channels, calibration=whole).warnings)


def test_stretches_of_time_may_be_typed_with_units(stand):
    table, channels = _plain_firing(stand, _burn(3.0, 15.0), noise=1e-3)
    typed = pk.HotFire(stand, table, channels, window=("6 s", "10 s"), zero_before=("0 s", "2000 ms"))
    plain = pk.HotFire(stand, table, channels, window=(6.0, 10.0), zero_before=(0.0, 2.0))
    assert typed.window == plain.window
    assert typed.table.equals(plain.table)
    with pytest.raises(pk.InputError, match="zero_after"):
        pk.HotFire(stand, table, channels, zero_after="late")


@pytest.mark.parametrize("source", [[1, 2], None, 3.0])
def test_what_is_no_recording_is_refused_in_words(stand, source):
    with pytest.raises(pk.InputError, match="path of a CSV file, or a DataFrame"):
        pk.HotFire(stand, source, {"chamber.pressure": "p", "thrust": "F"})


def test_columns_divided_by_semicolons_get_a_hint(stand, tmp_path):
    path = tmp_path / "stand.csv"
    path.write_text("time [s];pc [bar]\n" + "".join(f"{k};1,5\n" for k in range(30)), encoding="utf-8")
    with pytest.raises(pk.InputError, match="semicolons"):
        pk.HotFire(stand, path, {"chamber.pressure": "pc", "thrust": "F"})
