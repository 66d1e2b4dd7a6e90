"""Which cooling scenario an object prefers: hand numbers, the tables of a run, and the words of the verdict."""

from dataclasses import replace

import numpy as np
import pytest
from astropy.table import Table
from xarray import Dataset, DataTree

from decayinfer.catalog.pulsar import Pulsar
from decayinfer.inference.outcome import ChannelFit, ObjectFit, Status
from decayinfer.results.average import channel_probabilities
from decayinfer.results.preference import best_scenario, mass_of, preferences, scenario_rows
from decayinfer.results.read import read_run
from decayinfer.results.run import run_fit
from decayinfer.results.summary import summarise
from decayinfer.results.tables import SCENARIO_COLUMNS, object_columns
from decayinfer.results.verdict import Interval, verdict

PULSAR = Pulsar(
    name="A",
    period=0.2,
    period_derivative=5e-14,
    braking_index=20.0,
    braking_index_err_minus=1.0,
    braking_index_err_plus=1.0,
)
SHAPE = (2, 2000)


def run(scenario, channel, ln_evidence, mass=1.4, prior=1.3, err=0.0):
    """Normal draws of the mass, 0.1 wide about the posterior median and 0.2 about that of the prior."""
    random = np.random.default_rng([*f"{scenario}{channel}".encode()])
    groups = {"posterior": random.normal(mass, 0.1, SHAPE), "prior": random.normal(prior, 0.2, SHAPE)}
    if ln_evidence == -np.inf:
        groups = {"prior": groups["prior"]}
    status = Status.UNREACHABLE if ln_evidence == -np.inf else Status.OK
    draws = {g: Dataset({"mass": (("chain", "draw"), m)}) for g, m in groups.items()}
    draws = DataTree.from_dict(draws)
    return ChannelFit(
        "A", scenario, channel, status, ln_evidence=ln_evidence, ln_evidence_err=err, draws=draws
    )


def failed(scenario, channel):
    return ChannelFit("A", scenario, channel, Status.FAILED, reason="x")


def made(*fits, weights=None, odds=None):
    fit = ObjectFit("A", fits, weights or {"cool": 0.5, "warm": 0.5})
    p = channel_probabilities(fit, odds)
    return preferences(fit, p, mass_of(p, seed=1, name="A"), seed=1)


@pytest.fixture
def spread():
    """Two scenarios whose masses are 0.3 Msun apart, at odds of 4:1."""
    ln = {"cool": np.log([0.1, 0.7]), "warm": np.log([0.05, 0.15])}
    return made(
        *(run(s, c, z, {"cool": 1.3, "warm": 1.6}[s]) for s in ln for c, z in zip("ab", ln[s], strict=True))
    )


def test_evidence_is_averaged_over_channels_and_weighed(spread):
    cool, warm = spread
    assert (cool.ln_evidence, warm.ln_evidence) == pytest.approx((np.log(0.4), np.log(0.1)))
    assert (cool.probability, warm.probability) == pytest.approx((0.8, 0.2))
    assert best_scenario(spread).scenario == "cool"


def test_weights_and_prior_odds_count():
    fits = [run(s, c, np.log(z)) for s, c, z in (("cool", "a", 0.2), ("cool", "b", 0.8), ("warm", "a", 0.6))]
    fits.append(run("warm", "b", np.log(0.4)))
    cool, warm = made(*fits, weights={"cool": 0.1, "warm": 0.9}, odds={"a": 3.0})
    assert np.exp([cool.ln_evidence, warm.ln_evidence]) == pytest.approx([0.35, 0.55])
    assert cool.probability == pytest.approx(0.1 * 0.35 / (0.1 * 0.35 + 0.9 * 0.55))
    assert cool.weight == 0.1


def test_errors_by_hand():
    """d ln Z = share-weighted errors; dp = p (1 - p) d ln(Z_cool/Z_warm)."""
    fits = [run("cool", c, np.log(0.5), err=e) for c, e in (("a", 0.06), ("b", 0.08))]
    cool, warm = made(*fits, run("warm", "a", np.log(0.5)), run("warm", "b", np.log(0.5)))
    assert cool.ln_evidence_err == pytest.approx(0.05)
    assert warm.ln_evidence_err == 0.0
    assert cool.probability_err == pytest.approx(0.25 * 0.05)


def test_shifts_of_the_mass(spread):
    """Medians at 1.3 (80 %) and 1.6 (20 %), 0.1 wide each: the mixture has sd sqrt(0.01 + 0.16 * 0.09) = 0.156."""
    cool, warm = spread
    assert warm.mass_shift - cool.mass_shift == pytest.approx(0.3 / np.sqrt(0.0244), rel=0.03)
    assert cool.mass_shift < 0.0 < warm.mass_shift
    assert cool.mass.prior_shift == pytest.approx(0.0, abs=0.05)
    assert warm.mass.prior_shift == pytest.approx(1.5, abs=0.08)


def test_unreachable_and_failed_scenarios():
    three = {"cool": 0.4, "warm": 0.4, "odd": 0.2}
    cool, warm, odd = made(
        run("cool", "a", -3.0), run("warm", "a", -np.inf), failed("odd", "a"), weights=three
    )
    assert (cool.probability, warm.probability) == (1.0, 0.0)
    assert (warm.ln_evidence, warm.ln_evidence_err) == (-np.inf, 0.0)
    assert np.isnan([warm.mass_shift, warm.mass.prior_shift, odd.ln_evidence, odd.probability]).all()
    assert [each.failed for each in (cool, warm, odd)] == [0, 0, 1]
    row = scenario_rows("A", (warm,))[0]
    assert np.isnan([row["mass_q50"], row["mass_prior_q50"]]).all()


