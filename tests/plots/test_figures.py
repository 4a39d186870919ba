"""The live plot and the static drawing of a figure hold the same data, which are those of the object."""

from __future__ import annotations

import re
import struct
from typing import Any

import numpy as np
import pytest

import propkit as pk
from propkit.physics import atmosphere
from propkit.plots import curves, live_figures, paint, plot_of, wire
from propkit.plots.build import build, columns, limits, structure
from propkit.plots.limits import round_limits
from propkit.series import Axis, Bars, Figure, Line, Mark, Rule, Series
from propkit.view import svg

pytest.importorskip("bokeh")


@pytest.fixture(scope="module")
def gas() -> pk.Performance:
    chamber = pk.Chamber.from_gas(pressure="3 MPa", temperature="3000 K", molar_mass="22 g/mol", isentropic_exponent=1.2)
    return pk.Performance(pk.Nozzle(chamber, exit_pressure="80 kPa", thrust="2 kN", sizing_ambient="sea level"), ambient="vacuum")


def every_figure(*calculations: Any) -> list[Figure]:
    return [
        figure
        for calculation in calculations
        for system in ("SI", "US")
        for _, make in live_figures(calculation)
        for figure in make(calculation, system)
    ]


def source_of(plot: Any, place: int) -> dict[str, list[Any]]:
    return dict(plot.select_one({"name": f"layer-{place}"}).data)


def test_bokeh_holds_every_number_of_every_layer(perf: pk.Performance, gas: pk.Performance) -> None:
    figures = every_figure(perf, perf.nozzle, perf.chamber, perf.case, gas, gas.nozzle.chamber)
    assert len(figures) > 25
    for figure in figures:
        plot = build(figure).figure
        for place, layer in enumerate(figure.layers):
            data = source_of(plot, place)
            if isinstance(layer, Line):
                np.testing.assert_array_equal(data["x"], layer.x.values)
                np.testing.assert_array_equal(data["y"], layer.y.values)
                for number, series in enumerate(layer.hover):
                    np.testing.assert_array_equal(data[f"hover{number}"], series.values)
            elif isinstance(layer, Bars):
                assert data["value"] == list(layer.values.values)
                assert len(data["category"]) == len(set(data["category"])) == len(layer.categories)
            elif isinstance(layer, Mark):
                assert (data["x"], data["y"], data["text"]) == ([layer.x], [layer.y], [layer.label])
            else:
                assert (data["at"], data["text"]) == ([layer.at], [layer.label])


def drawn_paths(drawing: str) -> list[np.ndarray[Any, Any]]:
    """Points of every drawn line of more than six points, from the path data of the SVG."""
    found = []
    for text in re.findall(r"<path d='([^']*)'", drawing):
        points = re.findall(r"[ML](-?[\d.]+) (-?[\d.]+)", text)
        if len(points) > 6:
            found.append(np.array(points, dtype=float))
    return found


def test_the_drawing_and_the_live_plot_show_the_same_curves(perf: pk.Performance) -> None:
    """An axis maps data linearly to pixels, so pixels against the data of BokehJS must be a straight line within rounding."""
    compared = 0
    for figure in every_figure(perf, perf.chamber):
        lines = [layer for layer in figure.layers if isinstance(layer, Line) and np.isfinite(layer.y.values).sum() > 6]
        paths = drawn_paths(svg.draw(figure))
        plot = build(figure).figure
        for line in lines:
            data = source_of(plot, figure.layers.index(line))
            keep = np.isfinite(data["y"])
            x, y = np.array(data["x"])[keep], np.array(data["y"])[keep]
            fits = [path for path in paths if len(path) == len(x) and off_line(x, path[:, 0]) < 0.11 and off_line(y, path[:, 1]) < 0.11]
            assert fits, (figure.name, line.label, len(x), [len(path) for path in paths])
            compared += 1
    assert compared > 15


def off_line(data: Any, pixels: Any) -> float:
    """Largest distance of pixels from the best straight line over the data; a constant is its own line."""
    if np.ptp(data) == 0.0:
        return float(np.ptp(pixels))
    slope, start = np.polyfit(data - data.mean(), pixels, 1)
    return float(np.abs(pixels - start - slope * (data - data.mean())).max())


