"""The short table at the end of a run."""

import numpy as np
import pytest

from decayinfer.results import listing as module
from decayinfer.results.flags import FLAGS
from decayinfer.results.listing import HEADER, flag_legend, listing, time_text
from decayinfer.results.read import read_run
from decayinfer.results.run import run_fit


def test_a_row_per_object(tmp_path, engine, catalogue, settings):
    run = read_run(run_fit(catalogue("A", "unreachable"), tmp_path / "run", settings).path)
    first, second = (dict(zip(HEADER, row, strict=True)) for row in listing(run))
    assert (first["object"], first["n"], first["tau_c"]) == ("A", "20.0 ± 1.0", "63.4 kyr")
    assert first["most probable channel"] == "phonon+hall 0.61"
    assert second["most probable channel"] == "none"
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
    assert module._index({"braking_index": n, "err_minus": minus, "err_plus": plus, "limit": np.nan}) == text


def test_an_upper_limit_is_shown_as_one():
    row = {"braking_index": np.nan, "err_minus": np.nan, "err_plus": np.nan, "limit": 30.0}
    assert module._index(row) == "< 30"


def test_times():
    assert time_text(999.0) == "999 yr"
    assert time_text(1e3) == "1 kyr"
    assert time_text(3e4, 4.2e5) == "30-420 kyr"
    assert time_text(1.2e9) == "1200 Myr"
    assert time_text(np.nan, 1.0) == "-"
