"""Adaptive importance sampling on densities whose integrals are known."""

import numpy as np
import pytest
from scipy.special import logsumexp
from scipy.stats import multivariate_normal

from decayinfer.errors import SamplingError
from decayinfer.inference.annealing import Normal, anneal, sound


def ln_normal(points, mean, sds):
    z = (points - mean) / sds
    return np.sum(-0.5 * z**2 - np.log(sds) - 0.5 * np.log(2.0 * np.pi), axis=1)


DENSITIES = {
    "the start itself": lambda z: ln_normal(z, 0.0, np.ones(4)),
    "far and narrow": lambda z: ln_normal(z, np.array([3.5, -2.0, 0.0, 1.0]), np.array([0.02, 0.3, 1.0, 0.1])),
    "two peaks": lambda z: logsumexp(
        [
            np.log(0.3) + ln_normal(z, np.array([-2.0, 0.0, 0.0, 0.0]), np.full(4, 0.2)),
            np.log(0.7) + ln_normal(z, np.array([2.0, 1.0, 0.0, 0.0]), np.array([0.1, 0.4, 1.0, 1.0])),
        ],
        axis=0,
    ),
    "half a space": lambda z: np.where(z[:, 0] > 0.5, ln_normal(z, 0.0, np.ones(4)) - np.log(0.3085375387), -np.inf),
}  # fmt: skip


@pytest.mark.parametrize("name", DENSITIES)
def test_integral_and_weighted_draws(name, rng):
    found = anneal(lambda z: DENSITIES[name](z) - 7.0, Normal(np.ones(4)), rng)
    assert sound(found)
    assert found.ln_evidence == pytest.approx(-7.0, abs=4.0 * found.ln_evidence_err + 1e-9)
    assert found.ln_evidence_err < 0.04
    if name == "two peaks":
        share = found.weights[found.points[:, 0] > 0.0].sum()
        assert share == pytest.approx(0.7, abs=0.05)


def test_errors_are_honest():
    """Forty repetitions scatter about the truth by what they say: chi squared within its 1e-3 tails."""
    from scipy.stats import chi2

    z = []
    for seed in range(40):
        found = anneal(DENSITIES["two peaks"], Normal(np.ones(4)), np.random.default_rng(seed))
        z.append(found.ln_evidence / found.ln_evidence_err)
    tail = chi2.cdf(np.sum(np.square(z)), 40)
    assert 1e-3 < tail < 1.0 - 1e-3


def test_a_sheet_it_cannot_follow_is_not_called_sound(rng):
    """A thin shell in eight dimensions, as an index known well makes of an orbit: the weights must say so."""

    def shell(z):
        return -0.5 * ((np.linalg.norm(z, axis=1) - 2.5) / 1e-4) ** 2

    assert not sound(anneal(shell, Normal(np.ones(8)), rng))


def test_a_density_that_vanishes_is_an_error(rng):
    with pytest.raises(SamplingError, match="vanishes"):
        anneal(lambda z: np.full(len(z), -np.inf), Normal(np.ones(2)), rng)


def test_normal_proposal_is_what_scipy_says(rng):
    start = Normal(np.array([1.0, 2.5]))
    points = start.sample(50, rng)
    expected = multivariate_normal([0.0, 0.0], np.diag([1.0, 2.5**2])).logpdf(points)
    np.testing.assert_allclose(start.ln_density(points), expected, rtol=1e-12)
