"""The density with its gradient against the same density written symbolically."""

import time

import numpy as np
import pytensor
import pytensor.tensor as pt
import pytest
from numba.core.event import install_recorder

from decayinfer.cooling import form
from decayinfer.cooling.recipes import RECIPES
from decayinfer.cooling.registry import standard_names
from decayinfer.inference.compiled import flat_numbers
from decayinfer.inference.coordinates import history_inputs, ln_index_excess, ln_prior
from decayinfer.inference.density import evaluate
from decayinfer.inference.measurement import ln_index_likelihood


class Symbolic:
    """The density as one PyTensor graph over the readable field history of tests/inference/reference.py.

    Like the compiled model it takes every number as data and serves every object, channel and cooling scenario; so it
    carries every term that a scenario may have. A graph has no loop that stops when it has found the age, so two
    functions are made: the density with its gradient at a known age, and one Newton step of the age. The cost of the
    symbolic density is that of the first and of as many of the second as the points need.
    """

    def __init__(self, terms, template):
        point, age, numbers = pt.dvector("point"), pt.dvector("ln_age"), pt.dvector("numbers")
        problem = type(template)(*_slices(template, numbers))
        self.scalars, self.table = problem.scalars, problem.table
        ln_age = age[0]
        z = [point[i] for i in range(8)]
        theta = pt.stack(history_inputs(z, problem))
        ln_g, depth, ln_w, ln_phonon, ln_amplitude = terms(self, theta, problem.flags, problem.freeze, ln_age)
        slope = pt.grad(ln_g, ln_age)
        history = [ln_age, depth, ln_w, theta[0] + pt.log(slope) - ln_age, ln_phonon, ln_amplitude]
        observed, minus, plus, limit = (problem.index[i] for i in range(4))
        index = 3.0 + pt.exp(ln_index_excess(z, problem))
        logp = ln_prior(z, history, problem)
        logp = logp + ln_index_likelihood(observed, index, minus, plus, limit, problem.limits[4])
        miss = ln_g - theta[0]
        # the age moves with the coordinates so that ln G(t) = ln tau holds
        gradient = pt.grad(logp, point) - pt.grad(logp, ln_age) * pt.grad(miss, point) / slope
        self.density = self._compile([point, age, numbers], [logp, gradient])
        # 1/G is nearly linear in 1/t, down to the wall where the field at birth is infinite
        self.step = self._compile([point, age, numbers], [-pt.log1p((pt.exp(miss) - 1.0) / slope)])

    def ln_temperature(self, ln_age, mass):
        """The closed form with all of its terms."""
        scalars = [2.0, 2.0, 1.0, 1.0, *(self.scalars[i] for i in range(4, 10))]
        return form.ln_temperature(ln_age, mass, self.table, scalars)

    @staticmethod
    def _compile(inputs, outputs):
        return pytensor.function(inputs, outputs, mode="NUMBA", on_unused_input="ignore").vm.jit_fn

    def steps(self, point, ln_age, numbers):
        """Newton steps from an age too small by a factor e until it holds to 1e-10."""
        age, count = np.array([ln_age - 1.0]), 0
        while abs(age[0] - ln_age) > 1e-10 and count < 50:
            age = age + self.step(point, age, numbers)[0]
            count += 1
        return count


def _slices(template, numbers):
    parts, start = [], 0
    for value in template:
        shape = np.shape(value)
        stop = start + int(np.prod(shape))
        parts.append(numbers[start:stop].reshape(shape) if shape else numbers[start])
        start = stop
    return parts


@pytest.fixture(scope="module")
def symbolic(reference, bench):
    # without traces: PyTensor joins those of merged nodes, and on this graph they fill the memory
    with pytensor.config.change_flags(traceback__limit=0, traceback__compile_limit=0):
        return Symbolic(
            reference.ReferenceHistory._terms, bench.problem(bench.stars[1], "impurity+phonon+hall")
        )


@pytest.mark.benchmark
@pytest.mark.filterwarnings("ignore")  # the symbolic model is no part of the package
def test_half_the_cost_of_the_symbolic_density(bench, say, symbolic):
    """On the median of the standard scenarios, for the sum of all channels."""
    begun = time.perf_counter()
    ratios = []
    for scenario in ("urca", "candle", *standard_names()):
        problem = bench.problem(bench.stars[1], "impurity+phonon+hall", scenario)
        numbers, density = flat_numbers(problem), bench.density(problem)
        points, ages = typical(problem)
        if scenario == "urca":  # it has every term, so here the two are the same
            compare(symbolic, density, points[:20], ages[:20], numbers)
            count = np.mean([symbolic.steps(points[i], ages[i, 0], numbers) for i in range(len(points))])
            say(
                f"compiled and compared in {time.perf_counter() - begun:.0f} s; Newton steps to the age {count:.1f}"
            )
        trials = []
        for _ in range(7):
            ours = density.seconds(points)
            known, step = (seconds(call, points, ages, numbers) for call in (symbolic.density, symbolic.step))
            trials.append((ours / (known + count * step), ours, known, step))
        ratio, ours, known, step = sorted(trials)[len(trials) // 2]
        say(
            f"{scenario:20} density with gradient {ours * 1e6:.0f} us; symbolic {(known + count * step) * 1e6:.0f} us "
            f"({known * 1e6:.0f} + {count:.1f} x {step * 1e6:.0f}); ratio {ratio:.2f}"
        )
        ratios.append(ratio)
    assert np.median(ratios[2:]) <= 0.5


@pytest.mark.benchmark
def test_computed_scenarios_cost_at_most_twice_the_provisional_one(bench, say):
    """Every one of them, for the sum of all channels; and a change of scenario compiles nothing."""

    def prepared(scenario):
        problem = bench.problem(bench.stars[1], "impurity+phonon+hall", scenario)
        return bench.density(problem), typical(problem)[0]

    candle, points = prepared("candle")
    candle(points[0])
    ratios = {}
    with install_recorder("numba:compile") as recorder:
        for name in RECIPES:
            density, own = prepared(name)
            trials = [(density.seconds(own), candle.seconds(points)) for _ in range(9)]
            ours, theirs = np.median(trials, axis=0)
            ratios[name] = np.median([a / b for a, b in trials])
            say(f"{name:24} {ours * 1e6:.0f} us; candle {theirs * 1e6:.0f} us; ratio {ratios[name]:.2f}")
    assert not recorder.buffer
    assert max(ratios.values()) <= 2.0


def typical(problem):
    """Coordinates near those of a posterior, and the ln age of each, (1,)."""
    rng = np.random.default_rng(1)
    points = np.array([-0.6, 0.0, -0.7, -0.7, -0.7, 0.5, -0.9, 0.0]) + 0.4 * rng.standard_normal((200, 8))
    evaluation = evaluate(points, problem)
    finite = np.isfinite(evaluation.ln_prior)
    return points[finite], evaluation.history[0][finite, None]


def compare(symbolic, density, points, ages, numbers):
    for point, age in zip(points, ages, strict=True):
        value, gradient = symbolic.density(point, age, numbers)
        code, ours, slope = density(point)
        assert code == 0
        assert ours == pytest.approx(float(value), rel=1e-9, abs=1e-9)
        np.testing.assert_allclose(slope, gradient, rtol=1e-7, atol=1e-7)


def seconds(call, points, ages, numbers):
    begun = time.process_time()
    for point, age in zip(points, ages, strict=True):
        call(point, age, numbers)
    return (time.process_time() - begun) / len(points)
