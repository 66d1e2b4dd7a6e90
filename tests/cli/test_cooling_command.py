"""decayinfer cooling: the list, the CSV table, one scenario."""

import csv
import io

import pytest

from decayinfer.cooling.registry import load_scenario, scenario_names, standard_names

HEADER = "name,eos,superfluidity,envelope,direct_urca,max_error_T,max_error_slope"


def lines_by_name(text):
    return {line.split()[0]: line for line in text.splitlines() if line.split()}


def test_every_scenario_has_a_line_with_its_physics(run):
    lines = lines_by_name(run("cooling").stdout)
    for name in scenario_names():
        properties = load_scenario(name).properties
        assert all(value in lines[name] for value in properties.values())
    assert {name for name, line in lines.items() if "standard" in line.split()} == set(standard_names())
    assert "provisional" in lines["candle"]


def test_lines_give_the_errors_of_the_fit(run):
    scenario = load_scenario("bsk24-triplet-iron")
    line = lines_by_name(run("cooling").stdout)[scenario.name]
    temperature, slope = scenario.fit_error["temperature"], scenario.fit_error["slope"]
    assert line.split()[-3:] == [f"{100 * temperature:.2f}", "%", f"{slope:.3f}"]


def test_csv_has_a_row_per_scenario_and_errors_as_fractions(run):
    result = run("cooling", "--csv")
    assert result.exit_code == 0
    assert result.stdout.splitlines()[0] == HEADER
    rows = {row["name"]: row for row in csv.DictReader(io.StringIO(result.stdout))}
    assert tuple(rows) == scenario_names()
    for name, row in rows.items():
        scenario = load_scenario(name)
        assert all(row[key] == value for key, value in scenario.properties.items())
        for column, key in (("max_error_T", "temperature"), ("max_error_slope", "slope")):
            stored = scenario.fit_error.get(key, float("nan"))
            assert float(row[column]) == pytest.approx(stored, rel=1e-5, nan_ok=True)
    errors = [float(row["max_error_T"]) for row in rows.values()]
    assert sum(0.0 < error < 0.1 for error in errors) == len(rows) - 2  # the two provisional ones have none


def test_csv_of_one_scenario(run):
    name = standard_names()[0]
    head, row = run("cooling", name, "--csv").stdout.splitlines()
    assert head == HEADER
    assert row.startswith(f"{name},")


def test_one_scenario_tells_its_physics_errors_and_sources(run):
    scenario = load_scenario("bsk24-normal-iron-urca")
    text = " ".join(run("cooling", scenario.name).stdout.split())
    assert text.startswith(f"{scenario.name}: {scenario.title}")
    assert "direct urca: yes" in text
    assert f"largest fit error in temperature: {100 * scenario.fit_error['temperature']:.2g} %" in text
    assert f"largest fit error in slope: {scenario.fit_error['slope']:.2g} " in text
    assert all(f"source: {source}" in text for source in scenario.sources)


def test_an_unknown_scenario_is_an_error(run):
    result = run("cooling", "tepid", "--csv")
    assert result.exit_code == 2
    assert "there is no cooling scenario 'tepid'" in result.stderr
