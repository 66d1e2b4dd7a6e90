"""Channel probabilities under other readings, priors and scenarios."""

import numpy as np
import pytest

from decayinfer.inference.outcome import ChannelFit, ObjectFit, Status
from decayinfer.results.average import channel_probabilities
from decayinfer.results.sensitivity import ANY_DECAY, average_evidence, sensitivity_rows, trials
from decayinfer.results.verdict import Interval, verdict

WEIGHTS = {"cool": 0.5, "warm": 0.5}


def run(channel, scenario, value, **variants):
    status = Status.OK if np.isfinite(value) else Status.UNREACHABLE
    pairs = {name.replace("_", "-"): (v, 0.02) for name, v in variants.items()}
    return ChannelFit(
        "Teal", scenario, channel, status, ln_evidence=value, ln_evidence_err=0.01, variants=pairs
    )


def wren(noise=-4.0):
    """Decay well ahead as quoted; with noise, whatever the argument makes of it."""
    decay = {"quoted": -2.0, "with_noise": noise, "tight": -1.0, "wide": -3.0}
    rival = {"quoted": -5.0, "with_noise": -4.0, "tight": -4.5, "wide": -5.0}
    fits = []
    for scenario in WEIGHTS:
        fits.append(run("constant", scenario, -np.inf, with_noise=-4.0))
        fits.append(run("phonon", scenario, -2.0, **decay))
        fits.append(run("spin-noise", scenario, -4.5, **rival))
    return ObjectFit("Teal", tuple(fits), WEIGHTS)


def test_every_assumption_is_tried():
    made = trials(wren())
    assert [(t.kind, t.name) for t in made] == [
        ("reading", "scattered"), ("reading", "quoted"), ("reading", "with-noise"), ("priors", "tight"),
        ("priors", "wide"), ("scenarios", "without cool"), ("scenarios", "without warm"),
    ]  # fmt: skip


def test_probabilities_follow_the_variant():
    """Odds are ratios of evidences; a constant dipole out of reach comes within it when noise is added."""
    made = {t.name: t for t in trials(wren())}
    assert made["quoted"].decay()[0] == pytest.approx(1.0 / (1.0 + np.exp(-3.0)))
    assert made["tight"].decay()[0] == pytest.approx(1.0 / (1.0 + np.exp(-3.5)))
    assert made["with-noise"].decay()[0] == pytest.approx(1.0 / 3.0)
    assert made["with-noise"].probabilities.of_channel("constant")[0] == pytest.approx(1.0 / 3.0)
    assert made["scattered"].probabilities.of_channel("constant")[0] == 0.0


def test_rows_hold_every_channel_and_all_decay():
    rows = sensitivity_rows(wren(), trials(wren()))
    assert len(rows) == 7 * 4
    first = [row for row in rows if row["setting"] == "quoted"]
    assert [row["channel"] for row in first] == ["constant", "phonon", "spin-noise", ANY_DECAY]
    assert sum(row["probability"] for row in first[:3]) == pytest.approx(1.0)


def test_evidence_is_averaged_by_weight():
    runs = [run("phonon", "cool", -1.0), run("phonon", "warm", -3.0)]
    value, err = average_evidence(runs, {"cool": 0.75, "warm": 0.25})
    assert value == pytest.approx(np.log(0.75 * np.exp(-1.0) + 0.25 * np.exp(-3.0)))
    assert 0.0 < err < 0.01


def words(fit):
    return verdict(channel_probabilities(fit), Interval(), Interval(), trials(fit))


def test_the_verdict_says_whether_the_readings_agree():
    assert "readings differ on decay: 0.95 with the quoted error" in words(wren())
    assert "all readings of n agree on decay" in words(wren(noise=-1.0))
    assert "decay as a whole has 0.92" in words(wren())


def test_the_verdict_says_when_nothing_can_be_told_apart():
    fits = (run("phonon", "cool", -2.0), run("spin-noise", "cool", -2.5))
    fit = ObjectFit("Teal", fits, {"cool": 1.0})
    assert "decay and spin-noise cannot be told apart (odds 1.6:1)" in words(fit)


def test_a_scenario_that_turns_the_majority_is_named():
    fits = (
        run("phonon", "cool", 0.0), run("spin-noise", "cool", -4.0), run("phonon", "warm", -9.0),
        run("spin-noise", "warm", -1.5),
    )  # fmt: skip
    said = words(ObjectFit("Teal", fits, WEIGHTS))
    assert "which side of one half decay is on changes (without cool: 0.00)" in said
