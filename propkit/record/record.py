"""The record of a calculation: what a reviewer holds, reads and recomputes."""

from __future__ import annotations

import copy
import importlib
import math
from collections.abc import Callable, Mapping
from pathlib import Path
from typing import Any

from propkit.errors import InputError, Problem, RecordError
from propkit.model.base import RECORD_MIME, Calculation, from_recipe
from propkit.record import build, schema
from propkit.record.canonical import LARGEST_INTEGER, canonical_bytes, digest_of, sealed, whole_digest
from propkit.record.outcome import Verification, visible
from propkit.record.storage import write_atomically
from propkit.record.verify import seal_checks, verify_document

WRITERS = {
    ".html": "propkit.memo.record_page:record_page",
    ".pdf": "propkit.memo.record_pdf:record_pdf",
    ".zip": "propkit.memo.crate:record_crate",
}
"""Suffix -> "module:function" that turns a record into the bytes of a file; resolved when such a file is asked for."""

PAPERS = ("a4", "letter")
_WITH_PAPER = (".pdf", ".zip")


class Record:
    """A calculation record: an immutable document with its seals.

    Made by ``obj.record(title=...)`` or `Record.load`.
    """

    __slots__ = ("_calculation", "_document", "_migrated_from", "_sealed_as")

    def __init__(self, document: Mapping[str, Any]) -> None:
        plain_document = _ordered(document)
        version = schema.version_of(plain_document)
        self._sealed_as: dict[str, Any] = plain_document
        self._migrated_from = None if version == schema.VERSION else version
        self._document: dict[str, Any] = schema.migrated(plain_document)
        schema.check_form(self._document)
        self._calculation: Calculation | None = None

    # -- reading --------------------------------------------------------------------------------

    @property
    def document(self) -> dict[str, Any]:
        """The whole document as plain values: a copy."""
        return copy.deepcopy(self._document)

    @property
    def content(self) -> dict[str, Any]:
        """What is recomputed, as plain values: a copy."""
        return copy.deepcopy(self._document["content"])

    @property
    def provenance(self) -> dict[str, Any]:
        """Versions, time, digest of the notebook cell: a copy."""
        return copy.deepcopy(self._document["provenance"])

    @property
    def title(self) -> str:
        """Title as given, or what the calculation is about."""
        content = self._document["content"]
        return str(content["title"] or content["description"])

    @property
    def digest(self) -> str:
        """Digest over the whole document."""
        return str(self._document["digest"])

    @property
    def content_digest(self) -> str:
        """Digest over the content alone: the same calculation gives the same one at any time."""
        return str(self._document["provenance"]["content_digest"])

    @property
    def calculation(self) -> Calculation:
        """The object of the record, rebuilt from its recipe.

        Raises
        ------
        PropkitError
            When the recipe is refused or has no solution.
        """
        if self._calculation is None:
            made = from_recipe(self._document["content"]["recipe"])
            if not isinstance(made, Calculation) or made.kind not in self._document["content"]["objects"]:
                raise RecordError("the recipe of the record makes an object that the record does not hold")
            self._calculation = made
        return self._calculation

    @property
    def sealed(self) -> bool:
        """Whether both digests are those of the document: it was not changed since it was sealed."""
        return all(check.status == "same" for check in seal_checks(self._document, self._seals()))

    def _seals(self) -> tuple[str, str]:
        """Return both digests as computed over the document in the form that it was sealed in."""
        return digest_of(self._sealed_as.get("content")), whole_digest(self._sealed_as)

    def verify(self, name: str = "record", known: dict[str, dict[str, Any]] | None = None) -> Verification:
        """Return what comes out when everything is recomputed from the inputs and compared.

        Parameters
        ----------
        name : str
            What to call the record in the table.
        known : dict, optional
            What was recomputed already in this run, by digest of the recipe; filled, so that records of one calculation share it.
        """
        return verify_document(self._document, name, self._seals(), self._migrated_from, known)

    def compare(self, other: Record) -> Any:
        """Return what differs between this record and another: inputs, assumptions, versions, results.

        Parameters
        ----------
        other : Record
            The one to compare with.

        Returns
        -------
        Comparison
            Displays itself as text and HTML.
        """
        from propkit.record.compare import compare

        return compare(self, other)

    def trace(self, name: str) -> Any:
        """Return where a number comes from: relation, inputs, sources, back to the data rows, as a tree.

        Parameters
        ----------
        name : str
            A result such as ``specific_impulse``.

        Raises
        ------
        InputError
            For a name that the chain does not have.
        """
        from propkit.record.trace import trace

        return trace(self.calculation, name)

    # -- files ----------------------------------------------------------------------------------

    def to_bytes(self) -> bytes:
        """Return the document as a JSON file: its canonical form and a line end."""
        return canonical_bytes(self._document) + b"\n"

    def save(self, path: str | Path, paper: str | None = None) -> Path:
        """Write the record; the old file stays whole until the new one is complete.

        Parameters
        ----------
        path : str or Path
            A name that ends in .json, .html (memo page), .pdf (memo) or .zip (RO-Crate with all of them).
        paper : {"a4", "letter"}, optional
            Size of the sheets of the PDF memo, A4 unless given; a page of HTML takes the paper of the printer.

        Returns
        -------
        Path
            The file written.

        Raises
        ------
        InputError
            For another suffix, another paper, or a paper for a file without sheets.
        StorageError
            When it cannot be written.
        MissingExtraError
            When the memo extra is needed and absent.
        """
        if not isinstance(path, str | Path) or not str(path).strip():
            raise InputError(Problem("path", repr(path), "the name of a file", 'For example "engine.record.json".'))
        suffix = Path(path).suffix.lower()
        check_paper(paper, suffix)
        if suffix == ".json":
            return write_atomically(path, self.to_bytes())
        if suffix not in WRITERS:
            raise InputError(Problem("path", repr(str(path)), "a name that ends in .json, " + ", ".join(WRITERS)))
        module, _, function = WRITERS[suffix].partition(":")
        write: Callable[..., bytes] = getattr(importlib.import_module(module), function)
        return write_atomically(path, write(self, paper=paper) if paper else write(self))

    @classmethod
    def load(cls, path: str | Path) -> Record:
        """Return the one record in a file.

        Parameters
        ----------
        path : str or Path
            A .json, .html, .zip or .ipynb file.

        Raises
        ------
        StorageError
            When the file cannot be read.
        RecordError
            When it holds no record, several, or one whose form is wrong.
        """
        from propkit.record.containers import records_in

        found = records_in(path).found
        digests = {entry.record.digest for entry in found}
        if len(digests) != 1:
            raise RecordError(
                f"{Path(path).name} holds {len(digests) or 'no'} records; Record.load reads a file with one"
                + (" (propkit verify reads them all)" if digests else "")
            )
        return found[0].record

    @classmethod
    def from_bytes(cls, data: bytes | str) -> Record:
        """Return the record of a JSON text.

        Raises
        ------
        RecordError
            When it is no record.
        """
        from propkit.record.reading import parse_json

        return cls(parse_json(data))

    # -- display --------------------------------------------------------------------------------

    def report(self) -> Any:
        """Return what the record says, as neutral data that displays itself; the numbers are the recorded ones."""
        from propkit.record.sheet import report_of

        return report_of(self)

    def __str__(self) -> str:
        return "\n".join(visible(line) for line in str(self.report()).split("\n"))

    def __repr__(self) -> str:
        return f"<Record {self.title!r}, {self.digest[:19]}…>"

    def _repr_mimebundle_(self, include: Any = None, exclude: Any = None) -> dict[str, Any]:
        bundle: dict[str, Any] = dict(self.report()._repr_mimebundle_(include, exclude))
        bundle[RECORD_MIME] = self.document
        return bundle

    def __eq__(self, other: object) -> bool:
        return self._document == other._document if isinstance(other, Record) else NotImplemented

    def __hash__(self) -> int:
        return hash(self.digest)

    def __reduce__(self) -> tuple[Any, ...]:
        return Record, (self.document,)

    def __copy__(self) -> Record:
        return self

    def __deepcopy__(self, memo: Any) -> Record:
        return self


