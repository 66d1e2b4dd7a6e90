"""Rows of the tables against the draws they come from."""

from dataclasses import replace

import arviz as az
import numpy as np
import pytest
from xarray import Dataset, DataTree

from decayinfer.catalog.pulsar import Pulsar
from decayinfer.inference.outcome import ChannelFit, ObjectFit, Status
from decayinfer.results.summary import summarise

PULSAR = Pulsar(
    name="A",
    period=0.2,
    period_derivative=5e-14,
    braking_index=20.0,
    braking_index_err_minus=1.0,
    braking_index_err_plus=2.0,
    flags=("old",),
)


def run(channel, ln_evidence, posterior, prior=None, scenario="s", flags=()):
    groups = {"posterior": posterior, "prior": prior or posterior}
    dims = ("chain", "draw")
    tree = {g: Dataset({k: (dims, v) for k, v in content.items()}) for g, content in groups.items()}
    return ChannelFit(
        "A", scenario, channel, Status.OK, ln_evidence=ln_evidence, ln_evidence_err=0.01, flags=flags,
        draws=DataTree.from_dict(tree),
    )  # fmt: skip


@pytest.fixture
def random():
    return np.random.default_rng(5)


def rows_of(rows, **labels):
    found = [row for row in rows if all(row[key] == value for key, value in labels.items())]
    assert len(found) == 1
    return found[0]


def test_a_run_s_row_holds_the_figures_of_its_draws(random, settings):
    mass, prior = random.normal(1.4, 0.1, (2, 500)), random.normal(1.3, 0.2, (2, 500))
    fit = run("phonon", -3.0, {"mass": mass}, {"mass": prior})
    rows = summarise(PULSAR, ObjectFit("A", (fit,), {"s": 1.0}), settings)
    row = rows_of(rows.parameters, scenario="s", channel="phonon", parameter="mass")
    for q in (5, 16, 50, 84, 95):
        assert row[f"q{q:02d}"] == np.quantile(mass, q / 100)
    for q in (5, 50, 95):
        assert row[f"prior_q{q:02d}"] == np.quantile(prior, q / 100)
    assert (row["mean"], row["sd"]) == (mass.mean(), mass.std(ddof=1))
    assert row["ess_bulk"] == float(az.ess(mass, method="bulk", chain_axis=0, draw_axis=1))
    assert row["r_hat"] == float(az.rhat(mass, chain_axis=0, draw_axis=1))
    assert (row["unit"], row["share"]) == ("Msun", 1.0)


def test_a_constant_has_no_mixing(random, settings):
    draws = {"mass": random.normal(1.4, 0.1, (2, 100)), "share_phonon": np.ones((2, 100))}
    rows = summarise(PULSAR, ObjectFit("A", (run("phonon", -3.0, draws),), {"s": 1.0}), settings)
    row = rows_of(rows.parameters, channel="phonon", parameter="share_phonon")
    assert row["q05"] == row["q95"] == 1.0
    assert np.isnan(row["ess_bulk"])
    assert np.isnan(row["r_hat"])


def test_averages_weigh_channels_and_state_their_share(random, settings):
    low, high = np.full((2, 100), 1.2), np.full((2, 100), 1.6)
    times = 10.0 ** random.normal(5.0, 0.3, (2, 100))
    fits = (run("hall", 0.0, {"mass": low}), run("phonon", np.log(3.0), {"mass": high, "phonon_time": times}))
    rows = summarise(PULSAR, ObjectFit("A", fits, {"s": 1.0}), settings)
    mass = rows_of(rows.parameters, scenario="averaged", channel="averaged", parameter="mass")
    assert mass["mean"] == pytest.approx(0.25 * 1.2 + 0.75 * 1.6)
    assert mass["prior_q50"] in (1.2, 1.6, pytest.approx(1.4))
    assert mass["share"] == pytest.approx(1.0)
    phonon_time = rows_of(rows.parameters, scenario="averaged", channel="averaged", parameter="phonon_time")
    assert phonon_time["share"] == pytest.approx(0.75)
    assert phonon_time["q50"] == pytest.approx(np.median(times))
    assert rows.objects["phonon_time_q50"] == phonon_time["q50"]


