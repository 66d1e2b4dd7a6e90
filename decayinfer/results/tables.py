"""The tables of a run: their columns, units and descriptions, and their bytes.

Numbers are written with ten significant digits, nothing in a table tells the time, and rows follow the order
of the input, the scenarios and the channels. So the same draws give the same bytes.
"""

import re
import warnings
from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from io import BytesIO, StringIO
from pathlib import Path
from typing import TYPE_CHECKING, Any

import numpy as np

from decayinfer.errors import InputError, RunFolderError
from decayinfer.results.files import write_whole

if TYPE_CHECKING:
    from astropy.table import Table

    from decayinfer.results.summary import ObjectRows

__all__ = [
    "CHANNEL_COLUMNS",
    "PARAMETER_COLUMNS",
    "SCENARIO_COLUMNS",
    "SENSITIVITY_COLUMNS",
    "Column",
    "any_to_ecsv",
    "check_new_table",
    "object_columns",
    "save_table",
    "to_ecsv",
    "to_table",
    "write_tables",
]

#: Significant digits of every number in a table.
DIGITS = 10


@dataclass(frozen=True)
class Column:
    """A column of a table.

    Attributes
    ----------
    name, description : str
        Its name and what it holds.
    unit : str
        Astropy unit string; empty when dimensionless.
    kind : type
        ``str``, ``int`` or ``float``.
    """

    name: str
    description: str
    unit: str = ""
    kind: type = float


def _interval_columns(name: str, what: str, unit: str) -> tuple[Column, ...]:
    levels = (("q05", "5 % quantile"), ("q50", "median"), ("q95", "95 % quantile"))
    return tuple(Column(f"{name}_{key}", f"{level} of the {what}", unit) for key, level in levels)


_LABELS = (
    Column("object", "name of the object", kind=str),
    Column("scenario", "cooling scenario, or averaged", kind=str),
    Column("channel", "channel, or averaged", kind=str),
)

#: Columns of channels.ecsv.
CHANNEL_COLUMNS = (
    *_LABELS,
    Column("ln_evidence", "ln p(n | P, Pdot, channel, scenario)"),
    Column("ln_evidence_err", "standard error of ln_evidence"),
    Column("ln_evidence_joint", "ln p(n, ln P, ln Pdot | channel, scenario)"),
    Column("probability", "probability of this channel and scenario among those of the object"),
    Column("ess_bulk_min", "smallest bulk effective sample size over the sampled coordinates"),
    Column("r_hat_max", "largest R-hat over the sampled coordinates"),
    Column("divergences", "divergent transitions among the kept draws", kind=int),
    Column("status", "ok, unreachable or failed", kind=str),
    Column("ln_evidence_joint_err", "standard error of ln_evidence_joint"),
    Column("probability_err", "Monte Carlo standard error of probability"),
    Column("ess_tail_min", "smallest tail effective sample size over the sampled coordinates"),
    Column("flags", "flags, separated by commas", kind=str),
    Column("reason", "why the status is not ok", kind=str),
)

#: Columns of parameters.ecsv; values are in the unit of the row.
PARAMETER_COLUMNS = (
    *_LABELS,
    Column("parameter", "name of the parameter", kind=str),
    Column("unit", "unit of the row's values; empty when dimensionless", kind=str),
    Column("prior_q05", "5 % quantile given P and Pdot but not n"),
    Column("prior_q50", "median given P and Pdot but not n"),
    Column("prior_q95", "95 % quantile given P and Pdot but not n"),
    Column("mean", "posterior mean"),
    Column("sd", "posterior standard deviation"),
    Column("q05", "5 % quantile of the posterior"),
    Column("q16", "16 % quantile of the posterior"),
    Column("q50", "median of the posterior"),
    Column("q84", "84 % quantile of the posterior"),
    Column("q95", "95 % quantile of the posterior"),
    Column("ess_bulk", "bulk effective sample size"),
    Column("r_hat", "R-hat"),
    Column("share", "share of the averaged probability over which the parameter is defined"),
    Column("information", "Kullback-Leibler divergence of posterior from prior", "bit"),
)

#: Columns of sensitivity.ecsv.
SENSITIVITY_COLUMNS = (
    Column("object", "name of the object", kind=str),
    Column("varied", "what is varied: reading (of n), priors or scenarios", kind=str),
    Column("setting", "to what; the reading scattered is the default of the other tables", kind=str),
    Column("channel", "channel, or any decay for the decay channels together", kind=str),
    Column("probability", "probability of the channel, over all scenarios"),
    Column("probability_err", "Monte Carlo standard error of probability"),
    Column("ln_evidence", "ln p(n | P, Pdot, channel), averaged over scenarios by their weights"),
    Column("ln_evidence_err", "standard error of ln_evidence"),
)

#: Columns of scenarios.ecsv.
SCENARIO_COLUMNS = (
    Column("object", "name of the object", kind=str),
    Column("scenario", "cooling scenario", kind=str),
    Column("weight", "stated prior weight of the scenario"),
    Column("ln_evidence", "ln p(n | P, Pdot, scenario), averaged over channels by their prior odds"),
    Column("ln_evidence_err", "standard error of ln_evidence"),
    Column("probability", "posterior probability of the scenario, channels summed"),
    *_interval_columns("mass", "mass under this scenario, averaged over channels", "Msun"),
    *_interval_columns("mass_prior", "mass given P and Pdot but not n, under this scenario", "Msun"),
    Column(
        "mass_shift", "median mass less that averaged over scenarios, in standard deviations of the average"
    ),
    Column("prior_shift", "median mass less that of its prior, in prior standard deviations"),
    Column("probability_err", "Monte Carlo standard error of probability"),
    Column("failed", "channels that failed under this scenario, and are left out", kind=int),
)


