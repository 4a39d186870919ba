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
class Price:
    """What one alternative to an assumption would change, computed: relative changes of the results, the hardware held.

    None stands for what could not be computed; `note` then says why, or how the alternative was computed.
    """

    alternative: str
    mass_flow: float | None = None
    specific_impulse: float | None = None
    thrust: float | None = None
    note: str = ""

    @property
    def size(self) -> float:
        """Largest of the three changes, without sign; -1 where none could be computed."""
        known = [abs(value) for value in (self.mass_flow, self.specific_impulse, self.thrust) if value is not None]
        return max(known, default=-1.0)


@dataclass(frozen=True, slots=True)
class Assumption:
    """One assumption: what is assumed, where it enters, how it came about, and what its alternatives would change.

    `key` is stable (``flow``, ``contraction``, ``basis``); `origin` is ``given``, ``default`` or ``method``. `taken` is the
    statement in a few words. `prices` are filled in by a performance, the largest first.
    """

    key: str
    statement: str
    origin: str
    about: str = ""
    taken: str = ""
    prices: tuple[Price, ...] = ()

    def __str__(self) -> str:
        return self.statement

    @property
    def alternative(self) -> str:
        """The alternative that changes most, or an empty text."""
        return self.prices[0].alternative if self.prices else ""

    @property
    def size(self) -> float:
        """Largest change that an alternative makes; -1 without one."""
        return max((price.size for price in self.prices), default=-1.0)
