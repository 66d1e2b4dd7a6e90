"""Fit a rival of decay: posterior, prior and evidence by adaptive importance sampling, without chains.

Few coordinates and no history to integrate: thousands of points cost milliseconds, so draws come from weights
throughout.
"""

import json
from contextlib import suppress
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from decayinfer.catalog.pulsar import Pulsar
from decayinfer.channels.decay import CONSTANT
from decayinfer.channels.rival import Rival
from decayinfer.cooling.scenario import Scenario
from decayinfer.errors import SamplingError
from decayinfer.inference.annealing import POINTS, Normal, anneal, sound
from decayinfer.inference.importance import Weighted
from decayinfer.inference.outcome import ChannelFit, Status
from decayinfer.inference.problem import make_problem
from decayinfer.inference.reach import out_of_reach
from decayinfer.inference.refine import DISAGREE, contradiction
from decayinfer.inference.report import assemble
from decayinfer.inference.rival_density import (
    SHARED,
    Evaluated,
    Pinned,
    RivalProblem,
    evaluate_rival,
    pinnable,
    rival_parameters,
)
from decayinfer.inference.rival_variants import rival_variants
from decayinfer.inference.settings import FitSettings
from decayinfer.inference.state import ln_measured, state_of
from decayinfer.measurements import State

__all__ = ["fit_rival", "integrate_posterior", "integrate_prior", "make_rival_problem"]

type Array = NDArray[np.float64]

_INFORMED = (
    400.0  # prior draws that a likelihood leaves effective, below which the index becomes a coordinate
)
_PINNED_SD = 1.5  # of the first proposal in that coordinate
_CROWDED = 0.05  # share of the prior that counts as crowding
_MINOR = 0.02  # error of the evidence from what pinning does not reach that is left alone
_NOISY = 0.05  # error of a ln evidence that is flagged


def make_rival_problem(
    pulsar: Pulsar, rival: Rival, scenario: Scenario, settings: FitSettings
) -> RivalProblem:
    """Collect what one posterior problem of a rival is made of."""
    observed, minus, plus, limit = make_problem(pulsar, CONSTANT, scenario, settings.priors).index
    index = float(observed), float(minus), float(plus), float(limit)
    return RivalProblem(pulsar, rival, scenario, settings.priors, index)


def fit_rival(
    pulsar: Pulsar, rival: Rival, scenario: Scenario, settings: FitSettings, seeds: np.random.SeedSequence
) -> ChannelFit:
    """Fit an object under a rival.

    Parameters
    ----------
    pulsar : Pulsar
        The object.
    rival : Rival
        The explanation.
    scenario : Scenario
        Gives radius, inertia and crust temperature, nothing else.
    settings : FitSettings
        Number of draws, and priors.
    seeds : numpy.random.SeedSequence
        Source of every random number.

    Raises
    ------
    SamplingError
        If the density vanishes wherever it is tried.
    """
    problem = make_rival_problem(pulsar, rival, scenario, settings)
    attributes = {
        "object": pulsar.name, "scenario": scenario.name, "channel": rival.name,
        "seed": settings.seed, "settings": json.dumps(settings.as_dict()),
    }  # fmt: skip
    rng = np.random.default_rng(seeds)
    labels = pulsar.name, scenario.name, rival.name
    prior = integrate_prior(problem, rng)
    reason = out_of_reach(problem.index, rival.low, rival.high, settings.priors.scatter_sd)
    if reason:
        tree = assemble(_groups(problem, settings, rng, prior, None), _names(rival), attributes)
        return ChannelFit(
            *labels, Status.UNREACHABLE, reason=reason, ln_evidence=-np.inf, ln_evidence_err=0.0,
            ln_evidence_joint=-np.inf, ln_evidence_joint_err=0.0, flags=("unreachable",), draws=tree,
            variants=rival_variants(problem, prior, None, rng, _integrate),
        )  # fmt: skip
    posterior = integrate_posterior(problem, prior, rng)
    good = sound(prior) and sound(posterior)
    worth = min(prior.effective_size, posterior.effective_size)
    err = float(np.hypot(prior.ln_evidence_err, posterior.ln_evidence_err))
    return ChannelFit(
        *labels,
        Status.OK if good else Status.FAILED,
        reason="" if good else _shortcoming(prior, posterior),
        ln_evidence=posterior.ln_evidence - prior.ln_evidence,
        ln_evidence_err=err,
        ln_evidence_joint=posterior.ln_evidence,
        ln_evidence_joint_err=posterior.ln_evidence_err,
        ess_bulk_min=worth,
        ess_tail_min=worth,
        flags=(
            "weighted",
            *(() if good else ("poor-mixing",)),
            *(("evidence-noisy",) if err > _NOISY else ()),
            *(("measurements-disagree",) if _disagree(problem, rng) else ()),
        ),
        draws=assemble(_groups(problem, settings, rng, prior, posterior), _names(rival), attributes),
        variants=rival_variants(problem, prior, posterior, rng, _integrate),
    )


