"""Interruptions that are not lost."""

import signal
import threading
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from types import FrameType

__all__ = ["kept_interrupts"]


@contextmanager
def kept_interrupts() -> Iterator[Callable[[], None]]:
    """Give a function that raises KeyboardInterrupt if one came in the block and was swallowed.

    An interruption raises KeyboardInterrupt at once, as ever; but a library may be in the middle of an import
    or a compilation that catches everything. Outside the main thread nothing is kept: no signals come there.
    """
    came = threading.Event()

    def keep(number: int, frame: FrameType | None) -> None:
        came.set()
        signal.default_int_handler(number, frame)

    def check() -> None:
        if came.is_set():
            raise KeyboardInterrupt

    ours = threading.current_thread() is threading.main_thread()
    ours = ours and signal.getsignal(signal.SIGINT) is signal.default_int_handler
    if ours:
        signal.signal(signal.SIGINT, keep)
    try:
        yield check
    finally:
        if ours:
            signal.signal(signal.SIGINT, signal.default_int_handler)
