"""One column of a table as numbers in internal units, with what could not be used marked cell by cell."""

from collections.abc import Mapping
from dataclasses import dataclass
from decimal import Decimal
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from decayinfer.catalog.columns import COLUMNS, value_of
from decayinfer.catalog.problem import shorten
from decayinfer.errors import InputError

if TYPE_CHECKING:
    from astropy.table import Table

__all__ = ["Cells", "names_of", "read_cells", "read_text"]

_BLANK = {"", "nan", "na", "n/a", "none", "null", "-", "--", "...", "*", "<na>"}
_NUMERIC = (
    str,
    int,
    float,
    Decimal,
    np.integer,
    np.floating,
)  # what may be turned into a float  # text that means no value


@dataclass(frozen=True)
class Cells:
    """A column of numbers.

    Attributes
    ----------
    column : str
        Name the table itself uses.
    values : (n_row,) array of float
        Values in internal units; nan where there is none to use.
    absent, bad : (n_row,) array of bool
        No value given (masked, blank or nan); a value that is no finite number.
    raw : sequence
        The cells as the table holds them.
    unit : str
        Unit of `raw`.
    """

    column: str
    values: NDArray[np.float64]
    absent: NDArray[np.bool_]
    bad: NDArray[np.bool_]
    raw: Any
    unit: str

    @property
    def given(self) -> NDArray[np.bool_]:
        """Whether each row has a usable number, shape (n_row,)."""
        return np.asarray(~(self.absent | self.bad))

    def got(self, row: int) -> str:
        """Return a cell as a message shows it."""
        if self.absent[row]:
            return "nothing"
        return " ".join(filter(None, (shorten(_text(self.raw[row])), self.unit)))


def read_cells(source: str, table: "Table", mapped: Mapping[str, str]) -> dict[str, Cells]:
    """Convert every known column of numbers.

    Parameters
    ----------
    source : str
        Name of the table, for messages.
    table : astropy.table.Table
        The table as read.
    mapped : mapping of str to str
        Known name to the table's own name.

    Returns
    -------
    dict of str to Cells
        By known name; a column the table lacks is absent in every row.

    Raises
    ------
    InputError
        When a column has a unit of the wrong dimension, or holds arrays.
    """
    nothing = np.ones(len(table), bool)
    cells = {}
    for name in COLUMNS:
        if name in mapped:
            cells[name] = _convert(source, table, name, mapped)
        else:
            cells[name] = Cells(name, np.full(len(table), np.nan), nothing, ~nothing, None, "")
    return cells


def _convert(source: str, table: "Table", name: str, mapped: Mapping[str, str]) -> Cells:
    column = _plain(source, table, mapped[name])
    raw, absent, bad = _numbers(column)
    unit = column.unit
    partner = mapped.get(value_of(name))
    if unit is None and partner is not None:  # an error or a limit without a unit has that of its value
        unit = getattr(table[partner], "unit", None)
    values = _to_internal(f"{source}, column {mapped[name]}", raw, unit, COLUMNS[name])
    bad |= ~absent & ~np.isfinite(values)
    values[absent | bad] = np.nan
    return Cells(mapped[name], values, absent, bad, column, "" if unit is None else str(unit))


def _plain(source: str, table: "Table", name: str) -> Any:
    """Return a column after checking that each of its cells is a single value."""
    from astropy.table import Column

    column = table[name]
    if not isinstance(column, Column) or column.ndim != 1:
        raise InputError(
            f"{source}, column {name}: each cell must hold one value, "
            f"got {type(column).__name__} of shape {getattr(column, 'shape', '?')}; remedy: split the column"
        )
    return column


def _numbers(column: Any) -> tuple[NDArray[np.float64], NDArray[np.bool_], NDArray[np.bool_]]:
    """Return the values, which cells are absent, and which are no numbers."""
    absent = np.array(np.ma.getmaskarray(column), dtype=bool)
    data = np.ma.getdata(column)
    if data.dtype.kind in "iuf":
        values = np.array(data, dtype=float)
        return values, absent | np.isnan(values), np.zeros(len(values), bool)
    parsed = [np.nan if gone else _number(cell) for cell, gone in zip(data, absent, strict=True)]
    bad = np.array([value is None for value in parsed])
    values = np.array([np.nan if value is None else value for value in parsed], dtype=float)
    return values, absent | (np.isnan(values) & ~bad), bad


def _number(cell: Any) -> float | None:
    """Return a cell as a number, nan when it is blank, None when it is neither."""
    if _missing(cell):
        return np.nan
    if isinstance(cell, str | bytes):
        cell = _text(cell).strip()
        if cell.casefold() in _BLANK:
            return np.nan
    if not isinstance(cell, _NUMERIC) or isinstance(cell, bool | np.timedelta64):  # both pass as integers
        return None
    try:
        return float(cell)
    except OverflowError:
        return np.inf  # an integer beyond any float
    except (TypeError, ValueError):
        return None


def _to_internal(where: str, values: NDArray[np.float64], unit: Any, internal: str) -> NDArray[np.float64]:
    """Convert to the internal unit, in which a column without a unit already is."""
    from astropy import units as u

    if unit is None:
        return values
    target = u.Unit(internal)
    try:
        with np.errstate(all="ignore"):
            return np.array(unit.to(target, values), dtype=float)
    except (u.UnitConversionError, TypeError, ValueError, AttributeError):
        kind = "dimensionless" if not internal else f"{internal} or a unit that converts to it"
        raise InputError(
            f"{where}: the unit must be {kind}, got {str(unit)!r}; "
            "remedy: correct the unit or map another column"
        ) from None


def _missing(cell: Any) -> bool:
    """Tell the usual marks of an absent value: None, nan, pandas.NA."""
    return (
        cell is None
        or type(cell).__name__ == "NAType"
        or (isinstance(cell, float | np.floating) and bool(np.isnan(cell)))
    )


def _text(cell: Any) -> str:
    if isinstance(cell, bytes):
        return cell.decode("utf-8", errors="replace")
    try:
        return str(cell)
    except ValueError:  # Python writes no integer of thousands of digits
        return f"a {type(cell).__name__} too long to write"


def read_text(source: str, table: "Table", column: str) -> Cells:
    """Return a column of text, `raw` being the list of its cells, empty where there is nothing.

    Raises
    ------
    InputError
        When the column holds arrays.
    """
    raw = ["" if text.casefold() in _BLANK else text for text in names_of(source, table, column)]
    never = np.zeros(len(raw), bool)
    return Cells(
        column, np.full(len(raw), np.nan), np.array([not text for text in raw], bool), never, raw, ""
    )


def names_of(source: str, table: "Table", column: str) -> list[str]:
    """Return the object names as text without outer blanks, empty where there is none.

    Raises
    ------
    InputError
        When the column holds arrays.
    """
    cells = _plain(source, table, column)
    masked = np.ma.getmaskarray(cells)
    return ["" if gone else _name(cell) for cell, gone in zip(np.ma.getdata(cells), masked, strict=True)]


def _name(cell: Any) -> str:
    if _missing(cell):
        return ""
    if isinstance(cell, float | np.floating) and float(cell).is_integer():
        return str(int(cell))  # a column of whole numbers with gaps arrives as floats
    return _text(cell).strip()
