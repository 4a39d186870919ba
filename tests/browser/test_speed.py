"""Speed of a panel in the browser. A quick check in every run; the full count with `pytest -m full`, which prints the figures."""

from __future__ import annotations

import statistics
import time

import numpy as np
import pytest
import rig
import speed

import propkit as pk

pytestmark = pytest.mark.browser
PATHS = ("chamber.pressure", "case.mixture_ratio", "nozzle.area_ratio")


@pytest.mark.full
def test_a_move_is_shown_within_150_milliseconds(page: rig.Page) -> None:
    page.start("speed.ipynb", "panel = perf.panel()\npanel")
    speed.slider_times(page, PATHS[0], 5)
    for path in PATHS:
        times = np.array(speed.slider_times(page, path, 100))
        print(f"{path}: median {np.median(times):.0f} ms, 95th percentile {np.percentile(times, 95):.0f} ms, largest {times.max():.0f} ms")
        assert np.percentile(times, 95) <= 150.0


@pytest.mark.full
def test_the_kernel_rebuilds_the_chain_within_30_milliseconds(perf: pk.Performance) -> None:
    times = []
    for number in range(60):
        begin = time.perf_counter()
        perf.replace({"chamber.pressure": f"{8 + number / 50} MPa"})
        times.append(1e3 * (time.perf_counter() - begin))
    print(f"rebuild: median {statistics.median(times):.1f} ms, largest {max(times):.1f} ms")
    assert statistics.median(times) <= 30.0
