"""What the scenarios that ship say together."""

import numpy as np
import pytest

from decayinfer.cooling.recipes import RECIPES
from decayinfer.cooling.registry import load_scenario

SLOW = [name for name, r in RECIPES.items() if r.superfluidity in ("normal", "protons") and not r.direct_urca]


@pytest.mark.parametrize("name", SLOW)
def test_light_stars_are_hotter_inside(name):
    """1.1 M_sun is hotter than 1.4 M_sun at 1e3 to 1e5 yr without pairing or with strong protons: common practice."""
    ln_age = np.log(np.geomspace(1e3, 1e5, 41))
    scenario = load_scenario(name)
    assert np.all(scenario.ln_temperature(ln_age, 1.1) > scenario.ln_temperature(ln_age, 1.4))


def test_strong_protons_keep_stars_hot_and_triplet_neutrons_do_not():
    """Proton pairing quenches modified Urca; neutron Cooper pairs radiate (Page et al. 2011, PRL 106, 081101)."""
    normal, protons, triplet = (
        load_scenario(f"bsk24-{kind}-iron").ln_temperature(np.log(1e5), 1.4)
        for kind in ("normal", "protons", "triplet")
    )
    assert protons > normal
    assert protons > triplet


@pytest.mark.parametrize("pairing", ["normal", "protons"])
def test_direct_urca_acts_on_heavy_stars_alone(pairing):
    """It opens above a threshold (Lattimer et al. 1991, PRL 66, 2701): below, the two scenarios are one."""
    slow, fast = (load_scenario(f"bsk24-{pairing}-iron{end}") for end in ("", "-urca"))
    ln_age = np.log(np.geomspace(1e3, 1e6, 31))
    assert fast.ln_temperature(ln_age, 1.2) == pytest.approx(slow.ln_temperature(ln_age, 1.2), abs=0.02)
    assert fast.ln_temperature(np.log(1e4), 1.95) < slow.ln_temperature(np.log(1e4), 1.95) - 0.1
