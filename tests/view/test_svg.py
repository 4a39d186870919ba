"""Drawings are small, well-formed, the same each time, and hold what the figure holds."""

from __future__ import annotations

import re
import xml.etree.ElementTree as ET

import pytest

from propkit.report import Report
from propkit.series import Axis, Bars, Figure, Line, Mark, Series
from propkit.view import palette, svg
from propkit.view.svg_curves import ticks
from propkit.view.svg_parts import width_of

SPACE = "{http://www.w3.org/2000/svg}"


def drawn(figure: Figure) -> ET.Element:
    return ET.fromstring(svg.draw(figure))


def texts(root: ET.Element) -> list[str]:
    return ["".join(element.itertext()) for element in root.iter(f"{SPACE}text")]


@pytest.fixture(scope="session")
def figures(reports: dict[str, Report]) -> dict[str, Figure]:
    return {figure.name: figure for figure in reports["performance"].figures}


def test_drawings_are_small_and_repeat(figures: dict[str, Figure]) -> None:
    for figure in figures.values():
        first = svg.draw(figure)
        assert first == svg.draw(figure)
        assert len(first) < 5000
        assert not re.search(r"<script|href|url\(|id=", first)


def test_the_replacing_text_and_title_are_in_the_drawing(figures: dict[str, Figure]) -> None:
    for figure in figures.values():
        root = drawn(figure)
        assert root.findtext(f"{SPACE}title") == figure.alt
        assert figure.title in texts(root)


def test_everything_drawn_lies_on_the_plate(figures: dict[str, Figure]) -> None:
    for figure in figures.values():
        root = drawn(figure)
        width, height = (float(root.get(side) or 0) for side in ("width", "height"))
        for path in root.iter(f"{SPACE}path"):
            for x, y in re.findall(r"[ML](-?[\d.]+) (-?[\d.]+)", path.get("d") or ""):
                assert -1.0 <= float(x) <= width + 1.0
                assert -1.0 <= float(y) <= height + 1.0
        for element in root.iter(f"{SPACE}text"):
            assert 0.0 <= float(element.get("x") or 0) <= width
            assert 0.0 <= float(element.get("y") or 0) <= height


def test_a_nozzle_is_drawn_to_one_scale(figures: dict[str, Figure]) -> None:
    """Length 0.6 m and exit diameter 0.6 m of the sample must take the same number of pixels."""
    outline = next(path for path in drawn(figures["outline"]).iter(f"{SPACE}path") if (path.get("d") or "").endswith("Z"))
    points = [(float(x), float(y)) for x, y in re.findall(r"[ML](-?[\d.]+) (-?[\d.]+)", outline.get("d") or "")]
    wide = max(x for x, _ in points) - min(x for x, _ in points)
    high = max(y for _, y in points) - min(y for _, y in points)
    assert wide == pytest.approx(high, abs=0.2)


def test_a_gap_in_the_data_is_a_gap_in_the_line(figures: dict[str, Figure]) -> None:
    solid = [path.get("d") or "" for path in drawn(figures["altitude"]).iter(f"{SPACE}path") if path.get("stroke") == palette.ACCENT]
    assert any(data.count("M") == 2 for data in solid)


def test_bars_are_as_long_as_their_values(figures: dict[str, Figure]) -> None:
    rects = [float(r.get("width") or 0) for r in drawn(figures["composition"]).iter(f"{SPACE}rect") if r.get("fill") != palette.PLATE]
    assert rects[1] / rects[0] == pytest.approx(13.0 / 49.3, rel=0.01)
    assert "H₂O" in texts(drawn(figures["composition"]))


def test_axis_titles_tell_symbol_and_unit(figures: dict[str, Figure]) -> None:
    assert any(text.replace("\u200b", "") == "thrust Fvac [kN]" for text in texts(drawn(figures["altitude"])))


@pytest.mark.parametrize(("low", "high"), [(0.0, 1.0), (376.0, 468.0), (-3.0, 7.0), (0.0, 1e-7), (2e6, 9e6), (5.0, 5.0)])
def test_ticks_are_round_inside_and_not_too_many(low: float, high: float) -> None:
    found = ticks(low, high)
    assert 1 <= len(found) <= 8
    assert all(low - 1e-9 * abs(high) <= value <= high + 1e-9 * abs(high) for value in found)
    assert found == sorted(set(found))


@pytest.mark.parametrize("values", [(1.0, 1.0), (0.0, 0.0), (float("nan"), float("nan")), (-5.0, 5.0), (1e-9, 1e9)])
@pytest.mark.parametrize("scale", ["linear", "log"])
def test_no_data_breaks_a_drawing(values: tuple[float, float], scale: str) -> None:
    line = Line(Series("x", (1.0, 2.0)), Series("y", values))
    figure = Figure("f", "t", "a", Axis("x"), Axis("y", scale=scale), (line, Mark(1.0, 1.0, "here")))  # type: ignore[arg-type]
    assert "nan" not in svg.draw(figure)


def luminance(colour: str) -> float:
    """Return relative luminance as WCAG 2 defines it."""
    parts = [int(colour[place : place + 2], 16) / 255 for place in (1, 3, 5)]
    linear = [part / 12.92 if part <= 0.04045 else ((part + 0.055) / 1.055) ** 2.4 for part in parts]
    return 0.2126 * linear[0] + 0.7152 * linear[1] + 0.0722 * linear[2]


def contrast(one: str, other: str) -> float:
    light, dark = sorted((luminance(one), luminance(other)), reverse=True)
    return (light + 0.05) / (dark + 0.05)


