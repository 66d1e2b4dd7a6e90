"""run.toml: everything that decides the numbers of a run, and the software that made them."""

import hashlib
import platform
import sys
import tomllib
from collections.abc import Iterator, Mapping
from importlib.metadata import PackageNotFoundError, version
from pathlib import Path
from typing import TYPE_CHECKING, Any

from decayinfer.errors import RunFolderError
from decayinfer.results.files import explain_os_errors, write_whole
from decayinfer.results.toml import to_toml

if TYPE_CHECKING:
    from decayinfer.catalog import Catalog
    from decayinfer.inference.settings import FitSettings

__all__ = ["RECORD_NAME", "claim_folder", "make_record", "read_record"]

RECORD_NAME = "run.toml"

#: Copy of the input table in the run folder.
INPUT_NAME = "input.ecsv"

_PACKAGES = (
    "numpy", "scipy", "pandas", "astropy", "pymc", "pytensor", "numba", "nutpie", "arviz",
    "xarray", "h5netcdf", "h5py",
)  # fmt: skip

_COMMENT = "What this run was told to do and what did it. The same command goes on with it."

#: Parts of the record that a resumed run must share with the run that began it, and what in them may differ.
_BINDING = ("decayinfer", "settings", "input")
_FREE = ("input.table",)


def make_record(catalog: "Catalog", settings: "FitSettings", input_table: str) -> dict[str, Any]:
    """Return the record of a run.

    Parameters
    ----------
    catalog : Catalog
        The input.
    settings : FitSettings
        The settings, channels and scenarios named.
    input_table : str
        Text of the run's copy of the input table.
    """
    from decayinfer import __version__

    return {
        "decayinfer": __version__,
        "settings": settings.as_dict(),
        "input": {
            "table": catalog.source,
            "sha256": hashlib.sha256(input_table.encode()).hexdigest(),
            "objects": [pulsar.name for pulsar in catalog.pulsars],
            "columns": dict(catalog.columns),
        },
        "versions": {
            "python": platform.python_version(),
            "platform": f"{sys.platform} {platform.machine()}",
            **{name: _version(name) for name in _PACKAGES},
        },
    }


def claim_folder(folder: Path, record: Mapping[str, Any]) -> list[str]:
    """Make the folder the run's own: write its record, or check that it is this very run's.

    Parameters
    ----------
    folder : Path
        An existing folder, locked.
    record : mapping
        From `make_record`.

    Returns
    -------
    list of str
        A sentence for each package that has another version than when the run began.

    Raises
    ------
    RunFolderError
        If the folder holds another run, or other files.
    """
    if not (folder / RECORD_NAME).exists():
        _refuse_other_files(folder)
        write_whole(folder / RECORD_NAME, to_toml(record, comment=_COMMENT))
        return []
    found = read_record(folder)
    _refuse_other_run(folder, found, record)
    then, now = dict(_flat(found["versions"])), dict(_flat(_as_read(record)["versions"]))
    return [
        f"{k} is {now[k]} now, was {then.get(k)} when the run began" for k in now if now[k] != then.get(k)
    ]


def read_record(folder: Path) -> dict[str, Any]:
    """Return the record of a run folder.

    Raises
    ------
    RunFolderError
        If there is none or it cannot be read.
    """
    path = folder / RECORD_NAME
    if not path.is_file():
        raise RunFolderError(
            f"{folder} is no run folder: it has no {RECORD_NAME}; make one with decayinfer fit"
        )
    try:
        with explain_os_errors(path, "read"):
            return tomllib.loads(path.read_text(encoding="utf-8"))
    except ValueError as error:
        raise RunFolderError(f"{path} is damaged ({error}); choose another folder for a new run") from error


def _refuse_other_files(folder: Path) -> None:
    from decayinfer.results.lock import LOCK_NAME

    others = sorted(p.name for p in folder.iterdir() if p.name != LOCK_NAME and not p.name.startswith("."))
    if others:
        raise RunFolderError(
            f"{folder} is not empty and holds no run (found {', '.join(others[:3])}); "
            "choose a new or an empty folder with --out"
        )


def _refuse_other_run(folder: Path, found: Mapping[str, Any], record: Mapping[str, Any]) -> None:
    then = dict(_flat({key: found.get(key) for key in _BINDING}))
    now = dict(_flat({key: _as_read(record)[key] for key in _BINDING}))
    keys = [key for key in {**then, **now} if key not in _FREE]
    differing = [key for key in keys if repr(then.get(key)) != repr(now.get(key))]
    if not differing:
        return
    if "input.sha256" in differing:
        differing = [key for key in differing if not key.startswith("input.")] + ["input.sha256"]
    told = "; ".join(_difference(key, then.get(key), now.get(key)) for key in differing[:4])
    more = f" (and {len(differing) - 4} more)" if len(differing) > 4 else ""
    raise RunFolderError(
        f"{folder} holds a run with other settings: {told}{more}. "
        "Give the same settings to go on with it, or choose another folder with --out"
    )


def _difference(key: str, then: Any, now: Any) -> str:
    if key == "input.sha256":
        return "the input table has changed"
    name = key.removeprefix("settings.").removeprefix("input.")
    return f"{name} was {_short(then)}, is now {_short(now)}"


def _short(value: Any) -> str:
    text = ",".join(map(str, value)) if isinstance(value, list) else str(value)
    return text if len(text) <= 80 else f"{text[:60]}... ({len(text)} characters)"


def _as_read(record: Mapping[str, Any]) -> dict[str, Any]:
    """Return the record as it comes back from the file."""
    return tomllib.loads(to_toml(record))


def _flat(values: Mapping[str, Any], prefix: str = "") -> Iterator[tuple[str, Any]]:
    for key, value in values.items():
        if isinstance(value, Mapping):
            yield from _flat(value, f"{prefix}{key}.")
        else:
            yield f"{prefix}{key}", value


def _version(package: str) -> str:
    try:
        return version(package)
    except PackageNotFoundError:
        return "not installed"
