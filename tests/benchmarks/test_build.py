"""What it takes to solve and fit every cooling scenario from scratch."""

import resource
import subprocess
import sys

import pytest

from decayinfer.cooling.recipes import RECIPES


def kind(recipe):
    """Scenarios of a kind have the same number of terms, and cost alike."""
    if recipe.direct_urca:
        return "direct Urca"
    return "many terms" if recipe.superfluidity in ("fading", "triplet") else "few terms"


def processor_seconds():
    used = resource.getrusage(resource.RUSAGE_CHILDREN)
    return used.ru_utime + used.ru_stime


@pytest.mark.benchmark
def test_every_scenario_is_built_in_minutes(tmp_path, say):
    """By the documented command, one of each kind, times their number, on two cores: under a quarter of an hour."""
    total = 0.0
    for name in ("sly4-protons-light", "apr4-triplet-iron", "bsk24-normal-iron-urca"):
        command = [
            sys.executable,
            "-m",
            "decayinfer.cooling.build",
            name,
            "--jobs",
            "1",
            "--out",
            str(tmp_path),
        ]
        begun = processor_seconds()
        subprocess.run(command, check=True, capture_output=True)
        assert (tmp_path / f"{name}.toml").is_file()
        seconds = processor_seconds() - begun
        alike = sum(kind(recipe) == kind(RECIPES[name]) for recipe in RECIPES.values())
        say(f"{kind(RECIPES[name]):12} {seconds:.0f} s of processor time each, {alike} of them")
        total += alike * seconds
    say(f"all {len(RECIPES)} on two cores: {total / 120.0:.0f} min")
    assert total / 120.0 < 15.0
