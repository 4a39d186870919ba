"""Where blocks run: threads of this machine, any concurrent.futures executor, or a dask client.

The blocks, their size and their order are fixed by the caller, and each block is computed by one pure function,
so that the results are the same bit for bit wherever they run. Results are handed over in order and only
a few blocks are under way at once: memory stays bounded however many there are.
"""

from __future__ import annotations

import os
import time
from collections import deque
from collections.abc import Callable, Sequence
from concurrent.futures import BrokenExecutor, CancelledError, Executor, ThreadPoolExecutor
from dataclasses import dataclass, field
from typing import Any, Protocol, TypeVar

from propkit.errors import InputError, Problem
from propkit.study.progress import Progress

Block = TypeVar("Block")
Value = TypeVar("Value")

_POLL = 0.2
"""Seconds between two looks at the clock while a block is awaited."""
_PATIENCE = 10.0
"""Seconds that a cluster may be without any worker before it counts as broken."""


class Future(Protocol):
    """What is needed of a future: both concurrent.futures and dask have it."""

    def result(self, timeout: float | None = None) -> Any:
        """Return the result, waiting at most `timeout` seconds."""

    def done(self) -> bool:
        """Whether it has ended."""

    def cancel(self) -> Any:
        """Try to prevent it from running."""


@dataclass(frozen=True, slots=True)
class Failed:
    """Stands in for the result of a block whose calculation raised an error."""

    error: Exception


@dataclass(slots=True)
class BlockRun:
    """How a run of blocks went.

    Parameters
    ----------
    blocks : int
        Number of blocks asked for.
    done : int
        Number of blocks whose results were handed over, the first ones in order.
    interrupted : bool
        Whether the run was stopped before its end.
    notes : tuple of str
        What a reader of the results should know about the run.
    seconds : float
        Time taken [s].
    failures : dict of int to Exception
        Blocks whose calculation raised, with their errors.
    """

    blocks: int
    done: int = 0
    interrupted: bool = False
    notes: tuple[str, ...] = ()
    seconds: float = 0.0
    failures: dict[int, Exception] = field(default_factory=dict)

    @property
    def complete(self) -> bool:
        """Whether every block was run."""
        return self.done == self.blocks


def run_blocks(
    function: Callable[[Block], Value],
    blocks: Sequence[Block],
    consume: Callable[[int, Value | Failed], None],
    *,
    executor: Any = None,
    progress: bool | Callable[[int, int, float], None] = True,
    sizes: Sequence[int] | None = None,
    noun: str = "designs",
    keep_failures: bool = False,
    should_stop: Callable[[], bool] | None = None,
) -> BlockRun:
    """Run `function` on every block and hand the results over in order.

    Parameters
    ----------
    function : callable
        Pure function of one block; it must be picklable for processes and clusters.
    blocks : sequence
        The blocks, indexed lazily: a sequence that makes them on demand keeps memory small.
    consume : callable
        Called in this thread with the number of a block and its result, in order.
    executor : executor, dask client or None
        Where to run; None: threads on the cores of this machine.
    progress : bool or callable
        Whether to show a bar for a run of more than a second; or a callable of (done, total, seconds).
    sizes : sequence of int, optional
        Number of items in each block, for the progress.
    noun : str
        What the items are called in the progress.
    keep_failures : bool
        Whether a block whose calculation raises is handed over as `Failed`; else the error is raised.
    should_stop : callable, optional
        Asked between blocks; a true answer stops the run as an interruption does.

    Returns
    -------
    BlockRun
        How it went: an interruption (Ctrl-C, the stop button of a notebook) leaves the first `done` blocks.

    Raises
    ------
    InputError
        For an executor that is none.
    Exception
        The error of a block, unless `keep_failures`.
    """
    run = BlockRun(len(blocks))
    counts = list(sizes) if sizes is not None else [1] * len(blocks)
    meter = Progress(sum(counts), noun, progress)
    start = time.perf_counter()
    own = _own_threads(len(blocks)) if executor is None else None
    pool = _Pool(own if executor is None else _checked(executor))

    def hand_over(index: int, value: Value | Failed) -> None:
        if isinstance(value, Failed):
            if not keep_failures:
                raise value.error
            run.failures[index] = value.error
        consume(index, value)
        run.done = index + 1
        meter.advance(counts[index])

    try:
        for index in range(len(blocks)):
            if should_stop is not None and should_stop():
                run.interrupted = True
                break
            pool.fill(function, blocks, index)
            hand_over(index, pool.take(function, blocks, index, meter))
    except KeyboardInterrupt:
        run.interrupted = True
    finally:
        pool.abandon()
        if own is not None:
            own.shutdown(wait=True, cancel_futures=True)
        meter.finish()
    run.seconds = time.perf_counter() - start
    run.notes = tuple(pool.notes)
    if run.interrupted:
        handed = sum(counts[: run.done])
        run.notes += (f"interrupted after {handed} of {sum(counts)} {noun}: what is shown is a partial result",)
    return run


