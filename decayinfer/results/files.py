"""Files that appear whole or not at all: temporary name, fsync, rename, fsync of the folder."""

import errno
import os
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

from decayinfer.errors import RunFolderError

__all__ = ["clear_leftovers", "explain_os_errors", "make_folder", "write_whole"]

#: Ending of a file that is still being written.
PARTIAL = ".partial"

_REASONS = {
    errno.ENOSPC: "the disk is full; free some space, then run the same command again",
    errno.EDQUOT: "the disk quota is used up; free some space, then run the same command again",
    errno.EFBIG: "the file would exceed the size limit; raise the limit, then run the same command again",
    errno.EACCES: "permission is denied; choose a folder you may write to",
    errno.EPERM: "permission is denied; choose a folder you may write to",
    errno.EROFS: "the file system is read-only; choose a folder you may write to",
}


@contextmanager
def explain_os_errors(path: Path, doing: str = "write") -> Iterator[None]:
    """Turn an OSError raised in the block into a RunFolderError that names the path and the remedy."""
    try:
        yield
    except RunFolderError:
        raise
    except OSError as error:
        reason = _REASONS.get(error.errno or 0, str(error))
        raise RunFolderError(f"cannot {doing} {path}: {reason}") from error


def make_folder(path: Path) -> None:
    """Make a folder and its parents, if they are not there.

    Raises
    ------
    RunFolderError
        If it cannot be made.
    """
    with explain_os_errors(path, "make"):
        path.mkdir(parents=True, exist_ok=True)


def write_whole(path: Path, content: bytes | str) -> None:
    """Write a file so that its name never stands for less than the whole content.

    Parameters
    ----------
    path : Path
        Final name; an older file of that name is replaced at once.
    content : bytes or str
        What to write; text is written as UTF-8.

    Raises
    ------
    RunFolderError
        If the disk is full, permission is missing, or writing fails otherwise. The final name then
        stands for what it stood for before.
    """
    data = content.encode() if isinstance(content, str) else content
    partial = path.with_name(f".{os.getpid()}-{path.name}"[:200] + PARTIAL)
    with explain_os_errors(path):
        try:
            with partial.open("wb") as file:
                file.write(data)
                file.flush()
                os.fsync(file.fileno())
            partial.replace(path)
        except BaseException:
            partial.unlink(missing_ok=True)
            raise
        _sync_folder(path.parent)


def clear_leftovers(folder: Path) -> int:
    """Delete what a killed process left half written below a folder; return how many files went."""
    leftovers = [path for path in folder.rglob(f".*{PARTIAL}") if path.is_file()]
    for path in leftovers:
        path.unlink(missing_ok=True)
    return len(leftovers)


def _sync_folder(folder: Path) -> None:
    if os.name == "nt":  # a folder cannot be opened there, and the rename is journaled
        return
    handle = os.open(folder, os.O_RDONLY)
    try:
        os.fsync(handle)
    finally:
        os.close(handle)
