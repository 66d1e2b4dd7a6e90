"""Alignment: past and present in closed form against integration of the torque equations."""

import numpy as np
import pytest
from scipy.integrate import solve_ivp

from decayinfer.physics.obliquity import plasma_past, plasma_today, vacuum_past, vacuum_today
from decayinfer.physics.torque import PLASMA, VACUUM, obliquity_index, obliquity_invariant

CASES = [(VACUUM, vacuum_past, vacuum_today), (PLASMA, plasma_past, plasma_today)]
IDS = ["vacuum", "plasma"]


def integrated(torque, birth_angle, span, *, birth_period=0.1):
    """P and a after a span of P_0^2 over the constant K of P Pdot = K (k0 + k1 sin^2 a)."""

    def slopes(_, state):
        period, angle = state
        sine, cosine = np.sin(angle), np.cos(angle)
        return (torque.k0 + torque.k1 * sine**2) / period, -torque.k2 * sine * cosine / period**2

    run = solve_ivp(
        slopes, (0.0, span * birth_period**2), [birth_period, birth_angle], "DOP853", rtol=1e-12, atol=1e-40
    )
    return run.y[:, -1]


@pytest.mark.parametrize(("torque", "past", "today"), CASES, ids=IDS)
@pytest.mark.parametrize("degrees", [3.0, 30.0, 60.0, 85.0, 89.9])
@pytest.mark.parametrize("span", [0.01, 1.0, 40.0])
def test_past_and_present_are_those_of_the_integrated_star(torque, past, today, degrees, span):
    """The equations of Philippov, Tchekhovskoy & Li 2014, MNRAS 441, 1879, from birth to now."""
    birth_angle = np.radians(degrees)
    period, angle = integrated(torque, birth_angle, span)
    scale = torque.k1  # unit K is P Pdot at sin^2 a = 1 in vacuum
    now = today(np.array([np.cos(birth_angle)]), np.array([2.0 * scale * span]))
    assert 0.1 * now.period_growth[0] == pytest.approx(period, rel=1e-8)
    assert now.cosine_squared[0] == pytest.approx(np.cos(angle) ** 2, rel=1e-6)
    assert now.sine_squared[0] == pytest.approx(np.sin(angle) ** 2, rel=1e-6)

    found = past(np.array([np.cos(angle)]), np.array([np.sin(angle) ** 2]), np.array([0.1 / period]))
    assert found.birth_cosine[0] == pytest.approx(np.cos(birth_angle), rel=1e-6)
    product = torque.k0 + torque.k1 * np.sin(angle) ** 2
    age = found.age_ratio[0] * period**2 / (2.0 * product)  # tau_c = P^2/(2 P Pdot)
    assert age == pytest.approx(span * 0.01, rel=1e-6)


@pytest.mark.parametrize(("torque", "past", "today"), CASES, ids=IDS)
def test_the_invariant_links_birth_and_now(torque, past, today):
    """Omega cos a in vacuum, Omega cos^2 a/sin a in plasma, both derived from the torque equations."""
    cosine, ratio = np.random.default_rng(3).random((2, 200))
    found = past(cosine, 1.0 - cosine**2, ratio)
    birth = obliquity_invariant(1.0 / ratio, np.arccos(found.birth_cosine), torque)
    np.testing.assert_allclose(birth, obliquity_invariant(1.0, np.arccos(cosine), torque), rtol=1e-9)
    assert np.all(found.birth_cosine <= cosine)
    assert np.all((found.age_ratio > 0.0) & (found.age_ratio < 2.0))


@pytest.mark.parametrize(("torque", "past", "today"), CASES, ids=IDS)
def test_slope_is_the_derivative_of_the_birth_cosine(torque, past, today):
    cosine, step = np.linspace(0.02, 0.98, 25), 1e-6
    ratio = np.full_like(cosine, 0.37)
    above, below = (past(c, 1.0 - c**2, ratio).birth_cosine for c in (cosine + step, cosine - step))
    slope = past(cosine, 1.0 - cosine**2, ratio).slope
    np.testing.assert_allclose(slope, (above - below) / (2.0 * step), rtol=1e-6)


@pytest.mark.parametrize(("torque", "past", "today"), CASES, ids=IDS)
def test_at_right_angles_the_age_is_that_of_a_constant_dipole(torque, past, today):
    cosine = np.array([1e-9, 1e-5, 1e-3])
    ratio = np.full_like(cosine, 0.4)
    found = past(cosine, 1.0 - cosine**2, ratio)
    np.testing.assert_allclose(found.age_ratio, 1.0 - 0.4**2, rtol=1e-5)


def test_bounds_of_the_index():
    """Philippov et al. 2014: 3 to 3.25 in plasma, by their torque; textbook: 3 + 2 cot^2 a in vacuum."""
    angles = np.linspace(1e-3, np.pi / 2, 4001)
    assert obliquity_index(angles, PLASMA).max() == pytest.approx(3.25, abs=1e-6)
    np.testing.assert_allclose(obliquity_index(angles, VACUUM), 3.0 + 2.0 / np.tan(angles) ** 2, rtol=1e-9)
