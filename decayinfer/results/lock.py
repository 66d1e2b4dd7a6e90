"""One run at a time in a run folder.

The lock is the operating system's own, so it dies with its process: a killed run never blocks the next.
"""

import errno
import os
import socket
from collections.abc import Iterator
from contextlib import contextmanager, suppress
from pathlib import Path

from decayinfer.errors import RunFolderError
from decayinfer.results.files import explain_os_errors

try:
    import fcntl
except ImportError:  # pragma: no cover - Windows has no flock; there the lock is left out
    fcntl = None  # type: ignore[assignment]

__all__ = ["LOCK_NAME", "run_lock"]

LOCK_NAME = "run.lock"

_HELD = {errno.EAGAIN, errno.EACCES, errno.EWOULDBLOCK}


@contextmanager
def run_lock(folder: Path) -> Iterator[None]:
    """Hold the lock of a run folder.

    Parameters
    ----------
    folder : Path
        The run folder, which must exist.

    Raises
    ------
    RunFolderError
        If a living process holds the lock.
    """
    path = folder / LOCK_NAME
    with explain_os_errors(path):
        handle = _locked_handle(path)
    try:
        with suppress(OSError):  # only a note for whoever finds the lock held
            os.truncate(handle, 0)
            os.write(handle, f"process {os.getpid()} on {socket.gethostname()}\n".encode())
        yield
    finally:
        with suppress(OSError):
            path.unlink()
        os.close(handle)


def _locked_handle(path: Path) -> int:
    """Return a locked file handle whose name is still in the folder."""
    while True:
        handle = os.open(path, os.O_RDWR | os.O_CREAT, 0o666)
        try:
            _lock(handle, path)
            if _still_named(handle, path):
                return handle
        except BaseException:
            os.close(handle)
            raise
        os.close(handle)


def _still_named(handle: int, path: Path) -> bool:
    """Tell whether the file is still there: its last holder may have deleted it before we had the lock."""
    try:
        return os.path.samestat(os.fstat(handle), path.stat())
    except FileNotFoundError:
        return False


def _lock(handle: int, path: Path) -> None:
    if fcntl is None:  # pragma: no cover
        return
    try:
        fcntl.flock(handle, fcntl.LOCK_EX | fcntl.LOCK_NB)
    except OSError as error:
        if error.errno in _HELD:
            raise RunFolderError(
                f"another run is at work in {path.parent} ({_holder(path)}); "
                "wait until it ends, or choose another folder"
            ) from None
        # Some shared file systems know no locks; a run there is still right, only unguarded.


def _holder(path: Path) -> str:
    try:
        return path.read_text().strip() or "unknown process"
    except OSError:
        return "unknown process"
