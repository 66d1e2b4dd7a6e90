"""Emissivities of Yakovlev, Kaminker, Gnedin & Haensel 2001, Phys. Rep. 354, 1; prefactors from constants."""

import numpy as np
import pytest

from decayinfer.cooling import emission
from decayinfer.cooling.capacity import heat_capacity
from decayinfer.cooling.constants import (
    AXIAL_COUPLING,
    COS_CABIBBO,
    ERG_PER_MEV,
    FERMI_COUPLING,
    HBAR,
    K_B,
    MASS_NEUTRON,
    MASS_PION_CHARGED_MEV,
    MASS_PION_NEUTRAL_MEV,
    MASS_PROTON,
)
from decayinfer.cooling.emission import State
from decayinfer.cooling.eos import get_eos
from decayinfer.cooling.matter import SYMMETRY_ENERGIES, beta_equilibrium
from decayinfer.cooling.stars import stars_of_mass
from decayinfer.physics.constants import C_CGS

KT = K_B * 1e9
P_0 = HBAR * emission.K_0 * 1e13  # momentum of n_0
PION, PION_0 = (m * ERG_PER_MEV / C_CGS**2 for m in (MASS_PION_CHARGED_MEV, MASS_PION_NEUTRAL_MEV))


def test_direct_urca_prefactor():
    """(457 pi/10080) G_F^2 cos^2 theta_C (1 + 3 g_A^2) m_n m_p m_e* (k T)^6/(hbar^10 c^3), m_e* = p_F/c."""
    coupling = FERMI_COUPLING**2 * COS_CABIBBO**2 * (1 + 3 * AXIAL_COUPLING**2)
    masses = MASS_NEUTRON * MASS_PROTON * P_0 / C_CGS
    value = 457 * np.pi / 10080 * coupling * masses * KT**6 / (HBAR**10 * C_CGS**3)
    assert value == pytest.approx(emission.DIRECT_URCA, rel=0.005)


def test_modified_urca_prefactor():
    """(11513/30240) G_F^2 cos^2 theta_C g_A^2 m_n^3 m_p/(2 pi) (f/m_pi)^4 p_Fp (kT)^8/(hbar^10 c^8)."""
    coupling = FERMI_COUPLING**2 * COS_CABIBBO**2 * AXIAL_COUPLING**2 / (2 * np.pi)
    masses = MASS_NEUTRON**3 * MASS_PROTON / PION**4
    value = 11513 / 30240 * coupling * masses * P_0 * KT**8 / (HBAR**10 * C_CGS**8)
    assert value == pytest.approx(emission.MODIFIED_URCA, rel=0.005)


@pytest.mark.parametrize(
    ("number", "expected"), [(41, emission.BREMSSTRAHLUNG_SAME), (82, emission.BREMSSTRAHLUNG_MIXED)]
)
def test_bremsstrahlung_prefactors(number, expected):
    """(41 or 82)/14175 G_F^2 g_A^2 m_N^4/(2 pi) (f/m_pi0)^4 p_F (k T)^8/(hbar^10 c^8), per flavour."""
    coupling = FERMI_COUPLING**2 * AXIAL_COUPLING**2 / (2 * np.pi)
    value = number / 14175 * coupling * MASS_NEUTRON**4 / PION_0**4 * P_0 * KT**8 / (HBAR**10 * C_CGS**8)
    assert value == pytest.approx(expected, rel=0.01)


def test_pair_prefactor():
    """4 G_F^2 m p_F (k T)^7/(15 pi^5 hbar^10 c^6), at p_F = m c."""
    value = 4 * FERMI_COUPLING**2 * MASS_NEUTRON**2 * C_CGS * KT**7 / (15 * np.pi**5 * HBAR**10 * C_CGS**6)
    assert value == pytest.approx(emission.PAIR, rel=0.003)
    assert pytest.approx(emission.P_OVER_MC, rel=0.002) == HBAR * 1e13 / (MASS_NEUTRON * C_CGS)


