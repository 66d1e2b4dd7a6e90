import astropy.constants as ac
import pytest
from astropy import units as u

from decayinfer.cooling import constants


@pytest.mark.parametrize(
    ("ours", "reference"),
    [
        (constants.HBAR, ac.hbar.cgs.value),
        (constants.K_B, ac.k_B.cgs.value),
        (constants.STEFAN_BOLTZMANN, ac.sigma_sb.cgs.value),
        (constants.ERG_PER_MEV, (1 * u.MeV).to_value(u.erg)),
        (constants.HBAR_C_MEV_FM, (ac.hbar * ac.c).to_value(u.MeV * u.fm)),
        (constants.MASS_NEUTRON, ac.m_n.cgs.value),
        (constants.MASS_PROTON, ac.m_p.cgs.value),
        (constants.MASS_ELECTRON_MEV, (ac.m_e * ac.c**2).to_value(u.MeV)),
        (constants.MASS_PER_BARYON, ac.u.cgs.value),
    ],
)
def test_constants_are_those_of_codata(ours, reference):
    assert ours == pytest.approx(reference, rel=1e-5)


def test_fermi_coupling_in_cgs():
    """G_F = 1.436e-49 erg cm^3 (Yakovlev et al. 2001, Phys. Rep. 354, 1; from memory)."""
    assert pytest.approx(1.436e-49, rel=1e-3) == constants.FERMI_COUPLING
