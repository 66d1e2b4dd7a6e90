"""Effective draws per second against a plain ensemble sampler, with a chain long enough to know its own.

    python tests/studies/ensemble_efficiency.py --channel impurity+phonon+hall --seconds 1800

tests/benchmarks/test_sampling.py runs the ensemble for a minute, too short for its autocorrelation time. Here it runs
until that time is known: both its bulk effective size (walkers counted as chains) and steps times walkers over the
autocorrelation time are recorded, at several lengths of the chain, so that it shows whether they have settled.
"""

import argparse
import logging
import sys
import time
from pathlib import Path

import numpy as np

sys.path[:0] = [
    str(Path(__file__).parent),
    *(str(Path(__file__).parents[1] / f) for f in ("inference", "benchmarks")),
]

import ensemble  # noqa: E402
import forward  # noqa: E402
import recording  # noqa: E402

from decayinfer.catalog.pulsar import Pulsar  # noqa: E402
from decayinfer.channels.registry import load_channel  # noqa: E402
from decayinfer.cooling.registry import load_scenario  # noqa: E402
from decayinfer.inference.density import evaluate  # noqa: E402
from decayinfer.inference.diagnostics import bulk_ess, r_hat  # noqa: E402
from decayinfer.inference.explore import explore  # noqa: E402
from decayinfer.inference.priors import Priors  # noqa: E402
from decayinfer.inference.problem import make_problem  # noqa: E402
from decayinfer.inference.settings import FitSettings  # noqa: E402

#: Invented, as in the benchmarks.
STAR = Pulsar(
    name="Sedge", period=0.31, period_derivative=4e-14, braking_index=21.0,
    braking_index_err_minus=1.05, braking_index_err_plus=1.05,
)  # fmt: skip


def main():
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    parser.add_argument("--channel", default="impurity+phonon+hall")
    parser.add_argument("--cooling", default="candle")
    parser.add_argument("--seconds", type=float, default=1800.0)
    parser.add_argument("--seed", type=int, default=3)
    asked = parser.parse_args()
    problem = make_problem(STAR, load_channel(asked.channel), load_scenario(asked.cooling), Priors())
    explore(problem, FitSettings(), np.random.SeedSequence(1))  # loads what is loaded once
    begun = time.process_time()
    found = explore(problem, FitSettings(), np.random.SeedSequence(2))
    took = time.process_time() - begun

    plain = ensemble.PlainPosterior(forward, STAR, asked.channel, asked.cooling)
    draws = found.points.reshape(-1, 8)[:: found.points.size // 8 // 32]
    names = [ensemble.NAMES[i] for i in plain.free]
    starts = ensemble.free_of(evaluate(draws, problem).physical, names)
    logging.disable(logging.WARNING)
    chain, seconds = ensemble.sample(plain, starts, seconds=asked.seconds, seed=asked.seed)
    rows = []
    for part in (8, 4, 2, 1):
        steps = chain.shape[1] // part
        cut, spent = chain[:, :steps], seconds / part
        tau = ensemble.autocorrelation_time(cut)
        sizes = {"bulk": float(np.min(bulk_ess(cut))), "autocorrelation": cut.shape[0] * steps / tau}
        row = {
            "steps": steps,
            "seconds": spent,
            "autocorrelation_time": tau,
            "r_hat": float(np.max(r_hat(cut))),
        }
        for name, size in sizes.items():
            row |= {f"ess_{name}": size, f"ratio_{name}": found.quality.ess_bulk / took * spent / size}
        rows.append(row)
        print(row, flush=True)
    recording.write(
        f"ensemble_efficiency-{asked.channel}", rows, cooling=asked.cooling, walkers=chain.shape[0], seed=asked.seed,
        ess_bulk=found.quality.ess_bulk, seconds=took,
    )  # fmt: skip


if __name__ == "__main__":
    main()
