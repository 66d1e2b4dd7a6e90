"""From coordinates to the reported parameters, and into ArviZ's schema."""

import json
from collections.abc import Sequence
from importlib.metadata import version
from typing import Any

import numpy as np
from numpy.typing import NDArray
from xarray import DataTree

from decayinfer.channels.base import Channel
from decayinfer.cooling.form import ln_temperature
from decayinfer.inference.density import Evaluation, evaluate
from decayinfer.inference.explore import Exploration
from decayinfer.inference.problem import COORDINATES, Problem
from decayinfer.physics import torque
from decayinfer.physics.constants import B_UNIT_G, T_UNIT_K

__all__ = ["SCHEMA", "assemble", "data_tree", "parameters"]

type Array = NDArray[np.float64]

SCHEMA = "1"  #: major version of the layout of stored draws


def parameters(evaluation: Evaluation, problem: Problem, channel: Channel) -> dict[str, Array]:
    """Return the parameters that a channel reports, in the units of `decayinfer.inference.outcome.PARAMETERS`.

    Parameters
    ----------
    evaluation : Evaluation
        Physical parameters of n points.
    problem : Problem
        The numbers of the problem.
    channel : Channel
        The explanation.

    Returns
    -------
    dict of str to (n,) array
    """
    p = evaluation.physical
    age_yr, tau_c = np.exp(p.ln_age), np.exp(problem.spin[2])
    with np.errstate(over="ignore", divide="ignore"):  # parameters of a channel that is off overflow
        every = {
            "mass": p.mass,
            "impurity_parameter": np.exp(p.ln_impurity_parameter),
            "phonon_time": np.exp(p.ln_phonon_time),
            "hall_time": np.exp(p.ln_hall_time),
            "age": age_yr,
            "birth_field": np.exp(p.ln_birth_field) * B_UNIT_G,
            "birth_period": np.exp(p.ln_birth_period),
            "field": np.exp(p.ln_field) * B_UNIT_G,
            "braking_index": p.index + np.zeros_like(age_yr),
            "decay_time": torque.decay_time(p.index, tau_c) + np.zeros_like(age_yr),
            "crust_temperature": np.exp(ln_temperature(p.ln_age, p.mass, problem.table, problem.scalars))
            * T_UNIT_K,
            "share_impurity": p.share_impurity,
            "share_phonon": p.share_phonon,
            "share_hall": p.share_hall,
        }
    return {name: np.broadcast_to(every[name], age_yr.shape) for name in channel.parameters}


def data_tree(
    problem: Problem,
    channel: Channel,
    prior: Exploration,
    posterior: Exploration | None,
    attributes: dict[str, Any],
) -> DataTree:
    """Gather draws in ArviZ's schema.

    Groups ``prior`` (given P and Pdot, without n), and with a posterior also ``posterior``, ``sample_stats``,
    ``log_likelihood``, ``log_prior`` and ``observed_data``.
    """
    without = problem.without_index()
    groups: dict[str, dict[str, NDArray[Any]]] = {
        "prior": _variables(prior.points, _evaluated(prior.points, without), without, channel),
        "prior_sample_stats": {"diverging": prior.diverging},
        "observed_data": {"braking_index": np.asarray(problem.index[0])},
    }
    if posterior is not None:
        shape = posterior.points.shape[:2]
        evaluation = _evaluated(posterior.points, problem)
        likelihood = evaluation.ln_likelihood.reshape(shape)
        ln_prior = evaluation.ln_prior.reshape(shape)
        groups |= {
            "posterior": _variables(posterior.points, evaluation, problem, channel),
            "sample_stats": {"diverging": posterior.diverging, "lp": likelihood + ln_prior},
            "log_likelihood": {"braking_index": likelihood},
            "log_prior": {"all_coordinates": ln_prior},
        }
    return assemble(groups, COORDINATES, attributes)


def assemble(
    groups: dict[str, dict[str, NDArray[Any]]], coordinates: Sequence[str], attributes: dict[str, Any]
) -> DataTree:
    """Put groups of (chains, draws, ...) arrays into ArviZ's schema, with coordinate names and attributes."""
    import arviz as az

    tree: DataTree = az.from_dict(
        groups, coords={"coordinate": list(coordinates)}, dims={"coordinates": ["coordinate"]}
    )
    tree.attrs.update({"schema": SCHEMA, "versions": json.dumps(_versions()), **attributes})
    return tree


def _evaluated(points: Array, problem: Problem) -> Evaluation:
    return evaluate(points.reshape(-1, points.shape[-1]), problem)


def _variables(points: Array, evaluation: Evaluation, problem: Problem, channel: Channel) -> dict[str, Array]:
    flat = parameters(evaluation, problem, channel)
    return {"coordinates": points} | {name: values.reshape(points.shape[:2]) for name, values in flat.items()}


def _versions() -> dict[str, str]:
    return {
        name: version(name)
        for name in ("decayinfer", "numpy", "pymc", "pytensor", "nutpie", "numba", "arviz")
    }
