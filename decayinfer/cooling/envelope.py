"""Heat-blanketing envelopes: surface temperature from the temperature below, without a magnetic field.

T_b is the local temperature at 1e10 g cm^-3, T_s the local effective temperature, g the surface gravity.
"""

from collections.abc import Callable, Mapping
from types import MappingProxyType

import numpy as np
from numpy.typing import ArrayLike, NDArray

from decayinfer.cooling.constants import STEFAN_BOLTZMANN
from decayinfer.errors import UnknownNameError

__all__ = ["ENVELOPES", "partly_accreted", "photon_luminosity", "surface_temperature"]

type Array = NDArray[np.float64]


def _gudmundsson(t9: Array, g14: Array) -> Array:
    """Iron: T_b8 = 1.288 (T_s6^4/g_14)^0.455; Gudmundsson, Pethick & Epstein 1983, ApJ 272, 286."""
    return 1e6 * (g14 * (10 * t9 / 1.288) ** (1 / 0.455)) ** 0.25


def _iron(t9: Array, g14: Array) -> Array:
    """Iron; Potekhin, Chabrier & Yakovlev 1997, A&A 323, 415 (coefficients from memory)."""
    zeta = t9 - 1e-3 * g14**0.25 * np.sqrt(7 * t9)
    return 1e6 * (g14 * ((7 * zeta) ** 2.25 + (zeta / 3) ** 1.25)) ** 0.25


def _accreted(t9: Array, g14: Array) -> Array:
    """Fully accreted, light elements; Potekhin, Chabrier & Yakovlev 1997 (coefficients from memory)."""
    return 1e6 * (g14 * (18.1 * t9) ** 2.42) ** 0.25


def _potekhin_yakovlev(t9: Array, g14: Array) -> Array:
    """Iron, zero-field part of Potekhin & Yakovlev 2001, A&A 374, 213 (coefficients from memory)."""
    return 1e6 * g14**0.25 * (15.7 * t9**1.5 + 1.36 * t9) ** 0.3796


#: Envelopes, by name.
ENVELOPES: Mapping[str, Callable[[Array, Array], Array]] = MappingProxyType(
    {"iron": _iron, "iron-1983": _gudmundsson, "iron-2001": _potekhin_yakovlev, "light": _accreted}
)


def surface_temperature(t_b: ArrayLike, gravity_14: ArrayLike, *, envelope: str) -> Array:
    """Effective temperature of the surface.

    Parameters
    ----------
    t_b : array_like [K]
        Temperature at the base of the envelope, 1e6 K and above.
    gravity_14 : array_like [1e14 cm s^-2]
        Surface gravity.
    envelope : str
        One of `ENVELOPES`.

    Returns
    -------
    array [K]

    Raises
    ------
    UnknownNameError
        If there is no such envelope.
    """
    if envelope not in ENVELOPES:
        raise UnknownNameError("envelope", envelope, ENVELOPES)
    return ENVELOPES[envelope](np.asarray(t_b, dtype=float) / 1e9, np.asarray(gravity_14, dtype=float))


def partly_accreted(t_b: ArrayLike, gravity_14: ArrayLike, *, eta: float) -> Array:
    """Surface temperature [K] with a light-element layer, eta = g_14^2 Delta M/M.

    T_s6^4 = (a T_Fe^4 + T_acc^4)/(a + 1), a = [1.2 + (5.3e-6/eta)^0.38] T_b9^(5/3);
    Potekhin, Chabrier & Yakovlev 1997 (coefficients from memory).
    """
    t9, g14 = np.asarray(t_b, dtype=float) / 1e9, np.asarray(gravity_14, dtype=float)
    a = (1.2 + (5.3e-6 / eta) ** 0.38) * t9 ** (5 / 3)
    return np.asarray(((a * _iron(t9, g14) ** 4 + _accreted(t9, g14) ** 4) / (a + 1)) ** 0.25)


def photon_luminosity(t_s: ArrayLike, radius_km: ArrayLike) -> Array:
    """4 pi R^2 sigma T_s^4 [erg/s], local, for T_s in K and R in km."""
    return np.asarray(4e10 * np.pi * np.asarray(radius_km) ** 2 * STEFAN_BOLTZMANN * np.asarray(t_s) ** 4)
