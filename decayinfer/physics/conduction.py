"""Electrical conductivity of the crust and the Ohmic decay times that follow from it.

Coefficients: Cumming, Zweibel & Bildsten 2001, ApJ 557, 958 and Cumming, Arras & Zweibel 2004, ApJ 609, 999
(CAZ04 below), from memory; a test re-derives each from fundamental constants. Times take the pressure scale
height as length and hold for relativistic electrons in the neutron-drip crust, with the neutrons carrying
the pressure. Phonon values need T_U < T << 0.13 T_p (`decayinfer.physics.lattice`).
"""

import numpy as np

from decayinfer.physics.constants import C_CGS, KM_CM, YEAR_S
from decayinfer.physics.namespace import Value, namespace

__all__ = [
    "CHARGE",
    "ELECTRON_FRACTION",
    "GRAVITY_14",
    "IMPURITY_CONDUCTIVITY_14",
    "IMPURITY_DENSITY_EXPONENT",
    "IMPURITY_TIME_14",
    "PHONON_CONDUCTIVITY_14",
    "PHONON_DENSITY_EXPONENT",
    "PHONON_TIME_14",
    "conductivity_impurity",
    "conductivity_phonon",
    "density_from_phonon_time",
    "impurity_parameter",
    "impurity_time",
    "ohmic_time",
    "phonon_time",
]

ELECTRON_FRACTION = 0.05  #: Y_e at which the coefficients are quoted
CHARGE = 30.0  #: ion charge Z at which the coefficients are quoted
GRAVITY_14 = 2.45  #: surface gravity [1e14 cm/s^2] at which the coefficients are quoted

PHONON_CONDUCTIVITY_14 = 1.8e25  #: [1/s] at 1e14 g/cm^3, 1e8 K (CAZ04; 1.84e25 re-derived)
IMPURITY_CONDUCTIVITY_14 = 4.4e25  #: [1/s] at 1e14 g/cm^3, Q = 1 (CAZ04; 4.38e25 re-derived)
PHONON_TIME_14 = 2.2e6  #: [yr] at 1e14 g/cm^3, 1e8 K (CAZ04; 2.12e6 re-derived)
IMPURITY_TIME_14 = 5.7e6  #: [yr] at 1e14 g/cm^3, Q = 1 (CAZ04, from memory; 5.2e6 re-derived)
PHONON_DENSITY_EXPONENT = 15.0 / 6.0  #: of the phonon time (CAZ04)
IMPURITY_DENSITY_EXPONENT = 5.0 / 3.0  #: of the impurity time (CAZ04)


def conductivity_phonon(
    density_14: Value, temperature_8: Value, *, electron_fraction: Value = ELECTRON_FRACTION
) -> Value:
    """Return the conductivity [1/s] set by electron-phonon scattering (CAZ04).

    Parameters
    ----------
    density_14 : float, array or PyTensor variable
        Mass density [1e14 g cm^-3].
    temperature_8 : float, array or PyTensor variable
        Local temperature [1e8 K].
    electron_fraction : float, array or PyTensor variable
        Electrons per baryon.
    """
    composition = (electron_fraction / ELECTRON_FRACTION) ** (5.0 / 3.0)
    return PHONON_CONDUCTIVITY_14 * density_14 ** (7.0 / 6.0) * temperature_8**-2.0 * composition


def conductivity_impurity(
    density_14: Value,
    impurity_parameter: Value,
    *,
    electron_fraction: Value = ELECTRON_FRACTION,
    charge: Value = CHARGE,
) -> Value:
    """Return the conductivity [1/s] set by electron-impurity scattering (CAZ04), whatever the temperature.

    Parameters
    ----------
    density_14 : float, array or PyTensor variable
        Mass density [1e14 g cm^-3].
    impurity_parameter : float, array or PyTensor variable
        Q, see `impurity_parameter`.
    electron_fraction, charge : float, array or PyTensor variable
        Electrons per baryon and mean ion charge.
    """
    composition = (electron_fraction / ELECTRON_FRACTION) ** (1.0 / 3.0) * (charge / CHARGE)
    return IMPURITY_CONDUCTIVITY_14 * density_14 ** (1.0 / 3.0) / impurity_parameter * composition


