"""Timing errors against an explicit least-squares fit."""

import numpy as np
import pytest

from decayinfer.physics.constants import YEAR_S
from decayinfer.physics.timing import CUBIC_FACTOR, baseline, index_error, nuddot_error, span_exponent


def least_squares_error(nu, residual, count, span_s):
    """Standard error of nuddot from phase = a + b t + c t^2/2 + nuddot t^3/6, all four free."""
    x = np.linspace(-0.5, 0.5, count)
    design = np.stack([np.ones(count), x, x**2 / 2, x**3 / 6], axis=1)
    covariance = np.linalg.inv(design.T @ design) * (nu * residual) ** 2
    return np.sqrt(covariance[3, 3]) / span_s**3


@pytest.mark.parametrize(("count", "tolerance"), [(260, 0.03), (20000, 3e-4)])
def test_error_of_nuddot_is_that_of_least_squares(count, tolerance):
    expected = least_squares_error(5.0, 1e-3, count, 20.0 * YEAR_S)
    assert nuddot_error(5.0, 1e-3, count=count, span=20.0) == pytest.approx(expected, rel=tolerance)


def test_worked_pulsar():
    """5 Hz, 1 ms, 260 arrival times in 20 yr: 3.916e-28 Hz/s^2; 0.196 in n at nudot = -1e-13."""
    error = nuddot_error(5.0, 1e-3, count=260, span=20.0)
    assert pytest.approx(317.5, rel=1e-4) == CUBIC_FACTOR
    assert error == pytest.approx(3.916e-28, rel=2e-4)
    assert index_error(5.0, -1e-13, error) == pytest.approx(0.196, rel=2e-3)


def test_baseline_inverts_the_error():
    """An error of one in n with monthly 1 ms arrival times takes 12.5 yr for the same pulsar."""
    cadence = 28 / 365.25
    span = baseline(5.0, -1e-13, index_error=1.0, residual=1e-3, cadence=cadence)
    assert span == pytest.approx(12.5, rel=5e-3)
    error = nuddot_error(5.0, 1e-3, count=span / cadence, span=span)
    assert index_error(5.0, -1e-13, error) == pytest.approx(1.0, rel=1e-12)


def test_exponent_of_white_noise():
    assert span_exponent(0.0) == -3.5
    np.testing.assert_array_equal(
        span_exponent(np.array([2.0, 4.0, 6.0, 8.0, 10.0])), [-2.5, *3 * [np.nan], -0.5]
    )
