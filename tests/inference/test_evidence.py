"""Evidences against forward Monte Carlo, brute-force quadrature and a nested sampler.

The full runs are in tests/studies, with their results.
"""

import json
from pathlib import Path

import numpy as np
import pytest
from scipy import integrate, stats

from decayinfer.cooling.form import MASS_RANGE
from decayinfer.inference.density import evaluate
from decayinfer.inference.fit import fit_channel
from decayinfer.inference.priors import Priors
from decayinfer.inference.settings import FitSettings
from decayinfer.physics import torque

STUDIES = Path(__file__).parents[1] / "studies"


# --- forward Monte Carlo ----------------------------------------------------------------------------------


@pytest.fixture(scope="module")
def forward_study(study):
    return study("evidence_forward")


@pytest.mark.slow
@pytest.mark.parametrize("channel", ["impurity", "phonon", "impurity+phonon+hall"])
def test_evidence_is_that_of_a_forward_simulation(forward_study, channel):
    """Prior, field and spin equations, binned near the data: within 3.5 standard errors, none above 0.1."""
    row = forward_study.compare(channel, "candle", 300_000, seed=3)
    assert row["status"] == "ok"
    for kind in ("joint", "spin"):
        assert np.hypot(row[f"{kind}_simulated_err"], row[f"{kind}_inferred_err"]) < 0.1
        assert abs(row[f"{kind}_pull"]) < 3.5


@pytest.mark.slow
def test_the_simulation_tells_scenarios_apart(forward_study):
    """Negative control: the evidence of a warmer star does not pass for that of a colder one."""
    value, error, _ = forward_study.simulated(
        "phonon", "candle", forward_study.OBJECT, 300_000, np.random.default_rng(4)
    )["joint"]
    fitted, fit_error, _ = forward_study.inferred("phonon", "slow-candle", forward_study.OBJECT)[0]["joint"]
    assert abs(fitted - value) > 3.5 * np.hypot(error, fit_error)


def test_impossible_stars_are_impossible(forward_study):
    """Stars that the study does not follow end outside its bin, every one."""
    study, star = forward_study, forward_study.OBJECT
    rng = np.random.default_rng(5)
    sample, _ = study.stars(4000, study.Priors(), 1.0, rng)
    ages = star.characteristic_age * 4.0 * rng.random(4000)
    sample = study.forward.Draws(**(vars(sample) | {"age": ages}))
    scenario = study.load_scenario("candle")
    left_out = ~study.may_end_in_bin(sample, scenario, star, study.WIDTH)
    left_out |= ages > star.characteristic_age * np.exp(study.WIDTH)
    today = study.forward.evolve(sample[left_out], scenario, channel="phonon+hall")
    with np.errstate(divide="ignore"):
        off = np.abs(np.log([today.period / star.period, today.period_derivative / star.period_derivative]))
    assert left_out.sum() > 1000
    assert np.all(off.max(axis=0) > study.WIDTH / 2)


# --- brute force ------------------------------------------------------------------------------------------


def grid_evidence(numbers, axes):
    """Trapezoids over the coordinates in use, on a product grid; the idle ones integrate to one."""
    active = np.flatnonzero(numbers.active)
    assert len(active) == len(axes)
    points = np.zeros((int(np.prod([axis.size for axis in axes])), 8))
    points[:, active] = np.stack(np.meshgrid(*axes, indexing="ij"), axis=-1).reshape(-1, len(axes))
    ln_density = np.concatenate(
        [evaluate(part, numbers).ln_density(numbers) for part in np.array_split(points, 16)]
    )
    ln_density += 0.5 * (8 - len(active)) * np.log(2.0 * np.pi)
    top = ln_density.max()
    total = np.exp(ln_density - top).reshape([axis.size for axis in axes])
    edge = max(np.moveaxis(total, i, 0)[[0, -1]].max() for i in range(len(axes)))
    assert edge < 1e-3  # the grid holds all of it
    for axis in reversed(axes):
        total = np.trapezoid(total, axis, axis=-1)
    return top + np.log(total)


@pytest.mark.slow
def test_evidence_of_impurity_decay_by_brute_force(tools):
    """Four coordinates in use: mass, index, birth period and depth."""
    numbers = tools.problem("impurity")
    fit = fit_channel(tools.WREN, "impurity", "candle", FitSettings())
    mass, period, depth = np.linspace(-9.0, 6.0, 24), np.linspace(-9.0, 9.0, 28), np.linspace(6.0, 18.0, 18)
    joint = grid_evidence(numbers, [mass, np.linspace(-11.0, 5.0, 40), period, depth])
    spin = grid_evidence(numbers.without_index(), [mass, np.linspace(-10.0, 5.0, 30), period, depth])
    assert fit.ln_evidence_joint == pytest.approx(joint, abs=0.03)
    assert fit.ln_evidence == pytest.approx(joint - spin, abs=0.03)


