"""The files that carry records: .json, .ipynb, .html and .zip; each read as data, with limits."""

from __future__ import annotations

import base64
import binascii
import io
import re
import stat
import zipfile
import zlib
from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from propkit.errors import RecordError
from propkit.model.base import RECORD_MIME
from propkit.record.canonical import text_digest
from propkit.record.outcome import Check
from propkit.record.reading import LARGEST_BYTES, parse_json, read_file
from propkit.record.record import Record

TEMPLATE = re.compile(rb"<template\s+data-propkit-record(?:=\"\")?\s*>([A-Za-z0-9+/=\s]*)</template>", re.IGNORECASE)
_MARKER = re.compile(rb"<template\s[^>]{0,200}data-propkit-record", re.IGNORECASE)
MOST_RECORDS = 500
_MOST_MEMBERS = 2000
_LARGEST_UNPACKED = 200_000_000
_LARGEST_RATIO = 200


@dataclass(frozen=True, slots=True)
class Found:
    """One record in a file: where it is, the record, and what is to be said about the place."""

    place: str
    record: Record
    checks: tuple[Check, ...] = ()


@dataclass(frozen=True, slots=True)
class Contents:
    """What a file holds: its records, and checks that concern the file as a whole."""

    found: tuple[Found, ...]
    checks: tuple[Check, ...] = ()


def records_in(path: str | Path) -> Contents:
    """Return the records of a file.

    Parameters
    ----------
    path : str or Path
        A .json, .ipynb, .html or .zip file.

    Returns
    -------
    Contents
        The records with their places.

    Raises
    ------
    StorageError
        When the file cannot be read.
    RecordError
        When it is of another kind, breaks a limit, or a record in it has a wrong form.
    """
    file = Path(path)
    suffix = file.suffix.lower()
    if suffix not in _READERS:
        raise RecordError(f"{file.name} is not a file that carries records; those end in {', '.join(_READERS)}")
    return records_of(suffix, read_file(file), file.name)


def records_of(suffix: str, data: bytes, name: str) -> Contents:
    """Return the records in the bytes of a file with that suffix; arguments and errors as for `records_in`."""
    try:
        contents: Contents = _READERS[suffix](data, name)
    except RecordError as error:
        raise RecordError(f"{name}: {error.message}" if not error.message.startswith(name) else error.message) from None
    if len(contents.found) > MOST_RECORDS:
        raise RecordError(f"{name} holds more than {MOST_RECORDS} records")
    return contents


def _from_json(data: bytes, name: str) -> Contents:
    return Contents((Found(name, Record(parse_json(data))),))


# -- notebooks ------------------------------------------------------------------------------------


def _from_notebook(data: bytes, name: str) -> Contents:
    notebook = parse_json(data)
    cells = notebook.get("cells") if isinstance(notebook, Mapping) else None
    if not isinstance(cells, list) or not all(isinstance(cell, Mapping) for cell in cells):
        raise RecordError("this is not a notebook of format 4: it has no list of cells")
    sources = {text_digest(_source(cell)): place for place, cell in enumerate(cells, 1) if cell.get("cell_type") == "code"}
    carried = [(place, cell, list(documents_of(cell))) for place, cell in enumerate(cells, 1) if cell.get("cell_type") == "code"]
    if sum(len(documents) for _, _, documents in carried) > MOST_RECORDS:
        raise RecordError(f"the notebook holds more than {MOST_RECORDS} records")
    found = []
    for place, cell, documents in carried:
        for number, document in enumerate(documents, 1):
            record = _record_at(document, f"cell {place}")
            label = f"{name}, cell {place}" + (f", record {number}" if number > 1 else "")
            found.append(Found(label, record, (_cell_check(record, sources, place, cell),)))
    return Contents(tuple(found), (_order_check(cells),))


def _record_at(document: Any, place: str) -> Record:
    try:
        return Record(document)
    except RecordError as error:
        raise RecordError(f"the record in {place}: {error.message}") from None


def _source(cell: Mapping[str, Any]) -> str:
    source = cell.get("source", "")
    if isinstance(source, list):
        source = "".join(str(line) for line in source)
    return source if isinstance(source, str) else ""


def documents_of(cell: Mapping[str, Any]) -> Iterator[Any]:
    """Yield what the outputs of a notebook cell carry as records, whatever it is."""
    outputs = cell.get("outputs", [])
    for output in outputs if isinstance(outputs, list) else []:
        data = output.get("data") if isinstance(output, Mapping) else None
        if isinstance(data, Mapping) and RECORD_MIME in data:
            yield data[RECORD_MIME]


def _cell_check(record: Record, sources: Mapping[str, int], place: int, cell: Mapping[str, Any]) -> Check:
    stored = record.provenance.get("cell")
    if stored is None:
        return Check("cell", "noted", "the record does not say which cell showed it")
    if stored == text_digest(_source(cell)):
        return Check("cell", "same", f"shown by cell {place} as it stands")
    if stored in sources:
        return Check("cell", "noted", f"found in cell {place}, but shown by cell {sources[stored]}")
    return Check("cell", "noted", f"found in cell {place}; the cell that showed it was changed or removed since")


