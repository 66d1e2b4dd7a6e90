"""One run at a time in a folder."""

import os
import signal
import subprocess
import sys
from pathlib import Path

import pytest

from decayinfer.errors import RunFolderError
from decayinfer.results.lock import LOCK_NAME, run_lock

HOLD = (
    "import sys, time, pathlib\n"
    "from decayinfer.results.lock import run_lock\n"
    "with run_lock(pathlib.Path(sys.argv[1])):\n"
    "    print('held', flush=True)\n"
    "    time.sleep(60)\n"
)


def names_in(folder):
    return sorted(path.name for path in folder.iterdir())


@pytest.fixture
def holder(tmp_path):
    """Another process that holds the lock of tmp_path."""
    root = Path(__file__).parents[2]
    process = subprocess.Popen(
        [sys.executable, "-c", HOLD, str(tmp_path)],
        env={**os.environ, "PYTHONPATH": str(root)},
        stdout=subprocess.PIPE,
        text=True,
    )
    assert process.stdout.readline() == "held\n"
    yield process
    process.kill()
    process.communicate()


def test_the_lock_leaves_nothing_behind(tmp_path):
    with run_lock(tmp_path):
        assert (tmp_path / LOCK_NAME).read_text().startswith(f"process {os.getpid()} on ")
    assert names_in(tmp_path) == []


def test_a_second_run_is_refused_and_told_who_holds_the_folder(tmp_path, holder):
    with (
        pytest.raises(RunFolderError, match=rf"another run is at work .*process {holder.pid} .*wait"),
        run_lock(tmp_path),
    ):
        pass
    assert (tmp_path / LOCK_NAME).exists()


def test_the_lock_of_a_killed_process_is_taken_over(tmp_path, holder):
    holder.send_signal(signal.SIGKILL)
    holder.wait()
    assert (tmp_path / LOCK_NAME).exists()
    with run_lock(tmp_path):
        assert str(os.getpid()) in (tmp_path / LOCK_NAME).read_text()


def test_an_exception_frees_the_lock(tmp_path):
    with pytest.raises(ZeroDivisionError), run_lock(tmp_path):
        raise ZeroDivisionError
    with run_lock(tmp_path):
        pass
