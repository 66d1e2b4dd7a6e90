"""Coefficients of the crust re-derived from fundamental constants, and scalings by logarithmic derivative.

Collision rates: phonons after Baiko & Yakovlev 1995, Astron. Lett. 21, 702 (moments and fit constant from
memory); impurities in the form of Cumming, Arras & Zweibel 2004, ApJ 609, 999 (CAZ04) with a Coulomb
logarithm of one. The pressure is a share f = 0.5 of that of free neutrons with Y_n = 0.8.
"""

from itertools import product

import numpy as np
import pytest
from astropy import constants

from decayinfer.physics import conduction, hall, lattice

C, HBAR, K_B, M_U = (getattr(constants, name).cgs.value for name in ("c", "hbar", "k_B", "u"))
E, M_N, ALPHA = constants.e.esu.value, constants.m_n.cgs.value, constants.alpha.value
YEAR = 3.15576e7
RHO, Y_E, Z, GRAVITY = 1e14, 0.05, 30.0, 2.45e14

N_E = Y_E * RHO / M_U
P_F = HBAR * (3 * np.pi**2 * N_E) ** (1 / 3)
M_STAR = P_F / C  # relativistic electrons, v_F = c
N_ION, M_ION = N_E / Z, Z / Y_E * M_U
T_P = HBAR / K_B * np.sqrt(4 * np.pi * E**2 * Z**2 * N_ION / M_ION)


def drude(rate):
    return N_E * E**2 / (M_STAR * rate)


def phonon_conductivity(temperature=1e8, *, quantum_limit=True):
    """Electron-phonon conductivity; u_-2 = 12.972 and a_0 = 0.0174 from memory."""
    t = temperature / T_P
    share = t / np.sqrt(0.0174) if quantum_limit else t / np.sqrt(t**2 + 0.0174)
    return drude(ALPHA * K_B * temperature / HBAR * 12.972 * share)


def impurity_conductivity():
    return drude(4 * np.pi * E**4 * N_ION / (P_F**2 * C))


def scale_height():
    neutrons = 0.8 * RHO / M_N
    pressure = 0.5 * (3 * np.pi**2) ** (2 / 3) * HBAR**2 * neutrons ** (5 / 3) / (5 * M_N)
    return pressure / (RHO * GRAVITY)


def ohmic_years(conductivity):
    return 4 * np.pi * conductivity * scale_height() ** 2 / C**2 / YEAR


def test_phonon_conductivity_from_constants():
    assert phonon_conductivity() == pytest.approx(1.84e25, rel=5e-3)
    assert conduction.conductivity_phonon(1.0, 1.0) == pytest.approx(phonon_conductivity(), rel=0.025)


def test_quantum_limit_holds_at_1e8_kelvin_and_fails_when_hot():
    assert phonon_conductivity() == pytest.approx(phonon_conductivity(quantum_limit=False), rel=0.03)
    assert phonon_conductivity(1e9) < 0.6 * phonon_conductivity(1e9, quantum_limit=False)


def test_impurity_conductivity_from_constants():
    assert conduction.conductivity_impurity(1.0, 1.0) == pytest.approx(impurity_conductivity(), rel=6e-3)


def test_scale_height_of_the_crust_base():
    assert scale_height() == pytest.approx(1.63e4, rel=3e-3)


@pytest.mark.parametrize(
    ("code", "derived", "tolerance"),
    [
        pytest.param(conduction.phonon_time(1.0, 1.0), ohmic_years(phonon_conductivity()), 0.04, id="phonon"),
        pytest.param(
            conduction.impurity_time(1.0, 1.0), ohmic_years(impurity_conductivity()), 0.10, id="impurity"
        ),
        pytest.param(
            hall.hall_time(1.0, 1.0),
            4 * np.pi * N_E * E * scale_height() ** 2 / (C * 1e12) / YEAR,
            0.01,
            id="hall",
        ),
    ],
)
def test_times_over_a_scale_height_from_constants(code, derived, tolerance):
    """CAZ04 prefactors; the constants give 10 % less than the impurity one, which is from memory."""
    assert derived == pytest.approx(code, rel=tolerance)


def test_general_times():
    """1e25 /s and 0.5 km: 1.108e7 yr. 3e35 electrons per cm^3, 0.5 km, 1e13 G: 4.785e5 yr."""
    assert conduction.ohmic_time(1e25, 0.5) == pytest.approx(1.108e7, rel=5e-4)
    assert hall.drift_time(3e35, 0.5, 10.0) == pytest.approx(4.785e5, rel=5e-4)


