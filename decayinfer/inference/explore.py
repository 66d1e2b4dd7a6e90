"""Explore one density: NUTS, evidence by importance sampling, and a longer retry when either is poor."""

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from decayinfer.inference.density import evaluate
from decayinfer.inference.diagnostics import bulk_ess, r_hat, tail_ess
from decayinfer.inference.engine import NutsRun, engine
from decayinfer.inference.importance import Weighted, importance_sample
from decayinfer.inference.pilot import disagreement, pilot
from decayinfer.inference.problem import Problem
from decayinfer.inference.settings import FitSettings

__all__ = ["Exploration", "Quality", "Standard", "drawn_by_weights", "explore", "survey"]

type Array = NDArray[np.float64]


@dataclass(frozen=True)
class Standard:
    """What draws must reach to be reported as converged."""

    r_hat: float = 1.01
    ess: float = 400.0
    divergent: float = 0.005
    pareto_k: float = 0.7


@dataclass(frozen=True)
class Quality:
    """Worst diagnostics over the coordinates in use."""

    ess_bulk: float
    ess_tail: float
    r_hat: float
    divergences: int
    draws: int

    def meets(self, standard: Standard) -> bool:
        """Whether every diagnostic is within the standard."""
        return bool(
            self.ess_bulk >= standard.ess
            and self.ess_tail >= standard.ess / 4.0
            and self.r_hat <= standard.r_hat
            and self.divergences <= standard.divergent * self.draws
        )


@dataclass(frozen=True)
class Exploration:
    """Draws and evidence of one density.

    Attributes
    ----------
    points : (chains, draws, 8) array
        Coordinates.
    diverging : (chains, draws) array of bool
        Divergent transitions among them.
    quality : Quality
        Diagnostics of the points.
    weighted : Weighted
        Importance sample behind the evidence.
    gradients : int
        Gradient evaluations spent.
    converged, topped_up, retried : bool
        Whether the points meet the standard, come from importance weights, or took a longer run.
    """

    points: Array
    diverging: NDArray[np.bool_]
    quality: Quality
    weighted: Weighted
    gradients: int
    converged: bool
    topped_up: bool = False
    retried: bool = False


STANDARD = Standard()
_PROPOSALS = 4000
_CANDIDATES = 150
_REFITS = (2, 2, 6)  # times the proposals
_SHORT = 250  # draws and warm-up of chains that need only find the density
_STRETCH = 4  # a retry has this many times the draws
_LONG = 35  # gradients per draw of short chains beyond which longer ones are not worth their time
_FAR = 3.5  # standard deviations between chains and weights that mean a missed mode


def explore(
    problem: Problem, settings: FitSettings, seeds: np.random.SeedSequence, *, wider: Array | None = None
) -> Exploration:
    """Sample a density and integrate it.

    Parameters
    ----------
    problem : Problem
        The density.
    settings : FitSettings
        Lengths of the run.
    seeds : numpy.random.SeedSequence
        Source of every random number.
    wider : (k, 8) array, optional
        Draws of a wider density, for the importance proposal.

    Raises
    ------
    SamplingError
        If the sampler cannot start.
    """
    first, second = seeds.spawn(2)
    tried = _attempt(problem, settings, first, wider, longer=False)
    if tried.converged:
        return tried
    again = _attempt(problem, settings, second, wider, longer=True)
    gradients = tried.gradients + again.gradients
    return Exploration(**(vars(again) | {"gradients": gradients, "retried": True}))