def _order_check(cells: list[Any]) -> Check:
    counts = [cell.get("execution_count") for cell in cells if cell.get("cell_type") == "code" and _source(cell).strip()]
    if counts == list(range(1, len(counts) + 1)):
        return Check("execution order", "same", f"the {len(counts)} cells ran once each, from top to bottom")
    if all(count is None for count in counts):
        return Check("execution order", "noted", "no cell was executed")
    return Check(
        "execution order", "noted", "the cells did not run once each from top to bottom: outputs may not follow from the cells above them"
    )


# -- pages ----------------------------------------------------------------------------------------


def record_template(record: Record) -> str:
    """Return the element that carries a record in a page: its canonical JSON in base64."""
    return f"<template data-propkit-record>{base64.b64encode(record.to_bytes().strip()).decode('ascii')}</template>"


def _from_html(data: bytes, name: str) -> Contents:
    found = []
    texts = TEMPLATE.findall(data)
    if len(texts) != len(_MARKER.findall(data)):
        raise RecordError("the page has an element for a record that does not hold one")
    for number, text in enumerate(texts, 1):
        if number > MOST_RECORDS:
            raise RecordError(f"the page holds more than {MOST_RECORDS} records")
        try:
            document = base64.b64decode(b"".join(text.split()), validate=True)
        except (binascii.Error, ValueError):
            raise RecordError(f"record {number} of the page is not in base64") from None
        found.append(Found(f"{name}, record {number}", Record(parse_json(document))))
    return Contents(tuple(found))


# -- archives -------------------------------------------------------------------------------------


def _from_zip(data: bytes, name: str) -> Contents:
    found: list[Found] = []
    checks: list[Check] = []
    for member, text in _members(data):
        suffix = Path(member).suffix.lower()
        if member.endswith(".record.json") or suffix in (".ipynb", ".html"):
            inside = records_of(
                ".json" if suffix == ".json" else suffix, text, f"{name}, {member if member.isprintable() else _shown(member)}"
            )
            found += inside.found
            checks += inside.checks
    return Contents(tuple(found), tuple(checks))


def _members(data: bytes) -> Iterator[tuple[str, bytes]]:
    try:
        with zipfile.ZipFile(io.BytesIO(data)) as archive:
            entries = archive.infolist()
            _check_members(entries)
            for entry in entries:
                if not entry.is_dir() and entry.filename.lower().endswith((".json", ".ipynb", ".html")):
                    with archive.open(entry) as stream:
                        text = stream.read(LARGEST_BYTES + 1)
                    if len(text) > LARGEST_BYTES:
                        raise RecordError(f"{_shown(entry.filename)} in the archive has more than {LARGEST_BYTES // 1_000_000} MB")
                    yield entry.filename, text
    except (zipfile.BadZipFile, zlib.error, NotImplementedError, EOFError, OSError, ValueError, RuntimeError, OverflowError) as error:
        if isinstance(error, RecordError):
            raise
        raise RecordError(f"this is not an archive that can be read: {error}") from None


def _check_members(entries: list[zipfile.ZipInfo]) -> None:
    if len(entries) > _MOST_MEMBERS:
        raise RecordError(f"the archive has more than {_MOST_MEMBERS} members")
    seen: set[str] = set()
    for entry in entries:
        shown, raw = _shown(entry.filename), entry.orig_filename
        parts = raw.replace("\\", "/").split("/")
        if raw.startswith(("/", "\\")) or ".." in parts or ":" in parts[0] or "\\" in raw or "\0" in raw:
            raise RecordError(f"the archive has a path that leads outside it: {shown}")
        if stat.S_ISLNK(entry.external_attr >> 16):
            raise RecordError(f"the archive has a link: {shown}")
        if entry.filename.casefold() in seen:
            raise RecordError(f"the archive has the name {shown} twice")
        seen.add(entry.filename.casefold())
        if entry.flag_bits & 1:
            raise RecordError(f"the archive has an encrypted member: {shown}")
        if entry.file_size > 1_000_000 and entry.file_size > _LARGEST_RATIO * max(entry.compress_size, 1):
            raise RecordError(f"{shown} in the archive unpacks to more than {_LARGEST_RATIO} times its size")
    if sum(entry.file_size for entry in entries) > _LARGEST_UNPACKED:
        raise RecordError(f"the archive unpacks to more than {_LARGEST_UNPACKED // 1_000_000} MB")


def _shown(name: str) -> str:
    shown = ascii(name)
    return shown if len(shown) <= 80 else f"{shown[:77]}..."


_READERS = {".json": _from_json, ".ipynb": _from_notebook, ".html": _from_html, ".zip": _from_zip}
