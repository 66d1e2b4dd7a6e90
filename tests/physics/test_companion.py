"""Acceleration and jerk of a wide companion against an integrated two-body problem and worked numbers."""

import numpy as np
import pytest
from scipy.integrate import solve_ivp
from scipy.optimize import brentq

from decayinfer.physics.companion import Orbit, contaminated_index, pull, pull_scale, turning
from decayinfer.physics.constants import C_CGS, G_CGS, M_SUN_G, YEAR_S


def two_bodies(mass, companion, period, orbit, times):
    """Velocity of the pulsar along the line of sight [cm/s], by integration of both bodies from periastron."""
    e, argument, sine = orbit.eccentricity, orbit.argument, orbit.sine_inclination
    total = G_CGS * M_SUN_G * (mass + companion)
    axis = np.cbrt(total * (period * YEAR_S / (2.0 * np.pi)) ** 2)
    share = np.array([companion, -mass]) / (mass + companion)  # pulsar, companion about their centre
    place = axis * (1.0 - e) * np.array([1.0, 0.0])
    speed = np.sqrt(total / axis * (1.0 + e) / (1.0 - e)) * np.array([0.0, 1.0])
    start = np.concatenate([share[0] * place, share[1] * place, share[0] * speed, share[1] * speed])

    def slopes(_, state):
        pulsar, other, *velocities = state.reshape(4, 2)
        apart = other - pulsar
        force = G_CGS * M_SUN_G * apart / np.linalg.norm(apart) ** 3
        return np.concatenate([*velocities, companion * force, -mass * force])

    run = solve_ivp(slopes, (0.0, times[-1]), start, "DOP853", times, rtol=1e-12, atol=1e-6)
    vx, vy = run.y[4], run.y[5]
    return sine * (vx * np.sin(argument) + vy * np.cos(argument))


@pytest.mark.parametrize("eccentricity", [0.0, 0.3, 0.8])
@pytest.mark.parametrize("argument", [0.4, 4.0])
@pytest.mark.parametrize("phase", [0.05, 0.3, 0.77])
def test_pull_is_that_of_two_integrated_bodies(eccentricity, argument, phase):
    """Five velocities around a moment give acceleration and jerk by central differences."""
    period = 300.0
    moment = phase * period * YEAR_S
    mean = 2.0 * np.pi * phase
    anomaly = brentq(lambda x: x - eccentricity * np.sin(x) - mean, 0.0, 2.0 * np.pi)
    orbit = Orbit(eccentricity, anomaly, argument, 0.7)
    step = 2e-4 * period * YEAR_S
    v = two_bodies(1.4, 0.8, period, orbit, moment + step * np.arange(-2, 3))
    acceleration = (v[0] - 8 * v[1] + 8 * v[3] - v[4]) / (12 * step)
    jerk = (-v[0] + 16 * v[1] - 30 * v[2] + 16 * v[3] - v[4]) / (12 * step**2)
    scale, shape = pull_scale(1.4, 0.8, period), pull(orbit)
    assert scale.acceleration * shape.acceleration * C_CGS == pytest.approx(acceleration, rel=1e-5)
    assert scale.jerk * shape.jerk * C_CGS == pytest.approx(jerk, rel=2e-4, abs=1e-6 * scale.jerk * C_CGS)


@pytest.mark.parametrize(
    ("period", "first", "second"), [(100.0, 1.189e-13, 2.367e-22), (1000.0, 5.518e-15, 1.099e-24)]
)
def test_worked_orbit(period, first, second):
    """Circular and edge-on, 1.4 and 1.0 M_sun, 5 Hz: nu a_p omega^2/c and nu a_p omega^3/c, by Kepler's third law."""
    scale = pull_scale(1.4, 1.0, period)
    assert 5.0 * scale.acceleration == pytest.approx(first, rel=5e-4)
    assert 5.0 * scale.jerk == pytest.approx(second, rel=5e-4)
    quarters = [pull(Orbit(0.0, x, 0.0, 1.0)) for x in (0.0, np.pi / 2)]
    assert abs(quarters[0].jerk) == pytest.approx(1.0, rel=1e-12)
    assert abs(quarters[1].acceleration) == pytest.approx(1.0, rel=1e-12)
    assert abs(quarters[0].acceleration) + abs(quarters[1].jerk) < 1e-12


def test_contaminated_index_from_an_observed_phase():
    """Kinematics: the phase of a dipole pulsar at a distance z(t), differentiated numerically, has this index."""
    nu, nudot, acceleration, jerk = 5.0, -1e-13, 3e-15, -4e-24  # Hz, Hz/s, and over c
    nuddot = 3.0 * nudot**2 / nu
    # reception time t; emission at t - z/c; phase = integral of the spin frequency to emission
    z = np.polynomial.Polynomial([0.0, 0.0, acceleration / 2.0, jerk / 6.0])
    emission = np.polynomial.Polynomial([0.0, 1.0]) - z
    phase = nu * emission + nudot / 2.0 * emission**2 + nuddot / 6.0 * emission**3
    first, second, third = (float(phase.deriv(k)(0.0)) for k in (1, 2, 3))
    observed = first * third / second**2
    ratio = nudot / second  # Pdot/P = -nudot/nu, and the velocity is zero now
    found = contaminated_index(ratio, jerk, timescale=-first / second)
    assert found == pytest.approx(observed, rel=1e-6)
    assert abs(observed - 3.0) > 1.0


def test_turning_is_keplers_second_law():
    e = 0.6
    near, far = (turning(Orbit(e, x, 0.0, 1.0)) for x in (0.0, np.pi))
    assert near / far == pytest.approx(((1 + e) / (1 - e)) ** 2, rel=1e-12)
    anomaly = np.linspace(0.0, 2.0 * np.pi, 20001)
    mean = anomaly - e * np.sin(anomaly)
    swept = np.trapezoid(turning(Orbit(e, anomaly, 0.0, 1.0)), mean)
    assert swept == pytest.approx(2.0 * np.pi, rel=1e-7)  # the true anomaly turns once in a period
