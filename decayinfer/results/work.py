"""The work on one object: fit what is missing, read everything back, make the rows of the tables."""

import time
import traceback
from collections.abc import Callable
from dataclasses import dataclass, replace
from pathlib import Path

from decayinfer.catalog.pulsar import Pulsar
from decayinfer.cooling.registry import load_scenario
from decayinfer.errors import RunFolderError
from decayinfer.inference.outcome import ChannelFit, ObjectFit, Status
from decayinfer.inference.settings import FitSettings
from decayinfer.results.draws import draws_path, fingerprint, load_reported, read_header, save_channel_fit
from decayinfer.results.log import LOG, Log, logged_to, stamp
from decayinfer.results.summary import ObjectRows, summarise

__all__ = ["DIED", "Done", "Fitter", "Stopped", "Task", "drop_unusable", "work_on"]

#: Reason of the posterior runs that were not finished when their process was lost.
DIED = "the process at work was lost twice (killed, out of memory or crashed)"

type Cell = tuple[str, str]
type Fitter = Callable[[Pulsar, str, str, FitSettings], ChannelFit]


@dataclass(frozen=True)
class Task:
    """One object of a run.

    Attributes
    ----------
    run : Path
        The run folder.
    pulsar : Pulsar
        The object.
    settings : FitSettings
        Settings with channels and scenarios named.
    """

    run: Path
    pulsar: Pulsar
    settings: FitSettings

    @property
    def cells(self) -> tuple[Cell, ...]:
        """Scenario and channel of every posterior run, in the order of the tables."""
        return tuple((s, c) for s in self.settings.cooling for c in self.settings.channels)

    @property
    def missing(self) -> tuple[Cell, ...]:
        """Scenario and channel of every posterior run that has no file yet."""
        return tuple(cell for cell in self.cells if not self.path(cell).exists())

    def path(self, cell: Cell) -> Path:
        """Return the file of a posterior run."""
        return draws_path(self.run, self.pulsar.name, *cell)


@dataclass(frozen=True)
class Done:
    """What comes back from the work on one object.

    Attributes
    ----------
    name : str
        The object.
    rows : ObjectRows
        Its rows in the tables.
    fitted : int
        How many posterior runs were made now rather than found.
    lines : tuple of str
        Lines for log.txt, when they have not been passed on at once.
    """

    name: str
    rows: ObjectRows
    fitted: int
    lines: tuple[str, ...] = ()


class Stopped(Exception):  # noqa: N818 - a request, not an error
    """The run was asked to stop between two posterior runs."""


def drop_unusable(task: Task) -> list[str]:
    """Delete files that a resumed run must not take over: damaged, of other inputs, or failed without draws.

    A run that failed with draws did not converge, and would not the next time.

    Returns
    -------
    list of str
        A line for each file deleted.
    """
    lines = []
    for cell in task.cells:
        path = task.path(cell)
        if path.exists() and (why := _unusable(path, _fingerprint(task, cell))):
            path.unlink()
            lines.append(stamp(f"{_label(task, cell)}: done again, for {why}"))
    return lines


def work_on(
    task: Task,
    fitter: Fitter,
    log: Log,
    *,
    on_start: Callable[[Cell], None] = lambda _: None,
    stop: Callable[[], bool] = lambda: False,
) -> Done:
    """Make the missing posterior runs of an object and return its rows, computed from the files.

    Parameters
    ----------
    task : Task
        The object.
    fitter : callable
        Makes one posterior run from pulsar, channel, scenario and settings. What it raises becomes status
        ``failed``.
    log : callable
        Takes lines for log.txt.
    on_start : callable
        Told scenario and channel before each posterior run.
    stop : callable
        Asked before each posterior run whether to stop.

    Raises
    ------
    Stopped
        If `stop` said so.
    RunFolderError
        If a file cannot be written or read.
    """
    with logged_to(log):
        missing = task.missing
        for cell in missing:
            if stop():
                raise Stopped
            on_start(cell)
            _fit_and_save(task, cell, fitter)
        fits = tuple(_load(task, cell, fitter) for cell in task.cells)
        rows = _rows(task, fits)
    return Done(task.pulsar.name, rows, len(missing))


def _fit_and_save(task: Task, cell: Cell, fitter: Fitter) -> None:
    fit = _attempt(task, cell, fitter)
    save_channel_fit(task.path(cell), fit, fingerprint=_fingerprint(task, cell))


def _attempt(task: Task, cell: Cell, fitter: Fitter) -> ChannelFit:
    """Make a posterior run; whatever it raises is a result too."""
    scenario, channel = cell
    start = time.perf_counter()
    try:
        fit = fitter(task.pulsar, channel, scenario, task.settings)
    except (KeyboardInterrupt, SystemExit):
        raise
    except BaseException as error:  # compiled samplers panic with exceptions of their own
        LOG.error("%s: failed\n%s", _label(task, cell), traceback.format_exc().rstrip())
        reason = " ".join(f"{type(error).__name__}: {error}".split())
        return ChannelFit(task.pulsar.name, scenario, channel, Status.FAILED, reason=reason)
    LOG.info("%s: %s%s in %.1f s", _label(task, cell), fit.status, _detail(fit), time.perf_counter() - start)
    return fit


def _detail(fit: ChannelFit) -> str:
    if fit.status is not Status.OK:
        return f" ({fit.reason})"
    flags = f", {' '.join(fit.flags)}" if fit.flags else ""
    return f", ln evidence {fit.ln_evidence:.3f} +- {fit.ln_evidence_err:.3f}{flags}"


def _load(task: Task, cell: Cell, fitter: Fitter) -> ChannelFit:
    """Read a posterior run back; if its file is damaged, make it once more, and then it has failed."""
    try:
        return load_reported(task.path(cell))
    except RunFolderError as error:
        LOG.warning("%s: done again, for %s", _label(task, cell), error)
    _fit_and_save(task, cell, fitter)
    try:
        return load_reported(task.path(cell))
    except RunFolderError as error:
        LOG.error("%s: failed, for %s", _label(task, cell), error)
        return ChannelFit(task.pulsar.name, *cell, Status.FAILED, reason=str(error))


def _rows(task: Task, fits: tuple[ChannelFit, ...]) -> ObjectRows:
    weights = {name: load_scenario(name).weight for name in task.settings.cooling}
    total = sum(weights.values())
    fit = ObjectFit(task.pulsar.name, fits, {name: weight / total for name, weight in weights.items()})
    try:
        return summarise(task.pulsar, fit, task.settings)
    except Exception as error:
        LOG.error("%s: no summary\n%s", task.pulsar.name, traceback.format_exc().rstrip())
        reason = f"no summary: {' '.join(f'{type(error).__name__}: {error}'.split())}"
        failed = tuple(ChannelFit(f.name, f.scenario, f.channel, Status.FAILED, reason=reason) for f in fits)
        return summarise(task.pulsar, replace(fit, fits=failed), task.settings)


def _unusable(path: Path, expected: str) -> str:
    """Say why a draws file cannot be taken over; empty when it can."""
    try:
        header = read_header(path)
    except RunFolderError as error:
        return f"its file is damaged ({error})"
    if header["fingerprint"] != expected:
        return "its file was made from other inputs"
    return "it failed before" if header["status"] == Status.FAILED and not header["drawn"] else ""


def _fingerprint(task: Task, cell: Cell) -> str:
    return fingerprint(task.pulsar, task.settings, load_scenario(cell[0]))


def _label(task: Task, cell: Cell) -> str:
    return f"{task.pulsar.name} {cell[0]} {cell[1]}"
