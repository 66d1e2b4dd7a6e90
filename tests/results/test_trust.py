"""Information gained and the predictive check, against closed forms and simulation."""

import numpy as np
import pytest

from decayinfer.inference.measurement import sample_index
from decayinfer.results.trust import information, predictive_tail


@pytest.fixture
def rng():
    return np.random.default_rng(8)


@pytest.mark.parametrize(("mean", "sd"), [(0.0, 1.0), (1.0, 1.0), (0.0, 0.3), (2.0, 0.1)])
def test_information_between_gaussians(rng, mean, sd):
    """KL(N(m, s) || N(0, 1)) = ln(1/s) + (s^2 + m^2 - 1)/2 nats; one estimate from 2000 draws scatters by 0.06 bit."""
    bits = (np.log(1.0 / sd) + 0.5 * (sd**2 + mean**2 - 1.0)) / np.log(2.0)
    found = [information(mean + sd * rng.standard_normal(2000), rng.standard_normal(2000)) for _ in range(40)]
    assert np.mean(found) == pytest.approx(bits, rel=0.06, abs=0.03)
    assert np.std(found) < max(0.08, 0.05 * bits)


def test_information_does_not_care_for_units(rng):
    posterior, prior = 0.5 * rng.standard_normal(2000), rng.standard_normal(2000)
    assert information(np.exp(posterior), np.exp(prior)) == pytest.approx(information(posterior, prior))


def test_information_of_nothing_is_unknown():
    assert np.isnan(information(np.empty(0), np.ones(500)))
    assert np.isnan(information(np.ones(500), np.ones(500)))


@pytest.mark.parametrize("errors", [(2.0, 2.0), (1.0, 4.0)])
@pytest.mark.parametrize("observed", [12.0, 20.0, 27.0])
def test_predictive_tail_is_that_of_repeated_measurements(rng, errors, observed):
    indices = 20.0 + 3.0 * rng.standard_normal(2000)
    again = np.concatenate([sample_index(indices, *errors, 0.5, rng) for _ in range(100)])
    above = np.mean(again > observed)
    expected = 2.0 * min(above, 1.0 - above)
    assert predictive_tail(indices, observed, *errors, 0.5) == pytest.approx(expected, abs=0.01)


def test_predictive_tail_of_a_limit_is_unknown():
    assert np.isnan(predictive_tail(np.ones(100), np.nan, 1.0, 1.0, 0.5))
