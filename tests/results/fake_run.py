"""Fit a made-up catalogue with the fake engine, in a process that a test may kill.

Usage: fake_run.py OUT JOBS DELAY NAME...
"""

import sys
import types
from pathlib import Path

sys.path.insert(0, str(Path(__file__).parent))

import fake_engine

import decayinfer.inference
from decayinfer.catalog import read_table
from decayinfer.cooling.registry import register_scenario

if __name__ in (
    "__main__",
    "__mp_main__",
):  # parallel processes import this file too
    fake_engine.delay = float(sys.argv[3])
    for scenario in fake_engine.scenarios():
        register_scenario(scenario)
    decayinfer.inference.fit = types.SimpleNamespace(fit_channel=fake_engine.fit_channel)


CHANNELS = ("constant", "phonon", "phonon+hall")


def catalogue(names):
    """Return a catalogue of objects with these names."""
    from astropy.table import Table

    rows = [(name, 0.2 + 0.01 * k, 5e-14, 20.0 + k, 1.0) for k, name in enumerate(names)]
    heads = ("name", "period", "period_derivative", "braking_index", "braking_index_err")
    return read_table(Table(rows=rows, names=heads))


if __name__ == "__main__":
    from decayinfer.inference.settings import FitSettings
    from decayinfer.results.run import run_fit

    settings = FitSettings(channels=CHANNELS, cooling=("cool", "warm"), draws=100, tune=50)
    run_fit(catalogue(sys.argv[4:]), sys.argv[1], settings, jobs=int(sys.argv[2]))
