"""Commands: what they print and their exit codes."""

import pytest
from astropy.table import Table

import decayinfer
from decayinfer.cooling.registry import scenario_names
from decayinfer.results.read import read_run

GOOD, BAD = "A,0.2,5e-14,20.0,1.0", "B,-0.2,5e-14,20.0,1.0"
FIT = ("fit", "table.csv", "--out", "run")
SHORT = ("--channels", "constant,phonon", "--cooling", "cool", "--draws", "100", "--tune", "50")


def one_line(text):
    return " ".join(text.split())


def test_version(run):
    result = run("--version")
    assert (result.exit_code, result.stdout) == (0, f"decayinfer {decayinfer.__version__}\n")


def test_help_names_every_command(run):
    text = run("--help").stdout
    assert all(command in text for command in ("check", "fit", "simulate", "cooling", "demo"))


def test_check_shows_what_follows_from_the_table(run, table):
    result = run("check", table(GOOD))
    assert result.exit_code == 0
    assert "63.4 kyr" in result.stdout  # P / (2 Pdot)
    assert "14.9 kyr" in result.stdout  # 4 tau_c / (n - 3)
    assert "1 objects can be fitted, 0 rows set aside" in result.stdout


def test_check_shows_what_else_is_known(run, table):
    head = "name,period,period_derivative,braking_index,braking_index_err,age,age_err,data_span"
    result = run("check", table("A,0.2,5e-14,20,1,3e4,2e3,22", "B,0.2,5e-14,20,1,x,,", head=head))
    assert result.exit_code == 0  # a bad age costs no row
    assert "age 30000 ± 2000 yr; data span 22 yr" in result.stdout
    assert (
        "row 2 (B), column age: must be a finite number, positive, to be used, got x; remedy" in result.stdout
    )
    assert "also known" not in run("check", table(GOOD)).stdout


def test_check_reports_rows_set_aside(run, table):
    result = run("check", table(GOOD, BAD))
    assert result.exit_code == 1
    assert "row 2 (B), column period: must be positive, got -0.2; remedy" in result.stdout
    assert "1 objects can be fitted, 1 rows set aside" in result.stdout


def test_check_of_a_table_without_a_good_row(run, table):
    result = run("check", table(BAD))
    assert result.exit_code == 1
    assert "0 objects can be fitted" in result.stdout


@pytest.mark.parametrize(
    ("arguments", "said"),
    [
        (("check", "nowhere.csv"), "nowhere.csv"),
        (("check", "broken.csv"), "broken.csv: the table needs column"),
        (("fit", "broken.csv", "--out", "run"), "broken.csv: the table needs column"),
        (("check", "table.csv", "--column", "period"), "--column 'period' must have the form period=THEIRS"),
        (("check", "table.csv", "--column", "perod=P0"), "perod"),
        (
            (*FIT, "--channels", "hal"),
            "there is no channel 'hal'; choose from: constant",
        ),
        ((*FIT, "--cooling", "tepid"), "there is no cooling scenario 'tepid'"),
        ((*FIT, "--objects", "Z"), "there is no pulsar 'Z'; choose from: A"),
        ((*FIT, "--draws", "3"), "draws must be at least 100, got 3"),
        (("fit", "table.csv", "--out", "table.csv"), "cannot make table.csv"),
        (
            ("fit", "bad.csv", "--out", "run"),
            "no row that can be fitted; the first problem: bad.csv, row 1",
        ),
        (("cooling", "tepid"), "there is no cooling scenario 'tepid'; choose from: "),
    ],
)
def test_errors_are_one_line_and_code_2(run, table, engine, tmp_path, arguments, said):
    table(GOOD)
    table(BAD, name="bad.csv")
    table("A,1", name="broken.csv", head="name,x")
    result = run(*arguments)
    assert result.exit_code == 2
    line = result.stderr.splitlines()[-1]
    assert line.startswith("error: ")
    assert said in line
    assert "Traceback" not in result.output
    assert not (tmp_path / "run").exists()


@pytest.mark.parametrize("arguments", [("fit", "t.csv"), ("nonsense",), (*FIT, "--jobs", "0")])
def test_wrong_usage_is_code_2(run, arguments):
    assert run(*arguments).exit_code == 2


def test_fit_prints_a_row_per_object(run, table, engine):
    result = run("fit", table(GOOD), "--out", "run", *SHORT)
    assert result.exit_code == 0
    row = next(line for line in result.stdout.splitlines() if line.strip().startswith("A "))
    assert one_line(row).startswith("A 20.0 ± 1.0 63.4 kyr phonon 1.00 1.00 1.1")
    assert "2 posterior runs made, 0 found, 1 unreachable, 0 failed" in result.stdout
    assert "results in run" in result.stdout
    assert result.stderr.splitlines()[-1] == "2 of 2 posterior runs"


