"""Six pulsars of one timing programme (Parthasarathy et al. 2019, MNRAS 489, 3810; digits from the ATNF Pulsar
Catalogue v1.67), among them a negative and an absurdly large index, through every channel.
"""

from pathlib import Path

import numpy as np
import pytest

from decayinfer.catalog import read_table
from decayinfer.catalog.pulsar import Pulsar
from decayinfer.channels.registry import channel_names
from decayinfer.inference.fit import fit_channel, fit_object
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
                weighted = run.channel in channel_names(rivals=True)  # no chains, no R-hat
                assert np.isnan(run.r_hat_max) if weighted else run.r_hat_max <= 1.01, (run.name, run.channel)
                assert run.ess_bulk_min >= 400, (run.name, run.channel)
                assert run.divergences <= 0.005 * SETTINGS.draws * SETTINGS.chains, (run.name, run.channel)
                assert run.ln_evidence_err <= 0.05, (run.name, run.channel)


@pytest.mark.slow
@pytest.mark.parametrize("name", [NEGATIVE, ABSURD])
def test_what_decay_cannot_reach_says_so(fits, name):
    for run in fits[name].fits:
        if run.channel in channel_names(rivals=False):
            assert run.status is Status.UNREACHABLE, (run.channel, run.status)
            assert "total errors" in run.reason
            assert run.ln_evidence == -np.inf


@pytest.mark.slow
@pytest.mark.parametrize("name", [NEGATIVE, ABSURD])
def test_noise_and_companions_reach_what_decay_cannot(fits, name):
    """All the probability goes to the rivals, a negative index to those of either sign."""
    found = {run.channel: run for run in fits[name].fits if run.status is Status.OK}
    assert {"spin-noise", "companion"} <= set(found) <= set(channel_names(rivals=True))
    total = np.logaddexp.reduce([run.ln_evidence for run in found.values()])
    either = np.logaddexp(found["spin-noise"].ln_evidence, found["companion"].ln_evidence)
    assert either - total > np.log(0.99 if name == NEGATIVE else 0.05)
    assert np.median(found["spin-noise"].posterior("index_excess")) == pytest.approx(
        -17.6 if name == NEGATIVE else 2884.0, rel=0.1
    )


def test_alignment_in_plasma_is_a_live_rival_for_an_index_of_3_15():
    """PSR J1640-4631, n = 3.15(3), Archibald et al. 2016, ApJ 819, L16; P and Pdot from the ATNF catalogue v1.67."""
    star = Pulsar(
        name="J1640-4631", period=0.206443048, period_derivative=9.759690e-13, braking_index=3.15,
        braking_index_err_minus=0.03, braking_index_err_plus=0.03,
    )  # fmt: skip
    fits = {name: fit_channel(star, name, "candle", SETTINGS) for name in channel_names(rivals=True)}
    assert all(run.status is Status.OK for run in fits.values())
    total = np.logaddexp.reduce([run.ln_evidence for run in fits.values()])
    assert np.exp(fits["obliquity-plasma"].ln_evidence - total) > 0.2
    angle = fits["obliquity-plasma"].posterior("obliquity")
    # 3.15 is met on either side of the maximum at sin^2 a = 1/3
    assert np.mean(angle < 35.26) > 0.05
    assert np.mean(angle > 35.26) > 0.05


@pytest.mark.slow
def test_an_ordinary_index_is_reached_by_decay(fits):
    """n = 23.5 at 51 kyr (J1809-1917): every sum of channels can give it, a constant dipole cannot."""
    by_channel = {run.channel: run for run in fits["J1809-1917"].fits}
    assert by_channel["constant"].status is Status.UNREACHABLE
    assert by_channel["impurity+phonon+hall"].status is Status.OK
