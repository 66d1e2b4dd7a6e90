"""What every channel must do under every scenario: numbers at the start, draws in range, verdicts, no crash."""

import io
from dataclasses import replace

import numpy as np
import pytest

from decayinfer.catalog.pulsar import Pulsar
from decayinfer.channels.registry import channel_names, load_channel
from decayinfer.cooling.registry import load_scenario, scenario_names
from decayinfer.inference.density import evaluate
from decayinfer.inference.explore import _start
from decayinfer.inference.fit import fit_channel, fit_object
from decayinfer.inference.forward import draw_prior, evolve
from decayinfer.inference.outcome import Status
from decayinfer.inference.priors import Priors
from decayinfer.inference.problem import COORDINATES, make_problem
from decayinfer.inference.report import parameters
from decayinfer.inference.settings import FitSettings

CHANNELS = channel_names(rivals=False)
SCENARIOS = ("candle", "slow-candle")
SHORT = FitSettings(draws=500, tune=300)


def finite_somewhere(numbers):
    rng = np.random.default_rng(1)
    start = _start(numbers, rng)
    return np.isfinite(evaluate(start[None], numbers).ln_density(numbers)[0]), start


@pytest.mark.parametrize("channel", CHANNELS)
def test_the_sampler_starts_at_a_finite_density(tools, channel, odd):
    """Whatever the object, with and without n; and the parameters there are numbers in their ranges."""
    for scenario in SCENARIOS:
        numbers = tools.problem(channel, scenario, **odd)
        for used in (numbers, numbers.without_index()):
            finite, start = finite_somewhere(used)
            assert finite
            reported = parameters(evaluate(start[None], used), used, load_channel(channel))
            assert set(reported) == set(load_channel(channel).parameters)
            for values in reported.values():
                assert values.shape == (1,)
                assert not np.isnan(values[0])
            assert 1.0 <= reported["mass"][0] <= 2.0
            assert reported["birth_field"][0] >= reported["field"][0] * (1.0 - 1e-9)


@pytest.mark.parametrize("scenario", scenario_names())
@pytest.mark.parametrize("channel", CHANNELS)
def test_every_shipped_scenario_starts(tools, channel, scenario):
    numbers = make_problem(tools.WREN, load_channel(channel), load_scenario(scenario), Priors())
    assert finite_somewhere(numbers)[0]


@pytest.mark.parametrize("scenario", SCENARIOS)
@pytest.mark.parametrize("channel", CHANNELS)
def test_prior_draws_are_in_range(channel, scenario):
    """Masses and ages where the scenarios hold, everything positive; a field only decays, a period only grows."""
    priors = Priors()
    draws = draw_prior(2000, priors, np.random.default_rng(2))
    assert np.all((draws.mass >= 1.0) & (draws.mass <= 2.0))
    assert np.all(draws.age < 5.0 * priors.max_age)  # the taper leaves 2e-6 beyond
    assert all(np.all(values > 0.0) for values in draws)
    today = evolve(draws, load_channel(channel), load_scenario(scenario), priors)
    alive = today.field > 0.0
    assert alive.mean() > 0.5
    assert np.all(today.field <= draws.birth_field * (1.0 + 1e-9))
    assert np.all(today.period >= draws.birth_period)
    assert np.all(today.braking_index[alive] >= 3.0 - 1e-9)
    if channel == "constant":
        np.testing.assert_allclose(today.braking_index, 3.0)
    off = [f"rate_{name}" for name in ("phonon", "impurity", "hall") if name not in channel.split("+")]
    assert all(np.all(getattr(today, name) == 0.0) for name in off)


def test_prior_draws_follow_the_priors():
    """Medians and widths of every lognormal, and the age, flat with its taper; tests at tail probability 1e-3."""
    from scipy import special, stats

    priors = Priors()
    draws = draw_prior(5000, priors, np.random.default_rng(3))
    means, sds = priors.normals()
    for values, mean, sd in zip(draws[1:8], means, sds, strict=True):
        assert stats.kstest(np.log(values), stats.norm(mean, sd).cdf).pvalue > 1e-3
        assert stats.kstest(np.log(values), stats.norm(mean, 0.9 * sd).cdf).pvalue < 1e-3  # negative control

    def ages(t):
        """Integral of 1/(1 + x^8) up to t/T over the whole, in Gauss's hypergeometric function."""
        x = t / priors.max_age
        return x * special.hyp2f1(1.0, 0.125, 1.125, -(x**8)) / (np.pi / 8.0 / np.sin(np.pi / 8.0))

    assert stats.kstest(draws.age, ages).pvalue > 1e-3
    assert stats.kstest(draws.age, stats.uniform(0.0, 1e7).cdf).pvalue < 1e-3  # negative control
    edges = [(edge - priors.mass_mean) / priors.mass_sd for edge in (1.0, 2.0)]
    assert (
        stats.kstest(draws.mass, stats.truncnorm(*edges, priors.mass_mean, priors.mass_sd).cdf).pvalue > 1e-3
    )