def _disagree(problem: RivalProblem, rng: np.random.Generator) -> bool:
    """Whether the posterior without the further measurements all but excludes one of them."""
    measurements = problem.pulsar.measurements
    if not measurements:
        return False
    bare = replace(problem, pulsar=replace(problem.pulsar, measurements=()))
    alone = _integrate(bare, rng)[1]
    state = _state(evaluate_rival(alone.points, bare), bare)
    return any(contradiction(alone, state, each) < DISAGREE for each in measurements)


def _state(e: Evaluated, problem: RivalProblem) -> State:
    with np.errstate(all="ignore"):  # far points overflow, and weigh nothing
        known = rival_parameters(e.spin, e.response, problem.rival, problem.scenario)
        return state_of(known, problem.scenario)


def _integrate(problem: RivalProblem, rng: np.random.Generator) -> tuple[Weighted, Weighted]:
    prior = integrate_prior(problem, rng)
    return prior, integrate_posterior(problem, prior, rng)


def integrate_prior(problem: RivalProblem, rng: np.random.Generator) -> Weighted:
    """Integrate the density given P and Pdot, without n.

    Raises
    ------
    SamplingError
        If the density vanishes wherever it is tried.
    """
    return _broad(_Density(problem, with_index=False), rng)


def integrate_posterior(problem: RivalProblem, prior: Weighted, rng: np.random.Generator) -> Weighted:
    """Integrate the density with the likelihood of n.

    A well-measured index is made a coordinate where the rival can (`Rival.pin`).

    Parameters
    ----------
    problem : RivalProblem
        The problem.
    prior : Weighted
        Result of `integrate_prior`.
    rng : numpy.random.Generator
        Source of randomness.

    Raises
    ------
    SamplingError
        If the density vanishes wherever it is tried.
    """
    if not _informs_little(problem, prior):
        apart = replace(problem, least_excess=_least_excess(problem, prior))
        found = _in_parts(_Density(apart, with_index=True), Pinned.INDEX, rng)
        if sound(found):
            return found
    return _broad(_Density(problem, with_index=True), rng)


@dataclass(frozen=True)
class _Density:
    """Log density of a problem in unpinned or pinned coordinates, whole or in parts."""

    problem: RivalProblem
    with_index: bool

    def whole(self, points: Array) -> Array:
        return self._of(evaluate_rival(points, self.problem))

    def rest(self, points: Array, what: Pinned) -> Array:
        e = evaluate_rival(points, self.problem)
        return np.where(pinnable(e, self.problem, what), -np.inf, self._of(e))

    def reached(self, points: Array, what: Pinned) -> Array:
        e = evaluate_rival(points, self.problem.pin(what))
        return np.where(pinnable(e, self.problem, what), self._of(e) + e.ln_pinned, -np.inf)

    def _of(self, e: Evaluated) -> Array:
        total = e.ln_prior + e.ln_likelihood if self.with_index else e.ln_prior
        measurements = self.problem.pulsar.measurements
        return total + ln_measured(_state(e, self.problem), measurements) if measurements else total


def _broad(density: _Density, rng: np.random.Generator) -> Weighted:
    """Integrate from draws of the prior; a Pdot that is hardly the star's own is rare among them, and set apart."""
    if density.problem.rival.pin_ratio is not None:
        return _in_parts(density, Pinned.RATIO, rng)
    return anneal(density.whole, _start(density.problem), rng)


