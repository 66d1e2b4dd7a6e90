"""Superfluid gaps, reduction factors, and density profiles of the critical temperature.

v = Delta / (k_B T). Pairing types: ``"A"`` singlet 1S0; ``"B"`` triplet 3P2 with m_J = 0 (v is the least
gap on the Fermi surface); ``"C"`` triplet with |m_J| = 2 (v is the largest gap; the gap has nodes). Fits by
Levenfish & Yakovlev 1994, Astron. Rep. 38, 247 and Astron. Lett. 20, 43; Yakovlev & Levenfish 1995, A&A 297,
717; Yakovlev, Levenfish & Shibanov 1999, Phys. Usp. 42, 737; Yakovlev, Kaminker & Levenfish 1999, A&A 343,
650; coefficients from memory, each held in tests against direct integrals over quasi-particle energies.
"""

from collections.abc import Mapping
from dataclasses import dataclass
from types import MappingProxyType
from typing import Literal

import numpy as np
from numpy.typing import ArrayLike, NDArray

__all__ = [
    "CRITICAL_TEMPERATURES",
    "CriticalTemperature",
    "Pairing",
    "bremsstrahlung_factor",
    "direct_urca_factor",
    "gap",
    "heat_capacity_factor",
    "mixed_bremsstrahlung_factor",
    "modified_urca_factor",
    "pair_emission",
]

type Array = NDArray[np.float64]
type Pairing = Literal["A", "B", "C"]


def _root(a: float, b: float, v: Array) -> Array:
    return np.sqrt(a**2 + (b * v) ** 2)


def _suppression(a: float, v: Array, b: float = 1.0) -> Array:
    """exp(a - sqrt(a^2 + b^2 v^2)): one at v = 0, exp(-b v) at large v."""
    return np.exp(a - _root(a, b, v))


def gap(t: ArrayLike, pairing: Pairing) -> Array:
    """Gap over temperature, v(T/T_c); zero at and above the critical temperature.

    Parameters
    ----------
    t : array_like
        T/T_c; infinity is allowed and means normal matter.
    pairing : {"A", "B", "C"}
        Type of pairing.
    """
    x = np.minimum(np.maximum(np.asarray(t, dtype=float), 1e-12), 1.0)
    if pairing == "A":
        return np.asarray(np.sqrt(1 - x) * (1.456 - 0.157 / np.sqrt(x) + 1.764 / x))
    if pairing == "B":
        return np.asarray(np.sqrt(1 - x) * (0.7893 + 1.188 / x))
    return np.asarray(np.sqrt(1 - x**4) / x * (2.030 - 0.4903 * x**4 + 0.1727 * x**8))


def heat_capacity_factor(v: Array, pairing: Pairing) -> Array:
    """Heat capacity over that of normal matter (Yakovlev, Levenfish & Shibanov 1999).

    It jumps at the critical temperature, by 2.43 (A) or 2.19 (B, C); v = 0 is normal matter.
    """
    if pairing == "A":
        factor = (0.4186 + _root(1.007, 0.5010, v)) ** 2.5 * _suppression(1.456, v)
    elif pairing == "B":
        factor = (0.6893 + _root(0.790, 0.2824, v)) ** 2 * _suppression(1.934, v)
    else:
        top = 2.188 - (9.537e-5 * v) ** 2 + (0.1491 * v) ** 4
        factor = top / (1 + (0.2846 * v) ** 2 + (0.01335 * v) ** 4 + (0.1815 * v) ** 6)
    return np.where(v > 0, factor, 1.0)


def direct_urca_factor(v: Array, pairing: Pairing) -> Array:
    """Direct Urca with one superfluid nucleon (Levenfish & Yakovlev 1994)."""
    if pairing == "A":
        return (0.2312 + _root(0.7688, 0.1438, v)) ** 5.5 * _suppression(3.427, v)
    if pairing == "B":
        return (0.2546 + _root(0.7454, 0.1284, v)) ** 5 * _suppression(2.701, v)
    slow = (0.5 + (0.09226 * v) ** 2) / (1 + (0.1821 * v) ** 2 + (0.16736 * v) ** 4)
    return slow + 0.5 * np.exp(1 - np.sqrt(1 + (0.4129 * v) ** 2))


def modified_urca_factor(v: Array, pairing: Pairing) -> Array:
    """Modified Urca with one superfluid nucleon of four (Yakovlev & Levenfish 1995).

    Exact for protons (A) in the neutron branch and neutrons (B) in the proton branch; where the spectator is
    superfluid the same factors are used (similarity criterion of the same paper, from memory), which leaves
    more emission than there is, in branches that pairing already makes small.
    """
    if pairing == "A":
        a, b = 0.1477 + _root(0.8523, 0.1175, v), 0.1477 + _root(0.8523, 0.1297, v)
        return 0.5 * (a**7.5 + b**5.5) * _suppression(3.4370, v)
    a, b = 0.1612 + _root(0.8388, 0.1117, v), 0.1612 + _root(0.8388, 0.1274, v)
    return 0.5 * (a**7 + b**5) * _suppression(2.398, v)


