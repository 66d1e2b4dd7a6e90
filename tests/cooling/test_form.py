"""The closed form of ln T_b: its shape, its compiled twin and their derivatives."""

import numpy as np
import pytensor
import pytensor.tensor as pt
import pytest
from numpy.polynomial import chebyshev as numpy_chebyshev
from pytensor.compile.mode import Mode

from decayinfer.cooling import form
from decayinfer.cooling.kernel import branch_values, clock, temperature_jet
from decayinfer.cooling.registry import load_scenario, scenario_names

PLAIN = Mode("py", "merge")
OWN = ["candle", "slow-candle", "urca"]
AGES = np.geomspace(1.0, 1e8, 400)
MASSES = np.linspace(*form.MASS_RANGE, 21)


def test_chebyshev_is_numpy_s():
    row = np.array([0.3, -1.2, 0.7, 0.05])
    expected = numpy_chebyshev.chebval((MASSES - 1.5) / 0.5, row)
    np.testing.assert_allclose(form.chebyshev(row, MASSES), expected, rtol=1e-13)


@pytest.mark.parametrize("name", [*OWN, *scenario_names()])
def test_temperature_falls_with_age_and_stays_above_its_floor(tools, name):
    scenario = tools.scenario(name) if name in OWN else load_scenario(name)
    ln_t = scenario.ln_temperature(np.log(AGES), MASSES[:, None])
    assert np.all(np.diff(ln_t, axis=1) < 1e-12)
    assert np.all(ln_t >= scenario.scalars[form.SCALARS.index("ln_floor")])
    assert np.all(np.isfinite(scenario.ln_temperature(-np.inf, MASSES)))  # at birth


@pytest.mark.parametrize("name", OWN)
def test_pytensor_has_the_same_temperature(tools, name):
    scenario = tools.scenario(name)
    ln_age, mass = pt.dvector(), pt.dvector()
    function = pytensor.function([ln_age, mass], scenario.ln_temperature(ln_age, mass), mode=PLAIN)
    x, m = np.log(np.geomspace(10.0, 1e7, 60)), np.linspace(1.0, 2.0, 60)
    np.testing.assert_allclose(function(x, m), scenario.ln_temperature(x, m), rtol=1e-12, atol=1e-13)


@pytest.mark.parametrize("name", OWN)
def test_compiled_twin_has_the_derivatives_of_the_form(tools, name):
    """Value, first and second derivative in ln t, derivative in M and the mixed one, against PyTensor's."""
    scenario = tools.scenario(name)
    ln_age, mass = pt.dscalar(), pt.dscalar()
    value = scenario.ln_temperature(ln_age, mass)
    slope, by_mass = pt.grad(value, ln_age), pt.grad(value, mass)
    every = [value, slope, pt.grad(slope, ln_age), by_mass, pt.grad(by_mass, ln_age)]
    function = pytensor.function([ln_age, mass], every, mode=PLAIN)
    rng = np.random.default_rng(3)
    for x, m in zip(np.log(10.0) * rng.uniform(1.0, 7.0, 60), rng.uniform(1.0, 2.0, 60), strict=True):
        tick, lam = clock(np.exp(x), scenario.scalars[9])
        v, v_x, v_xx, v_m, v_xm = temperature_jet(tick, m, branch_values(scenario.table, m), scenario.scalars)
        # from the clock x = ln(t + t_r) to ln t, by the chain rule
        found = [v, v_x * lam, v_xx * lam**2 + v_x * lam * (1.0 - lam), v_m, v_xm * lam]
        np.testing.assert_allclose(found, function(x, m), rtol=1e-9, atol=1e-11)


def test_compiled_polynomials_have_their_mass_derivatives(tools):
    table = tools.scenario("urca").table
    for mass in (1.0, 1.37, 1.5, 1.94):
        values = branch_values(table, mass)
        for branch in range(2):
            for i, name in enumerate(form.PARAMETERS):
                row, m = table[branch, i], (mass - 1.5) / 0.5
                value = numpy_chebyshev.chebval(m, row)
                slope = numpy_chebyshev.chebval(m, numpy_chebyshev.chebder(row)) / 0.5
                if name in form.POSITIVE:
                    value, slope = np.exp(value), np.exp(value) * slope
                assert values[branch, 0, i] == pytest.approx(value, rel=1e-12, abs=1e-14)
                assert values[branch, 1, i] == pytest.approx(slope, rel=1e-12, abs=1e-14)


def test_direct_urca_opens_above_its_mass(tools):
    """Below the threshold the slow branch rules; well above it the star is much colder."""
    urca = tools.scenario("urca")
    closed = urca.scalars.copy()
    closed[form.SCALARS.index("direct_urca")] = 0.0
    ln_age = np.log(1e4)
    with_it = form.ln_temperature(ln_age, np.array([1.2, 1.9]), urca.table, urca.scalars)
    without = form.ln_temperature(ln_age, np.array([1.2, 1.9]), urca.table, closed)
    assert without[0] - with_it[0] < 0.1
    assert without[1] - with_it[1] > 1.0


def test_the_clock_stands_still_until_the_crust_relaxes():
    assert clock(1e5, 0.0) == (0.0, 1.0)
    early, late = clock(1.0, 100.0), clock(1e6, 100.0)
    assert early[1] == pytest.approx(1.0 / 101.0)
    assert late[1] == pytest.approx(1.0, abs=1e-3)


def test_slopes_of_the_candle(tools):
    """Modified Urca: T ~ t^-1/6 (Yakovlev & Pethick 2004, ARA&A 42, 169); photons cool faster."""
    ln_t = tools.scenario("candle").ln_temperature(np.log([3e3, 3.03e3, 4e6, 4.04e6]), 1.4)
    early, late = np.diff(ln_t)[[0, 2]] / np.log(1.01)
    assert early == pytest.approx(-1.0 / 6.0, rel=0.02)
    assert late < -0.5
