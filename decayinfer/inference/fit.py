"""Fit one object: every channel under every cooling scenario, each with posterior, prior and evidence."""

import json
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from decayinfer.catalog.pulsar import Pulsar
from decayinfer.channels.base import Channel
from decayinfer.channels.registry import channel_names, load_channel
from decayinfer.channels.rival import Rival
from decayinfer.cooling.registry import choose_scenarios, load_scenario
from decayinfer.cooling.scenario import Scenario
from decayinfer.errors import SamplingError
from decayinfer.inference.coordinates import ln_index_excess, ln_prior
from decayinfer.inference.density import Evaluation, evaluate
from decayinfer.inference.explore import Exploration, explore, survey
from decayinfer.inference.importance import Weighted, rewarp
from decayinfer.inference.outcome import ChannelFit, ObjectFit, Status
from decayinfer.inference.priors import Priors
from decayinfer.inference.problem import Problem, make_problem, with_priors
from decayinfer.inference.reach import out_of_reach
from decayinfer.inference.refine import DISAGREE, decay_target, refine_run
from decayinfer.inference.report import data_tree
from decayinfer.inference.rival import fit_rival
from decayinfer.inference.seeds import named_seeds
from decayinfer.inference.settings import FitSettings
from decayinfer.inference.variants import (
    PRIOR_SETTINGS,
    READINGS,
    Variant,
    ln_reading,
    read_otherwise,
    read_with_noise,
    reweighed,
    stretched,
)
from decayinfer.measurements import Measurement

__all__ = ["fit_channel", "fit_object"]

type Array = NDArray[np.float64]


def fit_object(
    pulsar: Pulsar,
    settings: FitSettings | None = None,
    *,
    on_progress: Callable[[str, str], None] | None = None,
) -> ObjectFit:
    """Fit an object under every channel and cooling scenario of the settings.

    Parameters
    ----------
    pulsar : Pulsar
        The object.
    settings : FitSettings, optional
        Channels, scenarios, lengths, seed and priors.
    on_progress : callable, optional
        Called with the scenario and the channel before each posterior run.

    Returns
    -------
    ObjectFit
        One `ChannelFit` per scenario and channel; a run that fails is one of them, not an exception.

    Examples
    --------
    >>> import decayinfer as di
    >>> star = di.Pulsar(name="Wren 3", period=0.31, period_derivative=4e-14, braking_index=31.0,
    ...                  braking_index_err_minus=1.5, braking_index_err_plus=1.5)
    >>> settings = di.FitSettings(channels=("constant", "phonon"), cooling=("bsk24-protons-iron",))
    >>> fit = di.fit_object(star, settings)
    >>> [(run.channel, run.status.value) for run in fit.fits]
    [('constant', 'unreachable'), ('phonon', 'ok')]
    """
    settings = settings or FitSettings()
    scenarios = choose_scenarios(settings.cooling)
    weights = {name: load_scenario(name).weight for name in scenarios}
    total = sum(weights.values())
    fits = []
    for scenario in scenarios:
        for channel in settings.channels or channel_names():
            if on_progress is not None:
                on_progress(scenario, channel)
            fits.append(fit_channel(pulsar, channel, scenario, settings))
    return ObjectFit(pulsar.name, tuple(fits), {name: weight / total for name, weight in weights.items()})


def fit_channel(pulsar: Pulsar, channel: str, scenario: str, settings: FitSettings) -> ChannelFit:
    """Fit an object under one channel and one cooling scenario.

    The result depends on nothing but the arguments: the seed is made from the run seed and the names.

    Parameters
    ----------
    pulsar : Pulsar
        The object.
    channel, scenario : str
        Registry names.
    settings : FitSettings
        Lengths, seed and priors.

    Raises
    ------
    UnknownNameError
        If a name is in no registry.
    """
    explanation, star = load_channel(channel), load_scenario(scenario)
    seeds = named_seeds(settings.seed, pulsar.name, scenario, channel)
    blank = ChannelFit(pulsar.name, scenario, channel, Status.FAILED)
    try:
        if isinstance(explanation, Rival):
            return fit_rival(pulsar, explanation, star, settings, seeds)
        problem = make_problem(pulsar, explanation, star, settings.priors)
        return _fit(blank, pulsar, explanation, star, problem, seeds, settings)
    except SamplingError as error:
        return replace(blank, reason=str(error), flags=("failed",))


