"""The fake engine and catalogues for it."""

import importlib.util
import os
import subprocess
import sys
import types
from contextlib import contextmanager
from pathlib import Path

import pytest

import decayinfer
import decayinfer.inference
from decayinfer.catalog import read_table
from decayinfer.cooling import registry
from decayinfer.inference.settings import FitSettings

HERE = Path(__file__).parent


@pytest.fixture(scope="session")
def make_engine():
    """Put the fake engine in the place of the real one for a while."""

    @contextmanager
    def make():
        spec = importlib.util.spec_from_file_location("fake_engine", HERE / "fake_engine.py")
        module = importlib.util.module_from_spec(spec)
        spec.loader.exec_module(module)
        fake = types.SimpleNamespace(fit_channel=module.fit_channel)
        with pytest.MonkeyPatch.context() as patch:
            patch.setattr(decayinfer.inference, "fit", fake, raising=False)
            for scenario in module.scenarios():
                patch.setitem(registry._REGISTERED, scenario.name, scenario)
            yield module

    return make


@pytest.fixture
def engine(make_engine):
    """The fake engine in the place of the real one."""
    with make_engine() as module:
        yield module


@pytest.fixture(scope="session")
def catalogue():
    """Make a catalogue of objects with the given names."""

    def make(*names):
        from astropy.table import Table

        rows = [(name, 0.2 + 0.01 * k, 5e-14, 20.0 + k, 1.0) for k, name in enumerate(names)]
        heads = ("name", "period", "period_derivative", "braking_index", "braking_index_err")
        return read_table(Table(rows=rows, names=heads))

    return make


@pytest.fixture(scope="session")
def settings():
    """Short settings with one channel that is unreachable."""
    return FitSettings(
        channels=("constant", "phonon", "phonon+hall"), cooling=("cool", "warm"), draws=100, tune=50
    )


@pytest.fixture
def start_run():
    """Start fake_run.py in a process of its own."""
    started = []

    def start(out, *names, jobs=1, delay=0.0):
        environment = {**os.environ, "PYTHONPATH": str(Path(decayinfer.__file__).parents[1])}
        command = [sys.executable, str(HERE / "fake_run.py"), str(out), str(jobs), str(delay), *names]
        process = subprocess.Popen(
            command, env=environment, stdout=subprocess.PIPE, stderr=subprocess.PIPE, text=True
        )
        started.append(process)
        return process

    yield start
    for process in started:
        process.kill()
        process.communicate()
