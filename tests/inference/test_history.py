"""From coordinates to physical parameters and forward again through the differential equations, and back."""

import numpy as np
import pytest

from decayinfer.inference.coordinates import history_inputs
from decayinfer.inference.density import evaluate
from decayinfer.inference.kernel import history_many
from decayinfer.inference.priors import Priors
from decayinfer.inference.problem import COORDINATES
from decayinfer.physics.constants import B_UNIT_G
from decayinfer.physics.lattice import FREEZE_OUT

CHANNELS = [
    "constant",
    "impurity",
    "phonon",
    "hall",
    "impurity+phonon",
    "impurity+hall",
    "phonon+hall",
    "impurity+phonon+hall",
]
CASES = [("candle", "none"), ("candle", "cut"), ("slow-candle", "exponential"), ("urca", "exponential")]
STARS = [
    {"period": 0.3, "period_derivative": 4e-14, "braking_index": 20.0},  # 1e5 yr
    {"period": 0.15, "period_derivative": 4e-13, "braking_index": 4.5},  # 6e3 yr
    {"period": 0.8, "period_derivative": 1e-14, "braking_index": 60.0},  # 1e6 yr
]


@pytest.mark.parametrize(("name", "law"), CASES)
@pytest.mark.parametrize("channel", CHANNELS)
def test_the_equations_lead_back_to_the_spin(tools, forward, channel, name, law, rng):
    """scipy's adaptive solver (DOP853, 1e-12) from birth reproduces P, Pdot, n and B to 1e-6."""
    scenario = tools.scenario(name)
    for star in STARS:
        numbers = tools.problem(channel, name, priors=Priors(freeze_out=law), **star)
        evaluation = evaluate(tools.typical_points(numbers, 1, rng), numbers)
        draws = tools.draws_of(forward, evaluation.physical)[0]
        today = forward.evolve_one(draws, scenario, channel=channel, law=FREEZE_OUT[law])
        physical = evaluation.physical
        expected = star["period"], star["period_derivative"]
        assert (today.period, today.period_derivative) == pytest.approx(expected, rel=1e-6)
        index = np.broadcast_to(physical.index, 1)[0]
        assert today.braking_index == pytest.approx(index, rel=1e-6)
        assert today.field == pytest.approx(np.exp(physical.ln_field[0]), rel=1e-6)


@pytest.mark.parametrize("channel", CHANNELS[1:])
def test_shares_are_those_of_the_rates(tools, forward, channel, rng):
    """Each process's part of -dlnB/dt today, from the right-hand side of the field equation."""
    numbers = tools.problem(channel)
    physical = evaluate(tools.typical_points(numbers, 20, rng), numbers).physical
    draws, star = tools.draws_of(forward, physical), tools.scenario("candle")
    field = np.exp(physical.ln_field)
    law = FREEZE_OUT["exponential"]
    total = forward.equations(draws, star, channel, law).rate(draws.age, field)
    for part in ("phonon", "impurity", "hall"):
        if part in channel.split("+"):
            share = forward.equations(draws, star, part, law).rate(draws.age, field) / total
        else:
            share = np.zeros(20)
        np.testing.assert_allclose(getattr(physical, f"share_{part}"), share, rtol=1e-9, atol=1e-12)


@pytest.mark.parametrize("channel", CHANNELS)
def test_physical_parameters_come_back_as_coordinates(tools, forward, channel, rng):
    """Coordinates to physical parameters to today's observables to coordinates: the identity to 1e-6."""
    numbers = tools.problem(channel)
    points = tools.typical_points(numbers, 20, rng)
    evaluation = evaluate(points, numbers)
    seen = tools.observe(
        forward, tools.draws_of(forward, evaluation.physical), tools.scenario("candle"),
        channel=channel, law=FREEZE_OUT["exponential"],
    )  # fmt: skip
    np.testing.assert_allclose(seen["ln_period"], numbers.spin[0], atol=1e-6)
    np.testing.assert_allclose(seen["ln_period_derivative"], numbers.spin[1], atol=1e-6)
    expected = dict(zip(COORDINATES, points.T, strict=True))
    expected["logit_mass"] = evaluation.physical.mass
    expected["warped_index"] = np.log(evaluation.physical.index - 3.0) if channel != "constant" else None
    for name, active in zip(COORDINATES, numbers.active, strict=True):
        if active:
            np.testing.assert_allclose(seen[name], expected[name], atol=2e-6, err_msg=name)


def test_the_spin_equation_at_its_edges(tools):
    """Born spinning as now, the star is young; born far faster, its age is that of the field history alone."""
    numbers = tools.problem("impurity")
    z = np.zeros((2, 8))
    z[:, 4] = 12.0, -12.0
    theta = np.column_stack(np.broadcast_arrays(*history_inputs(list(z.T), numbers)))
    young, old = history_many(theta, numbers.flags, numbers.freeze, numbers.table, numbers.scalars)[:, 0]
    ln_tau_c, rate = numbers.spin[2], np.exp(theta[1, 1])
    assert young == pytest.approx(ln_tau_c + np.log(2.0) - 12.0, abs=1e-3)  # 1 - (P_0/P)^2 = 2(1 - P_0/P)
    # constant rate r: tau_c = (e^{2rt} - 1)/(2r)
    assert np.exp(old) == pytest.approx(np.log1p(2.0 * rate * np.exp(ln_tau_c)) / (2.0 * rate), rel=1e-8)


def test_the_field_is_that_of_the_orthogonal_rotator(tools, rng):
    """B = 3.2e19 G (P Pdot)^(1/2) for 10 km and 1e45 g cm^2 (Manchester & Taylor 1977), scaled by I^(1/2)/R^3."""
    numbers, star = tools.problem("phonon"), tools.scenario("candle")
    physical = evaluate(tools.typical_points(numbers, 5, rng), numbers).physical
    scale = np.sqrt(star.inertia_45(physical.mass)) / (star.radius_km(physical.mass) / 10.0) ** 3
    expected = 3.2e19 * np.sqrt(0.3 * 4e-14) * scale
    np.testing.assert_allclose(np.exp(physical.ln_field) * B_UNIT_G, expected, rtol=5e-3)
