"""The memo in a real browser with the network blocked: nothing is asked for, nothing complains, every picture is drawn."""

from __future__ import annotations

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