def core(n=(0.1, 0.3, 0.5, 0.7, 0.9), t9=0.3, v_n=0.0, v_p=0.0):
    c = beta_equilibrium(np.array(n), SYMMETRY_ENERGIES["BSk24"])
    one = np.ones(len(n))
    return State(c, t9 * one, v_n * one, v_p * one)


@pytest.mark.parametrize(
    ("process", "power"),
    [(emission.direct_urca, 6), (emission.modified_urca, 8), (emission.bremsstrahlung, 8)],
)
def test_powers_of_temperature(process, power):
    """T^6 for direct Urca, T^8 for the others in normal matter (phase space)."""
    warm, cool = process(core(t9=0.3)), process(core(t9=0.15))
    opened = cool > 0
    assert opened.any()
    assert warm[opened] / cool[opened] == pytest.approx(2.0**power)


def test_normal_matter_has_no_pair_emission_and_pairing_quenches_the_rest():
    assert np.all(emission.pair_emission(core()) == 0)
    for process in (emission.direct_urca, emission.modified_urca, emission.bremsstrahlung):
        for gaps in ({"v_p": 8.0}, {"v_n": 8.0}):
            assert np.all(process(core(**gaps)) <= process(core()))
    assert np.all(emission.pair_emission(core(v_n=2.0)) > 0)


def test_strong_proton_pairing_leaves_neutron_bremsstrahlung():
    quenched = emission.neutrino_emission(core(v_p=60.0), urca=False)
    nn = emission.bremsstrahlung(core(v_p=60.0))
    assert quenched == pytest.approx(nn, rel=1e-6)
    ratio = emission.neutrino_emission(core(), urca=False) / quenched
    # one to two orders of magnitude (Yakovlev & Pethick 2004, ARA&A 42, 169)
    assert np.all((ratio > 10) & (ratio < 300))


def test_proton_branch_is_continuous_between_its_two_forms():
    n = np.linspace(0.1, 1.0, 2000)
    c = beta_equilibrium(n, SYMMETRY_ENERGIES["BSk24"], muons=False)
    wide = c.k_n < 3 * c.k_p - c.k_e
    assert wide.any()
    assert not wide.all()
    values = emission.modified_urca(State(c, np.ones(2000), np.zeros(2000), np.zeros(2000)))
    assert np.abs(np.diff(np.log(values))).max() < 0.01


@pytest.mark.parametrize(
    ("eos", "mass", "luminosity", "capacity"),
    [
        ("BSk24", 1.0, 1.63e40, 1.27e39),
        ("BSk24", 1.4, 4.07e40, 1.83e39),
        ("BSk24", 1.8, 1.11e41, 2.47e39),
        ("SLy4", 1.0, 1.75e40, 1.17e39),
        ("SLy4", 1.4, 4.85e40, 1.68e39),
        ("SLy4", 1.8, 1.77e41, 2.29e39),
    ],
)
def test_integrals_agree_with_an_independent_calculation(eos, mass, luminosity, capacity):
    """Redshifted L/T_9^8 and C/T_9 without muons, masses 0.7, S = 31 MeV (n/n_0)^0.49 (earlier integral)."""
    (star,) = stars_of_mass(get_eos(eos), [mass])
    n, _, e_phi, volume = star.core()
    c = beta_equilibrium(n, SYMMETRY_ENERGIES["SLy4"], muons=False)
    state = State(c, 1 / e_phi, 0 * n, 0 * n)
    assert np.sum(emission.neutrino_emission(state, urca=False) * e_phi**2 * volume) == pytest.approx(
        luminosity, rel=0.01
    )
    assert np.sum(heat_capacity(state) * volume) == pytest.approx(capacity, rel=0.01)


def test_direct_urca_outshines_modified_urca_by_many_orders():
    """L_DU/L_MU of order 1e5 to 1e7 at 3e8 K where the triangle is wide open (Lattimer et al. 1991)."""
    state = core(n=(1.2,))
    ratio = emission.direct_urca(state) / emission.modified_urca(state)
    assert 1e5 < ratio[0] < 1e8
