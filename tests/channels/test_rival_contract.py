"""Each rival against plain Monte Carlo from birth, by forward code of this file alone.

Stars are drawn from the priors and followed to today: those that land in a cell around an object's ln P and ln Pdot
give the density there, and the mean likelihood of n among them the evidence of n. Orbits solve Kepler's equation by
Newton's steps and differentiate positions; alignment comes from a table of integrated torque equations; nothing is
shared with the package but constants, scenarios and the likelihood of n.
"""

from dataclasses import replace
from functools import cache

import numpy as np
import pytest
from scipy.integrate import solve_ivp
from scipy.interpolate import RegularGridInterpolator
from scipy.stats import truncnorm

from decayinfer.channels.registry import channel_names, load_channel
from decayinfer.inference.fit import fit_channel
from decayinfer.inference.measurement import ln_index_likelihood
from decayinfer.inference.outcome import Status
from decayinfer.inference.priors import Priors
from decayinfer.inference.settings import FitSettings
from decayinfer.physics.constants import C_CGS, G_CGS, M_SUN_G, YEAR_S

RIVALS = channel_names(rivals=True)
PRIORS = Priors()
STARS = 1_500_000
HALF = 0.3  # half width of the cell in ln P and ln Pdot
#: Indices that each rival often gives, so that the sums have enough terms.
MEASURED = {
    "obliquity-vacuum": (6.0, 2.0),
    "obliquity-plasma": (3.1, 0.1),
    "companion": (8.0, 10.0),
    "spin-noise": (-9.0, 4.0),
    "glitch": (12.0, 5.0),
}


def births(scenario, n, rng):
    """Mass, birth period [s], age [s] and K = 4 pi^2 B^2 R^6/(c^3 I) [s]."""
    edges = [(edge - PRIORS.mass_mean) / PRIORS.mass_sd for edge in (1.0, 2.0)]
    mass = truncnorm.rvs(*edges, loc=PRIORS.mass_mean, scale=PRIORS.mass_sd, size=n, random_state=rng)
    period = 10.0 ** rng.normal(PRIORS.birth_period_log10_mean, PRIORS.birth_period_log10_sd, n)
    field = 10.0 ** rng.normal(PRIORS.birth_field_log10_mean, PRIORS.birth_field_log10_sd, n)
    ages = rng.uniform(0.0, 3.0 * PRIORS.max_age, 4 * n)
    ages = ages[rng.random(4 * n) < 1.0 / (1.0 + (ages / PRIORS.max_age) ** 8)][:n]
    radius, inertia = scenario.radius_km(mass) * 1e5, scenario.inertia_45(mass) * 1e45
    return mass, period, ages * YEAR_S, 4.0 * np.pi**2 * field**2 * radius**6 / (C_CGS**3 * inertia)


def dipoles(scenario, n, rng):
    mass, birth, age, strength = births(scenario, n, rng)
    product = 2.0 / 3.0 * strength  # P Pdot of an orthogonal rotator in vacuum
    period = np.sqrt(birth**2 + 2.0 * product * age)
    return mass, period, product / period


def spin_noise(scenario, n, rng):
    """The regression on the catalogue (Manchester et al. 2005), its scatter shared by scale and sign."""
    _, period, derivative = dipoles(scenario, n, rng)
    nu, nudot = 1.0 / period, -derivative / period**2
    x, y = np.log10(-nudot / 1e-15), np.log10(nu)
    part = np.log10(np.abs(np.random.default_rng(0).standard_normal(2_000_000)))
    sd = np.sqrt(0.83**2 - part.var() + 0.11**2 + (0.13 * x) ** 2 + (0.28 * y) ** 2)
    scale = 10.0 ** rng.normal(-26.35 - part.mean() + 0.97 * x + 0.38 * y, sd)
    return period, derivative, 3.0 + scale * rng.standard_normal(n) * nu / nudot**2