def bremsstrahlung_factor(v: Array) -> Array:
    """Bremsstrahlung of two nucleons of one superfluid species, singlet (Yakovlev & Levenfish 1995)."""
    c, d = 0.1747 + _root(0.8253, 0.07933, v), 0.7333 + _root(0.2667, 0.1678, v)
    return 0.5 * (c**2 * _suppression(4.228, v, 2.0) + d**7.5 * _suppression(7.762, v, 3.0))


def mixed_bremsstrahlung_factor(v: Array) -> Array:
    """Neutron-proton bremsstrahlung with one superfluid species, singlet (Yakovlev & Levenfish 1995)."""
    a, b = 0.9982 + _root(0.0018, 0.3815, v), 0.3949 + _root(0.6051, 0.2666, v)
    return (a * _suppression(1.306, v) + 1.732 * b**7 * _suppression(3.303, v, 2.0)) / 2.732


def pair_emission(v: Array, pairing: Pairing) -> Array:
    """Dimensionless F(v) of Cooper-pair breaking and formation (Yakovlev, Kaminker & Levenfish 1999)."""
    if pairing == "A":
        power = 0.602 * v**2 + 0.5942 * v**4 + 0.288 * v**6
        return power * np.sqrt(0.5547 + _root(0.4453, np.sqrt(0.0113), v)) * _suppression(2.245, v, 2.0)
    if pairing == "B":
        power = (1.204 * v**2 + 3.733 * v**4 + 0.3191 * v**6) / (1 + 0.3511 * v**2)
        return power * (0.7591 + _root(0.2409, np.sqrt(0.3145), v)) ** 2 * _suppression(0.4616, v, 2.0)
    top = 0.4013 * v**2 - 0.043 * v**4 + 0.002172 * v**6
    return top / (1 - 0.2018 * v**2 + 0.02601 * v**4 - 0.001477 * v**6 + 0.0000434 * v**8)


@dataclass(frozen=True)
class CriticalTemperature:
    """T_c(k) = peak f(k)/max f, f = (k - k_0)^2/[(k - k_0)^2 + k_1^2] (k - k_2)^2/[(k - k_2)^2 + k_3^2].

    Zero outside k_0 < k < k_2. The shape is that of Kaminker, Haensel & Yakovlev 2001, A&A 373, L17.

    Parameters
    ----------
    peak : float [K]
        Highest critical temperature.
    k_0, k_1, k_2, k_3 : float [fm^-1]
        Onset, width of the rise, closure, width of the fall, in the Fermi wave number of the species.
    pairing : {"A", "B", "C"}
        Type of pairing.
    source : str
        Where the numbers come from.
    """

    peak: float
    k_0: float
    k_1: float
    k_2: float
    k_3: float
    pairing: Pairing
    source: str

    def __call__(self, k: ArrayLike) -> Array:
        """Critical temperature [K] at Fermi wave number k [fm^-1]."""
        highest = self._shape(np.linspace(self.k_0, self.k_2, 2001)).max()
        return np.asarray(self.peak * self._shape(np.asarray(k, dtype=float)) / highest)

    def _shape(self, k: Array) -> Array:
        rise, fall = (k - self.k_0) ** 2, (k - self.k_2) ** 2
        curve = rise / (rise + self.k_1**2) * fall / (fall + self.k_3**2)
        return np.where((k > self.k_0) & (k < self.k_2), curve, 0.0)


_KAMINKER = "Kaminker, Haensel & Yakovlev 2001, A&A 373, L17 (from memory)"
_OURS = "chosen here in the shape of Kaminker, Haensel & Yakovlev 2001"
_OPEN = _OURS + "; open to the centre"
_CAS_A = _OURS + "; peak as Page et al. 2011, PRL 106, 081101 infer from Cassiopeia A"

#: Profiles of the critical temperature, by name.
CRITICAL_TEMPERATURES: Mapping[str, CriticalTemperature] = MappingProxyType(
    {
        "protons-strong": CriticalTemperature(6.8e9, 0.0, 0.30, 2.6, 0.30, "A", _OPEN),
        "protons-closing": CriticalTemperature(6.8e9, 0.0, 1.117, 1.241, 0.1473, "A", _KAMINKER),
        "neutrons-weak": CriticalTemperature(2.0e8, 1.0, 1.961, 2.755, 1.3, "B", _OURS),
        "neutrons-moderate": CriticalTemperature(5.5e8, 1.0, 1.961, 2.755, 1.3, "B", _CAS_A),
    }
)
