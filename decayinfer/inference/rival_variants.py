"""The evidence of a rival read otherwise, by the names of `decayinfer.inference.variants`."""

from collections.abc import Callable
from dataclasses import replace

import numpy as np

from decayinfer.errors import SamplingError
from decayinfer.inference.importance import Weighted
from decayinfer.inference.rival_density import RivalProblem, evaluate_rival
from decayinfer.inference.variants import PRIOR_SETTINGS, Variant, read_otherwise, read_with_noise, stretched

__all__ = ["rival_variants"]

#: Integrates a problem without and with n.
type Integrate = Callable[[RivalProblem, np.random.Generator], tuple[Weighted, Weighted]]


def rival_variants(
    problem: RivalProblem,
    prior: Weighted,
    posterior: Weighted | None,
    rng: np.random.Generator,
    integrate: Integrate,
) -> dict[str, Variant]:
    """Return the conditional evidence of a rival under other readings of n and other prior settings.

    Parameters
    ----------
    problem : RivalProblem
        The problem.
    prior, posterior : Weighted
        Points behind the evidence without and with n; no posterior where the index is out of reach.
    rng : numpy.random.Generator
        Source of randomness.
    integrate : callable
        Integrates the problem anew under other priors.
    """
    index, star, priors = problem.index, problem.pulsar, problem.priors
    before = prior, evaluate_rival(prior.points, problem).response.braking_index
    if posterior is None:
        return {"with-noise": read_with_noise(before, index, star, priors)}
    after = posterior, evaluate_rival(posterior.points, problem).response.braking_index
    found = read_otherwise(before, after, index, star, priors)
    if problem.rival.noisy:
        found["with-noise"] = _conditional(prior, posterior)
    for name, factor in PRIOR_SETTINGS.items():
        # a rival's coordinates are images of its priors and its index may be pinned: integrating anew is simplest
        try:
            other = integrate(replace(problem, priors=stretched(priors, factor)), rng)
        except SamplingError:
            found[name] = -np.inf, np.nan
        else:
            found[name] = _conditional(*other)
    return found


def _conditional(prior: Weighted, posterior: Weighted) -> Variant:
    err = float(np.hypot(prior.ln_evidence_err, posterior.ln_evidence_err))
    return posterior.ln_evidence - prior.ln_evidence, err