def object_columns(channels: Iterable[str]) -> tuple[Column, ...]:
    """Return the columns of objects.ecsv for the channels of a run."""
    return (
        Column("object", "name of the object", kind=str),
        Column("characteristic_age", "P / (2 Pdot)", "yr"),
        Column("braking_index", "observed braking index n"),
        Column("err_minus", "quoted error of n below"),
        Column("err_plus", "quoted error of n above"),
        Column("limit", "upper limit on n"),
        Column("best_channel", "most probable channel", kind=str),
        Column("best_probability", "probability of the most probable channel, over all scenarios"),
        Column("best_probability_err", "Monte Carlo standard error of best_probability"),
        *(Column(f"probability_{c}", f"probability of {c}, over all scenarios") for c in channels),
        Column("probability_any_decay", "probability of all decay channels together"),
        Column("predictive_p", "two-sided tail probability of the observed n under the averaged posterior"),
        Column("best_scenario", "most probable cooling scenario", kind=str),
        Column("best_scenario_probability", "probability of the most probable scenario, over all channels"),
        *_interval_columns("mass", "mass, averaged over channels and scenarios", "Msun"),
        *_interval_columns("mass_prior", "mass given P and Pdot but not n", "Msun"),
        *_interval_columns("phonon_time", "phonon time at 1e8 K, averaged where phonons act", "yr"),
        Column("verdict", "the answer in plain words", kind=str),
        Column("flags", "flags, separated by commas", kind=str),
    )


def to_table(rows: Sequence[dict[str, Any]], columns: Sequence[Column]) -> "Table":
    """Return rows as an astropy table with units and descriptions."""
    from astropy.table import Column as AstropyColumn
    from astropy.table import Table

    return Table(
        [
            AstropyColumn(
                data=_values([row[c.name] for row in rows], c.kind),
                name=c.name,
                description=c.description,
                unit=c.unit or None,
            )
            for c in columns
        ]
    )


def _values(values: list[Any], kind: type) -> np.ndarray[Any, Any]:
    if kind is float:
        return np.array([float(f"{float(value):.{DIGITS}g}") for value in values])
    return np.array(values, dtype=kind)


def to_ecsv(table: "Table") -> str:
    """Return a table as ECSV text."""
    text = StringIO()
    table.write(text, format="ascii.ecsv")
    return text.getvalue()


def any_to_ecsv(table: "Table") -> str:
    """Return any table as ECSV text; metadata and Python objects that ECSV cannot hold become text."""
    try:
        return to_ecsv(table)
    except Exception:  # astropy passes on whatever its JSON and YAML writers raise
        plain = table.copy()
        plain.meta = {str(key): _as_text(value) for key, value in table.meta.items()}
        for name in table.colnames:
            if getattr(getattr(table[name], "dtype", None), "kind", "") == "O":
                plain.replace_column(name, [_as_text(value) for value in table[name]])
        return to_ecsv(plain)


def _as_text(value: Any) -> str:
    """Return an object as text that is the same in every process."""
    return re.sub(r" at 0x[0-9a-f]+", "", str(value))


def check_new_table(path: Path) -> str:
    """Return the astropy format that the ending of a new table's path stands for.

    Raises
    ------
    InputError
        If the ending stands for none.
    RunFolderError
        If the file exists already.
    """
    formats = {
        ".ecsv": "ascii.ecsv",
        ".csv": "ascii.csv",
        ".fits": "fits",
        ".xml": "votable",
        ".vot": "votable",
    }
    if path.suffix.lower() not in formats:
        raise InputError(f"{path} must end in one of {', '.join(formats)} to tell its format")
    if path.exists():
        raise RunFolderError(f"{path} exists already; delete it or choose another name")
    return formats[path.suffix.lower()]


def save_table(table: "Table", path: Path) -> None:
    """Write a new table in the format of the path's ending: .ecsv, .csv, .fits, .xml or .vot.

    Raises
    ------
    InputError
        If the ending stands for no format.
    RunFolderError
        If the file exists already or cannot be written.
    """
    from astropy.units import UnitsWarning

    kind = check_new_table(path)
    content: Any = StringIO() if kind.startswith("ascii") else BytesIO()
    with warnings.catch_warnings():
        warnings.simplefilter("ignore", UnitsWarning)  # VOTable would rather have tesla than gauss
        table.write(content, format=kind)
    write_whole(path, content.getvalue())


def write_tables(folder: Path, rows: Sequence["ObjectRows"], channels: Sequence[str]) -> None:
    """Write the tables into a run folder, objects.ecsv last.

    Raises
    ------
    RunFolderError
        If a table cannot be written.
    """
    channel_rows = [row for each in rows for row in each.channels]
    parameter_rows = [row for each in rows for row in each.parameters]
    sensitivity_rows = [row for each in rows for row in each.sensitivity]
    scenario_rows = [row for each in rows for row in each.scenarios]
    write_whole(folder / "scenarios.ecsv", to_ecsv(to_table(scenario_rows, SCENARIO_COLUMNS)))
    write_whole(folder / "sensitivity.ecsv", to_ecsv(to_table(sensitivity_rows, SENSITIVITY_COLUMNS)))
    write_whole(folder / "parameters.ecsv", to_ecsv(to_table(parameter_rows, PARAMETER_COLUMNS)))
    write_whole(folder / "channels.ecsv", to_ecsv(to_table(channel_rows, CHANNEL_COLUMNS)))
    write_whole(
        folder / "objects.ecsv", to_ecsv(to_table([r.objects for r in rows], object_columns(channels)))
    )
