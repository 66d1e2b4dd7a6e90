import numpy as np
import pytest

from decayinfer.cooling.constants import HBAR_C_MEV_FM, MASS_MUON_MEV
from decayinfer.cooling.eos import get_eos
from decayinfer.cooling.matter import (
    SYMMETRY_ENERGIES,
    SymmetryEnergy,
    beta_equilibrium,
    direct_urca_mass,
    number_density,
    urca_opening,
)

N = np.linspace(0.08, 1.2, 100)
STIFF = SymmetryEnergy(32.0, 1.0, "invented")


@pytest.mark.parametrize("muons", [True, False])
def test_composition_is_neutral_and_in_beta_equilibrium(muons):
    c = beta_equilibrium(N, STIFF, muons=muons)
    charge = number_density(c.k_e) + number_density(c.k_mu)
    assert number_density(c.k_p) == pytest.approx(charge)
    assert number_density(c.k_n) + number_density(c.k_p) == pytest.approx(N)
    mu_e = HBAR_C_MEV_FM * c.k_e
    assert mu_e == pytest.approx(4 * (1 - 2 * c.proton_fraction) * STIFF(N), rel=1e-8)
    present = c.k_mu > 0
    assert present.any() == muons
    mu_mu = np.hypot(HBAR_C_MEV_FM * c.k_mu, MASS_MUON_MEV)
    assert mu_mu[present] == pytest.approx(mu_e[present], rel=1e-8)


def test_proton_fraction_at_saturation_is_the_textbook_one():
    """A few per cent at n_0 (Shapiro & Teukolsky 1983); muons appear just below n_0 (common practice)."""
    c = beta_equilibrium([0.16], SymmetryEnergy(31.0, 0.49, ""))
    assert 0.03 < c.proton_fraction[0] < 0.06
    onset = N[np.argmax(beta_equilibrium(N, SymmetryEnergy(31.0, 0.49, "")).k_mu > 0)]
    assert 0.10 < onset < 0.16


def test_threshold_fraction_without_muons_is_one_ninth():
    """x_p = 1/9 for npe matter (Lattimer, Pethick, Prakash & Haensel 1991, PRL 66, 2701)."""
    c = beta_equilibrium(np.linspace(0.1, 1.2, 4000), STIFF, muons=False)
    first = np.argmax(urca_opening(c, c.k_e) > 0)
    assert c.proton_fraction[first] == pytest.approx(1 / 9, abs=5e-4)


def test_threshold_fraction_with_muons_lies_between_the_limits():
    """Between 1/9 and 0.148, the limit of massless muons (Lattimer et al. 1991)."""
    c = beta_equilibrium(np.linspace(0.1, 1.2, 4000), STIFF)
    first = np.argmax(urca_opening(c, c.k_e) > 0)
    assert 1 / 9 < c.proton_fraction[first] < 0.148
    muon_branch = np.argmax(urca_opening(c, c.k_mu) > 0)
    assert muon_branch > first


def test_opening_is_one_sided_and_smooth():
    c = beta_equilibrium(np.linspace(0.1, 1.2, 4000), STIFF)
    d = (c.k_p + c.k_e) / c.k_n - 1
    opening = urca_opening(c, c.k_e)
    assert np.all(opening[d <= 0] == 0)
    assert opening == pytest.approx(np.where(d > 0, 1 - np.exp(-((d / 0.1) ** 2)), 0))
    assert np.all(urca_opening(c, 0 * c.k_e) == 0)


@pytest.mark.parametrize(("eos", "mass"), [("BSk24", 1.595), ("BSk21", 1.59)])
def test_direct_urca_opens_at_the_remembered_mass(eos, mass):
    """BSk21 1.59, BSk24 1.595 M_sun (Pearson et al. 2018, from memory).

    The exponent of the symmetry energy was chosen for this: the test guards the choice, it confirms nothing.
    """
    assert direct_urca_mass(get_eos(eos), SYMMETRY_ENERGIES[eos]) == pytest.approx(mass, abs=0.02)


@pytest.mark.parametrize("eos", ["SLy4", "BSk20", "APR4"])
def test_direct_urca_stays_closed_in_soft_matter(eos):
    """SLy4: none, or only near the maximum mass (remembered)."""
    assert direct_urca_mass(get_eos(eos), SYMMETRY_ENERGIES[eos]) > 2.0
    assert direct_urca_mass(get_eos(eos), SymmetryEnergy(32.0, 1.3, "")) < 1.2
