"""Channel probabilities of one object, and posteriors averaged over channels and cooling scenarios.

With prior odds of the channels, equal unless stated, and the stated weights of the cooling scenarios,

    P(channel, scenario | n, P, Pdot)  ~  odds(channel) weight(scenario) p(n | P, Pdot, channel, scenario)

(Bayesian model averaging: Hoeting et al. 1999, Stat. Sci. 14, 382).
"""

import hashlib
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from decayinfer.inference.outcome import ChannelFit, ObjectFit, Status

__all__ = ["Probabilities", "channel_probabilities", "mean_evidence", "mix_draws"]

type _Floats = NDArray[np.float64]


@dataclass(frozen=True)
class Probabilities:
    """Probabilities over the posterior runs of one object.

    Attributes
    ----------
    fits : tuple of ChannelFit
        The runs.
    prior : (n_fits,) ndarray
        Prior probability of each run's channel and scenario; zero where the run failed. Sums to one.
    values : (n_fits,) ndarray
        Posterior probability; zero where unreachable, nan where failed, and nan everywhere when no run
        has any evidence. Sums to one otherwise.
    ln_evidence_err : (n_fits,) ndarray
        Standard error of each ln evidence.
    """

    fits: tuple[ChannelFit, ...]
    prior: _Floats
    values: _Floats
    ln_evidence_err: _Floats

    @property
    def known(self) -> bool:
        """Whether any run has evidence, so that there are probabilities."""
        return bool(np.any(self.values > 0))

    def of(self, chosen: Callable[[ChannelFit], bool]) -> tuple[float, float]:
        """Return the probability that the chosen runs hold together, and its Monte Carlo standard error.

        To first order in the errors s_k of the ln evidences, p = sum of p_k over the chosen runs has the
        variance sum over all runs of p_k^2 ([k chosen] - p)^2 s_k^2.
        """
        inside = np.array([chosen(fit) for fit in self.fits])
        if not self.known or np.all(np.isnan(self.values[inside])):
            return np.nan, np.nan
        p_k = np.nan_to_num(self.values)
        p = float(p_k[inside].sum())
        return p, float(np.sqrt(np.sum((p_k * (inside - p) * np.nan_to_num(self.ln_evidence_err)) ** 2)))

    def of_channel(self, channel: str) -> tuple[float, float]:
        """Return a channel's probability over all scenarios, and its Monte Carlo standard error."""
        return self.of(lambda fit: fit.channel == channel)

    def within(self, scenario: str) -> "Probabilities":
        """Return the probabilities given one cooling scenario."""
        keep = np.array([fit.scenario == scenario for fit in self.fits])
        return Probabilities(
            fits=tuple(fit for fit in self.fits if fit.scenario == scenario),
            prior=_normalised(self.prior[keep]),
            values=_normalised(self.values[keep]),
            ln_evidence_err=self.ln_evidence_err[keep],
        )


def channel_probabilities(fit: ObjectFit, prior_odds: Mapping[str, float] | None = None) -> Probabilities:
    """Return the probabilities over the posterior runs of an object.

    Parameters
    ----------
    fit : ObjectFit
        The runs and the scenario weights.
    prior_odds : mapping of str to float, optional
        Prior odds of the channels, relative to one another; one where left out. Default: all equal.

    Returns
    -------
    Probabilities
        Unreachable runs have probability zero; failed ones are left out.
    """
    odds = prior_odds or {}
    weight = np.array([odds.get(f.channel, 1.0) * fit.weights[f.scenario] for f in fit.fits])
    ln_evidence = np.array([f.ln_evidence for f in fit.fits])
    usable = np.array([f.status is not Status.FAILED for f in fit.fits]) & ~np.isnan(ln_evidence)
    ln_evidence = np.where(usable, ln_evidence, -np.inf)
    best = np.max(ln_evidence, initial=-np.inf)
    evidence = np.exp(ln_evidence - best) if np.isfinite(best) else np.zeros(len(fit.fits))
    return Probabilities(
        fits=fit.fits,
        prior=_normalised(np.where(usable, weight, 0.0)),
        values=np.where(usable, _normalised(weight * evidence), np.nan),
        ln_evidence_err=np.array([f.ln_evidence_err for f in fit.fits]),
    )


def mean_evidence(ln_evidence: _Floats, errors: _Floats, weights: _Floats) -> tuple[float, float]:
    """Return ln of the weighted mean of evidences, and its standard error.

    Parameters
    ----------
    ln_evidence, errors : (n,) ndarray
        ln evidences, minus infinity where the index is out of reach, and their standard errors.
    weights : (n,) ndarray
        Positive, not necessarily normalised.

    Returns
    -------
    tuple of float
        nan without any evidence.
    """
    if not ln_evidence.size:
        return np.nan, np.nan
    ln_terms = np.log(weights / weights.sum()) + ln_evidence
    top = ln_terms.max()
    if not np.isfinite(top):
        return -np.inf, 0.0
    terms = np.exp(ln_terms - top)
    err = np.hypot.reduce(terms / terms.sum() * np.nan_to_num(errors))
    return float(top + np.log(terms.sum())), float(err)


def mix_draws(draws: Sequence[_Floats], weights: _Floats, *, seed: int, name: str) -> _Floats:
    """Return draws resampled from several runs in proportion to their weights.

    Parameters
    ----------
    draws : sequence of (n_draws,) ndarray
        Draws of one quantity in each run; an empty array where the run does not define it.
    weights : (n_runs,) ndarray
        Weight of each run, not necessarily normalised; only runs that have draws count.
    seed : int
        Seed of the fit.
    name : str
        The object; it sets the random numbers together with the seed.

    Returns
    -------
    ndarray
        As many draws as the largest run has; empty when no run with weight has any. Quantities that the same
        runs define are resampled at the same draws, so that their correlations stay.
    """
    weights = np.array([w if d.size else 0.0 for d, w in zip(draws, np.nan_to_num(weights), strict=True)])
    if not weights.sum() > 0:
        return np.empty(0)
    digest = hashlib.sha256(f"average {seed} {name}".encode()).digest()
    random = np.random.default_rng(int.from_bytes(digest[:16]))
    counts = _shares(weights, max(d.size for d in draws), offset=random.uniform())
    return np.concatenate(
        [random.choice(d, n, replace=n > d.size) for d, n in zip(draws, counts, strict=True) if n > 0]
    )


def _shares(weights: _Floats, total: int, *, offset: float) -> NDArray[np.int64]:
    """Split a total in proportion to weights: whole numbers, right on average, each off by less than one."""
    edges = np.concatenate([[0.0], np.cumsum(weights / weights.sum())])
    edges[-1] = 1.0
    starts = np.floor(edges * total + offset).astype(np.int64)
    return starts[1:] - starts[:-1]


def _normalised(weights: _Floats) -> _Floats:
    """Return weights that sum to one, or nan where they cannot."""
    total = np.nansum(weights)
    return weights / total if total > 0 else np.full_like(weights, np.nan)
