"""Recordings: reading, flags, correlated means against known variances, zeros, throats, windows."""

import math

import numpy as np
import pandas as pd
import pytest
from scipy import signal

from propkit.errors import InputError, RangeError, StorageError
from propkit.reconcile.firing_series import Recording, flagged, read_recording, split_header
from propkit.reconcile.firing_statistics import mean_of, throat_at, variance_ratio, zero_of
from propkit.reconcile.firing_window import Criterion, burn, find_window

UNITS = {"chamber.pressure": "Pa", "thrust": "N"}
CHANNELS = {"chamber.pressure": "chamber pressure", "thrust": "thrust"}


def autoregressive(rng, count, rho, sigma=1.0):
    white = rng.standard_normal(count)
    start = rng.standard_normal()
    found, _ = signal.lfilter([math.sqrt(1.0 - rho**2)], [1.0, -rho], white, zi=[rho * start])
    return sigma * found


def table(count=400, **columns):
    time = np.arange(count) * 0.01
    rng = np.random.default_rng(0)
    base = {
        "time [s]": time,
        "chamber pressure [MPa]": 5.0 + 0.01 * rng.standard_normal(count),
        "thrust (kN)": 20.0 + 0.05 * rng.standard_normal(count),
    }
    return pd.DataFrame(base | columns)


def firing_of(noise=0.005, count=4000, seed=0, slope=0.0):
    """Return a recording with a burn from 10 s to 30 s at 100 samples a second."""
    rng = np.random.default_rng(seed)
    time = np.arange(count) * 0.01
    rise = np.clip((time - 10.0) / 1.5, 0.0, 1.0) * np.clip((30.0 - time) / 0.3, 0.0, 1.0)
    values = 5e6 * rise * (1.0 + slope * (time - 20.0)) + 5e6 * noise * rng.standard_normal(count)
    channel = flagged("chamber.pressure", "p [Pa]", "Pa", values)
    return Recording(time, {"chamber.pressure": channel})


# -- reading ---------------------------------------------------------------------------------------------


def test_csv_and_table_give_the_same(tmp_path):
    frame = table()
    frame.to_csv(tmp_path / "run.csv", index=False)
    one = read_recording(frame, CHANNELS, UNITS)
    two = read_recording(tmp_path / "run.csv", {**CHANNELS, "thrust": "thrust (kN)"}, UNITS)
    for name in CHANNELS:
        np.testing.assert_allclose(one.channels[name].values, two.channels[name].values, rtol=1e-12)
    np.testing.assert_allclose(one.channels["thrust"].values, frame["thrust (kN)"] * 1e3, rtol=1e-12)
    assert one.interval == pytest.approx(0.01)


def test_headers_and_offsets():
    assert split_header("thrust [kN]") == ("thrust", "kN")
    assert split_header("T1 (°C)") == ("T1", "°C")
    assert split_header("thrust") == ("thrust", None)
    frame = table(**{"feed [°C]": np.full(400, 20.0), "ms [ms]": np.arange(400) * 10.0})
    found = read_recording(frame, {"oxidizer_temperature": "feed"}, {"oxidizer_temperature": "K"}, time="ms")
    np.testing.assert_allclose(found.channels["oxidizer_temperature"].values, 293.15)
    np.testing.assert_allclose(found.time, np.arange(400) * 0.01, atol=1e-12)


def test_every_problem_is_listed_at_once():
    frame = table(**{"flow": np.ones(400), "mass [kg]": np.ones(400), "text [kN]": ["x"] * 400})
    channels = {"chamber.pressure": "chamber presure", "mass_flow": "flow", "thrust": "mass", "thrust_vacuum": "text"}
    units = {**UNITS, "mass_flow": "kg/s", "thrust_vacuum": "N"}
    with pytest.raises(InputError) as caught:
        read_recording(frame, channels, units)
    text = str(caught.value)
    for words in ("Did you mean 'chamber pressure'", "unit in brackets", "force", "'x' among its values"):
        assert words in text
    assert len(caught.value.problems) == 4


def test_gauge_units_in_a_header_are_refused():
    frame = table(**{"pc [psig]": np.full(400, 700.0)})
    with pytest.raises(InputError, match="gauge"):
        read_recording(frame, {"chamber.pressure": "pc"}, UNITS)


