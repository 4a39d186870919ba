"""A panel in a real browser, offline: what a person reads, and what BokehJS holds, against objects built anew."""

from __future__ import annotations

import json
from typing import Any

import numpy as np
import pytest
import rig

import propkit as pk
from propkit.plots import curves
from propkit.series import Line

pytestmark = pytest.mark.browser

PRESSURE, RATIO = "chamber.pressure", "case.mixture_ratio"


def built(pressure: Any = "9.7 MPa", ratio: Any = 3.4) -> pk.Performance:
    nozzle = pk.Nozzle(
        pk.Chamber(pk.PropellantCase("LOX", "LCH4", mixture_ratio=ratio), pressure=pressure), area_ratio=35, throat_diameter="0.18 m"
    )
    return pk.Performance(nozzle, ambient="sea level")


def assert_shows(page: rig.Page, expected: pk.Performance, number: int = 0) -> None:
    """Readout, plot data and title of a panel are those of an object built on its own."""
    panel = page.panel(number)
    for name, unit in (("thrust", "kN"), ("specific_impulse", "s"), ("mass_flow", "kg/s"), ("thrust_vacuum", "kN")):
        assert panel.number(name) == pytest.approx(getattr(expected, name).to(unit).magnitude, rel=5.1e-5), name
        assert panel.result(name)[1] == unit
    held = {figure["name"]: figure for figure in page.figures()}
    for name in ("thrust", "specific_impulse"):
        wanted = curves.altitude_figure(expected, name, "SI")
        for place, layer in enumerate(wanted.layers):
            if isinstance(layer, Line):
                got = np.array(held[wanted.name]["sources"][f"layer-{place}"]["y"], dtype=float)
                np.testing.assert_allclose(got, layer.y.values, rtol=1e-12)


def test_a_whole_session(page: rig.Page) -> None:
    panel = page.start("session.ipynb", "panel = perf.panel()\npanel")
    assert_shows(page, built())
    pixels = page.canvases()

    panel.press_slider(PRESSURE, "ArrowRight", 3)
    text = panel.field(PRESSURE).input_value()
    assert float(text.split()[0]) > 9.7
    assert_shows(page, built(text))
    assert page.canvases() != pixels

    panel.type(RATIO, "3.6")
    assert_shows(page, built(text, 3.6))

    panel.type(PRESSURE, "80 psig")
    assert "gauge pressure" in panel.error(PRESSURE)
    assert panel.status().startswith("Not current")
    assert_shows(page, built(text, 3.6))
    panel.click("Undo")
    assert panel.error(PRESSURE) == panel.status() == ""
    panel.click("Undo")
    assert_shows(page, built(text))
    panel.click("Redo")
    assert_shows(page, built(text, 3.6))

    panel.click("Pin")
    panel.type(PRESSURE, "1500 psia")
    step = built("1500 psia", 3.6).thrust.to("kN").magnitude - built(text, 3.6).thrust.to("kN").magnitude
    shown = panel.root.locator('.pk-results tr[data-name="thrust"] .pk-step').first.inner_text()
    assert float(shown.replace("\n", "").replace("−", "-")) == pytest.approx(step, abs=0.006)

    panel.click("US")
    assert panel.result("thrust")[1] == "lbf"
    assert panel.number("thrust") == pytest.approx(built("1500 psia", 3.6).thrust.to("lbf").magnitude, rel=5.1e-5)
    assert panel.field(PRESSURE).input_value() == "1500 psia"
    assert [figure["title"] for figure in page.figures()] == ["Thrust against altitude", "Specific impulse against altitude"]
    panel.click("SI")
    assert_shows(page, built("1500 psia", 3.6))

    code = panel.root.locator("code").inner_text() or panel.root.locator("code").text_content()
    scope: dict[str, Any] = {}
    exec(str(code), scope)
    assert scope["performance"] == built("1500 psia", 3.6)


def test_reload_shows_the_current_state_and_a_cut_plot_update_is_noticed(page: rig.Page) -> None:
    """The comparison is worth something only if it can fail: without the update of the plot it does."""
    panel = page.start("reload.ipynb", "panel = perf.panel()\npanel")
    panel.type(PRESSURE, "7.3 MPa")
    page.page.keyboard.press("Escape")
    page.command("docmanager:save")
    page.page.wait_for_timeout(500)
    page.page.reload()
    page.page.wait_for_selector(".pk-panel", timeout=60_000)
    page.wait_figures(2)
    assert_shows(page, built("7.3 MPa"))
    page.panel().press_slider(PRESSURE, "ArrowRight", 2)
    assert_shows(page, built(page.panel().field(PRESSURE).input_value()))
    page.page.evaluate("() => document.querySelectorAll('.pk-figure').forEach((figure) => { figure.__propkit.fill = () => {}; })")
    page.panel().press_slider(PRESSURE, "ArrowRight", 3)
    with pytest.raises(AssertionError):
        assert_shows(page, built(page.panel().field(PRESSURE).input_value()))


