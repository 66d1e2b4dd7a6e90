"""Published indices below 3, the paper of each in the file: nothing secular that is built in gives them."""

from pathlib import Path

import pytest
from astropy.table import Table

from decayinfer.catalog.pulsar import Pulsar
from decayinfer.channels.registry import channel_names, load_channel
from decayinfer.inference.fit import fit_object
from decayinfer.inference.outcome import Status
from decayinfer.inference.settings import FitSettings
from decayinfer.results.summary import summarise

TABLE = Path(__file__).parents[1] / "data" / "braking_index_below_3.csv"
#: All channels; of the decay channels one, since all share the reach below 3.
SETTINGS = FitSettings(
    draws=400, tune=200, cooling=("candle",), channels=("constant", "phonon", *channel_names(rivals=True))
)


def classic():
    """The rows well below 3: by more than five of the total errors that a fit counts with."""
    table = Table.read(TABLE)
    return [row for row in table if row["n"] < 3.0 - 14.0 * row["n_err"]]


@pytest.mark.slow
@pytest.mark.parametrize("row", classic(), ids=lambda row: f"{row['psr']}-{row['n']}")
def test_no_secular_channel_reaches_a_classic_index(own_scenarios, row):
    star = Pulsar(
        name=str(row["psr"]), period=float(row["period_s"]), period_derivative=float(row["period_derivative"]),
        braking_index=float(row["n"]), braking_index_err_minus=float(row["n_err"]),
        braking_index_err_plus=float(row["n_err"]),
    )  # fmt: skip
    fit = fit_object(star, SETTINGS)
    for run in fit.fits:
        if load_channel(run.channel).secular:
            assert run.status is Status.UNREACHABLE, run.channel
            assert "total errors below 3" in run.reason
        else:
            assert run.status is not Status.FAILED, (run.channel, run.reason)
    rows = summarise(star, fit, SETTINGS)
    assert "no secular channel reaches this index" in rows.objects["verdict"]
    assert rows.objects["probability_any_decay"] == 0.0
