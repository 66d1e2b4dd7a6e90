"""Columns, units and bytes of the tables."""

import warnings

import numpy as np
import pytest
from astropy import units as u
from astropy.table import Table

from decayinfer.errors import InputError, RunFolderError
from decayinfer.results.tables import (
    CHANNEL_COLUMNS,
    PARAMETER_COLUMNS,
    Column,
    any_to_ecsv,
    object_columns,
    save_table,
    to_ecsv,
    to_table,
)

COLUMNS = (Column("name", "who", kind=str), Column("x", "what", "yr"), Column("k", "count", kind=int))


def test_columns_of_channels_and_parameters():
    evidence = "ln_evidence ln_evidence_err ln_evidence_joint probability"
    diagnostics = "ess_bulk_min r_hat_max divergences status"
    channels = f"object scenario channel {evidence} {diagnostics}".split()
    quantiles = "prior_q05 prior_q50 prior_q95 mean sd q05 q16 q50 q84 q95"
    parameters = f"object scenario channel parameter unit {quantiles} ess_bulk r_hat".split()
    assert [c.name for c in CHANNEL_COLUMNS][: len(channels)] == channels
    assert [c.name for c in PARAMETER_COLUMNS][: len(parameters)] == parameters


def test_columns_of_objects():
    names = [c.name for c in object_columns(("hall", "phonon+hall"))]
    assert names[0] == "object"
    assert names[-2:] == ["verdict", "flags"]
    assert {"probability_hall", "probability_phonon+hall", "mass_prior_q95", "phonon_time_q50"} <= set(names)


def test_units_and_descriptions_survive_the_file():
    rows = [{"name": 'A, "b"', "x": 1.0 / 3.0, "k": 3}, {"name": "", "x": np.nan, "k": 0}]
    back = Table.read(to_ecsv(to_table(rows, COLUMNS)), format="ascii.ecsv")
    assert (str(back["x"].unit), back["x"].description) == ("yr", "what")
    assert back["name"][0] == 'A, "b"'
    assert back["x"][0] == 0.3333333333
    assert np.isnan(back["x"][1])
    assert back["k"].dtype == np.int64


def test_last_bits_do_not_change_the_bytes():
    one = [{"name": "A", "x": 0.1 + 0.2, "k": 1}]
    other = [{"name": "A", "x": 0.3, "k": 1}]
    assert one != other
    assert to_ecsv(to_table(one, COLUMNS)) == to_ecsv(to_table(other, COLUMNS))


def test_any_table_can_be_kept():
    table = Table({"name": ["A", "B"], "x": [1.5, 2.5]})
    assert any_to_ecsv(table) == to_ecsv(table)
    table["odd"] = [object(), {1}]
    table.meta["note"] = object()
    assert any_to_ecsv(table) == any_to_ecsv(table.copy())
    back = Table.read(any_to_ecsv(table), format="ascii.ecsv")
    assert list(back["odd"]) == ["<object object>", "{1}"]
    assert back.meta["note"] == "<object object>"
    assert list(back["x"]) == [1.5, 2.5]


def test_an_empty_table_keeps_its_columns():
    back = Table.read(to_ecsv(to_table([], PARAMETER_COLUMNS)), format="ascii.ecsv")
    assert back.colnames == [c.name for c in PARAMETER_COLUMNS]
    assert len(back) == 0


@pytest.mark.parametrize("ending", [".ecsv", ".csv", ".fits", ".xml", ".vot"])
def test_save_table_knows_formats_by_ending(tmp_path, ending):
    path = tmp_path / f"t{ending}"
    save_table(Table({"name": ["A", "B"], "x": [1.0, 2.5], "B": [1e12, 1e13] * u.G}), path)
    kind = {".csv": "ascii.csv", ".ecsv": "ascii.ecsv", ".fits": "fits"}.get(ending, "votable")
    with warnings.catch_warnings():
        warnings.simplefilter("ignore", u.UnitsWarning)
        assert list(Table.read(path, format=kind)["x"]) == [1.0, 2.5]


def test_save_table_refuses_other_endings_and_never_overwrites(tmp_path):
    table = Table({"x": [1.0]})
    with pytest.raises(InputError, match=r"must end in one of \.ecsv, \.csv"):
        save_table(table, tmp_path / "t.txt")
    save_table(table, tmp_path / "t.csv")
    with pytest.raises(RunFolderError, match="exists already"):
        save_table(table, tmp_path / "t.csv")