def ohmic_time(conductivity: Value, length_km: Value) -> Value:
    """Return 4 pi sigma L^2/c^2 [yr] for a conductivity [1/s] and a length [km]."""
    return 4.0 * np.pi * conductivity * (length_km * KM_CM) ** 2 / C_CGS**2 / YEAR_S


def phonon_time(
    density_14: Value,
    temperature_8: Value,
    *,
    gravity_14: Value = GRAVITY_14,
    electron_fraction: Value = ELECTRON_FRACTION,
) -> Value:
    """Return the Ohmic time [yr] of electron-phonon scattering over a pressure scale height (CAZ04).

    Parameters
    ----------
    density_14 : float, array or PyTensor variable
        Mass density [1e14 g cm^-3].
    temperature_8 : float, array or PyTensor variable
        Local temperature [1e8 K].
    gravity_14 : float, array or PyTensor variable
        Surface gravity [1e14 cm s^-2].
    electron_fraction : float, array or PyTensor variable
        Electrons per baryon.
    """
    composition = (electron_fraction / ELECTRON_FRACTION) ** (5.0 / 3.0)
    depth = density_14**PHONON_DENSITY_EXPONENT * (gravity_14 / GRAVITY_14) ** -2.0
    return PHONON_TIME_14 * depth * temperature_8**-2.0 * composition


def density_from_phonon_time(phonon_time: Value, gravity_14: Value = GRAVITY_14) -> Value:
    """Return the density [1e14 g cm^-3] at which the phonon time at 1e8 K has the given value [yr].

    The inverse of `phonon_time` at an electron fraction of 0.05.
    """
    depth = phonon_time / PHONON_TIME_14 * (gravity_14 / GRAVITY_14) ** 2.0
    return depth ** (1.0 / PHONON_DENSITY_EXPONENT)


def impurity_time(
    density_14: Value,
    impurity_parameter: Value,
    *,
    gravity_14: Value = GRAVITY_14,
    electron_fraction: Value = ELECTRON_FRACTION,
    charge: Value = CHARGE,
) -> Value:
    """Return the Ohmic time [yr] of electron-impurity scattering over a pressure scale height (CAZ04).

    Parameters
    ----------
    density_14 : float, array or PyTensor variable
        Mass density [1e14 g cm^-3].
    impurity_parameter : float, array or PyTensor variable
        Q, see `impurity_parameter`.
    gravity_14 : float, array or PyTensor variable
        Surface gravity [1e14 cm s^-2].
    electron_fraction, charge : float, array or PyTensor variable
        Electrons per baryon and mean ion charge.
    """
    composition = (electron_fraction / ELECTRON_FRACTION) ** (1.0 / 3.0) * (charge / CHARGE)
    depth = density_14**IMPURITY_DENSITY_EXPONENT * (gravity_14 / GRAVITY_14) ** -2.0
    return IMPURITY_TIME_14 * depth / impurity_parameter * composition


def impurity_parameter(abundances: Value, charges: Value) -> Value:
    """Return Q = sum_i x_i (Z_i - <Z>)^2 (Itoh & Kohyama 1993, ApJ 404, 268, cited from memory).

    Parameters
    ----------
    abundances : (..., n_species) array or PyTensor variable
        Ion abundances; normalised here to unit sum.
    charges : (..., n_species) array or PyTensor variable
        Ion charges Z_i.

    Returns
    -------
    (...) array or PyTensor variable
        The impurity parameter.
    """
    if namespace(abundances, charges) is np:
        abundances, charges = np.asarray(abundances, dtype=float), np.asarray(charges, dtype=float)
    fractions = abundances / abundances.sum(axis=-1, keepdims=True)
    mean = (fractions * charges).sum(axis=-1, keepdims=True)
    return (fractions * (charges - mean) ** 2).sum(axis=-1)
