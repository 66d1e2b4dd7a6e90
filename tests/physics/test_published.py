"""Numbers printed in papers, and common practice, each with its source and the tolerance it deserves.

"Published" numbers were read in the paper named; what is "from memory" is marked; "common practice"
has no single source.
"""

import numpy as np
import pytest

from decayinfer.physics.conduction import phonon_time
from decayinfer.physics.hall import switch_time
from decayinfer.physics.history import exponential_field
from decayinfer.physics.structure import moment_of_inertia_45
from decayinfer.physics.timing import index_error, nuddot_error, span_exponent
from decayinfer.physics.torque import (
    PLASMA,
    VACUUM,
    braking_index,
    characteristic_age,
    decay_time,
    dipole_field,
    index_from_frequency,
    obliquity_index,
    spin_down_luminosity,
    third_derivative,
    torque_factor,
)


@pytest.mark.parametrize(
    ("period", "derivative", "age", "field", "luminosity"),
    [
        pytest.param(33.39e-3, 4.21e-13, 1257.0, 3.79, 4.46e38, id="Crab"),
        pytest.param(89.33e-3, 1.25e-13, 11.3e3, 3.38, 6.9e36, id="Vela"),
    ],
)
def test_crab_and_vela(period, derivative, age, field, luminosity):
    """Catalogue values (Manchester et al. 2005, AJ 129, 1993), all from memory."""
    assert characteristic_age(period, derivative) == pytest.approx(age, rel=0.01)
    assert dipole_field(period, derivative) == pytest.approx(field, rel=0.01)
    assert spin_down_luminosity(period, derivative) == pytest.approx(luminosity, rel=0.01)


def test_j1411_2551_age_and_field():
    """Published: Martinez et al. 2017 print Pdot = 9.6(7)e-20, tau_c > 9.1 Gyr and B < 2.6e9 G."""
    upper = 9.6e-20 + 2 * 0.7e-20
    assert characteristic_age(62.4e-3, upper) == pytest.approx(9.1e9, rel=0.03)
    assert dipole_field(62.4e-3, upper) == pytest.approx(2.6e-3, rel=0.03)


def test_j1907_0918_derivative_and_field_from_its_age():
    """Published: astro-ph/0005389 prints P = 226 ms, age 38 kyr, Pdot = 9.4e-14 and B = 4.7e12 G."""
    assert characteristic_age(0.226, 9.4e-14) == pytest.approx(38e3, rel=0.03)
    assert dipole_field(0.226, 9.4e-14) == pytest.approx(4.7, rel=0.03)


def test_b1509_58_third_derivative():
    """Published: Livingstone et al. 2005, n = 2.839(3), nu''' = -1.28(21)e-31, 1.65 sigma off.

    The frequency and its derivative are from memory.
    """
    predicted = third_derivative(2.839, 6.6336, -6.77e-11)
    assert (predicted - -1.28e-31) / 0.21e-31 == pytest.approx(1.65, abs=0.05)


def test_j1640_4631_decay_time():
    """Published: Archibald et al. 2016, P = 206 ms and n = 3.15(3); Pdot = 9.7e-13 from memory."""
    age = characteristic_age(0.206, 9.7e-13)
    assert age == pytest.approx(3.36e3, rel=0.01)
    assert decay_time(3.15, age) == pytest.approx(9.0e4, rel=0.01)
    assert braking_index(1.0 / decay_time(3.15, age), age) == pytest.approx(3.15, rel=1e-12)


def test_j1846_0258_change_of_index():
    """Published: n went from 2.65(1) to 2.19(3), by 14.5 sigma.

    The frequencies and the citation, Archibald et al. 2015, are from memory.
    """
    nu, nudot = 3.0621, -6.664e-11
    unit = nudot**2 / nu
    change = index_from_frequency(nu, nudot, 2.19 * unit) - index_from_frequency(nu, nudot, 2.65 * unit)
    error = np.hypot(index_error(nu, nudot, 0.01 * unit), index_error(nu, nudot, 0.03 * unit))
    assert change == pytest.approx(-0.46, rel=1e-9)
    assert -change / error == pytest.approx(14.5, abs=0.05)


