"""Lattice temperatures and Umklapp freezing."""

import numpy as np
import pytest
from astropy import constants

from decayinfer.physics import lattice


def test_plasma_temperature():
    """Definition: 7.832e3 K rho^(1/2) Y_e; 3.92e9 K at 1e14 g/cm^3 and 0.05."""
    assert lattice.plasma_temperature(1e-14, 1.0) == pytest.approx(7.832e3, rel=1e-4)
    assert lattice.plasma_temperature(1.0, 0.05) == pytest.approx(3.92e9, rel=2e-3)
    assert lattice.debye_temperature(0.4, 0.1) == pytest.approx(
        0.45 * lattice.plasma_temperature(0.4, 0.1), rel=1e-14
    )


def test_umklapp_temperature_from_constants():
    """T_p Z^(1/3) e^2/(hbar c) is 8.88e7 K, 2 % above Cumming, Arras & Zweibel 2004."""
    derived = lattice.plasma_temperature(1.0) * 30.0 ** (1 / 3) * constants.alpha.value
    assert derived == pytest.approx(8.88e7, rel=1e-3)
    assert lattice.umklapp_temperature(1.0) == pytest.approx(derived, rel=0.022)
    assert derived / 3.0 == pytest.approx(lattice.UMKLAPP_TEMPERATURE_14_LOW, rel=0.015)


def test_freeze_out_laws():
    ratio = np.array([0.1, 0.5, 1.0, 2.0, 10.0])
    none, exponential, cut = (
        lattice.freeze_out(ratio, 1.0, strength=law.strength, power=law.power)
        for law in (lattice.FREEZE_OUT[name] for name in ("none", "exponential", "cut"))
    )
    np.testing.assert_array_equal(none, 1.0)
    np.testing.assert_allclose(exponential, np.exp(-1.0 / ratio), rtol=1e-14)
    assert np.all(cut[:2] < 1e-27)
    assert cut[3] == pytest.approx(1.0, abs=0.016)
    assert np.all(np.diff(cut) > 0)


@pytest.mark.parametrize("scale", [1.0, 1e8])
def test_freeze_out_depends_on_the_ratio_alone(scale):
    assert lattice.freeze_out(2.0 * scale, 0.5 * scale) == pytest.approx(np.exp(-0.25), rel=1e-14)
