"""The state behind one or more panels of a chain: the current object, its history, the pins and what was refused.

Objects are immutable, so that a state is one reference: undo, redo and pins keep objects, not copies of numbers.
Every change goes through `apply`, under one lock: callbacks may come from several threads.
"""

from __future__ import annotations

import logging
import threading
from collections.abc import Callable, Iterator, Mapping
from dataclasses import dataclass
from typing import Any

from propkit.errors import InputError, PropkitError
from propkit.panels.case import CaseFace
from propkit.panels.chamber import ChamberFace
from propkit.panels.faces import Face
from propkit.panels.nozzle import NozzleFace
from propkit.panels.performance import PerformanceFace

MOST_STEPS = 100
MOST_PINS = 1000
FACES: dict[str, type[Face]] = {"case": CaseFace, "chamber": ChamberFace, "nozzle": NozzleFace, "performance": PerformanceFace}
log = logging.getLogger("propkit.panels")


@dataclass(frozen=True, slots=True)
class Refusal:
    """A change that was refused: the control, what it shows, the changes, and the reason in words."""

    path: str
    text: str
    changes: Mapping[str, Any]
    words: str


def words_of(error: Exception, name: str = "", label: str = "") -> str:
    """Return an error in words for a person, the input `name` called by its label; one not foreseen says so."""
    if isinstance(error, PropkitError):
        return error.message.replace(f"`{name}`", label) if name else error.message
    return f"The calculation failed in a way that was not foreseen ({type(error).__name__}: {error})."


def face_of(link: Any) -> Face:
    """Return the face of an object."""
    return FACES.get(link.kind, Face)(link)


class Session:
    """One chain under change; panels are its views."""

    def __init__(self, value: Any) -> None:
        self.opened = value
        self.value = value
        self.past: list[Any] = []
        self.future: list[Any] = []
        self.pins: dict[str, Any] = {}
        self.baseline = ""
        self.refusals: dict[str, Refusal] = {}
        self.ranges: dict[tuple[str, str], Any] = {}
        self.lock = threading.RLock()
        self._views: list[Callable[[], None]] = []
        self._run = ""

    # -- views -------------------------------------------------------------------------------------

    def attach(self, refresh: Callable[[], None]) -> None:
        """Call `refresh` after every change."""
        self._views.append(refresh)

    def detach(self, refresh: Callable[[], None]) -> bool:
        """Stop calling `refresh`; return whether that was the last view."""
        self._views = [view for view in self._views if view != refresh]
        return not self._views

    def changed(self) -> None:
        """Bring every view up to date; an observer that fails does not keep the others from it."""
        failed: list[Exception] = []
        for view in list(self._views):
            try:
                view()
            except Exception as error:
                failed.append(error)
        if failed:
            raise failed[0]

    def forget(self) -> None:
        """Let go of every object."""
        self.opened = self.value = None
        self.past, self.future = [], []
        self.pins, self.refusals, self.ranges = {}, {}, {}

    # -- the chain ---------------------------------------------------------------------------------

    def link(self, kind: str) -> Any:
        """Return the object of a kind in the chain."""
        return next(link for link in self.value.chain() if link.kind == kind)

    def faces(self, down_to: str) -> Iterator[Face]:
        """Yield the faces of the chain from the first object to that of kind `down_to`."""
        for link in self.value.chain():
            yield face_of(link)
            if link.kind == down_to:
                return

    # -- changes -----------------------------------------------------------------------------------

    def apply(self, path: str, text: str, changes: Mapping[str, Any], run: str = "") -> Exception | None:
        """Rebuild the chain with `changes` and bring the views up to date; return the error where it was refused.

        Parameters
        ----------
        path : str
            Control that asks for the change.
        text : str
            What it shows; kept beside the error when the change is refused.
        changes : mapping of path to input
            As `replace` takes them. What was refused before is tried along first, then the change alone.
        run : str
            Changes with the same name (one drag of a slider) are one step of undo.
        """
        with self.lock:
            waiting = {p: v for other in self.refusals.values() if other.path != path for p, v in other.changes.items() if p not in changes}
            error: Exception | None = None
            for attempt in [{**waiting, **changes}, dict(changes)] if waiting else [dict(changes)]:
                try:
                    value = self.value.replace(attempt)
                except Exception as refused:
                    error = refused
                    continue
                self._accept(value, path, attempt, run)
                self.changed()
                return None
            assert error is not None
            self.refuse(path, text, changes, error)
            self.changed()
            return error

    def refuse(self, path: str, text: str, changes: Mapping[str, Any], error: Exception) -> None:
        """Keep a refused change beside its control; the last good object stays."""
        if not isinstance(error, PropkitError):
            log.error("a change of %s failed", path, exc_info=error)
        self.refusals[path] = Refusal(path, text, dict(changes), words_of(error, *self._called(path)))

    def _called(self, path: str) -> tuple[str, str]:
        """Return name and label of the input of a path; empty texts for a group."""
        kind, point, name = path.partition(".")
        if not point:
            return "", ""
        label = face_of(self.link(kind)).label(name)
        return name, label[:1].upper() + label[1:]

    def _accept(self, value: Any, path: str, applied: Mapping[str, Any], run: str) -> None:
        self.refusals = {p: r for p, r in self.refusals.items() if p != path and not all(key in applied for key in r.changes)}
        self._put(value, run)

    def _put(self, value: Any, run: str = "") -> None:
        if value == self.value and value.given_name() == self.value.given_name():
            return
        if not run or run != self._run:
            self.past.append(self.value)
            del self.past[:-MOST_STEPS]
        self._run = run
        self.future.clear()
        self.value = value

    def set_value(self, value: Any) -> None:
        """Make an object of the same class the current one."""
        if type(value) is not type(self.value):
            raise InputError(f"this panel shows a {type(self.value).__name__}, not a {type(value).__name__}")
        with self.lock:
            self.refusals.clear()
            self._put(value)
            self.changed()

    def withdraw(self, path: str) -> None:
        """Forget what was refused at a control."""
        with self.lock:
            self.refusals.pop(path, None)
            self.changed()

    def undo(self) -> None:
        """Go back one step: first what was refused is dropped, then the object before is taken."""
        self._step(self.past, self.future)

    def redo(self) -> None:
        """Go forward one step."""
        self._step(self.future, self.past)

    def _step(self, here: list[Any], there: list[Any]) -> None:
        with self.lock:
            refused, self._run = bool(self.refusals), ""
            self.refusals.clear()
            if not (refused and here is self.past) and here:
                there.append(self.value)
                self.value = here.pop()
            self.changed()

    # -- pins --------------------------------------------------------------------------------------

    def pin(self, name: str = "") -> str:
        """Keep the current object as a baseline; return its name."""
        with self.lock:
            given = name or self._free_name(self.value.given_name())
            self.pins[given] = self.value
            self.baseline = given
            self.changed()
            return given

    def _free_name(self, title: str) -> str:
        """Return a name for a pin that no pin has: the title of the object, with a letter behind it where it has to be."""
        letters = "ABCDEFGHIJKLMNOPQRSTUVWXYZ"
        if title and title not in self.pins:
            return title
        first = 1 if title else 0
        named = (f"{title} {letters[count % 26]}{count // 26 or ''}".strip() for count in range(first, first + MOST_PINS))
        return next(name for name in named if name not in self.pins)

    def unpin(self, name: str = "") -> None:
        """Let go of a pin, or of all."""
        with self.lock:
            if name:
                self.pins.pop(name, None)
            else:
                self.pins.clear()
            if self.baseline not in self.pins:
                self.baseline = next(reversed(self.pins), "")
            self.changed()