def test_nothing_is_preferred_when_nothing_is_known(settings):
    fits = run("cool", "hall", -np.inf), run("warm", "hall", -np.inf)
    assert best_scenario(made(*fits)) is None
    rows = summarise(PULSAR, ObjectFit("A", fits, {"cool": 0.5, "warm": 0.5}), settings)
    assert rows.objects["best_scenario"] == ""
    assert np.isnan(rows.objects["best_scenario_probability"])
    assert len(rows.scenarios) == 2


def test_rows_agree_with_the_other_tables(tmp_path, engine, catalogue, settings):
    """Probabilities are sums of channels.ecsv; masses are those of parameters.ecsv, averaged over channels."""
    found = read_run(run_fit(catalogue("A", "unreachable", "broken"), tmp_path / "run", settings).path)
    table = found.table("scenarios")
    assert table.colnames == [column.name for column in SCENARIO_COLUMNS]
    assert str(table["mass_q50"].unit) == "solMass"
    assert list(zip(table["object"], table["scenario"], strict=True)) == [
        (name, s) for name in ("A", "unreachable", "broken") for s in ("cool", "warm")
    ]
    rows = found.scenarios.set_index(["object", "scenario"])
    sums = found.channels.groupby(["object", "scenario"])["probability"].sum()
    parameters = found.parameters.set_index(["object", "scenario", "channel", "parameter"])
    for scenario in ("cool", "warm"):
        row, other = rows.loc[("A", scenario)], parameters.loc[("A", scenario, "averaged", "mass")]
        assert row["probability"] == pytest.approx(sums["A", scenario], abs=1e-9)
        for q in ("q05", "q50", "q95"):
            assert row[f"mass_{q}"] == other[q]
            assert row[f"mass_prior_{q}"] == other[f"prior_{q}"]
        whole = parameters.loc[("A", "averaged", "averaged", "mass")]
        assert row["mass_shift"] == pytest.approx((other["q50"] - whole["q50"]) / whole["sd"], rel=1e-6)
    assert set(rows.loc["broken"]["failed"]) == {len(settings.channels)}
    objects = found.objects.set_index("object")
    best = rows.loc["A"]["probability"].idxmax()
    assert objects.loc["A", "best_scenario"] == best
    assert objects.loc["A", "best_scenario_probability"] == rows.loc[("A", best), "probability"]
    assert list(objects.loc[["unreachable", "broken"], "best_scenario"]) == ["", ""]


def test_columns_begin_as_described():
    names = [column.name for column in SCENARIO_COLUMNS]
    head = "object scenario weight ln_evidence ln_evidence_err probability mass_q05 mass_q50 mass_q95"
    tail = "mass_prior_q05 mass_prior_q50 mass_prior_q95 mass_shift prior_shift"
    assert names[:14] == f"{head} {tail}".split()
    assert {"best_scenario", "best_scenario_probability"} <= {c.name for c in object_columns(("hall",))}


def said(fits, preferred, prior_shift=0.0):
    p = channel_probabilities(ObjectFit("A", fits, {"cool": 0.5, "warm": 0.5}))
    return verdict(p, Interval(), Interval(), preferred=preferred, prior_shift=prior_shift)


def test_the_verdict_names_what_is_notable(spread):
    fits = (run("cool", "hall", 0.0), run("warm", "hall", 0.0))
    words = said(fits, spread, prior_shift=-0.8)
    assert "the median mass lies 0.8 prior standard deviations below that of its prior" in words
    assert "cooling scenario cool preferred (0.80), odds 4.0:1 over warm" in words
    assert "the mass moves by 1.9 standard deviations between cooling scenarios" in words
    assert "(median 1.30 Msun under cool, 1.60 under warm)" in words


def test_the_verdict_keeps_silent_otherwise(spread):
    fits = (run("cool", "hall", 0.0), run("warm", "hall", 0.0))
    cool, warm = spread
    near = replace(warm, mass_shift=cool.mass_shift + 0.4)
    assert "moves" not in said(fits, (cool, near), prior_shift=0.4)
    assert "prior standard" not in said(fits, (cool, near), prior_shift=0.4)
    close = replace(warm, probability=0.4)
    assert "preferred" not in said(fits, (replace(cool, probability=0.6), close))
    assert "preferred" not in said(fits, (cool, replace(warm, failed=1)))
    improbable = replace(warm, probability=0.005)
    assert "moves" not in said(fits, (replace(cool, probability=0.995), improbable))
    assert "cooling" not in said(fits, (cool,))


def test_a_run_says_how_far_the_mass_moves(settings):
    fits = (run("cool", "hall", 0.0, 1.2), run("warm", "hall", 0.0, 1.7))
    rows = summarise(PULSAR, ObjectFit("A", fits, {"cool": 0.5, "warm": 0.5}), settings)
    assert "the mass moves by" in rows.objects["verdict"]
    assert "preferred" not in rows.objects["verdict"]


def test_text_survives_the_file(tmp_path, engine, catalogue, settings):
    path = run_fit(catalogue("A"), tmp_path / "run", settings).path
    assert list(Table.read(path / "scenarios.ecsv", format="ascii.ecsv")["scenario"]) == ["cool", "warm"]
