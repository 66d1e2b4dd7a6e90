"""What the benchmarks share: invented objects, their problems, and the cost of one gradient."""

import ctypes
import importlib.util
import time
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from decayinfer.catalog.pulsar import Pulsar
from decayinfer.channels.registry import load_channel
from decayinfer.cooling.registry import load_scenario
from decayinfer.inference.engine import engine
from decayinfer.inference.priors import Priors
from decayinfer.inference.problem import make_problem

DECAYING = (
    "phonon",
    "impurity",
    "hall",
    "impurity+phonon",
    "phonon+hall",
    "impurity+hall",
    "impurity+phonon+hall",
)


def star(name, period, period_derivative, index, error):
    return Pulsar(
        name=name, period=period, period_derivative=period_derivative, braking_index=index,
        braking_index_err_minus=error, braking_index_err_plus=error,
    )  # fmt: skip


#: Invented objects: young and old, with small, middling and large indices.
STARS = (
    star("Reed", 0.12, 9e-14, 6.1, 0.3),
    star("Sedge", 0.31, 4e-14, 21.0, 1.05),
    star("Rush", 0.72, 2.2e-14, 43.0, 2.1),
)


class Density:
    """The compiled log density and gradient of a problem, as the sampler calls it."""

    def __init__(self, problem):
        self._model = engine().with_numbers(problem)
        self._call = self._model.compiled_logp_func.ctypes
        self._numbers = self._model.user_data.ctypes.data
        self._gradient, self._value = np.empty(8), np.empty(1)
        self._out = pointer(self._gradient), pointer(self._value)

    def __call__(self, point):
        code = self._call(8, pointer(point), *self._out, self._numbers)
        return code, self._value[0], self._gradient.copy()

    def seconds(self, points):
        """Mean processor time of one call over points, (n, 8)."""
        pointers = [pointer(point) for point in np.ascontiguousarray(points)]
        begun = time.process_time()
        for one in pointers:
            self._call(8, one, *self._out, self._numbers)
        return (time.process_time() - begun) / len(pointers)


def pointer(array):
    return array.ctypes.data_as(ctypes.POINTER(ctypes.c_double))


@dataclass(frozen=True)
class Bench:
    """Objects, problems and clocks of the benchmarks."""

    stars: tuple[Pulsar, ...] = STARS
    channels: tuple[str, ...] = DECAYING
    scenario: str = "candle"
    density: type = Density

    def problem(self, star: Pulsar, channel: str, scenario: str = "candle") -> Any:
        return make_problem(star, load_channel(channel), load_scenario(scenario), Priors())


@pytest.fixture(scope="session")
def bench():
    return Bench()


@pytest.fixture(scope="session")
def ensemble():
    """The plain counterpart, ensemble.py, as a module."""
    spec = importlib.util.spec_from_file_location("ensemble", Path(__file__).parent / "ensemble.py")
    module = importlib.util.module_from_spec(spec)
    spec.loader.exec_module(module)
    return module


@pytest.fixture(scope="module", autouse=True)
def _scenarios(own_scenarios):
    return own_scenarios


@pytest.fixture
def say(capsys):
    """Print past pytest's capture, so that the ratios show without -s."""

    def show(text):
        with capsys.disabled():
            print(f"\n    {text}", end="")

    return show
