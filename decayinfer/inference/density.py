"""The same log density outside PyMC: NumPy, many points at once, for starts, evidence and derived quantities."""

from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from decayinfer.inference import kernel
from decayinfer.inference.coordinates import Physical, history_inputs, ln_index_excess, ln_prior, physical
from decayinfer.inference.measurement import ln_index_likelihood
from decayinfer.inference.problem import Problem

__all__ = ["Evaluation", "evaluate"]

type Array = NDArray[np.float64]


class Evaluation(NamedTuple):
    """Log density terms and physical parameters at many points.

    Attributes
    ----------
    ln_prior, ln_likelihood : (n,)
        Prior with its Jacobian, and likelihood of n (whether or not the problem uses it); minus infinity
        where no history exists.
    physical : Physical
        Physical parameters, arrays of shape (n,).
    history : (6, n)
        The kernel's outputs.
    """

    ln_prior: Array
    ln_likelihood: Array
    physical: Physical
    history: Array

    def ln_density(self, problem: Problem) -> Array:
        """Return the log density that is sampled, (n,)."""
        return self.ln_prior + float(problem.use_index) * self.ln_likelihood


def evaluate(points: Array, problem: Problem) -> Evaluation:
    """Evaluate the density at coordinates.

    Parameters
    ----------
    points : (n, 8) array
        Coordinates, `decayinfer.inference.problem.COORDINATES`.
    problem : Problem
        The numbers of the problem.
    """
    z = list(np.ascontiguousarray(points.T))
    with np.errstate(all="ignore"):  # far points overflow to -inf, which is what they are worth
        theta = np.column_stack(np.broadcast_arrays(*history_inputs(z, problem)))
        history = kernel.history_many(theta, problem.flags, problem.freeze, problem.table, problem.scalars).T
        prior = ln_prior(z, history, problem)
        index = 3.0 + problem.active[1] * np.exp(ln_index_excess(z, problem))
        observed, minus, plus, limit = problem.index
        likelihood = ln_index_likelihood(observed, index, minus, plus, limit, problem.limits[4])
        derived = physical(z, history, problem)
    return Evaluation(_finite(prior), _finite(np.broadcast_to(likelihood, prior.shape)), derived, history)


def _finite(values: Array) -> Array:
    return np.where(np.isfinite(values), values, -np.inf)
