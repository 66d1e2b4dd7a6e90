"""Composition of the core: neutrons, protons, electrons and muons in beta equilibrium.

The equations of state give P(rho) alone; the proton fraction follows from a symmetry energy S(n) in the
parabolic approximation, mu_e = mu_n - mu_p = 4 (1 - 2 x_p) S(n) (textbook; Lattimer et al. 1991, PRL 66,
2701).
"""

from collections.abc import Mapping
from dataclasses import dataclass
from types import MappingProxyType

import numpy as np
from numpy.typing import ArrayLike, NDArray

from decayinfer.cooling.constants import HBAR_C_MEV_FM, MASS_MUON_MEV, SATURATION_DENSITY
from decayinfer.cooling.eos import EquationOfState
from decayinfer.cooling.stars import maximum_mass_star, sequence

__all__ = [
    "SYMMETRY_ENERGIES",
    "Composition",
    "SymmetryEnergy",
    "beta_equilibrium",
    "direct_urca_mass",
    "number_density",
    "urca_opening",
]

type Array = NDArray[np.float64]


@dataclass(frozen=True)
class SymmetryEnergy:
    """S(n) = J (n/n_0)^gamma, with n_0 = 0.16 fm^-3.

    Parameters
    ----------
    at_saturation : float [MeV]
        J.
    exponent : float
        gamma; the slope parameter is L = 3 gamma J.
    source : str
        Where the numbers come from.
    """

    at_saturation: float
    exponent: float
    source: str

    def __call__(self, n: ArrayLike) -> Array:
        """Symmetry energy [MeV] at baryon density n [fm^-3]."""
        return np.asarray(self.at_saturation * (np.asarray(n) / SATURATION_DENSITY) ** self.exponent)


_SOFT = SymmetryEnergy(31.0, 0.49, "common practice; soft enough to forbid direct Urca below 2 M_sun")

_BSK_EXPONENT = 0.826

#: Symmetry energy that goes with each equation of state.
SYMMETRY_ENERGIES: Mapping[str, SymmetryEnergy] = MappingProxyType(
    {
        "APR4": _SOFT,
        "BSk20": _SOFT,
        "BSk21": SymmetryEnergy(30.0, _BSK_EXPONENT, "J of Goriely et al. 2010, PRC 82, 035804"),
        "BSk24": SymmetryEnergy(
            30.0,
            _BSK_EXPONENT,
            "J of Goriely et al. 2013, PRC 88, 024308 (from memory); the exponent is chosen so that direct"
            " Urca opens near the published 1.595 M_sun (Pearson et al. 2018, from memory)",
        ),
        "SLy4": _SOFT,
    }
)


@dataclass(frozen=True, eq=False)
class Composition:
    """Fermi wave numbers of the four species.

    Parameters
    ----------
    n : (k,) array [fm^-3]
        Baryon density.
    k_n, k_p, k_e, k_mu : (k,) array [fm^-1]
        Fermi wave numbers; zero where a species is absent.
    """

    n: Array
    k_n: Array
    k_p: Array
    k_e: Array
    k_mu: Array

    @property
    def proton_fraction(self) -> Array:
        """n_p / n."""
        return number_density(self.k_p) / self.n


def number_density(k: Array) -> Array:
    """Density [fm^-3] of spin-1/2 fermions with Fermi wave number k [fm^-1]."""
    return k**3 / (3 * np.pi**2)


def _wave_number(density: Array) -> Array:
    return np.cbrt(3 * np.pi**2 * density)


def beta_equilibrium(n: ArrayLike, symmetry: SymmetryEnergy, *, muons: bool = True) -> Composition:
    """Solve for the composition.

    Parameters
    ----------
    n : (k,) array_like [fm^-3]
        Baryon density.
    symmetry : SymmetryEnergy
        S(n).
    muons : bool
        Whether muons appear once mu_e exceeds their mass.

    Returns
    -------
    Composition
    """
    n = np.atleast_1d(np.asarray(n, dtype=float))
    s = symmetry(n)
    low, high = np.zeros_like(n), 4 * s  # mu_e [MeV]: x_p = 0 gives the upper end
    for _ in range(60):  # bisection: the excess of positive charge falls with mu_e
        mu = 0.5 * (low + high)
        k_e, k_mu = _leptons(mu, muons=muons)
        protons = 0.5 * n * (1 - mu / (4 * s))
        too_few = number_density(k_e) + number_density(k_mu) < protons
        low, high = np.where(too_few, mu, low), np.where(too_few, high, mu)
    n_p = number_density(k_e) + number_density(k_mu)
    return Composition(n, _wave_number(n - n_p), _wave_number(n_p), k_e, k_mu)


def _leptons(mu: Array, *, muons: bool) -> tuple[Array, Array]:
    """Fermi wave numbers of electrons (massless to 1e-5 here) and muons at chemical potential mu [MeV]."""
    k_mu = np.sqrt(np.maximum(mu**2 - MASS_MUON_MEV**2, 0)) / HBAR_C_MEV_FM
    return mu / HBAR_C_MEV_FM, k_mu if muons else np.zeros_like(mu)


def urca_opening(composition: Composition, k_lepton: Array, *, width: float = 0.1) -> Array:
    """How far the momentum triangle of direct Urca is open, from 0 (closed) to 1.

    With d = (k_p + k_l - k_n)/k_n the opening is 1 - exp(-(d/width)^2) for d > 0 and zero below. The finite
    width is our device, of the size that Beznogov & Yakovlev 2015, MNRAS 452, 540 infer for the broadening;
    a tail below threshold would leak a process a million times stronger into every star.

    Parameters
    ----------
    composition : Composition
        Matter.
    k_lepton : (k,) array [fm^-1]
        Fermi wave number of the lepton, electron or muon.
    width : float
        Relative width.
    """
    d = (composition.k_p + k_lepton) / composition.k_n - 1
    opening = -np.expm1(-((np.maximum(d, 0) / width) ** 2))
    return np.where(k_lepton > 0, opening, 0.0)


def direct_urca_mass(eos: EquationOfState, symmetry: SymmetryEnergy) -> float:
    """Mass [M_sun] of the star in whose centre direct Urca with electrons opens.

    Infinite if no star is heavy enough, zero if it is open at every density. The threshold is k_n = k_p + k_e
    (Lattimer et al. 1991, PRL 66, 2701).
    """
    n = np.linspace(0.15, float(eos.baryon_density[-1]), 4000)
    c = beta_equilibrium(n, symmetry)
    opening = c.k_p + c.k_e - c.k_n
    top = maximum_mass_star(eos)
    if opening[0] > 0 or not np.any(opening > 0):
        return 0.0 if opening[0] > 0 else float("inf")
    first = int(np.argmax(opening > 0))
    onset = np.interp(0.0, opening[first - 1 : first + 1], n[first - 1 : first + 1])
    rho = float(np.interp(onset, eos.baryon_density, eos.density))
    return sequence(eos, [rho])[0].mass if rho < top.central_density else float("inf")
