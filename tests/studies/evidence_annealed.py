"""Evidence of n against PyMC's sequential Monte Carlo, on the model that the package compiles.

    python tests/studies/evidence_annealed.py [--particles 2000] [--seed 1]

It starts from draws of p(coordinates | P, Pdot), made by the package without n, and anneals the likelihood of n by
Metropolis moves (Del Moral, Doucet & Jasra 2006, J. R. Stat. Soc. B 68, 411); its marginal likelihood is
p(n | P, Pdot, channel). Its error is the scatter of independent runs.
"""

import argparse
import logging
import sys
import time
import warnings
from dataclasses import replace
from pathlib import Path

import numpy as np

sys.path[:0] = [str(Path(__file__).parent), str(Path(__file__).parents[1] / "inference")]

import recording  # noqa: E402
import tools  # noqa: E402

from decayinfer.channels.registry import load_channel  # noqa: E402
from decayinfer.cooling.registry import load_scenario  # noqa: E402
from decayinfer.inference.fit import fit_channel  # noqa: E402
from decayinfer.inference.importance import rewarp  # noqa: E402
from decayinfer.inference.model import build_model  # noqa: E402
from decayinfer.inference.priors import Priors  # noqa: E402
from decayinfer.inference.problem import make_problem  # noqa: E402
from decayinfer.inference.settings import FitSettings  # noqa: E402

SNIPE = replace(
    tools.WREN, name="Snipe", period=0.12, period_derivative=1.5e-13, braking_index=4.2,
    braking_index_err_minus=0.3, braking_index_err_plus=0.4,
)  # fmt: skip
OBJECTS = (tools.WREN, SNIPE)  # invented: one of middle age, one young with a weak excess
CHANNELS = ("impurity", "phonon+hall")
RUNS = 4


def annealed(numbers, draws, particles, seed):
    """ln p(n | P, Pdot): ln of the mean over independent runs (each unbiased for p itself), and its error."""
    import pymc as pm

    logging.getLogger("pymc").setLevel(logging.ERROR)
    draws = rewarp(draws, numbers.without_index(), numbers)
    rng = np.random.default_rng(seed)
    found = []
    with build_model(numbers), warnings.catch_warnings():
        warnings.simplefilter("ignore")
        for _ in range(RUNS):
            start = {"coordinates": draws[rng.choice(len(draws), particles, replace=False)]}
            trace = pm.sample_smc(
                particles,
                start=start,
                chains=1,
                cores=1,
                random_seed=int(rng.integers(2**31)),
                progressbar=False,
            )
            stages = trace["sample_stats"]["log_marginal_likelihood"].values.ravel()[-1]
            found.append(float(np.ravel(stages)[-1]))
    ratios = np.exp(np.array(found) - np.max(found))
    return float(np.max(found) + np.log(ratios.mean())), float(
        ratios.std(ddof=1) / ratios.mean() / np.sqrt(RUNS)
    )


def compare(star, channel, particles, seed, scenario="candle"):
    """One row: both evidences of n, and their difference in combined errors."""
    fit = fit_channel(star, channel, scenario, FitSettings(draws=4000, seed=seed))  # many draws to start from
    numbers = make_problem(star, load_channel(channel), load_scenario(scenario), Priors())
    begun = time.perf_counter()
    draws = fit.draws["prior"]["coordinates"].values.reshape(-1, 8)
    value, error = annealed(numbers, draws, particles, seed)
    return {
        "object": star.name, "channel": channel, "scenario": scenario, "status": fit.status.value,
        "annealed": value, "annealed_err": error, "fitted": fit.ln_evidence, "fitted_err": fit.ln_evidence_err,
        "pull": float((fit.ln_evidence - value) / np.hypot(error, fit.ln_evidence_err)),
        "seconds": round(time.perf_counter() - begun, 1),
    }  # fmt: skip


def main():
    parser = argparse.ArgumentParser(
        description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter
    )
    parser.add_argument("--particles", type=int, default=2000)
    parser.add_argument("--seed", type=int, default=1)
    chosen = parser.parse_args()
    tools.register_scenarios()
    rows = []
    for star in OBJECTS:
        for channel in CHANNELS:
            rows.append(compare(star, channel, chosen.particles, chosen.seed))
            print(rows[-1], flush=True)
    print(recording.write("evidence_annealed", rows, particles=chosen.particles, runs=RUNS, seed=chosen.seed))
    return 0 if max(abs(row["pull"]) for row in rows) < 3.5 else 1


if __name__ == "__main__":
    raise SystemExit(main())
