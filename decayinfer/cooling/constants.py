"""Constants of nuclear and neutrino physics in cgs (CODATA 2018 and Particle Data Group values).

A test holds the CODATA values to those that astropy ships.
"""

import math

__all__ = [
    "AXIAL_COUPLING",
    "COS_CABIBBO",
    "ERG_PER_MEV",
    "FERMI_COUPLING",
    "HBAR",
    "HBAR_C_MEV_FM",
    "K_B",
    "MASS_ELECTRON_MEV",
    "MASS_MUON_MEV",
    "MASS_NEUTRON",
    "MASS_PER_BARYON",
    "MASS_PION_CHARGED_MEV",
    "MASS_PION_NEUTRAL_MEV",
    "MASS_PROTON",
    "SATURATION_DENSITY",
    "STEFAN_BOLTZMANN",
]

HBAR = 1.054571817e-27  #: erg s (CODATA 2018)
K_B = 1.380649e-16  #: erg/K (exact)
STEFAN_BOLTZMANN = 5.670374419e-5  #: erg cm^-2 s^-1 K^-4 (CODATA 2018)
ERG_PER_MEV = 1.602176634e-6  #: exact
HBAR_C_MEV_FM = 197.3269804  #: MeV fm (CODATA 2018)
MASS_NEUTRON = 1.67492749804e-24  #: g (CODATA 2018)
MASS_PROTON = 1.67262192369e-24  #: g (CODATA 2018)
MASS_PER_BARYON = 1.66054e-24  #: g; the atomic mass unit, rest mass per baryon of the outermost crust
MASS_ELECTRON_MEV = 0.51099895
MASS_MUON_MEV = 105.6583755
MASS_PION_CHARGED_MEV = 139.57039
MASS_PION_NEUTRAL_MEV = 134.9768
SATURATION_DENSITY = 0.16  #: n_0 [fm^-3], the conventional round value
AXIAL_COUPLING = 1.26  #: g_A as in Yakovlev, Kaminker, Gnedin & Haensel 2001, Phys. Rep. 354, 1
COS_CABIBBO = math.sqrt(1 - 0.231**2)  #: sin(theta_C) = 0.231, same source
#: G_F [erg cm^3], from G_F/(hbar c)^3 = 1.1663788e-5 GeV^-2
FERMI_COUPLING = 1.1663788e-11 / ERG_PER_MEV**2 * ERG_PER_MEV**3 * (HBAR_C_MEV_FM * 1e-13) ** 3
