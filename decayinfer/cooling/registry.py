"""The cooling scenarios that ship with the package, one data file each."""

from collections.abc import Iterable
from functools import cache
from importlib.resources import as_file, files

from decayinfer.cooling.scenario import Scenario, read_scenario
from decayinfer.errors import UnknownNameError

__all__ = [
    "ALL",
    "choose_scenarios",
    "load_scenario",
    "register_scenario",
    "scenario_names",
    "standard_names",
]

ALL = "all"  #: stands for every scenario that is not provisional

_FOLDER = files("decayinfer.cooling") / "data"
_REGISTERED: dict[str, Scenario] = {}


@cache
def _shipped() -> tuple[str, ...]:
    return tuple(sorted(entry.name[:-5] for entry in _FOLDER.iterdir() if entry.name.endswith(".toml")))


@cache
def _read(name: str) -> Scenario:
    with as_file(_FOLDER / f"{name}.toml") as path:
        return read_scenario(path)


def scenario_names() -> tuple[str, ...]:
    """Return the names of every known scenario, the shipped ones first."""
    return (*_shipped(), *(name for name in _REGISTERED if name not in _shipped()))


def standard_names() -> tuple[str, ...]:
    """Return the names of the scenarios that are fitted when none is named."""
    return tuple(name for name in scenario_names() if load_scenario(name).standard)


def choose_scenarios(asked: Iterable[str]) -> tuple[str, ...]:
    """Return the scenarios that are asked for, each once.

    Parameters
    ----------
    asked : iterable of str
        Names; none means the standard set, and `ALL` every scenario that is not provisional.

    Raises
    ------
    UnknownNameError
        If no scenario has one of the names.
    """
    names: list[str] = []
    for name in asked:
        computed = (each for each in scenario_names() if not load_scenario(each).provisional)
        names += computed if name == ALL else (load_scenario(name).name,)
    return tuple(dict.fromkeys(names)) or standard_names()


def load_scenario(name: str) -> Scenario:
    """Return the scenario of that name.

    Raises
    ------
    UnknownNameError
        If no scenario has that name.
    """
    if name in _REGISTERED:
        return _REGISTERED[name]
    if name not in _shipped():
        raise UnknownNameError("cooling scenario", name, scenario_names())
    return _read(name)


def register_scenario(scenario: Scenario) -> None:
    """Add a scenario of the caller's own to the registry of this process."""
    _REGISTERED[scenario.name] = scenario
