"""The memo of a record: page, PDF and archive say the same numbers as the object."""

import csv
import io
import json
import re
import subprocess
import unicodedata
import zipfile

import pytest

import propkit as pk
from propkit.errors import RecordError
from propkit.memo.crate import SPECIFICATION, record_crate
from propkit.record.containers import records_of
from propkit.record.files import verify_file
from propkit.view import numbers

HOSTILE = '"#panic() \\ $x$ *b* _i_ <b> &amp; @x [y] =1+1 ```'


@pytest.fixture(scope="module")
def perf():
    case = pk.PropellantCase("NTO", "MMH", mixture_ratio=1.9)
    chamber = pk.Chamber(case, pressure="2.4 MPa", contraction_ratio=3, cstar_efficiency=0.97)
    nozzle = pk.Nozzle(chamber, area_ratio=80, throat_diameter="40 mm", flow="frozen", freeze_at="throat")
    return pk.Performance(nozzle, ambient="vacuum")


@pytest.fixture(scope="module")
def record(perf):
    return perf.record(title=f"Title {HOSTILE}", author="A. Analyst", purpose=f"Purpose {HOSTILE}", notes='#import "@preview/x:1.0.0"')


@pytest.fixture(scope="module")
def files(record, tmp_path_factory):
    folder = tmp_path_factory.mktemp("memo")
    for suffix in (".html", ".pdf", ".zip", ".json"):
        record.save(folder / f"memo{suffix}")
    return folder


def pdf_text(path):
    run = subprocess.run(["pdftotext", "-layout", str(path), "-"], capture_output=True, text=True, check=True)
    return run.stdout


def spaceless(text):
    """Return text without spaces of any width, figures of powers as plain figures."""
    return "".join(unicodedata.normalize("NFKC", text).split())


def shown_numbers(report):
    for row in report.rows():
        if isinstance(row.value, float):
            yield row.name, numbers.pretty(row.value, row.digits)
    for section in report.sections:
        if section.table is not None and section.name in ("stations", "composition", "propellants"):
            for column in section.table.columns:
                for value in column.values:
                    if isinstance(value, float):
                        yield f"{section.name} {column.name}", numbers.pretty(value, column.digits)


def test_every_number_of_the_sheet_is_in_page_and_pdf(perf, files):
    page = spaceless(re.sub(r"<[^>]+>", " ", (files / "memo.html").read_text()))
    printed = spaceless(pdf_text(files / "memo.pdf"))
    count = 0
    for link in (perf, perf.case):
        for name, text in shown_numbers(link.report()):
            assert spaceless(text) in page, name
            assert spaceless(text) in printed, name
            count += 1
    assert count > 60


def test_user_text_is_text_everywhere(files):
    page = (files / "memo.html").read_text()
    assert "&lt;b&gt; &amp;amp; @x" in page
    assert "#panic()" in spaceless(pdf_text(files / "memo.pdf"))
    assert "@preview" in pdf_text(files / "memo.pdf")


def test_chapters_and_pages(files):
    text = pdf_text(files / "memo.pdf")
    for title in ("Purpose", "Results", "Assumptions", "Inputs", "Working", "Stations", "Checks", "Warnings", "References", "Provenance"):
        assert title in text
    assert re.search(r"page 1 of [4-9]", text)
    assert text.count("A. Analyst") > 3


def test_same_record_same_bytes(record, files):
    again = pk.Record.load(files / "memo.json")
    from propkit.memo.record_page import record_page
    from propkit.memo.record_pdf import record_pdf

    assert record_pdf(again) == (files / "memo.pdf").read_bytes()
    assert record_page(again) == (files / "memo.html").read_bytes()
    assert record_crate(again) == (files / "memo.zip").read_bytes()


def test_pdf_is_an_archive_pdf(files):
    data = (files / "memo.pdf").read_bytes()
    assert b"pdfaid:part" in data
    info = subprocess.run(["pdfinfo", str(files / "memo.pdf")], capture_output=True, text=True, check=True).stdout
    assert "A4" in info
    fonts = subprocess.run(["pdffonts", str(files / "memo.pdf")], capture_output=True, text=True, check=True).stdout
    assert "PropkitSans" in fonts
    assert all(line.split()[-5] == "yes" for line in fonts.splitlines()[2:]), fonts


def test_files_verify(files):
    for name in ("memo.html", "memo.zip", "memo.json"):
        result = verify_file(files / name)
        assert result.status == "verified", str(result)
    assert pk.Record.load(files / "memo.zip") == pk.Record.load(files / "memo.json")