def survey(problem: Problem, settings: FitSettings, seeds: np.random.SeedSequence) -> Exploration:
    """Integrate a density that is wanted for its evidence and for comparison: the prior at this P and Pdot.

    Short chains find it, a mixture fitted to them proposes, and the weights supply the draws; where the weights are
    not good enough it is explored like any other.

    Parameters
    ----------
    problem, settings, seeds
        As in `explore`.

    Raises
    ------
    SamplingError
        If the sampler cannot start.
    """
    first, second = seeds.spawn(2)
    rng = np.random.default_rng(first)
    short = replace(settings, draws=min(_SHORT, settings.draws), tune=min(_SHORT, settings.tune))
    run = _sample(problem, short, rng, longer=False)
    wider = pilot(problem, rng)
    draws = run.points.reshape(-1, run.points.shape[-1])
    quality = _quality(problem.active, run.points, run.diverging)
    for more in (1, *_REFITS):
        weighted = importance_sample(problem, draws, more * _PROPOSALS, rng, wider=wider)
        if sound := _sound(weighted, 2.0 * STANDARD.ess):
            break
        draws = weighted.resample(_PROPOSALS // 2, rng)
    good = sound and _agree(problem, run.points.reshape(-1, run.points.shape[-1]), weighted, quality)
    if not good and run.gradients <= _LONG * settings.chains * (short.draws + short.tune):
        return explore(problem, settings, second)
    drawn = _topped_up(problem, settings, run, quality, weighted, rng)
    return replace(drawn, converged=drawn.converged and good)


def _attempt(
    problem: Problem,
    settings: FitSettings,
    seeds: np.random.SeedSequence,
    wider: Array | None,
    *,
    longer: bool,
) -> Exploration:
    stretch = _STRETCH if longer else 1
    rng = np.random.default_rng(seeds)
    run = _sample(problem, settings, rng, longer=longer)
    flat = run.points.reshape(-1, run.points.shape[-1])
    wider = pilot(problem, rng) if wider is None else wider
    weighted = importance_sample(problem, flat, stretch * _PROPOSALS, rng, wider=wider)
    quality = _quality(problem.active, run.points, run.diverging)
    mixed = quality.meets(STANDARD) and _agree(problem, flat, weighted, quality)
    converged = mixed and _sound(weighted, STANDARD.ess)
    for more in () if converged else _REFITS:
        # refit to the weighted draws: the proposal inherits what made the chains mix poorly
        refitted = weighted.resample(flat.shape[0], rng)
        weighted = importance_sample(problem, refitted, more * stretch * _PROPOSALS, rng, wider=wider)
        if converged := mixed and _sound(weighted, STANDARD.ess):
            break
        if _sound(weighted, 2.0 * STANDARD.ess):
            return _topped_up(problem, settings, run, quality, weighted, rng)
    points, diverging = run.points[:, -settings.draws :], run.diverging[:, -settings.draws :]
    if longer and converged:
        points, diverging = run.points[:, stretch - 1 :: stretch], run.diverging[:, stretch - 1 :: stretch]
    return Exploration(points, diverging, quality, weighted, run.gradients, converged)


def _sample(problem: Problem, settings: FitSettings, rng: np.random.Generator, *, longer: bool) -> NutsRun:
    return engine().sample(
        problem,
        lambda seed: _start(problem, np.random.default_rng(seed)),
        draws=(_STRETCH if longer else 1) * settings.draws,
        tune=(2 if longer else 1) * settings.tune,
        chains=settings.chains,
        seed=int(rng.integers(2**31)),
        target_accept=0.95 if longer else 0.8,
    )


def _sound(weighted: Weighted, least: float) -> bool:
    return weighted.effective_size >= least and weighted.pareto_k < STANDARD.pareto_k


def _agree(problem: Problem, draws: Array, weighted: Weighted, quality: Quality) -> bool:
    """Whether chains and weights describe one distribution; they do not where the chains missed a mode."""
    used = problem.active > 0.0
    distance = disagreement(draws[:, used], weighted.points[:, used], weighted.weights)
    return distance < _FAR * 0.5 * float(np.sqrt(1.0 / quality.ess_bulk + 1.0 / weighted.effective_size))


def _topped_up(
    problem: Problem,
    settings: FitSettings,
    run: NutsRun,
    quality: Quality,
    weighted: Weighted,
    rng: np.random.Generator,
) -> Exploration:
    found = Exploration(
        run.points, run.diverging, quality, weighted, run.gradients, converged=False, topped_up=True
    )
    return drawn_by_weights(found, weighted, problem.active, (settings.chains, settings.draws), rng)


def drawn_by_weights(
    run: Exploration, weighted: Weighted, active: Array, shape: tuple[int, int], rng: np.random.Generator
) -> Exploration:
    """Return an exploration whose draws are resampled from weights; whether those are sound is for the caller to say.

    Parameters
    ----------
    run : Exploration
        What the weights were found from.
    weighted : Weighted
        Weighted points of the density.
    active : (8,) array
        1 for each coordinate in use.
    shape : (int, int)
        Number of chains and draws.
    rng : numpy.random.Generator
        Source of randomness.
    """
    points = weighted.resample(shape[0] * shape[1], rng).reshape(*shape, active.size)
    independent = np.zeros(shape, dtype=bool)
    found, worth = _quality(active, points, independent), weighted.effective_size
    # resampled draws repeat: they are worth no more than the weights they came from
    quality = replace(found, ess_bulk=min(found.ess_bulk, worth), ess_tail=min(found.ess_tail, worth))
    return replace(
        run,
        points=points,
        diverging=independent,
        quality=quality,
        weighted=weighted,
        converged=quality.meets(STANDARD),
    )


def _start(problem: Problem, rng: np.random.Generator) -> Array:
    """Best of a cloud of candidates: the warm-up then never begins beyond the wall of infinite birth field."""
    phonon, umklapp = problem.normals[0, 0], problem.normals[0, 6]
    centre = np.array([-1.0, 0.0, -0.7, -0.7, -0.7, 0.5, umklapp, phonon])
    spread = np.array([1.0, 0.7, 1.5, 1.2, 1.5, 1.0, 0.3, 1.0])
    cloud = rng.standard_normal((_CANDIDATES, centre.size))
    cloud = np.where(problem.active > 0.0, centre + spread * cloud, cloud)
    best: Array = cloud[np.argmax(evaluate(cloud, problem).ln_density(problem))]
    return best


def _quality(active: Array, points: Array, diverging: NDArray[np.bool_]) -> Quality:
    used = points[:, :, active > 0.0]
    return Quality(
        ess_bulk=float(np.min(bulk_ess(used))),
        ess_tail=float(np.min(tail_ess(used))),
        r_hat=float(np.max(r_hat(used))),
        divergences=int(diverging.sum()),
        draws=diverging.size,
    )
