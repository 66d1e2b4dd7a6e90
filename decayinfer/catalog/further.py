"""Further measurements of every row: age, surface temperature and whatever else `decayinfer.measurements` knows."""

from collections.abc import Mapping
from typing import TYPE_CHECKING, NamedTuple

import numpy as np
from numpy.typing import NDArray

from decayinfer.catalog.cells import Cells
from decayinfer.catalog.ledger import Ledger
from decayinfer.measurements import MEASUREMENTS, Measurement

if TYPE_CHECKING:
    from decayinfer.catalog.catalog import Catalog

__all__ = ["FURTHER_HEADER", "further_listing", "read_measurements"]

Floats = NDArray[np.float64]

#: Column heads of `further_listing`.
FURTHER_HEADER = ("object", "also known")


class _Columns(NamedTuple):
    """The columns of one kind of measurement."""

    value: Cells
    err: Cells
    err_minus: Cells
    err_plus: Cells
    lower: Cells
    upper: Cells


def read_measurements(cells: Mapping[str, Cells], ledger: Ledger) -> list[tuple[Measurement, ...]]:
    """Check the columns of further measurements; what cannot be used is set aside, its row is not.

    A value with its error comes before limits.

    Parameters
    ----------
    cells : mapping of str to Cells
        Columns by known name.
    ledger : Ledger
        Receives what is wrong.

    Returns
    -------
    list of tuple of Measurement
        The measurements of each row.
    """
    found: list[list[Measurement]] = [[] for _ in ledger.names]
    for kind in MEASUREMENTS.values():
        columns = _Columns(*(cells[name] for name in kind.columns()))
        if all(column.raw is None for column in columns):
            continue
        numbers = _read(kind, columns, ledger)
        for row in np.flatnonzero(
            np.any([np.isfinite(numbers[x]) for x in ("value", "lower", "upper")], axis=0)
        ):
            given = {name: float(values[row]) for name, values in numbers.items() if np.isfinite(values[row])}
            found[row].append(kind(**given))
    return [tuple(measurements) for measurements in found]


def further_listing(catalog: "Catalog") -> list[tuple[str, str]]:
    """Return a row of text, under `FURTHER_HEADER`, for each object of which more is known than its spin."""
    return [(p.name, "; ".join(words)) for p in catalog.pulsars if (words := p.further())]


def _read(kind: type[Measurement], columns: _Columns, ledger: Ledger) -> dict[str, Floats]:
    """Return the arguments of the kind for each row, nan where there is none."""
    value, lower, upper = (
        _number(kind, column, ledger) for column in (columns.value, columns.lower, columns.upper)
    )
    both, minus, plus = (_error(column, ledger) for column in columns[1:4])
    err_minus, err_plus = np.where(np.isnan(minus), both, minus), np.where(np.isnan(plus), both, plus)
    alone = np.isfinite(value) & ~np.isfinite(err_minus + err_plus)
    _ignore(alone, columns.value, "must come with its errors to be used", "give the one-sigma error", ledger)
    value = np.where(alone, np.nan, value)
    measured = np.isfinite(value)
    for name, limit in (("lower", lower), ("upper", upper)):
        rule = "a limit should stand where there is no value with its error"
        _ignore(measured & np.isfinite(limit), getattr(columns, name), rule, "blank one of the two", ledger)
    with np.errstate(invalid="ignore"):
        crossed = ~measured & (lower >= upper)
    rule = f"must be above {columns.lower.column} to be used"
    _ignore(crossed, columns.upper, rule, "correct the limits", ledger)
    unused = measured | crossed
    lower, upper = (np.where(unused, np.nan, limit) for limit in (lower, upper))
    nothing = ~(measured | np.isfinite(lower) | np.isfinite(upper))
    for column in columns[1:4]:
        idle = nothing & column.given & columns.value.absent & columns.lower.absent & columns.upper.absent
        _ignore(idle, column, "should come with a value or a limit", "fill that or blank the error", ledger)
    return {"value": value, "err_minus": err_minus, "err_plus": err_plus, "lower": lower, "upper": upper}


def _number(kind: type[Measurement], cells: Cells, ledger: Ledger) -> Floats:
    with np.errstate(invalid="ignore"):
        broken = cells.bad | (cells.given & ~kind.inside(cells.values))
    rule = f"must be a finite number, {kind.range_text()}, to be used"
    _ignore(broken, cells, rule, "correct the value or leave it blank", ledger)
    return np.where(broken, np.nan, cells.values)


def _error(cells: Cells, ledger: Ledger) -> Floats:
    broken = cells.bad | (cells.given & (cells.values <= 0))
    _ignore(broken, cells, "must be positive and finite to be used", "give the one-sigma error", ledger)
    return np.where(broken, np.nan, cells.values)


def _ignore(rows: NDArray[np.bool_], cells: Cells, rule: str, remedy: str, ledger: Ledger) -> None:
    ledger.flag(rows, cells, "value-ignored", rule, remedy)
