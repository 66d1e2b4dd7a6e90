"""The compiled field history against the same mathematics written plainly in PyTensor."""

import numpy as np
import pytest

from decayinfer.inference import kernel
from decayinfer.inference.coordinates import history_inputs
from decayinfer.inference.priors import Priors

CHANNELS = [
    "impurity",
    "phonon",
    "hall",
    "impurity+phonon",
    "impurity+hall",
    "phonon+hall",
    "impurity+phonon+hall",
]
CASES = [("candle", "none"), ("candle", "exponential"), ("candle", "cut"), ("urca", "exponential")]


@pytest.fixture(scope="module")
def plain(reference, tools):
    return {name: reference.ReferenceHistory(tools.scenario(name)) for name in ("candle", "urca")}


def inputs(tools, channel, scenario, law, count, rng):
    """Kernel inputs of typical points, with masses on both sides of the made-up direct-Urca threshold."""
    numbers = tools.problem(channel, scenario, priors=Priors(freeze_out=law, mass_mean=1.45))
    points = tools.typical_points(numbers, count, rng)
    return numbers, np.column_stack(np.broadcast_arrays(*history_inputs(list(points.T), numbers)))


@pytest.mark.parametrize(("name", "law"), CASES)
@pytest.mark.parametrize("channel", CHANNELS)
def test_kernel_is_the_plain_history(tools, plain, channel, name, law, rng):
    """Values to 1e-10, derivatives to 1e-8."""
    numbers, theta = inputs(tools, channel, name, law, 4, rng)
    for row in theta:
        data = numbers.flags, numbers.freeze
        values, jacobian = kernel.history(row, *data, numbers.table, numbers.scalars)
        expected, slopes = plain[name](row, *data)
        np.testing.assert_allclose(values, expected, rtol=1e-10, atol=1e-10)
        np.testing.assert_allclose(jacobian, slopes, rtol=1e-8, atol=1e-8)


@pytest.mark.parametrize("name", ["candle", "urca"])
def test_a_constant_field(tools, name):
    """b = 1: the age is tau itself, nothing decays, and only ln f remembers the temperature."""
    scenario, numbers = tools.scenario(name), tools.problem("constant", name)
    theta = np.array([11.3, -9.0, 0.3, 0.2, 0.1, 1.52, -0.8])

    def ln_f(ln_age, mass, ln_umklapp):
        ln_t = scenario.ln_temperature(ln_age, mass)
        return 2.0 * ln_t - numbers.freeze[0] * np.exp(numbers.freeze[1] * (ln_umklapp - ln_t))

    values, jacobian = kernel.history(theta, numbers.flags, numbers.freeze, numbers.table, numbers.scalars)
    np.testing.assert_allclose(values, [11.3, 0.0, 0.0, 0.0, ln_f(11.3, 1.52, -0.8), -9.0], rtol=1e-12)
    expected = np.zeros((6, 7))
    expected[0, 0] = expected[5, 1] = 1.0
    h = 1e-5
    expected[4, 0] = (ln_f(11.3 + h, 1.52, -0.8) - ln_f(11.3 - h, 1.52, -0.8)) / (2 * h)
    expected[4, 5] = (ln_f(11.3, 1.52 + h, -0.8) - ln_f(11.3, 1.52 - h, -0.8)) / (2 * h)
    expected[4, 6] = (ln_f(11.3, 1.52, -0.8 + h) - ln_f(11.3, 1.52, -0.8 - h)) / (2 * h)
    np.testing.assert_allclose(jacobian, expected, atol=1e-7)


@pytest.mark.parametrize("channel", ["constant", *CHANNELS])
def test_many_histories_are_those_of_one_by_one(tools, channel, rng):
    numbers, theta = inputs(tools, channel, "urca", "exponential", 8, rng)
    data = numbers.flags, numbers.freeze, numbers.table, numbers.scalars
    many = kernel.history_many(theta, *data)
    for row, values in zip(theta, many, strict=True):
        np.testing.assert_allclose(values, kernel.history(row, *data)[0], rtol=1e-12, atol=1e-12)


@pytest.mark.parametrize("channel", CHANNELS)
def test_the_age_is_where_the_spin_says(tools, channel, rng):
    """0 < t <= tau, since b >= 1 before now; a stronger decay makes a younger star."""
    numbers, theta = inputs(tools, channel, "candle", "exponential", 6, rng)
    data = numbers.flags, numbers.freeze, numbers.table, numbers.scalars
    faster = theta + np.array([0.0, 0.1, 0.0, 0.0, 0.0, 0.0, 0.0])
    ages, younger = kernel.history_many(theta, *data)[:, 0], kernel.history_many(faster, *data)[:, 0]
    assert np.all(ages <= theta[:, 0])
    assert np.all(younger < ages)


@pytest.mark.parametrize("channel", CHANNELS)
def test_extreme_inputs_end_in_numbers_or_nan(tools, channel):
    """No exception, and never an infinite value, however far a sampler strays."""
    numbers = tools.problem(channel, "urca")
    data = numbers.flags, numbers.freeze, numbers.table, numbers.scalars
    generator = np.random.default_rng(5)
    spread = np.array([10.0, 20.0, 30.0, 30.0, 10.0, 0.0, 5.0])
    theta = np.array([11.0, -9.0, 0.0, 0.0, 0.0, 1.4, -0.9]) + spread * generator.standard_normal((300, 7))
    for row in theta:
        values, jacobian = kernel.history(row, *data)
        assert np.all(np.isfinite(values)) or np.all(np.isnan(values[:4]))
        assert not np.any(np.isinf(jacobian[0]))
