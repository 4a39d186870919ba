"""The packaged notebooks: where they are, copying them to a folder of one's own, starting JupyterLab on them."""

from __future__ import annotations

import importlib.util
import os
import shutil
import subprocess
import sys
from pathlib import Path

from propkit.errors import MissingExtraError, StorageError

PACKAGED = Path(__file__).resolve().parents[1] / "notebooks"
SOURCE_TREE = Path(__file__).resolve().parents[2] / "notebooks"


def packaged_notebooks() -> list[Path]:
    """Return the notebooks that come with propkit, in their order.

    Returns
    -------
    list of Path
        The numbered notebooks of the installed package, or of the source tree.

    Raises
    ------
    StorageError
        When there are none.
    """
    for folder in (PACKAGED, SOURCE_TREE):
        found = sorted(folder.glob("[0-9][0-9]_*.ipynb"))
        if found:
            return found
    raise StorageError(f"no notebooks in {PACKAGED} nor in {SOURCE_TREE}: the installation is incomplete")


def copy_notebooks(directory: str | os.PathLike[str], open_lab: bool = False) -> list[Path]:
    """Copy the packaged notebooks into a folder; start JupyterLab on it when asked.

    Parameters
    ----------
    directory : path
        Folder to copy to; made when it is not there. A notebook that is there already with other content is kept.
    open_lab : bool
        Whether to start JupyterLab in the folder and wait for its end.

    Returns
    -------
    list of Path
        The notebooks in the folder.

    Raises
    ------
    StorageError
        When the folder cannot be written, or holds a notebook of the same name that was changed.
    MissingExtraError
        When JupyterLab is asked for and not installed; nothing is copied then.
    """
    if open_lab and importlib.util.find_spec("jupyterlab") is None:
        raise MissingExtraError("jupyterlab", "notebook", "opening the notebooks")
    folder = Path(directory)
    sources = packaged_notebooks()
    changed = [source.name for source in sources if _differs(source, folder / source.name)]
    if changed:
        raise StorageError(f"{folder} already holds {', '.join(changed)} with other content; name another folder, or move them away")
    try:
        folder.mkdir(parents=True, exist_ok=True)
        copied = [Path(shutil.copyfile(source, folder / source.name)) for source in sources]
    except OSError as error:
        raise StorageError(f"the notebooks cannot be copied to {folder}: {error}") from error
    if open_lab:
        subprocess.run([sys.executable, "-m", "jupyterlab", copied[0].name], cwd=folder, check=False)
    return copied


def _differs(source: Path, target: Path) -> bool:
    return target.exists() and target.read_bytes() != source.read_bytes()