def test_a_record_that_does_not_verify_makes_no_memo(record, tmp_path):
    document = record.document
    document["content"]["objects"]["performance"]["results"]["thrust"]["value"] *= 2
    with pytest.raises(RecordError, match="does not verify"):
        pk.Record(document).save(tmp_path / "x.pdf")
    assert not list(tmp_path.iterdir())


def test_crate_satisfies_ro_crate_1_1(files):
    """The MUST rules of RO-Crate Metadata Specification 1.1 (sections Root Data Entity, Data Entities), read from the metadata."""
    with zipfile.ZipFile(files / "memo.zip") as archive:
        described = json.loads(archive.read("ro-crate-metadata.json"))
        members = set(archive.namelist())
    assert described["@context"] == "https://w3id.org/ro/crate/1.1/context"
    graph = {entity["@id"]: entity for entity in described["@graph"]}
    assert len(graph) == len(described["@graph"])
    descriptor = graph["ro-crate-metadata.json"]
    assert descriptor["@type"] == "CreativeWork"
    assert descriptor["conformsTo"] == {"@id": SPECIFICATION}
    assert descriptor["about"] == {"@id": "./"}
    root = graph["./"]
    assert root["@type"] == "Dataset"
    assert all(root[name] for name in ("name", "description", "license"))
    assert re.match(r"\d{4}-\d{2}-\d{2}", root["datePublished"])
    assert {part["@id"] for part in root["hasPart"]} == members - {"ro-crate-metadata.json"}
    for part in root["hasPart"]:
        assert graph[part["@id"]]["@type"] == "File"
    assert all("@type" in entity for entity in graph.values())

    def references(value):
        if isinstance(value, dict):
            yield from [value["@id"]] if set(value) == {"@id"} else [found for entry in value.values() for found in references(entry)]
        elif isinstance(value, list):
            yield from [found for entry in value for found in references(entry)]

    for entity in graph.values():
        for target in references({name: value for name, value in entity.items() if name != "@id"}):
            assert target in graph or target.startswith("https://"), target


@pytest.mark.filterwarnings("ignore::DeprecationWarning")
def test_crate_loads_with_rocrate(files):
    rocrate = pytest.importorskip("rocrate.rocrate")
    crate = rocrate.ROCrate(str(files / "memo.zip"))
    assert crate.root_dataset["name"].startswith("Title")
    assert {"memo.pdf", "memo.html"} <= {entity.id for entity in crate.data_entities}


def test_tables_hold_the_numbers_and_no_formulas(perf, files):
    with zipfile.ZipFile(files / "memo.zip") as archive:
        rows = list(csv.DictReader(io.StringIO(archive.read("tables/inputs_and_results.csv").decode())))
        stations = list(csv.DictReader(io.StringIO(archive.read("tables/stations.csv").decode())))
    thrust = next(row for row in rows if row["object"] == "performance" and row["name"] == "thrust")
    assert float(thrust["value"]) == perf.thrust.to("N").magnitude
    exit_row = next(row for row in stations if row["station"] == "exit")
    assert float(exit_row["temperature [K]"]) == perf.nozzle.exit.temperature.to("K").magnitude

    from propkit.memo.crate import _csv

    assert _csv([("=1+1", "+x", "-y", "@z", -1.5)]) == b"'=1+1,'+x,'-y,'@z,-1.5\n"


def test_other_objects_make_memos(tmp_path):
    gas = pk.Chamber.from_gas(pressure="2 MPa", temperature="3000 K", molar_mass="22 g/mol", isentropic_exponent=1.2)
    nozzle = pk.Nozzle(gas, area_ratio=10, throat_diameter="50 mm")
    case = pk.PropellantCase("LOX", "LH2", mixture_ratio=6)
    for place, calculation in enumerate((gas, nozzle, case, pk.Performance(nozzle, ambient="12 km"))):
        path = calculation.record().save(tmp_path / f"{place}.pdf")
        assert spaceless(calculation.record().title)[:20] in spaceless(pdf_text(path))


def test_trace_ends_in_inputs_and_data_rows(record):
    origin = record.trace("specific_impulse")
    lines = list(origin.lines())
    ends = [entry for _, entry in lines if not entry.parts]
    assert all(entry.how.startswith(("given", "default", "data row", "see above", "vacuum", "computed")) for entry in ends), [
        entry.how for entry in ends
    ]
    assert any(entry.how.startswith("data row MMH") and entry.source for entry in ends)
    assert len({entry.path for _, entry in lines}) > 15
    assert "<script" not in origin.to_html()
    with pytest.raises(pk.InputError):
        record.trace("nonsense")


def test_zip_records(files):
    assert len(records_of(".zip", (files / "memo.zip").read_bytes(), "memo.zip").found) == 2