def test_the_comparison_can_fail(perf: pk.Performance) -> None:
    figure = curves.altitude_figure(perf, "thrust", "SI")
    line = max((layer for layer in figure.layers if isinstance(layer, Line)), key=lambda layer: np.isfinite(layer.y.values).sum())
    keep = np.isfinite(line.y.values)
    y = np.array(line.y.values)[keep]
    y[len(y) // 2] *= 1.01
    assert all(len(path) != len(y) or off_line(y, path[:, 1]) > 0.11 for path in drawn_paths(svg.draw(figure)))


def test_what_is_sent_to_the_page_reads_back(perf: pk.Performance) -> None:
    figures = curves.nozzle_figures(perf.nozzle, "SI")
    described, numbers = wire.frame_of(figures)
    flat = struct.unpack(f"<{len(numbers) // 8}d", numbers)
    for figure, frame in zip(figures, described, strict=True):
        assert frame["key"] == structure(figure)
        for layer, source in zip(figure.layers, frame["sources"], strict=True):
            for name, wanted in columns(layer, limits(figure)).items():
                got = source[name]
                assert list(flat[got[0] : got[0] + got[1]]) == wanted if not isinstance(wanted[0], str) else got == wanted


def test_new_numbers_keep_the_structure_and_other_units_do_not(perf: pk.Performance) -> None:
    figure = curves.altitude_figure(perf, "thrust", "SI")
    moved = curves.altitude_figure(perf.replace({"chamber.pressure": "9.8 MPa"}), "thrust", "SI")
    assert structure(figure) == structure(moved)
    assert structure(figure) != structure(curves.altitude_figure(perf, "thrust", "US"))


# -- the curves say what the objects say --------------------------------------------------------------


def test_mixture_curve_passes_through_objects(chamber: pk.Chamber) -> None:
    figure = curves.mixture_figure(chamber.case, "characteristic_velocity", "SI", chamber)
    line = figure.layers[0]
    assert isinstance(line, Line)
    for place in (3, 17, 29):
        other = chamber.replace({"case.mixture_ratio": line.x.values[place]})
        assert line.y.values[place] == pytest.approx(other.characteristic_velocity.magnitude, rel=1e-9)
    mark = figure.layers[-1]
    assert isinstance(mark, Mark)
    assert (mark.x, mark.y) == pytest.approx((3.4, chamber.characteristic_velocity.magnitude), rel=1e-12)


def test_mixture_curve_with_finite_contraction_follows_the_chamber(chamber: pk.Chamber) -> None:
    narrow = chamber.replace(contraction_ratio=2.0)
    figure = curves.mixture_figure(narrow.case, "temperature", "SI", narrow)
    line = figure.layers[0]
    assert isinstance(line, Line)
    other = narrow.replace({"case.mixture_ratio": line.x.values[5]})
    assert line.y.values[5] == pytest.approx(other.temperature.magnitude, rel=1e-9)


@pytest.mark.parametrize("options", [{}, {"flow": "frozen"}, {"flow": "frozen", "freeze_at": "throat"}, {"flow": "constant-property"}])
def test_flow_along_the_nozzle_is_the_flow_of_the_nozzle(nozzle: pk.Nozzle, options: dict[str, Any]) -> None:
    changed = nozzle.replace(options)
    drawing, _ = curves.nozzle_figures(changed, "SI")
    told = drawing.layers[-1]
    assert isinstance(told, Line)
    pressure, temperature, velocity, mach = (series.values for series in told.hover)
    assert pressure[-1] == pytest.approx(changed.exit.pressure.to("MPa").magnitude, rel=1e-9)
    assert temperature[-1] == pytest.approx(changed.exit.temperature.magnitude, rel=1e-9)
    assert velocity[-1] == pytest.approx(changed.exit.velocity.magnitude, rel=1e-9)
    throat = told.x.values.index(0.0)
    assert mach[throat] == pytest.approx(changed.throat.mach, rel=1e-9)
    assert np.all(np.diff(np.array(pressure)[np.isfinite(pressure)]) <= 1e-9)


def test_altitude_curve_is_the_performance_at_those_altitudes(perf: pk.Performance) -> None:
    for name, unit in (("thrust", "kN"), ("specific_impulse", "s")):
        lines = [layer for layer in curves.altitude_figure(perf, name, "SI").layers if isinstance(layer, Line)]
        for line in lines:
            for place in (0, 4, 40, 80):
                if np.isfinite(line.y.values[place]):
                    there = perf.replace(ambient=f"{line.x.values[place]} km")
                    assert line.y.values[place] == pytest.approx(getattr(there, name).to(unit).magnitude, rel=1e-9)


def test_separation_altitude_is_where_the_criterion_holds(perf: pk.Performance) -> None:
    """Summerfield et al. (1954): the flow separates where the exit pressure is below 0.4 of the ambient pressure."""
    height = curves.separation_altitudes(perf)["Summerfield"]
    assert height > 0.0
    assert float(atmosphere.pressure(height)) * 0.4 == pytest.approx(perf.nozzle.exit.pressure.magnitude, rel=1e-6)
    above, below = (perf.replace(ambient=f"{(height + step) / 1e3} km") for step in (50.0, -50.0))
    assert not any(doubt.code == "separation" for doubt in above.warnings)
    assert any(doubt.code == "separation" for doubt in below.warnings)


def test_plot_returns_a_plain_bokeh_figure(perf: pk.Performance, gas: pk.Performance) -> None:
    from bokeh.plotting import figure

    for calculation in (perf, perf.nozzle, perf.chamber, perf.case, gas.nozzle.chamber):
        assert isinstance(calculation.plot(), figure)
    assert plot_of(perf, "US").yaxis[0].axis_label == "Thrust [lbf]"


def test_hover_tells_numbers_with_units(perf: pk.Performance) -> None:
    from bokeh.models import HoverTool

    drawing, _ = curves.nozzle_figures(perf.nozzle, "SI")
    told = [tip for tool in build(drawing).figure.select({"type": HoverTool}) for tip in tool.tooltips]
    assert ("pressure", "@hover0{%.5g} MPa") in told
    assert ("temperature", "@hover1{%.5g} K") in told


# -- limits, colours -----------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("values", "wanted"),
    [((390.4, 480.6), (380.0, 500.0)), ((0.0, 49.4), (0.0, 60.0)), ((5.0, 5.0), None), ((float("nan"), 2.0, 3.0), None)],
)
def test_limits_hold_every_point_and_are_round(values: tuple[float, ...], wanted: tuple[float, float] | None) -> None:
    low, high = round_limits(values)
    assert low < high
    assert all(low <= value <= high for value in values if value == value)
    if wanted:
        assert (low, high) == pytest.approx(wanted)


