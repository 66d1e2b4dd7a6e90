"""The inference does not notice that a closed form stands in for the solver.

The full comparison is tests/studies/fit_against_solver.py, with its result beside it.
"""

import json
from pathlib import Path

import numpy as np
import pytest

from decayinfer.channels.registry import load_channel
from decayinfer.cooling.recipes import RECIPES
from decayinfer.cooling.registry import load_scenario
from decayinfer.inference.fit import fit_channel
from decayinfer.inference.priors import Priors
from decayinfer.inference.problem import make_problem
from decayinfer.inference.settings import FitSettings

STUDIES = Path(__file__).parents[1] / "studies"
LARGEST = 0.1  # posterior standard deviations
#: With triplet pairing fits may err by 5 per cent: the mean birth field of the young object moves by up to 0.11, and
#: its quantiles by twice as much. Held here as measured.
LARGEST_TRIPLET, LARGEST_TRIPLET_QUANTILE = 0.12, 0.25


@pytest.fixture(scope="module")
def against_solver(study):
    return study("fit_against_solver")


@pytest.fixture(scope="module")
def drawn(against_solver):
    """Draws of one posterior in every process at once, under the worst fit of the standard set."""
    scenario, channel = "bsk24-fading-iron", load_channel("impurity+phonon+hall")
    star = against_solver.OBJECTS[1]
    fit = fit_channel(star, channel.name, scenario, FitSettings(draws=300))
    numbers = make_problem(star, channel, load_scenario(scenario), Priors())
    return fit.draws["posterior"]["coordinates"].values.reshape(-1, 8), numbers, channel


@pytest.mark.parametrize("nodes", ["COARSE", "FINE"])
def test_the_fit_in_place_of_the_solver_changes_nothing(against_solver, drawn, nodes):
    """The comparison's own equations and search for the age give the density of the package, to 1e-6."""
    points, numbers, channel = drawn
    itself = against_solver.AsFitted(load_scenario("bsk24-fading-iron"))
    before, after, ln_ratio = against_solver.reweigh(
        points, numbers, channel, itself, getattr(against_solver, nodes)
    )
    assert np.abs(ln_ratio).max() < 1e-6
    for name in before:
        np.testing.assert_allclose(after[name], before[name], rtol=1e-6)
    json.dumps([against_solver.moves(before, after, ln_ratio)])


def test_another_scenario_does_not_pass_for_the_solver(against_solver, drawn):
    """Negative control: the temperatures of stars without pairing move the posterior."""
    points, numbers, channel = drawn
    other = against_solver.AsFitted(load_scenario("bsk24-normal-iron"))
    before, after, ln_ratio = against_solver.reweigh(points, numbers, channel, other, against_solver.COARSE)
    assert abs(against_solver.moves(before, after, ln_ratio)["worst_shift"]) > 3.0 * LARGEST


@pytest.mark.slow
def test_one_object_under_the_worst_standard_fit(against_solver):
    scenario, star = "bsk24-fading-iron", against_solver.OBJECTS[2]
    solved = against_solver.Solver(RECIPES[scenario])
    assert solved.left_out_error() < 1e-3  # the fit itself errs by nearly 1e-2
    (row,) = against_solver.compare(star, scenario, "phonon", {"solver": solved})
    assert row["converged"]
    assert abs(row["worst_shift"]) < LARGEST
    assert row["noise"] < 0.03


@pytest.fixture(scope="module")
def record():
    return json.loads((STUDIES / "fit_against_solver.json").read_text(encoding="utf-8"))


def test_the_full_study_is_of_every_scenario(record, against_solver):
    """Three objects and two channels each; triplet pairing a second time, for the nodes of the history."""
    found = [(row["against"], row["scenario"], row["object"], row["channel"]) for row in record["rows"]]
    sides = [("solver", name) for name in RECIPES]
    sides += [("nodes", name) for name, recipe in RECIPES.items() if recipe.superfluidity == "triplet"]
    expected = [
        (*side, star.name, channel)
        for side in sides
        for star in against_solver.OBJECTS
        for channel in against_solver.CHANNELS
    ]
    assert sorted(found) == sorted(expected)


def test_the_full_study_is_sound(record):
    for row in record["rows"]:
        assert row["converged"], row
        assert {"mass", "age", "birth_field", "phonon_time", "crust_temperature"} <= set(row["shifts"])
        assert row["noise"] < 0.03, row
        assert row["effective_share"] > 0.9, row  # the two densities are nearly one


def test_no_parameter_moves_under_the_solver_in_the_full_study(record):
    """Neither mean nor quantile by a tenth of the standard deviation, in the 20 scenarios without triplet pairing."""
    for row in record["rows"]:
        if "triplet" not in row["scenario"]:
            for moves in (row["shifts"], row["quantile_shifts"]):
                assert all(abs(move) < LARGEST for move in moves.values()), row


def test_the_nodes_of_the_history_move_nothing_with_triplet_pairing(record):
    """The onset is sharper than 36 nodes follow; 240 in their place move no parameter by a fiftieth."""
    for row in record["rows"]:
        if row["against"] == "nodes":
            for moves in (row["shifts"], row["quantile_shifts"]):
                assert all(abs(move) < 0.02 for move in moves.values()), row


def test_triplet_pairing_is_the_worst_of_the_full_study(record):
    rows = [row for row in record["rows"] if row["against"] == "solver" and "triplet" in row["scenario"]]
    for row in rows:
        assert all(abs(move) < LARGEST_TRIPLET for move in row["shifts"].values()), row
        assert all(abs(move) < LARGEST_TRIPLET_QUANTILE for move in row["quantile_shifts"].values()), row
