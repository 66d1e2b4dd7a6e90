import numpy as np
import pytest

from decayinfer.cooling import build, form
from decayinfer.cooling.gradients import Grid, Layout, evaluate
from decayinfer.cooling.recipes import RECIPES, SUPERFLUIDITY
from decayinfer.cooling.scenario import read_scenario, write_scenario

# Largest errors a fit may have, of T_b and of d ln T/d ln t, by superfluid model
LIMITS = {"normal": (0.01, 0.05), "protons": (0.01, 0.05), "fading": (0.01, 0.05), "triplet": (0.05, 0.25)}
RECOMPUTED = ("sly4-normal-iron", "bsk24-protons-light", "apr4-triplet-iron", "bsk24-normal-iron-urca")


def load_scenario(name):
    return read_scenario(build.FOLDER / f"{name}.toml")


def test_every_recipe_ships_as_a_data_file():
    assert {path.stem for path in build.FOLDER.glob("*.toml")} >= set(RECIPES)
    assert len(RECIPES) >= 12
    for name, recipe in RECIPES.items():
        scenario = load_scenario(name)
        assert not scenario.provisional
        assert scenario.properties["eos"] == recipe.eos
        assert scenario.properties["superfluidity"] == recipe.superfluidity
        assert scenario.properties["envelope"] == recipe.envelope
        assert scenario.properties["direct_urca"] == ("yes" if recipe.direct_urca else "no")


def test_recipes_span_what_they_should():
    assert {r.eos for r in RECIPES.values()} == {"APR4", "BSk24", "SLy4"}
    assert {r.superfluidity for r in RECIPES.values()} == set(SUPERFLUIDITY)
    assert {r.envelope for r in RECIPES.values()} == {"iron", "light"}
    assert {r.direct_urca for r in RECIPES.values()} == {True, False}


@pytest.mark.parametrize("name", RECIPES)
def test_stored_errors_keep_the_limits(name):
    recipe, error = RECIPES[name], load_scenario(name).fit_error
    temperature, slope = LIMITS[recipe.superfluidity]
    if recipe.direct_urca:
        assert error["temperature_away"] <= 0.03
        assert error["temperature_near_threshold"] <= 0.08
    else:
        assert error["temperature"] <= temperature
        assert error["slope"] <= slope
    assert error["radius"] < 0.01
    assert error["inertia"] < 0.01


@pytest.mark.parametrize("name", RECOMPUTED)
def test_stored_errors_are_found_again_by_the_solver(name):
    scenario = load_scenario(name)
    found = build.left_out_error(RECIPES[name], scenario)
    for key, value in found.items():
        assert value == pytest.approx(scenario.fit_error[key], rel=0.02, abs=2e-5)


@pytest.mark.parametrize("name", RECIPES)
def test_fits_fall_with_age_on_a_dense_grid(name):
    scenario = load_scenario(name)
    dense = Grid(np.linspace(*form.MASS_RANGE, 101), np.geomspace(1.0, 1e7, 600))
    value, slope, *_ = evaluate(dense, scenario.table, scenario.scalars, Layout(()))
    # on its floor, to 1e-12, a star has stopped: there the slope may round to zero, never above
    assert np.all(slope <= 0)
    assert np.all(slope[value > scenario.scalars[form.SCALARS.index("ln_floor")] + 1e-12] < 0)
    assert np.all(np.isfinite(value))


def test_errors_between_the_points_of_the_fit_stay_small():
    """A grid three times denser in age than the fit: no feature hides between its ages."""
    recipe = RECIPES["sly4-fading-iron"]
    scenario = load_scenario(recipe.name)
    grid = Grid(np.array([1.0, 1.37, 1.61, 1.98]), np.geomspace(1e3, 5e6, 350))
    target = build.solve_histories(build.get_eos(recipe.eos), recipe.physics, grid, envelope=recipe.envelope)
    error = build.fit_error(build.Fit(scenario.table, scenario.scalars), target)
    assert error.temperature < 0.02
    assert error.slope < 0.06


def test_building_again_gives_the_same_scenario(tmp_path):
    recipe = RECIPES["sly4-normal-light"]
    once, again = (build.build_scenario(recipe, starts=1) for _ in range(2))
    assert np.array_equal(once.table, again.table)
    write_scenario(once, tmp_path / f"{recipe.name}.toml")
    assert read_scenario(tmp_path / f"{recipe.name}.toml").fit_error == dict(once.fit_error)


def test_unknown_names_stop_the_command(capsys):
    with pytest.raises(SystemExit):
        build.main(["no-such-scenario"])
    assert "no-such-scenario" in capsys.readouterr().err
