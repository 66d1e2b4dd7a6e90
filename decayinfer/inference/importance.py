"""Evidence and independent draws by importance sampling from a mixture fitted to NUTS draws."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from decayinfer.inference.coordinates import ln_index_excess
from decayinfer.inference.density import Evaluation, evaluate
from decayinfer.inference.diagnostics import pareto_k
from decayinfer.inference.problem import Problem
from decayinfer.inference.proposal import fit_mixture

__all__ = ["Weighted", "importance_sample", "rewarp"]

type Array = NDArray[np.float64]

_LN_2PI = float(np.log(2.0 * np.pi))
_DEFENSIVE = 0.1  # share of each of the wider proposals
_BROADER = 1.7  # scale of the broadened copy of the fitted mixture


@dataclass(frozen=True)
class Weighted:
    """Weighted points of one density.

    Attributes
    ----------
    points : (n, 8) array
        Proposed coordinates.
    ln_weights : (n,) array
        Log of density over proposal.
    evaluation : Evaluation or None
        Density terms and physical parameters of the points, where they were kept.
    """

    points: Array
    ln_weights: Array
    evaluation: Evaluation | None = None

    @property
    def weights(self) -> Array:
        """Weights that sum to one, (n,)."""
        raw = np.exp(self.ln_weights - self.ln_weights.max())
        normalised: Array = raw / raw.sum()
        return normalised

    @property
    def ln_evidence(self) -> float:
        """Logarithm of the integral of the density."""
        top = self.ln_weights.max()
        return float(top + np.log(np.mean(np.exp(self.ln_weights - top))))

    @property
    def ln_evidence_err(self) -> float:
        """Standard error of `ln_evidence`."""
        return float(
            np.sqrt(max(self.ln_weights.size / self.effective_size - 1.0, 0.0) / self.ln_weights.size)
        )

    @property
    def effective_size(self) -> float:
        """Kish's effective number of draws, 1/sum of squared weights."""
        return float(1.0 / np.sum(self.weights**2))

    @property
    def pareto_k(self) -> float:
        """Shape of the generalised Pareto tail of the weights (Vehtari et al. 2024, JMLR 25, 72)."""
        return pareto_k(self.ln_weights)

    def resample(self, n: int, rng: np.random.Generator) -> Array:
        """Draw n points by their weights, systematically so that rounding adds least noise, in random order."""
        position = (rng.random() + np.arange(n)) / n
        cumulative = np.cumsum(self.weights)
        chosen = np.minimum(np.searchsorted(cumulative, position), self.weights.size - 1)
        drawn: Array = self.points[rng.permutation(chosen)]
        return drawn


def importance_sample(
    problem: Problem, draws: Array, n: int, rng: np.random.Generator, *, wider: Array | None = None
) -> Weighted:
    """Sample a problem's density from mixtures fitted to draws.

    Parameters
    ----------
    problem : Problem
        The density.
    draws : (m, 8) array
        Draws from it.
    n : int
        Number of proposals.
    rng : numpy.random.Generator
        Source of randomness.
    wider : (k, 8) array, optional
        Draws of a wider density, proposed one time in ten so that a mode the draws missed can be found. Another tenth
        comes from a broadened copy of the fitted mixture, which bounds the weights in its tails.
    """
    active = np.flatnonzero(problem.active)
    fitted = fit_mixture(draws[:, active])
    parts = [fitted.broadened(_BROADER)]
    if wider is not None:
        parts.append(fit_mixture(wider[:, active]))
    shares = [1.0 - _DEFENSIVE * len(parts)] + [_DEFENSIVE] * len(parts)
    parts.insert(0, fitted)
    counts = [n - int(_DEFENSIVE * n) * (len(parts) - 1)] + [int(_DEFENSIVE * n)] * (len(parts) - 1)
    proposed = np.concatenate([part.sample(count, rng) for part, count in zip(parts, counts, strict=True)])
    ln_parts = [np.log(share) + part.ln_density(proposed) for share, part in zip(shares, parts, strict=True)]
    ln_proposal = np.logaddexp.reduce(ln_parts)
    # a coordinate that the channel does not use is proposed from its own standard normal prior
    points = rng.standard_normal((n, problem.active.size))
    points[:, active] = 0.0
    idle = problem.active.size - active.size
    ln_proposal = ln_proposal - 0.5 * np.sum(points**2, axis=1) - 0.5 * idle * _LN_2PI
    points[:, active] = proposed
    evaluation = evaluate(points, problem)
    return Weighted(points, evaluation.ln_density(problem) - ln_proposal, evaluation)


def rewarp(points: Array, source: Problem, target: Problem) -> Array:
    """Move draws from one problem's warp of the index to another's."""
    out = points.copy()
    excess = ln_index_excess(list(points.T), source)
    centre, width, tail = target.warp
    unsheared = (
        excess
        - ln_index_excess(list(points.T), target)
        + centre
        + width * np.sinh(tail * points[:, 1]) / tail
    )
    out[:, 1] = np.arcsinh(tail * (unsheared - centre) / width) / tail
    return out
