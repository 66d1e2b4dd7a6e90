"""A reduced run of tests/studies/calibration_rivals.py with the same assertions, and the full runs' results."""

import json
from pathlib import Path

import pytest

from decayinfer.channels.registry import channel_names

STUDIES = Path(__file__).parents[1] / "studies"
RIVALS = channel_names(rivals=True)


@pytest.fixture(scope="module")
def rivals(study):
    return study("calibration_rivals")


@pytest.mark.parametrize("channel", ["spin-noise", "glitch", "obliquity-vacuum"])
def test_ranks_are_uniform_and_a_wrong_prior_shows(rivals, channel):
    ranks, _, converged = rivals.calibrate(channel, 40, 12)
    assert converged == 40
    assert rivals.calibration.smallest(rivals.calibration.rank_tests(ranks)) > rivals.calibration.TAIL
    wrong, _, _ = rivals.calibrate(channel, 40, 12, priors=rivals.WRONG)
    assert rivals.calibration.smallest(rivals.calibration.rank_tests(wrong)) < rivals.calibration.TAIL


@pytest.mark.parametrize("channel", RIVALS)
def test_committed_results(rivals, channel):
    """The full study passed the same tests, and its negative control failed them."""
    record = json.loads((STUDIES / f"calibration-{channel}.json").read_text(encoding="utf-8"))
    rivals.calibration.hold(record)
