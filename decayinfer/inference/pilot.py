"""A broad, cheap look at a density, so that a mode which the chains miss is proposed all the same.

Hall drift without a measured index has two: drift that goes on, and an attractor passed long ago. Chains that start
in one may never see the other, and importance weights of a proposal fitted to them cannot tell.
"""

import numpy as np
from numpy.typing import NDArray

from decayinfer.inference.density import evaluate
from decayinfer.inference.problem import Problem
from decayinfer.inference.proposal import fit_mixture

__all__ = ["disagreement", "pilot"]

type Array = NDArray[np.float64]

_POINTS = 2000
_LEFT = 0.1  # share of the cloud that the tempered weights leave effective


def pilot(problem: Problem, rng: np.random.Generator) -> Array:
    """Return points that cover a density broadly.

    A wide Gaussian cloud is resampled by its importance weights to the power that leaves a tenth of it effective
    (annealed importance sampling, Neal 2001, Stat. Comput. 11, 125); a mixture fitted to what is left proposes
    once more.

    Parameters
    ----------
    problem : Problem
        The density, without the likelihood of n.
    rng : numpy.random.Generator
        Source of randomness.

    Returns
    -------
    (2000, 8) array
    """
    phonon, umklapp = problem.normals[0, 0], problem.normals[0, 6]
    centre = np.array([-1.0, 0.0, -0.7, -0.7, -0.7, 0.0, umklapp, phonon])
    spread = np.array([1.3, 2.2, 2.2, 2.0, 1.6, 1.3, 0.5, 1.5])
    used = problem.active > 0.0
    steps = rng.standard_normal((_POINTS, centre.size))
    cloud = np.where(used, centre + spread * steps, steps)
    ln_cloud = -0.5 * np.sum(steps**2, axis=1)
    mixture = fit_mixture(cloud[_tempered(cloud, ln_cloud, problem, rng)][:, used], components=6)
    cloud = rng.standard_normal(cloud.shape)
    cloud[:, used] = mixture.sample(_POINTS, rng)
    ln_cloud = mixture.ln_density(cloud[:, used]) - 0.5 * np.sum(cloud[:, ~used] ** 2, axis=1)
    points: Array = cloud[_tempered(cloud, ln_cloud, problem, rng)]
    return points


def _tempered(cloud: Array, ln_cloud: Array, problem: Problem, rng: np.random.Generator) -> NDArray[np.intp]:
    """Resample by weights to the power, at most one, that leaves the wanted share effective; found by bisection."""
    ln_weights = evaluate(cloud, problem).ln_density(problem) - ln_cloud
    ln_weights -= ln_weights.max()
    low, high = 0.0, 1.0
    for _ in range(30):
        power = 0.5 * (low + high)
        weights = np.exp(power * ln_weights)
        weights /= weights.sum()
        if 1.0 / np.sum(weights**2) > _LEFT * weights.size:
            low = power
        else:
            high = power
    return rng.choice(weights.size, size=weights.size, p=weights)


def disagreement(draws: Array, points: Array, weights: Array) -> float:
    """Return the largest distance between the distributions of draws and of weighted points.

    Parameters
    ----------
    draws : (m, k) array
        Draws of k coordinates.
    points, weights : (n, k) and (n,) array
        Weighted points of the same density.

    Returns
    -------
    float
        The largest difference of the cumulative distributions at the deciles of the draws, over all coordinates.
    """
    levels = np.linspace(0.1, 0.9, 9)
    deciles = np.quantile(draws, levels, axis=0)
    below = np.array([weights @ (points <= row) for row in deciles])
    return float(np.max(np.abs(below - levels[:, None])))
