"""Curves and maps of a study hold the numbers of its table, mark what they say, and refuse what they cannot draw."""

import numpy as np
import pytest

import propkit as pk

GAS = pk.Performance(
    pk.Nozzle(
        pk.Chamber.from_gas(pressure="7 MPa", temperature="3500 K", molar_mass="22 g/mol", isentropic_exponent=1.2),
        area_ratio=20,
        throat_diameter="0.1 m",
    ),
    ambient="sea level",
)


@pytest.fixture(scope="module")
def found():
    axes = {"chamber.pressure": np.linspace(4e6, 9e6, 6), "nozzle.area_ratio": np.linspace(4, 40, 13)}
    return pk.Study(GAS, axes).run(progress=False)


def test_curves_hold_the_numbers_of_the_table(found):
    figure = found.curves(y="specific_impulse")
    assert figure.x.label == "area ratio"
    assert len(figure.layers) == 6
    frame = found.frame
    first = frame[frame["chamber.pressure"] == 4e6]
    assert figure.layers[0].y.values == tuple(first["specific_impulse"])
    assert figure.layers[0].label == "4 MPa"
    assert "pressure" in figure.title


def test_a_sheet_of_a_grid_shows_its_curves_and_a_list_of_designs_none(found):
    assert "data:image/svg" in found.report()._repr_mimebundle_()["text/html"]
    listed = pk.Study(GAS, found.frame[["nozzle.area_ratio"]].head(3)).run(progress=False)
    assert listed.figures() == ()


def test_a_map_marks_the_best_design_inside_the_limits(found):
    pytest.importorskip("bokeh")
    made = found.map("specific_impulse", limits={"nozzle.exit.pressure": ("40 kPa", None)})
    frame = found.frame
    inside = frame[frame["nozzle.exit.pressure"] >= 40e3]
    best = inside.loc[inside["specific_impulse"].idxmax()]
    marks = [source for source in _sources(made) if "text" in source and "align" in source]
    assert marks[0]["x"][0] == pytest.approx(best["chamber.pressure"] / 1e6)
    assert marks[0]["y"][0] == pytest.approx(best["nozzle.area_ratio"])
    assert f"{best['specific_impulse']:.5g}" in marks[0]["text"][0]
    told = next(source for source in _sources(made) if "hover1" in source)
    assert len(told["hover0"]) == len(frame)
    assert sorted(np.round(told["hover0"], 6)) == sorted(np.round(frame["specific_impulse"], 6))
    assert sorted(np.round(told["hover1"], 6)) == sorted(np.round(frame["nozzle.exit.pressure"] / 1e3, 6))


def _sources(made):
    from bokeh.models import ColumnDataSource

    return [dict(source.data) for source in made.select({"type": ColumnDataSource})]


def test_levels_are_round_and_enclose_the_values():
    from propkit.plots.level_sets import contour_levels

    levels = contour_levels(287.3, 341.9)
    assert levels[0] <= 287.3
    assert levels[-1] >= 341.9
    assert 5 <= len(levels) <= 12
    steps = np.diff(levels)
    assert np.allclose(steps, steps[0])
    assert len(contour_levels(3.0, 3.0)) == 2


def test_what_cannot_be_drawn_is_refused(found):
    pytest.importorskip("bokeh")
    listed = pk.Study(GAS, found.frame[["nozzle.area_ratio", "chamber.pressure"]].head(8)).run(progress=False)
    with pytest.raises(pk.InputError, match="grid"):
        listed.map("thrust")
    with pytest.raises(pk.InputError, match="another number"):
        pk.Study(GAS, {"area_ratio": [10, 20]}).run(progress=False).map("thrust")
    for call in (
        lambda: found.map("thrus"),
        lambda: found.map("thrust", x="ambient"),
        lambda: found.map("thrust", limits={"nozzle.exit.pressure": "40 kPa"}),
        lambda: found.map("thrust", limits={"nozzle.exit.pressure": ("40 K", None)}),
        lambda: found.plot(x="thrust"),
        lambda: found.plot(units="metric"),
    ):
        with pytest.raises(pk.InputError):
            call()


def test_a_record_of_a_study_verifies_and_a_changed_table_is_refused(found):
    record = found.record(title="Trade", sample=3, seed=4)
    outcome = record.verify()
    assert "verified" in str(outcome).splitlines()[1]
    assert record.content["recipe"]["inputs"]["options"]["seed"] == 4
    with pytest.raises(pk.InputError):
        found.record(sample=0)
    from propkit.study.sweep_result import StudyResult

    columns = {name: values.copy() for name, values in found._columns.items()}
    columns["thrust"] *= 1.0 + 1e-6
    forged = StudyResult(found.plan, columns, found._done, {}, (), False, 0.0)
    with pytest.raises(pk.RecordError, match="thrust"):
        forged.record(sample=3, seed=4)


def test_the_figure_of_a_sheet_shows_a_result_that_varies():
    case = pk.PropellantCase("LOX", "LCH4", mixture_ratio=3.4)
    nozzle = pk.Nozzle.sized_for(pk.Chamber(case, pressure="7 MPa"), thrust="80 kN", ambient="vacuum", area_ratio=20)
    result = pk.Study(pk.Performance(nozzle, ambient="vacuum"), {"chamber.pressure": [6e6, 7e6, 8e6]}).run(progress=False)
    assert np.ptp(result.frame["thrust"]) < 1e-3
    (figure,) = result.figures()
    assert figure.y.label == "specific impulse"
    assert np.ptp(figure.layers[0].y.values) > 0.01
