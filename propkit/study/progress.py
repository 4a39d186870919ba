"""The progress of a long run: a bar in a terminal or a notebook, with rate and remaining time.

Nothing is shown for a run of less than a second, nothing into a file or a pipe, and nothing stays behind
in a notebook, so that executing it twice gives the same outputs.
"""

from __future__ import annotations

import sys
import time
from collections.abc import Callable
from typing import Any, TextIO

_FIRST = 1.0
"""Seconds before a bar appears."""
_BETWEEN = 0.2
"""Seconds between two drawings of the bar."""
_WIDTH = 24


class Progress:
    """Counts items and shows how far a run is.

    Parameters
    ----------
    total : int
        Number of items.
    noun : str
        What the items are called.
    show : bool or callable
        Whether to show a bar; or a callable of (done, total, seconds), called at every advance.
    stream : text stream, optional
        Where a terminal bar is written; the default is the error stream.
    clock : callable
        Seconds that pass; for tests.
    """

    def __init__(
        self,
        total: int,
        noun: str = "designs",
        show: bool | Callable[[int, int, float], None] = True,
        *,
        stream: TextIO | None = None,
        clock: Callable[[], float] = time.perf_counter,
    ) -> None:
        self.total = total
        self.noun = noun
        self.done = 0
        self._call = show if callable(show) else None
        self._clock = clock
        self._start = clock()
        self._drawn = -_BETWEEN
        self._bar: _TerminalBar | _NotebookBar | None = _bar(stream) if show is True else None

    def advance(self, count: int) -> None:
        """Count `count` more items as done."""
        self.done += count
        if self._call is not None:
            self._call(self.done, self.total, self.seconds)
        self.tick()

    def tick(self) -> None:
        """Redraw the bar when it is time to."""
        seconds = self.seconds
        if self._bar is None or seconds < _FIRST or seconds - self._drawn < _BETWEEN:
            return
        self._drawn = seconds
        self._bar.draw(self.done / self.total if self.total else 1.0, self.text())

    def finish(self) -> None:
        """Take the bar away."""
        if self._bar is not None and self._drawn >= 0.0:
            self._bar.clear()

    @property
    def seconds(self) -> float:
        """Seconds since the start."""
        return self._clock() - self._start

    def text(self) -> str:
        """Return how far it is in words: count, rate and remaining time."""
        seconds = self.seconds
        counted = f"{grouped(self.done)} of {grouped(self.total)} {self.noun}"
        if not self.done or seconds <= 0.0:
            return counted
        rate = self.done / seconds
        left = (self.total - self.done) / rate
        return f"{counted}, {_rate(rate)} per second, {duration(left)} left"


def grouped(number: int) -> str:
    """Return a whole number with thin groups of three digits: ``1 000 000``."""
    return f"{number:,}".replace(",", "\u2009") if number >= 10_000 else str(number)


def duration(seconds: float) -> str:
    """Return a duration in words: ``12 s``, ``3 min 5 s``, ``2 h 4 min``."""
    whole = max(0, round(seconds))
    if whole < 60:
        return f"{whole} s"
    if whole < 3600:
        return f"{whole // 60} min {whole % 60} s"
    return f"{whole // 3600} h {whole % 3600 // 60} min"


def _rate(rate: float) -> str:
    return f"{rate:.2g}" if rate < 10 else grouped(round(rate))


class _TerminalBar:
    def __init__(self, stream: TextIO) -> None:
        self._stream = stream
        self._length = 0

    def draw(self, share: float, text: str) -> None:
        filled = round(_WIDTH * share)
        line = f"{'━' * filled}{'·' * (_WIDTH - filled)} {text}"
        self._write(f"\r{line}{' ' * max(0, self._length - len(line))}")
        self._length = len(line)

    def clear(self) -> None:
        self._write(f"\r{' ' * self._length}\r")

    def _write(self, text: str) -> None:
        try:
            self._stream.write(text)
        except UnicodeEncodeError:
            self._stream.write(text.encode("ascii", "replace").decode("ascii"))
        self._stream.flush()


class _NotebookBar:
    def __init__(self) -> None:
        self._handle: Any = None

    def draw(self, share: float, text: str) -> None:
        from IPython.display import display

        plain = text.replace("\u2009", " ")
        html = f'<progress max="1" value="{share:.3f}" aria-label="progress"></progress> <span>{text}</span>'
        data = {"text/plain": plain, "text/html": html}
        if self._handle is None:
            self._handle = display(data, raw=True, display_id=True)  # type: ignore[no-untyped-call]
        else:
            self._handle.update(data, raw=True)

    def clear(self) -> None:
        if self._handle is not None:
            self._handle.update({"text/plain": "", "text/html": ""}, raw=True)


def _bar(stream: TextIO | None) -> _TerminalBar | _NotebookBar | None:
    if stream is not None:
        return _TerminalBar(stream)
    if _in_notebook():
        return _NotebookBar()
    errors = sys.stderr
    return _TerminalBar(errors) if errors is not None and errors.isatty() else None


def _in_notebook() -> bool:
    """Whether this process serves a notebook; IPython is not imported to find out."""
    shell_module = sys.modules.get("IPython.core.getipython")
    shell = shell_module.get_ipython() if shell_module is not None else None
    return shell is not None and getattr(shell, "kernel", None) is not None
