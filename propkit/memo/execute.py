"""Execution of a notebook in the present interpreter, cell by cell."""

from __future__ import annotations

import os
import socket
import sys
import sysconfig
import tempfile
from collections.abc import Callable, Mapping
from pathlib import Path
from typing import Any

from propkit.errors import MissingExtraError, RecordError
from propkit.record.reading import parse_json, read_file
from propkit.record.schema import without_grammars


def require() -> None:
    """Raise when the packages that execute notebooks are absent.

    Raises
    ------
    MissingExtraError
        Naming the line that installs them.
    """
    import importlib.util

    for package in ("nbformat", "nbclient", "ipykernel"):
        if importlib.util.find_spec(package) is None:
            raise MissingExtraError(package, "memo", "executing a notebook")


def read_notebook(path: Path) -> Any:
    """Return a notebook, read as data with limits.

    Parameters
    ----------
    path : Path
        An .ipynb file.

    Raises
    ------
    StorageError, RecordError
        When it cannot be read, or is no notebook.
    """
    require()
    with without_grammars():
        import nbformat
        from nbformat.v4.rwbase import rejoin_lines

    try:
        value = parse_json(read_file(path))
    except RecordError as error:
        raise RecordError(f"{path.name} is not a notebook that can be read: {error.message}") from None
    cells = value.get("cells") if isinstance(value, Mapping) else None
    if not isinstance(cells, list) or not all(isinstance(cell, Mapping) for cell in cells):
        raise RecordError(f"{path.name} is not a notebook of format 4: it has no list of cells")
    try:
        notebook = nbformat.from_dict({"metadata": {}, "nbformat": 4, "nbformat_minor": 5, **value})  # type: ignore[no-untyped-call]
        notebook = rejoin_lines(notebook)  # type: ignore[no-untyped-call]
        _give_ids(notebook)
        nbformat.validate(notebook)
    except Exception as error:
        reason = str(error).splitlines()[0][:200] if str(error) else type(error).__name__
        raise RecordError(f"{path.name} is not a valid notebook: {reason}") from None
    return notebook


def _give_ids(notebook: Any) -> None:
    """Give cells of older notebooks the ids that the present format asks for: their place, so that bytes repeat."""
    if notebook.nbformat == 4 and notebook.nbformat_minor < 5:
        notebook.nbformat_minor = 5
    taken = {cell.get("id") for cell in notebook.cells if isinstance(cell, Mapping)}
    for place, cell in enumerate(notebook.cells, 1):
        if isinstance(cell, dict) and not cell.get("id"):
            name = f"cell-{place}"
            while name in taken:
                name += "x"
            cell["id"] = name
            taken.add(name)


def execute(
    notebook: Any, path: Path, timeout: int, say: Callable[[str], None], finished: Callable[[Any], None] = lambda cell: None
) -> str:
    """Execute a notebook in place, in the present interpreter whatever its kernelspec says.

    Parameters
    ----------
    notebook : nbformat notebook
        Changed in place; after an error it holds the outputs so far.
    path : Path
        Where the notebook is; the cells run in its folder.
    timeout : int
        Seconds that one cell may take.
    say : callable
        Told what happens, cell by cell.
    finished : callable
        Given each cell that was executed, with its outputs.

    Returns
    -------
    str
        Empty, or what went wrong in which cell.
    """
    from nbclient.exceptions import CellExecutionError, CellTimeoutError, DeadKernelError

    for cell in notebook.cells:
        if cell.cell_type == "code":
            cell.outputs, cell.execution_count = [], None
    notebook.metadata.pop("widgets", None)
    progress = _Progress(notebook, say, finished)
    try:
        with tempfile.TemporaryDirectory(prefix="pk") as sockets:
            _client(notebook, path.resolve().parent, timeout, progress, Path(sockets)).execute(env=_environment())
    except CellExecutionError as error:
        reason = f"{error.ename}: {error.evalue}"
    except CellTimeoutError:
        reason = f"it took longer than {timeout} s"
    except DeadKernelError:
        reason = "the kernel died while it was running"
    else:
        return ""
    return f"{path.name}, {progress.place}: {reason}"[:2000]


class _Progress:
    """Which code cell is running; blank cells are not counted."""

    def __init__(self, notebook: Any, say: Callable[[str], None], finished: Callable[[Any], None]) -> None:
        self._say, self._finished = say, finished
        self._places = [place for place, cell in enumerate(notebook.cells) if cell.cell_type == "code" and cell.source.strip()]
        self.place = "before its first cell"

    def started(self, cell: Any, cell_index: int) -> None:
        if cell_index in self._places:
            number = f"cell {self._places.index(cell_index) + 1} of {len(self._places)}"
            first = cell.source.strip().splitlines()[0][:70]
            self.place = f"{number} ({first})"
            self._say(f"  {number}: {first}")

    def executed(self, cell: Any, cell_index: int, execute_reply: Any) -> None:
        del cell_index, execute_reply
        self._finished(cell)


def _client(notebook: Any, folder: Path, timeout: int, progress: _Progress, sockets: Path) -> Any:
    from jupyter_client.kernelspec import KernelSpec
    from jupyter_client.manager import AsyncKernelManager
    from nbclient import NotebookClient

    class Here(AsyncKernelManager):  # type: ignore[misc, unused-ignore]
        """Starts the present interpreter, whatever kernel is asked for, on sockets that only this user can reach."""

        def __init__(self, **options: Any) -> None:
            if hasattr(socket, "AF_UNIX"):
                options = {"transport": "ipc", "ip": str(sockets / "s"), "connection_file": str(sockets / "kernel.json"), **options}
            super().__init__(**options)

        @property
        def kernel_spec(self) -> KernelSpec:
            argv = [sys.executable, "-m", "ipykernel_launcher", "-f", "{connection_file}"]
            return KernelSpec(argv=argv, display_name="Python", language="python")

    return NotebookClient(
        notebook,
        timeout=timeout,
        kernel_name="python3",
        kernel_manager_class=Here,
        resources={"metadata": {"path": str(folder)}},
        record_timing=False,
        on_cell_start=progress.started,
        on_cell_executed=progress.executed,
    )


def _environment() -> dict[str, str]:
    """Return the environment of the kernel: the propkit of this process is importable there too."""
    environment = dict(os.environ)
    home = str(Path(__file__).resolve().parents[2])
    if home not in (sysconfig.get_path("purelib"), sysconfig.get_path("platlib")):
        environment["PYTHONPATH"] = os.pathsep.join(part for part in (home, environment.get("PYTHONPATH")) if part)
    environment["PYDEVD_DISABLE_FILE_VALIDATION"] = "1"
    return environment