def test_a_slider_moves_while_a_cell_runs_and_two_views_stay_in_step(page: rig.Page) -> None:
    page.start("busy.ipynb", "panel = perf.panel()\npanel", "panel.view('chamber')", "import time\ntime.sleep(0)", count=3)
    page.page.evaluate(
        """() => {
          const kernel = window.jupyterapp.shell.currentWidget.sessionContext.session.kernel;
          window.over = false;
          kernel.requestExecute({code: 'import time; time.sleep(8)'}).done.then(() => { window.over = true; });
        }"""
    )
    page.page.wait_for_timeout(300)
    panel, view = page.panel(0), page.panel(1)
    panel.press_slider(PRESSURE, "ArrowRight", 2)
    text = panel.field(PRESSURE).input_value()
    assert page.page.evaluate("() => window.over") is False, "the cell was over before the slider moved"
    assert text != "9.7 MPa"
    assert_shows(page, built(text))
    view.settle()
    assert view.number("temperature") == pytest.approx(built(text).chamber.temperature.magnitude, rel=5.1e-6)


def test_without_a_kernel_the_static_sheet_stays(page: rig.Page) -> None:
    panel = page.start("twin.ipynb", "panel = perf.panel()\npanel")
    assert not page.page.locator(".pk-twin").first.is_visible()
    panel.type(PRESSURE, "7.3 MPa")
    page.command("docmanager:save")
    page.page.wait_for_timeout(800)
    saved = json.loads((page.lab.work / "twin.ipynb").read_text())
    outputs = saved["cells"][1]["outputs"]
    assert "application/vnd.propkit.record+json" in outputs[0]["data"]
    saved["cells"][0]["source"] = "# seen by another reader"
    saved["cells"][0]["outputs"] = []
    (page.lab.work / "untrusted.ipynb").write_text(json.dumps(saved))
    reader = rig.Page(page.context.browser, page.lab)
    reader.open("untrusted.ipynb")
    reader.page.wait_for_selector(".pk-twin", timeout=20_000)
    twin = reader.page.locator(".pk-twin").first
    assert twin.is_visible()
    assert f"{built().thrust.to('kN').magnitude:.2f}" in twin.inner_text()
    assert twin.locator("img").count() >= 1
    assert reader.outside == []
    reader.close()


def test_a_panel_whose_kernel_was_started_anew_says_so(page: rig.Page) -> None:
    panel = page.start("restart.ipynb", "panel = perf.panel()\npanel")
    page.page.evaluate("() => window.jupyterapp.shell.currentWidget.sessionContext.restartKernel()")
    page.page.wait_for_timeout(1500)
    page.wait_idle()
    panel.press_slider(PRESSURE, "ArrowRight")
    assert panel.status().startswith("No kernel is behind this panel")
    assert page.page.locator(".pk-twin").first.is_visible()
    assert_shows(page, built())
    page.run_all()
    page.wait_figures(2)
    page.panel().press_slider(PRESSURE, "ArrowRight", 2)
    assert page.panel().status() == ""
    assert float(page.panel().field(PRESSURE).input_value().split()[0]) > 9.7


def test_keyboard_labels_and_a_narrow_page_without_jumps(page: rig.Page) -> None:
    panel = page.start("keys.ipynb", "panel = perf.panel()\npanel")
    unlabelled = panel.root.evaluate(
        """(root) => [...root.querySelectorAll('input, select, button')].filter((item) => item.offsetParent &&
             !(item.labels && item.labels.length) && !item.getAttribute('aria-label') && !item.textContent.trim()).map((item) => item.outerHTML)"""
    )
    assert unlabelled == []
    panel.field(PRESSURE).focus()
    page.page.keyboard.press("Control+a")
    page.page.keyboard.type("8 MPa")
    page.page.keyboard.press("Enter")
    panel.settle()
    page.page.keyboard.press("Tab")
    page.page.keyboard.press("Enter")
    panel.settle()
    assert panel.field(PRESSURE).input_value() == "9.7 MPa"
    reached = set()
    panel.button("Pin").focus()
    for _ in range(30):
        page.page.keyboard.press("Tab")
        reached.add(
            page.page.evaluate("() => document.activeElement.closest('[data-path]')?.dataset.path ?? document.activeElement.className")
        )
    assert {PRESSURE, RATIO, "nozzle.area_ratio", "performance.ambient", "case.fuel"} <= reached

    page.page.set_viewport_size({"width": 700 + 330, "height": 1000})
    page.page.wait_for_timeout(400)
    assert panel.root.evaluate("(root) => root.scrollWidth <= root.clientWidth + 1")
    place = "(root) => [...root.querySelectorAll('.pk-control, .pk-figures, .pk-results')].map((item) => Math.round(item.getBoundingClientRect().top - root.getBoundingClientRect().top))"
    before = panel.root.evaluate(place)
    panel.press_slider(PRESSURE, "ArrowRight", 5)
    assert panel.root.evaluate(place) == before
