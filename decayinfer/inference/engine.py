"""The compiled model of this process, and one NUTS run on it."""

import time
from collections.abc import Callable
from dataclasses import dataclass, replace
from functools import cache
from typing import Any

import numpy as np
from numpy.typing import NDArray

from decayinfer.errors import SamplingError
from decayinfer.inference.problem import COORDINATES, Problem

__all__ = ["Engine", "NutsRun", "engine"]

type Array = NDArray[np.float64]


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
        Models compiled in this process.
    seconds : dict of str to float
        Time spent on import, graph and compilation.
    """

    compilations = 0

    def __init__(self, problem: Problem) -> None:
        start = time.perf_counter()
        import nutpie

        from decayinfer.inference.model import build_model

        imported = time.perf_counter()
        model = build_model(problem)
        built = time.perf_counter()
        self._compiled = nutpie.compile_pymc_model(model)
        Engine.compilations += 1
        self.seconds = {
            "import": imported - start,
            "graph": built - imported,
            "compilation": time.perf_counter() - built,
        }

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

        compiled = replace(self._compiled.with_data(**problem._asdict()), initial_point_func=start)
        begun = time.perf_counter()
        try:
            # the low-rank mass matrix follows the correlations that the amplitudes of the channels have
            trace = nutpie.sample(
                compiled, draws=draws, tune=tune, chains=chains, cores=1, seed=seed, progress_bar=False,
                adaptation="low_rank", target_accept=target_accept,
            )  # fmt: skip
        except (KeyboardInterrupt, SystemExit):
            raise
        except BaseException as error:  # the sampler's own panics are not Exceptions
            raise SamplingError(f"the sampler stopped: {error}") from error
        stats = trace["sample_stats"]
        steps = int(stats["n_steps"].sum()) + int(trace["warmup_sample_stats"]["n_steps"].sum())
        return NutsRun(
            points=np.asarray(trace["posterior"]["coordinates"].values, dtype=float),
            diverging=np.asarray(stats["diverging"].values, dtype=bool),
            gradients=steps,
            seconds=time.perf_counter() - begun,
        )

    def benchmark_data(self, problem: Problem) -> Any:
        """Return the compiled model with a problem's numbers, for timing one gradient."""
        return self._compiled.with_data(**problem._asdict())


@cache
def engine() -> Engine:
    """Return this process's engine, compiling it at the first call."""
    return Engine(_template())


def _template() -> Problem:
    """Numbers of the right shapes to compile with; every one is replaced before sampling."""
    from decayinfer.catalog.pulsar import Pulsar
    from decayinfer.channels.registry import channel_names, load_channel
    from decayinfer.cooling.registry import load_scenario, scenario_names
    from decayinfer.inference.priors import Priors
    from decayinfer.inference.problem import make_problem

    pulsar = Pulsar(
        name="template", period=1.0, period_derivative=1e-14, braking_index=10.0,
        braking_index_err_minus=1.0, braking_index_err_plus=1.0,
    )  # fmt: skip
    problem = make_problem(pulsar, load_channel(channel_names()[-1]), load_scenario(scenario_names()[0]), Priors())
    assert problem.active.size == len(COORDINATES)
    return problem
