"""One thread per process for numerical libraries: the objects are the one level of parallelism."""

import os
from collections.abc import Iterator
from contextlib import contextmanager

__all__ = ["one_thread"]

_VARIABLES = ("OMP_NUM_THREADS", "OPENBLAS_NUM_THREADS", "MKL_NUM_THREADS", "NUMBA_NUM_THREADS")


@contextmanager
def one_thread() -> Iterator[None]:
    """Set the environment so that libraries and processes that start in the block use one thread each."""
    before = {name: os.environ.get(name) for name in _VARIABLES}
    os.environ.update(dict.fromkeys(_VARIABLES, "1"))
    try:
        yield
    finally:
        for name, value in before.items():
            if value is None:
                os.environ.pop(name, None)
            else:
                os.environ[name] = value
