import numpy as np
import pytest

from decayinfer.cooling.envelope import (
    ENVELOPES,
    partly_accreted,
    photon_luminosity,
    surface_temperature,
)
from decayinfer.errors import UnknownNameError

T_B = np.array([1e7, 3e7, 1e8, 3e8, 1e9])

# Surface temperatures [K] at g_14 = 1, worked by hand from the published formulas (Gudmundsson, Pethick &
# Epstein 1983; Potekhin, Chabrier & Yakovlev 1997; Potekhin & Yakovlev 2001).
TABLE = {
    "iron-1983": [2.456e5, 4.491e5, 8.702e5, 1.591e6, 3.084e6],
    "iron": [2.369e5, 4.227e5, 8.208e5, 1.518e6, 2.986e6],
    "light": [3.555e5, 6.911e5, 1.432e6, 2.783e6, 5.766e6],
    "iron-2001": [2.618e5, 4.505e5, 8.404e5, 1.515e6, 2.935e6],
}


@pytest.mark.parametrize("envelope", TABLE)
def test_table(envelope):
    assert surface_temperature(T_B, 1.0, envelope=envelope) == pytest.approx(TABLE[envelope], rel=3e-4)


def test_every_envelope_is_in_the_table():
    assert set(TABLE) == set(ENVELOPES)


def test_iron_of_1983_in_its_other_form():
    """T_s = 0.870e6 K g_14^(1/4) T_b8^0.55 (Gudmundsson, Pethick & Epstein 1983, quoted in a public note)."""
    other = 0.870e6 * 2.0**0.25 * (T_B / 1e8) ** 0.55
    assert surface_temperature(T_B, 2.0, envelope="iron-1983") == pytest.approx(other, rel=2e-3)


def test_iron_envelopes_agree_among_authors():
    """Within 12 per cent in T_s over 1e7 to 1e9 K (comparison of the three formulas)."""
    first = surface_temperature(T_B, 1.0, envelope="iron")
    for envelope in ("iron-1983", "iron-2001"):
        assert surface_temperature(T_B, 1.0, envelope=envelope) == pytest.approx(first, rel=0.12)


def test_partly_accreted_lies_between_iron_and_light():
    assert partly_accreted(1e8, 1.0, eta=1e-12) == pytest.approx(9.69e5, rel=1e-3)
    iron, light = (surface_temperature(1e8, 1.0, envelope=e) for e in ("iron", "light"))
    layers = [float(partly_accreted(1e8, 1.0, eta=eta)) for eta in (1e-18, 1e-14, 1e-10, 1e-7)]
    assert all(a < b for a, b in zip([float(iron), *layers], [*layers, float(light)], strict=True))


def test_photon_luminosity_of_a_worked_case():
    """R = 12 km, T_s = 1e6 K: 1.0261e33 erg/s (Stefan-Boltzmann)."""
    assert photon_luminosity(1e6, 12.0) == pytest.approx(1.0261e33, rel=1e-4)


def test_unknown_envelope_is_named():
    with pytest.raises(UnknownNameError, match="envelope"):
        surface_temperature(1e8, 1.0, envelope="gold")
