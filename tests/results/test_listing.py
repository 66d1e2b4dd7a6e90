"""The short table at the end of a run."""

import numpy as np
import pytest

from decayinfer.results.flags import FLAGS
from decayinfer.results.listing import (
    CHECK_HEADER,
    HEADER,
    check_listing,
    flag_legend,
    index_text,
    listing,
    time_text,
)
from decayinfer.results.read import read_run
from decayinfer.results.run import run_fit


def test_a_row_per_object(tmp_path, engine, catalogue, settings):
    run = read_run(run_fit(catalogue("A", "unreachable"), tmp_path / "run", settings).path)
    first, second = (dict(zip(HEADER, row, strict=True)) for row in listing(run))
    assert (first["object"], first["n"], first["tau_c"]) == ("A", "20.0 ± 1.0", "63.4 kyr")
    # ln evidences in two scenarios: phonon -2.547, -2.039; phonon+hall -4.477, -5.175
    assert first["most probable channel"] == "phonon 0.92"
    assert second["most probable channel"] == "none"
    assert second["any decay"] == "-"
    assert second["flags"] == "no-channel"
    assert second["mass 90 % [Msun]"] == second["prior"] == second["phonon time 90 %"] == "-"
    assert flag_legend(run)["no-channel"] == FLAGS["no-channel"].meaning


@pytest.mark.parametrize(
    ("n", "minus", "plus", "text"),
    [
        (43.21, 1.1, 1.1, "43.2 ± 1.1"),
        (2887.0, 120.0, 120.0, "2887 ± 120"),
        (3.15, 0.03, 0.03, "3.150 ± 0.030"),
        (20.0, 1.0, 2.5, "20.0 +2.5 -1.0"),
    ],
)
def test_index_has_the_digits_of_its_error(n, minus, plus, text):
    assert index_text(n, minus, plus, np.nan) == text


def test_an_upper_limit_is_shown_as_one():
    assert index_text(np.nan, np.nan, np.nan, 30.0) == "< 30"


def test_a_catalogue_in_short(catalogue):
    row = dict(zip(CHECK_HEADER, check_listing(catalogue("A"))[0], strict=True))
    # tau_c = 0.2 s / (2 5e-14) = 2e12 s; decay time 4 tau_c / 17; B = 3.2e19 G (P Pdot)^(1/2)
    assert (row["tau_c"], row["decay time 4 tau_c/(n - 3)"], row["B [G]"]) == (
        "63.4 kyr",
        "14.9 kyr",
        "3.20e+12",
    )


def test_times():
    assert time_text(999.0) == "999 yr"
    assert time_text(1e3) == "1 kyr"
    assert time_text(3e4, 4.2e5) == "30-420 kyr"
    assert time_text(1.2e9) == "1200 Myr"
    assert time_text(np.nan, 1.0) == "-"
