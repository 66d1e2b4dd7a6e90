"""The log density and its gradient as one C callback, compiled once per machine.

PyTensor derives the density of the PyMC model and compiles it through Numba. The finished machine code goes to Numba's
disk cache under a digest of the sources and versions that it was made from, so a later process loads it in well under a
second and imports neither PyMC nor PyTensor.
"""

import hashlib
import os
import subprocess
import sys
import time
from functools import cache
from importlib.metadata import version
from importlib.resources import files
from pathlib import Path
from typing import Any

import numpy as np
from numba import carray, cfunc, types
from numba.extending import overload
from numpy.typing import NDArray

from decayinfer.inference.problem import COORDINATES, Problem, make_problem

__all__ = [
    "SOURCES",
    "TOOLS",
    "density_callback",
    "derivations",
    "derived_callback",
    "flat_numbers",
    "identity_callback",
    "template",
]

#: Modules that the density is made from; the digest of their text is part of the cache key.
SOURCES = (
    "cooling/form.py", "cooling/kernel.py", "inference/ages.py", "inference/compiled.py", "inference/coordinates.py",
    "inference/kernel.py", "inference/measurement.py", "inference/model.py", "inference/nodes.py",
    "inference/op.py", "inference/problem.py", "physics/conduction.py", "physics/constants.py",
    "physics/hall.py", "physics/lattice.py", "physics/namespace.py", "physics/structure.py", "physics/torque.py",
)  # fmt: skip
#: Packages that derive and compile it; their versions are part of the key.
TOOLS = ("llvmlite", "numba", "numpy", "pymc", "pytensor")

_DIM = len(COORDINATES)
_REALS = types.CPointer(types.double)
_DENSITY = types.int64(types.uint64, _REALS, _REALS, _REALS, types.voidptr)
_IDENTITY = types.int64(types.uint64, types.uint64, _REALS, _REALS, types.voidptr)
_FAILED, _NOT_FINITE = 1, 3
_may_derive: list[bool] = []
_derivations: list[float] = []


class _NotCachedError(Exception):
    """The disk cache has no density of these sources and versions."""


def template() -> Problem:
    """Return numbers of the shapes that every problem has; all are replaced before sampling."""
    from decayinfer.catalog.pulsar import Pulsar
    from decayinfer.channels.registry import channel_names, load_channel
    from decayinfer.cooling.registry import load_scenario, scenario_names
    from decayinfer.inference.priors import Priors

    pulsar = Pulsar(
        name="template", period=1.0, period_derivative=1e-14, braking_index=10.0,
        braking_index_err_minus=1.0, braking_index_err_plus=1.0,
    )  # fmt: skip
    return make_problem(
        pulsar, load_channel(channel_names()[-1]), load_scenario(scenario_names()[0]), Priors()
    )


def flat_numbers(problem: Problem) -> NDArray[np.float64]:
    """Return every number of a problem in one vector, which is what the callback reads."""
    return np.concatenate([np.ravel(np.asarray(value, dtype=float)) for value in problem])


def density_callback() -> Any:
    """Return the callback of density and gradient, from the disk cache.

    What is not there yet is derived and compiled by a process of its own, because machine code that shares a process
    with its ingredients may be linked to them and then differ in the last bits from what later processes load.
    """
    try:
        return _callback()
    except _NotCachedError:
        _fill_cache()
    try:
        return _callback()
    except _NotCachedError:  # nothing can be kept, on a read-only disk for example
        return derived_callback()


def derived_callback() -> Any:
    """Return the callback, derived in this process if the disk cache does not have it."""
    _may_derive.append(True)
    try:
        return _callback()
    finally:
        _may_derive.pop()


def derivations() -> tuple[float, ...]:
    """Return the time on imports and graphs [s] of each derivation that this process made or asked for.

    Empty when the disk cache had the density.
    """
    return tuple(_derivations)


