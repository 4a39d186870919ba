"""Speed of a panel in the browser: a report, never a timed test. `pytest -m full -s tests/browser/test_speed.py` prints the figures.

The aim is a 95th percentile of 150 ms from slider event to redrawn plot, and a median of 30 ms for the rebuild of the chain.
"""

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
def test_report_how_long_a_move_takes_to_be_shown(page: rig.Page) -> None:
    page.start("speed.ipynb", "panel = perf.panel()\npanel")
    speed.slider_times(page, PATHS[0], 5)
    for path in PATHS:
        times = np.array(speed.slider_times(page, path, 100))
        print(f"{path}: median {np.median(times):.0f} ms, 95th percentile {np.percentile(times, 95):.0f} ms, largest {times.max():.0f} ms")
        assert len(times) == 100


@pytest.mark.full
def test_report_how_long_the_kernel_rebuilds_the_chain(perf: pk.Performance) -> None:
    times = []
    for number in range(60):
        begin = time.perf_counter()
        perf.replace({"chamber.pressure": f"{8 + number / 50} MPa"})
        times.append(1e3 * (time.perf_counter() - begin))
    print(f"rebuild: median {statistics.median(times):.1f} ms, largest {max(times):.1f} ms")
    assert len(times) == 60
