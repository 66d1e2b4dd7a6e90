"""The evidence of a fit is that of a nested sampler (Skilling 2006, Bayesian Anal. 1, 833)."""

import json
from pathlib import Path

import pytest

STUDIES = Path(__file__).parents[1] / "studies"


@pytest.mark.slow
def test_one_object_and_channel(study):
    nested = study("evidence_nested")
    row = nested.compare(nested.OBJECTS[0], nested.CHANNELS[0], live=150)
    assert row["status"] == "ok"
    assert row["nested_err"] < 0.3
    assert abs(row["pull"]) < nested.SIGMAS, row


def test_the_full_study_passed(study):
    """Two objects and two channels within three standard errors."""
    nested = study("evidence_nested")
    rows = json.loads((STUDIES / "evidence_nested.json").read_text(encoding="utf-8"))["rows"]
    assert {(row["object"], row["channel"]) for row in rows} == {
        (star.name, channel) for star in nested.OBJECTS for channel in nested.CHANNELS
    }
    for row in rows:
        assert row["status"] == "ok"
        assert abs(row["pull"]) < nested.SIGMAS, row