def _fill_cache() -> None:
    code = f"from {__name__} import derivations, derived_callback; derived_callback(); print(*derivations())"
    path = os.pathsep.join([str(Path(str(files("decayinfer"))).parent), os.environ.get("PYTHONPATH", "")])
    command, environment = [sys.executable, "-W", "ignore", "-c", code], os.environ | {"PYTHONPATH": path}
    done = subprocess.run(command, env=environment, capture_output=True, text=True, check=False)
    _derivations.extend(float(word) for word in done.stdout.split())


def _callback() -> Any:
    size = flat_numbers(template()).size
    digest = _digest()

    def density(dim: Any, point: Any, gradient: Any, value: Any, numbers: Any) -> Any:
        if digest == "":  # named here so that it is a closure variable, which is what enters the cache key
            return _FAILED
        try:
            logp, slope = _log_density(carray(point, (_DIM,)), carray(numbers, (size,), np.float64))
        except Exception:  # nothing may unwind into the sampler
            return _FAILED
        carray(value, (1,))[0] = logp
        finite = np.isfinite(logp)
        out = carray(gradient, (_DIM,))
        for i in range(_DIM):
            out[i] = slope[i]
            finite &= np.isfinite(slope[i])
        return 0 if finite else _NOT_FINITE

    return cfunc(_DENSITY, cache=True)(density)


def identity_callback() -> Any:
    """Return the callback through which draws are stored: the coordinates as they are."""

    def identity(dim: Any, expanded: Any, point: Any, out: Any, numbers: Any) -> Any:
        for i in range(dim):
            carray(out, (_DIM,))[i] = carray(point, (_DIM,))[i]
        return 0

    return cfunc(_IDENTITY, cache=True)(identity)


def _log_density(point: Any, numbers: Any) -> Any:
    """Return log density and gradient; compiled code gets it through `_derive_density`, interpreted code as it is."""
    return _derived()(point, numbers)


@overload(_log_density)
def _derive_density(point: Any, numbers: Any) -> Any:
    if not _may_derive:
        raise _NotCachedError
    derived = _derived()

    def call(point: Any, numbers: Any) -> Any:
        return derived(point, numbers)

    return call


@cache
def _derived() -> Any:
    """Derive (coordinates, flat numbers) -> (log density, gradient)."""
    start = time.perf_counter()
    import pytensor
    import pytensor.tensor as pt
    from pytensor.graph import clone_replace, rewrite_graph

    from decayinfer.inference.model import build_model

    problem = template()
    model = build_model(problem)
    coordinates = model.rvs_to_values[model["coordinates"]]
    logp = rewrite_graph(model.logp(), include=["canonicalize", "stabilize"])
    gradient = pt.grad(logp, coordinates)
    point = pt.TensorType("float64", shape=(_DIM,))("point")
    numbers = pt.TensorType("float64", shape=(flat_numbers(problem).size,))("numbers")
    replacements = {coordinates: point} | _slices(model, problem, numbers)
    outputs = clone_replace([logp, gradient], replacements)
    function = pytensor.function([point, numbers], outputs, mode="NUMBA")
    _derivations.append(time.perf_counter() - start)
    return function.vm.jit_fn


def _slices(model: Any, problem: Problem, numbers: Any) -> dict[Any, Any]:
    """Return the model's data as views of the flat numbers, in the order of `flat_numbers`."""
    found, start = {}, 0
    for name, value in problem._asdict().items():
        shape = np.shape(value)
        stop = start + int(np.prod(shape))
        found[model[name]] = numbers[start:stop].reshape(shape) if shape else numbers[start]
        start = stop
    return found


def _digest() -> str:
    digest = hashlib.sha256()
    for tool in TOOLS:
        digest.update(f"{tool} {version(tool)}\n".encode())
    root = files("decayinfer")
    for source in SOURCES:
        digest.update(root.joinpath(source).read_bytes())
    return digest.hexdigest()
