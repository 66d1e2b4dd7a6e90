"""Fit a catalogue into a run folder, and go on where an earlier run stopped."""

import logging
import time
from collections.abc import Callable, Iterator, Mapping, Sequence
from dataclasses import dataclass, replace
from os import PathLike
from pathlib import Path
from typing import TYPE_CHECKING

from decayinfer.channels.registry import channel_names, load_channel
from decayinfer.cooling.registry import choose_scenarios
from decayinfer.errors import InputError
from decayinfer.inference.outcome import Status
from decayinfer.inference.settings import FitSettings
from decayinfer.results.files import clear_leftovers, make_folder, write_whole
from decayinfer.results.interrupt import kept_interrupts
from decayinfer.results.lock import run_lock
from decayinfer.results.log import Log, log_file, stamp
from decayinfer.results.pool import in_processes
from decayinfer.results.record import INPUT_NAME, claim_folder, make_record
from decayinfer.results.tables import any_to_ecsv, write_tables
from decayinfer.results.work import Done, Task, drop_unusable, work_on

if TYPE_CHECKING:
    from astropy.table import Table
    from pandas import DataFrame

    from decayinfer.catalog import Catalog, Problem
    from decayinfer.results.read import Run

__all__ = ["Progress", "RunSummary", "fit_sample", "resolve_settings", "run_fit"]


@dataclass(frozen=True)
class Progress:
    """How far a run is.

    Attributes
    ----------
    done, total : int
        Posterior runs that have their file, and all of them.
    running : tuple of str
        Object, scenario and channel of the posterior runs at work.
    """

    done: int
    total: int
    running: tuple[str, ...] = ()


@dataclass(frozen=True)
class RunSummary:
    """What a run came to.

    Attributes
    ----------
    path : Path
        The run folder.
    objects : int
        Objects in the tables.
    fitted, reused : int
        Posterior runs made now, and those found from before.
    unreachable, failed : int
        Posterior runs of that status.
    problems : tuple of Problem
        What the reader found wrong with the input table.
    remarks : tuple of str
        Sentences on the resumption, such as a library of another version.
    seconds : float
        Wall time.
    """

    path: Path
    objects: int
    fitted: int
    reused: int
    unreachable: int
    failed: int
    problems: "tuple[Problem, ...]"
    remarks: tuple[str, ...]
    seconds: float


def resolve_settings(settings: FitSettings) -> FitSettings:
    """Return the settings with channels and cooling scenarios named, each once.

    Raises
    ------
    UnknownNameError
        If a channel or scenario does not exist.
    """
    channels = tuple(dict.fromkeys(settings.channels or channel_names()))
    for name in channels:
        load_channel(name)
    return replace(settings, channels=channels, cooling=choose_scenarios(settings.cooling))


def run_fit(
    catalog: "Catalog",
    out: str | PathLike[str],
    settings: FitSettings | None = None,
    *,
    jobs: int = 1,
    progress: Callable[[Progress], None] | None = None,
) -> RunSummary:
    """Fit every object of a catalogue into a run folder.

    Posterior runs whose file is there are not made again, so the same call goes on after an interruption;
    those that ended with an exception are tried again. Tables are computed from the files, so they come out
    the same, byte for byte, however often the run was interrupted and whatever the number of jobs.

    Parameters
    ----------
    catalog : Catalog
        The objects.
    out : path
        The run folder; made when it is not there.
    settings : FitSettings, optional
        What to fit and how. Default: every channel, the standard cooling scenarios.
    jobs : int
        Number of objects to fit at a time, each in a process of its own when more than one.
    progress : callable, optional
        Told a `Progress` at every step.

    Returns
    -------
    RunSummary
        Counts and remarks; `decayinfer.read_run` reads the results.

    Raises
    ------
    InputError
        If there is no object to fit, or `jobs` is not positive.
    UnknownNameError
        If a channel or scenario does not exist.
    RunFolderError
        If the folder holds another run or other files, another process is at work in it, or it cannot be
        written.
    """
    start = time.perf_counter()
    settings = resolve_settings(settings or FitSettings())
    _check(catalog, jobs)
    folder = Path(out)
    make_folder(folder)
    with run_lock(folder):
        remarks = _claim(folder, catalog, settings)
        with log_file(folder) as log:
            _log_start(catalog, remarks, log)
            tasks = [Task(folder, pulsar, settings) for pulsar in catalog.pulsars]
            for task in tasks:
                log(drop_unusable(task))
            done = _work_through(tasks, jobs, progress or (lambda _: None), log)
            write_tables(folder, [done[task.pulsar.name].rows for task in tasks], settings.channels)
            summary = _summary(folder, catalog, list(done.values()), remarks, time.perf_counter() - start)
            log([stamp(f"finished: {summary.fitted} posterior runs made, {summary.reused} found")])
    return summary


