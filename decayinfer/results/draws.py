"""One netCDF file per posterior run: the draws, and beside them the numbers of its `ChannelFit`."""

import hashlib
import json
from dataclasses import asdict, fields
from pathlib import Path
from typing import TYPE_CHECKING, Any
from urllib.parse import quote

from decayinfer import __version__
from decayinfer.errors import RunFolderError
from decayinfer.results.files import explain_os_errors, write_whole

if TYPE_CHECKING:
    from xarray import Dataset, DataTree

    from decayinfer.catalog.pulsar import Pulsar
    from decayinfer.cooling.scenario import Scenario
    from decayinfer.inference.outcome import ChannelFit
    from decayinfer.inference.settings import FitSettings

__all__ = [
    "draws_path",
    "fingerprint",
    "load_channel_fit",
    "load_reported",
    "read_header",
    "safe_name",
    "save_channel_fit",
]

#: Attribute of the file's root group that holds the header, as JSON.
HEADER = "decayinfer"

#: Version of the file layout.
LAYOUT = 2

_LONGEST_NAME = 100


def safe_name(name: str) -> str:
    """Return a name that every file system takes, different for different names.

    Letters, digits and ``+-_`` stay, other characters are percent-encoded; a long name is cut and ends in a
    hash.

    Examples
    --------
    >>> safe_name("J1234+5678"), safe_name("a/b c"), safe_name("..")
    ('J1234+5678', 'a%2Fb%20c', '%2E%2E')
    """
    encoded = quote(name, safe="+").replace("~", "%7E")
    if encoded.startswith(".") or encoded.endswith("."):
        encoded = encoded.replace(".", "%2E")
    if len(encoded) > _LONGEST_NAME:
        encoded = f"{encoded[: _LONGEST_NAME - 17]}~{hashlib.sha256(name.encode()).hexdigest()[:16]}"
    return encoded


def draws_path(run: Path, name: str, scenario: str, channel: str) -> Path:
    """Return where the posterior run of an object, scenario and channel is kept."""
    return run / "draws" / safe_name(name) / f"{safe_name(scenario)}__{safe_name(channel)}.nc"


def fingerprint(pulsar: "Pulsar", settings: "FitSettings", scenario: "Scenario") -> str:
    """Return a hash of everything that decides the numbers of an object's posterior runs in a scenario."""
    sampling = {key: value for key, value in settings.as_dict().items() if key not in ("channels", "cooling")}
    parts = [LAYOUT, __version__, asdict(pulsar), sampling, asdict(scenario)]
    content = json.dumps(parts, sort_keys=True, default=_plain)
    return hashlib.sha256(content.encode()).hexdigest()


def save_channel_fit(path: Path, fit: "ChannelFit", *, fingerprint: str = "") -> None:
    """Write one posterior run, whole or not at all.

    Parameters
    ----------
    path : Path
        File to write; its folder is made.
    fit : ChannelFit
        The posterior run; one without draws leaves a file with a header only.
    fingerprint : str
        Hash from `fingerprint`, by which a later run knows the file for its own.

    Raises
    ------
    RunFolderError
        If the file cannot be written.
    """
    from xarray import DataTree

    header = {"layout": LAYOUT, "fingerprint": fingerprint, "drawn": fit.draws is not None, **_scalars(fit)}
    tree = DataTree() if fit.draws is None else fit.draws.copy()
    tree.attrs[HEADER] = json.dumps(header, default=_plain)
    with explain_os_errors(path):
        path.parent.mkdir(parents=True, exist_ok=True)
    write_whole(path, bytes(tree.to_netcdf(engine="h5netcdf")))


def load_channel_fit(path: Path) -> "ChannelFit":
    """Read one posterior run back.

    Raises
    ------
    RunFolderError
        If there is no such file or it cannot be read.
    """
    import xarray

    header = read_header(path)
    with explain_os_errors(path, "read"), xarray.open_datatree(path, engine="h5netcdf") as tree:
        draws = tree.load()
    return _channel_fit(header, draws)


def load_reported(path: Path) -> "ChannelFit":
    """Read one posterior run back with the draws of the reported parameters only, thirty times as fast.

    The groups are ``posterior`` and ``prior`` and hold the variables named in `PARAMETERS`.

    Raises
    ------
    RunFolderError
        If there is no such file or it cannot be read.
    """
    import h5py
    from xarray import DataTree

    header = read_header(path)
    try:
        with h5py.File(path, "r") as file:
            groups = {name: _reported(file[name]) for name in ("posterior", "prior") if name in file}
    except (OSError, ValueError) as error:
        raise _unreadable(path, error) from error
    return _channel_fit(header, DataTree.from_dict(groups))


def read_header(path: Path) -> dict[str, Any]:
    """Return the header of a draws file: the scalars of its `ChannelFit` and its fingerprint.

    Raises
    ------
    RunFolderError
        If there is no such file, it is damaged, or a later decayinfer wrote it in another layout.
    """
    import h5py

    try:
        with h5py.File(path, "r") as file:
            header: dict[str, Any] = json.loads(file.attrs[HEADER])
    except (OSError, KeyError, ValueError) as error:
        raise _unreadable(path, error) from error
    if header.get("layout") != LAYOUT:
        raise RunFolderError(
            f"{path} has layout {header.get('layout')}, this decayinfer reads layout {LAYOUT}; "
            "use the version named in the run's run.toml"
        )
    return header


def _reported(group: Any) -> "Dataset":
    from xarray import Dataset

    from decayinfer.inference.outcome import PARAMETERS

    names = [p.name for p in PARAMETERS if p.name in group]
    return Dataset({name: (("chain", "draw"), group[name][()]) for name in names})


def _unreadable(path: Path, error: Exception) -> RunFolderError:
    return RunFolderError(f"cannot read {path}: {error}; delete it and run the same command again")


def _channel_fit(header: dict[str, Any], draws: "DataTree") -> "ChannelFit":
    from decayinfer.inference.outcome import ChannelFit, Status

    values: dict[str, Any] = {f.name: header[f.name] for f in fields(ChannelFit) if f.name != "draws"}
    values |= {"status": Status(header["status"]), "flags": tuple(header["flags"])}
    values["variants"] = {name: tuple(pair) for name, pair in header["variants"].items()}
    return ChannelFit(**values, draws=draws if draws.children else None)


def _scalars(fit: "ChannelFit") -> dict[str, Any]:
    """Return every field but the draws (`dataclasses.asdict` would copy those)."""
    return {f.name: getattr(fit, f.name) for f in fields(fit) if f.name != "draws"}


def _plain(value: Any) -> Any:
    """Return NumPy scalars and arrays as Python numbers and lists."""
    return value.tolist()
