"""A mixture of multivariate Student-t densities fitted to draws: the importance proposal for evidences.

Fitted by expectation-maximisation with fixed degrees of freedom (Peel & McLachlan 2000, Stat. Comput. 10, 339). Heavy
tails keep the weights bounded; several components follow bent and two-humped posteriors.
"""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.special import gammaln, logsumexp

__all__ = ["StudentMixture", "fit_mixture"]

type Array = NDArray[np.float64]

FREEDOM = 5.0  #: degrees of freedom of every component
_SWEEPS = 30
_RIDGE = 1e-6  # of the pooled covariance, keeps a component of few draws from collapsing


@dataclass(frozen=True)
class StudentMixture:
    """Mixture of K multivariate t densities in d dimensions.

    Attributes
    ----------
    weights : (K,) array
        Component weights, summing to one.
    means : (K, d) array
        Component centres.
    roots : (K, d, d) array
        Lower Cholesky factors of the component scale matrices.
    """

    weights: Array
    means: Array
    roots: Array

    def ln_density(self, points: Array) -> Array:
        """Return the log density at points, (n, d) to (n,)."""
        with np.errstate(divide="ignore"):
            total: Array = logsumexp(np.log(self.weights)[:, None] + _ln_components(self, points)[0], axis=0)
        return total

    def broadened(self, scale: float) -> "StudentMixture":
        """Return the same mixture with every component stretched about its centre."""
        return StudentMixture(self.weights, self.means, scale * self.roots)

    def sample(self, n: int, rng: np.random.Generator) -> Array:
        """Draw n points, (n, d)."""
        d = self.means.shape[1]
        component = rng.choice(self.weights.size, size=n, p=self.weights)
        spread = np.sqrt(FREEDOM / rng.chisquare(FREEDOM, size=n))
        steps = np.einsum("nij,nj->ni", self.roots[component], rng.standard_normal((n, d)))
        moved: Array = self.means[component] + spread[:, None] * steps
        return moved


def fit_mixture(draws: Array, components: int = 4) -> StudentMixture:
    """Fit a mixture to draws.

    Parameters
    ----------
    draws : (n, d) array
        Draws, roughly independent.
    components : int
        Number of components.
    """
    n, d = draws.shape
    pooled = np.atleast_2d(np.cov(draws.T))
    axis = (draws - draws.mean(axis=0)) @ np.linalg.eigh(pooled)[1][:, -1]
    share = np.zeros((components, n))  # start: slices along the widest direction
    share[np.minimum(np.argsort(np.argsort(axis)) * components // n, components - 1), np.arange(n)] = 1.0
    scale = np.ones((components, n))
    floor = _RIDGE * pooled + 1e-12 * np.eye(d)
    for _ in range(_SWEEPS):
        mixture = _maximise(draws, share, scale, floor)
        ln_parts, distance = _ln_components(mixture, draws)
        ln_parts += np.log(mixture.weights)[:, None]
        share = np.exp(ln_parts - logsumexp(ln_parts, axis=0))
        share += 1e-10
        scale = (FREEDOM + d) / (FREEDOM + distance)
    return mixture


def _maximise(draws: Array, share: Array, scale: Array, floor: Array) -> StudentMixture:
    totals = share.sum(axis=1)
    pull = share * scale
    means = pull @ draws / pull.sum(axis=1)[:, None]
    roots = np.empty((totals.size, draws.shape[1], draws.shape[1]))
    for k, mean in enumerate(means):
        centred = draws - mean
        roots[k] = np.linalg.cholesky((centred * pull[k][:, None]).T @ centred / totals[k] + floor)
    return StudentMixture(totals / totals.sum(), means, roots)


def _ln_components(mixture: StudentMixture, points: Array) -> tuple[Array, Array]:
    """Log density of each component and its squared Mahalanobis distance, each (K, n)."""
    d = points.shape[1]
    norm = gammaln((FREEDOM + d) / 2.0) - gammaln(FREEDOM / 2.0) - 0.5 * d * np.log(FREEDOM * np.pi)
    distances, densities = [], []
    for mean, root in zip(mixture.means, mixture.roots, strict=True):
        distance = (np.linalg.solve(root, (points - mean).T) ** 2).sum(axis=0)
        distances.append(distance)
        densities.append(
            norm - np.log(np.diag(root)).sum() - 0.5 * (FREEDOM + d) * np.log1p(distance / FREEDOM)
        )
    return np.array(densities), np.array(distances)
