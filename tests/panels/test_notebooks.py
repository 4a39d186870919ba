"""Copying the packaged notebooks."""

from __future__ import annotations

import json
from pathlib import Path

import pytest

import propkit as pk
from propkit.memo import notebooks


def test_notebooks_are_copied_with_clean_outputs(tmp_path: Path) -> None:
    copied = notebooks.copy_notebooks(tmp_path / "new" / "folder")
    assert [path.name for path in copied] == [path.name for path in notebooks.packaged_notebooks()]
    assert "02_panels_and_trades.ipynb" in [path.name for path in copied]
    for path in copied:
        cells = json.loads(path.read_text())["cells"]
        assert all(cell["outputs"] == [] and cell["execution_count"] is None for cell in cells if cell["cell_type"] == "code")
    assert notebooks.copy_notebooks(tmp_path / "new" / "folder") == copied


def test_a_changed_notebook_is_not_overwritten(tmp_path: Path) -> None:
    copied = notebooks.copy_notebooks(tmp_path)
    copied[0].write_text("{}")
    with pytest.raises(pk.StorageError, match=copied[0].name):
        notebooks.copy_notebooks(tmp_path)
    assert copied[0].read_text() == "{}"


def test_a_folder_that_cannot_be_written_is_an_error_of_storage(tmp_path: Path) -> None:
    (tmp_path / "file").write_text("")
    with pytest.raises(pk.StorageError, match="cannot be copied"):
        notebooks.copy_notebooks(tmp_path / "file")


def test_open_starts_jupyterlab_in_the_folder(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    started: list[tuple[list[str], Path]] = []
    monkeypatch.setattr(notebooks.subprocess, "run", lambda command, cwd, check: started.append((command, cwd)))
    copied = notebooks.copy_notebooks(tmp_path, open_lab=True)
    assert started[0][0][1:] == ["-m", "jupyterlab", copied[0].name]
    assert started[0][1] == tmp_path


def test_without_jupyterlab_the_error_names_the_install_line(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(notebooks.importlib.util, "find_spec", lambda name: None)
    with pytest.raises(pk.MissingExtraError, match=r"propkit\[notebook\]"):
        notebooks.copy_notebooks(tmp_path / "none", open_lab=True)
    assert not (tmp_path / "none").exists()