@pytest.mark.slow
def test_evidence_of_a_constant_dipole_by_brute_force(tools):
    """Two coordinates; and exactly n = 3, so that the evidence of n is one number."""
    numbers = tools.problem(
        "constant", braking_index=3.4, braking_index_err_minus=0.5, braking_index_err_plus=0.5
    )
    star = tools.replace(
        tools.WREN, braking_index=3.4, braking_index_err_minus=0.5, braking_index_err_plus=0.5
    )
    fit = fit_channel(star, "constant", "candle", FitSettings())
    joint = grid_evidence(numbers, [np.linspace(-12.0, 7.0, 200), np.linspace(-12.0, 12.0, 200)])
    assert fit.ln_evidence_joint == pytest.approx(joint, abs=0.03)
    likelihood = evaluate(np.zeros((1, 8)), numbers).ln_likelihood[0]
    assert fit.ln_evidence == pytest.approx(likelihood, abs=1e-12)


def test_a_constant_dipole_in_plain_integrals(tools):
    """p(ln P, ln Pdot) of a constant field, with no coordinate at all.

    With x = P_0/P: ln B_0 = (ln P + ln Pdot)/2 + a function of mass, ln P_0 = ln P + ln x and t = tau_c (1 - x^2), so
    that |d(ln B_0, ln P_0, t)/d(x, ln P, ln Pdot)| = tau_c (1 - x^2)/x + tau_c x = tau_c/x. The density is the
    integral over mass and x of the priors times that.
    """
    priors, star, scenario = Priors(), tools.WREN, tools.scenario("candle")
    edges = [(edge - priors.mass_mean) / priors.mass_sd for edge in MASS_RANGE]
    mass_prior = stats.truncnorm(*edges, priors.mass_mean, priors.mass_sd)
    field_prior = stats.norm(
        priors.birth_field_log10_mean * np.log(10), priors.birth_field_log10_sd * np.log(10)
    )
    period_prior = stats.norm(
        priors.birth_period_log10_mean * np.log(10), priors.birth_period_log10_sd * np.log(10)
    )

    def over_mass(mass):
        size = {"radius_km": scenario.radius_km(mass), "inertia_45": scenario.inertia_45(mass)}
        field = torque.dipole_field(star.period, star.period_derivative, **size)
        return mass_prior.pdf(mass) * field_prior.pdf(np.log(field * 1e12))

    def over_life(x):
        return period_prior.pdf(np.log(star.period * x)) / x

    mass_part = integrate.quad(over_mass, *MASS_RANGE)[0]
    life_part = integrate.quad(over_life, 1e-9, 1.0, points=[1e-3, 1e-2, 0.1], limit=200)[0]
    taper = np.pi / 8.0 / np.sin(np.pi / 8.0)
    expected = np.log(mass_part * life_part * star.characteristic_age / (priors.max_age * taper))
    numbers = tools.problem("constant").without_index()
    found = grid_evidence(numbers, [np.linspace(-12.0, 7.0, 300), np.linspace(-14.0, 14.0, 300)])
    assert found == pytest.approx(expected, abs=1e-3)


# --- committed studies ------------------------------------------------------------------------------------


def test_the_full_forward_study_passed():
    """Every decay channel within 3.5 standard errors, every error below 0.05."""
    record = json.loads((STUDIES / "evidence_forward.json").read_text())
    channels = {row["channel"] for row in record["rows"]}
    assert len(channels) == 7
    for row in record["rows"]:
        assert row["status"] == "ok"
        for kind in ("joint", "spin"):
            assert np.hypot(row[f"{kind}_simulated_err"], row[f"{kind}_inferred_err"]) < 0.05
            assert abs(row[f"{kind}_pull"]) < 3.5


def test_the_annealed_study_passed():
    """PyMC's sequential Monte Carlo of n given the spin, two objects and two channels: within 3.5 standard errors."""
    rows = json.loads((STUDIES / "evidence_annealed.json").read_text())["rows"]
    assert len({(row["object"], row["channel"]) for row in rows}) == 4
    for row in rows:
        assert row["status"] == "ok"
        assert np.hypot(row["annealed_err"], row["fitted_err"]) < 0.1
        assert abs(row["pull"]) < 3.5
