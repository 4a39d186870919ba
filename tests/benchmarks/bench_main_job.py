"""Benchmark report: the README's main job after installation, from the first notebook to a verified memo.

Run it with ``python tests/benchmarks/bench_main_job.py [PYTHON]``; it prints elapsed and processor seconds of both steps and their sum,
three repeats, and never fails. The aim is 30 s on two cores with nothing else running. PYTHON is the interpreter of another environment:
the README installs ``.[memo]`` alone into a fresh one; the extra ``fluids`` adds the seconds that CoolProp takes to read its fluids, once
in each of the three processes.
"""

from __future__ import annotations

import resource
import statistics
import subprocess
import sys
import tempfile
import time
from pathlib import Path

PYTHON = sys.argv[1] if len(sys.argv) > 1 else sys.executable
NOTEBOOK = Path(__file__).parents[2] / "notebooks" / "01_first_engine.ipynb"


def timed(*arguments: str) -> tuple[float, float]:
    before = resource.getrusage(resource.RUSAGE_CHILDREN)
    start = time.perf_counter()
    subprocess.run([PYTHON, "-m", "propkit", *arguments], check=True, stdout=subprocess.DEVNULL)
    elapsed = time.perf_counter() - start
    after = resource.getrusage(resource.RUSAGE_CHILDREN)
    return elapsed, after.ru_utime + after.ru_stime - before.ru_utime - before.ru_stime


def main() -> None:
    totals = []
    for repeat in range(3):
        with tempfile.TemporaryDirectory() as folder:
            memo = timed("memo", str(NOTEBOOK), "--out", folder)
            files = [str(path) for path in sorted(Path(folder).glob("*.record.json"))]
            verify = timed("verify", *files, str(Path(folder) / NOTEBOOK.name))
        totals.append(memo[0] + verify[0])
        print(f"run {repeat + 1}: memo {memo[0]:.1f} s ({memo[1]:.1f} s processor), verify {verify[0]:.1f} s ({verify[1]:.1f} s processor)")
    print(f"main job: median {statistics.median(totals):.1f} s elapsed, best {min(totals):.1f} s")


if __name__ == "__main__":
    main()
