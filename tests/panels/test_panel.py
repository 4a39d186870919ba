"""Panels on the kernel's side: what a control does is what a line of code does, and an error never leaves half a state."""

from __future__ import annotations

import gc
import threading
import weakref
from typing import Any

import pytest

import propkit as pk

pytest.importorskip("ipywidgets")

PRESSURE = "chamber.pressure"


def built(pressure: Any = "9.7 MPa", ratio: Any = 3.4, area_ratio: Any = 35, ambient: Any = "sea level") -> pk.Performance:
    case = pk.PropellantCase("LOX", "LCH4", mixture_ratio=ratio)
    nozzle = pk.Nozzle(pk.Chamber(case, pressure=pressure), area_ratio=area_ratio, throat_diameter="0.18 m")
    return pk.Performance(nozzle, ambient=ambient)


@pytest.fixture
def panel(perf: pk.Performance) -> Any:
    made = perf.panel()
    yield made
    made.close()


def page(panel: Any, **asked: Any) -> None:
    """Send what the page sends: a custom message through the widget's own handler."""
    panel.widget._handle_msg({"content": {"data": {"method": "custom", "content": {"client": "t", "number": 1, **asked}}}, "buffers": []})


def row(panel: Any, name: str) -> dict[str, Any]:
    return next(row for row in panel.content()["results"] if row["name"] == name)


def control(panel: Any, path: str) -> dict[str, Any]:
    sets = panel.content()["sets"]
    return next(entry for group in sets for entry in (*group["controls"], *group["minor"]) if entry["path"] == path)


# -- what a control does ------------------------------------------------------------------------------


def test_setting_a_control_acts_at_once(panel: Any) -> None:
    seen: list[Any] = []
    panel.observe(lambda change: seen.append(change["new"]), "value")
    panel.controls[PRESSURE].value = "8 MPa"
    assert panel.value == built("8 MPa")
    assert seen == [panel.value]
    assert panel.value.thrust.magnitude == built("8 MPa").thrust.magnitude


@pytest.mark.parametrize(
    ("asked", "wanted"),
    [
        ({"do": "type", "path": PRESSURE, "text": "1500 psia"}, {"pressure": "1500 psia"}),
        ({"do": "type", "path": PRESSURE, "text": "8"}, {"pressure": "8 MPa"}),
        ({"do": "slide", "path": PRESSURE, "at": 8.460000000000001}, {"pressure": "8.46 MPa"}),
        ({"do": "slide", "path": "case.mixture_ratio", "at": 3.6500000001}, {"ratio": 3.65}),
        ({"do": "type", "path": "nozzle.area_ratio", "text": "40"}, {"area_ratio": 40}),
        ({"do": "slide", "path": "performance.ambient", "at": 12.0}, {"ambient": "12 km"}),
        ({"do": "type", "path": "performance.ambient", "text": "vacuum"}, {"ambient": "vacuum"}),
    ],
)
def test_the_page_does_what_code_does(panel: Any, asked: dict[str, Any], wanted: dict[str, Any]) -> None:
    page(panel, **asked)
    assert panel.errors == {}
    assert panel.value == built(**wanted)
    assert panel.widget.ack == {"client": "t", "number": 1}
    assert panel.widget.shown["code"] == panel.as_code()


def test_code_reproduces_what_is_shown(panel: Any) -> None:
    page(panel, do="slide", path=PRESSURE, at=8.46)
    page(panel, do="choose", path="nozzle.flow", choice="frozen")
    page(panel, do="type", path="nozzle.freeze_at", text="throat")
    scope: dict[str, Any] = {}
    exec(panel.as_code(), scope)
    assert scope["performance"] == panel.value
    assert scope["performance"].thrust.magnitude == panel.value.thrust.magnitude


def test_changing_the_chamber_rebuilds_everything_below_and_nothing_above(panel: Any, perf: pk.Performance) -> None:
    panel.set(PRESSURE, "8 MPa")
    assert panel.value.case is perf.case
    assert panel.value.nozzle.mass_flow.magnitude == built("8 MPa").nozzle.mass_flow.magnitude