def test_record_of_an_analysis_makes_a_memo(perf, tmp_path):
    fit = pk.Reconciliation(perf, {"thrust": ("4.1 kN", "2 %"), "mass_flow": ("1.35 kg/s", "2 %"), "throat_diameter": ("40 mm", "0.1 mm")})
    record = fit.record(title="Reconciled")
    for suffix in (".pdf", ".html"):
        path = record.save(tmp_path / f"x{suffix}")
    assert "Reconciled" in pdf_text(tmp_path / "x.pdf")
    assert verify_file(path).exit_code == 0


def test_prices_stand_beside_the_assumptions(perf, files):
    text = spaceless(pdf_text(files / "memo.pdf"))
    priced = [price for entry in perf.assumptions for price in entry.prices if price.size >= 0]
    assert priced
    assert all(spaceless(price.alternative) in text for price in priced)


def page_size(path):
    found = re.search(
        r"Page size:\s+([0-9.]+) x ([0-9.]+)", subprocess.run(["pdfinfo", str(path)], capture_output=True, text=True, check=True).stdout
    )
    return tuple(round(float(side)) for side in found.groups())


def test_paper(record, tmp_path):
    """A4 is 210 mm by 297 mm (ISO 216), Letter 8.5 in by 11 in (ANSI/ASME Y14.1); a point is 1/72 in."""
    assert page_size(record.save(tmp_path / "x.pdf", paper="a4")) == (595, 842)
    assert page_size(record.save(tmp_path / "y.pdf", paper="letter")) == (612, 792)
    with zipfile.ZipFile(record.save(tmp_path / "z.zip", paper="letter")) as archive:
        (tmp_path / "z.pdf").write_bytes(archive.read("memo.pdf"))
    assert page_size(tmp_path / "z.pdf") == (612, 792)
    for name, paper in (("x.pdf", "legal"), ("x.json", "a4"), ("x.html", "letter"), ("x.pdf", 4)):
        with pytest.raises(pk.InputError, match="paper"):
            record.save(tmp_path / name, paper=paper)


def test_digests_are_whole_in_the_pdf(files, record):
    assert record.content_digest in spaceless(pdf_text(files / "memo.pdf"))


def test_a_study_shows_its_sample_as_a_table(perf):
    result = pk.Study(perf, {"chamber.pressure": ["2 MPa", "3 MPa"]}).run(progress=False)
    report = result.record(title="Two").report()
    names = [section.name for section in report.sections]
    table = next(section.table for section in report.sections if section.name == "study-sample")
    assert names.index("study-sample") == names.index("study") + 1
    assert len(table.index) > 20
    assert not any(row.name.startswith("design ") for section in report.sections for row in section.rows)
    stored = result.record().content["objects"]["study"]["results"]
    place = next(place for place, name in enumerate(table.index) if name.startswith("thrust ["))
    for column in table.columns:
        assert column.values[place] == stored[f"{column.name} thrust"]["value"]


@pytest.mark.parametrize(
    "title", ["推力 \u0928\u094d\u200d \u05d0\u05d1 \U0001f680", "12\u202f000\u2009N ½ ≤ Ω", "\U0001f468\u200d\U0001f680" * 20]
)
def test_letters_of_any_script_can_be_set(perf, tmp_path, title):
    path = perf.nozzle.chamber.case.record(title=f"Title {title}", notes=title).save(tmp_path / "x.pdf")
    fonts = subprocess.run(["pdffonts", str(path)], capture_output=True, text=True, check=True).stdout
    assert all(line.split()[-5] == "yes" for line in fonts.splitlines()[2:]), fonts
    assert "Title" in pdf_text(path)


def test_control_characters_of_a_notebook_do_not_stop_the_pdf():
    from propkit.memo.blocks import blocks_of
    from propkit.memo.notebook_pdf import notebook_pdf
    from propkit.memo.page import NotebookMemo

    noise = "".join(map(chr, [*range(32), 0x7F, 0x85, 0xAD, 0x202E, 0xFFFE, 0xE000, 0x10FFFF])) + "end"
    outputs = [
        {"output_type": "display_data", "data": {"text/html": f"<p title='{noise}'>{noise}</p><img alt='{noise}' src='x'>"}, "metadata": {}}
    ]
    cells = [
        {"cell_type": "markdown", "source": f"# T{noise}\n\n{noise}"},
        {"cell_type": "code", "source": f"x{noise}", "outputs": outputs},
    ]
    assert notebook_pdf(NotebookMemo(f"T{noise}", f"{noise}.ipynb", tuple(blocks_of({"cells": cells})), (), noise)).startswith(b"%PDF")