@pytest.mark.parametrize(("field", "age"), [(1.0, 1e4), (10.0, 10.0)])
def test_hall_overtakes_ohm(field, age):
    """Published: Cumming, Arras & Zweibel 2004 (astro-ph/0402392, abstract)."""
    assert switch_time(field) == pytest.approx(age, rel=1e-12)


@pytest.mark.parametrize(("radius", "inertia"), [(10.0, 1.0516), (12.0, 1.4104)])
def test_moment_of_inertia(radius, inertia):
    """Published formula: Bejger & Haensel 2002, A&A 396, 917, worked for 1.4 M_sun."""
    assert moment_of_inertia_45(1.4, radius) == pytest.approx(inertia, rel=1e-4)


def test_orthogonal_rotator_spins_down_twice_as_fast_as_aligned():
    """Published: Spitkovsky 2006, ApJ 648, L51, luminosity proportional to 1 + sin^2 a."""
    assert torque_factor(np.pi / 2, PLASMA) / torque_factor(0.0, PLASMA) == pytest.approx(2.0, rel=1e-12)


def test_plasma_index_stays_below_three_and_a_quarter():
    """Published: Philippov, Tchekhovskoy & Li 2014, MNRAS 441, 1879; the bound follows from their torque."""
    angles = np.linspace(0.01, np.pi / 2 - 0.01, 2001)
    index = obliquity_index(angles, PLASMA)
    assert np.all((index > 3.0) & (index <= 3.25))
    assert np.sin(angles[np.argmax(index)]) ** 2 == pytest.approx(1.0 / 3.0, abs=1e-3)


def test_vacuum_index_is_that_of_the_magneto_dipole_formula():
    """Textbook: n = 3 + 2 cot^2 a; 5 at 45 degrees, 3.6667 at 60."""
    np.testing.assert_allclose(
        obliquity_index(np.radians([45.0, 60.0]), VACUUM), [5.0, 11.0 / 3.0], rtol=1e-12
    )


def test_dipole_field_prefactor():
    """Textbook: B = 3.2e19 G (P Pdot)^(1/2); the exact prefactor is 3.19961e19."""
    assert dipole_field(1.0, 1.0) * 1e12 == pytest.approx(3.19961e19, rel=1e-5)


def test_half_life_of_a_field_with_e_fold_of_4e5_yr():
    """Common practice: the field of an ordinary pulsar e-folds in 4e5 yr, hence halves in 2.77e5 yr."""
    assert exponential_field(2.77e5, 1.0, decay_time=4e5) == pytest.approx(0.5, abs=5e-4)


def test_error_of_nuddot_falls_with_the_span():
    """Published: Liu, Bassa & Stappers 2018, MNRAS 478, 2359, T^(-7/2) at a fixed cadence."""
    once, twice = (nuddot_error(5.0, 1e-3, count=years * 13, span=years) for years in (10.0, 20.0))
    assert once / twice == pytest.approx(2.0**3.5, rel=1e-12)


def test_red_noise_slows_the_gain():
    """Published: Liu, Keith, Bassa & Stappers 2019, arXiv:1907.03183."""
    assert 2.0 ** -span_exponent(3.0) == pytest.approx(4.0, rel=1e-12)
    assert span_exponent(9.0) == -0.5
    assert np.isnan(span_exponent(5.0))


def test_phonon_time_goes_as_inverse_square_of_temperature():
    """Common practice, and Cumming, Arras & Zweibel 2004: tau ~ T^-2."""
    assert phonon_time(0.3, 2.0) / phonon_time(0.3, 1.0) == pytest.approx(0.25, rel=1e-12)


@pytest.mark.parametrize(("age", "time", "index"), [(1e5, 4e5, 4.0), (1e5, 1e4, 43.0), (1e6, 4e5, 13.0)])
def test_large_index_means_fast_decay(age, time, index):
    """Derived from n = 3 - 4 tau_c Bdot/B: indices of several tens need decay within 1e4-1e5 yr."""
    assert braking_index(1.0 / time, age) == pytest.approx(index, rel=1e-12)