def test_every_declared_input_has_a_control_with_its_own_label(panel: Any) -> None:
    shown = {entry["path"]: entry for group in panel.content()["sets"] for entry in (*group["controls"], *group["minor"])}
    useless = {"nozzle.freeze_at", "nozzle.exponent", "nozzle.sizing_ambient", "nozzle.wall_thickness", "nozzle.wall_density"}
    no_text = {"case.additives", "performance.losses"}
    hidden = useless | no_text
    for link in panel.value.chain():
        for name, declared in link.declared_inputs.items():
            path = f"{link.kind}.{name}"
            group = next(
                (
                    entry["group"]
                    for entry in shown.values()
                    if "group" in entry and name in dict(entry["group"]["members"]) and entry["path"].startswith(link.kind)
                ),
                None,
            )
            if name == link.upstream_input or path in hidden or (group and group["member"] != name):
                continue
            assert path in shown, path
            assert shown[path]["doc"].casefold().startswith(declared.doc.casefold()[:20])


def test_choosing_a_propellant_of_the_library(panel: Any) -> None:
    page(panel, do="choose", path="case.fuel", choice="LH2")
    assert panel.value.case.inputs["fuel"] == "LH2"
    choices = dict(control(panel, "case.fuel")["choices"])
    assert "LCH4" in choices
    assert "LOX" not in choices


def test_a_propellant_of_ones_own_stays_until_another_is_chosen(perf: pk.Performance) -> None:
    own = pk.Propellant(
        name="lot 7", formula="C H1.95", enthalpy="-24.717 kJ/mol", density="810 kg/m3", temperature="298.15 K", role="fuel"
    )
    panel = perf.replace({"case.fuel": own}).panel()
    assert control(panel, "case.fuel")["choice"] == "as given"
    page(panel, do="slide", path=PRESSURE, at=8.0)
    assert panel.value.case.inputs["fuel"] == own
    panel.close()


# -- groups -----------------------------------------------------------------------------------------------


@pytest.mark.parametrize("member", ["exit_pressure", "exit_diameter", "exit_area"])
def test_another_way_to_give_the_expansion_keeps_the_design(panel: Any, perf: pk.Performance, member: str) -> None:
    page(panel, do="member", key="nozzle:expansion", member=member)
    assert panel.errors == {}
    assert member in panel.value.nozzle.inputs
    assert panel.value.nozzle.area_ratio == pytest.approx(35.0, rel=1e-5)
    assert panel.value.thrust.magnitude == pytest.approx(perf.thrust.magnitude, rel=1e-4)


@pytest.mark.parametrize("member", ["throat_area", "exit_diameter", "exit_area", "mass_flow", "thrust"])
def test_another_size_keeps_the_design(panel: Any, perf: pk.Performance, member: str) -> None:
    page(panel, do="member", key="nozzle:size", member=member)
    assert panel.errors == {}
    assert member in panel.value.nozzle.inputs
    assert "throat_diameter" not in panel.value.nozzle.inputs
    assert panel.value.thrust.magnitude == pytest.approx(perf.thrust.magnitude, rel=1e-4)


def test_a_nozzle_sized_for_thrust_is_sized_again(panel: Any) -> None:
    page(panel, do="member", key="nozzle:size", member="thrust")
    page(panel, do="type", path="nozzle.thrust", text="300 kN")
    page(panel, do="type", path="nozzle.sizing_ambient", text="sea level")
    page(panel, do="slide", path=PRESSURE, at=8.0)
    assert panel.errors == {}
    assert panel.value.thrust.to("kN").magnitude == pytest.approx(300.0, rel=1e-9)


def test_two_sizes_stay_two_sizes(panel: Any) -> None:
    page(panel, do="member", key="nozzle:expansion", member="exit_diameter")
    page(panel, do="type", path="nozzle.throat_diameter", text="0.2 m")
    assert set(panel.value.nozzle.inputs) >= {"throat_diameter", "exit_diameter"}
    page(panel, do="member", key="nozzle:expansion", member="area_ratio")
    assert set(panel.value.nozzle.inputs) >= {"throat_diameter", "area_ratio"}
    assert "exit_diameter" not in panel.value.nozzle.inputs


def test_equivalence_ratio_in_place_of_mixture_ratio(panel: Any, perf: pk.Performance) -> None:
    page(panel, do="member", key="case:mixture_ratio", member="equivalence_ratio")
    assert set(panel.value.case.inputs) >= {"equivalence_ratio"}
    assert panel.value.case.mixture_ratio == pytest.approx(3.4, rel=1e-5)


