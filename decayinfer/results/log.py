"""log.txt: what happened in a run, and when (UTC)."""

import logging
import time
from collections.abc import Callable, Iterator, Sequence
from contextlib import contextmanager
from pathlib import Path

from decayinfer.results.files import explain_os_errors

__all__ = ["LOG", "Log", "log_file", "logged_to", "stamp"]

#: Parent of every logger of the package.
LOG = logging.getLogger("decayinfer")

#: Appends lines to log.txt.
type Log = Callable[[Sequence[str]], None]

_FORMAT = logging.Formatter("%(asctime)s %(levelname)s %(message)s", "%Y-%m-%d %H:%M:%S")
_FORMAT.converter = time.gmtime


class _Handler(logging.Handler):
    """Pass formatted records on."""

    def __init__(self, log: Log) -> None:
        super().__init__(logging.INFO)
        self.log = log
        self.setFormatter(_FORMAT)

    def emit(self, record: logging.LogRecord) -> None:
        self.log([self.format(record)])


@contextmanager
def logged_to(log: Log) -> Iterator[None]:
    """Pass on what this package logs in the block, and the warnings of the libraries below it."""
    handler = _Handler(log)
    loggers = (LOG, logging.getLogger("py.warnings"))
    level = LOG.level
    LOG.setLevel(logging.INFO)
    logging.captureWarnings(True)
    for logger in loggers:
        logger.addHandler(handler)
    try:
        yield
    finally:
        logging.captureWarnings(False)
        for logger in loggers:
            logger.removeHandler(handler)
        LOG.setLevel(level)


@contextmanager
def log_file(folder: Path) -> Iterator[Log]:
    """Open a run's log.txt and give the function that appends lines to it.

    Raises
    ------
    RunFolderError
        If it cannot be written.
    """
    path = folder / "log.txt"
    with explain_os_errors(path):
        file = path.open("a", encoding="utf-8", errors="replace")
    with file:

        def append(lines: Sequence[str]) -> None:
            with explain_os_errors(path):
                file.writelines(f"{line}\n" for line in lines)
                file.flush()

        yield append


def stamp(sentence: str, level: int = logging.INFO) -> str:
    """Return a line of the log."""
    return _FORMAT.format(logging.LogRecord(LOG.name, level, "", 0, sentence, None, None))
