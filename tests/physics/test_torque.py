"""Torque, obliquity and braking index against direct integration of the spin equations."""

import numpy as np
import pytest
from scipy.integrate import solve_ivp

from decayinfer.physics.constants import YEAR_S
from decayinfer.physics.torque import (
    ORTHOGONAL_VACUUM,
    PLASMA,
    VACUUM,
    Torque,
    braking_index,
    decay_rate,
    decay_time,
    dipole_field,
    index_from_frequency,
    obliquity_index,
    obliquity_invariant,
    spin_down_constant,
    third_derivative,
    torque_factor,
)


def aligning_star(torque, times, *, obliquity):
    """Integrate the two torque equations with mu^2/(I c^3) = 1 from Omega = 1."""

    def slopes(_, state):
        omega, angle = state
        sine, cosine = np.sin(angle), np.cos(angle)
        return -(omega**3) * (torque.k0 + torque.k1 * sine**2), -torque.k2 * omega**2 * sine * cosine

    run = solve_ivp(slopes, (0.0, times[-1]), [1.0, obliquity], "DOP853", times, rtol=1e-12, atol=1e-14)
    return run.y


@pytest.mark.parametrize(
    ("torque", "time", "degrees", "omega"),
    [
        (PLASMA, 100.0, 12.683, 0.066591),
        (PLASMA, 1e4, 1.4000, 0.0070574),
        (VACUUM, 10.0, 9.414, 0.50683),
    ],
)
def test_alignment_reaches_the_expected_angle(torque, time, degrees, omega):
    """The ODE of Philippov, Tchekhovskoy & Li 2014 from 60 degrees; the invariant carries the frequency."""
    frequency, angle = aligning_star(torque, [time], obliquity=np.pi / 3)[:, -1]
    assert np.degrees(angle) == pytest.approx(degrees, rel=1e-4)
    assert frequency == pytest.approx(omega, rel=2e-5)
    start = obliquity_invariant(1.0, np.pi / 3, torque)
    assert start / obliquity_invariant(1.0, angle, torque) == pytest.approx(omega, rel=1e-4)


@pytest.mark.parametrize("torque", [PLASMA, VACUUM, Torque(1.0, 1.2, 1.0), Torque(0.7, 0.4, 1.3)])
def test_invariant_is_conserved(torque):
    frequency, angle = aligning_star(torque, np.geomspace(0.1, 30.0, 7), obliquity=1.2)
    invariant = obliquity_invariant(frequency, angle, torque)
    np.testing.assert_allclose(invariant, obliquity_invariant(1.0, 1.2, torque), rtol=1e-9)
    assert np.ptp(frequency) > 0.1


@pytest.mark.parametrize("torque", [PLASMA, VACUUM, Torque(1.0, 1.2, 1.0)])
def test_obliquity_index_is_that_of_the_integrated_star(torque):
    step = 1e-3
    (before, now, after), angle = aligning_star(torque, [2.0 - step, 2.0, 2.0 + step], obliquity=1.0)
    first, second = (after - before) / (2 * step), (after - 2 * now + before) / step**2
    assert obliquity_index(angle[1], torque) == pytest.approx(
        index_from_frequency(now, first, second), rel=1e-5
    )


def test_constant_of_the_dipole_equation():
    """P Pdot = C B^2 holds with the field it defines, at any radius and inertia."""
    constant = spin_down_constant(radius_km=12.0, inertia_45=1.4)
    assert constant * dipole_field(0.1, 1e-14, radius_km=12.0, inertia_45=1.4) ** 2 == pytest.approx(
        1e-15, rel=1e-12
    )
    assert constant / spin_down_constant() == pytest.approx(1.2**6 / 1.4, rel=1e-12)


def test_plasma_field_prefactor():
    """2.612e19 (1 + sin^2 a)^(-1/2) (P Pdot)^(1/2) G, from the torque of Spitkovsky 2006."""
    constant = spin_down_constant(torque=torque_factor(np.pi / 2, PLASMA))
    assert 1e12 / np.sqrt(constant) == pytest.approx(2.612e19 / np.sqrt(2.0), rel=5e-4)
    assert torque_factor(np.pi / 2, VACUUM) == pytest.approx(ORTHOGONAL_VACUUM, rel=1e-15)


def test_index_of_a_decaying_dipole():
    """n from P, Pdot, Pddot of P Pdot = C B_0^2 exp(-2 t/tau), solved by hand, against 3 + 4 tau_c/tau."""
    tau, now, birth = 3e5, 2e5, 0.05
    constant = spin_down_constant() * YEAR_S  # s^2 per yr
    product = constant * np.exp(-2 * now / tau)
    period = np.sqrt(birth**2 + constant * tau * -np.expm1(-2 * now / tau))
    first = product / period
    second = (-2 * product / tau - first**2) / period
    assert 2 - period * second / first**2 == pytest.approx(
        braking_index(1 / tau, period / (2 * first)), rel=1e-12
    )


def test_rate_and_time_invert_the_index():
    assert braking_index(decay_rate(17.0, 2e5), 2e5) == pytest.approx(17.0, rel=1e-14)
    assert decay_time(17.0, 2e5) * decay_rate(17.0, 2e5) == pytest.approx(1.0, rel=1e-14)
    assert decay_time(2.5, 1e4) == pytest.approx(-8e4)
    assert decay_time(3.0, 1e4) == np.inf


def test_third_derivative_of_a_power_law():
    """Nu = (1 + t)^(-1/(n-1)) has index n; its third derivative at t = 0 follows by hand."""
    index = 2.839
    power = -1.0 / (index - 1.0)
    expected = power * (power - 1.0) * (power - 2.0)
    assert third_derivative(index, 1.0, power) == pytest.approx(expected, rel=1e-12)
