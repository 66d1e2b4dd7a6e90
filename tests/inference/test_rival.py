"""Fits of the rivals: densities against the constant channel and the forward map, evidences against plain sums."""

from dataclasses import replace

import numpy as np
import pytest

from decayinfer.channels.registry import channel_names, load_channel
from decayinfer.inference.coordinates import physical
from decayinfer.inference.density import evaluate
from decayinfer.inference.fit import fit_channel
from decayinfer.inference.outcome import Status
from decayinfer.inference.priors import Priors
from decayinfer.inference.rival import integrate_posterior, integrate_prior, make_rival_problem
from decayinfer.inference.rival_density import Pinned, evaluate_rival, pinnable
from decayinfer.inference.settings import FitSettings

RIVALS = channel_names(rivals=True)
PINNED = ("companion", "spin-noise", "glitch")
SHORT = FitSettings(draws=500)


def problem_of(tools, rival, star=None, settings=SHORT, **changes):
    return make_rival_problem(
        replace(star or tools.WREN, **changes), load_channel(rival), tools.scenario("candle"), settings
    )


def test_spin_part_equals_the_constant_channel_point_by_point(tools, rng):
    """Spin noise and constant field share mass, birth period, field and age: densities differ by a Jacobian alone."""
    from scipy.stats import norm, truncnorm

    priors, star = Priors(), tools.WREN
    numbers = tools.problem("constant")
    z = np.zeros((200, 8))
    z[:, 0], z[:, 4] = rng.normal(-1.0, 1.0, 200), rng.normal(-0.5, 1.5, 200)
    found = evaluate(z, numbers)
    idle = -0.5 * 6 * np.log(2.0 * np.pi)  # six unused coordinates at zero
    p = physical(list(z.T), found.history, numbers)

    # the same stars in a rival's coordinates
    low, high = ((edge - priors.mass_mean) / priors.mass_sd for edge in (1.0, 2.0))
    mass = truncnorm(low, high, priors.mass_mean, priors.mass_sd)
    mean, sd = priors.normals()[:, 5]
    cut = norm.cdf((np.log(star.period) - mean) / sd)
    u = np.zeros((200, 4))
    u[:, 0] = norm.ppf(mass.cdf(p.mass))
    u[:, 1] = norm.ppf(norm.cdf((p.ln_birth_period - mean) / sd) / cut)
    e = evaluate_rival(u, problem_of(tools, "spin-noise"))
    np.testing.assert_allclose(e.spin.mass, p.mass, rtol=1e-9)
    np.testing.assert_allclose(e.spin.period_ratio * star.period, np.exp(p.ln_birth_period), rtol=1e-9)
    ln_noise = -np.log(2.0 * np.pi)  # two coordinates of the noise at zero
    # per unit of mass and of ln P_0, on either side
    ln_rival = e.ln_prior - ln_noise - norm.logpdf(u[:, 0]) - norm.logpdf(u[:, 1])
    ln_rival += mass.logpdf(p.mass) + norm.logpdf(p.ln_birth_period, mean, sd) - np.log(cut)
    share = 1.0 / (1.0 + np.exp(-z[:, 0]))
    ln_constant = found.ln_prior - idle - np.log(share * (1.0 - share)) + np.log1p(np.exp(z[:, 4]))
    np.testing.assert_allclose(ln_rival, ln_constant, rtol=0.0, atol=1e-9)


def test_joint_evidence_of_pure_spin_equals_that_of_the_constant_channel(tools):
    """A rival that leaves P and Pdot alone has the p(ln P, ln Pdot) of a constant field."""
    constant = fit_channel(tools.WREN, "constant", "candle", FitSettings())
    prior = constant.ln_evidence_joint - constant.ln_evidence
    if constant.status is Status.UNREACHABLE:  # the evidence without n is then not in the record
        prior = None
    for rival in ("spin-noise", "glitch"):
        found = integrate_prior(problem_of(tools, rival), np.random.default_rng(1))
        reference = integrate_prior(problem_of(tools, "spin-noise"), np.random.default_rng(2))
        err = np.hypot(found.ln_evidence_err, reference.ln_evidence_err)
        assert found.ln_evidence == pytest.approx(reference.ln_evidence, abs=4.0 * err)
        if prior is not None:
            assert found.ln_evidence == pytest.approx(
                prior, abs=4.0 * np.hypot(err, constant.ln_evidence_joint_err)
            )