@pytest.mark.parametrize("colour", [palette.INK, palette.QUIET, palette.ACCENT, palette.DOUBT])
def test_text_on_the_plate_has_the_contrast_that_wcag_asks(colour: str) -> None:
    """WCAG 2.1, 1.4.3: at least 4.5 to 1 for text (from memory)."""
    assert contrast(colour, palette.PLATE) >= 4.5


@pytest.mark.parametrize("colour", [palette.INK_DARK, palette.QUIET_DARK, palette.ACCENT_DARK, palette.DOUBT_DARK, palette.BAR_DARK])
def test_text_on_dark_paper_has_the_contrast_that_wcag_asks(colour: str) -> None:
    assert contrast(colour, palette.PLATE_DARK) >= 4.5


DEFICIENCIES = {
    "protan": ((0.152286, 1.052583, -0.204868), (0.114503, 0.786281, 0.099216), (-0.003882, -0.048116, 1.051998)),
    "deutan": ((0.367322, 0.860646, -0.227968), (0.280085, 0.672501, 0.047413), (-0.011820, 0.042940, 0.968881)),
    "tritan": ((1.255528, -0.076749, -0.178779), (-0.078411, 0.930809, 0.147602), (0.004733, 0.691367, 0.303900)),
}
"""G. M. Machado, M. M. Oliveira, L. A. F. Fernandes, IEEE Trans. Vis. Comput. Graph. 15 (2009) 1291, severity 1.0 (from memory)."""


@pytest.mark.parametrize("kind", ["", *DEFICIENCIES])
def test_series_are_told_apart_with_every_colour_deficiency(kind: str) -> None:
    """CIE 1976 difference of any two of the series above 10, about ten times what is just noticeable."""
    seen = [lab(colour, kind) for colour in palette.SERIES]
    apart = [sum((a - b) ** 2 for a, b in zip(one, other, strict=True)) ** 0.5 for k, one in enumerate(seen) for other in seen[k + 1 :]]
    assert min(apart) > 10.0


def lab(colour: str, kind: str) -> tuple[float, float, float]:
    """Return CIE L*a*b* (D65) of a colour as seen with a deficiency."""
    parts = [int(colour[place : place + 2], 16) / 255 for place in (1, 3, 5)]
    linear = [part / 12.92 if part <= 0.04045 else ((part + 0.055) / 1.055) ** 2.4 for part in parts]
    if kind:
        linear = [min(1.0, max(0.0, sum(m * p for m, p in zip(line, linear, strict=True)))) for line in DEFICIENCIES[kind]]
    rows = ((0.4124, 0.3576, 0.1805), (0.2126, 0.7152, 0.0722), (0.0193, 0.1192, 0.9505))
    xyz = [sum(m * p for m, p in zip(line, linear, strict=True)) / white for line, white in zip(rows, (0.9505, 1.0, 1.089), strict=True)]
    f = [value ** (1 / 3) if value > (6 / 29) ** 3 else value / (3 * (6 / 29) ** 2) + 4 / 29 for value in xyz]
    return 116 * f[1] - 16, 500 * (f[0] - f[1]), 200 * (f[1] - f[2])


def test_bars_with_starts_hang_where_they_begin_and_those_cut_off_say_so() -> None:
    values = Series("Isp", (300.0, 300.0, 290.0), "s")
    bars = Bars(("ideal", "loss", "delivered"), values, ("300 s", "-10 s", "290 s"), starts=(280.0, 290.0, 280.0))
    root = drawn(Figure("ledger", "t", "a", Axis("Isp", "s", low=280.0), Axis(""), (bars,)))
    rects = [r for r in root.iter(f"{SPACE}rect") if r.get("fill") != palette.PLATE]
    ends = [(float(r.get("x") or 0), float(r.get("x") or 0) + float(r.get("width") or 0)) for r in rects]
    assert ends[1][0] == pytest.approx(ends[2][1], abs=0.2)
    assert ends[1][1] == pytest.approx(ends[0][1], abs=0.2)
    assert len([p for p in root.iter(f"{SPACE}path") if p.get("fill") == palette.PLATE]) == 2


@pytest.mark.parametrize("at", [(0.0, 0.0), (0.0, 0.1), (9.0, 10.0), (0.0, 10.0)])
def test_labels_of_dimensions_never_overlap(at: tuple[float, float]) -> None:
    wall = Line(Series("x", (-10.0, 10.0, 10.0, -10.0), "m"), Series("r", (3.0, 3.0, -3.0, -3.0), "m"), closed=True)
    marks = tuple(Mark(x, 3.0, f"{name} 180 mm") for x, name in zip(at, ("throat", "exit"), strict=True))
    root = drawn(Figure("outline", "t", "a", Axis("x", "m"), Axis("r", "m"), (wall, *marks), equal_aspect=True))
    left, right = (float(t.get("x") or 0) for t in root.iter(f"{SPACE}text") if "180 mm" in "".join(t.itertext()))
    assert right - left >= width_of("throat 180 mm", 10)
    assert right + width_of("exit 180 mm", 10) <= svg.WIDTH - 5


@pytest.mark.parametrize("x", [0.0, 4.0, 9.5, 10.0])
def test_a_long_label_of_a_mark_stays_inside_the_drawing(x: float) -> None:
    words = "thrust, chamber pressure and thrust coefficient of the model"
    line = Line(Series("x", (0.0, 10.0), "m"), Series("y", (1.0, 2.0), "m"))
    root = drawn(Figure("routes", "t", "a", Axis("x", "m"), Axis("y", "m"), (line, Mark(x, 1.5, words))))
    (label,) = (t for t in root.iter(f"{SPACE}text") if words in "".join(t.itertext()))
    left = float(label.get("x") or 0)
    assert left >= 0.0
    assert left + width_of(words, 10.5) <= svg.WIDTH
