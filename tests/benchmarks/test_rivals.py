"""What the rivals of decay cost next to the decay channels."""

import time

import pytest

from decayinfer.channels.registry import channel_names
from decayinfer.inference.fit import fit_channel
from decayinfer.inference.outcome import Status
from decayinfer.inference.settings import FitSettings


@pytest.mark.benchmark
@pytest.mark.parametrize("i", range(3))
def test_rivals_add_less_than_half_to_the_decay_channels(bench, say, i):
    """Processor time of whole fits under one scenario, all that a fit does included."""
    star, settings = bench.stars[i], FitSettings()
    for channel in ("phonon", "companion"):
        fit_channel(star, channel, bench.scenario, settings)  # loads what is loaded once
    spent = {}
    for rivals in (False, True):
        begun = time.process_time()
        fits = [fit_channel(star, name, bench.scenario, settings) for name in channel_names(rivals=rivals)]
        spent[rivals] = time.process_time() - begun
        assert all(fit.status is not Status.FAILED for fit in fits)
    say(
        f"{star.name}: rivals {spent[True]:.2f} s, others {spent[False]:.2f} s, ratio {spent[True] / spent[False]:.2f}"
    )
    assert spent[True] < 0.5 * spent[False]
