"""The memo in a real browser with the network blocked: nothing is asked for, nothing complains, every picture is drawn."""

from __future__ import annotations

import re
import subprocess
from pathlib import Path
from typing import Any

import pytest

import propkit as pk
from propkit import cli

NOTEBOOK = Path(__file__).parents[2] / "notebooks" / "01_first_engine.ipynb"


@pytest.fixture(scope="module")
def memos(tmp_path_factory: pytest.TempPathFactory) -> list[Path]:
    folder = tmp_path_factory.mktemp("memo")
    assert cli.main(["memo", str(NOTEBOOK), "--out", str(folder)]) == 0
    chamber = pk.Chamber(pk.PropellantCase("LOX", "LH2", mixture_ratio=6), pressure="7 MPa")
    perf = pk.Performance(pk.Nozzle(chamber, area_ratio=40, throat_diameter="0.1 m"), ambient="vacuum")
    perf.record(title="A memo of a record").save(folder / "record.html")
    return [folder / f"{NOTEBOOK.stem}.html", folder / "record.html"]


@pytest.mark.parametrize("width", [1100, 390])
@pytest.mark.parametrize("which", [0, 1])
def test_a_memo_needs_no_network(browser: Any, memos: list[Path], which: int, width: int) -> None:
    asked: list[str] = []
    complaints: list[str] = []
    context = browser.new_context(viewport={"width": width, "height": 900}, offline=True)
    page = context.new_page()
    page.on("request", lambda request: asked.append(request.url))
    page.on("console", lambda message: complaints.append(message.text))
    page.on("pageerror", lambda error: complaints.append(str(error)))
    page.goto(memos[which].as_uri())
    page.wait_for_load_state("load")
    outside = [url for url in asked if not url.startswith(("file:", "data:"))]
    assert outside == []
    assert complaints == []
    assert page.locator("script").count() == 0
    pictures = page.evaluate("[...document.images].map(image => [image.complete, image.naturalWidth])")
    assert pictures
    assert all(complete and wide > 0 for complete, wide in pictures)
    assert page.evaluate("document.documentElement.scrollWidth") <= width + 1
    assert "specific impulse" in page.inner_text("body")
    context.close()


@pytest.mark.parametrize(("paper", "size"), [("A4", (595, 842)), ("Letter", (612, 792))])
@pytest.mark.parametrize("which", [0, 1])
def test_a_memo_prints_on_both_papers(
    browser: Any, memos: list[Path], tmp_path: Path, which: int, paper: str, size: tuple[int, int]
) -> None:
    """Page numbers stand at the foot, nothing is cut at the right edge, and no heading is left alone at the foot of a page."""
    page = browser.new_page()
    page.goto(memos[which].as_uri())
    printed = tmp_path / "memo.pdf"
    page.pdf(path=str(printed), format=paper)
    page.close()
    info = subprocess.run(["pdfinfo", str(printed)], capture_output=True, text=True, check=True).stdout
    wide, high = (round(float(side)) for side in re.findall(r"Page size:\s+([0-9.]+) x ([0-9.]+)", info)[0])
    assert abs(wide - size[0]) <= 1
    assert abs(high - size[1]) <= 1
    count = int(re.findall(r"Pages:\s+(\d+)", info)[0])
    pages = subprocess.run(["pdftotext", "-layout", str(printed), "-"], capture_output=True, text=True, check=True).stdout.split("\f")
    headings = {
        "Chamber",
        "Nozzle",
        "Records",
        "Cautions",
        "Code",
        "4. Inputs",
        "6. Working",
        "8. Checks",
        "11. References",
        "12. Provenance",
    }
    for number, text in enumerate(pages[:count], 1):
        lines = [line.strip() for line in text.splitlines() if line.strip()]
        assert f"page {number} of {count}" in lines[-1]
        assert lines[-2] not in headings, (number, lines[-3:])
    boxes = subprocess.run(["pdftotext", "-bbox", str(printed), "-"], capture_output=True, text=True, check=True).stdout
    assert max(float(edge) for edge in re.findall(r'xMax="([0-9.]+)"', boxes)) < wide - 20
