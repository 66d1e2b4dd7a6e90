"""Weighted draws and the integral of a density in a few dimensions, by adaptive importance sampling.

A population starts from a plain proposal and is carried to the target along the powers between the two: each sweep
takes the largest power its weights can bear, fits a mixture of Student-t densities to the weighted points and proposes
from it anew (Cappe et al. 2008, Stat. Comput. 18, 447, from memory). The first proposal and a broadened copy of the
mixture stay in as defence, so weights remain bounded. Only the last sweep counts.
"""

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from decayinfer.errors import SamplingError
from decayinfer.inference.importance import Weighted
from decayinfer.inference.proposal import StudentMixture, fit_mixture

__all__ = ["POINTS", "Normal", "anneal", "sound"]

type Array = NDArray[np.float64]

POINTS = 4000  #: points of a sweep
_FITTED = 1500  # draws that a mixture is fitted to
_LEAST = 150.0  # effective points that a sweep must keep
_WANTED = 1000.0  # effective points at which it ends
_FLOOR = 400.0  # effective points below which the result is not sound
_SWEEPS = 14
_PATIENCE = 6  # sweeps after which more points are proposed
_DEFENCE = 0.1
_BROADER = 1.7
_LN_2PI = float(np.log(2.0 * np.pi))


@dataclass(frozen=True)
class Normal:
    """Independent normal proposal about zero with standard deviations (d,)."""

    sds: Array

    def sample(self, n: int, rng: np.random.Generator) -> Array:
        """Draw n points, (n, d)."""
        drawn: Array = self.sds * rng.standard_normal((n, self.sds.size))
        return drawn

    def ln_density(self, points: Array) -> Array:
        """Return the log density at points, (n, d) to (n,)."""
        scaled = points / self.sds
        total: Array = np.sum(-0.5 * scaled**2 - np.log(self.sds) - 0.5 * _LN_2PI, axis=1)
        return total


def anneal(
    ln_target: Callable[[Array], Array],
    start: Normal | StudentMixture,
    rng: np.random.Generator,
    *,
    scale: int = 1,
) -> Weighted:
    """Sample and integrate a density.

    Parameters
    ----------
    ln_target : callable
        Log density of points, (n, d) to (n,); minus infinity where it vanishes.
    start : Normal or StudentMixture
        First proposal, wide enough to hold the target.
    rng : numpy.random.Generator
        Source of randomness.
    scale : int
        Factor on the points of a sweep, and on those that it must keep.

    Raises
    ------
    SamplingError
        If the density vanishes at every point proposed.
    """
    count = scale * POINTS
    points = start.sample(count, rng)
    ln_proposal = start.ln_density(points)
    for sweep in range(_SWEEPS):
        ln_density, ln_start = ln_target(points), start.ln_density(points)
        if not np.isfinite(ln_density).any():
            raise SamplingError("the density vanishes wherever it was tried")
        weighted = Weighted(points, ln_density - ln_proposal)
        if weighted.effective_size >= _WANTED and sound(weighted):
            break
        ln_ratio, ln_base = ln_density - ln_start, ln_start - ln_proposal
        power = _power(ln_ratio, ln_base, scale * _LEAST)
        fitted = fit_mixture(Weighted(points, power * ln_ratio + ln_base).resample(scale * _FITTED, rng))
        if power == 1.0 and sweep >= _PATIENCE:
            count = min(2 * count, 8 * scale * POINTS)
        proposals: tuple[StudentMixture | Normal, ...] = (fitted, fitted.broadened(_BROADER), start)
        shares = (1.0 - 2.0 * _DEFENCE, _DEFENCE, _DEFENCE)
        sizes = [round(share * count) for share in shares]
        points = np.concatenate([q.sample(size, rng) for q, size in zip(proposals, sizes, strict=True)])
        ln_parts = [np.log(w) + q.ln_density(points) for w, q in zip(shares, proposals, strict=True)]
        ln_proposal = np.logaddexp.reduce(ln_parts)
    return weighted


def sound(weighted: Weighted) -> bool:
    """Whether weights are good enough to report draws and an integral from."""
    return weighted.effective_size >= _FLOOR and weighted.pareto_k < 0.7


def _power(ln_ratio: Array, ln_base: Array, least: float) -> float:
    """Largest power of the ratio, at most one, that leaves that effective size; by bisection."""

    def size(power: float) -> float:
        ln_weights = power * ln_ratio + ln_base
        weights = np.exp(ln_weights - ln_weights.max())
        return float(weights.sum() ** 2 / np.sum(weights**2))

    if size(1.0) >= least:
        return 1.0
    low, high = 0.0, 1.0
    for _ in range(30):
        middle = 0.5 * (low + high)
        low, high = (middle, high) if size(middle) >= least else (low, middle)
    return max(low, 1e-6)