# -- errors -----------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("path", "text", "word"),
    [
        (PRESSURE, "80 psig", "gauge"),
        (PRESSURE, "7,5 MPa", "decimal"),
        (PRESSURE, "fast", "pressure"),
        (PRESSURE, "", "missing"),
        ("case.mixture_ratio", "-1", "at least"),
        ("chamber.contraction_ratio", "0.8", "throat over chamber"),
        ("performance.ambient", "20 MPa", "stagnation pressure"),
        ("nozzle.throat_diameter", "3 kg", "kind"),
    ],
)
def test_an_error_stands_beside_its_control_and_the_last_good_result_stays(
    panel: Any, perf: pk.Performance, path: str, text: str, word: str
) -> None:
    before = panel.content()["results"]
    page(panel, do="type", path=path, text=text)
    shown = control(panel, path)
    assert word in shown["error"]
    assert "`" not in shown["error"].split(" is ")[0]
    assert shown["text"] == text
    assert all(not control(panel, other)["error"] for other in panel.controls if other != path)
    content = panel.content()
    assert content["current"] is False
    assert content["status"].startswith("Not current")
    assert content["results"] == before
    assert panel.value is perf


def test_code_hears_the_error_too(panel: Any) -> None:
    with pytest.raises(pk.InputError, match="absolute pressure"):
        panel.set(PRESSURE, "80 psig")
    assert "gauge" in panel.controls[PRESSURE].error


def test_a_good_value_ends_the_error(panel: Any) -> None:
    page(panel, do="type", path=PRESSURE, text="fast")
    page(panel, do="type", path=PRESSURE, text="8 MPa")
    assert panel.errors == {}
    assert panel.value == built("8 MPa")


def test_another_control_works_while_one_is_refused(panel: Any) -> None:
    page(panel, do="type", path=PRESSURE, text="fast")
    page(panel, do="slide", path="case.mixture_ratio", at=3.6)
    assert panel.value == built(ratio=3.6)
    assert set(panel.errors) == {PRESSURE}
    assert panel.content()["current"] is False


def test_a_refused_value_is_taken_once_another_control_allows_it(panel: Any) -> None:
    page(panel, do="type", path="performance.ambient", text="12 MPa")
    assert "performance.ambient" in panel.errors
    page(panel, do="type", path=PRESSURE, text="20 MPa")
    assert panel.errors == {}
    assert panel.value == built("20 MPa", ambient="12 MPa")


def test_resetting_a_refused_control_shows_the_accepted_value(panel: Any, perf: pk.Performance) -> None:
    page(panel, do="type", path=PRESSURE, text="fast")
    page(panel, do="reset", path=PRESSURE)
    assert panel.errors == {}
    assert control(panel, PRESSURE)["text"] == "9.7 MPa"
    assert panel.value is perf


def test_what_nobody_foresaw_is_shown_and_logged(
    panel: Any, perf: pk.Performance, monkeypatch: pytest.MonkeyPatch, caplog: pytest.LogCaptureFixture
) -> None:
    def broken(*_: Any, **__: Any) -> Any:
        raise ZeroDivisionError("a bug")

    monkeypatch.setattr(type(perf), "replace", broken)
    page(panel, do="type", path=PRESSURE, text="8 MPa")
    assert "ZeroDivisionError: a bug" in control(panel, PRESSURE)["error"]
    assert panel.value is perf
    assert "a bug" in caplog.text


def test_an_observer_that_fails_is_told_and_keeps_no_view_behind(panel: Any) -> None:
    other = panel.view("chamber")

    def fails(_: Any) -> None:
        raise RuntimeError("the observer fails")

    panel.observe(fails, "value")
    with pytest.raises(RuntimeError, match="the observer fails"):
        panel.set(PRESSURE, "8 MPa")
    assert other.value.pressure.magnitude == 8e6
    page(panel, do="type", path=PRESSURE, text="7 MPa")
    assert "the observer fails" in panel.widget.shown["status"]
    other.close()


# -- undo, pins, reset -------------------------------------------------------------------------------


def test_undo_and_redo(panel: Any, perf: pk.Performance) -> None:
    panel.set(PRESSURE, "8 MPa")
    panel.set("case.mixture_ratio", 3.6)
    panel.undo()
    assert panel.value == built("8 MPa")
    panel.undo()
    assert panel.value == perf
    assert panel.content()["undo"] is False
    panel.redo()
    panel.redo()
    assert panel.value == built("8 MPa", 3.6)
    panel.undo()
    panel.set("nozzle.area_ratio", 30)
    assert panel.content()["redo"] is False


