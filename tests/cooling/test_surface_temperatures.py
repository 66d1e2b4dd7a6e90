"""Surface temperatures of real stars against the scenarios; the papers stand in the table, row by row."""

from dataclasses import replace

import numpy as np
import pytest

from decayinfer.cooling.eos import get_eos
from decayinfer.cooling.evolution import cool, interior
from decayinfer.cooling.recipes import RECIPES
from decayinfer.cooling.registry import standard_names
from decayinfer.cooling.stars import stars_of_mass


@pytest.fixture(scope="module")
def surface(script):
    return script("surface")


@pytest.fixture(scope="module")
def old(surface):
    """Rows older than 1e3 yr, where the crust has relaxed."""
    return [star for star in surface.read_observed() if star.age > 1e3]


def inside(surface, stars, names):
    return sum(bool(surface.containing(star, names)) for star in stars)


def test_every_row_has_its_paper(surface):
    assert all(any(c.isdigit() for c in star.source) for star in surface.read_observed())


def test_how_many_old_rows_the_scenarios_reach(surface, old):
    """All with direct Urca, half without it, none in the standard set; and the page says so."""
    assert len(old) == 4
    reached = [inside(surface, old, names) for names in (RECIPES, surface.WITHOUT_URCA, standard_names())]
    assert reached == [4, 2, 0]
    page = surface.surface_page()
    said = (
        f"Of the 4 rows older than 1e3 yr, {reached[0]} lie in the band of some computed scenario, {reached[1]} "
        f"without those with direct Urca, {reached[2]} in the standard set."
    )
    assert said in page


def test_stars_too_hot_for_any_cooling_are_outside(surface, old):
    """Four times the temperature observed, and no computed scenario reaches three of the four rows."""
    hot = [replace(star, temperature=4.0 * star.temperature, error=0.0) for star in old]
    assert inside(surface, hot, RECIPES) <= 1


def test_bands_are_those_of_the_solver(surface, old):
    """Vela (Pavlov et al. 2001) is colder than stars in which direct Urca is closed, hotter than 2 M_sun with it open.

    Temperatures of the surface straight from the solver, as seen from far away.
    """
    vela = next(star for star in old if star.name == "J0835-4510")
    recipe = RECIPES["bsk24-normal-iron-urca"]
    stars = stars_of_mass(get_eos(recipe.eos), [1.0, 1.4, 2.0])
    solved = [
        cool(interior(star, recipe.physics), [vela.age], envelope="iron").surface_temperature[0]
        * star.redshift_factor
        / 1e6
        for star in stars
    ]
    assert min(solved[:2]) > vela.temperature + 5.0 * vela.error
    assert solved[2] < vela.temperature - 5.0 * vela.error
    low, high = surface.bands(recipe.name, vela.age, redshifted=True)
    assert low[0] == pytest.approx(solved[2], rel=0.04)
    assert high[0] == pytest.approx(max(solved), rel=0.01)


def test_far_away_stars_look_cooler(surface):
    for near, far in zip(*(surface.bands("candle", 1e4, redshifted=r) for r in (False, True)), strict=True):
        assert far[0] < 0.9 * near[0]


def test_the_page_is_that_of_the_table(docs, surface):
    assert (docs / "surface_temperature.md").read_text(encoding="utf-8") == surface.surface_page()
    for star in surface.read_observed():
        assert star.source in surface.surface_page()
    assert np.isfinite([star.temperature for star in surface.read_observed()]).all()
