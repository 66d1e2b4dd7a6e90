"""From a file or an object in memory to an astropy Table."""

import csv
import gzip
import sys
import warnings
import zlib
from collections import Counter
from collections.abc import Callable, Sequence
from io import BytesIO
from os import PathLike, fspath
from pathlib import Path
from typing import TYPE_CHECKING, Any

from decayinfer.errors import InputError

if TYPE_CHECKING:
    from astropy.table import Table

__all__ = ["load"]


def load(source: object, text_column: str) -> tuple[str, "Table", tuple[str, ...]]:
    """Return a table as it stands, untouched by any rule.

    Parameters
    ----------
    source : path, pandas.DataFrame or astropy.table.Table
        What `read_table` was given.
    text_column : str
        Column of a CSV file that is text whatever it looks like: names such as 1E1048 are no numbers.

    Returns
    -------
    label : str
        The path as given, or the kind of object.
    table : astropy.table.Table
        Every column of the source, with units where it has them.
    remarks : tuple of str
        What the reader warned about, such as a unit it does not know.

    Raises
    ------
    InputError
        When the source is no table, or has no rows.
    """
    if isinstance(source, str | PathLike):
        label = fspath(source)
        label = label if isinstance(label, str) else label.decode(errors="replace")
        path = Path(label)
        read = _reader(label, path)
        data = _bytes(label, path)
        action: Callable[[], Table] = lambda: read(data, text_column)  # noqa: E731
    else:
        label = type(source).__name__
        action = _converter(source)
    table, remarks = _guarded(label, action)
    if len(table) == 0:
        raise InputError(f"{label}: the table has no rows; remedy: give at least one object")
    return label, table, remarks


def _guarded(label: str, action: "Callable[[], Table]") -> tuple["Table", tuple[str, ...]]:
    """Run a foreign reader: its errors become InputError, its warnings remarks."""
    with warnings.catch_warnings(record=True) as caught:
        warnings.simplefilter("always")
        try:
            table = action()
        except Exception as error:  # what readers raise on broken files is not documented
            reason = " ".join(str(error).split())[:300] or type(error).__name__
            raise InputError(
                f"{label}: the table cannot be read ({reason}); "
                "remedy: correct it, or write it in another format"
            ) from error
    remarks = (
        " ".join(str(w.message).split()) for w in caught if not issubclass(w.category, ResourceWarning)
    )
    return table, tuple(dict.fromkeys(remarks))


def _bytes(label: str, path: Path) -> bytes:
    try:
        data = path.read_bytes()
        return gzip.decompress(data) if data[:2] == b"\x1f\x8b" else data
    except FileNotFoundError:
        raise InputError(f"{label}: there is no such file; remedy: check the path") from None
    except (OSError, EOFError, ValueError, zlib.error) as error:
        raise InputError(
            f"{label}: the file cannot be read ({error}); remedy: check the path and its rights"
        ) from error


def _reader(label: str, path: Path) -> "Callable[[bytes, str], Table]":
    suffixes = [suffix.lower() for suffix in path.suffixes]
    ending = (suffixes[:-1] if suffixes[-1:] == [".gz"] else suffixes)[-1:]
    if not ending or ending[0] not in _READERS:
        raise InputError(
            f"{label}: a table file must end in one of {', '.join(_READERS)}, "
            f"got {''.join(ending) or 'no ending'!r}; remedy: rename or convert the file"
        )
    return _READERS[ending[0]]


def _csv(data: bytes, text_column: str) -> "Table":
    from astropy.table import Table

    text = data.decode("utf-8-sig") + "\n"  # the line break tells astropy that this is content, not a path
    if text.startswith("# %ECSV"):
        return Table.read(text, format="ascii.ecsv")
    lines = (line for line in text.splitlines() if line.strip() and not line.lstrip().startswith("#"))
    _check_distinct([name.strip() for name in next(csv.reader(lines), [])])
    return Table.read(text, format="ascii.csv", comment="#", converters={text_column: str})


def _ecsv(data: bytes, _: str) -> "Table":
    from astropy.table import Table

    return Table.read(data.decode("utf-8-sig") + "\n", format="ascii.ecsv")


def _fits(data: bytes, _: str) -> "Table":
    from astropy.table import Table

    return Table.read(BytesIO(data), format="fits", character_as_bytes=False)


def _votable(data: bytes, _: str) -> "Table":
    from astropy.io.votable import parse

    tables = list(parse(BytesIO(data)).iter_tables())
    if not tables:
        raise ValueError("it holds no table")
    if len(tables) > 1:
        warnings.warn(f"the file holds {len(tables)} tables; the first was read", UserWarning, stacklevel=2)
    return tables[0].to_table(use_names_over_ids=True)


_READERS: "dict[str, Callable[[bytes, str], Table]]" = {
    ".csv": _csv,
    ".ecsv": _ecsv,
    ".xml": _votable,
    ".vot": _votable,
    ".votable": _votable,
    ".fits": _fits,
    ".fit": _fits,
}


def _converter(source: Any) -> "Callable[[], Table]":
    from astropy.table import Table

    if isinstance(source, Table):
        return lambda: Table(source)  # a QTable's quantities become columns with units
    pandas = sys.modules.get("pandas")  # a DataFrame can only exist once pandas is loaded
    if pandas is not None and isinstance(source, pandas.DataFrame):
        return lambda: _from_pandas(source)
    raise InputError(
        f"a table must be a path, a pandas DataFrame or an astropy Table, got {type(source).__name__}; "
        "remedy: wrap the data as one of these"
    )


def _from_pandas(frame: Any) -> "Table":
    from astropy.table import Table

    index = frame.index
    if index.names != [None] or index.dtype.kind not in "iu":  # plain row numbers are no data
        frame = frame.reset_index()
    names = [str(name) for name in frame.columns]
    _check_distinct(names)
    return Table.from_pandas(frame.set_axis(names, axis=1))


def _check_distinct(names: Sequence[str]) -> None:
    repeated = [name for name, count in Counter(names).items() if count > 1]
    if repeated:
        raise ValueError(f"column names must differ, got {', '.join(map(repr, repeated))} more than once")
