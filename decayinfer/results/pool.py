"""Objects in parallel processes, one object to a task.

Results come as objects finish. When a process dies, nobody knows whose object killed it: the objects at work
then are run again one at a time, and one that loses its process again is marked failed.
"""

import multiprocessing
import os
import signal
import threading
from collections import deque
from collections.abc import Callable, Generator, Iterator, Sequence
from concurrent.futures import FIRST_COMPLETED, Future, ProcessPoolExecutor, wait
from concurrent.futures.process import BrokenProcessPool
from contextlib import contextmanager
from dataclasses import replace
from itertools import batched
from typing import TYPE_CHECKING

from decayinfer.cooling.registry import load_scenario, register_scenario
from decayinfer.errors import SamplingError
from decayinfer.inference.outcome import ChannelFit, Status
from decayinfer.results.threads import one_thread
from decayinfer.results.work import DIED, Done, Fitter, Task, work_on

if TYPE_CHECKING:
    from multiprocessing.context import SpawnContext
    from multiprocessing.synchronize import Event

    from decayinfer.catalog.pulsar import Pulsar
    from decayinfer.cooling.scenario import Scenario
    from decayinfer.inference.settings import FitSettings

__all__ = ["in_processes"]

_POLL_S = 0.3

#: Processes are renewed after about this many objects, for samplers keep some memory after every run.
_OBJECTS_PER_PROCESS = 100

type Tick = Callable[[Sequence[Task]], None]


def in_processes(tasks: Sequence[Task], *, jobs: int, tick: Tick) -> Iterator[Done]:
    """Work on objects in parallel processes.

    Parameters
    ----------
    tasks : sequence of Task
        The objects.
    jobs : int
        Number of processes.
    tick : callable
        Called a few times per second with the tasks at work.

    Yields
    ------
    Done
        As objects finish.

    Raises
    ------
    SamplingError
        If no process can be started.
    RunFolderError
        If a file cannot be written or read.
    """
    for batch in batched(tasks, _OBJECTS_PER_PROCESS * jobs):
        waiting = deque(batch)
        while waiting:
            suspects = yield from _until_broken(waiting, jobs, tick)
            for task in suspects:
                if (yield from _until_broken(deque([task]), 1, tick)):
                    yield _work_on(task, _mark_failed)


def _until_broken(waiting: deque[Task], jobs: int, tick: Tick) -> Generator[Done, None, list[Task]]:
    """Work through the queue; when a process dies, return the tasks that were at work."""
    context = multiprocessing.get_context("spawn")
    stop = context.Event()
    with one_thread(), _pool(context, jobs, stop, waiting[0].settings) as pool:
        at_work: dict[Future[Done], Task] = {}
        try:
            while waiting or at_work:
                while waiting and len(at_work) < jobs:
                    future = pool.submit(_work, waiting[0])
                    at_work[future] = waiting.popleft()
                finished, _ = wait(at_work, timeout=_POLL_S, return_when=FIRST_COMPLETED)
                tick(tuple(at_work.values()))
                for future in finished:
                    done = future.result()
                    del at_work[future]
                    yield done
        except BrokenProcessPool:
            return list(at_work.values())
        except BaseException:
            stop.set()  # each process ends after the posterior run it is at
            raise
    return []


@contextmanager
def _pool(
    context: "SpawnContext", jobs: int, stop: "Event", settings: "FitSettings"
) -> Iterator[ProcessPoolExecutor]:
    scenarios = tuple(load_scenario(name) for name in settings.cooling)
    start = (stop, scenarios)
    with ProcessPoolExecutor(jobs, mp_context=context, initializer=_start, initargs=start) as pool:
        try:
            pool.submit(_ready).result()
        except BrokenProcessPool as error:
            raise SamplingError(
                "parallel processes could not be started; in a script, put the call below "
                "`if __name__ == '__main__':`, or fit with one job"
            ) from error
        yield pool


_stop: "Event | None" = None


def _start(stop: "Event", scenarios: "tuple[Scenario, ...]") -> None:
    """Prepare a new process: the parent decides when to stop, and the process does not outlive it."""
    global _stop
    _stop = stop
    signal.signal(signal.SIGINT, signal.SIG_IGN)
    threading.Thread(target=_end_with_parent, daemon=True).start()
    for scenario in scenarios:
        register_scenario(scenario)


def _end_with_parent() -> None:
    parent = multiprocessing.parent_process()
    if parent is not None:
        parent.join()
        os._exit(1)


def _ready() -> bool:
    return True


def _work(task: Task) -> Done:
    from decayinfer.inference import fit

    return _work_on(task, fit.fit_channel, stop=lambda: _stop is not None and _stop.is_set())


def _work_on(task: Task, fitter: Fitter, *, stop: Callable[[], bool] = lambda: False) -> Done:
    """Work on an object and send the lines for the log back with the result."""
    lines: list[str] = []
    return replace(work_on(task, fitter, lines.extend, stop=stop), lines=tuple(lines))


def _mark_failed(pulsar: "Pulsar", channel: str, scenario: str, _: "FitSettings") -> ChannelFit:
    return ChannelFit(pulsar.name, scenario, channel, Status.FAILED, reason=DIED)
