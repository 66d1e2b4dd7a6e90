"""Temperatures of the ion lattice, and the freezing of Umklapp processes below one of them."""

from typing import NamedTuple

import numpy as np

from decayinfer.physics.conduction import CHARGE, ELECTRON_FRACTION
from decayinfer.physics.constants import ELEMENTARY_CHARGE_ESU, HBAR_CGS, K_B_CGS, M_U_G
from decayinfer.physics.namespace import Value, namespace

__all__ = [
    "FREEZE_OUT",
    "UMKLAPP_TEMPERATURE_14",
    "UMKLAPP_TEMPERATURE_14_LOW",
    "FreezeOut",
    "debye_temperature",
    "freeze_out",
    "plasma_temperature",
    "umklapp_temperature",
]

#: [K] at 1e14 g/cm^3: T_p Z^(1/3) e^2/(hbar c), Cumming, Arras & Zweibel 2004, ApJ 609, 999
UMKLAPP_TEMPERATURE_14 = 8.7e7
#: [K] the same with the further factor 1/3 of Gnedin, Yakovlev & Potekhin 2001, MNRAS 324, 725 (from memory)
UMKLAPP_TEMPERATURE_14_LOW = 3.0e7


class FreezeOut(NamedTuple):
    """Strength c and power p of the factor exp(-c (T_U/T)^p) on the phonon rate."""

    strength: float
    power: float


#: Laws by name. "exponential" as in Gnedin et al. 2001 (from memory); "none" after Chugunov 2012, Astron.
#: Lett. 38, 25, who finds no exponential freezing (from memory); "cut" is a smooth stand-in for a sharp cut.
FREEZE_OUT = {
    "none": FreezeOut(0.0, 1.0),
    "exponential": FreezeOut(1.0, 1.0),
    "cut": FreezeOut(1.0, 6.0),
}


def plasma_temperature(density_14: Value, electron_fraction: Value = ELECTRON_FRACTION) -> Value:
    """Return the ion plasma temperature (hbar/k_B)(4 pi n_ion Z^2 e^2/m_ion)^(1/2) [K].

    Parameters
    ----------
    density_14 : float, array or PyTensor variable
        Mass density [1e14 g cm^-3].
    electron_fraction : float, array or PyTensor variable
        Electrons per baryon; all nucleons are counted with the ion, so that Z/A is this fraction.
    """
    frequency = np.sqrt(4.0 * np.pi * 1e14) * ELEMENTARY_CHARGE_ESU / M_U_G
    return HBAR_CGS / K_B_CGS * frequency * density_14**0.5 * electron_fraction


def debye_temperature(density_14: Value, electron_fraction: Value = ELECTRON_FRACTION) -> Value:
    """Return the Debye temperature of a bcc Coulomb crystal, 0.45 T_p [K] (factor from memory)."""
    return 0.45 * plasma_temperature(density_14, electron_fraction)


def umklapp_temperature(
    density_14: Value, electron_fraction: Value = ELECTRON_FRACTION, charge: Value = CHARGE
) -> Value:
    """Return the Umklapp temperature of Cumming, Arras & Zweibel 2004 [K]; others put it 3 times lower.

    Parameters
    ----------
    density_14 : float, array or PyTensor variable
        Mass density [1e14 g cm^-3].
    electron_fraction, charge : float, array or PyTensor variable
        Electrons per baryon and ion charge.
    """
    composition = (electron_fraction / ELECTRON_FRACTION) * (charge / CHARGE) ** (1.0 / 3.0)
    return UMKLAPP_TEMPERATURE_14 * density_14**0.5 * composition


def freeze_out(
    temperature: Value, umklapp_temperature: Value, *, strength: Value = 1.0, power: Value = 1.0
) -> Value:
    """Return the factor exp(-c (T_U/T)^p) on the electron-phonon rate.

    Parameters
    ----------
    temperature, umklapp_temperature : float, array or PyTensor variable
        Local temperature and Umklapp temperature, in one unit.
    strength, power : float, array or PyTensor variable
        c and p of a law in `FREEZE_OUT`.
    """
    xp = namespace(temperature, umklapp_temperature, strength, power)
    return xp.exp(-strength * (umklapp_temperature / temperature) ** power)
