r"""A constant dipole whose magnetic axis aligns with the spin: the past from today's angle, and today from birth.

With mu^2 constant, P dP/dt = K (k0 + k1 sin^2 a) and da/dt = -k2 K sin a cos a / P^2, both explicit in two published
cases (`decayinfer.physics.torque`): the vacuum formula, k0 = 0 and k1 = k2, and the plasma-filled magnetosphere with
k0 = k1 = k2 (Spitkovsky 2006, ApJ 648, L51; Philippov, Tchekhovskoy & Li 2014, MNRAS 441, 1879). The conserved
quantity gives the birth angle, cos a_0 = (P_0/P) cos a in vacuum and cos^2 a_0/sin a_0 = (P_0/P) cos^2 a/sin a in
plasma, and the integral of dt along it the age,

.. math::

    t/\tau_c = \tan^2 a \, \ln(\sin^2 a_0/\sin^2 a), \qquad
    t/\tau_c = (1 + s^2) (s^2/c^4) [1/s^2 - 1/s_0^2 - \ln(s_0^2/s^2)]

with s = sin a, c = cos a. Both tend to 1 - (P_0/P)^2 at right angles. A test integrates the equations.
"""

from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

__all__ = ["Past", "Present", "plasma_past", "plasma_today", "vacuum_past", "vacuum_today"]

type Array = NDArray[np.float64]


class Past(NamedTuple):
    """What today's angle and P_0/P imply.

    Attributes
    ----------
    birth_cosine : array
        cos a_0.
    slope : array
        Derivative of cos a_0 by cos a at fixed P_0/P.
    age_ratio : array
        Age over characteristic age.
    """

    birth_cosine: Array
    slope: Array
    age_ratio: Array


class Present(NamedTuple):
    """What birth implies: P/P_0 and cos^2 a, sin^2 a of today."""

    period_growth: Array
    cosine_squared: Array
    sine_squared: Array


def vacuum_past(cosine: Array, sine_squared: Array, period_ratio: Array) -> Past:
    """Return the past of an aligning star in vacuum.

    Parameters
    ----------
    cosine, sine_squared : array
        cos a and sin^2 a of today; both, because near alignment one does not give the other.
    period_ratio : array
        P_0/P.
    """
    growth = cosine**2 * (1.0 - period_ratio**2) / sine_squared  # sin^2 a_0/sin^2 a - 1
    age = (1.0 - period_ratio**2) * np.log1p(growth) / growth
    return Past(period_ratio * cosine, period_ratio + np.zeros_like(cosine), age)


def plasma_past(cosine: Array, sine_squared: Array, period_ratio: Array) -> Past:
    """Return the past of an aligning star with a plasma-filled magnetosphere.

    Parameters
    ----------
    cosine, sine_squared, period_ratio : array
        As for `vacuum_past`.
    """
    c2 = cosine**2
    h = period_ratio**2 * c2**2 / sine_squared  # (cos^2 a_0/sin a_0)^2
    c2_birth = 2.0 * h / (h + np.sqrt(h**2 + 4.0 * h))
    s2_birth = c2_birth**2 / h
    birth = np.sqrt(c2_birth)
    slope = birth / cosine * (2.0 - c2) / (2.0 - c2_birth) * s2_birth / sine_squared
    lost = (c2 - c2_birth) / s2_birth  # 1 - sin^2 a/sin^2 a_0
    # lost + ln(1 - lost), which cancels near right angles
    small = -(lost**2) * (0.5 + lost * (1.0 / 3.0 + lost * (0.25 + 0.2 * lost)))
    integral = lost * c2 / sine_squared + np.where(lost < 1e-3, small, lost + np.log1p(-lost))
    return Past(birth, slope, (1.0 + sine_squared) * sine_squared / c2**2 * integral)


def vacuum_today(birth_cosine: Array, braking: Array) -> Present:
    """Return spin and angle today in vacuum.

    Parameters
    ----------
    birth_cosine : array
        cos a_0.
    braking : array
        2 K t/P_0^2, where P Pdot = K sin^2 a.
    """
    c2, s2 = birth_cosine**2, 1.0 - birth_cosine**2
    gained = -s2 * np.expm1(-c2 * braking)
    return Present(np.sqrt(1.0 + gained / c2), c2 + gained, s2 * np.exp(-c2 * braking))


def plasma_today(birth_cosine: Array, braking: Array) -> Present:
    """Return spin and angle today with a plasma-filled magnetosphere.

    Parameters
    ----------
    birth_cosine : array
        cos a_0.
    braking : array
        2 K t/P_0^2, where P Pdot = K (1 + sin^2 a).
    """
    c2, s2 = birth_cosine**2, 1.0 - birth_cosine**2
    cotangent = c2 / s2
    # x = cot^2 a solves x - ln(1 + x) = d; the start lies above the root and Newton's steps fall towards it
    d = cotangent - np.log1p(cotangent) + braking * c2**2 / s2
    x = d + np.sqrt(2.0 * d)
    for _ in range(12):
        x = x - (x - np.log1p(x) - d) * (1.0 + x) / x
    growth = x / np.sqrt(1.0 + x) / (cotangent / np.sqrt(1.0 + cotangent))
    return Present(growth, x / (1.0 + x), 1.0 / (1.0 + x))
