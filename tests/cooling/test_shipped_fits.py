"""What is known of cooling stars, asked of the shipped fits, which are what the inference uses."""

import numpy as np
import pytest

from decayinfer.cooling import build
from decayinfer.cooling.evolution import cool, interior
from decayinfer.cooling.recipes import RECIPES
from decayinfer.cooling.registry import load_scenario
from decayinfer.cooling.stars import stars_of_mass

AGES = np.geomspace(1e3, 1e5, 41)


def of(*superfluidity):
    return [n for n, r in RECIPES.items() if r.superfluidity in superfluidity and not r.direct_urca]


@pytest.mark.parametrize("name", of("normal", "protons"))
def test_light_stars_are_hotter_inside(name):
    """A 1.1 M_sun star is hotter than a 1.4 M_sun one at 1e3 to 1e5 yr (common practice; no paper)."""
    scenario = load_scenario(name)
    assert np.all(scenario.ln_temperature(np.log(AGES), 1.1) > scenario.ln_temperature(np.log(AGES), 1.4))


@pytest.mark.parametrize("name", of("normal"))
def test_standard_neutrino_candle(name):
    """T = 3.45e8 K (1 - x) [1 + 0.12 (R/10 km)^2] (330 yr/t)^(1/6), redshifted, within 20 per cent.

    Yakovlev, Ho, Shternin, Heinke & Potekhin 2011, MNRAS 411, 1977 (from memory).
    """
    scenario, ages = load_scenario(name), np.geomspace(330.0, 1e4, 20)
    for mass in (1.0, 1.4, 1.8):
        redshift, radius = scenario.redshift_factor(mass), scenario.radius_km(mass)
        candle = 3.45 * redshift**2 * (1.0 + 0.12 * (radius / 10.0) ** 2) * (330.0 / ages) ** (1.0 / 6.0)
        found = np.exp(scenario.ln_temperature(np.log(ages), mass)) * redshift
        np.testing.assert_allclose(found, candle, rtol=0.2)


@pytest.mark.parametrize("name", RECIPES)
def test_energy_balance_of_the_histories_behind_them(name):
    """Energy radiated is heat lost, to 1e-4, over 300 yr to 1e7 yr; light and heavy stars."""
    recipe = RECIPES[name]
    for star in stars_of_mass(build.get_eos(recipe.eos), [1.2, 1.9]):
        curve = cool(interior(star, recipe.physics), np.geomspace(300.0, 1e7, 40), envelope=recipe.envelope)
        assert abs(curve.energy_error) < 1e-4
