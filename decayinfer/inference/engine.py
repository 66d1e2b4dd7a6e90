"""The compiled model of this process, and one NUTS run on it."""

import time
from collections.abc import Callable
from dataclasses import dataclass, replace
from functools import cache
from typing import Any

import numpy as np
from numpy.typing import NDArray

from decayinfer.errors import SamplingError
from decayinfer.inference.compiled import density_callback, derivations, flat_numbers, identity_callback
from decayinfer.inference.problem import COORDINATES, Problem

__all__ = ["Engine", "NutsRun", "engine"]

type Array = NDArray[np.float64]

_DEPTH = 6  # doublings of a trajectory: most draws take three; what needs more is reported, not waited for


@dataclass(frozen=True)
class NutsRun:
    """Draws of one sampler run.

    Attributes
    ----------
    points : (chains, draws, 8) array
        Coordinates.
    diverging : (chains, draws) array of bool
        Divergent transitions.
    gradients : int
        Gradient evaluations, warm-up included.
    seconds : float
        Wall time of the run.
    """

    points: Array
    diverging: NDArray[np.bool_]
    gradients: int
    seconds: float


class Engine:
    """The one compiled model; numbers are swapped, nothing recompiles.

    Attributes
    ----------
    compilations : int
        Models compiled or loaded in this process.
    seconds : dict of str to float
        Time spent on import, graph (none when the machine code came from the disk cache) and compilation.
    """

    compilations = 0

    def __init__(self) -> None:
        start = time.perf_counter()
        from nutpie.compile_pymc import CompiledPyMCModel

        imported = time.perf_counter()
        density, identity = density_callback(), identity_callback()
        loaded = time.perf_counter()
        Engine.compilations += 1
        size = len(COORDINATES)
        # the model that the sampler's own compiler would make, around callbacks that the disk keeps
        self._compiled = CompiledPyMCModel(
            compiled_logp_func=density,
            compiled_expand_func=identity,
            initial_point_func=np.zeros,
            user_data=np.empty(0),
            shared_data={},
            shared_var_keys={},
            n_expanded=size,
            shape_info=(["coordinates"], [slice(0, size)], [(size,)]),
            logp_func=None,
            expand_func=None,
            dims={},
            reparameterized_names=[],
            _n_dim=size,
            _shapes={"coordinates": (size,)},
            _coords={},
        )
        self.seconds = {
            "import": imported - start,
            "graph": sum(derivations()),
            "compilation": loaded - imported - sum(derivations()),
        }

    def with_numbers(self, problem: Problem) -> Any:
        """Return the sampler's model with a problem's numbers."""
        return replace(self._compiled, user_data=flat_numbers(problem))

    def sample(
        self,
        problem: Problem,
        start: Callable[[int], Array],
        *,
        draws: int,
        tune: int,
        chains: int,
        seed: int,
        target_accept: float = 0.8,
    ) -> NutsRun:
        """Sample the coordinates of a problem.

        Parameters
        ----------
        problem : Problem
            The numbers of the problem.
        start : callable
            From a seed to a starting point (8,).
        draws, tune, chains, seed, target_accept
            As in the sampler.

        Raises
        ------
        SamplingError
            If the sampler cannot start or stops.
        """
        import nutpie

        compiled = replace(self.with_numbers(problem), initial_point_func=start)
        begun = time.perf_counter()
        try:
            # the low-rank mass matrix follows the correlations that the amplitudes of the channels have
            trace = nutpie.sample(
                compiled, draws=draws, tune=tune, chains=chains, cores=1, seed=seed, progress_bar=False,
                adaptation="low_rank", target_accept=target_accept, maxdepth=_DEPTH,
                return_raw_trace=True,
            )  # fmt: skip
        except (KeyboardInterrupt, SystemExit):
            raise
        except BaseException as error:  # the sampler's own panics are not Exceptions
            said = " ".join(str(error).split("Stack backtrace")[0].split())
            raise SamplingError(f"the sampler stopped: {said}") from error
        chosen = [_kept(*batches) for batches in zip(*trace.get_arrow_trace(), strict=True)]
        return NutsRun(
            points=np.array([points for points, _, _ in chosen]),
            diverging=np.array([diverging for _, diverging, _ in chosen]),
            gradients=sum(steps for _, _, steps in chosen),
            seconds=time.perf_counter() - begun,
        )


def _kept(draws: Any, stats: Any) -> tuple[Array, NDArray[np.bool_], int]:
    """Coordinates and divergences after the warm-up, and all gradients, from one chain's Arrow tables."""
    import pyarrow

    kept = ~stats.column("tuning").to_numpy()
    points = pyarrow.array(draws.column("coordinates")).flatten().to_numpy(False).reshape(kept.size, -1)[kept]
    diverging = stats.column("diverging").to_numpy()[kept]
    return points, diverging, int(stats.column("n_steps").to_numpy().sum())


@cache
def engine() -> Engine:
    """Return this process's engine, compiling or loading it at the first call."""
    return Engine()
