"""How often the truths of an invented sample lie inside their intervals."""

from collections import defaultdict
from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

import numpy as np

from decayinfer.inference.outcome import PARAMETERS
from decayinfer.results.read import Run
from decayinfer.results.summary import AVERAGED

__all__ = ["Coverage", "coverage"]


@dataclass(frozen=True)
class Coverage:
    """Truths inside their 90 per cent intervals.

    Attributes
    ----------
    inside, total : int
        Truths inside, and truths compared.
    by_parameter : mapping of str to (int, int)
        The same for each parameter.
    """

    inside: int
    total: int
    by_parameter: Mapping[str, tuple[int, int]]


def coverage(run: Run) -> Coverage | None:
    """Compare the input's ``truth_`` columns with the averaged 90 per cent intervals.

    A truth counts where the average defines the parameter. Truths must be in the units of `PARAMETERS`, or
    state theirs.

    Returns
    -------
    Coverage or None
        None when the input has no truths.
    """
    truths = _truths(run)
    counts: dict[str, list[bool]] = defaultdict(list)
    frame = run.parameters
    averaged = frame[(frame.channel == AVERAGED) & (frame.scenario == AVERAGED)]
    for name, parameter, low, high in averaged[["object", "parameter", "q05", "q95"]].to_numpy().tolist():
        truth = truths.get((name, parameter), np.nan)
        if np.isfinite(truth):
            counts[parameter].append(low <= truth <= high)
    if not counts:
        return None
    by_parameter = {name: (sum(hits), len(hits)) for name, hits in counts.items()}
    inside, total = (sum(values) for values in zip(*by_parameter.values(), strict=True))
    return Coverage(inside, total, by_parameter)


def _truths(run: Run) -> dict[tuple[str, str], float]:
    """Return the truth of every object and parameter that the input gives."""
    table = run.table("input")
    names = [str(name) for name in table[run.record["input"]["columns"].get("name", "name")]]
    truths: dict[tuple[str, str], float] = {}
    for parameter in PARAMETERS:
        column = f"truth_{parameter.name}"
        if column in table.colnames:
            values = _in_unit(table[column], parameter.unit)
            truths |= {(name, parameter.name): v for name, v in zip(names, values, strict=True)}
    return truths


def _in_unit(column: Any, unit: str) -> list[float]:
    values = np.ma.filled(np.ma.asarray(column, dtype=float), np.nan)
    if column.unit is not None and unit:
        values = (values * column.unit).to_value(unit)
    return [float(value) for value in values]
