"""Convergence diagnostics on bare arrays, all by ArviZ; the one place that knows its array interface."""

from typing import Any

import numpy as np
from numpy.typing import NDArray

__all__ = ["bulk_ess", "pareto_k", "r_hat", "tail_ess"]

type Array = NDArray[np.float64]


def bulk_ess(draws: Array) -> Array:
    """Return the bulk effective sample size of (chains, draws, k) draws, (k,)."""
    return np.asarray(_stats().ess(draws, method="bulk", chain_axis=0, draw_axis=1))


def tail_ess(draws: Array) -> Array:
    """Return the effective sample size of the 5 % and 95 % quantiles of (chains, draws, k) draws, (k,)."""
    return np.asarray(_stats().ess(draws, method="tail", prob=(0.05, 0.95), chain_axis=0, draw_axis=1))


def r_hat(draws: Array) -> Array:
    """Return the rank-normalised R-hat of (chains, draws, k) draws, (k,)."""
    return np.asarray(_stats().rhat(draws, chain_axis=0, draw_axis=1))


def pareto_k(ln_weights: Array) -> float:
    """Return the tail shape of importance weights (Vehtari et al. 2024, JMLR 25, 72)."""
    # ArviZ expects log likelihoods, whose inverse are the weights
    return float(_stats().psislw(-ln_weights[np.isfinite(ln_weights)])[1])


def _stats() -> Any:
    from arviz_stats.base import array_stats  # type: ignore[attr-defined]

    return array_stats