def _fit(
    blank: ChannelFit,
    pulsar: Pulsar,
    channel: Channel,
    scenario: Scenario,
    problem: Problem,
    seeds: np.random.SeedSequence,
    settings: FitSettings,
) -> ChannelFit:
    without, within = seeds.spawn(2)
    refined = _Refiner(channel, scenario, pulsar.measurements, np.random.default_rng(seeds.spawn(1)[0]))
    found = survey(problem.without_index(), settings, without)
    prior, tails = refined(found, problem.without_index())
    attributes = {
        "object": pulsar.name, "scenario": blank.scenario, "channel": channel.name,
        "seed": settings.seed, "settings": json.dumps(settings.as_dict()),
    }  # fmt: skip
    reason = _out_of_reach(problem, channel, found, settings)
    if reason:
        draws = data_tree(problem, channel, prior, None, attributes)
        return replace(
            blank, status=Status.UNREACHABLE, reason=reason, ln_evidence=-np.inf, ln_evidence_err=0.0,
            ln_evidence_joint=-np.inf, ln_evidence_joint_err=0.0, gradients=prior.gradients,
            flags=("unreachable",), draws=draws,
            variants=_noise_alone(pulsar, problem, prior.weighted, settings.priors),
        )  # fmt: skip
    if channel.decays:
        wider = rewarp(found.points.reshape(-1, found.points.shape[-1]), problem.without_index(), problem)
        posterior, tails = refined(explore(problem, settings, within, wider=wider), problem)
        joint, joint_err = posterior.weighted.ln_evidence, posterior.weighted.ln_evidence_err
        conditional = joint - prior.weighted.ln_evidence
        conditional_err = float(np.hypot(joint_err, prior.weighted.ln_evidence_err))
        gradients = prior.gradients + posterior.gradients
        variants = _variants(pulsar, problem, prior.weighted, posterior.weighted, settings.priors)
    else:
        # n = 3 whatever the coordinates: the likelihood is one number and the posterior is the prior
        posterior = prior
        conditional = float(evaluate(prior.points[0, :1], problem).ln_likelihood[0])
        conditional_err, joint_err = 0.0, prior.weighted.ln_evidence_err
        joint = conditional + prior.weighted.ln_evidence
        gradients = prior.gradients
        variants = _constant_variants(problem, pulsar, settings.priors)
    converged = prior.converged and posterior.converged
    return replace(
        blank,
        status=Status.OK if converged else Status.FAILED,
        reason="" if converged else _shortcoming(prior, posterior),
        ln_evidence=conditional,
        ln_evidence_err=conditional_err,
        ln_evidence_joint=joint,
        ln_evidence_joint_err=joint_err,
        ess_bulk_min=min(prior.quality.ess_bulk, posterior.quality.ess_bulk),
        ess_tail_min=min(prior.quality.ess_tail, posterior.quality.ess_tail),
        r_hat_max=max(prior.quality.r_hat, posterior.quality.r_hat),
        divergences=int(posterior.diverging.sum()),
        gradients=gradients,
        flags=_flags(posterior, converged, pulsar.measurements, tails),
        variants=variants,
        draws=data_tree(problem, channel, prior, posterior, attributes),
    )


@dataclass(frozen=True)
class _Refiner:
    """Multiplies densities by the likelihood of what was measured beside P, Pdot and n."""

    channel: Channel
    scenario: Scenario
    measurements: tuple[Measurement, ...]
    rng: np.random.Generator

    def __call__(self, run: Exploration, problem: Problem) -> tuple[Exploration, dict[str, float]]:
        target = decay_target(problem, self.channel, self.scenario)
        return refine_run(run, target, problem.active, self.measurements, self.rng)


