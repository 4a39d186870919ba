"""Records of every kind of object: verified, set as memos, compared with each other, every number traced."""

import html
import itertools
import json

import pytest

import propkit as pk
from propkit.record.files import verify_file

from .test_agreement import OBJECTS, delivered


def others():
    film = pk.PropellantCase.with_film("LOX", "RP-1", mixture_ratio=2.4, film_fraction=0.08, film_mixture_ratio=0.8)
    yield "film", delivered(pk.Chamber(film, pressure="7 MPa"), area_ratio=20)
    case = OBJECTS["case"]
    lossy = pk.Nozzle(
        pk.Chamber(case, pressure="9.7 MPa", cstar_efficiency=0.97), area_ratio=35, throat_diameter="0.18 m", contour=pk.Bell(length=0.8)
    )
    asked = {"two-phase": "1 s", "kinetics": 0.99, "boundary layer": {"ratio": 0.985, "source": "test series of an earlier nozzle"}}
    yield "losses", pk.Performance(lossy, ambient="12 km", losses=asked)
    sized = pk.Nozzle(
        pk.Chamber(case, pressure="6 MPa"),
        area_ratio=20,
        thrust="50 kN",
        sizing_ambient="vacuum",
        discharge_coefficient=0.99,
        flow="frozen",
        freeze_at="throat",
    )
    yield "sized, frozen", pk.Performance(sized, ambient="vacuum")
    gas = OBJECTS["given gas"]
    yield "gas by mass flow", pk.Performance(pk.Nozzle(gas, exit_pressure="20 kPa", mass_flow="3 kg/s"), ambient="12 km")


def analyses():
    from propkit.reconcile.firing_demo import CALIBRATION, HEADERS, demo_firing

    perf = OBJECTS["performance"]
    yield "study", pk.Study(perf, {"chamber.pressure": ["5 MPa", "6 MPa"]}).run(progress=False)
    yield "uncertainty", pk.Uncertainty(perf, {"chamber.pressure": pk.Normal("1 %")}).run(samples=300, seed=1)
    yield (
        "reconciliation",
        pk.Reconciliation(
            perf, {"thrust": ("140 kN", "2 %"), "mass_flow": ("40 kg/s", "2 %"), "nozzle.throat_diameter": ("96 mm", "0.1 mm")}
        ),
    )
    target = pk.Performance(
        pk.Nozzle(pk.Chamber(OBJECTS["case"], pressure="5 MPa"), area_ratio=8, throat_diameter="80 mm"), ambient="sea level"
    )
    made = demo_firing(target, 1)
    options = {"throat_before": made.throat_before, "throat_after": made.throat_after, "throat_growth": made.throat_growth}
    calibration = {name: f"{100.0 * share:g} %" for name, share in CALIBRATION.items()}
    yield "firing", pk.HotFire(target, made.table, HEADERS, calibration=calibration, **options)


RECORDS = {name: one.record(title=name, author="A. Analyst") for name, one in itertools.chain(OBJECTS.items(), others(), analyses())}


@pytest.mark.parametrize("name", RECORDS)
def test_the_archive_of_every_kind_verifies(name, tmp_path):
    record = RECORDS[name]
    result = verify_file(record.save(tmp_path / "x.zip", paper="letter"))  # with the record, its page and its PDF inside
    assert result.status == "verified", str(result)
    assert len(result.verifications) == 2
    assert str(record)


@pytest.mark.parametrize("name", RECORDS)
def test_every_number_can_be_traced(name):
    record = RECORDS[name]
    content = record.content
    for kind, stored in content["objects"].items():
        for result in (*stored["results"], *stored["inputs"]):
            origin = record.trace(result if kind == content["object"] else f"{kind}.{result}")
            assert origin.text
            assert origin.how
            assert "<script" not in origin.to_html()


def test_unlike_records_compare():
    for one, two in itertools.product(RECORDS.values(), repeat=2):
        comparison = one.compare(two)
        assert comparison.same == (one is two)
        assert len(str(comparison)) < 40_000
        assert "{'" not in str(comparison).partition("Texts:")[0]
        assert json.dumps(comparison.to_page())


def test_an_object_on_one_side_is_told_in_a_word():
    text = str(RECORDS["case"].compare(RECORDS["performance"]))
    assert "performance | (absent) | present, 1 entry" in text


def test_the_samples_of_a_firing_are_left_out_of_its_memo(tmp_path):
    page = RECORDS["firing"].save(tmp_path / "x.html").read_text(encoding="utf-8")
    text, _, _ = page.partition("<template")
    assert "values here" in text
    assert "the record holds them" in text
    assert len(RECORDS["firing"].to_bytes()) > 5 * len(text[text.index("The same calculation as a script") :])


@pytest.mark.parametrize("name", ["study", "uncertainty", "reconciliation", "firing"])
def test_the_memo_of_an_analysis_tells_its_whole_sheet(name, tmp_path):
    page = RECORDS[name].save(tmp_path / "x.html").read_text(encoding="utf-8")
    sections = RECORDS[name].calculation.report().sections
    assert sections
    for section in sections:
        assert f"<h3>{html.escape(section.title)}</h3>" in page
        assert all(html.escape(line) in page for line in section.lines)
