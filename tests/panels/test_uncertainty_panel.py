"""Panels of uncertainties on the kernel's side: first order at every move, trials on demand, the numbers of a line of code."""

from __future__ import annotations

import gc
import weakref
from typing import Any

import numpy as np
import pytest

import propkit as pk

pytest.importorskip("ipywidgets")

PRESSURE, THROAT = "chamber.pressure", "nozzle.throat_diameter"
SPREAD = "uncertainty.chamber.pressure"


def built(pressure: Any = "9.7 MPa") -> pk.Performance:
    nozzle = pk.Nozzle(
        pk.Chamber(pk.PropellantCase("LOX", "LCH4", mixture_ratio=3.4), pressure=pressure), area_ratio=35, throat_diameter="0.18 m"
    )
    return pk.Performance(nozzle, ambient="sea level")


def uncertain(target: pk.Performance | None = None, pressure: Any = "1 %") -> pk.Uncertainty:
    inputs = {PRESSURE: pk.Normal(pressure), THROAT: pk.Uniform("0.2 mm"), "case.mixture_ratio": "0.5 %"}
    return pk.Uncertainty(target or built(), inputs, correlation={(PRESSURE, "case.mixture_ratio"): 0.3})


@pytest.fixture
def panel() -> Any:
    made = uncertain().panel("thrust")
    yield made
    made.close()


def page(panel: Any, **asked: Any) -> None:
    """Send what the page sends: a custom message through the widget's own handler."""
    panel.widget._handle_msg({"content": {"data": {"method": "custom", "content": {"client": "t", "number": 1, **asked}}}, "buffers": []})


def control(panel: Any, path: str) -> dict[str, Any]:
    return next(entry for group in panel.content()["sets"] for entry in (*group["controls"], *group["minor"]) if entry["path"] == path)


def bars(panel: Any) -> Any:
    return panel.figures()[0].layers[0]


def test_the_value_is_the_result_of_a_line_of_code(panel: Any) -> None:
    assert panel.value.table.equals(uncertain().run().table)
    seen: list[Any] = []
    panel.observe(lambda change: seen.append(change["new"]), "value")
    panel.controls[SPREAD].value = "2 %"
    assert seen == [panel.value]
    wanted = uncertain(pressure="2 %").run()
    assert panel.value.table.equals(wanted.table)
    assert panel.uncertainty.inputs[PRESSURE] == pk.Normal("2 %")


def test_nominal_inputs_of_the_chain_are_controls_too(panel: Any) -> None:
    page(panel, do="slide", path=PRESSURE, at=8.4, phase="drag")
    assert panel.value.table.equals(uncertain(built("8.4 MPa")).run().table)


@pytest.mark.parametrize(
    ("asked", "wanted"),
    [
        ({"do": "slide", "at": 1.5, "phase": "drag"}, "1.500 %"),
        ({"do": "type", "text": "1.8"}, "1.8 %"),
        ({"do": "type", "text": "0.05 MPa"}, "0.05 MPa"),
        ({"do": "type", "text": "20 psi"}, "20 psi"),
    ],
)
def test_the_spread_of_an_input_is_a_slider_and_a_text_with_units(panel: Any, asked: dict[str, Any], wanted: str) -> None:
    page(panel, path=SPREAD, **asked)
    assert panel.errors == {}
    assert panel.value.table.equals(uncertain(pressure=wanted).run().table)
    assert control(panel, SPREAD)["text"] == wanted
    page(panel, do="reset", path=SPREAD)
    assert panel.value.table.equals(uncertain().run().table)


def test_the_bars_are_the_budget_and_the_curve_the_interval(panel: Any) -> None:
    panel.set(SPREAD, "3 %")
    budget = uncertain(pressure="3 %").run().budget("thrust")
    assert bars(panel).categories == tuple(budget.index)
    np.testing.assert_allclose(bars(panel).values.values, budget["contribution"] / 1e3, rtol=1e-12)
    curve = panel.figures()[1]
    row = uncertain(pressure="3 %").run().table.loc["thrust"]
    assert [rule.at for rule in curve.layers[1:]] == pytest.approx([row["value"] / 1e3, row["low"] / 1e3, row["high"] / 1e3])
    x, y = (np.array(series.values) for series in (curve.layers[0].x, curve.layers[0].y))
    assert np.trapezoid(y, x) == pytest.approx(1.0, abs=1e-3)
    answer = panel.content()["headline"]
    assert float(answer[1]["text"]) == pytest.approx(row["standard_uncertainty"] / 1e3, rel=0.05)


def test_the_result_shown_can_be_chosen_without_a_new_run(panel: Any) -> None:
    before = panel.value
    page(panel, do="choose", path="uncertainty.result", choice="specific_impulse")
    assert panel.value is before
    assert panel.figures()[0].name == "tornado-specific_impulse"
    assert "result.plot('specific_impulse'" in panel.as_code()


