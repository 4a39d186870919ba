"""The panel of a study in a real browser, offline: the map that BokehJS holds against a study run on its own."""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest
import rig

import propkit as pk

pytestmark = pytest.mark.browser

PRESSURE, RATIO, EPSILON = "chamber.pressure", "case.mixture_ratio", "nozzle.area_ratio"
RATIOS, EPSILONS = np.linspace(2.4, 4.4, 50), np.linspace(8.0, 80.0, 50)
CELL = """import numpy as np
study = pk.Study(perf, {"case.mixture_ratio": np.linspace(2.4, 4.4, 50), "nozzle.area_ratio": np.linspace(8.0, 80.0, 50)})
panel = study.panel("specific_impulse", limits={"separation_margin": (1, None)})
panel"""
POINTS, BAND, BEST = 3, 2, 4
"""Layers of the map: the designs, the band of the limit, the mark of the best one."""


def built(pressure: str) -> pk.Performance:
    nozzle = pk.Nozzle(
        pk.Chamber(pk.PropellantCase("LOX", "LCH4", mixture_ratio=3.4), pressure=pressure), area_ratio=35, throat_diameter="0.18 m"
    )
    return pk.Performance(nozzle, ambient="sea level")


def run(pressure: str) -> Any:
    return pk.Study(built(pressure), {RATIO: RATIOS, EPSILON: EPSILONS}).run(progress=False)


def assert_map(page: rig.Page, wanted: Any) -> None:
    """The map that BokehJS holds, its mark and the readout are those of a study run on its own."""
    held = page.figures()[0]["sources"]
    table = wanted.frame.sort_values([EPSILON, RATIO])
    points = held[f"layer-{POINTS}"]
    np.testing.assert_allclose(np.array(points["hover0"], dtype=float), table["specific_impulse"], rtol=1e-8)
    np.testing.assert_allclose(np.array(points["x"], dtype=float), table[RATIO], rtol=1e-12)
    full = table[np.array(points["hover1"], dtype=float) >= 1.0]
    best = full.loc[full["specific_impulse"].idxmax()]
    mark = held[f"layer-{BEST}"]
    assert mark["x"][0] == pytest.approx(best[RATIO])
    assert mark["y"][0] == pytest.approx(best[EPSILON])
    shown = page.panel().root.locator('.pk-answer[data-name="specific_impulse"] b').inner_text()
    assert float(shown) == pytest.approx(best["specific_impulse"], abs=0.006)
    # the band ends where the middle of three criteria just predicts separation
    ring = np.array(held[f"layer-{BAND}"]["ys"][0], dtype=float)
    lowest = table.loc[np.array(points["hover1"], dtype=float) < 1.0, EPSILON].min()
    step = EPSILONS[1] - EPSILONS[0]
    assert lowest - step <= np.nanmin(ring) <= lowest + 1e-9


def test_a_live_map(page: rig.Page) -> None:
    panel = page.start("study.ipynb", CELL, count=1)
    assert_map(page, run("9.7 MPa"))
    pixels = page.canvases()

    slider = panel.control(PRESSURE).locator(".pk-slider")
    slider.scroll_into_view_if_needed()
    box = slider.bounding_box()
    height = box["y"] + box["height"] / 2
    page.page.mouse.move(box["x"] + 0.3 * box["width"], height)
    page.page.mouse.down()
    for share in np.linspace(0.3, 0.55, 12):
        page.page.mouse.move(box["x"] + float(share) * box["width"], height)
        page.page.wait_for_timeout(60)
    panel.settle()
    moved = panel.field(PRESSURE).input_value()
    assert moved != "9.7 MPa"
    assert_map(page, run(moved))
    page.page.mouse.up()
    panel.settle()
    assert_map(page, run(panel.field(PRESSURE).input_value()))
    assert page.canvases() != pixels

    panel.type("study.x_low", "5")
    assert "below the highest" in panel.error("study.x_low")
    assert panel.status().startswith("Not current")
    assert_map(page, run(moved))
    panel.click("Undo")
    assert panel.status() == ""

    panel.click("Undo")
    assert panel.field(PRESSURE).input_value() == "9.7 MPa"
    assert_map(page, run("9.7 MPa"))

    live = panel.root.locator(".pk-live").first.bounding_box()
    page.page.mouse.click(live["x"] + 0.5 * live["width"], live["y"] + 0.4 * live["height"])
    panel.settle()
    assert "Opened design" in panel.root.locator(".pk-above").inner_text()

    page.command("docmanager:save")
    page.wait_idle()
    page.page.reload()
    page.page.wait_for_selector(".jp-Notebook", timeout=60_000)
    page.wait_figures(1)
    assert_map(page, run("9.7 MPa"))


def test_an_uncertainty_is_redrawn_at_every_move(page: rig.Page) -> None:
    cell = 'panel = pk.Uncertainty(perf, {"chamber.pressure": "1 %", "nozzle.throat_diameter": "0.2 %"}).panel("thrust")\npanel'
    panel = page.start("uncertainty.ipynb", cell, count=2)

    def assert_budget(spread: str) -> None:
        wanted = pk.Uncertainty(built("9.7 MPa"), {PRESSURE: spread, "nozzle.throat_diameter": "0.2 %"}).run().budget("thrust")
        bars = page.figures()[0]["sources"]["layer-0"]
        assert bars["category"] == list(wanted.index)
        np.testing.assert_allclose(np.array(bars["value"], dtype=float), wanted["contribution"] / 1e3, rtol=1e-12)

    assert_budget("1 %")
    panel.press_slider("uncertainty.chamber.pressure", "ArrowRight", 4)
    assert_budget(panel.field("uncertainty.chamber.pressure").input_value())
    panel.type("uncertainty.chamber.pressure", "2 kg")
    assert "another kind" in panel.error("uncertainty.chamber.pressure")
    panel.click("Undo")
    panel.type("uncertainty.chamber.pressure", "0.05 MPa")
    assert_budget("0.05 MPa")
    panel.click("Run 10000 trials")
    page.page.wait_for_timeout(500)
    assert [figure["name"] for figure in page.figures()] == ["tornado-thrust", "histogram-thrust"]
