"""Whatever a table holds, it is refused as a whole with a clear error or its bad rows are set aside."""

import string

import numpy as np
import pandas as pd
import pytest
from astropy import units as u
from astropy.table import Table
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

import decayinfer.catalog.ledger as ledger_module
from decayinfer.catalog import Catalog, read_table, summary_table
from decayinfer.catalog.columns import COLUMNS
from decayinfer.errors import InputError

QUICK = settings(max_examples=150, deadline=None, derandomize=True, suppress_health_check=list(HealthCheck))

CELLS = st.one_of(
    st.floats(),
    st.floats(1e-16, 1e3),
    st.integers(),
    st.sampled_from(
        [0, -0.1, 10**400, -(10**5000), None, np.nan, np.inf, True, b"\xff", b"1.5", 1j, (), [1], {}]
    ),
    st.sampled_from(["", " ", "nan", "inf", "abc", "1e-14", "-1", "1_0", "\x00", "𝟙", "--"]),
    st.text(max_size=5),
    st.datetimes(),
    st.sampled_from([np.datetime64(5, "ns"), np.timedelta64(5, "ns"), np.float32(1.5), np.bool_(True)]),
)
NAMES = st.one_of(st.text(max_size=4), st.sampled_from(["A", "A ", "B"]), CELLS)
UNITS = st.sampled_from([None] * 100 + ["s", "ms", "Hz", "Hz/s", "m", "K", "", "dex(s)", "mag", "furlong"])


def sound(catalog: Catalog) -> None:
    """The promise: nothing lost, and what is kept can be fitted."""
    n_row = len(catalog.table)
    assert sorted([*catalog.rows, *catalog.rows_set_aside]) == list(range(1, n_row + 1))
    assert len(catalog.rows) == len(catalog.pulsars) == len(summary_table(catalog))
    assert len({p.name for p in catalog.pulsars}) == len(catalog)
    for problem in catalog.problems:
        assert str(problem).isprintable()
        assert problem.rule
        assert problem.got
        assert problem.remedy
    for p in catalog.pulsars:
        assert p.name
        assert p.name.isprintable()
        p.name.encode()
        assert all(
            0 < x < np.inf for x in (p.period, p.period_derivative, p.characteristic_age, p.dipole_field)
        )
        if np.isnan(p.braking_index):
            assert np.isfinite(p.braking_index_limit)
        else:
            assert np.isfinite(p.braking_index)
            assert 0 < p.braking_index_err_minus < np.inf
            assert 0 < p.braking_index_err_plus < np.inf


def read(source, **options) -> Catalog | None:
    try:
        catalog = read_table(source, **options)
    except InputError:
        return None
    sound(catalog)
    return catalog


@st.composite
def columns_of_cells(draw):
    n_row = draw(st.integers(0, 5))
    usual = ["name", "period", "period_derivative", "braking_index", "braking_index_err"]
    names = draw(st.sampled_from([usual, usual[:3], usual[1:], []]))
    names = [*names, *draw(st.lists(st.sampled_from([*COLUMNS, "other", "perod"]), max_size=5))]
    columns = {}
    for name in dict.fromkeys(names):
        cells = NAMES if name == "name" else draw(st.sampled_from([CELLS, st.floats(), st.floats(1e-16, 10)]))
        columns[name] = draw(st.lists(cells, min_size=n_row, max_size=n_row))
    return columns


def object_array(values: list) -> np.ndarray:
    array = np.empty(len(values), dtype=object)
    array[:] = values
    return array


@QUICK
@given(columns_of_cells(), st.data())
def test_broken_astropy_tables(columns, data):
    table = Table({name: object_array(values) for name, values in columns.items()})
    for name in table.colnames:
        unit = data.draw(UNITS)
        table[name].unit = None if unit is None else u.Unit(unit, parse_strict="silent")
    read(table)


