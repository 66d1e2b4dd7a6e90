r"""Acceleration and jerk along the line of sight from a wide companion, and the index they feign.

Kepler motion of the pulsar about the centre of mass, z = a_p sin i (r/a) sin(w + v), gives with u = 1 - e cos E

.. math::

    \ddot z &= -a_p \omega^2 \sin i \, u^{-2} \sin(w + v), \\
    \dddot z &= -a_p \omega^3 \sin i \, u^{-3} (1 - e^2)^{-1/2} [(1 + e\cos v)\cos(w + v) - 2 e \sin v \sin(w + v)]

(differentiated here; a test integrates two bodies). To first order in v/c (kinematics; reception time), with z
growing away from us, nudot_obs = nudot - nu z2/c and nuddot_obs = nuddot - 3 nudot z2/c - nu z3/c, hence for a dipole

.. math::

    \dot P = \dot P_{obs} - P \ddot z/c, \qquad n_{obs} = 3 \dot P/\dot P_{obs} - (P/\dot P_{obs})^2 \dddot z/c .

Joshi & Rasio 1997, ApJ 479, 948 (from memory) use such derivatives to find orbits; Kaplan et al. 2016 (J1024-0719) met
an orbit of thousands of years.
"""

from typing import NamedTuple

import numpy as np

from decayinfer.physics.constants import C_CGS, G_CGS, M_SUN_G, YEAR_S
from decayinfer.physics.namespace import Value

__all__ = ["Orbit", "Pull", "contaminated_index", "pull", "pull_scale", "turning"]


class Orbit(NamedTuple):
    """Shape and place: eccentricity, eccentric anomaly, argument of periastron [rad], sin of inclination."""

    eccentricity: Value
    eccentric_anomaly: Value
    argument: Value
    sine_inclination: Value


class Pull(NamedTuple):
    """Acceleration and jerk along the line of sight over c [1/s, 1/s^2], positive away from us."""

    acceleration: Value
    jerk: Value


def pull_scale(mass: Value, companion_mass: Value, orbital_period: Value) -> Pull:
    """Return a_p omega^2/c and a_p omega^3/c for masses [M_sun] and a period [yr]."""
    total = mass + companion_mass
    omega = 2.0 * np.pi / (orbital_period * YEAR_S)
    radius = np.cbrt(G_CGS * M_SUN_G * total / omega**2) * companion_mass / total
    return Pull(radius * omega**2 / C_CGS, radius * omega**3 / C_CGS)


def pull(orbit: Orbit) -> Pull:
    """Return acceleration and jerk in units of `pull_scale`, both along the line of sight."""
    e = orbit.eccentricity
    ratio = 1.0 / (1.0 - e * np.cos(orbit.eccentric_anomaly))  # a/r
    root = np.sqrt(1.0 - e**2)
    cosine = (np.cos(orbit.eccentric_anomaly) - e) * ratio
    sine = root * np.sin(orbit.eccentric_anomaly) * ratio
    up = np.sin(orbit.argument) * cosine + np.cos(orbit.argument) * sine  # sin(w + v)
    along = np.cos(orbit.argument) * cosine - np.sin(orbit.argument) * sine  # cos(w + v)
    swing = (1.0 + e * cosine) * along - 2.0 * e * sine * up
    si = orbit.sine_inclination
    return Pull(-si * ratio**2 * up, -si * ratio**3 / root * swing)


def turning(orbit: Orbit) -> Value:
    """Return the present angular velocity over its mean, (a/r)^2 (1 - e^2)^(1/2), by Kepler's second law."""
    e = orbit.eccentricity
    return np.sqrt(1.0 - e**2) / (1.0 - e * np.cos(orbit.eccentric_anomaly)) ** 2


def contaminated_index(derivative_ratio: Value, jerk: Value, *, timescale: Value) -> Value:
    """Return n_obs of a dipole seen through a jerk.

    Parameters
    ----------
    derivative_ratio : float or array
        Intrinsic over observed Pdot.
    jerk : float or array
        Jerk along the line of sight over c [1/s^2].
    timescale : float or array
        P/Pdot as observed [s].
    """
    return 3.0 * derivative_ratio - timescale**2 * jerk
