"""The history's 36 nodes on the scenarios that ship, against 240 nodes in plain NumPy.

Between the two stand only the integrals: the equations are those of the kernel's docstring, written again.
"""

import numpy as np
import pytest

from decayinfer.channels.registry import load_channel
from decayinfer.cooling import build
from decayinfer.cooling.recipes import RECIPES
from decayinfer.cooling.scenario import read_scenario
from decayinfer.inference import kernel
from decayinfer.inference.coordinates import history_inputs
from decayinfer.inference.nodes import quadrature
from decayinfer.inference.priors import Priors
from decayinfer.inference.problem import make_problem

FINE = quadrature(240, 8.0)
SMOOTH = [name for name, recipe in RECIPES.items() if recipe.superfluidity != "triplet"]
SHARP = [name for name, recipe in RECIPES.items() if recipe.superfluidity == "triplet"]


def fine_history(ln_age, theta, numbers, scenario):
    """ln G, J(0) and ln w(0) of many stars of given age."""
    sigma, weights, to_now = FINE
    _, ln_rate, ln_q, ln_eta, ln_ratio, mass, ln_umklapp = theta.T[..., None]
    phonon, impurity, hall = numbers.flags
    strength, power = numbers.freeze

    def ln_f(age):
        ln_t = scenario.ln_temperature(np.log(np.maximum(age, 1e-300)), np.broadcast_to(mass, age.shape))
        return 2.0 * ln_t - strength * np.exp(power * (ln_umklapp - ln_t))

    q = impurity * (np.exp(ln_q) if phonon else 1.0)
    eta = hall * (np.exp(ln_eta) if phonon + impurity else 1.0)
    age = np.exp(ln_age)[:, None]
    switch = 1.0 / (1.0 + (sigma / np.exp(ln_ratio)) ** 4)
    amplitude = np.exp(ln_rate) / (phonon + q + eta / (1.0 + np.exp(-4.0 * ln_ratio)))
    depth = age * amplitude * ((phonon * np.exp(ln_f(age * sigma) - ln_f(age)) + q) @ to_now.T)
    drift = age * amplitude * eta * ((switch * np.exp(depth)) @ to_now.T)
    ln_w = np.log1p(-drift) - depth
    return ln_age + np.log(np.exp(-2.0 * ln_w) @ weights), depth[:, 0], ln_w[:, 0]


def errors(tools, name, channel, rng, count):
    """Largest errors of ln t, J(0) and ln w(0) at typical points."""
    scenario = read_scenario(build.FOLDER / f"{name}.toml")
    numbers = make_problem(tools.WREN, load_channel(channel), scenario, Priors())
    points = tools.typical_points(numbers, count, rng)
    theta = np.column_stack(np.broadcast_arrays(*history_inputs(list(points.T), numbers)))
    data = numbers.flags, numbers.freeze, numbers.table, numbers.scalars
    values, jacobians = map(np.array, zip(*(kernel.history(row, *data) for row in theta), strict=True))
    ln_g, depth, ln_w = fine_history(values[:, 0], theta, numbers, scenario)
    miss = ln_g - theta[:, 0]  # the kernel's age belongs to this other tau; the Jacobian leads back
    found = np.column_stack([values[:, 0], depth, ln_w]) - miss[:, None] * jacobians[:, :3, 0]
    return np.abs(found - values[:, :3]).max(axis=0)


@pytest.mark.parametrize("name", SMOOTH)
def test_the_nodes_follow_scenarios_without_triplet_pairing(tools, name, rng):
    for channel in ("phonon", "impurity+phonon+hall"):
        assert np.all(errors(tools, name, channel, rng, 20) < 1e-6)


@pytest.mark.parametrize("channel", ["hall", "impurity+hall"])
def test_the_nodes_follow_channels_without_temperature(tools, channel, rng):
    assert np.all(errors(tools, SMOOTH[0], channel, rng, 60) < 1e-6)


@pytest.mark.parametrize("name", SHARP)
def test_triplet_pairing_sets_in_faster_than_the_nodes_follow(tools, name, rng):
    """A known limit: half a per cent in age and birth field, below the error of their own temperature fits."""
    assert np.all(errors(tools, name, "impurity+phonon+hall", rng, 40) < 1e-2)
