"""Blocks give the same results bit for bit wherever they run, and a run that breaks or is stopped says so."""

import importlib.util
import io
import multiprocessing
import os
import sys
import threading
from concurrent.futures import ProcessPoolExecutor, ThreadPoolExecutor
from pathlib import Path

import numpy as np
import pytest

from propkit.errors import InputError
from propkit.study import executors
from propkit.study.executors import Failed, run_blocks
from propkit.study.progress import Progress, duration, grouped


def load_blocks():
    """Import the module of block functions under a name that another process can import too."""
    folder = str(Path(__file__).parent)
    if folder not in sys.path:
        sys.path.insert(0, folder)
    spec = importlib.util.find_spec("blocks")
    assert spec is not None
    return importlib.import_module("blocks")


blocks = load_blocks()
BLOCKS = [(number, 1000 + number) for number in range(12)]


def gather(function, items=BLOCKS, **options):
    kept = {}
    run = run_blocks(function, items, kept.__setitem__, **{"progress": False, **options})
    assert list(kept) == list(range(len(kept)))
    return kept, run


def same(kept):
    return all(np.array_equal(kept[number], blocks.heavy(BLOCKS[number])) for number in range(len(BLOCKS)))


def processes(count=2):
    return ProcessPoolExecutor(count, mp_context=multiprocessing.get_context("spawn"))


def test_default_threads_and_one_core(monkeypatch):
    kept, run = gather(blocks.heavy)
    assert same(kept)
    assert run.complete
    assert run.notes == ()
    monkeypatch.setattr(executors, "available_cores", lambda: 1)
    assert same(gather(blocks.heavy)[0])


def test_threads_and_processes_agree_bit_for_bit():
    with ThreadPoolExecutor(3) as pool:
        assert same(gather(blocks.heavy, executor=pool)[0])
        assert pool.submit(int, "3").result() == 3  # the caller's executor is left open
    with processes() as pool:
        kept, run = gather(blocks.heavy, executor=pool)
        assert same(kept)
        assert run.notes == ()


def test_a_real_local_cluster_agrees_bit_for_bit():
    distributed = pytest.importorskip("distributed")
    with (
        distributed.LocalCluster(n_workers=1, threads_per_worker=2, processes=False, dashboard_address=None) as cluster,
        distributed.Client(cluster) as client,
    ):
        kept, run = gather(blocks.heavy, executor=client)
        assert same(kept)
        assert run.notes == ()
        kept, run = gather(blocks.fails_at_three, executor=client, keep_failures=True)
        assert isinstance(kept[3], Failed)
        assert isinstance(kept[3].error, ArithmeticError)
        assert run.complete
        assert run.notes == ()


def test_a_cluster_that_goes_away_leaves_the_rest_to_this_process():
    distributed = pytest.importorskip("distributed")
    cluster = distributed.LocalCluster(n_workers=1, threads_per_worker=1, processes=False, dashboard_address=None)
    client = distributed.Client(cluster)
    client.close()
    cluster.close()
    kept, run = gather(blocks.heavy, executor=client)
    assert same(kept)
    assert run.complete
    assert "executor broke at block 1" in run.notes[0]


def test_a_broken_pool_leaves_the_rest_to_this_process():
    items = [(*item, os.getpid()) for item in BLOCKS]
    with processes(1) as pool:
        kept, run = gather(blocks.dies_elsewhere, items, executor=pool)
    assert same(kept)
    assert run.complete
    assert len(run.notes) == 1
    assert "BrokenProcessPool" in run.notes[0]


def test_a_pool_that_is_shut_or_cannot_take_the_function_leaves_it_to_this_process():
    pool = ThreadPoolExecutor(1)
    pool.shutdown()
    kept, run = gather(blocks.heavy, executor=pool)
    assert same(kept)
    assert "executor broke at block 1" in run.notes[0]
    with processes(1) as other:
        kept, run = gather(lambda block: blocks.heavy(block), executor=other)
    assert same(kept)
    assert len(run.notes) == 1