@pytest.mark.parametrize(
    ("change", "words"),
    [
        (lambda time: np.where(np.arange(400) == 200, 1.0, time), "increasing"),
        (lambda time: np.where(np.arange(400) == 7, np.nan, time), "a number in every row"),
        (lambda time: np.repeat(time[::2], 2), "increasing"),
    ],
)
def test_time_must_increase(change, words):
    frame = table()
    frame["time [s]"] = change(frame["time [s]"].to_numpy())
    with pytest.raises(InputError, match=words):
        read_recording(frame, CHANNELS, UNITS)


def test_files_that_are_no_recordings(tmp_path):
    with pytest.raises(StorageError, match="cannot be read"):
        read_recording(tmp_path / "none.csv", CHANNELS, UNITS)
    (tmp_path / "bad.csv").write_bytes(b"\xff\xfe\x00,1\n")
    with pytest.raises(InputError):
        read_recording(tmp_path / "bad.csv", CHANNELS, UNITS)
    with pytest.raises(InputError, match="10 rows"):
        read_recording(table(5), CHANNELS, UNITS)
    with pytest.raises(InputError, match="time"):
        read_recording(table().drop(columns="time [s]"), CHANNELS, UNITS)


# -- flags ------------------------------------------------------------------------------------------------


def test_anomalies_are_flagged_where_they_are():
    rng = np.random.default_rng(4)
    clean = 100.0 + autoregressive(rng, 3000, 0.8)
    values = clean.copy()
    values[[500, 1500]] += [30.0, -40.0]
    values[800] = 0.0
    values[1000:1030] = np.nan
    values[2000:2040] = values[2000]
    values[2500:2520] = 125.0
    channel = flagged("thrust", "thrust [N]", "N", values)
    assert np.flatnonzero(channel.spikes).tolist() == [500, 1500]
    assert channel.dropouts[800]
    assert channel.dropouts[1000:1030].all()
    assert channel.dropouts[2000:2040].all()
    assert channel.saturated[2500:2520].all()
    assert np.count_nonzero(~channel.good) == 2 + 1 + 30 + 40 + 20
    assert channel.notes() == (
        "thrust: 2 spikes left out",
        "thrust: 71 dropouts left out",
        "thrust: 20 saturated samples left out",
    )


def test_clean_series_have_hardly_any_flags():
    for seed in range(20):
        channel = flagged("thrust", "t [N]", "N", 100.0 + autoregressive(np.random.default_rng(seed), 5000, 0.9))
        assert channel.good.all()


def test_measuring_range_and_transients():
    values = np.concatenate([np.zeros(200), np.linspace(0.0, 50.0, 40), 50.0 + np.random.default_rng(1).standard_normal(500)])
    channel = flagged("thrust", "t [N]", "N", values, (-10.0, 51.0))
    assert np.array_equal(channel.saturated, values >= 51.0)
    rising = flagged("thrust", "t [N]", "N", values)
    assert not rising.good[200:240].all() or np.count_nonzero(~rising.good[200:240]) == 0
    assert not rising.dropouts[:200].any()  # a resting channel reads zero: that is no dropout


# -- means -------------------------------------------------------------------------------------------------


@pytest.mark.parametrize("rho", [-0.4, 0.0, 0.5, 0.9])
@pytest.mark.parametrize("count", [1, 7, 200])
def test_variance_ratio_against_its_sum(rho, count):
    lags = np.arange(1, count)
    assert variance_ratio(rho, count) == pytest.approx(1.0 + 2.0 * np.sum((1.0 - lags / count) * rho**lags), rel=1e-12)


def check_mean(seeds, tolerance, low, high):
    """Known variance of the mean of an AR(1) series: (sigma²/n)[1 + 2 sum (1 - k/n) rho^k]."""
    for rho in (0.0, 0.5, 0.8, 0.9):
        count, sigma = 2000, 3.0
        known = sigma * math.sqrt(variance_ratio(rho, count) / count)
        found = [mean_of(10.0 + autoregressive(np.random.default_rng([seed, 77]), count, rho, sigma)) for seed in range(seeds)]
        estimated = math.sqrt(np.mean([entry.standard_uncertainty**2 for entry in found]))
        assert estimated == pytest.approx(known, rel=tolerance)
        inside = sum(abs(entry.value - 10.0) <= 1.959964 * entry.standard_uncertainty for entry in found)
        assert low * seeds <= inside <= high * seeds
        assert np.mean([entry.deviation for entry in found]) == pytest.approx(sigma, rel=0.02)


def test_mean_of_a_correlated_series():
    check_mean(50, 0.12, 0.84, 1.0)