def fit_sample(
    source: "Catalog | str | PathLike[str] | DataFrame | Table",
    *,
    out: str | PathLike[str],
    settings: FitSettings | None = None,
    jobs: int = 1,
    columns: Mapping[str, str] | None = None,
) -> "Run":
    """Fit every object of a table and return the results.

    Parameters
    ----------
    source : Catalog, path, pandas.DataFrame or astropy.table.Table
        The objects, or the table to read them from.
    out : path
        The run folder; a call with the same arguments goes on where an earlier one stopped.
    settings : FitSettings, optional
        What to fit and how. Default: every channel, the standard cooling scenarios.
    jobs : int
        Number of objects to fit at a time.
    columns : mapping of str to str, optional
        Known column names to those of the table, see `decayinfer.read_table`.

    Returns
    -------
    Run
        Tables as DataFrames, and the draws.

    Raises
    ------
    InputError
        If the table cannot be used or holds no good row.
    UnknownNameError
        If a channel or scenario does not exist.
    RunFolderError
        If the folder cannot take the run, see `run_fit`.

    Examples
    --------
    >>> from tempfile import TemporaryDirectory
    >>> from astropy.table import Table
    >>> import decayinfer as di
    >>> rows = [("Rush 7", 0.2, 5e-14, 20.0, 1.0), ("Rush 9", 0.4, 3e-14, 8.0, 0.5)]
    >>> header = ("name", "period", "period_derivative", "braking_index", "braking_index_err")
    >>> scenario = "bsk24-protons-iron"
    >>> settings = di.FitSettings(channels=("constant", "phonon"), cooling=(scenario,))
    >>> with TemporaryDirectory() as folder:
    ...     run = di.fit_sample(Table(rows=rows, names=header), out=folder, settings=settings)
    ...     objects, parameters = run.objects, run.parameters
    ...     draws = run.draws("Rush 7", scenario, "phonon")
    >>> objects.best_channel.tolist()
    ['phonon', 'phonon']
    >>> parameters.columns[:8].tolist()
    ['object', 'scenario', 'channel', 'parameter', 'unit', 'prior_q05', 'prior_q50', 'prior_q95']
    >>> draws["posterior"]["mass"].shape
    (2, 1000)
    """
    from decayinfer.catalog import Catalog, read_table
    from decayinfer.results.read import read_run

    catalog = source if isinstance(source, Catalog) else read_table(source, columns=columns)
    return read_run(run_fit(catalog, out, settings, jobs=jobs).path)


def _check(catalog: "Catalog", jobs: int) -> None:
    if jobs < 1:
        raise InputError(f"jobs must be at least 1, got {jobs}")
    if not catalog.pulsars:
        errors = [str(problem) for problem in catalog.problems if problem.severity == "error"]
        first = f"; the first problem: {errors[0]}" if errors else ""
        raise InputError(f"{catalog.source} has no row that can be fitted{first}")


def _claim(folder: Path, catalog: "Catalog", settings: FitSettings) -> tuple[str, ...]:
    """Make the folder this run's, keep the input in it, and clear what a killed run left half written."""
    input_table = any_to_ecsv(catalog.table)
    remarks = claim_folder(folder, make_record(catalog, settings, input_table))
    if not (folder / INPUT_NAME).exists():
        write_whole(folder / INPUT_NAME, input_table)
    clear_leftovers(folder)
    return tuple(remarks)


def _log_start(catalog: "Catalog", remarks: Sequence[str], log: Log) -> None:
    log([stamp(f"start: {len(catalog.pulsars)} objects from {catalog.source}")])
    log([stamp(str(problem), logging.WARNING) for problem in catalog.problems])
    log([stamp(remark, logging.WARNING) for remark in remarks])


def _work_through(
    tasks: Sequence[Task], jobs: int, progress: Callable[[Progress], None], log: Log
) -> dict[str, Done]:
    """Work on every task; return what came back, by object."""
    from decayinfer.inference import fit

    missing = {task.pulsar.name: len(task.missing) for task in tasks}
    total = sum(len(task.cells) for task in tasks)
    jobs = min(jobs, len(tasks))

    def tick(at_work: Sequence[Task]) -> None:
        check_interrupt()
        left = {task: task.missing for task in at_work}
        waiting = sum(missing.values()) - sum(
            missing[t.pulsar.name] - len(cells) for t, cells in left.items()
        )
        running = tuple(" ".join((t.pulsar.name, *cells[0])) for t, cells in left.items() if cells)
        progress(Progress(total - waiting, total, running))

    def one_by_one() -> Iterator[Done]:
        for task in tasks:
            yield work_on(task, fit.fit_channel, log, on_start=lambda _, task=task: tick([task]))  # type: ignore[misc]

    finished = {}
    with kept_interrupts() as check_interrupt:
        for done in in_processes(tasks, jobs=jobs, tick=tick) if jobs > 1 else one_by_one():
            finished[done.name] = done
            missing[done.name] = 0
            log(done.lines)
            tick(())
    return finished


def _summary(
    folder: Path, catalog: "Catalog", done: list[Done], remarks: tuple[str, ...], seconds: float
) -> RunSummary:
    statuses = [row["status"] for each in done for row in each.rows.channels]
    fitted = sum(each.fitted for each in done)
    return RunSummary(
        path=folder,
        objects=len(done),
        fitted=fitted,
        reused=len(statuses) - fitted,
        unreachable=statuses.count(Status.UNREACHABLE),
        failed=statuses.count(Status.FAILED),
        problems=catalog.problems,
        remarks=remarks,
        seconds=seconds,
    )
