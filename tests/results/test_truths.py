"""Truths of an invented sample against the intervals."""

import numpy as np
import pytest
from astropy import units as u

from decayinfer.catalog import read_table
from decayinfer.results.read import read_run
from decayinfer.results.run import run_fit
from decayinfer.results.truths import coverage


@pytest.fixture
def covered(tmp_path, engine, catalogue, settings):
    """Coverage of objects A and B for the given truth columns."""

    def fit(**truths):
        table = catalogue("A", "B").table
        for name, values in truths.items():
            table[f"truth_{name}"] = values
        return coverage(read_run(run_fit(read_table(table), tmp_path / "run", settings).path))

    return fit


def test_truths_inside_and_outside_are_counted(covered):
    # The fake posterior of the mass is 1.3 +- 0.1, that of the phonon time 1e5 within a factor three.
    found = covered(mass=[1.3, 1.9], phonon_time=[1e5, np.nan])
    assert found.by_parameter == {"mass": (1, 2), "phonon_time": (1, 1)}
    assert (found.inside, found.total) == (2, 3)


def test_units_of_the_table_count(covered):
    found = covered(phonon_time=[0.1, 100.0] * u.Myr)
    assert found.by_parameter == {"phonon_time": (1, 2)}


def test_parameters_that_no_channel_defines_are_left_out(covered):
    assert covered(impurity_parameter=[1.0, 1.0]) is None


def test_no_truths_no_coverage(covered):
    assert covered() is None
