"""Every packaged notebook runs from clean outputs, offline, and leaves a memo and records that verify."""

from __future__ import annotations

import json
import re
import shutil
from pathlib import Path

import pytest

from propkit import cli

NOTEBOOKS = sorted((Path(__file__).parents[2] / "notebooks").glob("*.ipynb"))


def test_there_are_notebooks():
    assert [path.name for path in NOTEBOOKS][:1] == ["01_first_engine.ipynb"]


@pytest.mark.parametrize("path", NOTEBOOKS, ids=lambda path: path.stem)
def test_a_notebook_runs_and_its_records_verify(path, tmp_path, monkeypatch, capsys):
    pytest.importorskip("nbclient")
    for name in ("http_proxy", "https_proxy", "HTTP_PROXY", "HTTPS_PROXY"):
        monkeypatch.setenv(name, "http://127.0.0.1:9")  # nothing answers there: a download would fail
    copy = tmp_path / path.name
    shutil.copy(path, copy)
    out = tmp_path / "out"
    assert cli.main(["memo", str(copy), "--out", str(out)]) == 0, capsys.readouterr().out
    executed = out / path.name
    records = sorted(out.glob("*.record.json"))
    assert records
    assert cli.main(["verify", str(executed), *map(str, records)]) == 0, capsys.readouterr().out
    cells = [cell for cell in json.loads(executed.read_text(encoding="utf-8"))["cells"] if cell["cell_type"] == "code"]
    assert [cell["execution_count"] for cell in cells] == list(range(1, len(cells) + 1))
    page = (out / f"{path.stem}.html").read_text(encoding="utf-8")
    assert "<script" not in page
    assert not re.search(r"""(?:src|href)=["']https?:""", page)
