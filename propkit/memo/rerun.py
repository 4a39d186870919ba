"""A notebook executed again in a clean kernel, and the records it makes compared with those that it carries."""

from __future__ import annotations

import dataclasses
from collections.abc import Callable
from pathlib import Path

from propkit.errors import PropkitError
from propkit.memo import execute as execution
from propkit.memo.notebook import notebook_bytes
from propkit.record.containers import Found, records_in, records_of
from propkit.record.files import FileVerification
from propkit.record.outcome import Check


def rerun(result: FileVerification, say: Callable[[str], None], timeout: int = 600) -> FileVerification:
    """Return the verification of a notebook with what executing it again gave; other files are returned as they are.

    Parameters
    ----------
    result : FileVerification
        Verification of the file as it stands.
    say : callable
        Told that code is executed.
    timeout : int
        Seconds that one cell may take.
    """
    path = Path(result.path)
    if result.problem or path.suffix.lower() != ".ipynb":
        return result
    notebook = execution.read_notebook(path)
    say(f"executing {path.name}: this runs its code, in this Python")
    error = execution.execute(notebook, path, timeout, say)
    if error:
        check = Check("rerun", "differs", f"the notebook did not run to its end: {error}")
    else:
        try:
            made = records_of(".ipynb", notebook_bytes(notebook), path.name).found
            check = _compared(records_in(path).found, made)
        except PropkitError as refused:
            check = Check("rerun", "differs", refused.message)
    return dataclasses.replace(result, checks=(*result.checks, check))


def _compared(carried: tuple[Found, ...], made: tuple[Found, ...]) -> Check:
    if len(carried) != len(made):
        return Check("rerun", "differs", f"the notebook carries {len(carried)} records, executed again it makes {len(made)}")
    wrong = [f"{one.place} ({', '.join(topics)})" for one, two in zip(carried, made, strict=True) if (topics := _differing(one, two))]
    if wrong:
        return Check("rerun", "differs", f"executed again, the records differ at {'; '.join(wrong)}")
    return Check("rerun", "same", f"executed again in a clean kernel, all {len(made)} records came out the same")


def _differing(one: Found, two: Found) -> list[str]:
    """Return the topics in which two records differ, versions apart."""
    return [topic for topic, found in one.record.compare(two.record).topics.items() if found and topic != "versions"]
