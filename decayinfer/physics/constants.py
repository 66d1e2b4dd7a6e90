"""Constants in the internal units: yr, s, 1e12 G, M_sun, 1e8 K.

Physical constants are CODATA and IAU values as astropy ships them (`astropy.constants`); a test compares.
"""

import numpy as np

__all__ = [
    "B_UNIT_G",
    "C_CGS",
    "ELEMENTARY_CHARGE_ESU",
    "G_CGS",
    "HBAR_CGS",
    "INERTIA_UNIT_CGS",
    "KM_CM",
    "K_B_CGS",
    "M_SUN_G",
    "M_U_G",
    "T_UNIT_K",
    "YEAR_S",
]

YEAR_S = 3.15576e7  #: Julian year [s] (IAU)
C_CGS = 2.99792458e10  #: speed of light [cm/s] (exact)
G_CGS = 6.6743e-8  #: gravitational constant [cm^3 g^-1 s^-2] (CODATA 2018)
HBAR_CGS = 1.0545718176461565e-27  #: reduced Planck constant [erg s] (exact)
K_B_CGS = 1.380649e-16  #: Boltzmann constant [erg/K] (exact)
ELEMENTARY_CHARGE_ESU = 4.803204712570263e-10  #: elementary charge [esu] (exact)
M_U_G = 1.660539068e-24  #: atomic mass unit [g] (CODATA 2018 and 2022 agree to 1e-9)
M_SUN_G = 1.98840987e33  #: solar mass [g] (IAU 2015 GM_sun over CODATA 2018 G)
KM_CM = 1e5  #: kilometre [cm]
T_UNIT_K = 1e8  #: internal unit of temperature [K]
B_UNIT_G = 1e12  #: internal unit of field [G]
#: unit of moments of inertia [g cm^2]; typed, because PyTensor would try a bare literal in single precision
INERTIA_UNIT_CGS = np.float64(1e45)