def test_averages_within_a_scenario_and_over_all(settings):
    fits = tuple(
        run("hall", z, {"mass": np.full((2, 100), m)}, scenario=s)
        for s, z, m in (("s", 0.0, 1.2), ("t", 0.0, 1.6))
    )
    rows = summarise(PULSAR, ObjectFit("A", fits, {"s": 0.9, "t": 0.1}), settings)
    means = {r["scenario"]: r["mean"] for r in rows.parameters if r["channel"] == "averaged"}
    assert means == pytest.approx({"s": 1.2, "t": 1.6, "averaged": 0.9 * 1.2 + 0.1 * 1.6})


def test_mixing_of_an_average(random, settings):
    a, b = random.normal(size=(2, 400)), random.normal(size=(2, 400))
    fits = (run("hall", 0.0, {"mass": a}), run("phonon", 0.0, {"mass": b}))
    rows = summarise(PULSAR, ObjectFit("A", fits, {"s": 1.0}), settings)
    ess = [float(az.ess(x, method="bulk", chain_axis=0, draw_axis=1)) for x in (a, b)]
    row = rows_of(rows.parameters, scenario="averaged", channel="averaged")
    assert row["ess_bulk"] == pytest.approx(1.0 / (0.25 / ess[0] + 0.25 / ess[1]))
    assert row["r_hat"] == max(float(az.rhat(x, chain_axis=0, draw_axis=1)) for x in (a, b))


def test_draws_resampled_from_weights_count_no_more_than_the_weights(random, settings):
    draws = {"mass": random.normal(1.4, 0.1, (2, 500))}
    found = {}
    for flag in ("retried", "topped-up"):
        fit = replace(run("hall", 0.0, draws, flags=(flag,)), ess_bulk_min=450.0)
        rows = summarise(PULSAR, ObjectFit("A", (fit,), {"s": 1.0}), settings)
        found[flag] = rows_of(rows.parameters, channel="hall")["ess_bulk"]
    assert found["retried"] > 600.0
    assert found["topped-up"] == 450.0


def test_the_averaged_prior_counts_unreachable_channels(settings):
    low, high = {"mass": np.full((2, 100), 1.2)}, {"mass": np.full((2, 100), 1.6)}
    far = run("hall", -np.inf, low)
    far = replace(
        far, status=Status.UNREACHABLE, draws=DataTree.from_dict({"prior": far.draws["prior"].dataset})
    )
    rows = summarise(PULSAR, ObjectFit("A", (far, run("phonon", 0.0, high)), {"s": 1.0}), settings)
    row = rows_of(rows.parameters, scenario="averaged", channel="averaged")
    assert (row["prior_q05"], row["prior_q95"]) == (1.2, 1.6)
    assert (row["q05"], row["q95"]) == (1.6, 1.6)


def test_flags_of_runs_that_matter_reach_the_object(random, settings):
    mass = {"mass": random.normal(1.4, 0.1, (2, 100))}
    fits = (
        run("hall", 0.0, mass),
        run("phonon", -2.0, mass, flags=("poor-mixing",)),
        run("impurity", -9.0, mass, flags=("evidence-noisy",)),
        run("impurity+hall", 0.0, mass, flags=("retried", "topped-up")),
        ChannelFit("A", "s", "constant", Status.FAILED, reason="why"),
    )
    rows = summarise(PULSAR, ObjectFit("A", fits, {"s": 1.0}), settings)
    assert rows.objects["flags"] == "failed,poor-mixing,old,prior-dominated"
    assert rows_of(rows.channels, channel="impurity")["flags"] == "evidence-noisy"
    assert rows_of(rows.channels, channel="constant")["flags"] == "failed"
    assert rows_of(rows.channels, channel="constant")["reason"] == "why"


def test_an_object_that_no_channel_reaches(settings):
    fits = tuple(ChannelFit("A", "s", c, Status.UNREACHABLE, ln_evidence=-np.inf) for c in ("hall", "phonon"))
    rows = summarise(PULSAR, ObjectFit("A", fits, {"s": 1.0}), settings)
    assert rows.objects["flags"] == "no-channel,old"
    assert rows.objects["best_channel"] == ""
    assert np.isnan(rows.objects["best_probability"])
    assert rows.parameters == ()
    assert len(rows.channels) == 2


def test_an_upper_limit_is_flagged(settings):
    limit = Pulsar(name="A", period=0.2, period_derivative=5e-14, braking_index_limit=30.0)
    rows = summarise(
        limit, ObjectFit("A", (run("hall", 0.0, {"mass": np.ones((2, 100))}),), {"s": 1.0}), settings
    )
    assert rows.objects["flags"] == "limit-only"
    assert rows.objects["limit"] == 30.0
