import gzip
from pathlib import Path

import numpy as np
import pandas as pd
import pytest
from astropy import units as u
from astropy.io.votable import from_table
from astropy.io.votable.tree import Resource
from astropy.table import MaskedColumn, QTable, Table

from decayinfer.catalog import Catalog, read_table
from decayinfer.errors import InputError

FORMATS = {
    "t.csv": "ascii.csv",
    "t.ecsv": "ascii.ecsv",
    "t.fits": "fits",
    "t.fit": "fits",
    "t.xml": "votable",
    "t.vot": "votable",
}


def same(catalog: Catalog, sample: Table) -> None:
    assert [p.name for p in catalog.pulsars] == ["X1", "X2", "X3"]
    for column in ("period", "period_derivative", "braking_index"):
        np.testing.assert_allclose([getattr(p, column) for p in catalog.pulsars], sample[column], rtol=1e-14)
    for side in ("minus", "plus"):
        errors = [getattr(p, f"braking_index_err_{side}") for p in catalog.pulsars]
        np.testing.assert_array_equal(errors, sample["braking_index_err"])
    assert catalog.rows == (1, 2, 3)
    assert catalog.problems == ()
    assert catalog.table.colnames == sample.colnames
    assert list(catalog.table["distance_note"]) == ["near", "far", "far"]


@pytest.mark.parametrize("file", FORMATS)
@pytest.mark.parametrize("packed", [False, True])
def test_every_file_format_gives_the_same_catalogue(sample, tmp_path, file, packed):
    path = tmp_path / file
    sample.write(path, format=FORMATS[file])
    if packed:
        path = tmp_path / f"{file}.gz"
        path.write_bytes(gzip.compress((tmp_path / file).read_bytes()))
    same(read_table(path), sample)
    assert read_table(str(path)).source == str(path)


@pytest.mark.parametrize("file", ["t.ecsv", "t.fits", "t.xml"])
def test_units_of_a_file_are_kept(sample, tmp_path, file):
    table = QTable(sample)
    table["period"] = sample["period"] * 1e3 * u.ms
    table.write(tmp_path / file, format=FORMATS[file])
    catalog = read_table(tmp_path / file)
    same(catalog, sample)
    assert catalog.table["period"].unit == u.ms


def test_tables_in_memory(sample):
    same(read_table(sample), sample)
    same(read_table(QTable(sample)), sample)
    same(read_table(sample.to_pandas()), sample)
    same(read_table(sample.to_pandas().set_index("name")), sample)
    same(read_table(sample.to_pandas().query("period > 0")), sample)
    numbered = sample.to_pandas().assign(name=[7, 8, 9]).set_index("name")
    assert [p.name for p in read_table(numbered).pulsars] == ["7", "8", "9"]


def test_the_table_given_is_not_touched(sample):
    catalog = read_table(sample)
    catalog.table["period"][0] = 7.0
    assert sample["period"][0] == 0.1


def test_masked_quantities_and_gaps(sample):
    table = QTable(sample, masked=True)
    table["period"] = np.ma.array([100.0, 250.0, 1.0], mask=[False, False, True])
    table["period"].unit = u.ms
    catalog = read_table(table)
    assert [p.period for p in catalog.pulsars] == [0.1, 0.25]
    assert "row 3 (X3), column period: must be given, got nothing" in str(catalog.problems[0])


def test_pandas_types_of_the_user(one):
    frame = pd.DataFrame(
        {
            "name": ["a", None, pd.NA, "d"],
            "period": pd.array([1, 2, 3, None], dtype="Int64"),
            "period_derivative": pd.array(["1e-14", "2e-14", "3e-14", None], dtype="string"),
            "braking_index_limit": [9, 9.0, 9, 9],
            "group": pd.Categorical(["x", "y", "x", "y"]),
            5: [1, 2, 3, 4],
        }
    )
    catalog = read_table(frame)
    assert [(p.name, p.period, p.braking_index_limit) for p in catalog.pulsars] == [("a", 1.0, 9.0)]
    assert catalog.rows_set_aside == (2, 3, 4)
    assert "5" in catalog.table.colnames


def test_csv_as_people_write_it(tmp_path):
    head = "name,period,period_derivative,braking_index,braking_index_err\n"
    body = 'X,0.1,1e-14,12,0.5\n"1E1048",0.2,1e-14,12,0.5\n0042,0.3,1e-14,12,0.5\n1e999,n/a,*,12,0.5\n'
    path = tmp_path / "t.csv"
    path.write_bytes(b"\xef\xbb\xbf# measured in spring\r\n" + (head + body).replace("\n", "\r\n").encode())
    catalog = read_table(path)
    assert [p.name for p in catalog.pulsars] == ["X", "1E1048", "0042"]
    assert [(p.row, p.column) for p in catalog.problems] == [(4, "period"), (4, "period_derivative")]


