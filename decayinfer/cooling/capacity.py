"""Heat capacity of the core per volume, erg cm^-3 K^-1.

Degenerate fermions, c = m* p_F k_B^2 T / (3 hbar^3), with superfluid reduction for nucleons; leptons have
m* = mu/c^2 (Yakovlev, Levenfish & Shibanov 1999, Phys. Usp. 42, 737). The crust holds little heat and is
left out.
"""

import numpy as np
from numpy.typing import NDArray

from decayinfer.cooling.constants import HBAR, K_B, MASS_NEUTRON, MASS_PROTON
from decayinfer.cooling.emission import State
from decayinfer.cooling.superfluidity import heat_capacity_factor
from decayinfer.physics.constants import C_CGS

__all__ = ["heat_capacity"]

_UNIT = K_B**2 * 1e9 * 1e13 / (3 * HBAR**2)  # for m* in g, k in fm^-1, T in 1e9 K


def heat_capacity(state: State) -> NDArray[np.float64]:
    """Heat capacity of neutrons, protons, electrons and muons [erg cm^-3 K^-1]."""
    c = state.composition
    neutrons = state.mass_n * MASS_NEUTRON * c.k_n * heat_capacity_factor(state.v_n, state.neutron_pairing)
    protons = state.mass_p * MASS_PROTON * c.k_p * heat_capacity_factor(state.v_p, "A")
    lepton_mass = HBAR * c.k_e * 1e13 / C_CGS  # mu_e/c^2, shared by muons in equilibrium
    return _UNIT * state.t9 * (neutrons + protons + lepton_mass * (c.k_e + c.k_mu))
