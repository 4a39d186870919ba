"""One test over all objects: sheet, memo page, PDF, Markdown and JSON agree number by number."""

import json
import re
import subprocess
import unicodedata

import pytest

import propkit as pk
from propkit.view import numbers, render


def chain():
    case = pk.PropellantCase("LOX", "LCH4", mixture_ratio=3.4)
    chamber = pk.Chamber(case, pressure="6.2 MPa", contraction_ratio=3)
    nozzle = pk.Nozzle(chamber, area_ratio=60, throat_diameter="96 mm", contour=pk.Bell(length=0.8))
    return case, chamber, nozzle, pk.Performance(nozzle, ambient="12 km")


def delivered(chamber, **nozzle):
    return pk.Performance(pk.Nozzle(chamber, throat_diameter="20 mm", **nozzle), ambient="vacuum")


def objects():
    yield from ((link.kind, link) for link in chain())
    gas = pk.Chamber.from_gas(pressure="2 MPa", temperature="3000 K", molar_mass="22 g/mol", isentropic_exponent=1.2)
    yield "given gas", gas
    yield "given gas, delivered", delivered(gas, area_ratio=10)
    cold = pk.PropellantCase.cold_gas("GN2", temperature="293 K")
    yield "cold gas", delivered(pk.Chamber(cold, pressure="2 MPa"), area_ratio=20)
    mono = pk.PropellantCase.monopropellant("hydrazine", ammonia_dissociation=0.6)
    yield "monopropellant", delivered(pk.Chamber(mono, pressure="1.5 MPa"), area_ratio=40)
    solid = pk.PropellantCase.monopropellant(pk.blend({"AP": 0.70, "Al": 0.18, "HTPB": 0.12}), condensed=True)
    yield "composite", delivered(pk.Chamber(solid, pressure="7 MPa"), area_ratio=10)


OBJECTS = dict(objects())


def spaceless(text):
    """Return text without spaces of any width, powers as plain figures."""
    return "".join(unicodedata.normalize("NFKC", re.sub(r"<[^>]+>", " ", text)).split()).replace("\\", "")


def shown(report):
    for row in report.rows():
        if isinstance(row.value, float):
            yield row.name, numbers.pretty(row.value, row.digits)
    for section in report.sections:
        if section.table is not None and section.name in ("stations", "composition", "propellants"):
            for column in section.table.columns:
                yield from (
                    (f"{section.name} {column.name}", numbers.pretty(value, column.digits))
                    for value in column.values
                    if isinstance(value, float)
                )


@pytest.mark.parametrize("name", OBJECTS)
def test_every_medium_of_every_object_says_the_same_numbers(name, tmp_path):
    one = OBJECTS[name]
    record = one.record(title=name)
    report = one.report()
    page, printed = record.save(tmp_path / "memo.html"), record.save(tmp_path / "memo.pdf")
    text = subprocess.run(["pdftotext", "-layout", str(printed), "-"], capture_output=True, text=True, check=True).stdout
    media = {
        "sheet": spaceless(render(report, "html")),
        "markdown": spaceless(render(report, "markdown")),
        "memo page": spaceless(page.read_text(encoding="utf-8")),
        "PDF": spaceless(text),
    }
    listed = list(shown(report))
    assert len(listed) >= 3
    missing = [(medium, row, value) for row, value in listed for medium, body in media.items() if spaceless(value) not in body]
    assert not missing, missing[:6]
    document = json.loads(record.save(tmp_path / "memo.json").read_text(encoding="utf-8"))
    for link in one.chain():
        stored = document["content"]["objects"][link.kind]["results"]
        for result, entry in stored.items():
            if isinstance(entry["value"], float) and "." not in result:
                assert entry["value"] == link.si(result), (link.kind, result)
