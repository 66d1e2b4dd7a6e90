"""Scenarios by name, and their data files."""

from dataclasses import replace

import numpy as np
import pytest

from decayinfer.cooling import form
from decayinfer.cooling.registry import load_scenario, register_scenario, scenario_names
from decayinfer.cooling.scenario import read_scenario, write_scenario
from decayinfer.errors import InputError, UnknownNameError


def test_shipped_scenarios_are_sorted_and_load():
    names = scenario_names()
    assert list(names) == sorted(set(names))
    assert len(names) >= 2
    for name in names:
        scenario = load_scenario(name)
        assert scenario.name == name
        assert scenario.table.shape == (2, len(form.PARAMETERS), form.DEGREE + 1)
        assert scenario.scalars.shape == (len(form.SCALARS),)
        assert scenario.title
        assert scenario.sources
        assert scenario.weight > 0.0


def test_shipped_stars_are_stars():
    """Radii of 9 to 16 km, inertia of 0.8 to 4e45 g cm^2, redshifts between 0 and 1 over the whole mass range."""
    mass = np.linspace(*form.MASS_RANGE, 21)
    for name in scenario_names():
        scenario = load_scenario(name)
        radius, inertia = scenario.radius_km(mass), scenario.inertia_45(mass)
        assert np.all((radius > 9.0) & (radius < 16.0))
        assert np.all((inertia > 0.8) & (inertia < 4.0))
        assert np.all((scenario.redshift_factor(mass) > 0.5) & (scenario.redshift_factor(mass) < 1.0))


def test_an_unknown_name_lists_the_known_ones():
    with pytest.raises(UnknownNameError, match=f"no cooling scenario 'lava'.*{scenario_names()[0]}"):
        load_scenario("lava")


def test_a_scenario_of_one_s_own(tools):
    forget = tools.register_scenarios()
    try:
        register_scenario(replace(tools.scenario("candle"), name="mine"))
        assert load_scenario("mine").name == "mine"
        assert "mine" in scenario_names()
    finally:
        forget()
    assert "mine" not in scenario_names()


@pytest.mark.parametrize("name", ["candle", "urca"])
def test_a_data_file_keeps_every_bit(tools, tmp_path, name):
    scenario = tools.scenario(name)
    write_scenario(scenario, tmp_path / f"{name}.toml")
    back = read_scenario(tmp_path / f"{name}.toml")
    for field in ("table", "scalars", "ln_radius", "ln_inertia"):
        np.testing.assert_array_equal(getattr(back, field), getattr(scenario, field))
    for field in (
        "name",
        "title",
        "description",
        "sources",
        "provisional",
        "weight",
        "properties",
        "fit_error",
    ):
        assert getattr(back, field) == getattr(scenario, field)


def test_text_with_quotes_survives(tools, tmp_path):
    scenario = replace(tools.scenario("candle"), name="quoted", description='say "hot", \\ and cold')
    write_scenario(scenario, tmp_path / "quoted.toml")
    assert read_scenario(tmp_path / "quoted.toml").description == scenario.description


@pytest.mark.parametrize(
    "spoil",
    [
        lambda text: text.replace("title", "heading", 1),
        lambda text: text.replace("a0 = [", "a9 = ["),
        lambda text: text.replace("a0 = [", "a0 = [1.0, 2.0, 3.0, "),
        lambda text: text.replace("[scalars]", "[scalars"),
        lambda text: text.replace("ln_floor", "ln_roof"),
    ],
)
def test_a_spoilt_file_is_refused_by_name(tools, tmp_path, spoil):
    path = tmp_path / "spoilt.toml"
    write_scenario(tools.scenario("candle"), path)
    path.write_text(spoil(path.read_text()))
    with pytest.raises(InputError, match=r"spoilt\.toml"):
        read_scenario(path)
