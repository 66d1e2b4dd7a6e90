"""A reduced run of tests/studies/calibration.py with the same assertions, and the full run's results."""

import json
from pathlib import Path

import pytest

from decayinfer.inference.settings import FitSettings

STUDIES = Path(__file__).parents[1] / "studies"
CHANNELS = ("phonon", "impurity+phonon", "impurity+phonon+hall")


@pytest.fixture(scope="module")
def calibration(study):
    return study("calibration")


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
    calibration.hold(json.loads((STUDIES / f"calibration-{channel}.json").read_text(encoding="utf-8")))