def test_one_drag_is_one_step_of_undo(panel: Any, perf: pk.Performance) -> None:
    for at in (9.0, 8.8, 8.6):
        page(panel, do="slide", path=PRESSURE, at=at, phase="drag", run="a")
    page(panel, do="slide", path=PRESSURE, at=8.0, phase="drag", run="b")
    panel.undo()
    assert panel.value == built("8.6 MPa")
    panel.undo()
    assert panel.value == perf


def test_undo_of_a_refused_value_only_drops_it(panel: Any) -> None:
    panel.set(PRESSURE, "8 MPa")
    page(panel, do="type", path=PRESSURE, text="fast")
    panel.undo()
    assert panel.errors == {}
    assert panel.value == built("8 MPa")


def test_reset_goes_to_the_default_or_to_what_was_opened(panel: Any, perf: pk.Performance) -> None:
    page(panel, do="type", path="chamber.cstar_efficiency", text="0.96")
    assert panel.value.chamber.cstar_efficiency == 0.96
    assert control(panel, "chamber.cstar_efficiency")["reset"] == "Reset to the default (1.0)"
    page(panel, do="reset", path="chamber.cstar_efficiency")
    assert "cstar_efficiency" not in panel.value.chamber.inputs
    panel.set(PRESSURE, "8 MPa")
    page(panel, do="reset", path=PRESSURE)
    assert panel.value == perf
    assert control(panel, PRESSURE)["reset"] == ""


def test_pins_show_every_result_as_a_difference(panel: Any, perf: pk.Performance) -> None:
    assert panel.pin() == "A"
    panel.set(PRESSURE, "11 MPa")
    later = built("11 MPa")
    for name, unit in (("thrust", "kN"), ("specific_impulse", "s")):
        step = getattr(later, name).to(unit).magnitude - getattr(perf, name).to(unit).magnitude
        shown = row(panel, name)
        assert float(shown["difference"].replace("−", "-")) == pytest.approx(step, abs=0.006)
        assert shown["share"] == f"{100 * step / getattr(perf, name).to(unit).magnitude:+.2f} %"
    assert all("difference" in entry for entry in panel.content()["results"])
    assert panel.pin("second") == "second"
    panel.set("nozzle.area_ratio", 30)
    frame = panel.comparison()
    assert list(frame.columns) == ["current", "A", "second"]
    assert frame.loc["thrust", "A"] == perf.thrust.magnitude
    assert frame.loc["thrust", "second"] == later.thrust.magnitude
    assert frame.attrs["units"]["thrust"] == "N"
    assert panel.content()["pins"]["names"] == ["A", "second"]
    panel.unpin("second")
    assert panel.content()["pins"]["baseline"] == "A"
    panel.unpin()
    assert "difference" not in row(panel, "thrust")


def test_pins_never_replace_each_other_by_chance(panel: Any, perf: pk.Performance) -> None:
    assert [panel.pin(), panel.pin()] == ["A", "B"]
    panel.set("performance.name", "stage")
    assert [panel.pin(), panel.pin(), panel.pin()] == ["stage", "stage B", "stage C"]


# -- views, units ------------------------------------------------------------------------------------


def test_two_views_stay_in_step(panel: Any) -> None:
    chamber = panel.view("chamber")
    page(chamber, do="slide", path=PRESSURE, at=8.0)
    assert panel.value == built("8.00 MPa")
    assert chamber.value is panel.value.chamber
    panel.set("case.mixture_ratio", 3.6)
    assert chamber.value.case.mixture_ratio == 3.6
    chamber.undo()
    assert panel.value == built("8.00 MPa")
    case = chamber.view("case")
    assert case.value is panel.value.case
    with pytest.raises(pk.InputError, match="kind"):
        panel.view("engine")
    for view in (case, chamber):
        view.close()


def test_value_can_be_set(panel: Any) -> None:
    chamber = panel.view("chamber")
    panel.value = built("6 MPa")
    assert chamber.value.pressure.magnitude == 6e6
    chamber.value = built("5 MPa").chamber
    assert panel.value == built("5 MPa")
    before = panel.value
    with pytest.raises(pk.InputError, match="shows a Performance"):
        panel.value = before.chamber
    assert panel.value is before
    chamber.close()


