import pytest

from decayinfer.catalog import read_table
from decayinfer.errors import InputError


def test_mapping_reads_the_users_names(sample):
    sample.rename_columns(["name", "period", "braking_index_err"], ["PSR", "P0", "sigma"])
    columns = {"name": "PSR", "period": "P0", "braking_index_err": "sigma"}
    catalog = read_table(sample, columns=columns)
    assert [p.name for p in catalog.pulsars] == ["X1", "X2", "X3"]
    assert catalog.problems == ()
    assert catalog.table.colnames == sample.colnames
    assert catalog.columns["period"] == "P0"
    assert catalog.columns["period_derivative"] == "period_derivative"


def test_problems_speak_of_the_users_names(sample):
    sample.rename_column("period", "P0")
    sample["P0"][2] = -0.1
    problem = read_table(sample, columns={"period": "P0"}).problems[0]
    assert problem.column == "P0"
    assert str(problem) == (
        "Table, row 3 (X3), column P0: must be positive, got -0.1; "
        "remedy: correct the value or remove the row"
    )


def test_mapping_wins_over_the_tables_own_column(sample):
    sample["P0"] = 2 * sample["period"]
    catalog = read_table(sample, columns={"period": "P0"})
    assert catalog.pulsars[0].period == 0.2
    assert [p.column for p in catalog.problems] == ["period"]


def test_unknown_quantity_in_a_mapping(sample):
    with pytest.raises(InputError, match="did you mean 'period_derivative'"):
        read_table(sample, columns={"period_derivate": "period"})
    with pytest.raises(InputError, match="choose from: name, period"):
        read_table(sample, columns={"colour": "period"})


def test_mapping_to_a_column_that_is_not_there(sample):
    with pytest.raises(InputError, match=r"no column 'perod'; it has 'name'.*nearest: 'period' for perod"):
        read_table(sample, columns={"period": "perod"})


@pytest.mark.parametrize(
    ("old", "new", "says"),
    [
        ("name", "Nam", "needs column name; .*'Nam' for name"),
        (
            "period",
            "Perio",
            "period with period_derivative, or frequency with frequency_derivative; .*'Perio' for period",
        ),
        ("braking_index", "n", "braking_index with braking_index_err, or"),
        ("braking_index_err", "Braking_Index_Eror", "'Braking_Index_Eror' for braking_index_err"),
    ],
)
def test_missing_column(sample, old, new, says):
    sample.rename_column(old, new)
    with pytest.raises(InputError, match=says) as caught:
        read_table(sample)
    assert "'distance_note'" in str(caught.value)
    assert "remedy: " in str(caught.value)


@pytest.mark.parametrize("theirs", ["Frequency", "surface_temprature", "braking_index_limt", "AGE", "agee"])
def test_likely_misspelling(sample, theirs):
    sample[theirs] = [1.0, 1.0, 1.0]
    catalog = read_table(sample)
    assert len(catalog) == 3
    (problem,) = catalog.problems
    assert (problem.column, problem.row, problem.severity) == (theirs, None, "warning")
    assert f"={theirs}" in problem.remedy


def test_unlike_columns_are_kept_in_silence(sample):
    sample["colour"] = [1.0, 1.0, 1.0]
    sample["age"] = [1.0, 2.0, 3.0]
    sample["age_err"] = [0.1, 0.2, 0.3]
    catalog = read_table(sample)
    assert catalog.problems == ()
    assert list(catalog.table["age"]) == [1.0, 2.0, 3.0]


def test_a_column_without_its_partner_is_reported(sample):
    sample["frequency"] = [10.0, 4.0, 2.0]
    sample["frequency_second_derivative"] = [1.0, 1.0, 1.0]
    sample["braking_index_err_minus"] = [1.0, 1.0, 1.0]
    catalog = read_table(sample)
    assert {p.column for p in catalog.problems} == {
        "frequency",
        "frequency_second_derivative",
        "braking_index_err_minus",
    }
    assert catalog.pulsars[0].braking_index_err_minus == 0.5
