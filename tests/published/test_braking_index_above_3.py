"""Six pulsars of one timing programme (Parthasarathy et al. 2019, MNRAS 489, 3810; digits from the ATNF Pulsar
Catalogue v1.67), among them a negative and an absurdly large index, through every channel.
"""

from pathlib import Path

import numpy as np
import pytest

from decayinfer.catalog import read_table
from decayinfer.channels.registry import channel_names
from decayinfer.inference.fit import fit_object
from decayinfer.inference.outcome import Status
from decayinfer.inference.settings import FitSettings

TABLE = Path(__file__).parents[1] / "data" / "braking_index_above_3.csv"
COLUMNS = {
    "name": "psr", "frequency": "f0_hz", "frequency_derivative": "f1_hz_s",
    "frequency_second_derivative": "f2_hz_s2", "frequency_second_derivative_err": "f2_err",
}  # fmt: skip
NEGATIVE, ABSURD = "J1833-0827", "J0857-4424"
SETTINGS = FitSettings(cooling=("candle",))


@pytest.fixture(scope="module")
def fits():
    catalog = read_table(TABLE, columns=COLUMNS)
    assert len(catalog) == 6
    return {pulsar.name: fit_object(pulsar, SETTINGS) for pulsar in catalog.pulsars}


@pytest.mark.slow
def test_no_run_fails(fits):
    for fit in fits.values():
        assert len(fit.fits) == len(channel_names())
        for run in fit.fits:
            assert run.status is not Status.FAILED, (run.name, run.channel, run.reason)


@pytest.mark.slow
def test_quality_of_what_is_called_ok(fits):
    """R-hat at most 1.01, bulk ESS at least 400, divergences at most 0.5 % of the draws."""
    for fit in fits.values():
        for run in fit.fits:
            if run.status is Status.OK:
                assert run.r_hat_max <= 1.01, (run.name, run.channel)
                assert run.ess_bulk_min >= 400, (run.name, run.channel)
                assert run.divergences <= 0.005 * SETTINGS.draws * SETTINGS.chains, (run.name, run.channel)
                assert run.ln_evidence_err <= 0.05, (run.name, run.channel)


@pytest.mark.slow
@pytest.mark.parametrize("name", [NEGATIVE, ABSURD])
def test_what_decay_cannot_reach_says_so(fits, name):
    for run in fits[name].fits:
        assert run.status is Status.UNREACHABLE, (run.channel, run.status)
        assert "total errors" in run.reason
        assert run.ln_evidence == -np.inf


@pytest.mark.slow
def test_an_ordinary_index_is_reached_by_decay(fits):
    """n = 23.5 at 51 kyr (J1809-1917): every sum of channels can give it, a constant dipole cannot."""
    by_channel = {run.channel: run for run in fits["J1809-1917"].fits}
    assert by_channel["constant"].status is Status.UNREACHABLE
    assert by_channel["impurity+phonon+hall"].status is Status.OK
