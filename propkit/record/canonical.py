"""The canonical form of a record (RFC 8785) and the seals over it.

Editors rewrite numbers (``3500.0`` becomes ``3500``) and the order of keys, so a digest is taken over the canonical
form and never over the bytes of a file.
"""

from __future__ import annotations

import dataclasses
import hashlib
import math
from collections.abc import Mapping
from typing import Any

from propkit.errors import RecordError

LARGEST_INTEGER = 2**53
"""Largest integer that every JSON reader keeps exactly; larger ones are stored as text."""


def canonical_bytes(value: Any) -> bytes:
    """Return the canonical form of a plain value.

    Parameters
    ----------
    value : object
        Mappings, lists, texts, finite numbers, booleans and None.

    Returns
    -------
    bytes
        The form of RFC 8785 (JSON Canonicalization Scheme) in UTF-8.

    Raises
    ------
    RecordError
        For anything that has no such form: NaN, an infinity, an integer above 2^53, a lone surrogate, another type.
    """
    import rfc8785

    try:
        return rfc8785.dumps(value)
    except (ValueError, TypeError, RecursionError) as error:
        raise RecordError(f"the value has no canonical form: {error}") from None


def digest_of(value: Any) -> str:
    """Return ``sha256:`` and the hexadecimal SHA-256 of the canonical form of a plain value."""
    return f"sha256:{hashlib.sha256(canonical_bytes(value)).hexdigest()}"


def text_digest(text: str) -> str:
    """Return ``sha256:`` and the digest of a text, line ends and trailing blank lines apart (the source of a cell)."""
    lines = text.replace("\r\n", "\n").replace("\r", "\n").rstrip("\n")
    return f"sha256:{hashlib.sha256(lines.encode('utf-8', 'surrogatepass')).hexdigest()}"


def sealed(schema: str, content: Mapping[str, Any], provenance: Mapping[str, Any]) -> dict[str, Any]:
    """Return the whole document with both digests.

    Parameters
    ----------
    schema : str
        Name of the schema version.
    content, provenance : mapping
        Plain values. `content_digest` is added to the provenance.

    Returns
    -------
    dict
        schema, content, provenance, digest.
    """
    document: dict[str, Any] = {
        "schema": schema,
        "content": dict(content),
        "provenance": {**provenance, "content_digest": digest_of(content)},
    }
    document["digest"] = whole_digest(document)
    return document


def whole_digest(document: Mapping[str, Any]) -> str:
    """Return the digest of a document without its entry ``digest``."""
    return digest_of({key: value for key, value in document.items() if key != "digest"})


def plain(value: Any) -> Any:
    """Return a value as mappings, lists, texts and finite numbers.

    Parameters
    ----------
    value : object
        Dataclasses, mappings, sequences, numpy scalars and arrays, numbers and texts.

    Returns
    -------
    object
        The same in plain types: an infinity is the text ``infinite``, NaN is None, an integer above 2^53 a text.

    Raises
    ------
    RecordError
        For an object of another kind.
    """
    if value is None or isinstance(value, bool):
        return value
    if isinstance(value, str):
        return str(value)
    if isinstance(value, int):
        return int(value) if abs(value) < LARGEST_INTEGER else str(int(value))
    if isinstance(value, float):
        if math.isinf(value):
            return "infinite" if value > 0 else "-infinite"
        return None if math.isnan(value) else float(value)
    if dataclasses.is_dataclass(value) and not isinstance(value, type):
        return {entry.name: plain(getattr(value, entry.name)) for entry in dataclasses.fields(value)}
    if isinstance(value, Mapping):
        return {str(key): plain(entry) for key, entry in value.items()}
    if isinstance(value, list | tuple):
        return [plain(entry) for entry in value]
    for method in ("tolist", "to_dict"):
        maker = getattr(value, method, None)
        if callable(maker):
            return plain(maker())
    raise RecordError(f"a record cannot hold a {type(value).__name__}")
