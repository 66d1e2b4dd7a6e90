"""The one PyMC model that serves every object, channel and cooling scenario."""

from typing import Any

import numpy as np
import pymc as pm
import pytensor.tensor as pt

from decayinfer.inference.coordinates import history_inputs, ln_index_excess, ln_prior
from decayinfer.inference.measurement import ln_index_likelihood
from decayinfer.inference.op import field_history
from decayinfer.inference.problem import COORDINATES, Problem

__all__ = ["build_model"]


def build_model(problem: Problem) -> pm.Model:
    """Build the model; every number of the problem is data, so that one compilation serves all.

    Parameters
    ----------
    problem : Problem
        The numbers the model starts with.

    Returns
    -------
    pm.Model
        Free variable ``coordinates`` (8,), whose density is the prior with its Jacobian, and the observed
        variable ``braking_index``.
    """
    with pm.Model() as model:
        data = {
            name: pm.Data(name, np.asarray(value, dtype=float)) for name, value in problem._asdict().items()
        }
        z = pm.CustomDist(
            "coordinates",
            *(data[name] for name in Problem._fields),
            logp=_coordinates_logp,
            signature=_SIGNATURE,
            initval=np.zeros(len(COORDINATES)),
        )
        points = [z[i] for i in range(len(COORDINATES))]
        index = 3.0 + data["active"][1] * pt.exp(ln_index_excess(points, Problem(**data)))
        pm.CustomDist(
            "braking_index",
            index,
            data["index"],
            data["use_index"],
            data["limits"],
            logp=_index_logp,
            signature="(),(i),(),(l)->()",
            observed=data["index"][0],
        )
    return model


# core dimensions of each number; that of ``active`` is also that of the coordinates
_DIMENSIONS = {
    "spin": "(s)", "index": "(i)", "use_index": "()", "flags": "(f)", "active": "(coordinate)", "freeze": "(z)",
    "table": "(b,p,d)", "scalars": "(c)", "structure": "(r,d)", "normals": "(m,n)", "warp": "(w)",
    "shear": "()", "limits": "(l)",
}  # fmt: skip
_SIGNATURE = ",".join(_DIMENSIONS[name] for name in Problem._fields) + "->(coordinate)"


def _coordinates_logp(value: Any, *numbers: Any) -> Any:
    problem = Problem(*numbers)
    z = [value[i] for i in range(len(COORDINATES))]
    theta = pt.stack(history_inputs(z, problem))
    values, _ = field_history(theta, problem.flags, problem.freeze, problem.table, problem.scalars)
    return ln_prior(z, [values[i] for i in range(6)], problem)


def _index_logp(value: Any, index: Any, measured: Any, use_index: Any, limits: Any) -> Any:
    likelihood = ln_index_likelihood(value, index, measured[1], measured[2], measured[3], limits[4])
    return use_index * likelihood
