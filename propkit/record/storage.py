"""Writing files so that a crash leaves the old file or the new one, never half of one."""

from __future__ import annotations

import os
import tempfile
from pathlib import Path

from propkit.errors import StorageError


def write_atomically(path: str | Path, data: bytes) -> Path:
    """Write a file: to a temporary file beside it, flushed to the disk, then renamed over it.

    Parameters
    ----------
    path : str or Path
        The file to write; its folder must exist.
    data : bytes
        The whole content.

    Returns
    -------
    Path
        The file written.

    Raises
    ------
    StorageError
        When it cannot be written; nothing half-written is left behind.
    """
    target = Path(path)
    try:
        if target.is_dir():
            raise StorageError(f"{target} is a folder; give the name of a file.", path=str(target))
        _replace(target, data)
    except (OSError, ValueError) as error:
        if isinstance(error, StorageError):
            raise
        reason = getattr(error, "strerror", None) or str(error)
        raise StorageError(
            f"{target} cannot be written: {reason}. Choose a folder that exists and that you may write to.", path=str(target)
        ) from None
    return target


def _replace(target: Path, data: bytes) -> None:
    handle, name = tempfile.mkstemp(prefix=f".{target.name[:80]}.", suffix=".part", dir=target.parent)
    try:
        with os.fdopen(handle, "wb") as stream:
            stream.write(data)
            stream.flush()
            os.fsync(stream.fileno())
        os.chmod(name, _mode(target))
        os.replace(name, target)
    except BaseException:
        if os.path.exists(name):
            os.unlink(name)
        raise


def _mode(target: Path) -> int:
    """Return the permissions of the file that is replaced, else those that a new file gets."""
    if target.exists():
        return target.stat().st_mode & 0o777
    mask = os.umask(0)
    os.umask(mask)
    return 0o666 & ~mask


def make_folder(path: str | Path) -> Path:
    """Return a folder, made when it is not there.

    Raises
    ------
    StorageError
        When it cannot be made.
    """
    folder = Path(path)
    try:
        folder.mkdir(parents=True, exist_ok=True)
    except OSError as error:
        raise StorageError(f"the folder {folder} cannot be made: {error.strerror or error}.", path=str(folder)) from None
    return folder
