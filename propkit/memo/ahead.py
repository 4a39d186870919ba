"""Recomputation of records while the notebook that makes them still runs: the kernel has one core, this process another.

What is recomputed is only kept; the comparison is made, and anything wrong is said, when the executed notebook is bound.
"""

from __future__ import annotations

import contextlib
import queue
import threading
from collections.abc import Mapping
from types import TracebackType
from typing import Any

from propkit.bridge.stored_state import load_fluids
from propkit.record.containers import documents_of
from propkit.record.record import Record


class Ahead:
    """A thread that recomputes the records of each finished cell into `known`, by digest of their recipes.

    Parameters
    ----------
    known : dict
        Filled as `propkit.record.verify` fills it.
    fluids : bool
        Whether to read the library of fluids first: it takes seconds and lets no other thread run, which is best while the kernel starts.
    """

    def __init__(self, known: dict[str, dict[str, Any]], fluids: bool) -> None:
        self._known, self._fluids = known, fluids
        self._cells: queue.SimpleQueue[Mapping[str, Any] | None] = queue.SimpleQueue()
        self._thread = threading.Thread(target=self._run, name="propkit-ahead", daemon=True)

    def __enter__(self) -> Ahead:
        self._thread.start()
        return self

    def __exit__(self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None) -> None:
        self._cells.put(None)
        if error is None:
            self._thread.join()

    def finished(self, cell: Mapping[str, Any]) -> None:
        """Take a cell that was executed."""
        self._cells.put(cell)

    def _run(self) -> None:
        if self._fluids:
            load_fluids()
        while (cell := self._cells.get()) is not None:
            for document in documents_of(cell):
                with contextlib.suppress(Exception):  # what is wrong with it is said when it is bound
                    Record(document).verify(known=self._known)
