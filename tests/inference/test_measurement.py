"""The measurement model of n against quadrature, and its random draws against its density."""

import numpy as np
import pytensor
import pytensor.tensor as pt
import pytest
from pytensor.compile.mode import Mode
from scipy import integrate, stats

from decayinfer.inference.measurement import ln_index_likelihood, sample_index, total_error

ALPHA = 1e-3  # tail probability of the statistical tests
ERRORS = [(1.0, 1.0), (0.4, 2.0), (3.0, 0.7)]


def split_normal(observed, index, minus, plus):
    """Two half Gaussians joined at the observed value; the wider one is as much likelier as it is wider."""
    error = plus if index > observed else minus
    return np.exp(-0.5 * ((index - observed) / error) ** 2) * np.sqrt(2.0 / np.pi) / (minus + plus)


def over_scatter(density, scatter):
    """Average over the factor e^(scatter |x|), x standard normal, by adaptive quadrature."""

    def integrand(x):
        return 2.0 * stats.norm.pdf(x) * density(np.exp(scatter * x))

    return sum(integrate.quad(integrand, a, a + 1.0, epsabs=0.0, epsrel=1e-10)[0] for a in range(9))


@pytest.mark.parametrize("scatter", [0.0, 0.2, 0.5, 1.0])
@pytest.mark.parametrize(("minus", "plus"), ERRORS)
def test_measured_index(minus, plus, scatter):
    """The scatter factor integrated out by sixteen nodes, against adaptive quadrature.

    1e-3 in the logarithm out to five quoted errors, 2e-2 out to eight: evidences are good to 0.05 at best.
    """
    for z in (-8.0, -5.0, -2.0, -0.5, 0.0, 0.1, 1.0, 3.0, 5.0, 8.0):
        index = 10.0 + z * (plus if z > 0.0 else minus)
        expected = over_scatter(lambda f, n=index: split_normal(10.0, n, minus * f, plus * f), scatter)
        found = ln_index_likelihood(10.0, index, minus, plus, 0.0, scatter)
        assert found == pytest.approx(np.log(expected), abs=1e-3 if abs(z) <= 5.0 else 2e-2)


@pytest.mark.parametrize("scatter", [0.0, 0.2, 0.5, 1.0])
def test_upper_limit(scatter):
    """The probability that the measured value fell below the limit, on the same terms."""
    for z in (-8.0, -3.0, -1.0, 0.0, 0.5, 2.0, 5.0, 8.0):
        expected = over_scatter(lambda f, z=z: stats.norm.cdf(-z / f), scatter)
        found = ln_index_likelihood(10.0, 10.0 + 1.3 * z, 1.3, 1.3, 1.0, scatter)
        assert found == pytest.approx(np.log(expected), abs=1e-3 if z <= 5.0 else 2e-2)


def test_upper_limit_far_in_the_tail():
    """Without scatter it is ln Phi(z), here down to z = -60, where Phi itself underflows."""
    z = np.linspace(-60.0, 8.0, 137)
    found = ln_index_likelihood(10.0, 10.0 - z, 1.0, 1.0, 1.0, 0.0)
    np.testing.assert_allclose(found, stats.norm.logcdf(z), rtol=3e-6, atol=1e-15)


@pytest.mark.parametrize(("minus", "plus"), ERRORS)
def test_density_of_the_observed_value_is_normalised(minus, plus):
    def density(x):
        return np.exp(ln_index_likelihood(x, 10.0, minus, plus, 0.0, 0.5))

    whole = sum(
        integrate.quad(density, *edges, limit=200)[0] for edges in [(-300, 5), (5, 10), (10, 15), (15, 300)]
    )
    assert whole == pytest.approx(1.0, abs=1e-6)


@pytest.mark.parametrize("limit", [0.0, 1.0])
def test_pytensor_has_the_same_likelihood(limit):
    index = np.linspace(-20.0, 60.0, 81)
    symbol = pt.dvector()
    graph = ln_index_likelihood(10.0, symbol, 0.8, 1.6, limit, 0.5)
    found = pytensor.function([symbol], graph, mode=Mode("py", "merge"))(index)
    np.testing.assert_allclose(found, ln_index_likelihood(10.0, index, 0.8, 1.6, limit, 0.5), rtol=1e-12)


def test_total_error_holds_nineteen_factors_in_twenty():
    assert stats.halfnorm.sf(np.log(total_error(2.0, 4.0, 0.5) / 3.0) / 0.5) == pytest.approx(0.05, abs=1e-3)


def distribution_of_the_observed(index, minus, plus, scatter):
    """Cumulative distribution of the observed value, by trapezoids on a fine grid of the density."""
    grid = np.concatenate([index - np.geomspace(400.0, 1e-3, 8000), index + np.geomspace(1e-3, 400.0, 8000)])
    density = np.exp(ln_index_likelihood(grid, index, minus, plus, 0.0, scatter))
    rising = integrate.cumulative_trapezoid(density, grid, initial=0.0)
    return lambda x: np.interp(x, grid, rising)


@pytest.mark.parametrize("scatter", [0.0, 0.5])
@pytest.mark.parametrize(("minus", "plus"), ERRORS)
def test_draws_follow_the_density(minus, plus, scatter):
    draws = sample_index(np.full(20000, 10.0), minus, plus, scatter, np.random.default_rng(8))
    expected = distribution_of_the_observed(10.0, minus, plus, scatter)
    assert stats.kstest(draws, expected).pvalue > ALPHA


@pytest.mark.parametrize("wrong", [(0.4, 2.0, 0.4), (2.0, 0.4, 0.5), (0.4, 1.8, 0.5)])
def test_draws_of_another_measurement_are_told_apart(wrong):
    """Negative control: less scatter, errors swapped, one error a tenth too small."""
    draws = sample_index(np.full(20000, 10.0), 0.4, 2.0, 0.5, np.random.default_rng(8))
    assert stats.kstest(draws, distribution_of_the_observed(10.0, *wrong)).pvalue < ALPHA
