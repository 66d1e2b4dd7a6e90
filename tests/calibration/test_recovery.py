"""The arithmetic of tests/studies/recovery.py."""

import numpy as np
import pytest


@pytest.fixture(scope="module")
def recovery(study):
    return study("recovery")


def test_probabilities_sum_to_one_and_leave_out_what_failed(recovery):
    chances = recovery.probabilities({"a": -1.0, "b": float("nan"), "c": -np.inf, "d": -2.0})
    assert set(chances) == {"a", "c", "d"}
    assert sum(chances.values()) == pytest.approx(1.0)
    assert chances["a"] / chances["d"] == pytest.approx(np.e)
    tilted = recovery.probabilities({"a": -1.0, "d": -2.0}, {"d": 1.0})
    assert tilted["a"] == pytest.approx(0.5)