def _in_parts(density: _Density, what: Pinned, rng: np.random.Generator) -> Weighted:
    """Integrate apart, and add, what a pinned coordinate reaches and the rest."""
    problem, start = density.problem, _start(density.problem)
    points = start.sample(POINTS, rng)
    rest = Weighted(points, density.rest(points, what) - start.ln_density(points))
    try:
        reached = anneal(lambda z: density.reached(z, what), _start(problem.pin(what)), rng)
    except SamplingError:  # a glitch cannot lower an index, for one
        return anneal(density.whole, start, rng)
    reached = Weighted(evaluate_rival(reached.points, problem.pin(what)).coordinates, reached.ln_weights)
    if not np.isfinite(rest.ln_weights).any():
        return reached
    share = np.exp(rest.ln_evidence - np.logaddexp(rest.ln_evidence, reached.ln_evidence))
    if share * rest.ln_evidence_err > _MINOR:
        with suppress(SamplingError):  # so little that new points miss it: the few there are must do
            rest = anneal(lambda z: density.rest(z, what), start, rng)
    return _together(reached, rest)


def _least_excess(problem: RivalProblem, prior: Weighted) -> float:
    """A tenth of the error where the prior crowds the index within that of 3, else nothing."""
    edge = 0.05 * (problem.index[1] + problem.index[2])
    excess = np.abs(evaluate_rival(prior.points, problem).response.braking_index - 3.0)
    return edge if prior.weights[excess < edge].sum() > _CROWDED else 0.0


def _informs_little(problem: RivalProblem, prior: Weighted) -> bool:
    """Whether draws of the prior meet the likelihood often enough, or nothing better is to be had."""
    if problem.rival.pin is None or problem.index[3]:
        return True
    ln_likelihood = evaluate_rival(prior.points, problem).ln_likelihood
    met = Weighted(prior.points, prior.ln_weights + ln_likelihood)
    return bool(np.isfinite(met.ln_weights).any()) and met.effective_size >= _INFORMED


def _together(*parts: Weighted) -> Weighted:
    """Join weighted points of parts of a domain: integrals add."""
    count = sum(part.ln_weights.size for part in parts)
    return Weighted(
        np.concatenate([part.points for part in parts]),
        np.concatenate([part.ln_weights + np.log(count / part.ln_weights.size) for part in parts]),
    )


def _start(problem: RivalProblem) -> Normal:
    """Return the first proposal: the prior of the coordinates, wider in a pinned one."""
    sds = np.ones(problem.size)
    if problem.pinned is not Pinned.NOTHING:
        sds[len(SHARED)] = _PINNED_SD
    return Normal(sds)


def _names(rival: Rival) -> tuple[str, ...]:
    return SHARED + rival.coordinates


def _groups(
    problem: RivalProblem,
    settings: FitSettings,
    rng: np.random.Generator,
    prior: Weighted,
    posterior: Weighted | None,
) -> dict[str, dict[str, NDArray[np.generic]]]:
    shape = settings.chains, settings.draws
    before = evaluate_rival(prior.resample(shape[0] * shape[1], rng), problem)
    never = np.zeros(shape, dtype=bool)
    groups: dict[str, dict[str, NDArray[np.generic]]] = {
        "prior": _variables(before, problem, shape),
        "prior_sample_stats": {"diverging": never},
        "observed_data": {"braking_index": np.asarray(problem.index[0])},
    }
    if posterior is None:
        return groups
    after = evaluate_rival(posterior.resample(shape[0] * shape[1], rng), problem)
    likelihood, ln_prior = after.ln_likelihood.reshape(shape), after.ln_prior.reshape(shape)
    return groups | {
        "posterior": _variables(after, problem, shape),
        "sample_stats": {"diverging": never, "lp": likelihood + ln_prior},
        "log_likelihood": {"braking_index": likelihood},
        "log_prior": {"all_coordinates": ln_prior},
    }


def _variables(e: Evaluated, problem: RivalProblem, shape: tuple[int, int]) -> dict[str, NDArray[np.generic]]:
    found = rival_parameters(e.spin, e.response, problem.rival, problem.scenario)
    own = {name: values.reshape(shape) for name, values in found.items()}
    return {"coordinates": e.coordinates.reshape(*shape, -1), **own}


def _shortcoming(prior: Weighted, posterior: Weighted) -> str:
    parts = [
        f"{label}: effective weights {run.effective_size:.0f}, Pareto k {run.pareto_k:.2f}"
        for label, run in (("without n", prior), ("with n", posterior))
        if not sound(run)
    ]
    return "the importance weights stayed poor (" + "; ".join(parts) + ")"