def glitch(scenario, n, rng):
    _, period, derivative = dipoles(scenario, n, rng)
    nudot = derivative / period**2
    step = np.exp(rng.normal(np.log(PRIORS.glitch_step_median), PRIORS.glitch_step_sd, n)) * nudot
    interval = (
        np.exp(rng.normal(np.log(PRIORS.glitch_interval_median), PRIORS.glitch_interval_sd, n)) * YEAR_S
    )
    tau = np.exp(rng.normal(np.log(PRIORS.recovery_time_median), PRIORS.recovery_time_sd, n)) * YEAR_S
    share, elapsed = rng.random(n), rng.random(n) * interval
    nuddot = (1.0 - share) * step / interval + share * step / tau * np.exp(-elapsed / tau)
    return period, derivative, 3.0 + nuddot / period / nudot**2


def companion(scenario, n, rng):
    mass, period, derivative = dipoles(scenario, n, rng)
    other = np.exp(rng.normal(np.log(PRIORS.companion_mass_median), PRIORS.companion_mass_sd, n))
    e, argument, sine = (
        np.sqrt(rng.random(n)),
        rng.uniform(0, 2 * np.pi, n),
        np.sin(np.arccos(rng.uniform(-1, 1, n))),
    )
    mean = rng.uniform(-np.pi, np.pi, n)

    def line_of_sight(phase):
        """Height over the plane of the sky in units of a_p."""
        anomaly = phase + 0.85 * e * np.sign(np.sin(phase))
        for _ in range(40):
            anomaly -= (anomaly - e * np.sin(anomaly) - phase) / (1.0 - e * np.cos(anomaly))
        x, y = np.cos(anomaly) - e, np.sqrt(1.0 - e**2) * np.sin(anomaly)
        return sine * (x * np.sin(argument) + y * np.cos(argument)), np.arctan2(y, x)

    h = 1e-3 * (1.0 - e) ** 1.5
    (low2, _), (low, before), (now, _), (high, after), (high2, _) = (
        line_of_sight(mean + k * h) for k in range(-2, 3)
    )
    second = (-low2 + 16 * low - 30 * now + 16 * high - high2) / (12 * h**2)
    third = (-low2 + 2 * low - 2 * high + high2) / (2 * h**3)
    turn = np.abs(np.angle(np.exp(1j * (after - before)))) / (2 * h)  # true over mean angular velocity
    least = np.log(PRIORS.companion_period_min) + np.maximum(0.0, np.log(turn))
    most = np.maximum(np.log(PRIORS.companion_period_max), least + np.log(10.0))
    omega = 2.0 * np.pi / (np.exp(rng.uniform(least, most)) * YEAR_S)
    axis = np.cbrt(G_CGS * M_SUN_G * (mass + other) / omega**2) * other / (mass + other)
    pull, jerk = axis * omega**2 * second / C_CGS, axis * omega**3 * third / C_CGS
    nu, nudot = 1.0 / period, -derivative / period**2
    first_seen = nudot - nu * pull
    second_seen = 3.0 * nudot**2 / nu - 3.0 * nudot * pull - nu * jerk
    return period, -first_seen / nu**2, nu * second_seen / first_seen**2


@cache
def aligned_table(k0, k1, k2):
    """ln P/P_0 and ln tan a over birth cosine and ln(K t/P_0^2), by integration of the torque equations."""
    cosines = np.concatenate([np.linspace(1e-4, 0.99, 160), 1.0 - np.geomspace(0.0095, 1e-5, 40)])
    spans = np.linspace(-12.0, 16.0, 281)
    rows = []
    for cosine in cosines:

        def slopes(s, state):
            ln_p, ln_tan = state
            sine2 = 1.0 / (1.0 + np.exp(-2.0 * ln_tan))
            rate = np.exp(s - 2.0 * ln_p)  # d(K t/P_0^2) (P_0/P)^2
            return rate * (k0 + k1 * sine2), -rate * k2

        start = [0.0, 0.5 * np.log(1.0 - cosine**2) - np.log(cosine)]
        run = solve_ivp(slopes, (spans[0], spans[-1]), start, "LSODA", spans, rtol=1e-8, atol=1e-8)
        rows.append(run.y.T)
    return RegularGridInterpolator((cosines, spans), np.array(rows), bounds_error=False, fill_value=None)


