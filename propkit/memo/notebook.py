"""From a notebook to its memo: execute, bind the records, write everything beside each other."""

from __future__ import annotations

import copy
import json
import re
import unicodedata
from collections.abc import Callable
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

from propkit.errors import MissingExtraError
from propkit.memo import execute as execution
from propkit.memo.ahead import Ahead
from propkit.memo.blocks import blocks_of, title_of, without_title
from propkit.memo.crate import record_crate
from propkit.memo.markup import uncertainty, value_text
from propkit.memo.notebook_pdf import notebook_pdf
from propkit.memo.page import Bound, NotebookMemo, notebook_page
from propkit.record.containers import Contents, records_of
from propkit.record.record import Record, check_paper
from propkit.record.sheet import headline_of
from propkit.record.storage import make_folder, write_atomically
from propkit.view import cells


@dataclass(slots=True)
class Written:
    """What was written, and what went wrong while the notebook was executed."""

    written: list[Path] = field(default_factory=list)
    error: str = ""


def write_memo(
    path: str | Path,
    out: str | Path | None = None,
    *,
    execute: bool = True,
    timeout: int = 600,
    crate: bool = False,
    paper: str = "a4",
    say: Callable[[str], None] = print,
) -> Written:
    """Execute a notebook and write the executed notebook, its HTML and PDF memos and the records it carries.

    Parameters
    ----------
    path : str or Path
        The notebook.
    out : str or Path, optional
        Folder to write to; the notebook's own unless given.
    execute : bool
        False takes an already executed notebook as it is.
    timeout : int
        Seconds that one cell may take.
    crate : bool
        Whether each record is written as an RO-Crate too, with the notebook inside.
    paper : {"a4", "letter"}
        Size of the sheets of the PDF.
    say : callable
        Told what happens.

    Returns
    -------
    Written
        The files, and the error of a cell that raised: the partial notebook is kept then.

    Raises
    ------
    InputError, StorageError, RecordError, MissingExtraError
        For another paper; when the notebook cannot be read, a file cannot be written, or the memo extra is absent.
    """
    check_paper(paper, ".pdf")
    notebook_path = Path(path)
    notebook = execution.read_notebook(notebook_path)
    folder = make_folder(out if out is not None else notebook_path.parent)
    outcome = Written()
    known: dict[str, dict[str, Any]] = {}
    if execute:
        say(f"executing {notebook_path.name}: this runs its code, in this Python")
        with Ahead(known, fluids=_mentions_propkit(notebook)) as ahead:
            outcome.error = execution.execute(notebook, notebook_path, timeout, say, ahead.finished)
        data = notebook_bytes(notebook)
        suffix = ".partial.ipynb" if outcome.error and folder.resolve() == notebook_path.resolve().parent else ".ipynb"
        outcome.written.append(write_atomically(folder / f"{notebook_path.stem}{suffix}", data))
    else:
        data = notebook_bytes(notebook)
    contents = records_of(".ipynb", data, notebook_path.name)
    bound = _bind(contents, known)
    blocks = list(blocks_of(notebook))
    title = title_of(blocks, notebook_path.stem.replace("_", " "))
    memo = NotebookMemo(title, notebook_path.name, tuple(without_title(blocks)), tuple(bound), outcome.error)
    outcome.written.append(write_atomically(folder / f"{notebook_path.stem}.html", notebook_page(memo).encode()))
    try:
        outcome.written.append(write_atomically(folder / f"{notebook_path.stem}.pdf", notebook_pdf(memo, paper)))
    except MissingExtraError as error:
        say(f"no PDF: {error}")
    taken: set[str] = set()
    for entry in bound:
        name = _file_name(entry.record, taken)
        outcome.written.append(entry.record.save(folder / f"{name}.record.json"))
        if crate:
            extra = {notebook_path.name: ("The executed notebook", data)}
            outcome.written.append(write_atomically(folder / f"{name}.zip", record_crate(entry.record, extra, paper)))
    for entry in bound:
        say(f"{entry.record.title}: {entry.headline} ({entry.verification.status})")
    return outcome


def _mentions_propkit(notebook: Any) -> bool:
    return any("propkit" in cell.source for cell in notebook.cells)


def notebook_bytes(notebook: Any) -> bytes:
    """Return a notebook as the bytes of its file."""
    from nbformat.v4.rwbase import split_lines

    divided = split_lines(copy.deepcopy(notebook))  # type: ignore[no-untyped-call]
    return (json.dumps(divided, indent=1, ensure_ascii=False, sort_keys=True, allow_nan=False) + "\n").encode()


def _bind(contents: Contents, known: dict[str, dict[str, Any]]) -> list[Bound]:
    """Return the records of a notebook, each once, with their verification, in the order of the notebook; `known` as for `Record.verify`."""
    made: dict[str, Bound] = {}
    for entry in contents.found:
        if entry.record.digest not in made:
            made[entry.record.digest] = Bound(entry.record, entry.record.verify(entry.place, known), answers_of(entry.record))
    return list(made.values())


def answers_of(record: Record) -> tuple[tuple[str, str, str], ...]:
    """Return the answer of a record as label, value and unit in display units."""
    return tuple((row.label, f"{value_text(row)}{uncertainty(row)}", cells.unit_text(row.unit)) for row in headline_of(record))


def _file_name(record: Record, taken: set[str]) -> str:
    plain = unicodedata.normalize("NFKD", record.title).encode("ascii", "ignore").decode()
    name = re.sub(r"[^a-z0-9]+", "-", plain.casefold()).strip("-")[:60].strip("-") or "record"
    unique, number = name, 1
    while unique in taken:
        number += 1
        unique = f"{name}-{number}"
    taken.add(unique)
    return unique
