"""From a table in any form to a catalogue of pulsars."""

from collections.abc import Mapping
from os import PathLike
from typing import TYPE_CHECKING

import numpy as np

from decayinfer.catalog.catalog import Catalog
from decayinfer.catalog.cells import Cells, names_of, read_cells, read_text
from decayinfer.catalog.columns import COLUMNS, KNOWN, check_required, map_columns, nearest
from decayinfer.catalog.facts import Facts, read_facts, read_index_kind
from decayinfer.catalog.further import read_measurements
from decayinfer.catalog.index import Index, read_index
from decayinfer.catalog.ledger import Ledger
from decayinfer.catalog.loading import load
from decayinfer.catalog.pulsar import Pulsar
from decayinfer.catalog.spin import Spin, read_spin
from decayinfer.measurements import Measurement

if TYPE_CHECKING:
    from astropy.table import Table
    from pandas import DataFrame

__all__ = ["read_table"]

_TRUTH = "truth_"  # begins the columns in which an invented sample keeps what it was made of


def read_table(
    source: "str | PathLike[str] | DataFrame | Table", *, columns: Mapping[str, str] | None = None
) -> Catalog:
    """Read spin measurements.

    Every row needs a name; period and period_derivative, or frequency and frequency_derivative; and
    braking_index with braking_index_err (or braking_index_err_minus and braking_index_err_plus), or
    frequency_second_derivative with its _err, or braking_index_limit, an upper limit. The spin columns may
    have an _err too. Of what else may be known, age, surface_temperature, thermal_luminosity and obliquity come
    with _err (or _err_minus and _err_plus), or as limits _min and _max; data_span, glitch_nudot_step,
    glitch_time_since, spin_noise_log10_scale (with _err) and index_kind are facts of the timing. Units are those the
    table states; without, they are s, Hz, Hz/s, Hz/s^2, yr, K, erg/s and deg, and an error or a limit has the unit
    of its value. A row that breaks a rule is set aside and reported, the others go on; where only something
    beside spin and index is wrong, that alone is left out, and reported too.

    Parameters
    ----------
    source : path, pandas.DataFrame or astropy.table.Table
        A CSV, ECSV, VOTable or FITS file, known by its ending (.csv, .ecsv, .xml, .vot, .fits), or a table.
    columns : mapping of str to str, optional
        Column names above to the names the table uses instead.

    Returns
    -------
    Catalog
        Pulsars in internal units, every problem, and the table as read.

    Raises
    ------
    InputError
        When the table as a whole cannot be used: unreadable, no rows, a needed column missing, a unit of the
        wrong dimension.

    Examples
    --------
    >>> from astropy.table import Table
    >>> from decayinfer.catalog import read_table
    >>> rows = [("A", 0.2, 5e-14, 20.0, 1.0), ("B", -0.1, 5e-14, 8.0, 1.0)]
    >>> header = ("name", "P0", "period_derivative", "braking_index", "braking_index_err")
    >>> catalog = read_table(Table(rows=rows, names=header), columns={"period": "P0"})
    >>> catalog["A"].braking_index
    20.0
    >>> print(catalog.problems[0])
    Table, row 2 (B), column P0: must be positive, got -0.1; remedy: correct the value or remove the row
    """
    mapping = {str(ours): str(theirs) for ours, theirs in (columns or {}).items()}
    label, table, remarks = load(source, mapping.get("name", "name"))
    mapped = map_columns(label, table.colnames, mapping)
    unused = check_required(label, table.colnames, mapped)
    cells = read_cells(
        label, table, {name: mapped[name] for name in mapped if name in COLUMNS and name not in unused}
    )
    ledger = Ledger(label, names_of(label, table, mapped["name"]))
    for remark in remarks:
        ledger.remark(
            "", "the reader should have no remarks", remark, "correct the file if the remark matters"
        )
    _remark_columns(table.colnames, mapped, unused, ledger)
    period, frequency = read_spin(cells, ledger)
    index = read_index(cells, frequency, ledger)
    measurements, facts = read_measurements(cells, ledger), read_facts(cells, ledger)
    kinds = [""] * len(table)
    if "index_kind" in mapped:
        kinds = read_index_kind(read_text(label, table, mapped["index_kind"]), ledger)
    _check_names(mapped["name"], ledger)
    kept = np.flatnonzero(~ledger.aside).tolist()
    pulsars = tuple(_pulsar(row, period, index, measurements[row], facts, kinds[row], ledger) for row in kept)
    return Catalog(label, pulsars, ledger.problems(), table, tuple(row + 1 for row in kept), mapped)


def _remark_columns(found: list[str], mapped: Mapping[str, str], unused: list[str], ledger: Ledger) -> None:
    """Warn of columns that lack their partner and of those that look misspelt."""
    for name in unused:
        ledger.remark(
            mapped[name],
            "should come with the columns it belongs to",
            "it alone, so it was not used",
            "add them",
        )
    replaced = [name for name, theirs in mapped.items() if theirs != name and name in found]
    for name in replaced:
        ledger.remark(
            name, "should not stand beside the column mapped to it", f"{mapped[name]} mapped", "drop one"
        )
    free = [name for name in KNOWN if name not in mapped]
    for theirs in (name for name in found if name not in {*mapped.values(), *replaced}):
        if theirs.startswith(_TRUTH):
            continue
        near = nearest(theirs, free, cutoff=0.8)
        if near:
            remedy = f"rename it or map it with --column {near}={theirs} if it is {near}"
            ledger.remark(
                theirs, "should be a known column", f"a name near {near}, so it was not used", remedy
            )


def _check_names(column: str, ledger: Ledger) -> None:
    """Set aside rows without a name, with an unprintable one, or with one that was used before."""
    names = np.array(ledger.names, dtype=object)
    nothing = np.zeros(len(names), bool)
    cells = Cells(column, np.full(len(names), np.nan), nothing, nothing, names, "")
    empty = names == ""
    odd = np.array([not name.isprintable() for name in ledger.names])
    first = dict(reversed([(name, row) for row, name in enumerate(ledger.names)]))
    again = np.array([first[name] != row for row, name in enumerate(ledger.names)])
    ledger.refuse(empty, cells, "must not be empty", "name the object", lambda _: "nothing")
    ledger.refuse(
        odd, cells, "must hold printable characters only", "remove control characters from the name"
    )
    ledger.refuse(again & ~empty, cells, "must be unique", "rename or remove one of the rows")


def _pulsar(
    row: int,
    period: Spin,
    index: Index,
    measurements: tuple[Measurement, ...],
    facts: Facts,
    index_kind: str,
    ledger: Ledger,
) -> Pulsar:
    return Pulsar(
        name=ledger.names[row],
        period=float(period.value[row]),
        period_derivative=float(period.derivative[row]),
        period_err=float(period.value_err[row]),
        period_derivative_err=float(period.derivative_err[row]),
        braking_index=float(index.value[row]),
        braking_index_err_minus=float(index.err_minus[row]),
        braking_index_err_plus=float(index.err_plus[row]),
        braking_index_limit=float(index.limit[row]),
        measurements=measurements,
        index_kind=index_kind,
        **facts.of(row),
        flags=ledger.flags(row),
    )
