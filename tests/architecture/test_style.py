"""The linter and the type checker pass on the whole tree."""

from __future__ import annotations

import subprocess
import sys
from pathlib import Path

import pytest

ROOT = Path(__file__).parents[2]


def run(*command: str) -> str:
    done = subprocess.run([sys.executable, "-m", *command], cwd=ROOT, capture_output=True, text=True, check=False)
    return "" if done.returncode == 0 else done.stdout[-3000:] + done.stderr[-1000:]


def test_the_linter_passes():
    pytest.importorskip("ruff")
    assert run("ruff", "check", ".") == ""


@pytest.mark.full
def test_the_type_checker_passes():
    pytest.importorskip("mypy")
    assert run("mypy") == ""
