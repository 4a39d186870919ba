"""The README is true: its Python blocks run as one script, its commands exist, its files are there."""

from __future__ import annotations

import re
from pathlib import Path

import pytest

ROOT = Path(__file__).parents[2]
TEXT = (ROOT / "README.md").read_text(encoding="utf-8")
BLOCKS = re.findall(r"```python\n(.*?)```", TEXT, re.DOTALL)


def test_the_python_blocks_run_in_order():
    pytest.importorskip("CoolProp")
    space: dict = {}
    for block in BLOCKS:
        exec(compile(block, "README.md", "exec"), space)
    assert space["perf"].si("thrust") > 0


@pytest.mark.parametrize("heading", ["Run it", "Test it"])
def test_run_and_test_are_one_line_each(heading):
    section = TEXT.split(f"## {heading}\n", 1)[1].split("\n## ", 1)[0]
    block = re.search(r"```\n(.*?)\n```", section, re.DOTALL)
    assert block is not None
    assert "\n" not in block[1]
    assert ".venv" in block[1]


def test_pictures_and_notebooks_exist():
    for path in re.findall(r"\]\((notebooks/[^)]+)\)", TEXT):
        assert (ROOT / path).is_file(), path
    for name in re.findall(r"^\| `(\d\d_\w+)` \|", TEXT, re.MULTILINE):
        assert (ROOT / "notebooks" / f"{name}.ipynb").is_file(), name


def test_the_commands_exist(capsys):
    from propkit import cli

    with pytest.raises(SystemExit):
        cli.main(["--help"])
    known = capsys.readouterr().out
    for command in re.findall(r"^propkit (\w+) ", TEXT, re.MULTILINE):
        assert command in known


def test_notebooks_are_committed_without_outputs():
    import json

    for path in (ROOT / "notebooks").glob("*.ipynb"):
        cells = json.loads(path.read_text(encoding="utf-8"))["cells"]
        assert not any(cell.get("outputs") or cell.get("execution_count") for cell in cells), path.name