def test_time_and_conductivity_coefficients_belong_together():
    """PHONON_TIME_14 is the Ohmic time of PHONON_CONDUCTIVITY_14 over the scale height, as for impurities."""
    height = scale_height() / 1e5
    phonon = conduction.ohmic_time(conduction.PHONON_CONDUCTIVITY_14, height)
    impurity = conduction.ohmic_time(conduction.IMPURITY_CONDUCTIVITY_14, height)
    assert phonon == pytest.approx(conduction.PHONON_TIME_14, rel=0.07)
    assert impurity == pytest.approx(conduction.IMPURITY_TIME_14, rel=0.10)


def phonon(rho=1.0, t=1.0, g=2.45, y=0.05):
    return conduction.phonon_time(rho, t, gravity_14=g, electron_fraction=y)


def impurity(rho=1.0, q=1.0, g=2.45, y=0.05, z=30.0):
    return conduction.impurity_time(rho, q, gravity_14=g, electron_fraction=y, charge=z)


def hall_drift(rho=1.0, b=1.0, g=2.45, y=0.05):
    return hall.hall_time(rho, b, gravity_14=g, electron_fraction=y)


def sigma_phonon(rho=1.0, t=1.0, y=0.05):
    return conduction.conductivity_phonon(rho, t, electron_fraction=y)


def sigma_impurity(rho=1.0, q=1.0, y=0.05, z=30.0):
    return conduction.conductivity_impurity(rho, q, electron_fraction=y, charge=z)


def plasma(rho=1.0, y=0.05):
    return lattice.plasma_temperature(rho, y)


def umklapp(rho=1.0, y=0.05, z=30.0):
    return lattice.umklapp_temperature(rho, y, z)


EXPONENTS = [
    (phonon, {"rho": 15 / 6, "t": -2, "g": -2, "y": 5 / 3}),
    (impurity, {"rho": 5 / 3, "q": -1, "g": -2, "y": 1 / 3, "z": 1}),
    (hall_drift, {"rho": 7 / 3, "b": -1, "g": -2, "y": 1}),
    (sigma_phonon, {"rho": 7 / 6, "t": -2, "y": 5 / 3}),
    (sigma_impurity, {"rho": 1 / 3, "q": -1, "y": 1 / 3, "z": 1}),
    (plasma, {"rho": 1 / 2, "y": 1}),
    (umklapp, {"rho": 1 / 2, "y": 1, "z": 1 / 3}),
]


@pytest.mark.parametrize(
    ("law", "argument", "exponent"),
    [(law, name, value) for law, table in EXPONENTS for name, value in table.items()],
)
def test_exponents(law, argument, exponent):
    """Scalings of Cumming, Zweibel & Bildsten 2001 and CAZ04, at and away from the reference point."""
    for start, step in product((0.2, 3.0), (1e-4,)):
        low, high = law(**{argument: start * np.exp(-step)}), law(**{argument: start * np.exp(step)})
        assert np.log(high / low) / (2 * step) == pytest.approx(exponent, abs=1e-8)


def test_density_from_phonon_time_inverts_it():
    times = np.geomspace(1e3, 1e8, 11)
    for gravity in (1.2, 2.45):
        density = conduction.density_from_phonon_time(times, gravity)
        np.testing.assert_allclose(
            conduction.phonon_time(density, 1.0, gravity_14=gravity), times, rtol=1e-13
        )


def test_shallow_layers_decay_fast():
    """At a third of the base density and 1e8 K the phonon time is 0.11 Myr (CAZ04 scaling)."""
    assert conduction.phonon_time(0.3, 1.0) == pytest.approx(0.11e6, rel=0.02)


def test_impurity_parameter_of_an_impure_crust():
    """5 % of ions off by 4 charges, the impure crust drawn in Chamel & Haensel 2008, LRR 11, 10, Fig. 54."""
    assert conduction.impurity_parameter([0.95, 0.05], [40, 44]) == pytest.approx(0.76, rel=1e-12)
    assert conduction.impurity_parameter([19, 1], [40, 36]) == pytest.approx(0.76, rel=1e-12)
    stacked = conduction.impurity_parameter([[0.5, 0.5], [1.0, 0.0]], [20, 30])
    np.testing.assert_allclose(stacked, [25.0, 0.0], atol=1e-12)
