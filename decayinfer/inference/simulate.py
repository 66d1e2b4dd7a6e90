"""Invented samples: objects drawn from the priors, measured with errors, their truths in extra columns."""

from typing import TYPE_CHECKING, Any

import numpy as np

from decayinfer.channels.base import Channel
from decayinfer.channels.registry import channel_names, load_channel
from decayinfer.channels.rival import Rival
from decayinfer.cooling.registry import choose_scenarios, load_scenario
from decayinfer.cooling.scenario import Scenario
from decayinfer.errors import InputError
from decayinfer.inference.forward import draw_prior, evolve
from decayinfer.inference.measurement import sample_index
from decayinfer.inference.outcome import PARAMETERS
from decayinfer.inference.rival_forward import evolve_rival
from decayinfer.inference.settings import FitSettings
from decayinfer.physics import torque
from decayinfer.physics.constants import B_UNIT_G, T_UNIT_K

if TYPE_CHECKING:
    from astropy.table import QTable, Table

__all__ = ["simulate_table"]

#: Names of the invented objects: birds of an invented marsh.
_BIRDS = (
    "Avocet", "Bittern", "Curlew", "Dunlin", "Egret", "Fulmar", "Godwit", "Heron", "Ibis", "Jacana", "Knot",
    "Lapwing",
)  # fmt: skip
_BATCH = 4000
#: A simulated object is kept when a timing programme could have measured its index.
_PERIODS = (0.02, 3.0)  # [s]
_AGES = (5e3, 3e6)  # characteristic age [yr]
_INDICES = (3.2, 120.0)
_RIVAL_INDICES = (-120.0, 120.0)
_RELATIVE_ERRORS = (0.02, 0.08)

_COLUMNS: dict[str, tuple[str, str]] = {
    "period": ("s", "spin period"),
    "period_derivative": ("", "period derivative"),
    "braking_index": ("", "measured braking index"),
    "braking_index_err": ("", "quoted error of the braking index"),
    "truth_braking_index": ("", "secular braking index"),
    "truth_mass": ("Msun", "mass"),
    "truth_impurity_parameter": ("", "impurity parameter"),
    "truth_phonon_time": ("yr", "phonon time at 1e8 K"),
    "truth_hall_time": ("yr", "Hall time of today's field"),
    "truth_age": ("yr", "age"),
    "truth_birth_field": ("G", "birth field"),
    "truth_birth_period": ("s", "birth period"),
    "truth_field": ("G", "field"),
    "truth_crust_temperature": ("K", "crust temperature"),
}


_MEASURED = ("period", "period_derivative", "braking_index", "braking_index_err")


def simulate_table(n: int, seed: int = 1, settings: FitSettings | None = None) -> "Table":
    """Invent a sample.

    Each object takes a channel and a cooling scenario at random from the settings, and its parameters from the
    priors; it is kept if a timing programme could have measured it (period, characteristic age and index within
    plain limits). Without channels named, those with field decay are drawn from. Named, the rivals of decay are too,
    and their own truths have columns; ``constant`` has nothing to measure beyond n = 3 and is left out unless it is
    alone.

    Parameters
    ----------
    n : int
        Number of objects.
    seed : int
        Seed.
    settings : FitSettings, optional
        Channels, cooling scenarios and priors to draw from.

    Returns
    -------
    astropy.table.Table
        Columns that `decayinfer.read_table` reads, and truths in columns that begin with ``truth_``.

    Raises
    ------
    InputError
        If n is not positive, or the priors hardly ever make an object that could be measured.

    Examples
    --------
    >>> import decayinfer as di
    >>> sample = di.simulate_table(3, seed=5)
    >>> [str(name) for name in sample["name"]]
    ['Avocet-1', 'Bittern-1', 'Curlew-1']
    """
    if n < 1:
        raise InputError(f"the number of objects must be positive, got {n}")
    settings = settings or FitSettings()
    rng = np.random.default_rng(seed)
    channels = settings.channels or channel_names(rivals=False)
    channels = tuple(name for name in channels if name != "constant") or channels
    scenarios = choose_scenarios(settings.cooling)
    rows = [_one(str(rng.choice(channels)), str(rng.choice(scenarios)), settings, rng) for _ in range(n)]
    return _table(rows, seed)


