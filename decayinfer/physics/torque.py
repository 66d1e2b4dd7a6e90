"""Spin-down: characteristic age, dipole field, braking index and the torque of an oblique rotator.

I dOmega/dt = -(mu^2 Omega^3/c^3)(k0 + k1 sin^2 a) and da/dt = -k2 (mu^2 Omega^2/(I c^3)) sin a cos a, with
mu = B R^3 for the equatorial field B. Vacuum: k0 = 0, k1 = k2 = 2/3 (magneto-dipole formula). Plasma-filled:
k0 = k1 = k2 = 1 (Spitkovsky 2006, ApJ 648, L51; Philippov, Tchekhovskoy & Li 2014, MNRAS 441, 1879).
"""

from typing import NamedTuple

import numpy as np

from decayinfer.physics.constants import B_UNIT_G, C_CGS, INERTIA_UNIT_CGS, KM_CM, YEAR_S
from decayinfer.physics.namespace import Value, namespace

__all__ = [
    "ORTHOGONAL_VACUUM",
    "PLASMA",
    "VACUUM",
    "Torque",
    "braking_index",
    "characteristic_age",
    "decay_rate",
    "decay_time",
    "dipole_field",
    "index_from_frequency",
    "obliquity_index",
    "obliquity_invariant",
    "spin_down_constant",
    "spin_down_luminosity",
    "third_derivative",
    "torque_factor",
]


class Torque(NamedTuple):
    """Coefficients k0, k1, k2 of the spin-down and alignment torques."""

    k0: float
    k1: float
    k2: float


VACUUM = Torque(0.0, 2.0 / 3.0, 2.0 / 3.0)  #: magneto-dipole formula
PLASMA = Torque(1.0, 1.0, 1.0)  #: Spitkovsky 2006; Philippov et al. 2014 give k1 of 1 to 1.2 (from memory)
ORTHOGONAL_VACUUM = 2.0 / 3.0  #: k0 + k1 sin^2 a of the standard dipole field


def characteristic_age(period: Value, period_derivative: Value) -> Value:
    """Return tau_c = P/(2 Pdot) [yr] for a period [s] and its derivative [s/s]."""
    return period / (2.0 * period_derivative) / YEAR_S


def spin_down_constant(
    *, radius_km: Value = 10.0, inertia_45: Value = 1.0, torque: Value = ORTHOGONAL_VACUUM
) -> Value:
    """Return C of P Pdot = C B^2.

    Parameters
    ----------
    radius_km : float, array or PyTensor variable
        Stellar radius [km].
    inertia_45 : float, array or PyTensor variable
        Moment of inertia [1e45 g cm^2].
    torque : float, array or PyTensor variable
        k0 + k1 sin^2 a, see `torque_factor`; the default is the orthogonal rotator in vacuum.

    Returns
    -------
    float, array or PyTensor variable
        C = 4 pi^2 R^6 (k0 + k1 sin^2 a)/(c^3 I) [s per (1e12 G)^2], for the equatorial field.
    """
    radius = radius_km * KM_CM
    return 4.0 * np.pi**2 * B_UNIT_G**2 / C_CGS**3 * torque * radius**6 / (inertia_45 * INERTIA_UNIT_CGS)


def dipole_field(
    period: Value, period_derivative: Value, *, radius_km: Value = 10.0, inertia_45: Value = 1.0
) -> Value:
    """Return the equatorial dipole field of an orthogonal rotator in vacuum.

    Parameters
    ----------
    period, period_derivative : float, array or PyTensor variable
        Period [s] and its derivative [s/s].
    radius_km, inertia_45 : float, array or PyTensor variable
        Stellar radius [km] and moment of inertia [1e45 g cm^2].

    Returns
    -------
    float, array or PyTensor variable
        B [1e12 G]; 3.2e19 G (P Pdot)^(1/2) at 10 km and 1e45 g cm^2. The polar field is twice as strong.
    """
    xp = namespace(period, period_derivative, radius_km, inertia_45)
    return xp.sqrt(
        period * period_derivative / spin_down_constant(radius_km=radius_km, inertia_45=inertia_45)
    )


def spin_down_luminosity(period: Value, period_derivative: Value, *, inertia_45: Value = 1.0) -> Value:
    """Return 4 pi^2 I Pdot/P^3 [erg/s] for a moment of inertia in 1e45 g cm^2."""
    return 4.0 * np.pi**2 * INERTIA_UNIT_CGS * inertia_45 * period_derivative / period**3


def decay_rate(braking_index: Value, characteristic_age: Value) -> Value:
    """Return -Bdot/B = (n - 3)/(4 tau_c) [1/yr], were field decay the only cause of the index."""
    return (braking_index - 3.0) / (4.0 * characteristic_age)


def decay_time(braking_index: Value, characteristic_age: Value) -> Value:
    """Return 4 tau_c/(n - 3) [yr], the e-folding time of the field; negative for n < 3, infinite at 3."""
    with np.errstate(divide="ignore"):
        return 4.0 * characteristic_age / (braking_index - np.float64(3.0))


def braking_index(decay_rate: Value, characteristic_age: Value) -> Value:
    """Return n = 3 + 4 tau_c r for a field that decays at the rate r = -Bdot/B [1/yr]."""
    return 3.0 + 4.0 * characteristic_age * decay_rate


def index_from_frequency(nu: Value, nudot: Value, nuddot: Value) -> Value:
    """Return n = nu nuddot/nudot^2 for a spin frequency [Hz] and its derivatives [Hz/s, Hz/s^2]."""
    return nu * nuddot / nudot**2


def third_derivative(braking_index: Value, nu: Value, nudot: Value) -> Value:
    """Return the third frequency derivative n(2n - 1) nudot^3/nu^2 [Hz/s^3] of a constant index."""
    return braking_index * (2.0 * braking_index - 1.0) * nudot**3 / nu**2


def torque_factor(obliquity: Value, torque: Torque = VACUUM) -> Value:
    """Return k0 + k1 sin^2 a for an obliquity a [rad]."""
    return torque.k0 + torque.k1 * namespace(obliquity).sin(obliquity) ** 2


def obliquity_index(obliquity: Value, torque: Torque = VACUUM) -> Value:
    """Return the braking index of a constant dipole that aligns.

    Parameters
    ----------
    obliquity : float, array or PyTensor variable
        Angle a between spin and magnetic axes [rad].
    torque : Torque
        `VACUUM` gives n = 3 + 2 cot^2 a; `PLASMA` stays between 3 and 3.25.

    Returns
    -------
    float, array or PyTensor variable
        n = 3 + 2 k1 k2 sin^2 a cos^2 a/(k0 + k1 sin^2 a)^2, from the two torque equations.
    """
    xp = namespace(obliquity)
    product = xp.sin(obliquity) * xp.cos(obliquity)
    return 3.0 + 2.0 * torque.k1 * torque.k2 * product**2 / torque_factor(obliquity, torque) ** 2


def obliquity_invariant(frequency: Value, obliquity: Value, torque: Torque = VACUUM) -> Value:
    """Return what alignment conserves: Omega cot(a)^(k0/k2) cos(a)^(k1/k2), in the unit of the frequency.

    It is Omega cos a in vacuum and Omega cos^2 a/sin a when all k are equal, for a field constant or not.
    """
    xp = namespace(frequency, obliquity)
    cosine, sine = xp.cos(obliquity), xp.sin(obliquity)
    aligned = cosine ** ((torque.k0 + torque.k1) / torque.k2)
    return frequency * aligned / sine ** (torque.k0 / torque.k2)
