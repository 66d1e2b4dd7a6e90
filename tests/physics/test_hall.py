"""The Hall time and the switch to the attractor."""

import numpy as np
import pytest

from decayinfer.physics.hall import attractor_switch, hall_time, switch_time


def test_switch_is_half_at_the_attractor_age():
    """Our own smooth form of the saturation of Gourgouliatos & Cumming 2014, PRL 112, 171101."""
    switch = attractor_switch(np.array([0.0, 1e3, 1e4, 1e5, 1e6]), 1e4)
    np.testing.assert_allclose(switch, [1.0, 1 / (1 + 1e-4), 0.5, 1 / (1 + 1e4), 1 / (1 + 1e8)], rtol=1e-14)


def test_strong_fields_drift_fast():
    assert hall_time(0.3, 10.0) / hall_time(0.3, 1000.0) == pytest.approx(100.0, rel=1e-13)
    assert switch_time(2.0) / switch_time(4.0) == pytest.approx(8.0, rel=1e-13)