def _one(
    channel_name: str, scenario_name: str, settings: FitSettings, rng: np.random.Generator
) -> dict[str, Any]:
    channel, scenario = load_channel(channel_name), load_scenario(scenario_name)
    for _ in range(25):
        period, derivative, index, truths = _batch(channel, scenario, settings, rng)
        with np.errstate(divide="ignore", over="ignore"):  # a dead field has an infinite characteristic age
            age = torque.characteristic_age(period, derivative)
        kept = _within(period, _PERIODS) & _within(age, _AGES)
        if channel.name != "constant":
            kept &= _within(index, _INDICES if channel.decays else _RIVAL_INDICES)
        if kept.any():
            i = int(np.argmax(kept))
            break
    else:
        raise InputError(
            f"channel {channel_name} under {scenario_name} makes hardly any measurable index with these priors; "
            "choose other channels or wider priors"
        )
    error = float(abs(index[i]) * rng.uniform(*_RELATIVE_ERRORS))
    measured = sample_index(index[i : i + 1], error, error, settings.priors.scatter_sd, rng)[0]
    return {
        "period": period[i],
        "period_derivative": derivative[i],
        "braking_index": measured,
        "braking_index_err": error,
        "truth_channel": channel_name,
        "truth_cooling": scenario_name,
        **{f"truth_{name}": values[i] for name, values in truths.items()},
    }


def _batch(
    channel: Channel, scenario: Scenario, settings: FitSettings, rng: np.random.Generator
) -> tuple[Any, Any, Any, dict[str, Any]]:
    """Period, derivative, index and truths of many stars drawn from the priors."""
    draws = draw_prior(_BATCH, settings.priors, rng)
    if isinstance(channel, Rival):
        return evolve_rival(draws, channel, scenario, settings.priors, rng)
    today = evolve(draws, channel, scenario, settings.priors)
    truths = {
        "braking_index": today.braking_index,
        "mass": draws.mass,
        "age": draws.age,
        "birth_field": draws.birth_field * B_UNIT_G,
        "birth_period": draws.birth_period,
        "field": today.field * B_UNIT_G,
        "crust_temperature": today.temperature * T_UNIT_K,
    }
    truths |= {"impurity_parameter": draws.impurity_parameter} if channel.impurity else {}
    truths |= {"phonon_time": draws.phonon_time} if channel.phonon else {}
    truths |= {"hall_time": today.hall_time} if channel.hall else {}
    return today.period, today.period_derivative, today.braking_index, truths


def _within(values: Any, limits: tuple[float, float]) -> Any:
    return (values > limits[0]) & (values < limits[1])


def _table(rows: list[dict[str, Any]], seed: int) -> "QTable":
    from astropy.table import Table

    rivals = {f"truth_{p.name}": (p.unit, p.label) for p in PARAMETERS}
    told = {key for row in rows for key in row}
    columns = _COLUMNS | {key: rivals[key] for key in rivals if key in told - set(_COLUMNS)}
    keys = [*_MEASURED, "truth_channel", "truth_cooling", *(key for key in columns if key not in _MEASURED)]
    names = [f"{_BIRDS[i % len(_BIRDS)]}-{i // len(_BIRDS) + 1}" for i in range(len(rows))]
    table = Table({"name": names} | {key: [row.get(key, np.nan) for row in rows] for key in keys})
    for name, (unit, description) in columns.items():
        table[name].unit = unit or None
        table[name].description = description
        table[name].info.format = ".10g"
    table.meta["comments"] = [f"Invented objects, drawn from the priors of decayinfer with seed {seed}."]
    return table
