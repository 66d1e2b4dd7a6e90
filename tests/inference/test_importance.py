"""Evidence by importance sampling, on densities whose integral is known; the mixture that proposes."""

from types import SimpleNamespace

import numpy as np
import pytest
from scipy import stats
from scipy.special import logsumexp

from decayinfer.inference import importance
from decayinfer.inference.diagnostics import pareto_k
from decayinfer.inference.importance import Weighted, importance_sample, rewarp
from decayinfer.inference.proposal import FREEDOM, StudentMixture, fit_mixture

ALPHA = 1e-3


def mixture():
    roots = np.array([[[0.5, 0.0], [0.3, 0.8]], [[1.0, 0.0], [-0.5, 0.4]]])
    return StudentMixture(np.array([0.3, 0.7]), np.array([[-2.0, 1.0], [1.0, 0.0]]), roots)


# --- the mixture ------------------------------------------------------------------------------------------


def test_mixture_density_is_scipy_s():
    points = np.random.default_rng(1).normal(size=(50, 2)) * 3.0
    parts = [
        np.log(w) + stats.multivariate_t(mean, root @ root.T, df=FREEDOM).logpdf(points)
        for w, mean, root in zip(mixture().weights, mixture().means, mixture().roots, strict=True)
    ]
    np.testing.assert_allclose(mixture().ln_density(points), logsumexp(parts, axis=0), rtol=1e-12)


def test_mixture_density_is_normalised():
    """Trapezoids over a square of 240 by 240; a t of five degrees of freedom leaves 2e-8 outside."""
    grid = np.concatenate([-np.geomspace(120.0, 1e-3, 700), np.geomspace(1e-3, 120.0, 700)])
    points = np.stack(np.meshgrid(grid, grid, indexing="ij"), axis=-1).reshape(-1, 2)
    density = np.exp(mixture().ln_density(points)).reshape(grid.size, grid.size)
    assert np.trapezoid(np.trapezoid(density, grid), grid) == pytest.approx(1.0, abs=1e-3)


def test_mixture_draws_follow_its_density():
    """Each coordinate's draws against the marginal, which is a mixture of scalar t densities."""
    draws = mixture().sample(20000, np.random.default_rng(2))
    for axis in range(2):
        scales = [np.sqrt((root @ root.T)[axis, axis]) for root in mixture().roots]

        def marginal(x, axis=axis, scales=scales):
            parts = zip(mixture().weights, mixture().means[:, axis], scales, strict=True)
            return sum(w * stats.t.cdf(x, FREEDOM, mean, scale) for w, mean, scale in parts)

        assert stats.kstest(draws[:, axis], marginal).pvalue > ALPHA
        assert stats.kstest(draws[:, axis] * 1.1, marginal).pvalue < ALPHA  # negative control


def test_fitted_mixture_follows_two_humps():
    """Relative to the true density, the fit loses less than 0.05 in mean ln density; one component loses more."""
    rng = np.random.default_rng(3)
    draws = mixture().sample(4000, rng)
    fresh = mixture().sample(4000, rng)
    truth = mixture().ln_density(fresh).mean()
    assert truth - fit_mixture(draws).ln_density(fresh).mean() < 0.05
    assert truth - fit_mixture(draws, components=1).ln_density(fresh).mean() > 0.1


def test_a_broadened_mixture_is_stretched():
    wide = mixture().broadened(2.0)
    np.testing.assert_allclose(wide.means, mixture().means)
    assert wide.ln_density(wide.means[:1])[0] < mixture().ln_density(wide.means[:1])[0]


def test_fit_of_draws_that_hardly_move():
    """A coordinate that stands still must not stop the fit."""
    draws = np.column_stack([np.random.default_rng(4).normal(size=500), np.full(500, 2.0)])
    assert np.all(np.isfinite(fit_mixture(draws).ln_density(draws)))


# --- evidence ---------------------------------------------------------------------------------------------

LN_EVIDENCE = -7.3  # of the toy densities, arbitrary
IDLE = (3, 6)  # coordinates of the toy problem that are not in use
ACTIVE = np.array([0.0 if i in IDLE else 1.0 for i in range(8)])


def gaussian(points):
    """A correlated Gaussian in the six coordinates in use, standard normal in the others."""
    d = int(ACTIVE.sum())
    covariance = 0.4 * np.eye(d) + 0.6
    used, idle = points[:, ACTIVE > 0], points[:, ACTIVE == 0]
    return stats.multivariate_normal(np.arange(d), covariance).logpdf(used) + stats.norm.logpdf(idle).sum(
        axis=1
    )