def test_fit_goes_on_with_the_same_command_and_refuses_another(run, table, engine):
    command = ("fit", table(GOOD), "--out", "run", *SHORT)
    run(*command)
    assert "0 posterior runs made, 2 found" in run(*command).stdout
    result = run(*command, "--seed", "5")
    assert result.exit_code == 2
    assert "seed was 1, is now 5" in result.stderr


def test_fit_sets_bad_rows_aside_and_fits_the_rest(run, table, engine):
    result = run("fit", table(GOOD, BAD), "--out", "run", *SHORT)
    assert result.exit_code == 0
    assert "row 2 (B), column period" in result.stderr
    assert list(read_run("run").objects.object) == ["A"]
    assert "row 2 (B), column period" in (read_run("run").path / "log.txt").read_text()


def test_fit_prints_a_few_problems_of_many(run, table, engine):
    rows = [f"X{k},-1,5e-14,20,1" for k in range(30)]
    result = run("fit", table(GOOD, *rows), "--out", "run", *SHORT)
    assert result.stderr.count("column period") == 10
    assert "and 20 more problems" in result.stderr


def test_fit_of_chosen_objects_and_mapped_columns(run, table, engine):
    path = table("A,0.2,5e-14,20,1", "B,0.3,5e-14,20,1", "C,0.4,5e-14,20,1", head="PSR,P0,P1,n,dn")
    names = ("name=PSR", "period=P0", "period_derivative=P1", "braking_index=n", "braking_index_err=dn")
    mapping = [part for pair in names for part in ("--column", pair)]
    result = run("fit", path, "--out", "run", "--objects", "C,A", *mapping, *SHORT)
    assert result.exit_code == 0
    assert list(read_run("run").objects.object) == ["A", "C"]


def test_fit_explains_the_flags_it_prints(run, table, engine):
    result = run("fit", table("unreachable,0.2,5e-14,20,1", GOOD), "--out", "run", *SHORT)
    assert "no-channel: Every fitted channel is unreachable" in one_line(result.stdout)


def test_a_failed_object_is_not_the_end(run, table, engine):
    result = run("fit", table("broken,0.2,5e-14,20,1", GOOD), "--out", "run", *SHORT)
    assert result.exit_code == 0
    assert "2 failed" in result.stdout
    assert "Traceback" not in result.output


def test_an_interruption_says_how_to_go_on(run, table, engine, monkeypatch):
    def interrupt(*_):
        raise KeyboardInterrupt

    monkeypatch.setattr("decayinfer.inference.fit.fit_channel", interrupt)
    result = run("fit", table(GOOD), "--out", "run", *SHORT)
    assert result.exit_code == 130
    assert result.stderr.splitlines()[-1] == "stopped; the same command goes on where this one stopped"


def test_truths_in_the_table_are_compared(run, table, engine):
    head = "name,period,period_derivative,braking_index,braking_index_err,truth_mass"
    result = run("fit", table(GOOD + ",1.3", "B,0.2,5e-14,20,1,9.9", head=head), "--out", "run", *SHORT)
    assert "1 of 2 truths (50 %) lie inside their 90 % intervals" in result.stdout


def test_cooling_lists_scenarios_and_shows_one(run):
    name = scenario_names()[0]
    listed = run("cooling")
    assert listed.exit_code == 0
    assert name in listed.stdout
    shown = run("cooling", name)
    assert shown.exit_code == 0
    assert shown.stdout.startswith(f"{name}: ")
    assert "source: " in shown.stdout


def test_simulate_writes_a_table_once(run, tmp_path, monkeypatch):
    import sys
    import types

    def simulate_table(n, seed, settings):
        assert settings.channels == ("phonon",)
        return Table({"name": [f"S{seed}-{k}" for k in range(n)]})

    fake = types.SimpleNamespace(simulate_table=simulate_table)
    monkeypatch.setitem(sys.modules, "decayinfer.inference.simulate", fake)
    command = ("simulate", "--objects", "3", "--out", "s.ecsv", "--seed", "7", "--channels", "phonon")
    assert run(*command).exit_code == 0
    assert list(Table.read(tmp_path / "s.ecsv")["name"]) == ["S7-0", "S7-1", "S7-2"]
    again = run(*command)
    assert again.exit_code == 2
    assert "s.ecsv exists already" in again.stderr
