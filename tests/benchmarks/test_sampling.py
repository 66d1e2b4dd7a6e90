"""Effective draws per second against a plain ensemble sampler with an adaptive ODE solver."""

import logging
import time

import numpy as np
import pytest

from decayinfer.inference.density import evaluate
from decayinfer.inference.diagnostics import bulk_ess, r_hat
from decayinfer.inference.explore import explore
from decayinfer.inference.settings import FitSettings

SECONDS = 60.0
SETTINGS = FitSettings()


@pytest.mark.benchmark
@pytest.mark.parametrize("channel", ["impurity+phonon+hall", "phonon"])
def test_effective_draws_per_second(bench, say, ensemble, forward, channel):
    """At least 300 times those of the ensemble, same object, channel, priors and measurement of n.

    Both by the bulk effective size of the parameter that mixes worst, walkers counted as chains, and by
    processor time. The walkers start on draws of the posterior, which gives the ensemble as many effective draws.
    """
    star = bench.stars[1]
    problem = bench.problem(star, channel)
    explore(problem, SETTINGS, np.random.SeedSequence(1))  # loads what is loaded once
    begun = time.process_time()
    found = explore(problem, SETTINGS, np.random.SeedSequence(2))
    took = time.process_time() - begun
    ours = found.quality.ess_bulk / took

    plain = ensemble.PlainPosterior(forward, star, channel, bench.scenario)
    names = [ensemble.NAMES[i] for i in plain.free]
    draws = found.points.reshape(-1, 8)[:: found.points.size // 8 // 32]
    starts = ensemble.free_of(evaluate(draws, problem).physical, names)
    # it is the same posterior: the equations lead from the draws to this P, Pdot and n
    for start, index in zip(starts[:3], evaluate(draws[:3], problem).physical.index, strict=True):
        x = plain.default.copy()
        x[plain.free] = start
        expected = [np.log(star.period), np.log(star.period_derivative), index]
        np.testing.assert_allclose(plain.today(x), expected, rtol=1e-3)

    chain, seconds = ensemble.sample(plain, starts, seconds=SECONDS, seed=3)
    size = float(np.min(bulk_ess(chain)))
    logging.disable(logging.WARNING)  # the chain is short on purpose, and its message says so below
    tau = ensemble.autocorrelation_time(chain)
    logging.disable(logging.NOTSET)
    short = chain.shape[1] < 50 * tau
    say(
        f"{channel}: least bulk ESS {found.quality.ess_bulk:.0f} in {took:.2f} s, evidence included; ensemble "
        f"{size:.0f} in {seconds:.0f} s, {chain.shape[1]} steps of {chain.shape[0]} walkers; ratio "
        f"{ours * seconds / size:.0f}"
    )
    say(
        f"  ensemble: autocorrelation time {tau:.0f} steps, R-hat {float(np.max(r_hat(chain))):.2f}"
        + ("; the chain is too short for either, so the ratio is a lower bound" if short else "")
    )
    assert ours >= 300.0 * size / seconds
