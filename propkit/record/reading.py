"""Reading JSON from strangers: data only, with limits, and every refusal a `RecordError`."""

from __future__ import annotations

import json
import math
import re
from pathlib import Path
from typing import Any

from propkit.errors import RecordError, StorageError

DEEPEST = 64
LARGEST_BYTES = 50_000_000
_MARK = re.compile(r'"(?:[^"\\]+|\\.)*+"?|[\[\]{}]', re.DOTALL)
_ESCAPED_HALF = re.compile(r"\\u[dD][89a-fA-F]")
_LONGEST_INTEGER = 400


def read_file(path: str | Path, largest: int = LARGEST_BYTES) -> bytes:
    """Return the bytes of a regular file.

    Parameters
    ----------
    path : str or Path
        The file.
    largest : int
        Most bytes that are read.

    Returns
    -------
    bytes
        The whole file.

    Raises
    ------
    StorageError
        When it cannot be read.
    RecordError
        When it is larger.
    """
    file = Path(path)
    try:
        if not file.is_file():
            raise StorageError(f"{file} is not a file." if file.exists() else f"{file} does not exist.", path=str(file))
        with file.open("rb") as stream:
            data = stream.read(largest + 1)
    except (OSError, ValueError) as error:
        if isinstance(error, StorageError):
            raise
        reason = getattr(error, "strerror", None) or str(error)
        raise StorageError(f"{file} cannot be read: {reason}.", path=str(file)) from None
    if len(data) > largest:
        raise RecordError(f"{file.name} has more than {largest // 1_000_000} MB; a record is far smaller.")
    return data


def parse_json(data: bytes | str) -> Any:
    """Return the value of a JSON text.

    Parameters
    ----------
    data : bytes or str
        UTF-8 without a byte order mark, at most 50 MB, nested at most 64 deep.

    Returns
    -------
    object
        Plain value.

    Raises
    ------
    RecordError
        For NaN or an infinity, a number out of range, a key given twice, too deep a nesting, too many bytes, a lone surrogate, or no JSON.
    """
    if len(data) > LARGEST_BYTES:
        raise RecordError(f"the text has more than {LARGEST_BYTES // 1_000_000} MB; a record is far smaller")
    text = _text(data)
    _check_depth(text)
    try:
        value = json.loads(text, object_pairs_hook=_object, parse_constant=_refuse_constant, parse_float=_float, parse_int=_integer)
    except RecordError as error:
        raise RecordError(error.message) from None
    except json.JSONDecodeError as error:
        raise RecordError(f"this is not JSON: {error.msg} in line {error.lineno}, column {error.colno}") from None
    except (ValueError, RecursionError) as error:
        raise RecordError(f"this is not JSON that can be read: {error}") from None
    if _ESCAPED_HALF.search(text):  # the text itself is UTF-8, so that half a character comes from an escape only
        _no_surrogates(value)
    return value


def _text(data: bytes | str) -> str:
    try:
        text = data.decode("utf-8") if isinstance(data, bytes) else data
        text.encode("utf-8")
    except UnicodeError:
        raise RecordError("this is not text in UTF-8") from None
    return text


def _check_depth(text: str) -> None:
    depth = 0
    for match in _MARK.finditer(text):
        mark = match.group()
        if mark in "[{":
            depth += 1
            if depth > DEEPEST:
                raise RecordError(f"the text is nested more than {DEEPEST} deep")
        elif mark in "]}":
            depth -= 1


def _object(pairs: list[tuple[str, Any]]) -> dict[str, Any]:
    made: dict[str, Any] = {}
    for key, value in pairs:
        if key in made:
            raise RecordError(f"the key {_short(key)} is given twice")
        made[key] = value
    return made


def _no_surrogates(value: Any) -> None:
    if isinstance(value, str) and any("\ud800" <= character <= "\udfff" for character in value):
        raise RecordError("a text holds half a character (a lone surrogate)")
    for entry in [*value, *value.values()] if isinstance(value, dict) else value if isinstance(value, list) else ():
        _no_surrogates(entry)


def _refuse_constant(text: str) -> Any:
    raise RecordError(f"{text} is not a number that a record can hold")


def _float(text: str) -> float:
    value = float(text)
    if not math.isfinite(value):
        raise RecordError(f"the number {_short(text)} is out of range")
    return value


def _integer(text: str) -> int | float:
    if len(text) > _LONGEST_INTEGER:
        raise RecordError(f"the number {_short(text)} is out of range")
    return int(text)


def _short(text: str) -> str:
    shown = ascii(text)
    return shown if len(shown) <= 40 else f"{shown[:37]}..."