def test_trials_are_run_by_the_button_and_dropped_by_a_move(panel: Any) -> None:
    panel.set("uncertainty.samples", 2000)
    panel.set("uncertainty.seed", 7)
    page(panel, do="press", what="trials")
    wanted = uncertain().run(samples=2000, seed=7, progress=False)
    assert panel.value.table.equals(wanted.table)
    assert "2000 of 2000 trials, seed 7" in panel.content()["facts"][0]
    assert panel.figures()[1].name == "histogram-thrust"
    scope: dict[str, Any] = {}
    exec(panel.as_code(), scope)
    assert scope["result"].table.equals(panel.value.table)
    page(panel, do="slide", path=PRESSURE, at=8.4, phase="drag")
    assert panel.value.trials is None
    panel.undo()
    assert panel.value.table.equals(wanted.table)


def test_results_that_are_there_are_shown_as_they_are() -> None:
    result = uncertain().run(samples=1000, seed=3, progress=False)
    panel = result.panel()
    assert panel.value is result
    assert "samples=1000, seed=3" in panel.as_code()
    panel.close()


def test_code_reproduces_what_is_shown(panel: Any) -> None:
    page(panel, do="slide", path=PRESSURE, at=8.46, phase="end")
    page(panel, do="type", path="uncertainty.nozzle.throat_diameter", text="0.4 mm")
    scope: dict[str, Any] = {}
    exec(panel.as_code(), scope)
    assert scope["result"].table.equals(panel.value.table)


def test_pins_and_units(panel: Any) -> None:
    panel.pin("before")
    panel.set(SPREAD, "2 %")
    assert panel.content()["headline"][1]["difference"].startswith("+")
    table = panel.comparison()
    assert table["before", "standard_uncertainty"]["thrust"] == uncertain().run().standard_uncertainty("thrust")
    assert table["current", "standard_uncertainty"]["thrust"] == uncertain(pressure="2 %").run().standard_uncertainty("thrust")
    panel.units = "US"
    assert panel.content()["headline"][0]["unit"] == "lbf"
    assert panel.pins["before"].table.equals(uncertain().run().table)


@pytest.mark.parametrize(
    ("path", "text"),
    [(SPREAD, "-1 %"), (SPREAD, "2 kg"), (SPREAD, "0"), (PRESSURE, "80 psig"), ("uncertainty.samples", "7"), ("uncertainty.seed", "1.5")],
)
def test_an_error_stands_beside_its_control_and_the_last_result_stays(panel: Any, path: str, text: str) -> None:
    before = panel.value
    page(panel, do="type", path=path, text=text)
    assert list(panel.errors) == [path]
    assert control(panel, path)["error"]
    assert panel.value is before
    assert panel.widget.shown["current"] is False
    panel.undo()
    assert panel.errors == {}


def test_trials_that_reach_illegal_draws_are_refused_in_sight_or_leave_them_out() -> None:
    plan = pk.Uncertainty(built(), {"chamber.cstar_efficiency": "0.3 %", THROAT: "0.1 %"})
    panel = plan.panel("specific_impulse")
    panel.set("uncertainty.samples", 500)
    page(panel, do="press", what="trials")
    assert "illegal" in panel.errors["uncertainty.method"]
    main = [entry["path"] for entry in panel.content()["sets"][0]["controls"]]
    assert "uncertainty.method" in main
    panel.reset("uncertainty.method")
    panel.set("uncertainty.illegal", "leave out")
    panel.run_trials()
    wanted = plan.run(samples=500, seed=1, progress=False, illegal="leave out")
    assert panel.value.table.equals(wanted.table)
    assert any("left out" in doubt for doubt in panel.content()["doubts"])
    panel.close()


def test_observed_values_have_no_slider() -> None:
    draws = [9.7e6 + 1e4 * step for step in range(-10, 11)]
    panel = pk.Uncertainty(built(), {PRESSURE: pk.Empirical(draws), THROAT: "0.1 %"}).panel()
    assert control(panel, SPREAD)["style"] == "fixed"
    assert "slider" not in control(panel, SPREAD)
    page(panel, do="type", path=SPREAD, text="1 %")
    assert "observed values" in panel.errors[SPREAD]
    panel.close()


def test_a_doubtful_first_order_says_so() -> None:
    gas = pk.Chamber.from_gas(pressure="7 MPa", temperature="3500 K", molar_mass="22 g/mol", isentropic_exponent=1.2)
    near = pk.Performance(pk.Nozzle(gas, area_ratio=1.02, throat_diameter="0.1 m"), ambient="vacuum")
    plan = pk.Uncertainty(near, {"nozzle.area_ratio": "0.5 %"})
    panel = plan.panel()
    assert panel.content()["doubts"] == [str(doubt) for doubt in plan.run().warnings]
    panel.close()


def test_the_twin_is_the_sheet_with_the_budget(panel: Any) -> None:
    from propkit.panels.twin import twin_bundle

    html = twin_bundle(panel.twin())["text/html"]
    assert "data:image/svg+xml" in html
    assert "Budget" in html


def test_a_record_of_what_is_shown_verifies(panel: Any) -> None:
    panel.set(SPREAD, "2 %")
    assert panel.record(title="Budget").verify().ok


def test_closing_lets_go_of_everything() -> None:
    panel = uncertain().panel()
    panel.pin()
    page(panel, do="slide", path=SPREAD, at=2.0, phase="drag")
    kept = [weakref.ref(thing) for thing in (panel.session.value, panel.widget, panel.session, panel, panel.session.value.target)]
    panel.close()
    assert panel.session._views == []
    del panel
    gc.collect()
    assert [ref() for ref in kept] == [None] * len(kept)
