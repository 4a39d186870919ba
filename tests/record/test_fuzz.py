"""The loaders under a coverage-guided fuzzer, where it is installed."""

import subprocess
import sys
from pathlib import Path

import pytest

RUNS = 5_000


@pytest.mark.full
def test_only_our_errors_come_out(tmp_path):
    pytest.importorskip("atheris", reason="needs atheris")
    command = [sys.executable, str(Path(__file__).with_name("fuzz_loaders.py")), f"-runs={RUNS}", "-seed=8", "-print_final_stats=1"]
    run = subprocess.run(command, cwd=tmp_path, capture_output=True, text=True, timeout=3000, check=False)
    assert run.returncode == 0, run.stderr[-4000:]
    assert f"Done {RUNS} runs" in run.stderr
