"""Reading a finished run."""

import pytest

from decayinfer.errors import RunFolderError, UnknownNameError
from decayinfer.results.read import read_run
from decayinfer.results.run import run_fit


@pytest.fixture
def run(tmp_path, engine, catalogue, settings):
    """A finished run of an ordinary object and one that no channel reaches."""
    return read_run(run_fit(catalogue("A", "unreachable"), tmp_path / "run", settings).path)


def test_tables_are_data_frames_with_text_as_text(run):
    assert list(run.objects.object) == ["A", "unreachable"]
    assert list(run.objects.best_channel)[1] == ""
    assert set(run.channels[run.channels.status == "ok"].reason) == {""}
    assert run.parameters[run.parameters.parameter == "share_phonon"].unit.eq("").all()
    assert run.channels.divergences.dtype == "int64"


def test_tables_have_units(run):
    assert str(run.table("objects")["mass_q50"].unit) == "solMass"
    assert run.table("input").colnames[:2] == ["name", "period"]
    with pytest.raises(UnknownNameError, match="no table 'objets'"):
        run.table("objets")


def test_draws_are_those_of_the_tables(run):
    posterior = run.draws("A", "cool", "phonon")["posterior"]
    frame = run.parameters.set_index(["object", "scenario", "channel", "parameter"])
    row = frame.loc[("A", "cool", "phonon", "mass")]
    assert row["mean"] == pytest.approx(float(posterior["mass"].mean()), rel=1e-9)


def test_unreachable_runs_keep_their_prior(run):
    assert set(run.draws("unreachable", "cool", "phonon").children) == {"prior"}


def test_runs_without_draws_say_why(tmp_path, engine, catalogue, settings):
    run = read_run(run_fit(catalogue("broken"), tmp_path / "run", settings).path)
    with pytest.raises(
        RunFolderError, match=r"no draws for phonon in cool: failed \(ValueError: the sampler"
    ):
        run.draws("broken", "cool", "phonon")


@pytest.mark.parametrize(
    ("asked", "said"),
    [
        (("Z", "cool", "phonon"), "no object 'Z'"),
        (("A", "tepid", "phonon"), "no cooling scenario 'tepid'"),
        (("A", "cool", "hall"), "no channel 'hall'"),
    ],
)
def test_unknown_names(run, asked, said):
    with pytest.raises(UnknownNameError, match=said):
        run.draws(*asked)


def test_other_folders_are_refused(tmp_path, run):
    with pytest.raises(RunFolderError, match=r"is no run folder: it has no run\.toml"):
        read_run(tmp_path)
    (run.path / "run.toml").write_text("[broken")
    with pytest.raises(RunFolderError, match="is damaged"):
        read_run(run.path)


def test_damaged_tables_are_refused(run):
    (run.path / "objects.ecsv").write_text("gibberish")
    with pytest.raises(RunFolderError, match=r"cannot read .*objects\.ecsv"):
        _ = run.objects