def test_mapped_name_column_of_a_csv_is_text(tmp_path):
    path = tmp_path / "t.csv"
    path.write_text("psr,period,period_derivative,braking_index_limit\n007,1,1e-14,9\n")
    assert read_table(path, columns={"name": "psr"}).pulsars[0].name == "007"


def test_ecsv_content_under_a_csv_ending(sample, tmp_path):
    sample["period"].unit = "s"
    sample.write(tmp_path / "t.ecsv", format="ascii.ecsv")
    path = (tmp_path / "t.ecsv").rename(tmp_path / "t.csv")
    assert read_table(path).table["period"].unit == u.s


def test_bytes_as_names(sample):
    sample["name"] = np.array([b"X1 ", b"X2", b"X3"])
    same(read_table(sample), sample)


def test_second_table_of_a_votable_is_mentioned(sample, tmp_path):
    votable, other = from_table(sample), from_table(sample[:1])
    votable.resources.append(Resource())
    votable.resources[1].tables.append(other.get_first_table())
    votable.to_xml(str(tmp_path / "t.xml"))
    catalog = read_table(tmp_path / "t.xml")
    assert len(catalog) == 3
    assert [p.got for p in catalog.problems] == ["the file holds 2 tables; the first was read"]
    assert catalog.problems[0].severity == "warning"
    assert catalog.problems[0].row is None


@pytest.mark.parametrize(
    ("file", "content", "says"),
    [
        ("t.csv", b"", "cannot be read"),
        ("t.csv", b"name,period,period_derivative,braking_index_limit\n", "no rows"),
        ("t.csv", b"name,name\n1,2\n", "'name' more than once"),
        ("t.csv", b"name,period\n1,2,3\n", "cannot be read"),
        ("t.csv", b"\xff\xfe\x00", "cannot be read"),
        ("t.ecsv", b"name\nX\n", "cannot be read"),
        ("t.xml", b"<html/>", "cannot be read"),
        ("t.fits", b"SIMPLE", "cannot be read"),
        ("t.csv.gz", b"\x1f\x8b\x00", "cannot be read"),
        ("t.dat", b"name\nX\n", "must end in one of .csv, .ecsv"),
        ("t", b"name\nX\n", "no ending"),
    ],
)
def test_unreadable_files(tmp_path, file, content, says):
    path = tmp_path / file
    path.write_bytes(content)
    with pytest.raises(InputError, match=says) as caught:
        read_table(path)
    assert str(caught.value).startswith(str(path))
    assert "remedy: " in str(caught.value)


def test_votable_columns_go_by_name_not_by_id(sample, tmp_path):
    votable = from_table(sample)
    for field in votable.get_first_table().fields:
        field.ID = f"col_{field.ID}"
    votable.to_xml(str(tmp_path / "t.xml"))
    same(read_table(tmp_path / "t.xml"), sample)


def test_votable_without_a_table(tmp_path):
    path = tmp_path / "t.xml"
    path.write_text('<VOTABLE version="1.4" xmlns="http://www.ivoa.net/xml/VOTable/v1.3"></VOTABLE>')
    with pytest.raises(InputError, match=r"t\.xml: .*no table"):
        read_table(path)


@pytest.mark.parametrize("source", ["missing.csv", Path("missing.fits")])
def test_missing_file(source):
    with pytest.raises(InputError, match="no such file"):
        read_table(source)


def test_a_folder_and_a_path_that_cannot_be(tmp_path):
    (tmp_path / "t.csv").mkdir()
    for path in (tmp_path / "t.csv", "a\0.csv"):
        with pytest.raises(InputError, match="file cannot be read"):
            read_table(path)


def test_what_is_no_table():
    with pytest.raises(InputError, match="got list"):
        read_table([1, 2])


def test_repeated_names_in_a_data_frame():
    with pytest.raises(InputError, match="'a' more than once"):
        read_table(pd.DataFrame([[1, 2]], columns=["a", "a"]))


def test_a_cell_that_holds_an_array(sample):
    sample["period"] = MaskedColumn(np.ones((3, 2)))
    with pytest.raises(InputError, match="column period: each cell must hold one value"):
        read_table(sample)
