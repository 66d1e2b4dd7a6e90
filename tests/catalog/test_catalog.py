from functools import partial

import numpy as np
import pytest
from astropy.table import Table

import decayinfer.catalog
from decayinfer.catalog import FLAGS, Problem, Pulsar, read_table, summary_table
from decayinfer.errors import UnknownNameError

close = partial(pytest.approx, abs=0)  # the default allows 1e-12, more than most values here


def named(names) -> Table:
    n = len(names)
    spin = {"period": [0.1] * n, "period_derivative": [1e-14] * n}
    return Table({"name": names, **spin, "braking_index_limit": [9.0] * n})


def test_public_names():
    assert all(hasattr(decayinfer.catalog, name) for name in decayinfer.catalog.__all__)
    assert all(name == name.lower() and " " not in name for name in FLAGS)


def test_second_of_two_equal_names_is_set_aside():
    catalog = read_table(named(["A", "B", " A ", "A"]))
    assert [p.name for p in catalog.pulsars] == ["A", "B"]
    assert catalog.rows_set_aside == (3, 4)
    assert {p.rule for p in catalog.problems} == {"must be unique"}


def test_blank_names_are_no_duplicates():
    catalog = read_table(named(["A", "", "  "]))
    assert catalog.rows_set_aside == (2, 3)
    assert {p.rule for p in catalog.problems} == {"must not be empty"}


@pytest.mark.parametrize("name", ["a\nb", "a\x00b", "a\x7fb", "a\u200bb", "\ud800"])
def test_names_that_cannot_be_printed(name):
    catalog = read_table(named(np.array([name, "B"], dtype=object)))
    assert catalog.rows_set_aside == (1,)
    assert str(catalog.problems[0]).isprintable()


@pytest.mark.parametrize(
    ("names", "text"),
    [
        ([7, 8], ["7", "8"]),
        ([7.0, 8.5], ["7", "8.5"]),
        ([b"A", b"\xc3\xa9"], ["A", "é"]),
        (np.array([("t", 1), 5], dtype=object), ["('t', 1)", "5"]),
        (["Ж 1/2+3", "  B"], ["Ж 1/2+3", "B"]),
    ],
)
def test_names_become_text(names, text):
    assert [p.name for p in read_table(named(names)).pulsars] == text


def test_every_problem_of_a_row_is_reported_in_order_of_rows(sample):
    sample["period"][2] = -1.0
    sample["braking_index_err"][2] = 0.0
    sample["period_derivative"][0] = np.nan
    catalog = read_table(sample)
    assert [(p.row, p.column) for p in catalog.problems] == [
        (1, "period_derivative"),
        (3, "period"),
        (3, "braking_index_err"),
    ]
    assert [p.name for p in catalog.pulsars] == ["X2"]
    assert catalog.rows == (2,)
    assert len(catalog.table) == 3


def test_a_table_of_bad_rows_only_gives_an_empty_catalogue(sample):
    sample["period"] = ["x", "y", "z"]
    catalog = read_table(sample)
    assert len(catalog) == 0
    assert catalog.rows_set_aside == (1, 2, 3)
    assert len(summary_table(catalog)) == 0


def test_find_by_name(sample):
    catalog = read_table(sample)
    assert catalog["X2"] is catalog.pulsars[1]
    with pytest.raises(UnknownNameError, match="choose from: X1, X2, X3"):
        catalog["Y"]


def test_long_and_odd_cells_are_shown_on_one_line(one):
    problem = one(period="1\n" * 100).problems[0]
    assert str(problem).isprintable()
    assert len(problem.got) < 60


def test_sentence_of_a_problem():
    problem = Problem("t.csv", 3, "J1", "period", "must be positive", "-0.1", "correct it", "error")
    assert str(problem) == "t.csv, row 3 (J1), column period: must be positive, got -0.1; remedy: correct it"
    problem = Problem("t.csv", None, "", "", "must be one table", "two", "split it", "warning")
    assert str(problem) == "t.csv: must be one table, got two; remedy: split it"


def test_derived_quantities():
    """tau_c = P/(2 Pdot); B = 3.2e19 G (P Pdot/1 s)^(1/2), exact prefactor 3.19961e19 (from memory)."""
    pulsar = Pulsar(name="X", period=0.5, period_derivative=2e-13, braking_index=23.0)
    assert pulsar.characteristic_age == close(0.25e13 / 2 / 3.15576e7 * 1.0)
    assert pulsar.dipole_field == close(3.19961e19 * 1e-13**0.5, rel=1e-5)
    assert pulsar.decay_time == close(pulsar.characteristic_age / 5)


def test_summary(sample):
    sample["braking_index_limit"] = ["", "", "8"]
    sample["braking_index"] = [13.0, 2.5, np.nan]
    catalog = read_table(sample)
    table = summary_table(catalog)
    assert list(table["name"]) == ["X1", "X2", "X3"]
    assert (str(table["characteristic_age"].unit), str(table["field"].unit)) == ("yr", "G")
    assert str(table["decay_time"].unit) == "yr"
    assert "orthogonal vacuum rotator with R = 10 km" in table["field"].description
    ages = [p.characteristic_age for p in catalog.pulsars]
    np.testing.assert_array_equal(table["characteristic_age"], ages)
    np.testing.assert_allclose(table["decay_time"], [0.4 * ages[0], np.nan, np.nan])
    np.testing.assert_array_equal(table["braking_index_limit"], [np.nan, np.nan, 8.0])
    np.testing.assert_array_equal(table["braking_index"], [13.0, 2.5, np.nan])


def test_summary_shows_flags(one):
    assert list(summary_table(one(period_derivative=1e-16, braking_index_limit=5.0))["flags"]) == [
        "old,value-ignored"
    ]


def test_summary_can_be_written(sample, tmp_path):
    table = summary_table(read_table(sample))
    table.write(tmp_path / "s.ecsv")
    again = Table.read(tmp_path / "s.ecsv")
    assert again["field"].description == table["field"].description
