"""The scale of spin noise reproduces the regression that it is taken from."""

import numpy as np
import pytest

from decayinfer.physics.spin_noise import noise_scale
from decayinfer.physics.torque import index_from_frequency


def test_noise_of_that_scale_has_mean_and_scatter_of_the_regression():
    """Our own regression on the catalogue of Manchester et al. 2005, AJ 129, 1993: -26.35 and 0.83 dex at its zero."""
    rng = np.random.default_rng(8)
    scale = noise_scale(1.0, -1e-15)
    drawn = scale.log10 + scale.sd * rng.standard_normal(400_000)
    log10 = drawn + np.log10(np.abs(rng.standard_normal(400_000)))
    assert log10.mean() == pytest.approx(-26.35, abs=0.01)
    assert log10.std() == pytest.approx(np.hypot(0.83, 0.11), abs=0.01)


def test_slopes_of_the_regression():
    low, high, fast = noise_scale(1.0, -1e-15), noise_scale(1.0, -1e-13), noise_scale(10.0, -1e-15)
    assert high.log10 - low.log10 == pytest.approx(2 * 0.97, rel=1e-12)
    assert fast.log10 - low.log10 == pytest.approx(0.38, rel=1e-12)
    assert high.sd > low.sd  # an extrapolation is less certain


def test_young_pulsar_with_an_index_of_tens_from_noise_alone():
    """The same regression carried to 5 Hz and -1e-12 Hz/s predicts |n| of 30."""
    scale = noise_scale(5.0, -1e-12)
    median = scale.log10 + -0.2758  # of log10 |z|, whose mean that is
    assert index_from_frequency(5.0, -1e-12, 10.0**median) == pytest.approx(30.0, rel=0.35)
