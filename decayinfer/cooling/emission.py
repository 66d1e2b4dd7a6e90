"""Neutrino emission of the core, erg cm^-3 s^-1, with superfluid reduction.

Yakovlev, Kaminker, Gnedin & Haensel 2001, Phys. Rep. 354, 1, three neutrino flavours; prefactors are
re-derived from constants in tests. Densities enter through Fermi wave numbers, k = (3 pi^2 n)^(1/3). The
in-medium factors alpha and beta, the muon branches and the second form of the proton branch are from memory
of that review.
"""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from decayinfer.cooling import superfluidity as sf
from decayinfer.cooling.constants import SATURATION_DENSITY
from decayinfer.cooling.matter import Composition, urca_opening

__all__ = ["State", "bremsstrahlung", "direct_urca", "modified_urca", "neutrino_emission", "pair_emission"]

type Array = NDArray[np.float64]

K_0 = float(np.cbrt(3 * np.pi**2 * SATURATION_DENSITY))  #: wave number of n_0 = 0.16 fm^-3 [fm^-1]
DIRECT_URCA = 4.00e27
MODIFIED_URCA = 8.1e21
BREMSSTRAHLUNG_SAME, BREMSSTRAHLUNG_MIXED = 7.5e19, 1.5e20
PAIR = 1.170e21
P_OVER_MC = 0.2103  #: hbar fm^-1 / (m_N c)
#: Axial-vector share of triplet pair emission after the quenching by four that Leinson 2010, PRC 81, 025501
#: finds (from memory): 2 g_A^2 / 4. Without quenching it is 3.18.
TRIPLET_PAIR = 2 * 1.26**2 / 4


@dataclass(frozen=True, eq=False)
class State:
    """Matter at a temperature.

    Parameters
    ----------
    composition : Composition
        (k,) shells.
    t9 : (..., k) array [1e9 K]
        Local temperature.
    v_n, v_p : (..., k) array
        Gaps over temperature of neutrons (triplet, type ``neutron_pairing``) and protons (singlet).
    neutron_pairing : {"B", "C"}
        Type of neutron pairing.
    mass_n, mass_p : float
        Effective masses over bare masses.
    """

    composition: Composition
    t9: Array
    v_n: Array
    v_p: Array
    neutron_pairing: sf.Pairing = "B"
    mass_n: float = 0.7
    mass_p: float = 0.7


def direct_urca(state: State, *, width: float = 0.1) -> Array:
    """Neutron beta decay and its inverse, to electrons and to muons, with a threshold of finite width."""
    c = state.composition
    opening = urca_opening(c, c.k_e, width=width) + urca_opening(c, c.k_mu, width=width)
    # both leptons have the effective mass mu_e/c^2, hence the same rate where their triangles are open
    rate = DIRECT_URCA * (c.k_e / K_0) * state.mass_n * state.mass_p * opening
    reduction = np.minimum(
        sf.direct_urca_factor(state.v_p, "A"), sf.direct_urca_factor(state.v_n, state.neutron_pairing)
    )
    return rate * reduction * state.t9**6


def modified_urca(state: State) -> Array:
    """Neutron and proton branches, electrons and muons."""
    c = state.composition
    alpha, beta = 1.76 - 0.63 * (1.68 / c.k_n) ** 2, 0.68
    rate = MODIFIED_URCA * state.mass_n**3 * state.mass_p * (c.k_p / K_0) * np.maximum(alpha, 0) * beta
    leptons = 1 + c.k_mu / c.k_e
    proton_branch = (state.mass_p / state.mass_n) ** 2 * (
        _proton_angle(c, c.k_e) + _proton_angle(c, c.k_mu) * c.k_mu / c.k_e
    )
    reduction = np.minimum(sf.modified_urca_factor(state.v_p, "A"), sf.modified_urca_factor(state.v_n, "B"))
    return rate * (leptons + proton_branch) * reduction * state.t9**8


def _proton_angle(c: Composition, k_l: Array) -> Array:
    """Angular factor of the proton branch: open for k_n < 3 k_p + k_l, continuous at k_n = 3 k_p - k_l."""
    safe = np.where(k_l > 0, k_l, 1.0)
    near = np.maximum(k_l + 3 * c.k_p - c.k_n, 0) ** 2 / (8 * safe * c.k_p)
    wide = (3 * c.k_p - c.k_n) / (2 * c.k_p)
    return np.where(k_l > 0, np.where(c.k_n < 3 * c.k_p - k_l, wide, near), 0.0)


def bremsstrahlung(state: State) -> Array:
    """Neutrino pairs from nn, np and pp scattering."""
    c, m_n, m_p = state.composition, state.mass_n, state.mass_p
    nn = BREMSSTRAHLUNG_SAME * m_n**4 * (c.k_n / K_0) * 0.59 * 0.56 * sf.bremsstrahlung_factor(state.v_n)
    pp = BREMSSTRAHLUNG_SAME * m_p**4 * (c.k_p / K_0) * 0.11 * 0.70 * sf.bremsstrahlung_factor(state.v_p)
    mixed = np.minimum(sf.mixed_bremsstrahlung_factor(state.v_n), sf.mixed_bremsstrahlung_factor(state.v_p))
    n_p = BREMSSTRAHLUNG_MIXED * (m_n * m_p) ** 2 * (c.k_p / K_0) * 1.06 * 0.66 * mixed
    return 3 * (nn + pp + n_p) * state.t9**8


def pair_emission(state: State) -> Array:
    """Breaking and formation of Cooper pairs, neutrons and protons."""
    c = state.composition
    neutrons = state.mass_n * c.k_n * TRIPLET_PAIR * sf.pair_emission(state.v_n, state.neutron_pairing)
    velocity = P_OVER_MC * c.k_p / state.mass_p
    weak = 0.0064 + 1.59 * velocity**2 * (state.mass_p**2 + 11 / 42)
    protons = state.mass_p * c.k_p * weak * sf.pair_emission(state.v_p, "A")
    return 3 * PAIR * P_OVER_MC * (neutrons + protons) * state.t9**7


def neutrino_emission(state: State, *, urca: bool) -> Array:
    """Sum of all processes, direct Urca only where ``urca`` is true."""
    slow = modified_urca(state) + bremsstrahlung(state) + pair_emission(state)
    return slow + direct_urca(state) if urca else slow