class _Pool:
    """The executor with the futures under way; once it breaks, everything runs in this process."""

    def __init__(self, executor: Any) -> None:
        self.executor = executor
        self.notes: list[str] = []
        self.under_way: deque[Future] = deque()
        self.next = 0
        self.window = 2 * _workers(executor) + 2 if executor is not None else 0
        self.is_dask = executor is not None and not isinstance(executor, Executor)

    def fill(self, function: Callable[[Block], Value], blocks: Sequence[Block], index: int) -> None:
        """Submit blocks until the window is full."""
        while self.executor is not None and self.next < min(len(blocks), index + self.window):
            try:
                options = {"pure": False} if self.is_dask else {}
                self.under_way.append(self.executor.submit(function, blocks[self.next], **options))
            except Exception as error:
                if not self.under_way:
                    self.broken(error, index)
                return
            self.next += 1

    def take(self, function: Callable[[Block], Value], blocks: Sequence[Block], index: int, meter: Progress) -> Value | Failed:
        """Return the result of block `index`."""
        if self.executor is None or not self.under_way:
            return _here(function, blocks[index])
        try:
            value: Value = self._await(self.under_way[0], meter)
        except (KeyboardInterrupt, SystemExit):
            raise
        except BaseException as error:  # dask raises asyncio's CancelledError, which is no Exception
            return self._again(function, blocks, index, error)
        self.under_way.popleft()
        return value

    def _await(self, future: Future, meter: Progress) -> Any:
        without_workers = 0.0
        while not future.done():
            meter.tick()
            try:
                return future.result(timeout=_POLL)
            except TimeoutError:
                without_workers = 0.0 if not self.is_dask or _has_workers(self.executor) else without_workers + _POLL
                if without_workers > _PATIENCE:
                    raise ConnectionError(f"the cluster has had no worker for {_PATIENCE:g} s") from None
        return future.result()

    def _again(self, function: Callable[[Block], Value], blocks: Sequence[Block], index: int, error: BaseException) -> Value | Failed:
        """Run a block whose future failed in this process: only an error of the calculation itself comes back."""
        same_process = isinstance(self.executor, ThreadPoolExecutor) and not isinstance(error, BrokenExecutor | CancelledError)
        value = Failed(error) if same_process and isinstance(error, Exception) else _here(function, blocks[index])
        if isinstance(value, Failed):
            self.under_way.popleft()
            return value
        self.broken(error, index)
        return value

    def broken(self, error: BaseException, index: int) -> None:
        """Give the executor up; from here on blocks run in this process."""
        if self.executor is None:
            return
        kind = type(error).__name__
        self.notes.append(
            f"the executor broke at block {index + 1} ({kind}); that block and the rest ran in this process, with the same results"
        )
        self.abandon()
        self.executor = None

    def abandon(self) -> None:
        """Cancel what has not started."""
        while self.under_way:
            future = self.under_way.pop()
            try:
                future.cancel()
            except Exception:  # a lost cluster cannot be told any more
                continue


def _here(function: Callable[[Block], Value], block: Block) -> Value | Failed:
    try:
        return function(block)
    except Exception as error:
        return Failed(error)


def _has_workers(client: Any) -> bool:
    try:
        return client.status == "running" and bool(client.scheduler_info()["workers"])
    except Exception:  # a client that cannot answer has no workers for us
        return False


def _own_threads(blocks: int) -> ThreadPoolExecutor | None:
    """Return threads for the cores of this machine; None where one core or one block gains nothing from them."""
    workers = min(available_cores(), blocks)
    return ThreadPoolExecutor(workers, thread_name_prefix="propkit") if workers > 1 else None


def available_cores() -> int:
    """Return the number of cores that this process may use."""
    try:
        return len(os.sched_getaffinity(0))
    except AttributeError:  # not on every system
        return os.cpu_count() or 1


def _workers(executor: Any) -> int:
    known = getattr(executor, "_max_workers", None)
    if isinstance(known, int):
        return known
    threads = getattr(executor, "nthreads", None)
    if callable(threads):
        try:
            return max(1, int(sum(threads().values())))
        except Exception:  # a cluster that is gone; submitting will say so
            return 1
    return available_cores()


def _checked(executor: Any) -> Any:
    if isinstance(executor, Executor) or (callable(getattr(executor, "submit", None)) and hasattr(executor, "scheduler_info")):
        return executor
    raise InputError(
        Problem(
            "executor",
            repr(executor),
            "a concurrent.futures executor, a dask.distributed client or None",
            "None uses threads on the cores of this machine.",
        )
    )