def test_colours_carry_on_their_ground_in_both_themes() -> None:
    """Contrast by WCAG 2.1: 3:1 for lines and marks, 4.5:1 for text."""
    grounds = {"light": "#ffffff", "dark": "#111111"}
    for theme, colours in paint.table().items():
        for role, colour in colours.items():
            if role in ("hairline", "paper", "series-3", "series-5") and theme == "light":
                continue
            if role in ("hairline", "paper"):
                continue
            assert contrast(colour, grounds[theme]) >= (4.5 if role in ("ink", "quiet", "accent") else 3.0), (theme, role)


def contrast(one: str, other: str) -> float:
    def luminance(colour: str) -> float:
        parts = [int(colour[place : place + 2], 16) / 255.0 for place in (1, 3, 5)]
        linear = [part / 12.92 if part <= 0.04045 else ((part + 0.055) / 1.055) ** 2.4 for part in parts]
        return float(np.dot(linear, (0.2126, 0.7152, 0.0722)))

    high, low = sorted((luminance(one), luminance(other)), reverse=True)
    return (high + 0.05) / (low + 0.05)


def test_every_kind_of_layer_is_built() -> None:
    x = Series("x", (1.0, 2.0, 3.0), "m")
    layers = (
        Line(x, Series("y", (1.0, 4.0, 9.0), "Pa"), closed=True, fill=True),
        Mark(2.0, 4.0, "here"),
        Rule("y", 3.0, "limit"),
        Rule("x", 2.5, "at"),
    )
    plot = build(Figure("all", "All", "all layers", Axis("x", "m", scale="log"), Axis("y", "Pa"), layers), width=300).figure
    assert [source_of(plot, place) is not None for place in range(4)] == [True] * 4
    assert plot.width == 300
