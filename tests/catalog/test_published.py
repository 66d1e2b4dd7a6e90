"""Published pulsars: the files name the paper of every row."""

import numpy as np
import pytest

from decayinfer.catalog import read_table, summary_table

COLUMNS = {
    "name": "psr",
    "frequency": "f0_hz",
    "frequency_derivative": "f1_hz_s",
    "frequency_derivative_err": "f1_err",
    "frequency_second_derivative": "f2_hz_s2",
    "frequency_second_derivative_err": "f2_err",
}


@pytest.mark.parametrize("with_period", [False, True])
def test_large_indices_from_the_frequency(data, with_period):
    """Parthasarathy et al. 2019, MNRAS 489, 3810; digits: ATNF Pulsar Catalogue v1.67 (2022)."""
    columns = COLUMNS | ({"period": "period_s"} if with_period else {})
    catalog = read_table(data / "braking_index_above_3.csv", columns=columns)
    table = catalog.table
    assert catalog.rows == (1, 2, 3, 4, 5, 6)
    np.testing.assert_allclose([p.braking_index for p in catalog.pulsars], table["n"], rtol=5e-4)
    np.testing.assert_allclose([p.braking_index_err for p in catalog.pulsars], table["n_err"], rtol=5e-3)
    np.testing.assert_allclose([p.period for p in catalog.pulsars], table["period_s"], rtol=1e-11)
    derivatives = [p.period_derivative for p in catalog.pulsars]
    np.testing.assert_allclose(derivatives, table["period_derivative"], rtol=1e-8)
    np.testing.assert_allclose(summary_table(catalog)["characteristic_age"], table["tau_c_yr"], rtol=1e-4)
    assert all(p.flags == () for p in catalog.pulsars)


def test_large_indices_as_given_agree_with_the_frequency(data):
    columns = COLUMNS | {"period": "period_s", "braking_index": "n", "braking_index_err": "n_err"}
    catalog = read_table(data / "braking_index_above_3.csv", columns=columns)
    assert len(catalog) == 6
    assert catalog.problems == ()


def test_small_indices(data):
    """Papers in the file; an object with several published indices is read once, the rest set aside."""
    columns = {"name": "psr", "period": "period_s", "braking_index": "n", "braking_index_err": "n_err"}
    catalog = read_table(data / "braking_index_below_3.csv", columns=columns)
    names = list(catalog.table["psr"])
    assert [p.name for p in catalog.pulsars] == list(dict.fromkeys(names))
    assert {p.rule for p in catalog.problems} == {"must be unique"}
    assert len(catalog) + len(catalog.rows_set_aside) == len(names)
    assert catalog["J0534+2200"].braking_index == 2.342
    assert catalog["J0534+2200"].characteristic_age == pytest.approx(1257, abs=2)