@pytest.mark.full
def test_mean_of_a_correlated_series_in_500_seeds():
    check_mean(500, 0.06, 0.91, 0.98)


def test_mean_of_few_or_equal_samples():
    with pytest.raises(InputError, match="at least 20"):
        mean_of(np.ones(19), "thrust")
    flat = mean_of(np.full(50, 3.0))
    assert (flat.value, flat.standard_uncertainty, flat.deviation) == (3.0, 0.0, 0.0)
    wander = mean_of(np.cumsum(np.random.default_rng(2).standard_normal(300)))
    assert wander.doubtful


# -- zeros and throats ---------------------------------------------------------------------------------------


def test_zero_and_drift_by_hand():
    rng = np.random.default_rng(5)
    before, after = 2.0 + 0.01 * rng.standard_normal(400), 5.0 + 0.01 * rng.standard_normal(400)
    zero = zero_of(before, after, 1.0)
    assert zero.correction == pytest.approx(2.5, abs=2e-3)
    assert zero.drift == pytest.approx(3.0, abs=3e-3)
    assert zero.drifted
    # uniform over the drift: 3/sqrt(12) (GUM 4.3.7)
    assert zero.standard_uncertainty == pytest.approx(3.0 / math.sqrt(12.0), rel=1e-2)
    steady = zero_of(before, before[::-1].copy(), 2.0)
    assert not steady.drifted
    assert zero_of(None, None, 0.0).correction == 0.0
    assert zero_of(before, None, 0.0).correction == pytest.approx(2.0, abs=2e-3)


def test_throat_between_two_measurements():
    hot, uncertainty = throat_at((0.1, 1e-5), (0.102, 2e-5), 0.5, (0.002, 0.0005))
    assert hot == pytest.approx(0.101 * 1.002)
    parts = [0.5e-5, 1e-5, 0.25 * 0.002 / math.sqrt(3.0)]
    assert uncertainty == pytest.approx(math.hypot(math.hypot(*parts) * 1.002, 0.101 * 0.0005))
    assert throat_at((0.1, 1e-5), None, 0.3) == (pytest.approx(0.1), pytest.approx(1e-5))


# -- window ---------------------------------------------------------------------------------------------------


def test_burn_and_window_are_found():
    recording = firing_of()
    ignition, cutoff = burn(recording, "chamber.pressure")
    assert ignition == pytest.approx(10.75, abs=0.05)  # half of a rise of 1.5 s
    assert cutoff == pytest.approx(29.85, abs=0.05)
    window = find_window(recording, "chamber.pressure")
    assert window.found
    assert 11.3 <= window.start <= 12.2
    assert 29.2 <= window.end <= 29.75
    assert abs(window.drift["chamber.pressure"]) < 0.01
    assert window.unsteady == ()
    assert 0.4 < window.share_of_burn < 0.6


def test_drifting_burn_gets_a_shorter_window():
    steep = find_window(firing_of(slope=0.002), "chamber.pressure")
    assert steep.end - steep.start < 9.0
    assert abs(steep.drift["chamber.pressure"]) < 0.015
    wide = find_window(firing_of(slope=0.002), "chamber.pressure", criterion=Criterion(drift=0.1, band=0.1))
    assert wide.end - wide.start > 15.0
    with pytest.raises(RangeError, match="no stretch of the burn"):
        find_window(firing_of(noise=0.0005, slope=0.06), "chamber.pressure", criterion=Criterion(drift=0.001, band=0.001))


def test_given_window_is_checked_not_changed():
    window = find_window(firing_of(slope=0.002), "chamber.pressure", given=(12.0, 29.0))
    assert (window.start, window.end, window.found) == (12.0, 29.0, False)
    assert window.unsteady == ("chamber.pressure",)
    for given, words in (
        ((5.0, 50.0), "inside the recording"),
        ((12.0, 12.05), "at least 20"),
        ((20.0, 12.0), "start first"),
        ("x", "pair"),
    ):
        with pytest.raises(InputError, match=words):
            find_window(firing_of(), "chamber.pressure", given=given)


def test_no_burn_is_said():
    time = np.arange(1000) * 0.01
    channel = flagged("chamber.pressure", "p", "Pa", -1.0 + 0.1 * np.random.default_rng(0).standard_normal(1000))
    with pytest.raises(RangeError, match="shows no burn"):
        find_window(Recording(time, {"chamber.pressure": channel}), "chamber.pressure")
    with pytest.raises(InputError, match="drift"):
        Criterion(drift=0.0)
