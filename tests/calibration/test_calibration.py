"""A reduced run of tests/studies/calibration.py with the same assertions, and the full run's results."""

import importlib.util
import json
import sys
from pathlib import Path

import pytest

from decayinfer.inference.settings import FitSettings

STUDIES = Path(__file__).parents[1] / "studies"
CHANNELS = ("phonon", "impurity+phonon", "impurity+phonon+hall")


@pytest.fixture(scope="module")
def calibration():
    spec = importlib.util.spec_from_file_location("calibration", STUDIES / "calibration.py")
    module = importlib.util.module_from_spec(spec)
    sys.modules["calibration"] = module
    spec.loader.exec_module(module)
    return module


@pytest.mark.slow
def test_ranks_are_uniform_and_a_wrong_prior_shows(calibration):
    # the first objects of the full run
    settings = FitSettings(draws=400, tune=250)
    ranks, _, converged = calibration.calibrate("phonon", 60, 2026, settings=settings)
    assert converged >= 57
    assert calibration.smallest(calibration.rank_tests(ranks)) > calibration.TAIL
    wrong, _, _ = calibration.calibrate("phonon", 60, 2026, settings=settings, priors=calibration.WRONG)
    assert calibration.smallest(calibration.rank_tests(wrong)) < calibration.TAIL


@pytest.mark.parametrize("channel", CHANNELS)
def test_committed_results(calibration, channel):
    """The full study passed the same tests, and its negative control failed them."""
    record = json.loads((STUDIES / f"calibration-{channel}.json").read_text(encoding="utf-8"))
    assert record["settings"]["simulations"] >= 200
    ranks = {
        label: {row["parameter"]: row["ranks"] for row in record["rows"] if row["prior"] == label}
        for label in ("right prior", "wrong prior")
    }
    assert calibration.smallest(calibration.rank_tests(ranks["right prior"])) > calibration.TAIL
    assert calibration.smallest(calibration.rank_tests(ranks["wrong prior"])) < calibration.TAIL
    for row in record["rows"]:
        if row["prior"] == "right prior":
            assert row["converged"] >= 0.95 * record["settings"]["simulations"]
            assert abs(row["coverage_90"] - 0.9) < 3.3 * (0.9 * 0.1 / 200) ** 0.5 + 0.02
