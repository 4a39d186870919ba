"""One JupyterLab and one browser for all browser tests; without a browser they skip, in CI they fail."""

from __future__ import annotations

import os
import sys
from collections.abc import Iterator
from pathlib import Path
from typing import Any

import pytest

sys.path.insert(0, str(Path(__file__).parent))

import rig


@pytest.fixture(scope="session")
def lab(tmp_path_factory: pytest.TempPathFactory) -> Iterator[rig.Lab]:
    reason = rig.why_not()
    if reason and os.environ.get("CI", "").lower() in ("1", "true", "yes"):
        pytest.fail(f"browser tests must run in CI: {reason}")
    if reason:
        pytest.skip(reason)
    with rig.lab(tmp_path_factory.mktemp("lab") / "root") as running:
        yield running


@pytest.fixture(scope="session")
def browser(lab: rig.Lab) -> Iterator[Any]:
    from playwright.sync_api import sync_playwright

    with sync_playwright() as playwright:
        launched = playwright.chromium.launch(executable_path=rig.browser_path(), args=list(rig.FLAGS))
        yield launched
        launched.close()


@pytest.fixture
def page(lab: rig.Lab, browser: Any) -> Iterator[rig.Page]:
    opened = rig.Page(browser, lab)
    yield opened
    opened.close()
    assert opened.outside == [], "the page asked for something outside"
    assert opened.complaints == [], "the console complained"
