"""Constants against astropy, whose values are CODATA and IAU."""

import numpy as np
import pytest
from astropy import constants, units

from decayinfer.physics import constants as ours

CASES = [
    (ours.C_CGS, constants.c.cgs.value, 1e-15),
    (ours.G_CGS, constants.G.cgs.value, 1e-8),
    (ours.HBAR_CGS, constants.hbar.cgs.value, 1e-14),
    (ours.K_B_CGS, constants.k_B.cgs.value, 1e-14),
    (ours.ELEMENTARY_CHARGE_ESU, constants.e.esu.value, 1e-14),
    (ours.M_U_G, constants.u.cgs.value, 2e-9),
    (ours.M_SUN_G, constants.M_sun.cgs.value, 1e-8),
    (ours.YEAR_S, (1.0 * units.yr).to_value("s"), 1e-15),
    (ours.KM_CM, (1.0 * units.km).to_value("cm"), 1e-15),
    (ours.B_UNIT_G, (1e12 * units.G).to_value("G"), 1e-15),
    (ours.T_UNIT_K, (1e8 * units.K).to_value("K"), 1e-15),
]


@pytest.mark.parametrize(("value", "expected", "tolerance"), CASES)
def test_constants_agree_with_astropy(value, expected, tolerance):
    np.testing.assert_allclose(value, expected, rtol=tolerance)