@pytest.mark.parametrize("make", [lambda: None, lambda: ThreadPoolExecutor(2), processes])
def test_an_error_of_the_calculation_itself_comes_back(make):
    pool = make()
    with pytest.raises(ArithmeticError, match="block three"):
        gather(blocks.fails_at_three, executor=pool)
    kept, run = gather(blocks.fails_at_three, executor=pool, keep_failures=True)
    assert list(run.failures) == [3]
    assert run.complete
    assert isinstance(kept[3], Failed)
    assert np.array_equal(kept[4], blocks.heavy(BLOCKS[4]))
    if pool is not None:
        pool.shutdown()


def test_interruption_keeps_the_first_blocks_and_says_so():
    kept = {}

    def consume(index, value):
        if index == 5:
            raise KeyboardInterrupt
        kept[index] = value

    run = run_blocks(blocks.heavy, BLOCKS, consume, progress=False, sizes=[size for _, size in BLOCKS], noun="designs")
    assert run.interrupted
    assert not run.complete
    assert run.done == 5
    assert len(kept) == 5
    handed, whole = sum(size for _, size in BLOCKS[:5]), sum(size for _, size in BLOCKS)
    assert run.notes == (f"interrupted after {handed} of {whole} designs: what is shown is a partial result",)
    assert not [thread for thread in threading.enumerate() if thread.name.startswith("propkit")]


def test_only_a_few_blocks_are_under_way_at_once():
    class Lazy:
        def __init__(self):
            self.made = 0

        def __len__(self):
            return 500

        def __getitem__(self, index):
            self.made = max(self.made, index)
            return (index, 10)

    items, ahead = Lazy(), []
    with ThreadPoolExecutor(2) as pool:
        run_blocks(blocks.heavy, items, lambda index, value: ahead.append(items.made - index), executor=pool, progress=False)
    assert len(ahead) == 500
    assert max(ahead) <= 6


def test_what_is_no_executor_is_refused():
    with pytest.raises(InputError, match=r"concurrent\.futures"):
        gather(blocks.heavy, executor="threads")


def clock_of(times):
    moments = iter(times)
    return lambda: next(moments)


def test_bar_appears_after_a_second_with_rate_and_remaining_time():
    stream, now = io.StringIO(), [0.0]
    meter = Progress(200_000, "designs", stream=stream, clock=lambda: now[0])
    now[0] = 0.9
    meter.advance(10_000)
    assert stream.getvalue() == ""
    now[0] = 2.0
    meter.advance(40_000)
    assert "50\u2009000 of 200\u2009000 designs, 25\u2009000 per second, 6 s left" in stream.getvalue()
    now[0] = 8.0
    meter.advance(150_000)
    meter.finish()
    assert stream.getvalue().endswith(" \r")


def test_bar_in_a_notebook_is_updated_and_taken_away(monkeypatch):
    import IPython
    import IPython.display

    shown = []

    class Handle:
        def update(self, data, raw):
            shown.append(data)

    def display(data, raw, display_id):
        shown.append(data)
        return Handle()

    monkeypatch.setattr(IPython.display, "display", display)
    monkeypatch.setattr(IPython.core.getipython, "get_ipython", lambda: type("Shell", (), {"kernel": object()})())
    now = [0.0]
    meter = Progress(100, "trials", clock=lambda: now[0])
    for now[0] in (1.5, 3.0):
        meter.advance(50)
    meter.finish()
    assert "<progress" in shown[0]["text/html"]
    assert "50 of 100 trials" in shown[0]["text/plain"]
    assert shown[-1] == {"text/plain": "", "text/html": ""}


def test_progress_can_be_a_callable_or_off():
    seen = []
    kept, _ = gather(blocks.slow, progress=lambda done, total, seconds: seen.append((done, total)))
    assert seen == [(place + 1, len(BLOCKS)) for place in range(len(BLOCKS))]
    assert same(kept)


def test_words_of_the_progress():
    assert grouped(9999) == "9999"
    assert grouped(1_000_000) == "1\u2009000\u2009000"
    assert [duration(value) for value in (0.2, 59.7, 185, 7440)] == ["0 s", "1 min 0 s", "3 min 5 s", "2 h 4 min"]
