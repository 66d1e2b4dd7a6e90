"""The command line as tests call it."""

import importlib.util
import types
from pathlib import Path

import pytest
from typer.testing import CliRunner

import decayinfer.inference
from decayinfer.cli import app
from decayinfer.cooling import registry


@pytest.fixture
def engine(monkeypatch):
    """The fake engine of tests/results in the place of the real one."""
    path = Path(__file__).parents[1] / "results" / "fake_engine.py"
    spec = importlib.util.spec_from_file_location("fake_engine", path)
    module = importlib.util.module_from_spec(spec)
    spec.loader.exec_module(module)
    fake = types.SimpleNamespace(fit_channel=module.fit_channel)
    monkeypatch.setattr(decayinfer.inference, "fit", fake, raising=False)
    for scenario in module.scenarios():
        monkeypatch.setitem(registry._REGISTERED, scenario.name, scenario)
    return module


@pytest.fixture
def run(tmp_path, monkeypatch):
    """Call the command line in an empty folder; a crash is a failure of the test."""
    monkeypatch.chdir(tmp_path)

    def call(*arguments):
        result = CliRunner().invoke(app, list(arguments))
        if result.exception is not None and not isinstance(result.exception, SystemExit):
            raise result.exception
        return result

    return call


@pytest.fixture
def table(tmp_path):
    """Write a CSV table of rows: name, period, period_derivative, braking_index, braking_index_err."""

    def write(*rows, name="table.csv", head="name,period,period_derivative,braking_index,braking_index_err"):
        (tmp_path / name).write_text("\n".join([head, *rows]) + "\n")
        return name

    return write
