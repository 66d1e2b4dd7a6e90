"""Closed histories against scipy's adaptive solver."""

import numpy as np
import pytest
from scipy.integrate import solve_ivp

from decayinfer.physics.history import exponential_field, hall_field, lumped_field, lumped_rate

TIMES = [(1e6, 1e6), (1e6, 1e4), (3e4, 1e7), (2e5, 3e3)]


@pytest.mark.parametrize(("ohmic", "hall"), TIMES)
def test_lumped_law_solves_its_equation(ohmic, hall):
    """Aguilera, Pons & Miralles 2008, A&A 486, 255 (equation from memory)."""

    def slope(_, field):
        return -field * (1.0 / ohmic + field / 10.0 / hall)

    ages = np.linspace(0.0, 3e5, 13)
    run = solve_ivp(slope, (0.0, ages[-1]), [10.0], "DOP853", ages, rtol=1e-12, atol=1e-14)
    np.testing.assert_allclose(
        lumped_field(ages, 10.0, ohmic_time=ohmic, hall_time=hall), run.y[0], rtol=1e-9
    )


@pytest.mark.parametrize(("ohmic", "hall"), TIMES)
def test_lumped_rate_is_the_logarithmic_slope(ohmic, hall):
    step = 1.0
    low, now, high = (
        lumped_field(1e4 + s, 10.0, ohmic_time=ohmic, hall_time=hall) for s in (-step, 0.0, step)
    )
    rate = lumped_rate(now, 10.0, ohmic_time=ohmic, hall_time=hall)
    assert rate == pytest.approx(-np.log(high / low) / (2 * step), rel=1e-6)


def test_worked_values():
    """1e13 G with both times 1e6 yr at 1e6 yr; and 1e6, 1e4 yr at 1e4 yr."""
    assert lumped_field(1e6, 10.0, ohmic_time=1e6, hall_time=1e6) == pytest.approx(2.2540, rel=5e-5)
    assert lumped_field(1e4, 1.0, ohmic_time=1e6, hall_time=1e4) == pytest.approx(0.49626, rel=2e-5)


def test_limits_of_the_lumped_law():
    ages = np.geomspace(1e2, 1e6, 5)
    pure_hall = lumped_field(ages, 3.0, ohmic_time=1e16, hall_time=1e4)
    pure_ohm = lumped_field(ages, 3.0, ohmic_time=2e5, hall_time=1e16)
    np.testing.assert_allclose(pure_hall, hall_field(ages, 3.0, hall_time=1e4), rtol=1e-9)
    np.testing.assert_allclose(pure_ohm, exponential_field(ages, 3.0, decay_time=2e5), rtol=1e-9)
    late = lumped_field(3e6, 3.0, ohmic_time=1e5, hall_time=1e4)
    assert late == pytest.approx(exponential_field(3e6, 3.0, decay_time=1e5) / (1 + 10.0), rel=1e-9)