def two_humps(points):
    """Two Gaussians five standard deviations apart, of weights 0.2 and 0.8."""
    shift = np.zeros(8)
    shift[0] = 5.0
    parts = [stats.norm.logpdf(points - k * shift).sum(axis=1) for k in (0, 1)]
    return logsumexp(parts, axis=0, b=np.array([[0.2], [0.8]]))


def draws_of(density, n, rng):
    if density is two_humps:
        points = rng.standard_normal((n, 8))
        points[:, 0] += 5.0 * (rng.random(n) < 0.8)
        return points
    points = rng.standard_normal((n, 8))
    d = int(ACTIVE.sum())
    points[:, ACTIVE > 0] = rng.multivariate_normal(np.arange(d), 0.4 * np.eye(d) + 0.6, size=n)
    return points


@pytest.fixture(params=[gaussian, two_humps], ids=["gaussian", "two humps"])
def toy(request, monkeypatch):
    def evaluate(points, problem):
        return SimpleNamespace(ln_density=lambda problem: request.param(points) + LN_EVIDENCE)

    monkeypatch.setattr(importance, "evaluate", evaluate)
    return request.param


def test_known_evidence(toy):
    """Sixty runs: pulls of ln Z are standard, their mean is unbiased, and the weights are tame."""
    problem = SimpleNamespace(active=ACTIVE)
    pulls, errors = [], []
    for seed in range(60):
        rng = np.random.default_rng(seed)
        weighted = importance_sample(problem, draws_of(toy, 1000, rng), 2000, rng)
        pulls.append((weighted.ln_evidence - LN_EVIDENCE) / weighted.ln_evidence_err)
        errors.append(weighted.ln_evidence_err)
        assert weighted.pareto_k < 0.7
        assert weighted.effective_size > 400
    assert max(errors) < 0.05
    assert abs(np.mean(pulls)) < stats.norm.isf(ALPHA / 2) / np.sqrt(60)
    low, high = stats.chi2.ppf([ALPHA / 2, 1 - ALPHA / 2], 60)
    assert low < np.sum(np.square(pulls)) < high


def test_a_wider_proposal_finds_the_hump_that_the_draws_missed(toy):
    rng = np.random.default_rng(9)
    problem = SimpleNamespace(active=ACTIVE)
    draws = draws_of(toy, 2000, rng)
    if toy is two_humps:
        draws = draws[draws[:, 0] > 2.5]
    wider = 3.0 * rng.standard_normal((2000, 8)) + np.array([2.0, 1.0, 2.0, 0.0, 3.0, 4.0, 0.0, 5.0]) * ACTIVE
    weighted = importance_sample(problem, draws, 20000, rng, wider=wider)
    assert weighted.ln_evidence == pytest.approx(LN_EVIDENCE, abs=max(4.0 * weighted.ln_evidence_err, 0.01))


def test_resampling_follows_the_weights():
    """Systematic resampling: each point comes n w times, rounded up or down (Kitagawa 1996)."""
    rng = np.random.default_rng(5)
    weighted = Weighted(np.arange(50.0)[:, None], rng.normal(size=50))
    drawn = weighted.resample(1000, rng)
    counts = np.bincount(drawn[:, 0].astype(int), minlength=50)
    assert np.all(np.abs(counts - 1000 * weighted.weights) <= 1.0)
    assert not np.all(np.diff(drawn[:, 0]) >= 0)  # in random order


def test_weights_of_minus_infinity_count_as_nothing():
    weighted = Weighted(np.zeros((4, 1)), np.array([0.0, -np.inf, 0.0, -np.inf]))
    assert weighted.ln_evidence == pytest.approx(np.log(0.5))
    assert weighted.effective_size == pytest.approx(2.0)


@pytest.mark.parametrize("shape", [0.3, 0.9])
def test_pareto_k_of_pareto_weights(shape):
    """Weights (1 - u)^-k have a Pareto tail of shape k."""
    u = np.random.default_rng(6).random(20000)
    assert pareto_k(-shape * np.log(u)) == pytest.approx(shape, abs=0.12)
    assert pareto_k(shape * np.log(u)) < 0.1  # bounded above: a light tail


def test_rewarp_keeps_the_index(tools, rng):
    wide, narrow = tools.problem("phonon").without_index(), tools.problem("phonon")
    from decayinfer.inference.coordinates import ln_index_excess

    points = rng.standard_normal((100, 8))
    moved = rewarp(points, wide, narrow)
    np.testing.assert_allclose(ln_index_excess(list(moved.T), narrow), ln_index_excess(list(points.T), wide))
    np.testing.assert_array_equal(np.delete(moved, 1, axis=1), np.delete(points, 1, axis=1))