def aligned(k0, k1, k2):
    def draw(scenario, n, rng):
        _, birth, age, strength = births(scenario, n, rng)
        ln_span = np.clip(np.log(strength * age / birth**2), -12.0, 16.0)
        ln_growth, ln_tan = aligned_table(k0, k1, k2)(np.column_stack([rng.random(n), ln_span])).T
        sine2 = 1.0 / (1.0 + np.exp(-2.0 * np.minimum(ln_tan, 300.0)))
        torque = k0 + k1 * sine2
        period = birth * np.exp(ln_growth)
        # n from d ln(torque)/dt = 2 k1 sin cos adot/torque with adot = -k2 K sin cos/P^2
        return period, strength * torque / period, 3.0 + 2.0 * k1 * k2 * sine2 * (1.0 - sine2) / torque**2

    return draw


FORWARD = {
    "obliquity-vacuum": aligned(0.0, 2.0 / 3.0, 2.0 / 3.0),
    "obliquity-plasma": aligned(1.0, 1.0, 1.0),
    "companion": companion,
    "spin-noise": spin_noise,
    "glitch": glitch,
}


def in_cell(star, rival, scenario):
    """Shares of forward stars in the cell, and their mean likelihood of n; with standard errors."""
    rng, found, total = np.random.default_rng(31), [], 0
    for _ in range(STARS // 250_000):
        with np.errstate(all="ignore"):
            period, derivative, index = FORWARD[rival](scenario, 250_000, rng)
            near = np.abs(np.log(period / star.period)) < HALF
            near &= np.abs(np.log(derivative / star.period_derivative)) < HALF
        found.append(index[near])
        total += period.size
    index = np.concatenate(found)
    error = star.braking_index_err_plus
    likelihood = np.exp(ln_index_likelihood(star.braking_index, index, error, error, 0.0, PRIORS.scatter_sd))
    density = index.size / total / (2.0 * HALF) ** 2
    evidence = likelihood.mean()
    return (density, density / np.sqrt(index.size)), (evidence, likelihood.std() / np.sqrt(index.size))


@pytest.mark.slow
@pytest.mark.parametrize("rival", RIVALS)
def test_evidence_and_prior_are_those_of_stars_followed_from_birth(tools, rival):
    index, error = MEASURED[rival]
    star = replace(
        tools.WREN, braking_index=index, braking_index_err_minus=error, braking_index_err_plus=error
    )
    fit = fit_channel(star, rival, "candle", FitSettings(draws=500))
    assert fit.status is Status.OK
    (density, density_err), (evidence, evidence_err) = in_cell(star, rival, tools.scenario("candle"))
    prior = np.exp(fit.ln_evidence_joint - fit.ln_evidence)
    # the cell's width bends the density by a few per cent
    assert prior == pytest.approx(density, abs=4.0 * np.hypot(density_err, 0.04 * density))
    assert evidence_err < 0.25 * evidence
    slack = np.hypot(0.04, fit.ln_evidence_err) * evidence
    assert np.exp(fit.ln_evidence) == pytest.approx(evidence, abs=4.0 * np.hypot(evidence_err, slack))


@pytest.mark.slow
def test_that_comparison_can_fail(tools):
    """Glitches ten times stronger are told apart."""
    star = replace(tools.WREN, braking_index=12.0, braking_index_err_minus=5.0, braking_index_err_plus=5.0)
    wrong = FitSettings(draws=500, priors=Priors(glitch_step_median=3e-2))
    fit = fit_channel(star, "glitch", "candle", wrong)
    _, (evidence, evidence_err) = in_cell(star, "glitch", tools.scenario("candle"))
    assert abs(np.exp(fit.ln_evidence) - evidence) > 4.0 * np.hypot(evidence_err, 0.06 * evidence)


@pytest.mark.parametrize("rival", RIVALS)
def test_odd_input_ends_in_a_status(tools, rival, odd):
    """No exception and no warning whatever the object, and a status with its reason."""
    fit = fit_channel(replace(tools.WREN, **odd), rival, "candle", FitSettings(draws=500))
    assert fit.status in Status
    assert bool(fit.reason) == (fit.status is not Status.OK)
    if fit.status is Status.OK:
        assert np.isfinite([fit.ln_evidence, fit.ln_evidence_err, fit.ln_evidence_joint]).all()
        for name in load_channel(rival).parameters:
            assert np.all(np.isfinite(fit.posterior(name)))
        assert np.all(fit.posterior("birth_period") <= replace(tools.WREN, **odd).period)
        assert np.all((fit.posterior("mass") >= 1.0) & (fit.posterior("mass") <= 2.0))