@pytest.mark.parametrize("rival", PINNED)
def test_pinned_coordinates_carry_their_derivative(tools, rival, rng):
    """d(coordinate)/d(pinned coordinate) by central differences, and pinning a point's own index leads back to it."""
    problem = problem_of(tools, rival).pin(Pinned.INDEX)
    points = rng.standard_normal((400, problem.size))
    middle = evaluate_rival(points, problem)
    reached = pinnable(middle, problem, Pinned.INDEX) & np.isfinite(middle.ln_prior)
    assert reached.sum() > 40
    step = np.zeros(problem.size)
    step[2] = 1e-5
    above, below = (evaluate_rival(points + s * step, problem).coordinates[:, 2] for s in (1.0, -1.0))
    slope = np.abs(above - below) / 2e-5
    np.testing.assert_allclose(np.log(slope[reached]), middle.ln_pinned[reached], atol=1e-4)


def test_pinned_ratio_carries_its_derivative(tools, rng):
    problem = problem_of(tools, "companion").pin(Pinned.RATIO)
    points = rng.standard_normal((400, problem.size))
    middle = evaluate_rival(points, problem)
    reached = pinnable(middle, problem, Pinned.RATIO)
    assert reached.sum() > 40
    step = np.zeros(problem.size)
    step[2] = 1e-5
    above, below = (evaluate_rival(points + s * step, problem).coordinates[:, 2] for s in (1.0, -1.0))
    slope = np.abs(above - below)[reached] / 2e-5
    np.testing.assert_allclose(np.log(slope), middle.ln_pinned[reached], atol=1e-4)


CASES = {
    "typical": {},
    "negative": {"braking_index": -14.6, "braking_index_err_minus": 1.8, "braking_index_err_plus": 1.8},
    "near three": {"period": 0.206, "period_derivative": 9.7e-13, "braking_index": 3.15,
                   "braking_index_err_minus": 0.03, "braking_index_err_plus": 0.03},
    "limit": {"braking_index": np.nan, "braking_index_limit": 15.0},
    "one-sided": {"braking_index_err_minus": 0.3, "braking_index_err_plus": 6.0},
}  # fmt: skip


@pytest.mark.parametrize("case", CASES)
@pytest.mark.parametrize("rival", RIVALS)
def test_evidence_equals_a_plain_sum_over_the_prior(tools, rival, case):
    """The mean of density over the standard normal, in plain draws of the coordinates: no pinning, no adaptation."""
    problem = problem_of(tools, rival, **CASES[case])
    rng = np.random.default_rng(4)
    without, within = [], []
    for _ in range(8):
        u = rng.standard_normal((50_000, problem.size))
        e = evaluate_rival(u, problem)
        ln = e.ln_prior + 0.5 * np.sum(u**2, axis=1) + 0.5 * problem.size * np.log(2.0 * np.pi)
        without.append(np.exp(ln))
        within.append(np.exp(ln + e.ln_likelihood))
    prior = integrate_prior(problem, rng)
    for sums, found in ((without, prior), (within, integrate_posterior(problem, prior, rng))):
        values = np.concatenate(sums)
        err = values.std() / values.mean() / np.sqrt(values.size)
        if err > 0.15:
            continue  # too few plain draws meet the measurement to judge by
        assert found.ln_evidence_err < 0.05
        assert found.ln_evidence == pytest.approx(
            np.log(values.mean()), abs=4.0 * np.hypot(err, found.ln_evidence_err)
        )


