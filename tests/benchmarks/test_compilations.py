"""One compilation serves every object, channel and cooling scenario of a process."""

import pytest
from numba.core.event import install_recorder

from decayinfer.channels.registry import channel_names
from decayinfer.inference.compiled import derivations
from decayinfer.inference.engine import Engine
from decayinfer.inference.fit import fit_channel
from decayinfer.inference.settings import FitSettings

QUICK = FitSettings(draws=100, tune=50)


@pytest.mark.benchmark
def test_compilations(bench, say):
    """At most two models per process, and no machine code at all after the first fit."""
    fit_channel(bench.stars[0], "impurity+phonon+hall", "candle", QUICK)
    fits = 0
    with install_recorder("numba:compile") as recorder:
        for star in bench.stars:
            for scenario in ("candle", "slow-candle"):
                for channel in channel_names(rivals=False):
                    fit_channel(star, channel, scenario, QUICK)
                    fits += 1
    compiled = sum(event.is_start for _, event in recorder.buffer)
    say(
        f"{fits} fits: models compiled or loaded {Engine.compilations}, densities derived {len(derivations())}, "
        f"functions compiled after the first fit {compiled}"
    )
    assert Engine.compilations <= 2
    assert len(derivations()) <= 1
    assert compiled == 0