def test_units_are_those_of_one_panel_and_what_was_typed_keeps_its_own(panel: Any) -> None:
    other = panel.view("nozzle")
    page(panel, do="units", units="US")
    assert row(panel, "thrust")["unit"] == "lbf"
    assert other.content()["results"][0]["unit"] != "psia"
    assert control(panel, PRESSURE)["text"] == "9.7 MPa"
    assert control(panel, PRESSURE)["note"] == "= 1406.9 psia"
    page(panel, do="slide", path=PRESSURE, at=8.0)
    assert panel.value.chamber.inputs["pressure"] == "8.00 MPa"
    other.close()


def test_numbers_shown_are_those_of_the_object(panel: Any) -> None:
    page(panel, do="slide", path=PRESSURE, at=8.46)
    expected = built("8.46 MPa")
    for name, unit in (("thrust", "kN"), ("specific_impulse", "s"), ("mass_flow", "kg/s"), ("thrust_coefficient", "")):
        value = getattr(expected, name)
        number = value.to(unit).magnitude if unit else value
        assert float(row(panel, name)["text"].replace("\N{NARROW NO-BREAK SPACE}", "")) == pytest.approx(number, rel=5.1e-5)
        assert row(panel, name)["unit"] == unit


@pytest.mark.parametrize("kind", ["case", "chamber", "nozzle", "performance"])
def test_every_object_has_a_panel_with_live_figures(perf: pk.Performance, kind: str) -> None:
    calculation = next(link for link in perf.chain() if link.kind == kind)
    panel = calculation.panel()
    titles = panel.figure_titles()
    assert titles
    for place in range(len(titles)):
        page(panel, do="figure", at=place)
        assert [frame["title"] for frame in panel.widget.frame] == [figure.title for figure in panel.figures()]
        assert all(text.startswith("<svg") for text in panel.widget.still)
    panel.close()


def test_a_gas_given_outright_and_other_cases_have_panels() -> None:
    gas = pk.Chamber.from_gas(pressure="3 MPa", temperature="3000 K", molar_mass="22 g/mol", isentropic_exponent=1.2)
    perf = pk.Performance(pk.Nozzle(gas, exit_pressure="80 kPa", exit_diameter="0.2 m"), ambient="vacuum")
    panel = perf.panel()
    page(panel, do="member", key="chamber:molar_mass", member="gas_constant")
    page(panel, do="slide", path="chamber.temperature", at=2900)
    assert panel.errors == {}
    assert panel.value.chamber.temperature.magnitude == 2900.0
    panel.close()


def test_cases_of_one_propellant_have_panels() -> None:
    mono = pk.Chamber(pk.PropellantCase.monopropellant("hydrazine", ammonia_dissociation=0.5), pressure="2 MPa").panel()
    page(mono, do="slide", path="case.ammonia_dissociation", at=0.6)
    assert mono.errors == {}
    assert mono.value == pk.Chamber(pk.PropellantCase.monopropellant("hydrazine", ammonia_dissociation=0.6), pressure="2 MPa")
    cold = pk.Chamber(pk.PropellantCase.cold_gas("GN2", temperature="293 K"), pressure="1 MPa").panel()
    page(cold, do="type", path="case.temperature", text="20 °C")
    assert cold.errors == {}
    assert cold.value.case.inputs["temperature"] == "20 °C"
    for panel in (mono, cold):
        panel.close()


def test_what_no_text_says_is_shown_once_given_and_stays(perf: pk.Performance) -> None:
    panel = perf.replace({"losses": {"kinetics": 0.99}, "case.additives": {"water": 0.02}, "nozzle.contour": pk.Cone("17 deg")}).panel()
    assert control(panel, "performance.losses")["style"] == "fixed"
    assert control(panel, "case.additives")["style"] == "fixed"
    assert control(panel, "nozzle.contour")["choice"] == "as given"
    page(panel, do="slide", path=PRESSURE, at=8.0)
    assert panel.errors == {}
    assert panel.value.inputs["losses"] == {"kinetics": 0.99}
    page(panel, do="figure", at=1)
    assert panel.figures()[0].title.startswith("Nozzle to scale")
    panel.close()


@pytest.mark.parametrize(("choice", "contour"), [("cone", pk.Cone("15 deg")), ("bell 80", pk.Bell(length=0.8)), ("none", None)])
def test_a_contour_is_chosen(panel: Any, choice: str, contour: Any) -> None:
    page(panel, do="choose", path="nozzle.contour", choice=choice)
    assert panel.errors == {}
    assert panel.value.nozzle.inputs.get("contour") == contour
    assert control(panel, "nozzle.contour")["choice"] == choice


