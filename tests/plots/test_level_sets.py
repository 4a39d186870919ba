"""Contours of a table: areas and lengths known in closed form, blanks, saddles, and a map whose plot stays while its data change."""

from __future__ import annotations

import numpy as np
import pytest

import propkit as pk
from propkit.plots import wire
from propkit.plots.level_sets import LevelSets, contour_levels, label_places
from propkit.plots.study import map_figure
from propkit.view import svg

XS, YS = np.linspace(-2.0, 2.0, 81), np.linspace(-1.5, 1.5, 61)
ACROSS, UP = np.meshgrid(XS, YS)


def enclosed(x: np.ndarray, y: np.ndarray) -> float:
    """Return the area that rings enclose, holes taken off (shoelace formula); the inside is on the left."""
    area = 0.0
    cuts = np.flatnonzero(np.isnan(x))
    for xs, ys in zip(np.split(x, cuts), np.split(y, cuts), strict=True):
        xs, ys = xs[np.isfinite(xs)], ys[np.isfinite(ys)]
        area += 0.5 * float(np.sum(xs * np.roll(ys, -1) - ys * np.roll(xs, -1)))
    return area


def test_a_plane_is_cut_exactly():
    sets = LevelSets(XS, YS, 2.0 * ACROSS + UP)
    x, y = sets.rings(0.5)
    border = (np.abs(np.abs(x) - 2.0) < 1e-12) | (np.abs(np.abs(y) - 1.5) < 1e-12)
    assert np.abs(2.0 * x + y - 0.5)[~border].max() < 1e-12
    # right of the line x = (0.5 - y) / 2: half of the rectangle of 12, less a strip of 3 by 0.25
    assert enclosed(x, y) == pytest.approx(6.0 - 3.0 * 0.25, abs=1e-12)


@pytest.mark.parametrize("radius", [0.4, 1.0, 1.4])
def test_a_circle_has_its_area_to_the_square_of_the_step(radius):
    # the chord of a cell of size h leaves out at most h^2 / (8 r) of height along 2 pi r: pi h^2 / 4
    sets = LevelSets(XS, YS, -(ACROSS**2) - UP**2)
    assert enclosed(*sets.rings(-(radius**2))) == pytest.approx(np.pi * radius**2, abs=np.pi * 0.05**2)
    around = LevelSets(XS, YS, ACROSS**2 + UP**2)
    assert enclosed(*around.rings(radius**2)) == pytest.approx(12.0 - np.pi * radius**2, abs=np.pi * 0.05**2)


def test_blanks_are_left_open_and_everything_closes():
    table = np.ones_like(ACROSS)
    table[20:31, 30:41] = np.nan
    # the hole reaches to the numbers around it: 12 by 12 cells of 0.05, its four corners cut by half a cell
    assert enclosed(*LevelSets(XS, YS, table).rings(0.0)) == pytest.approx(12.0 - 0.6 * 0.6 + 4 * 0.5 * 0.05**2, abs=1e-9)
    draw = np.random.default_rng(5)
    for _ in range(200):
        rough = draw.normal(size=(9, 7))
        rough[draw.random(rough.shape) < 0.15] = np.nan
        x, y = LevelSets(np.arange(7.0), np.arange(9.0), rough).rings(0.2)
        cuts = np.flatnonzero(np.isnan(x))
        for xs, ys in zip(np.split(x, cuts), np.split(y, cuts), strict=True):
            ring = np.isfinite(xs)
            assert (xs[ring][0], ys[ring][0]) == (xs[ring][-1], ys[ring][-1])


def test_nothing_and_everything():
    sets = LevelSets(XS, YS, np.zeros_like(ACROSS))
    assert len(sets.rings(1.0)[0]) == 0
    assert enclosed(*sets.rings(-1.0)) == pytest.approx(12.0)


def test_labels_stand_apart_and_inside():
    sets = LevelSets(XS, YS, ACROSS)
    places = np.array(label_places([sets.rings(level) for level in (-1.5, -1.0, 0.0, 0.05, 1.9)], XS, YS))
    assert np.isfinite(places[:3]).all()
    assert np.isnan(places[3]).all() or abs(places[3][1] - places[2][1]) >= 0.07 * 3.0
    assert np.isnan(places[4]).all()
    assert len(contour_levels(1.0, 1.0)) == 2


GAS = pk.Chamber.from_gas(pressure="7 MPa", temperature="3500 K", molar_mass="22 g/mol", isentropic_exponent=1.2)
PERF = pk.Performance(pk.Nozzle(GAS, area_ratio=20, throat_diameter="0.1 m"), ambient="sea level")


def found(pressure: str) -> object:
    target = PERF.replace({"chamber.temperature": pressure})
    return pk.Study(target, {"chamber.pressure": np.linspace(4e6, 9e6, 12), "nozzle.area_ratio": np.linspace(4, 40, 13)}).run(
        progress=False
    )


def test_a_plot_of_a_map_stays_while_its_data_change():
    pytest.importorskip("bokeh")
    limits = {"separation_margin": (1, None)}
    first, second = (map_figure(found(text), "specific_impulse", limits=limits) for text in ("3500 K", "2900 K"))
    (one, two), _ = wire.frame_of([first, second])
    assert one["key"] == two["key"]
    assert len(first.layers[0].xs) != 0
    described, data = wire.frame_of([first])
    numbers = np.frombuffer(data, dtype="<f8")
    place, *lengths = described[0]["sources"][0]["xs"]["rows"]
    assert [len(ring) for ring in first.layers[0].xs] == lengths
    sent = numbers[place : place + lengths[0]]
    np.testing.assert_array_equal(sent, first.layers[0].xs[0])


def test_the_margin_against_separation_is_that_of_the_objects():
    from propkit.plots.study import separation_margin

    result = found("3500 K")
    margin = separation_margin(result)
    for row in (0, 40, 100, 155):
        made = PERF.replace(result.plan.plan.design(row))
        assert (margin[row] < 1.0) == (made.separation["separates"].sum() >= 2)
    assert 0 < np.count_nonzero(margin < 1.0) < len(margin)


def test_a_map_is_drawn_statically_the_same_bytes_each_time():
    figure = map_figure(found("3500 K"), "specific_impulse", limits={"separation_margin": (1, None)})
    drawn = svg.draw(figure)
    assert drawn == svg.draw(figure)
    assert "fill-rule='evenodd'" in drawn
    assert "pattern id='pk-hatch-1'" in drawn
    assert "margin against separation below 1" in drawn
    assert "nan" not in drawn.casefold().replace("nance", "")
    assert len(drawn) < 40_000