# --- fits -------------------------------------------------------------------------------------------------


@pytest.mark.slow
@pytest.mark.parametrize("scenario", SCENARIOS)
@pytest.mark.parametrize("channel", CHANNELS)
def test_an_index_far_below_three_is_unreachable(tools, channel, scenario):
    """n = -14.6 +- 1.8 lies beyond five total errors below 3: a verdict in words, not a forced fit."""
    star = replace(tools.WREN, braking_index=-14.6, braking_index_err_minus=0.6, braking_index_err_plus=0.6)
    fit = fit_channel(star, channel, scenario, SHORT)
    assert fit.status is Status.UNREACHABLE
    assert "below 3" in fit.reason
    assert fit.flags[0] == "unreachable"
    assert fit.ln_evidence == -np.inf
    assert fit.posterior("mass").size == 0
    assert fit.prior("mass").size == SHORT.draws * SHORT.chains


@pytest.mark.slow
def test_odd_input_ends_in_a_status(tools, odd):
    """No exception whatever the object, and a status with its reason."""
    star = replace(tools.WREN, **odd)
    for channel in ("constant", "phonon", "impurity+hall"):
        fit = fit_channel(star, channel, "candle", FitSettings())
        assert fit.status in Status
        assert bool(fit.reason) == (fit.status is not Status.OK)
        if fit.status is Status.OK:
            assert np.isfinite([fit.ln_evidence, fit.ln_evidence_err, fit.ln_evidence_joint]).all()
            for name in load_channel(channel).parameters:
                assert np.all(np.isfinite(fit.posterior(name)))


@pytest.mark.slow
@pytest.mark.parametrize("channel", CHANNELS)
def test_a_fit_holds_what_its_record_says(tools, channel):
    fit = fit_channel(tools.WREN, channel, "candle", FitSettings())
    own = load_channel(channel)
    for name in own.parameters:
        draws = fit.posterior(name)
        assert draws.size == 2000
        assert np.all(np.isfinite(draws))
    shares = [fit.posterior(name) for name in own.parameters if name.startswith("share_")]
    if own.decays:
        np.testing.assert_allclose(sum(shares), 1.0, rtol=1e-9)
        rates = (fit.posterior("braking_index") - 3.0) / (4.0 * tools.WREN.characteristic_age)
        np.testing.assert_allclose(fit.posterior("decay_time"), 1.0 / rates, rtol=1e-9)
    assert np.all(fit.posterior("age") <= tools.WREN.characteristic_age)
    assert fit.draws["posterior"]["coordinates"].sizes["coordinate"] == len(COORDINATES)
    assert set(fit.draws.children) >= {"posterior", "prior", "sample_stats", "log_likelihood", "log_prior"}


def all_bytes(fit):
    """Everything a fit found, as bytes."""
    buffer = io.BytesIO()
    for name, group in sorted(fit.draws.children.items()):
        for variable, values in sorted(group.data_vars.items()):
            buffer.write(f"{name}/{variable}".encode())
            buffer.write(np.ascontiguousarray(values.values).tobytes())
    numbers = [fit.ln_evidence, fit.ln_evidence_err, fit.ln_evidence_joint, fit.ess_bulk_min, fit.r_hat_max]
    return buffer.getvalue() + np.array(numbers).tobytes() + repr((fit.status, fit.flags)).encode()


@pytest.mark.slow
def test_order_and_repetition_change_no_byte(tools):
    """The seed comes from the names: alone, first, last or repeated, a fit is the same to the last bit."""
    star = tools.WREN
    settings = replace(SHORT, channels=("phonon", "impurity"), cooling=SCENARIOS)
    turned = replace(SHORT, channels=("impurity", "phonon"), cooling=SCENARIOS[::-1])
    first = {(f.scenario, f.channel): all_bytes(f) for f in fit_object(star, settings).fits}
    second = {(f.scenario, f.channel): all_bytes(f) for f in fit_object(star, turned).fits}
    assert first == second
    assert all_bytes(fit_channel(star, "phonon", "candle", SHORT)) == first["candle", "phonon"]
    assert len(set(first.values())) == 4
    renamed = fit_channel(replace(star, name="Other"), "phonon", "candle", SHORT)
    assert all_bytes(renamed) != first["candle", "phonon"]


def test_an_index_without_error_is_refused(tools):
    star = Pulsar(name="Bare", period=0.3, period_derivative=4e-14, braking_index=9.0)
    with pytest.raises(ValueError, match=r"Bare: an index needs its error"):
        make_problem(star, load_channel("phonon"), tools.scenario("candle"), Priors())
