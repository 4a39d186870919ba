import json
import subprocess
import sys
from xml.etree import ElementTree

import pytest

import propkit as pk
from propkit.cli import main


@pytest.fixture(scope="module")
def record():
    chamber = pk.Chamber.from_gas(pressure="2 MPa", temperature="3000 K", molar_mass="22 g/mol", isentropic_exponent=1.2)
    return pk.Performance(pk.Nozzle(chamber, area_ratio=10, throat_diameter="50 mm"), ambient="vacuum").record(title="Gas")


@pytest.fixture
def file(record, tmp_path):
    return str(record.save(tmp_path / "gas.record.json"))


def tampered(record, tmp_path):
    document = record.document
    document["content"]["objects"]["performance"]["results"]["thrust"]["value"] *= 1.5
    path = tmp_path / "tampered.record.json"
    path.write_text(json.dumps(document))
    return str(path)


def test_verify(file, capsys):
    assert main(["verify", file]) == 0
    out = capsys.readouterr().out
    assert "verified" in out
    assert "stations" in out


def test_verify_exit_codes(record, file, tmp_path, capsys):
    wrong = tampered(record, tmp_path)
    assert main(["verify", file, wrong]) == 1
    assert "thrust" in capsys.readouterr().out
    assert main(["verify", file, wrong, str(tmp_path / "none.json")]) == 2
    empty = tmp_path / "empty.ipynb"
    empty.write_text('{"cells": [], "metadata": {}, "nbformat": 4, "nbformat_minor": 5}')
    assert main(["verify", str(empty)]) == 2
    assert "no record" in capsys.readouterr().out
    assert main(["verify", str(tmp_path)]) == 2


def test_verify_as_json_and_junit(record, file, tmp_path, capsys):
    xml = tmp_path / "out.xml"
    assert main(["verify", file, tampered(record, tmp_path), "--json", "--junit", str(xml)]) == 1
    found = json.loads(capsys.readouterr().out)
    assert [entry["status"] for entry in found] == ["verified", "mismatch"]
    suites = ElementTree.parse(xml).getroot()
    assert sum(int(suite.get("failures")) for suite in suites) == 3


def test_compare(record, file, tmp_path, capsys):
    assert main(["compare", file, file]) == 0
    other = record.calculation.replace({"nozzle.area_ratio": 12}).record(title="Gas").save(tmp_path / "other.json")
    page = tmp_path / "page.html"
    assert main(["compare", file, str(other), "--html", str(page)]) == 1
    assert "area_ratio" in capsys.readouterr().out
    assert "area_ratio" in page.read_text()


def test_propellants(capsys):
    assert main(["propellants"]) == 0
    assert "LOX" in capsys.readouterr().out
    assert main(["propellants", "LOX"]) == 0
    out = capsys.readouterr().out
    assert "strong oxidizer" in out
    assert main(["propellants", "LOXX"]) == 2
    error = capsys.readouterr().err
    assert "LOX" in error
    assert "Traceback" not in error


def test_notebooks(tmp_path, capsys):
    assert main(["notebooks", str(tmp_path / "mine")]) == 0
    copied = tmp_path / "mine" / "01_first_engine.ipynb"
    copied.write_text("{}")
    assert main(["notebooks", str(tmp_path / "mine")]) == 0
    assert copied.read_text() == "{}"
    assert "kept" in capsys.readouterr().out


def test_memo_of_a_missing_notebook(tmp_path, capsys):
    assert main(["memo", str(tmp_path / "none.ipynb")]) == 2
    assert "does not exist" in capsys.readouterr().err


def test_memo_of_a_notebook_that_raises(tmp_path, capsys):
    path = tmp_path / "x.ipynb"
    cell = {"cell_type": "code", "id": "a", "metadata": {}, "source": "1/0", "outputs": [], "execution_count": None}
    path.write_text(json.dumps({"cells": [cell], "metadata": {}, "nbformat": 4, "nbformat_minor": 5}))
    assert main(["memo", str(path), "--out", str(tmp_path / "out")]) == 1
    assert "ZeroDivisionError" in capsys.readouterr().err


def test_as_a_process(file, tmp_path):
    """Exit codes and messages of a real process: no traceback for bad input."""
    run = subprocess.run([sys.executable, "-m", "propkit", "verify", file], capture_output=True, text=True)
    assert run.returncode == 0, run.stderr
    bad = tmp_path / "bad.json"
    bad.write_text('{"a": NaN}')
    run = subprocess.run([sys.executable, "-m", "propkit", "verify", str(bad)], capture_output=True, text=True)
    assert run.returncode == 2
    assert "Traceback" not in run.stdout + run.stderr
    assert subprocess.run([sys.executable, "-m", "propkit"], capture_output=True).returncode == 2
