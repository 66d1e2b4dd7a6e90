"""Files appear whole or not at all."""

import errno
import os
import subprocess
import sys
from pathlib import Path

import pytest

from decayinfer.errors import RunFolderError
from decayinfer.results.files import clear_leftovers, make_folder, write_whole


def names_in(folder):
    return sorted(path.name for path in folder.iterdir())


def test_content_is_written_and_replaced(tmp_path):
    path = tmp_path / "a.txt"
    write_whole(path, "first")
    write_whole(path, b"second")
    assert path.read_bytes() == b"second"
    assert names_in(tmp_path) == ["a.txt"]


@pytest.mark.parametrize(
    ("code", "said"),
    [
        (errno.ENOSPC, "disk is full"),
        (errno.EDQUOT, "quota"),
        (errno.EACCES, "permission is denied"),
        (errno.EROFS, "read-only"),
    ],
)
def test_os_errors_are_explained_and_leave_the_old_file(tmp_path, monkeypatch, code, said):
    path = tmp_path / "a.txt"
    write_whole(path, "old")

    def fail(_):
        raise OSError(code, os.strerror(code))

    monkeypatch.setattr(os, "fsync", fail)
    with pytest.raises(RunFolderError, match=f"cannot write .*a.txt.*{said}"):
        write_whole(path, "new")
    assert path.read_text() == "old"
    assert names_in(tmp_path) == ["a.txt"]


def test_an_interruption_leaves_the_old_file(tmp_path, monkeypatch):
    path = tmp_path / "a.txt"
    write_whole(path, "old")

    def interrupt(_):
        raise KeyboardInterrupt

    monkeypatch.setattr(os, "fsync", interrupt)
    with pytest.raises(KeyboardInterrupt):
        write_whole(path, "new")
    assert path.read_text() == "old"
    assert names_in(tmp_path) == ["a.txt"]


def test_a_file_too_large_for_the_system_is_an_error(tmp_path):
    """A real refusal by the operating system, half way through the file."""
    code = (
        "import resource, signal, sys, pathlib\n"
        "from decayinfer.errors import RunFolderError\n"
        "from decayinfer.results.files import write_whole\n"
        "signal.signal(signal.SIGXFSZ, signal.SIG_IGN)\n"
        "resource.setrlimit(resource.RLIMIT_FSIZE, (4096, 4096))\n"
        "try:\n"
        "    write_whole(pathlib.Path(sys.argv[1]), b'x' * 100000)\n"
        "except RunFolderError as error:\n"
        "    print(error)\n"
    )
    root = Path(__file__).parents[2]
    done = subprocess.run(
        [sys.executable, "-c", code, str(tmp_path / "a.txt")],
        env={**os.environ, "PYTHONPATH": str(root)},
        capture_output=True,
        text=True,
        check=True,
    )
    assert "would exceed the size limit" in done.stdout
    assert names_in(tmp_path) == []


def test_leftovers_of_a_killed_process_are_cleared(tmp_path):
    folder = tmp_path / "draws" / "A"
    make_folder(folder)
    (folder / ".123-x.nc.partial").write_bytes(b"half")
    write_whole(folder / "x.nc", b"whole")
    assert clear_leftovers(tmp_path) == 1
    assert names_in(folder) == ["x.nc"]


def test_a_folder_that_cannot_be_made_is_an_error(tmp_path):
    (tmp_path / "a").write_text("a file")
    with pytest.raises(RunFolderError, match="cannot make"):
        make_folder(tmp_path / "a" / "b")