@QUICK
@given(columns_of_cells())
def test_broken_data_frames(columns):
    read(pd.DataFrame({name: object_array(values) for name, values in columns.items()}))
    read(pd.DataFrame({name: pd.Series(values) for name, values in columns.items()}))


@QUICK
@given(columns_of_cells(), st.sampled_from([",", ",,", "\t"]))
def test_broken_csv(tmp_path_factory, columns, comma):
    path = tmp_path_factory.mktemp("broken") / "t.csv"
    rows = [list(columns), *zip(*columns.values(), strict=True)]
    text = "\n".join(comma.join(_written(cell) for cell in row) for row in rows)
    path.write_text(text, encoding="utf-8", errors="replace")
    read(path)


def _written(cell: object) -> str:
    return "huge" if isinstance(cell, int) and abs(cell) > 10**4000 else str(cell)


@QUICK
@given(st.binary(max_size=400), st.sampled_from(["csv", "ecsv", "xml", "vot", "fits", "fits.gz"]))
def test_random_bytes(tmp_path_factory, content, ending):
    path = tmp_path_factory.mktemp("bytes") / f"t.{ending}"
    path.write_bytes(content)
    assert read(path) is None or ending == "csv"


@QUICK
@given(st.data(), st.sampled_from(["csv", "ecsv", "xml", "fits"]))
def test_damaged_files(tmp_path_factory, data, ending):
    """A sound file with a few bytes overwritten, or cut short."""
    folder = tmp_path_factory.mktemp("damaged")
    rows = [("A", 0.1, 1e-14, 12.0, 0.5), ("B", 0.2, 1e-14, 13.0, 0.5)]
    table = Table(
        rows=rows, names=["name", "period", "period_derivative", "braking_index", "braking_index_err"]
    )
    path = folder / f"t.{ending}"
    table.write(path, format="votable" if ending == "xml" else None)
    content = bytearray(path.read_bytes())
    for place in data.draw(st.lists(st.integers(0, len(content) - 1), max_size=4)):
        content[place] = data.draw(st.integers(0, 255))
    path.write_bytes(content[: data.draw(st.integers(0, len(content)))])
    read(path)


@QUICK
@given(st.dictionaries(st.sampled_from([*COLUMNS, "name", "x"]), st.text(string.ascii_letters, max_size=3)))
def test_any_mapping(columns):
    table = Table({"a": ["A"], "b": [0.1], "c": [1e-14], "d": [12.0]})
    read(table, columns=columns)


def test_ten_thousand_rows(monkeypatch):
    """Rules run over whole columns: the number of calls does not depend on the number of rows."""
    rng = np.random.default_rng(3)
    calls = []
    note = ledger_module.Ledger._note
    monkeypatch.setattr(ledger_module.Ledger, "_note", lambda *a: (calls.append(1), note(*a))[1])
    counts = []
    for n_row in (10, 10_000):
        table = Table(
            {
                "name": [f"X{i}" for i in range(n_row)],
                "period": rng.uniform(-0.1, 1, n_row),
                "period_derivative": 10 ** rng.uniform(-17, -12, n_row),
                "braking_index": [f"{x:.3f}" for x in rng.normal(10, 20, n_row)],
                "braking_index_err": rng.uniform(-0.1, 20, n_row),
            }
        )
        calls.clear()
        sound(read_table(table))
        counts.append(len(calls))
    assert counts[0] == counts[1] < 50


def test_ten_thousand_bad_rows(tmp_path):
    path = tmp_path / "t.csv"
    line = "X,-1,abc,,0\n"
    path.write_text("name,period,period_derivative,braking_index,braking_index_err\n" + line * 10_000)
    catalog = read_table(path)
    sound(catalog)
    assert len(catalog) == 0


@pytest.mark.parametrize("n_column", [1000])
def test_wide_tables(sample, n_column):
    for i in range(n_column):
        sample[f"extra_{i}"] = [1.0, 2.0, 3.0]
    assert len(read_table(sample)) == 3
