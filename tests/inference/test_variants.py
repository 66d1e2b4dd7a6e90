"""Readings of n and prior settings by reweighting, against fits that are made with them from the start."""

from dataclasses import replace

import numpy as np
import pytest
from scipy import integrate, stats

from decayinfer.inference.fit import fit_channel
from decayinfer.inference.priors import Priors
from decayinfer.inference.settings import FitSettings
from decayinfer.inference.variants import PRIOR_SETTINGS, ln_reading, stretched
from decayinfer.physics.spin_noise import noise_scale

PRIORS = Priors()
MEASURED = (21.0, 1.0, 3.0, 0.0)


@pytest.mark.parametrize("index", [-30.0, 20.0, 21.5, 90.0])
def test_noise_reading_is_the_integral_over_the_scale(tools, index):
    """A Gaussian of quoted error and noise in quadrature, averaged over a lognormal scale; scipy's quadrature."""
    star = tools.WREN
    scale = noise_scale(1.0 / star.period, -star.period_derivative / star.period**2)
    quoted = 3.0 if index > MEASURED[0] else 1.0

    def over_scale(u):
        noise = star.period**3 / star.period_derivative**2 * 10.0 ** (scale.log10 + scale.sd * u)
        norm = 0.5 * (np.hypot(1.0, noise) + np.hypot(3.0, noise)) * np.sqrt(2.0 * np.pi)
        gap = (index - MEASURED[0]) / np.hypot(quoted, noise)
        return stats.norm.pdf(u) * np.exp(-0.5 * gap**2) / norm

    expected = np.log(integrate.quad(over_scale, -8.0, 8.0, limit=200)[0])
    found = ln_reading("with-noise", np.array([index]), MEASURED, star, PRIORS)[0]
    assert found == pytest.approx(expected, abs=5e-3)


def test_quoted_reading_is_the_plain_gaussian(tools):
    found = ln_reading("quoted", np.array([19.0, 24.0]), MEASURED, tools.WREN, PRIORS)
    expected = -0.5 * np.array([2.0, 1.0]) ** 2 - np.log(2.0 * np.sqrt(2.0 * np.pi))
    np.testing.assert_allclose(found, expected, rtol=1e-12)


def test_stretched_priors_change_widths_alone():
    wide = stretched(PRIORS, 1.5)
    assert wide.phonon_time_sd == 1.5 * PRIORS.phonon_time_sd
    assert wide.phonon_time_median == PRIORS.phonon_time_median
    assert wide.scatter_sd == PRIORS.scatter_sd


@pytest.mark.slow
@pytest.mark.parametrize("channel", ["phonon", "impurity+phonon+hall", "glitch", "obliquity-vacuum"])
def test_variants_agree_with_fits_made_that_way(tools, own_scenarios, channel):
    """Quoted errors, tight and wide priors: the same evidence within three combined errors."""
    settings = FitSettings()
    fit = fit_channel(tools.WREN, channel, "candle", settings)
    others = {name: stretched(PRIORS, factor) for name, factor in PRIOR_SETTINGS.items()}
    others["quoted"] = replace(PRIORS, scatter_sd=0.0)
    for name, priors in others.items():
        other = fit_channel(tools.WREN, channel, "candle", replace(settings, priors=priors))
        value, err = fit.variants[name]
        assert np.isfinite(err), name
        assert abs(value - other.ln_evidence) < 3.0 * np.hypot(err, other.ln_evidence_err), name


@pytest.mark.slow
def test_a_constant_dipole_with_noise_is_the_noise_channel(tools, own_scenarios):
    """The same model reached in two ways, quoted errors in both."""
    settings = FitSettings(priors=Priors(scatter_sd=0.0))
    noise = fit_channel(tools.WREN, "spin-noise", "candle", settings)
    constant = fit_channel(tools.WREN, "constant", "candle", settings)
    value, _ = constant.variants["with-noise"]
    assert abs(value - noise.ln_evidence) < 3.0 * noise.ln_evidence_err