def _variants(
    pulsar: Pulsar, problem: Problem, prior: Weighted, posterior: Weighted, priors: Priors
) -> dict[str, Variant]:
    """Evidence under other readings of n and other prior settings, from the points behind the default."""
    without = problem.without_index()
    before, after = _evaluated(prior, without), _evaluated(posterior, problem)
    found = read_otherwise(
        (prior, _indices(before)), (posterior, _indices(after)), tuple(problem.index), pulsar, priors
    )
    for name, factor in PRIOR_SETTINGS.items():
        other = with_priors(problem, stretched(priors, factor))
        changes = _change(prior, before, other.without_index()), _change(posterior, after, other)
        found[name] = reweighed(prior, posterior, *changes)
    return found


def _noise_alone(pulsar: Pulsar, problem: Problem, prior: Weighted, priors: Priors) -> dict[str, Variant]:
    """The variant that an index out of reach has: with spin noise, it may be noise on top of what the channel gives."""
    indices = _indices(_evaluated(prior, problem.without_index()))
    return {"with-noise": read_with_noise((prior, indices), tuple(problem.index), pulsar, priors)}


def _evaluated(weighted: Weighted, problem: Problem) -> Evaluation:
    return weighted.evaluation or evaluate(weighted.points, problem)


def _indices(evaluation: Evaluation) -> Array:
    indices: Array = evaluation.physical.index + np.zeros_like(evaluation.ln_prior)
    return indices


def _change(weighted: Weighted, evaluation: Evaluation, other: Problem) -> Array:
    """Change of the log prior density at weighted points when the priors become those of another problem."""
    with np.errstate(all="ignore"):
        change: Array = ln_prior(list(weighted.points.T), evaluation.history, other) - evaluation.ln_prior
    return np.where(np.isfinite(evaluation.ln_prior), change, 0.0)


def _constant_variants(problem: Problem, pulsar: Pulsar, priors: Priors) -> dict[str, Variant]:
    """The same where n = 3 whatever the coordinates: no prior moves the conditional evidence."""
    three, measured = np.array([3.0]), tuple(problem.index)
    values = {r: float(ln_reading(r, three, measured, pulsar, priors)[0]) for r in READINGS}
    settings = dict.fromkeys(PRIOR_SETTINGS, values["scattered"])
    return {name: (value, 0.0) for name, value in (values | settings).items() if name != "scattered"}


def _out_of_reach(problem: Problem, channel: Channel, prior: Exploration, settings: FitSettings) -> str:
    """Say why a channel cannot give the index, or nothing when it can."""
    highest = float(ln_index_excess(list(np.moveaxis(prior.points, -1, 0)), problem.without_index()).max())
    low = 3.0  # decay only adds to the index of a constant dipole
    high = low + float(np.exp(highest)) if channel.decays else low
    return out_of_reach(
        tuple(problem.index), low, high, settings.priors.scatter_sd,
        where=" at this period and period derivative",
    )  # fmt: skip


def _shortcoming(prior: Exploration, posterior: Exploration) -> str:
    parts = []
    for label, run in (("without n", prior), ("with n", posterior)):
        if not run.converged:
            q = run.quality
            parts.append(
                f"{label}: R-hat {q.r_hat:.3f}, bulk ESS {q.ess_bulk:.0f}, {q.divergences} divergences in "
                f"{q.draws} draws, effective weights {run.weighted.effective_size:.0f}"
            )
    return "did not converge after a longer retry (" + "; ".join(parts) + "); raise --draws and --tune"


def _flags(
    posterior: Exploration,
    converged: bool,
    measurements: Sequence[Measurement],
    tails: Mapping[str, float],
) -> tuple[str, ...]:
    flags = ["weighted"] if measurements else []
    if any(tail < DISAGREE for tail in tails.values()):
        flags.append("measurements-disagree")
    if not converged:
        flags.append("poor-mixing")
    if posterior.topped_up:
        flags.append("topped-up")
    if posterior.retried:
        flags.append("retried")
    if posterior.weighted.ln_evidence_err > 0.05:
        flags.append("evidence-noisy")
    return tuple(flags)
