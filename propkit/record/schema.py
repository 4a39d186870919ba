"""The published form of a record, its version, and the migrations that keep old records readable."""

from __future__ import annotations

import json
import sys
from collections.abc import Callable, Iterator, Mapping
from contextlib import contextmanager
from functools import lru_cache
from importlib import resources
from typing import Any

from propkit.errors import RecordError

NAME = "propkit-record"
VERSION = 1
SCHEMA = f"{NAME}/{VERSION}"

Migration = Callable[[dict[str, Any]], dict[str, Any]]

MIGRATIONS: dict[int, Migration] = {}
"""Version -> function that turns a document of that version into one of the next. Digests are checked before it runs."""


@lru_cache(maxsize=1)
def schema() -> dict[str, Any]:
    """Return the JSON Schema (draft 2020-12) of the present version; do not change what is returned."""
    text = resources.files("propkit.data").joinpath("record.schema.json").read_text(encoding="utf-8")
    loaded: dict[str, Any] = json.loads(text)
    return loaded


@lru_cache(maxsize=1)
def _validator() -> Any:
    with without_grammars():
        from jsonschema import Draft202012Validator

    return Draft202012Validator(_inlined(schema(), schema()["$defs"]))


@contextmanager
def without_grammars() -> Iterator[None]:
    """Keep the first import of jsonschema from building its grammars of internationalized addresses, which takes seconds.

    They serve a format check that no propkit schema asks for. What another library imports itself is left as it is.
    """
    name = "rfc3987_syntax"
    hidden = name not in sys.modules
    if hidden:
        sys.modules[name] = None  # type: ignore[assignment]
    try:
        yield
    finally:
        if hidden:
            del sys.modules[name]


def _inlined(part: Any, definitions: Mapping[str, Any]) -> Any:
    """Return a schema with its references replaced by what they name, which validates several times faster."""
    if isinstance(part, list):
        return [_inlined(entry, definitions) for entry in part]
    if not isinstance(part, Mapping):
        return part
    made = {key: _inlined(value, definitions) for key, value in part.items() if key not in ("$ref", "$defs")}
    target = part.get("$ref")
    return made if target is None else {**_inlined(definitions[target.removeprefix("#/$defs/")], definitions), **made}


def version_of(document: Any) -> int:
    """Return the schema version of a document.

    Raises
    ------
    RecordError
        When it is no record, or of a version that this propkit does not know.
    """
    text = document.get("schema") if isinstance(document, Mapping) else None
    if not isinstance(text, str) or not text.startswith(f"{NAME}/"):
        raise RecordError(f"this is not a calculation record: it has no entry schema with {NAME}/ and a version")
    number = text.removeprefix(f"{NAME}/")
    if not (number.isascii() and number.isdigit() and len(number) < 6):
        raise RecordError(f"the schema version of the record, {text[:40]!r}, cannot be read")
    version = int(number)
    if version > VERSION:
        raise RecordError(f"the record has schema version {version}; this propkit reads up to {VERSION}. A newer propkit reads it.")
    if version != VERSION and version not in MIGRATIONS:
        raise RecordError(f"the record has schema version {version}, which no propkit ever wrote")
    return version


def migrated(document: dict[str, Any]) -> dict[str, Any]:
    """Return a document of an older schema version in the form of the present one; its seals are no longer its own."""
    for version in range(version_of(document), VERSION):
        document = {**MIGRATIONS[version](document), "schema": f"{NAME}/{version + 1}"}
    return document


def check_form(document: Any) -> None:
    """Raise when a document of the present version has not the form of the schema.

    Raises
    ------
    RecordError
        Naming the place and what is wrong there.
    """
    found = min(_validator().iter_errors(document), key=lambda error: (len(error.absolute_path), error.json_path), default=None)
    if found is not None:
        place = found.json_path.removeprefix("$").lstrip(".") or "the document"
        message = found.message if len(found.message) <= 160 else f"{found.message[:157]}..."
        raise RecordError(f"the form of the record is wrong at {place[:120]}: {message}")
