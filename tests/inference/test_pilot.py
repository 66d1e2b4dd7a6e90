"""A broad look at a density finds the modes that chains can miss."""

import numpy as np
import pytest
from scipy import stats

from decayinfer.inference.density import evaluate
from decayinfer.inference.explore import explore
from decayinfer.inference.importance import importance_sample
from decayinfer.inference.pilot import disagreement, pilot
from decayinfer.inference.settings import FitSettings

SPENT = -0.5  # ln(t_a/t) below which the Hall attractor was passed long ago


@pytest.mark.parametrize("channel", ["hall", "impurity+hall"])
def test_both_modes_of_hall_drift_are_in_the_pilot(tools, channel):
    """Drift that goes on, and an attractor passed long ago: 11 % and 7 % of the stars of this spin."""
    numbers = tools.problem(channel, braking_index=12.0).without_index()
    points = pilot(numbers, np.random.default_rng(1))
    assert 0.02 < np.mean(points[:, 5] < SPENT) < 0.5
    assert np.all(np.isfinite(evaluate(points, numbers).ln_density(numbers)))


def test_disagreement_of_samples_that_agree_is_small():
    """Below the 1e-3 tail of the Kolmogorov-Smirnov distance; a mode of a tenth that is missing lies above it."""
    rng = np.random.default_rng(2)
    points = rng.standard_normal((4000, 1))
    weights = rng.exponential(size=4000)
    weights /= weights.sum()
    effective = 1.0 / np.sum(weights**2)
    limit = stats.kstwobign.isf(1e-3) * np.sqrt(1.0 / 2000 + 1.0 / effective)
    assert disagreement(rng.standard_normal((2000, 1)), points, weights) < limit
    with_mode = points - 6.0 * (rng.random((4000, 1)) < 0.1)
    assert disagreement(rng.standard_normal((2000, 1)), with_mode, weights) > limit


@pytest.mark.slow
@pytest.mark.parametrize("channel", ["hall", "impurity+hall"])
def test_evidence_counts_both_modes(tools, channel):
    """Six runs that may each miss the lesser mode, against one that was told of both."""
    numbers = tools.problem(channel, braking_index=12.0).without_index()
    runs = [explore(numbers, FitSettings(), np.random.SeedSequence(seed)) for seed in range(6)]
    every = np.concatenate([run.weighted.resample(2000, np.random.default_rng(0)) for run in runs])
    broad = np.concatenate([pilot(numbers, np.random.default_rng(seed)) for seed in range(4)])
    truth = importance_sample(numbers, every, 40000, np.random.default_rng(1), wider=broad)
    assert truth.ln_evidence_err < 0.01
    found = np.array([run.weighted.ln_evidence for run in runs])
    assert np.all(np.abs(found - truth.ln_evidence) < 0.08)
    assert abs(found.mean() - truth.ln_evidence) < 0.03
