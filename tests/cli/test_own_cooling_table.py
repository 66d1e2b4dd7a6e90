"""fit --cooling TABLE: curves of the user's own become a scenario."""

from dataclasses import replace
from functools import partial
from pathlib import Path

import numpy as np
import pytest

from decayinfer.cooling import registry, user_table
from decayinfer.results.read import read_run

GOOD = "A,0.2,5e-14,20.0,1.0"
SHORT = ("--channels", "constant,phonon", "--draws", "100", "--tune", "50")


@pytest.fixture(autouse=True)
def registered(monkeypatch):
    """Fits with one start, which is enough for these curves; the registry as it was afterwards."""
    monkeypatch.setattr(user_table, "scenario_from_table", partial(user_table.scenario_from_table, starts=1))
    monkeypatch.setattr(registry, "_REGISTERED", dict(registry._REGISTERED))


@pytest.fixture
def curves(tmp_path):
    """Write an invented history, neutrino era and photon era, for five masses."""

    def write(name="my curves.csv", factor=1.0):
        age, mass = (a.ravel() for a in np.meshgrid(np.geomspace(300, 1e7, 25), (1.0, 1.25, 1.5, 1.75, 2.0)))
        late = (1 + age / 2e5) ** (1.5 * factor)
        temperature = 2.5e8 * (1.6 - 0.3 * mass) * (age / 1e3) ** (-factor / 6) / late
        rows = np.column_stack([age, mass, temperature])
        np.savetxt(tmp_path / name, rows, delimiter=",", header="age,mass,temperature", comments="")
        return name

    return write


def test_a_table_is_fitted_and_used_beside_other_scenarios(run, table, curves, engine):
    command = ("fit", table(GOOD), "--out", "run", "--cooling", f"{curves()},cool", *SHORT)
    result = run(*command)
    assert result.exit_code == 0
    assert "my curves.csv is the cooling scenario my-curves, fitted to 0." in result.stderr
    assert set(read_run("run").channels.scenario) == {"my-curves", "cool"}


def test_the_same_command_goes_on_unless_the_table_has_changed(run, table, curves, engine, monkeypatch):
    def quick(path, *, name):
        shipped = registry.load_scenario("bsk24-normal-iron")
        return replace(shipped, name=name, description=Path(path).read_text())

    monkeypatch.setattr(user_table, "scenario_from_table", quick)
    command = ("fit", table(GOOD), "--out", "run", "--cooling", curves(), *SHORT)

    def again():
        monkeypatch.setattr(registry, "_REGISTERED", {})  # as in a new process
        return run(*command).stdout

    assert "2 posterior runs made, 0 found" in again()
    assert "0 posterior runs made, 2 found" in again()
    curves(factor=0.9)
    assert "2 posterior runs made, 0 found" in again()


@pytest.mark.parametrize(
    ("name", "factor", "said"),
    [
        ("rising.csv", -1.0, "rising.csv, rows 1 and 2: temperature must fall as age grows"),
        ("bsk24 normal iron.csv", 1.0, "its scenario would be called 'bsk24-normal-iron', which is taken"),
        ("all.csv", 1.0, "its scenario would be called 'all', which is taken"),
    ],
)
def test_a_table_that_cannot_be_used_is_refused(run, table, curves, engine, tmp_path, name, factor, said):
    result = run("fit", table(GOOD), "--out", "run", "--cooling", curves(name, factor))
    assert result.exit_code == 2
    assert said in result.stderr.splitlines()[-1]
    assert not (tmp_path / "run").exists()


def test_a_table_that_is_not_there(run, table, engine):
    result = run("fit", table(GOOD), "--out", "run", "--cooling", "nowhere.csv")
    assert result.exit_code == 2
    assert "nowhere.csv: cannot be read as a table" in result.stderr