def check_paper(paper: str | None, suffix: str) -> None:
    """Raise for a paper that is none, or that a file of this suffix has no use for.

    Raises
    ------
    InputError
        Naming what is legal.
    """
    if paper is not None and paper not in PAPERS:
        raise InputError(Problem("paper", repr(paper)[:60], " or ".join(f'"{name}"' for name in PAPERS)))
    if paper is not None and suffix not in _WITH_PAPER:
        raise InputError(
            Problem("paper", repr(paper), f"a file with sheets: {' or '.join(_WITH_PAPER)}", f"A {suffix} file has none; leave paper out.")
        )


def _ordered(value: Any) -> Any:
    """Return a copy with the keys of every mapping in order, so that a record made and a record read show the same."""
    if isinstance(value, Mapping):
        if not all(isinstance(key, str) for key in value):
            raise RecordError("the keys of a record are texts")
        return {key: _ordered(value[key]) for key in sorted(value)}
    if isinstance(value, list | tuple):
        return [_ordered(entry) for entry in value]
    if value is None or isinstance(value, str | bool):
        return value
    if isinstance(value, int) and abs(value) >= LARGEST_INTEGER:
        raise RecordError("a record holds integers of 2^53 and above as texts")
    if not isinstance(value, int | float) or not math.isfinite(value):
        raise RecordError(f"a record cannot hold {str(value)[:40]!r}")
    return value


def record_of(calculation: Calculation, *, title: str = "", author: str = "", purpose: str = "", notes: str = "") -> Record:
    """Return the record of the chain that ends in an object.

    Parameters
    ----------
    calculation : Calculation
        The object.
    title, author, purpose, notes : str
        Free text for the title block.

    Raises
    ------
    InputError
        For a text that is too long or holds control characters.
    """
    texts = build.read_texts({"title": title, "author": author, "purpose": purpose, "notes": notes})
    record = Record(sealed(schema.SCHEMA, build.content_of(calculation, texts), build.provenance_now(show_cell=True)))
    record._calculation = calculation
    return record


def bundle_of(calculation: Calculation) -> dict[str, Any]:
    """Return the record of an object as it goes into the output of a notebook cell: media type -> document."""
    texts = {"title": calculation.given_name()}
    document = sealed(schema.SCHEMA, build.content_of(calculation, texts), build.provenance_now(show_cell=True))
    return {RECORD_MIME: document}
