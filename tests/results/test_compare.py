"""Bayes factors from stored evidences, and the density ratio as a second opinion."""

import numpy as np
import pytest
from scipy import stats

from decayinfer.cooling.registry import load_scenario
from decayinfer.errors import UnknownNameError
from decayinfer.inference.fit import fit_channel
from decayinfer.inference.priors import Priors
from decayinfer.inference.settings import FitSettings
from decayinfer.results.compare import HEADER, _ln_density_at_zero, compare, listing, savage_dickey
from decayinfer.results.read import read_run
from decayinfer.results.run import run_fit


@pytest.fixture
def run(tmp_path, engine, catalogue, settings):
    return read_run(run_fit(catalogue("A", "unreachable"), tmp_path / "run", settings).path)


def test_factors_are_ratios_of_the_stored_evidences(run):
    frame = run.compare("phonon", "phonon+hall").set_index(["object", "scenario"])
    stored = run.channels.set_index(["object", "scenario", "channel"]).ln_evidence
    for scenario in ("cool", "warm"):
        expected = stored["A", scenario, "phonon"] - stored["A", scenario, "phonon+hall"]
        assert frame.loc[("A", scenario)].ln_bayes_factor == pytest.approx(expected, rel=1e-6)
    weights = [load_scenario(scenario).weight for scenario in ("cool", "warm")]
    means = [
        np.average([np.exp(stored["A", scenario, c]) for scenario in ("cool", "warm")], weights=weights)
        for c in ("phonon", "phonon+hall")
    ]
    assert frame.loc[("A", "averaged")].ln_bayes_factor == pytest.approx(
        np.log(means[0] / means[1]), rel=1e-6
    )
    assert np.isnan(frame.loc[("unreachable", "averaged")].ln_bayes_factor)


def test_the_listing_fits_its_heads(run):
    rows = listing(compare(run, "phonon", "constant", objects=("A",)))
    assert all(len(row) == len(HEADER) for row in rows)
    assert [row[1] for row in rows] == ["cool", "warm", "averaged"]


def test_unknown_names_are_refused(run):
    with pytest.raises(UnknownNameError, match="no channel 'drift'"):
        run.compare("drift", "constant")
    with pytest.raises(UnknownNameError, match="no object 'B'"):
        compare(run, "phonon", "constant", objects=("B",))


def test_density_at_zero_of_a_gaussian():
    rng = np.random.default_rng(4)
    values = [_ln_density_at_zero(0.5 + rng.standard_normal(4000)) for _ in range(30)]
    found, errors = np.array(values).T
    assert np.mean(found) == pytest.approx(stats.norm.logpdf(0.5), abs=0.03)
    assert np.std(found) < 1.5 * np.mean(errors)
    assert np.isnan(_ln_density_at_zero(5.0 + rng.standard_normal(4000))[0])


def test_density_ratio_agrees_with_the_evidences(tools, own_scenarios):
    """The constant dipole within spin noise, quoted errors: two routes to one Bayes factor."""
    from dataclasses import replace

    settings = FitSettings(draws=8000, priors=Priors(scatter_sd=0.0))
    star = replace(tools.WREN, braking_index=4.5, braking_index_err_minus=3.0, braking_index_err_plus=3.0)
    noise = fit_channel(star, "spin-noise", "candle", settings)
    constant = fit_channel(star, "constant", "candle", settings)
    value, err = savage_dickey(noise, "noise")
    total = 3.0 * np.hypot(err, noise.ln_evidence_err)
    assert abs(value - (constant.ln_evidence - noise.ln_evidence)) < total
    assert total < 0.5