@pytest.mark.parametrize("rival", RIVALS)
def test_a_fit_is_reproducible_and_in_the_common_layout(tools, rival):
    fit = fit_channel(tools.WREN, rival, "candle", SHORT)
    again = fit_channel(tools.WREN, rival, "candle", SHORT)
    assert fit.ln_evidence == again.ln_evidence
    assert fit.status is Status.OK
    assert fit.flags == ("weighted",)
    assert fit.ess_bulk_min >= 400.0
    assert fit.ln_evidence_err < 0.05
    tree = fit.draws
    assert set(tree.children) >= {
        "posterior", "prior", "sample_stats", "log_likelihood", "log_prior", "observed_data",
    }  # fmt: skip
    own = load_channel(rival)
    for group in ("posterior", "prior"):
        assert set(tree[group].data_vars) == {"coordinates", *own.parameters}
        for name in own.parameters:
            values = tree[group][name].values
            assert values.shape == (2, 500)
            assert np.all(np.isfinite(values))
    assert {"object", "scenario", "channel", "seed", "settings", "schema", "versions"} <= set(tree.attrs)
    np.testing.assert_array_equal(fit.posterior("braking_index"), again.posterior("braking_index"))


@pytest.mark.parametrize("rival", ["spin-noise", "companion"])
def test_negative_indices_are_reached_from_either_side_alike(tools, rival):
    star = replace(tools.WREN, braking_index=-14.0)
    mirror = replace(tools.WREN, braking_index=20.0)
    below, above = (fit_channel(s, rival, "candle", SHORT) for s in (star, mirror))
    assert below.status is Status.OK
    assert np.median(below.posterior("braking_index")) == pytest.approx(-14.0, abs=2.0)
    err = np.hypot(below.ln_evidence_err, above.ln_evidence_err)
    # exact for noise; the acceleration tilts an orbit a little
    assert below.ln_evidence == pytest.approx(above.ln_evidence, abs=4.0 * err + 0.2 * (rival == "companion"))


def test_channels_above_three_do_not_reach_far_below(tools):
    star = replace(tools.WREN, braking_index=-40.0)
    for rival in ("obliquity-vacuum", "obliquity-plasma", "glitch"):
        fit = fit_channel(star, rival, "candle", SHORT)
        assert fit.status is Status.UNREACHABLE
        assert "below 3" in fit.reason
        assert fit.prior("mass").size == 1000
        assert fit.posterior("mass").size == 0
    high = fit_channel(replace(tools.WREN, braking_index=40.0), "obliquity-plasma", "candle", SHORT)
    assert high.status is Status.UNREACHABLE
    assert "above 3.25" in high.reason


def test_own_measurements_of_the_object_replace_the_wide_priors(tools):
    from dataclasses import make_dataclass

    facts = ("glitch_nudot_step", "glitch_time_since", "data_span", "spin_noise_log10_scale")
    known = make_dataclass("Known", [(name, float, np.nan) for name in facts], bases=(type(tools.WREN),),
                           frozen=True, kw_only=True)  # fmt: skip

    def star(**values):
        return known(**(vars(tools.WREN) | values))

    glitch = fit_channel(star(glitch_nudot_step=5e-3, glitch_time_since=2.0), "glitch", "candle", SHORT)
    assert np.std(np.log(glitch.prior("glitch_nudot_step") / 5e-3)) == pytest.approx(0.1, rel=0.1)
    np.testing.assert_allclose(glitch.posterior("glitch_time_since"), 2.0)
    assert np.all(glitch.posterior("glitch_interval") > 2.0)

    wide = fit_channel(star(data_span=60.0), "companion", "candle", SHORT)
    assert wide.posterior("orbital_period").min() > 60.0
    assert fit_channel(star(), "companion", "candle", SHORT).prior("orbital_period").min() < 60.0

    quiet, loud = (
        fit_channel(star(spin_noise_log10_scale=s), "spin-noise", "candle", SHORT) for s in (-26.0, -23.6)
    )
    assert loud.ln_evidence > quiet.ln_evidence + 3.0
