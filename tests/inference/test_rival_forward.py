"""Rivals forward from birth, by equations integrated here, against the density that runs backwards."""

import numpy as np
import pytest
from scipy.integrate import solve_ivp

from decayinfer.channels.registry import channel_names, load_channel
from decayinfer.inference.forward import draw_prior
from decayinfer.inference.priors import Priors
from decayinfer.inference.rival import integrate_prior, make_rival_problem
from decayinfer.inference.rival_forward import evolve_rival
from decayinfer.inference.settings import FitSettings
from decayinfer.inference.simulate import simulate_table
from decayinfer.physics.constants import B_UNIT_G, YEAR_S
from decayinfer.physics.torque import PLASMA, VACUUM, characteristic_age, spin_down_constant

RIVALS = channel_names(rivals=True)


@pytest.mark.parametrize("rival", RIVALS)
def test_joint_density_of_period_and_derivative_is_that_of_forward_draws(tools, rival):
    """The share of a million forward stars in a cell of (ln P, ln Pdot), against the density at its centre.

    The cell is narrow enough that the density is flat in it to a per cent.
    """
    priors, scenario, rng = Priors(), tools.scenario("candle"), np.random.default_rng(9)
    star = tools.WREN
    half = 0.25
    inside = total = 0
    for _ in range(10):
        today = evolve_rival(draw_prior(100_000, priors, rng), load_channel(rival), scenario, priors, rng)
        with np.errstate(all="ignore"):  # a pull may turn Pdot negative, alignment end it
            x = np.log(today.period / star.period)
            y = np.log(today.period_derivative / star.period_derivative)
        inside += int(np.sum((np.abs(x) < half) & (np.abs(y) < half)))
        total += x.size
    expected = np.exp(
        integrate_prior(
            make_rival_problem(star, load_channel(rival), scenario, FitSettings()), rng
        ).ln_evidence
    )
    found = inside / total / (2.0 * half) ** 2
    err = found / np.sqrt(inside)
    assert inside > 100
    assert found == pytest.approx(expected, abs=4.0 * np.hypot(err, 0.03 * expected))


@pytest.mark.parametrize(("rival", "torque"), [("obliquity-vacuum", VACUUM), ("obliquity-plasma", PLASMA)])
def test_aligning_stars_are_those_of_the_torque_equations(tools, rival, torque):
    """Each drawn star integrated again from birth in physical units: P, a, and n from differences of nu."""
    priors, scenario, rng = Priors(), tools.scenario("candle"), np.random.default_rng(5)
    draws = draw_prior(12, priors, rng)
    today = evolve_rival(draws, load_channel(rival), scenario, priors, rng)
    for i in range(12):
        radius, inertia = scenario.radius_km(draws.mass[i]), scenario.inertia_45(draws.mass[i])
        unit = spin_down_constant(radius_km=radius, inertia_45=inertia, torque=1.0)
        unit *= draws.birth_field[i] ** 2 * YEAR_S

        def slopes(_, state, unit=unit):
            period, angle = state
            sine, cosine = np.sin(angle), np.cos(angle)
            return unit * (
                torque.k0 + torque.k1 * sine**2
            ) / period, -torque.k2 * unit * sine * cosine / period**2

        start = [draws.birth_period[i], np.radians(today.truths["birth_obliquity"][i])]
        run = solve_ivp(slopes, (0.0, draws.age[i]), start, "DOP853", rtol=1e-11, atol=1e-30)
        period, angle = run.y[:, -1]
        assert today.period[i] == pytest.approx(period, rel=1e-7)
        assert today.truths["obliquity"][i] == pytest.approx(np.degrees(angle), rel=1e-4)
        first = slopes(0.0, (period, angle))[0] / YEAR_S
        assert today.period_derivative[i] == pytest.approx(first, rel=1e-4)
        if np.degrees(angle) < 1e-3:
            continue  # aligned to rounding: no Pdot is left to tell an age by
        assert today.truths["age"][i] == pytest.approx(draws.age[i], rel=1e-3)
        assert today.truths["field"][i] == pytest.approx(draws.birth_field[i] * B_UNIT_G, rel=1e-4)


def test_a_pulled_star_tells_its_own_derivative(tools):
    """Age and field reported for a star behind a companion are its own, whatever the acceleration does to Pdot."""
    priors, rng = Priors(), np.random.default_rng(6)
    draws = draw_prior(4000, priors, rng)
    today = evolve_rival(draws, load_channel("companion"), tools.scenario("candle"), priors, rng)
    seen = today.period_derivative > 0.0
    assert 0.5 < seen.mean() < 1.0
    np.testing.assert_allclose(today.truths["age"][seen], draws.age[seen], rtol=1e-6)
    np.testing.assert_allclose(today.truths["field"][seen], draws.birth_field[seen] * B_UNIT_G, rtol=1e-6)
    assert np.mean(np.abs(today.truths["acceleration_share"][seen]) > 0.05) > 0.02


def test_signs_of_the_excess(tools):
    priors, rng = Priors(), np.random.default_rng(7)
    for rival, low, high in (("spin-noise", 0.47, 0.53), ("companion", 0.4, 0.6), ("glitch", 1.0, 1.0)):
        today = evolve_rival(
            draw_prior(4000, priors, rng), load_channel(rival), tools.scenario("candle"), priors, rng
        )
        seen = today.period_derivative > 0.0
        above = np.mean(today.truths["index_excess"][seen] > 0.0)
        assert low <= above <= high


def test_invented_samples_hold_the_truths_of_rivals():
    table = simulate_table(12, 3, FitSettings(channels=("glitch", "companion", "phonon")))
    assert set(table["truth_channel"]) == {"glitch", "companion", "phonon"}
    glitch = table["truth_channel"] == "glitch"
    assert np.all(np.isfinite(table["truth_glitch_interval"][glitch]))
    assert np.all(np.isnan(table["truth_glitch_interval"][~glitch]))
    assert str(table["truth_orbital_period"].unit) == "yr"
    ages = characteristic_age(np.asarray(table["period"]), np.asarray(table["period_derivative"]))
    assert np.all((ages > 5e3) & (ages < 3e6))


def test_samples_of_decay_have_no_columns_of_rivals():
    assert not {"truth_glitch_interval", "truth_obliquity"} & set(simulate_table(2, 3).colnames)
