"""Panels of a firing and of a reconciliation: what a control does is what a line of code does."""

import pytest

import propkit as pk
from propkit.reconcile.firing_demo import HEADERS, demo_firing, demo_target

pytest.importorskip("ipywidgets")

TARGET = demo_target()
FIRING = pk.HotFire(TARGET, demo_firing(TARGET, 1).table, {name: head.partition(" [")[0] for name, head in HEADERS.items()})
GAS = pk.Chamber.from_gas(pressure="7 MPa", temperature="3400 K", molar_mass="22 g/mol", isentropic_exponent=1.2)
PERF = pk.Performance(pk.Nozzle(GAS, area_ratio=20, throat_diameter="0.2 m"), ambient="sea level")


def test_window_is_turned_and_found_again():
    panel = FIRING.panel()
    panel.slider.value = (6.0, 12.0)
    assert (panel.value.window.start, panel.value.window.end) == (6.0, 12.0)
    expected = FIRING.replace(window=(6.0, 12.0))
    assert panel.value.table.equals(expected.table)
    assert eval(panel.as_code(), {"firing": FIRING}).table.equals(expected.table)
    panel.find()
    assert panel.value.window == FIRING.window
    assert panel.as_code() == "firing.replace(window=None)"


def test_sheet_is_a_static_output_that_the_controls_redraw(monkeypatch):
    import IPython.display

    shown, updates = [], []

    class Handle:
        def update(self, bundle, raw):
            updates.append(bundle)

    def display(bundle, raw, display_id=False):
        shown.append(bundle)
        return Handle()

    monkeypatch.setattr(IPython.display, "display", display)
    panel = FIRING.panel()
    panel._ipython_display_()
    assert shown[0]["text/html"] == FIRING._repr_mimebundle_()["text/html"]
    assert "application/vnd.jupyter.widget-view+json" in shown[1]
    panel.choose(6.0, 12.0)
    assert updates[-1]["text/html"] == FIRING.replace(window=(6.0, 12.0))._repr_mimebundle_()["text/html"]


def test_refusal_is_shown_and_the_last_firing_kept():
    panel = FIRING.panel()
    panel.choose(5.0, 5.01)
    assert "at least 20" in panel.error
    assert panel.value is FIRING
    panel.choose(6.0, 12.0)
    assert panel.error == ""


def test_figures_are_struck_out_and_put_back():
    figures = {"thrust": ("372 kN", "1 %"), "mass_flow": ("140 kg/s", "1 %"), "throat_diameter": ("200 mm", "0.3 %")}
    fit = pk.Reconciliation(PERF, figures)
    panel = fit.panel()
    panel.strike("mass_flow")
    assert panel.value.adjusted.equals(fit.struck("mass_flow").adjusted)
    assert eval(panel.as_code(), {"fit": fit}).p_value == panel.value.p_value
    panel.strike("thrust")
    panel.strike("throat_diameter")
    assert panel.error
    panel.put_back("thrust")
    panel.put_back("throat_diameter")
    panel.put_back("mass_flow")
    assert panel.value.adjusted.equals(fit.adjusted)
