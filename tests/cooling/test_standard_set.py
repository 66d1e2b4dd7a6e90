"""Which scenarios are fitted when none is named, and what a list of names stands for."""

from dataclasses import replace

import pytest

from decayinfer.cooling.recipes import RECIPES, STANDARD
from decayinfer.cooling.registry import (
    choose_scenarios,
    load_scenario,
    register_scenario,
    scenario_names,
    standard_names,
)
from decayinfer.cooling.scenario import read_scenario, write_scenario
from decayinfer.errors import UnknownNameError
from decayinfer.inference.settings import FitSettings
from decayinfer.results.run import resolve_settings


def test_data_files_name_the_standard_set_of_the_recipes():
    assert sorted(standard_names()) == sorted(STANDARD)
    assert set(STANDARD) <= set(RECIPES)


def test_the_standard_set_spans_equations_of_state_pairing_and_envelopes():
    recipes = [RECIPES[name] for name in STANDARD]
    assert len({recipe.eos for recipe in recipes}) > 1
    assert {recipe.superfluidity for recipe in recipes} == {"normal", "protons", "fading"}
    assert {recipe.envelope for recipe in recipes} == {"iron", "light"}


def test_nothing_asked_means_the_standard_set():
    assert choose_scenarios(()) == standard_names()
    assert resolve_settings(FitSettings()).cooling == standard_names()


def test_all_means_every_computed_scenario(tools):
    chosen = choose_scenarios(("all",))
    assert set(chosen) == {name for name in scenario_names() if not load_scenario(name).provisional}
    assert set(RECIPES) <= set(chosen)
    assert "candle" not in chosen
    assert choose_scenarios(("candle", "all")) == ("candle", *chosen)


def test_names_are_kept_in_order_once():
    names = "sly4-fading-iron", "candle", "sly4-fading-iron"
    assert choose_scenarios(names) == ("sly4-fading-iron", "candle")
    with pytest.raises(UnknownNameError, match="no cooling scenario 'tepid'"):
        choose_scenarios(("candle", "tepid"))


def test_one_s_own_scenario_counts_among_all_but_not_among_the_standard(tools):
    forget = tools.register_scenarios()
    try:
        register_scenario(replace(load_scenario(STANDARD[0]), name="mine", standard=False))
        assert "mine" in choose_scenarios(("all",))
        assert "mine" not in choose_scenarios(())
    finally:
        forget()


@pytest.mark.parametrize("standard", [True, False])
def test_a_data_file_says_whether_it_is_standard(tools, tmp_path, standard):
    write_scenario(replace(tools.scenario("candle"), standard=standard), tmp_path / "mine.toml")
    assert read_scenario(tmp_path / "mine.toml").standard is standard


def test_a_data_file_need_not_say(tools, tmp_path):
    path = tmp_path / "mine.toml"
    write_scenario(tools.scenario("candle"), path)
    path.write_text(path.read_text().replace("standard = false\n", ""))
    assert read_scenario(path).standard is False
