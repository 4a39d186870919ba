"""Doubts that travel with a number, and the assumptions that carry it."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any


class Doubt(str):
    """A warning in words that knows which result it is about.

    It is a `str`, so a script prints it and a sheet sets it beside the number it concerns.
    """

    __slots__ = ("about", "code")

    code: str
    about: str

    def __new__(cls, text: str, *, code: str = "", about: str = "") -> Doubt:
        """Return the doubt `text` about the result `about`."""
        doubt = super().__new__(cls, text)
        doubt.code = code
        doubt.about = about
        return doubt

    def __reduce__(self) -> tuple[Any, ...]:
        return _doubt, (str(self), self.code, self.about)


def _doubt(text: str, code: str, about: str) -> Doubt:
    return Doubt(text, code=code, about=about)


@dataclass(frozen=True, slots=True)
class Assumption:
    """One assumption: what is assumed, where it enters, and how it came about.

    `key` is stable (``flow``, ``contraction``, ``basis``); `origin` is ``given``, ``default`` or ``method``.
    """

    key: str
    statement: str
    origin: str
    about: str = ""

    def __str__(self) -> str:
        return self.statement
