"""Read a finished run."""

from dataclasses import dataclass
from functools import cached_property
from os import PathLike
from pathlib import Path
from typing import TYPE_CHECKING, Any

from decayinfer.errors import RunFolderError, UnknownNameError
from decayinfer.results.draws import draws_path, load_channel_fit
from decayinfer.results.files import explain_os_errors
from decayinfer.results.record import INPUT_NAME, read_record

if TYPE_CHECKING:
    from astropy.table import Table
    from pandas import DataFrame
    from xarray import DataTree

    from decayinfer.inference.outcome import ChannelFit

__all__ = ["Run", "read_run", "read_table_file"]

_TABLES = ("objects", "channels", "parameters", "scenarios", "sensitivity")


@dataclass(frozen=True)
class Run:
    """A finished run.

    Attributes
    ----------
    path : Path
        The run folder.
    record : dict
        Content of run.toml: settings, input, versions.
    """

    path: Path
    record: dict[str, Any]

    @cached_property
    def objects(self) -> "DataFrame":
        """A row per object: channel probabilities, mass interval, verdict, flags."""
        return _frame(self.table("objects"))

    @cached_property
    def channels(self) -> "DataFrame":
        """A row per object, scenario and channel: evidence, probability, diagnostics, status."""
        return _frame(self.table("channels"))

    @cached_property
    def parameters(self) -> "DataFrame":
        """A row per object, scenario, channel (or ``averaged``) and parameter: prior and posterior."""
        return _frame(self.table("parameters"))

    @cached_property
    def scenarios(self) -> "DataFrame":
        """A row per object and cooling scenario: weight, evidence, probability, mass and how far it moves."""
        return _frame(self.table("scenarios"))

    @cached_property
    def sensitivity(self) -> "DataFrame":
        """A row per object, reading of n or prior setting or scenario left out, and channel: its probability."""
        return _frame(self.table("sensitivity"))

    def table(self, name: str) -> "Table":
        """Return a table with units.

        One of ``objects``, ``channels``, ``parameters``, ``scenarios``, ``sensitivity`` and the ``input``.

        Raises
        ------
        UnknownNameError
            If there is no table of that name.
        RunFolderError
            If it cannot be read.
        """
        if name not in (*_TABLES, "input"):
            raise UnknownNameError("table", name, (*_TABLES, "input"))
        return read_table_file(self.path / (INPUT_NAME if name == "input" else f"{name}.ecsv"))

    def compare(self, first: str, second: str) -> "DataFrame":
        """Return Bayes factors of two channels for every object, see `decayinfer.results.compare.compare`."""
        from decayinfer.results.compare import compare

        return compare(self, first, second)

    def fit(self, name: str, scenario: str, channel: str) -> "ChannelFit":
        """Return one posterior run.

        Raises
        ------
        UnknownNameError
            If the run has no such object, scenario or channel.
        RunFolderError
            If its file cannot be read.
        """
        settings, names = self.record["settings"], self.record["input"]["objects"]
        asked = (("object", name, names), ("cooling scenario", scenario, settings["cooling"]))
        for kind, given, known in (*asked, ("channel", channel, settings["channels"])):
            if given not in known:
                raise UnknownNameError(kind, given, known)
        return load_channel_fit(draws_path(self.path, name, scenario, channel))

    def draws(self, name: str, scenario: str, channel: str) -> "DataTree":
        """Return the draws of one posterior run: groups posterior, prior and the rest.

        A channel that is unreachable may have the group prior only.

        Parameters
        ----------
        name, scenario, channel : str
            The object, the cooling scenario and the channel.

        Raises
        ------
        UnknownNameError
            If the run has no such object, scenario or channel.
        RunFolderError
            If there are no draws, because the run failed, or the file cannot be read.
        """
        fit = self.fit(name, scenario, channel)
        if fit.draws is None:
            raise RunFolderError(
                f"{name} has no draws for {channel} in {scenario}: {fit.status} ({fit.reason}); "
                "choose one whose status in channels.ecsv is ok"
            )
        return fit.draws


def read_run(path: str | PathLike[str]) -> Run:
    """Open a finished run folder.

    Parameters
    ----------
    path : path
        The folder that ``decayinfer fit --out`` or `fit_sample` wrote.

    Raises
    ------
    RunFolderError
        If it is no run folder, or the run has not finished.
    """
    folder = Path(path)
    record = read_record(folder)
    missing = [name for name in _TABLES if not (folder / f"{name}.ecsv").is_file()]
    if missing:
        raise RunFolderError(
            f"the run in {folder} has not finished: {missing[0]}.ecsv is missing; "
            "give the command that began it once more, and it goes on"
        )
    return Run(folder, record)


def _frame(table: "Table") -> "DataFrame":
    frame: DataFrame = table.to_pandas()
    return frame


def read_table_file(path: Path) -> "Table":
    """Read an ECSV table; empty text stays empty text.

    Raises
    ------
    RunFolderError
        If it cannot be read.
    """
    from astropy.table import Table

    try:
        with explain_os_errors(path, "read"):
            table = Table.read(path, format="ascii.ecsv")
    except ValueError as error:
        raise RunFolderError(
            f"cannot read {path}: {error}; delete it and run the same command again"
        ) from error
    for column in table.itercols():
        if column.dtype.kind == "U" and hasattr(column, "filled"):
            table.replace_column(column.name, column.filled(""))
    return table
