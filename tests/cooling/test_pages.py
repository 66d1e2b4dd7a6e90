"""The pages of docs/cooling against the data files and the solver."""

import re

import pytest

from decayinfer.cooling.recipes import RECIPES
from decayinfer.cooling.registry import load_scenario, scenario_names


def test_the_index_is_that_of_the_data_files(docs, script):
    text = (docs / "index.md").read_text(encoding="utf-8")
    assert text == script("make").page()
    assert set(re.findall(r"\(cards/(.+?)\.md\)", text)) == set(scenario_names())


@pytest.mark.parametrize(
    "name", ["candle", "bsk24-fading-iron", "bsk24-normal-iron-urca", "sly4-triplet-light"]
)
def test_cards_are_those_of_the_data_files_and_the_solver(docs, script, name):
    cards = script("cards")
    made = cards.card(load_scenario(name), cards.solve(name))
    assert (docs / "cards" / f"{name}.md").read_text(encoding="utf-8") == made


def test_every_card_says_what_it_must(docs, script):
    error_text = script("drawing").error_text
    for name in scenario_names():
        scenario, text = load_scenario(name), (docs / "cards" / f"{name}.md").read_text(encoding="utf-8")
        assert text.startswith(f"# {name}\n")
        assert f"({name}.svg)" in text
        assert all(f"- {source}\n" in text for source in scenario.sources)
        assert name not in RECIPES or error_text(scenario)[0] in text
        assert ("no solver behind it" in text) is scenario.provisional


def test_figures_are_small_and_bear_no_date(docs):
    figures = sorted(docs.rglob("*.svg"))
    assert {f.stem for f in figures} == {*scenario_names(), "standard", "surface_temperature"}
    for figure in figures:
        assert figure.stat().st_size < 60_000, figure.name
        assert "dc:date" not in figure.read_text(encoding="utf-8")
