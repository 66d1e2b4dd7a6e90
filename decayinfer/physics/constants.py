"""Constants in the internal units: yr, s, 1e12 G, M_sun, 1e8 K.

Physical constants are CODATA and IAU values as astropy ships them (`astropy.constants`); a test compares.
"""

__all__ = [
    "C_CGS",
    "G_CGS",
    "M_SUN_G",
    "T_UNIT_K",
    "B_UNIT_G",
    "YEAR_S",
]

YEAR_S = 3.15576e7  #: Julian year [s] (IAU)
C_CGS = 2.99792458e10  #: speed of light [cm/s] (exact)
G_CGS = 6.6743e-8  #: gravitational constant [cm^3 g^-1 s^-2] (CODATA 2018)
M_SUN_G = 1.98840987e33  #: solar mass [g] (IAU 2015 GM_sun over CODATA 2018 G)
T_UNIT_K = 1e8  #: internal unit of temperature [K]
B_UNIT_G = 1e12  #: internal unit of field [G]
