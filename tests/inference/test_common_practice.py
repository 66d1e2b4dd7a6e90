"""What every worker in the field expects of the answer; each line says where the expectation comes from."""

import numpy as np
import pytest

from decayinfer.channels.registry import load_channel
from decayinfer.cooling.envelope import surface_temperature
from decayinfer.inference.forward import PriorDraws, evolve
from decayinfer.inference.priors import Priors
from decayinfer.physics.conduction import phonon_time

MASSES = np.linspace(1.0, 2.0, 11)


def stars(n=11, **changes):
    values = {
        "mass": np.full(n, 1.4), "phonon_time": np.full(n, 2e5), "impurity_parameter": np.full(n, 1.0),
        "hall_factor": np.ones(n), "attractor_times": np.full(n, 3.0), "birth_field": np.full(n, 10.0),
        "birth_period": np.full(n, 0.05), "umklapp": np.full(n, 0.3), "age": np.full(n, 3e4),
    }  # fmt: skip
    return PriorDraws(**(values | {key: np.broadcast_to(value, n) for key, value in changes.items()}))


@pytest.mark.parametrize("age", [1e3, 1e4, 1e5])
@pytest.mark.parametrize("scenario", ["candle", "slow-candle"])
def test_the_index_rises_as_the_mass_falls(tools, scenario, age):
    """Common practice: without a superfluid core, light stars are warmer inside and their field decays faster.

    At fixed age, phonon time, birth field and birth period; and n - 3 = 4 tau_c r falls with mass throughout.
    """
    today = evolve(stars(mass=MASSES, age=age), load_channel("phonon"), tools.scenario(scenario), Priors())
    assert np.all(np.diff(today.braking_index) < 0.0)
    assert np.all(np.diff(today.temperature) < 0.0)


def test_a_thinner_crust_layer_decays_faster(tools):
    """Common practice: a shorter phonon time gives a larger index."""
    times = np.geomspace(5e4, 2e6, 11)
    today = evolve(stars(phonon_time=times), load_channel("phonon"), tools.scenario("candle"), Priors())
    assert np.all(np.diff(today.braking_index) < 0.0)


def test_the_phonon_rate_goes_as_the_square_of_temperature(tools):
    """tau ~ T^-2 above the Umklapp temperature (Cumming, Arras & Zweibel 2004, ApJ 609, 999)."""
    scenario, priors = tools.scenario("candle"), Priors(freeze_out="none")
    today = evolve(stars(age=np.geomspace(1e3, 1e6, 11)), load_channel("phonon"), scenario, priors)
    slope = np.diff(np.log(today.rate_phonon)) / np.diff(np.log(today.temperature))
    np.testing.assert_allclose(slope, 2.0, rtol=1e-9)
    # and it is the phonon time at 1e8 K, redshifted, that the parameter names
    scaled = today.rate_phonon * 2e5 / today.temperature**2
    np.testing.assert_allclose(scaled, scenario.redshift_factor(1.4), rtol=1e-9)
    assert phonon_time(0.3, 2.0) == pytest.approx(phonon_time(0.3, 1.0) / 4.0)


def test_crust_of_1e8_kelvin_under_a_surface_of_1e6(tools):
    """Common practice: T_b near 1e8 K where T_s is near 1e6 K, for iron (Gudmundsson et al. 1983, ApJ 272, 286)."""
    gravity = float(tools.scenario("candle").gravity_14(1.4))
    assert surface_temperature(1e8, gravity, envelope="iron-1983") == pytest.approx(1e6, rel=0.15)
    # a standard star of 1e5 yr is there
    assert np.exp(tools.scenario("candle").ln_temperature(np.log(1e5), 1.4)) == pytest.approx(1.0, abs=0.4)


def test_hall_drift_slows_as_the_field_decays(tools):
    """The Hall time is inversely proportional to the field (Cumming, Arras & Zweibel 2004)."""
    scenario = tools.scenario("candle")
    today = evolve(stars(birth_field=np.geomspace(1.0, 100.0, 11)), load_channel("hall"), scenario, Priors())
    np.testing.assert_allclose(today.hall_time * today.field, (today.hall_time * today.field)[0], rtol=1e-9)


def test_impurities_decay_the_field_at_a_constant_rate(tools):
    """Impurity scattering does not know the temperature: Q/tau_1 whatever the age."""
    ages = np.geomspace(1e3, 1e6, 11)
    today = evolve(stars(age=ages), load_channel("impurity"), tools.scenario("candle"), Priors())
    np.testing.assert_allclose(today.rate_impurity, today.rate_impurity[0], rtol=1e-12)
    np.testing.assert_allclose(np.log(10.0 / today.field), today.rate_impurity * ages, rtol=1e-9)


def test_indices_near_a_hundred_are_within_reach(tools):
    """Common practice: n near 100 at tau_c of 1e4-1e5 yr needs a warm star and a short phonon time."""
    draws = stars(2000, phonon_time=np.geomspace(1e3, 1e6, 2000), age=3e3, umklapp=0.1, birth_field=30.0)
    today = evolve(draws, load_channel("phonon"), tools.scenario("slow-candle"), Priors())
    tau_c = today.period / (2.0 * today.period_derivative) / 3.15576e7
    assert np.any((today.braking_index > 80.0) & (tau_c > 1e4) & (tau_c < 1e5))


@pytest.mark.slow
def test_an_index_alone_hardly_moves_the_mass(tools):
    """One n narrows the decay rate, ln(n - 3); the mass follows its prior (what the prior shown beside it is for)."""
    from decayinfer.inference.fit import fit_channel
    from decayinfer.inference.settings import FitSettings

    fit = fit_channel(tools.WREN, "phonon", "candle", FitSettings())
    shift = abs(fit.posterior("mass").mean() - fit.prior("mass").mean()) / fit.prior("mass").std()
    assert shift < 0.5
    before, after = (np.log(draws("braking_index") - 3.0).std() for draws in (fit.prior, fit.posterior))
    assert after < 0.5 * before