# -- the widget ----------------------------------------------------------------------------------------


def test_a_panel_leaves_two_outputs_the_static_sheet_first(panel: Any, monkeypatch: pytest.MonkeyPatch) -> None:
    shown: list[Any] = []
    import IPython.display

    monkeypatch.setattr(IPython.display, "display", lambda *given, **options: shown.append((given[0], options)))
    panel._ipython_display_()
    (bundle, options), (widget, _) = shown
    assert options == {"raw": True}
    assert widget is panel.widget
    assert "application/vnd.propkit.record+json" in bundle
    assert f"{panel.value.thrust.to('kN').magnitude:.2f}" in bundle["text/html"]
    assert "<script" not in bundle["text/html"]


def test_the_state_stays_small_and_bokeh_comes_as_one_buffer(panel: Any, monkeypatch: pytest.MonkeyPatch) -> None:
    from propkit.panels.host import bokeh_script

    sent: list[tuple[Any, Any]] = []
    monkeypatch.setattr(panel.widget, "send", lambda content, buffers=None: sent.append((content, buffers)))
    panel.widget._on_message(panel.widget, {"ask": "bokeh"}, [])
    (content, buffers) = sent[0]
    assert content == {"answer": "bokeh", "version": panel.widget.bokeh}
    assert b"Copyright (c) Anaconda" in buffers[0][:400]
    assert len(bokeh_script()) > 1_000_000
    state = panel.widget.get_state()
    assert sum(len(str(value)) for value in state.values()) < 150_000


def test_the_same_structure_sends_only_numbers(panel: Any) -> None:
    plots = panel.widget.plots
    before = panel.widget.data
    page(panel, do="slide", path=PRESSURE, at=9.8)
    assert panel.widget.plots is plots
    assert panel.widget.data != before


def test_threads_leave_one_consistent_state(panel: Any) -> None:
    """Callbacks may come from several threads; whoever is last, value, views and undo belong together."""
    chamber = panel.view("chamber")
    failed: list[BaseException] = []

    def drag(path: str, places: list[float]) -> None:
        try:
            for at in places:
                page(panel, do="slide", path=path, at=at)
        except BaseException as error:
            failed.append(error)

    jobs = [(PRESSURE, [8.0, 8.5, 9.0]), ("case.mixture_ratio", [3.2, 3.5, 3.6]), ("nozzle.area_ratio", [30.0, 31.0, 32.0])]
    threads = [threading.Thread(target=drag, args=job) for job in jobs]
    for thread in threads:
        thread.start()
    for thread in threads:
        thread.join()
    assert not failed
    assert panel.value == built("9.00 MPa", 3.6, 32.0)
    assert panel.value.thrust.magnitude == built("9 MPa", 3.6, 32).thrust.magnitude
    assert chamber.value is panel.value.chamber
    assert panel.widget.shown["code"] == panel.as_code()
    chamber.close()


def test_closing_frees_every_object() -> None:
    panels = [built(f"{8 + number / 10} MPa").panel() for number in range(3)]
    kept: list[weakref.ref[Any]] = []
    for panel in panels:
        view = panel.view("chamber")
        kept += [weakref.ref(panel.value), weakref.ref(panel.widget), weakref.ref(view.widget)]
        panel.pin()
        page(panel, do="slide", path=PRESSURE, at=8.6)
        page(panel, do="type", path=PRESSURE, text="fast")
        kept.append(weakref.ref(panel.value))
        view.close()
        panel.close()
    del panel, view
    gc.collect()
    assert [place for place, reference in enumerate(kept) if reference() is not None] == []


def test_a_closed_panel_ignores_the_page(perf: pk.Performance) -> None:
    panel = perf.panel()
    widget = panel.widget
    panel.close()
    widget.act({"do": "undo"})
    assert panel.value is None


def test_twenty_panels_cost_less_than_200_megabytes() -> None:
    import resource

    def resident() -> float:
        with open("/proc/self/statm") as file:
            return int(file.read().split()[1]) * resource.getpagesize() / 1e6

    first = built().panel()
    first.widget.refresh()
    gc.collect()
    before = resident()
    panels = [built(f"{7 + number / 10} MPa").panel() for number in range(20)]
    for panel in panels:
        panel.widget.refresh()
    grown = resident() - before
    for panel in [*panels, first]:
        panel.close()
    assert grown < 200.0
