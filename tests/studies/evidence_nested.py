"""Evidence against nested sampling (Skilling 2006, Bayesian Anal. 1, 833; the general-purpose sampler dynesty).

    python tests/studies/evidence_nested.py

The same conditioned density is integrated twice, for two invented objects and two channels: by the importance
sample of a fit, and by nested sampling from a Gaussian reference three times as wide as the posterior.
"""

import sys
from pathlib import Path

import numpy as np
from scipy.stats import norm

from decayinfer.catalog.pulsar import Pulsar
from decayinfer.channels.registry import load_channel
from decayinfer.cooling.registry import load_scenario
from decayinfer.inference.density import evaluate
from decayinfer.inference.fit import fit_channel
from decayinfer.inference.priors import Priors
from decayinfer.inference.problem import make_problem
from decayinfer.inference.settings import FitSettings

OBJECTS = tuple(
    Pulsar(name=name, period=period, period_derivative=derivative, braking_index=index,
           braking_index_err_minus=error, braking_index_err_plus=error)
    for name, period, derivative, index, error in (("Plover", 0.2, 6e-14, 9.0, 0.7), ("Rail", 0.4, 2e-14, 24.0, 2.0))
)  # fmt: skip
CHANNELS = ("impurity+phonon", "phonon+hall")
SCENARIO = "bsk24-normal-iron"
LIVE, SPREAD, SIGMAS = 250, 3.0, 3.0


def compare(star, channel, live=LIVE):
    """One row: both evidences with their errors, and their distance in standard errors."""
    from dynesty import NestedSampler

    fit = fit_channel(star, channel, SCENARIO, FitSettings())
    problem = make_problem(star, load_channel(channel), load_scenario(SCENARIO), Priors())
    used = np.flatnonzero(problem.active)
    draws = fit.draws["posterior"]["coordinates"].values.reshape(-1, problem.active.size)[:, used]
    centre, width = draws.mean(axis=0), SPREAD * draws.std(axis=0)
    idle = problem.active.size - used.size

    def ln_ratio(z):
        point = np.zeros((1, problem.active.size))
        point[0, used] = z
        # an unused coordinate at zero contributes its normal density there, which integrates to one
        value = evaluate(point, problem).ln_density(problem)[0] + 0.5 * idle * np.log(2.0 * np.pi)
        return max(value - norm.logpdf(z, centre, width).sum(), -1e300)

    sampler = NestedSampler(
        ln_ratio,
        lambda u: centre + width * norm.ppf(u),
        used.size,
        nlive=live,
        rstate=np.random.default_rng(5),
    )
    sampler.run_nested(print_progress=False, dlogz=0.05)
    nested, nested_err = float(sampler.results.logz[-1]), float(sampler.results.logzerr[-1])
    pull = (fit.ln_evidence_joint - nested) / np.hypot(nested_err, fit.ln_evidence_joint_err)
    return {
        "object": star.name, "channel": channel, "status": str(fit.status), "fitted": fit.ln_evidence_joint,
        "fitted_err": fit.ln_evidence_joint_err, "nested": nested, "nested_err": nested_err, "pull": float(pull),
        "calls": int(np.sum(sampler.results.ncall)),
    }  # fmt: skip


def main():
    sys.path.insert(0, str(Path(__file__).parent))
    import recording

    rows = []
    for star in OBJECTS:
        for channel in CHANNELS:
            rows.append(compare(star, channel))
            print(rows[-1], flush=True)
    recording.write("evidence_nested", rows, live=LIVE, scenario=SCENARIO)


if __name__ == "__main__":
    main()
