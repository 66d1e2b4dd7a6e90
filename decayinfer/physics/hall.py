"""Hall drift in the crust: its time, and when it stops.

Coefficient and scaling of the Hall time over a pressure scale height follow the derivation of Cumming, Arras
& Zweibel 2004, ApJ 609, 999; the prefactor is our own re-derivation, as the printed one was not at hand.
"""

import numpy as np

from decayinfer.physics.conduction import ELECTRON_FRACTION, GRAVITY_14
from decayinfer.physics.constants import B_UNIT_G, C_CGS, ELEMENTARY_CHARGE_ESU, KM_CM, YEAR_S
from decayinfer.physics.namespace import Value

__all__ = [
    "HALL_DENSITY_EXPONENT",
    "HALL_TIME_14",
    "attractor_switch",
    "drift_time",
    "hall_time",
    "switch_time",
]

HALL_TIME_14 = 5.1e6  #: [yr] at 1e14 g/cm^3, 1e12 G (re-derived with 4 pi n_e e H^2/(c B))
HALL_DENSITY_EXPONENT = 7.0 / 3.0  #: of the Hall time: H^2 ~ rho^(4/3) times n_e ~ rho


def drift_time(electron_density: Value, length_km: Value, field_12: Value) -> Value:
    """Return 4 pi n_e e L^2/(c B) [yr] for an electron density [cm^-3], length [km] and field [1e12 G]."""
    current = 4.0 * np.pi * ELEMENTARY_CHARGE_ESU / C_CGS * electron_density
    return current * (length_km * KM_CM) ** 2 / (field_12 * B_UNIT_G) / YEAR_S


def hall_time(
    density_14: Value,
    field_12: Value,
    *,
    gravity_14: Value = GRAVITY_14,
    electron_fraction: Value = ELECTRON_FRACTION,
) -> Value:
    """Return the Hall time [yr] over a pressure scale height.

    Parameters
    ----------
    density_14 : float, array or PyTensor variable
        Mass density [1e14 g cm^-3].
    field_12 : float, array or PyTensor variable
        Field [1e12 G].
    gravity_14 : float, array or PyTensor variable
        Surface gravity [1e14 cm s^-2].
    electron_fraction : float, array or PyTensor variable
        Electrons per baryon.
    """
    depth = density_14**HALL_DENSITY_EXPONENT * (gravity_14 / GRAVITY_14) ** -2.0
    return HALL_TIME_14 * depth * (electron_fraction / ELECTRON_FRACTION) / field_12


def attractor_switch(age: Value, attractor_age: Value) -> Value:
    """Return S = 1/(1 + (t/t_a)^4), the share of Hall drift left at an age t.

    Hall drift saturates when the field reaches a state of isorotation (Gourgouliatos & Cumming 2014, PRL 112,
    171101). The smooth form is our own; ages in any common unit.
    """
    return 1.0 / (1.0 + (age / attractor_age) ** 4.0)


def switch_time(field_12: Value) -> Value:
    """Return the age [yr] at which Hall drift overtakes Ohmic decay in a pure crust, 1e4 yr B_12^-3.

    Cumming, Arras & Zweibel 2004, ApJ 609, 999, abstract.
    """
    return 1e4 * field_12**-3.0
