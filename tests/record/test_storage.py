"""A process killed while it writes leaves the old file or the new one."""

import random
import signal
import subprocess
import sys
import time

import pytest

from propkit.errors import StorageError
from propkit.record.storage import write_atomically

OLD, NEW = b"old" * 100_000, b"new!" * 2_000_000

WRITER = """
import sys
from propkit.record.storage import write_atomically
print("ready", flush=True)
while True:
    write_atomically(sys.argv[1], b"new!" * 2_000_000)
    write_atomically(sys.argv[1], b"old" * 100_000)
"""


def kill_often(path, times):
    chance = random.Random(8)
    for _ in range(times):
        process = subprocess.Popen([sys.executable, "-c", WRITER, str(path)], stdout=subprocess.PIPE)
        assert process.stdout.readline() == b"ready\n"
        time.sleep(chance.uniform(0.0, 0.2))
        process.send_signal(signal.SIGKILL)
        process.wait()
        process.stdout.close()
        assert path.read_bytes() in (OLD, NEW)


def test_killed_while_writing(tmp_path):
    path = tmp_path / "x.json"
    path.write_bytes(OLD)
    kill_often(path, 5)


@pytest.mark.full
def test_killed_while_writing_at_length(tmp_path):
    path = tmp_path / "x.json"
    path.write_bytes(OLD)
    kill_often(path, 50)


def test_a_failed_write_leaves_the_old_file(tmp_path, monkeypatch):
    path = tmp_path / "x.json"
    path.write_bytes(OLD)

    def full(handle):
        raise OSError(28, "No space left on device")

    monkeypatch.setattr("propkit.record.storage.os.fsync", full)
    with pytest.raises(StorageError, match="No space"):
        write_atomically(path, NEW)
    assert path.read_bytes() == OLD
    assert [entry.name for entry in tmp_path.iterdir()] == ["x.json"]


def test_permissions_of_the_old_file_stay(tmp_path):
    path = tmp_path / "x.json"
    path.write_bytes(OLD)
    path.chmod(0o640)
    write_atomically(path, NEW)
    assert path.stat().st_mode & 0o777 == 0o640
