"""Further measurements enter a density that is already sampled: weights, evidence, and contradictions.

The weighted points of the density are multiplied by the likelihood of the measurements. Where that leaves too few of
them, a mixture fitted to the density is carried to the product by adaptive importance sampling
(`decayinfer.inference.annealing`): age and temperature are functions of the coordinates that no chain needs to run
again for.
"""

from collections.abc import Callable, Sequence
from dataclasses import replace

import numpy as np
from numpy.typing import NDArray

from decayinfer.channels.base import Channel
from decayinfer.cooling.scenario import Scenario
from decayinfer.errors import SamplingError
from decayinfer.inference.annealing import anneal, sound
from decayinfer.inference.density import evaluate
from decayinfer.inference.explore import Exploration, drawn_by_weights
from decayinfer.inference.importance import Weighted
from decayinfer.inference.problem import Problem
from decayinfer.inference.proposal import fit_mixture
from decayinfer.inference.report import parameters
from decayinfer.inference.state import ln_measured, state_of
from decayinfer.measurements import Measurement, State

__all__ = ["DISAGREE", "Target", "contradiction", "contradictions", "decay_target", "refine", "refine_run"]

type Array = NDArray[np.float64]

#: What refinement needs of a density: log density and states of points, (n, d) to (n,) and `State`.
type Target = Callable[[Array], tuple[Array, State]]

DISAGREE = 0.003  #: tail probability below which a measurement contradicts the rest: three sigma
_WANTED = 1000.0  # effective points that reweighting alone must leave
_LARGER = 4  # times the points, where the usual ones could not follow the product
_FITTED = 2000  # draws that the mixture of the density is fitted to
_LN_2PI = float(np.log(2.0 * np.pi))


def decay_target(problem: Problem, channel: Channel, scenario: Scenario) -> Target:
    """Return the density of a problem with the states of its points."""

    def target(points: Array) -> tuple[Array, State]:
        evaluation = evaluate(points, problem)
        with np.errstate(all="ignore"):
            known = parameters(evaluation, problem, channel)
        return evaluation.ln_density(problem), state_of(known, scenario)

    return target


def refine(
    target: Target,
    active: Array,
    weighted: Weighted,
    measurements: Sequence[Measurement],
    rng: np.random.Generator,
) -> Weighted:
    """Return weighted points of a density times the likelihood of further measurements.

    Parameters
    ----------
    target : callable
        The density, as `decay_target` makes it.
    active : (d,) array
        1 for each coordinate in use; the others are standard normal and independent of the rest.
    weighted : Weighted
        An importance sample of the density.
    measurements : sequence of Measurement
        What was measured beside P, Pdot and n.
    rng : numpy.random.Generator
        Source of randomness.

    Returns
    -------
    Weighted
        Its `ln_evidence` is that of the product. Judge it by `decayinfer.inference.annealing.sound`: measurements that
        the density all but excludes may leave poor weights.

    Raises
    ------
    SamplingError
        If the measurements exclude every point of the density.
    """
    if not measurements:
        return weighted
    ln_likelihood = ln_measured(target(weighted.points)[1], measurements)
    reweighted = replace(weighted, ln_weights=weighted.ln_weights + ln_likelihood)
    if not np.isfinite(reweighted.ln_weights).any():
        names = ", ".join(str(measurement) for measurement in measurements)
        raise SamplingError(f"no star of this channel and scenario agrees with {names}; check those values")
    if reweighted.effective_size >= _WANTED and reweighted.pareto_k < 0.7:
        return reweighted
    used = np.flatnonzero(active)
    start = fit_mixture(weighted.resample(_FITTED, rng)[:, used])
    product = _product(target, active, measurements)
    found = anneal(product, start, rng)
    if not sound(found):
        found = anneal(product, start, rng, scale=_LARGER)
    points = rng.standard_normal((found.ln_weights.size, active.size))
    points[:, used] = found.points
    return Weighted(points, found.ln_weights)


def refine_run(
    run: Exploration,
    target: Target,
    active: Array,
    measurements: Sequence[Measurement],
    rng: np.random.Generator,
) -> tuple[Exploration, dict[str, float]]:
    """Return the exploration of a density times the likelihood of further measurements, and `contradictions`.

    Draws come from the refined weights, as many chains and draws as the run had; without measurements the run is
    returned as it is.

    Parameters
    ----------
    run : Exploration
        Of the density without the measurements.
    target, active, measurements, rng
        As in `refine`.

    Raises
    ------
    SamplingError
        If the measurements exclude every point of the density.
    """
    if not measurements:
        return run, {}
    tails = contradictions(target, run.weighted, measurements)
    weighted = refine(target, active, run.weighted, measurements, rng)
    drawn = drawn_by_weights(run, weighted, active, run.points.shape[:2], rng)
    return replace(drawn, converged=run.converged and sound(weighted)), tails


def contradiction(weighted: Weighted, state: State, measurement: Measurement) -> float:
    """Return how probable it is that a measurement falls as far out as it did, or farther.

    Parameters
    ----------
    weighted : Weighted
        A sample of the posterior without the measurement.
    state : State
        Of its points.
    measurement : Measurement
        What was measured.

    Returns
    -------
    float
        Posterior predictive tail probability, two-sided for a value; for a limit the probability that it is obeyed. 1
        where the channel predicts nothing.
    """
    predicted = measurement.predicted(state)
    if predicted is None:
        return 1.0
    possible = np.isfinite(predicted) & (weighted.weights > 0.0)
    weights = weighted.weights[possible]
    return measurement.tail(predicted[possible], weights / weights.sum())


def contradictions(
    target: Target, weighted: Weighted, measurements: Sequence[Measurement]
) -> dict[str, float]:
    """Return `contradiction` of each measurement under a posterior without any of them.

    By name, the smallest where two are of one kind.
    """
    if not measurements:
        return {}
    state = target(weighted.points)[1]
    found: dict[str, float] = {}
    for each in measurements:
        found[each.name] = min(found.get(each.name, 1.0), contradiction(weighted, state, each))
    return found


def _product(target: Target, active: Array, measurements: Sequence[Measurement]) -> Callable[[Array], Array]:
    """Log density of density times likelihood in the coordinates in use."""
    used = np.flatnonzero(active)
    idle = active.size - used.size

    def ln_product(points: Array) -> Array:
        full = np.zeros((points.shape[0], active.size))
        full[:, used] = points
        ln_density, state = target(full)
        # idle coordinates stand at zero, where their own density is (2 pi)^(-1/2) each
        total: Array = ln_density + 0.5 * idle * _LN_2PI + ln_measured(state, measurements)
        return total

    return ln_product
