"""Runs: complete, resumed, refused, interrupted, in parallel."""

import errno
import os
import shutil
import signal
import time
from dataclasses import replace

import numpy as np
import pytest

from decayinfer.errors import InputError, RunFolderError, SamplingError, UnknownNameError
from decayinfer.results import pool as module_of_pool
from decayinfer.results import run as module
from decayinfer.results import tables
from decayinfer.results.lock import run_lock
from decayinfer.results.read import read_run
from decayinfer.results.run import resolve_settings, run_fit

TABLES = ("objects.ecsv", "channels.ecsv", "parameters.ecsv", "scenarios.ecsv", "sensitivity.ecsv")


def table_bytes(folder):
    return [(folder / name).read_bytes() for name in TABLES]


def names_in(folder):
    return {path.name for path in folder.iterdir()}


def files_in(folder):
    return len(list(folder.rglob("*.nc")))


@pytest.fixture(scope="module")
def finished(tmp_path_factory, make_engine, catalogue, settings):
    """An uninterrupted run of objects A and B."""
    with make_engine():
        return run_fit(catalogue("A", "B"), tmp_path_factory.mktemp("finished") / "run", settings).path


@pytest.fixture
def whole(tmp_path, finished):
    """Bytes of the tables of the uninterrupted run, of which tmp_path/whole is a copy."""
    shutil.copytree(finished, tmp_path / "whole")
    return table_bytes(finished)


def test_a_run_folder_holds_what_it_should(tmp_path, engine, catalogue, settings):
    summary = run_fit(catalogue("A", "B/2"), tmp_path / "run", settings)
    assert names_in(tmp_path / "run") == {*TABLES, "run.toml", "log.txt", "input.ecsv", "draws"}
    assert names_in(tmp_path / "run/draws") == {"A", "B%2F2"}
    channels, scenarios = settings.channels, ("cool", "warm")
    assert names_in(tmp_path / "run/draws/A") == {f"{s}__{c}.nc" for s in scenarios for c in channels}
    assert (summary.objects, summary.fitted, summary.reused) == (2, 12, 0)
    assert (summary.unreachable, summary.failed) == (4, 0)
    assert "A cool phonon: ok, ln evidence" in (tmp_path / "run/log.txt").read_text()


def test_the_same_call_reuses_every_file(tmp_path, engine, catalogue, settings, whole):
    summary = run_fit(catalogue("A", "B"), tmp_path / "whole", settings)
    assert engine.calls == []
    assert (summary.fitted, summary.reused) == (0, 12)
    assert table_bytes(tmp_path / "whole") == whole


def test_missing_and_damaged_files_are_made_again(tmp_path, engine, catalogue, settings, whole):
    folder = tmp_path / "whole" / "draws" / "A"
    (folder / "cool__phonon.nc").unlink()
    damaged = folder / "warm__phonon.nc"
    damaged.write_bytes(damaged.read_bytes()[:1000])
    run_fit(catalogue("A", "B"), tmp_path / "whole", settings)
    assert engine.calls == [("A", "cool", "phonon"), ("A", "warm", "phonon")]
    assert table_bytes(tmp_path / "whole") == whole
    assert "done again, for its file is damaged" in (tmp_path / "whole/log.txt").read_text()


def test_damage_behind_an_intact_header_is_made_again(
    tmp_path, engine, catalogue, settings, whole, monkeypatch
):
    """The header reads, the draws do not: found only when the tables are made."""
    from decayinfer.results import work

    load, broken = work.load_reported, []

    def fail_once(path):
        if path.name == "cool__phonon.nc" and path.parent.name == "A" and not broken:
            broken.append(path)
            raise RunFolderError("bad sector")
        return load(path)

    monkeypatch.setattr(work, "load_reported", fail_once)
    run_fit(catalogue("A", "B"), tmp_path / "whole", settings)
    assert engine.calls == [("A", "cool", "phonon")]
    assert table_bytes(tmp_path / "whole") == whole


def test_failed_runs_are_rows_and_are_tried_again(tmp_path, engine, catalogue, settings):
    catalog = catalogue("A", "broken", "panic")
    summary = run_fit(catalog, tmp_path / "run", settings)
    assert summary.failed == 12
    frame = read_run(tmp_path / "run").channels
    assert set(frame[frame.object == "broken"].status) == {"failed"}
    assert set(frame[frame.object == "broken"].reason) == {"ValueError: the sampler lost its way"}
    assert set(frame[frame.object == "panic"].reason) == {"PanicError: deep trouble"}
    assert set(frame[frame.object == "A"].status) == {"unreachable", "ok"}
    log = (tmp_path / "run/log.txt").read_text()
    assert "Traceback" in log
    assert "raise ValueError" in log
    engine.calls.clear()
    run_fit(catalog, tmp_path / "run", settings)
    assert {name for name, *_ in engine.calls} == {"broken", "panic"}
    assert len(engine.calls) == 12


def test_runs_that_did_not_converge_keep_their_draws_and_are_not_tried_again(
    tmp_path, engine, catalogue, settings
):
    run_fit(catalogue("stuck"), tmp_path / "run", settings)
    run = read_run(tmp_path / "run")
    assert set(run.channels.status) == {"failed", "unreachable"}
    assert run.draws("stuck", "cool", "phonon")["posterior"].sizes["draw"] == 100
    assert len(run.parameters) == 0
    engine.calls.clear()
    run_fit(catalogue("stuck"), tmp_path / "run", settings)
    assert engine.calls == []


@pytest.fixture
def change_draws_of_a(engine, monkeypatch):
    """Have the fake engine hand back other draws for object A."""

    def have(change):
        fit = engine.fit_channel

        def changed(pulsar, *arguments):
            made = fit(pulsar, *arguments)
            if pulsar.name == "A" and made.status == "ok":
                made.draws["posterior"] = change(made.draws["posterior"].dataset)
            return made

        monkeypatch.setattr("decayinfer.inference.fit.fit_channel", changed)

    return have


def test_an_object_without_summary_is_failed_not_fatal(tmp_path, catalogue, settings, change_draws_of_a):
    change_draws_of_a(lambda draws: draws.assign(mass=draws["mass"].astype(str)))
    run_fit(catalogue("A", "B"), tmp_path / "run", settings)
    frame = read_run(tmp_path / "run").channels
    assert set(frame[frame.object == "A"].status) == {"failed"}
    assert frame[frame.object == "A"].reason.str.startswith("no summary: ").all()
    assert set(frame[frame.object == "B"].status) == {"unreachable", "ok"}


def test_draws_that_cannot_be_read_back_are_failed_not_fatal(
    tmp_path, catalogue, settings, change_draws_of_a
):
    change_draws_of_a(lambda draws: draws.assign(mass=1.4))
    run_fit(catalogue("A", "B"), tmp_path / "run", settings)
    frame = read_run(tmp_path / "run").channels
    failed = frame[frame.status == "failed"]
    assert set(failed.object) == {"A"}
    assert failed.reason.str.startswith("cannot read ").all()
    assert set(frame[frame.object == "B"].status) == {"unreachable", "ok"}


@pytest.mark.parametrize(
    ("change", "said"),
    [
        ({"draws": 101}, "draws was 100, is now 101"),
        ({"seed": 2}, "seed was 1, is now 2"),
        ({"channels": ("phonon",)}, "channels was constant,phonon,phonon+hall, is now phonon"),
        ({"cooling": ("cool",)}, "cooling was cool,warm, is now cool"),
    ],
)
def test_other_settings_are_refused_by_name(tmp_path, engine, catalogue, settings, whole, change, said):
    with pytest.raises(RunFolderError, match="holds a run with other settings") as caught:
        run_fit(catalogue("A", "B"), tmp_path / "whole", replace(settings, **change))
    assert said in str(caught.value)
    assert "same settings" in str(caught.value)
    assert "--out" in str(caught.value)
    assert table_bytes(tmp_path / "whole") == whole


def test_other_priors_are_refused_by_name(tmp_path, engine, catalogue, settings, whole):
    other = replace(settings, priors=replace(settings.priors, mass_mean=1.4))
    with pytest.raises(RunFolderError, match=r"priors\.mass_mean was 1\.28, is now 1\.4"):
        run_fit(catalogue("A", "B"), tmp_path / "whole", other)


def test_another_table_or_version_is_refused(tmp_path, engine, catalogue, settings, whole, monkeypatch):
    with pytest.raises(RunFolderError, match="the input table has changed"):
        run_fit(catalogue("A", "C"), tmp_path / "whole", settings)
    fewer = replace(catalogue("A", "B"), pulsars=catalogue("A").pulsars)
    with pytest.raises(RunFolderError, match="objects was A,B, is now A"):
        run_fit(fewer, tmp_path / "whole", settings)
    monkeypatch.setattr("decayinfer.__version__", "99.0")
    with pytest.raises(RunFolderError, match=r"decayinfer was .*, is now 99\.0"):
        run_fit(catalogue("A", "B"), tmp_path / "whole", settings)


def test_another_library_version_is_a_remark(tmp_path, engine, catalogue, settings, whole):
    path = tmp_path / "whole/run.toml"
    path.write_text(path.read_text().replace(f'numpy = "{np.__version__}"', 'numpy = "1.0"'))
    summary = run_fit(catalogue("A", "B"), tmp_path / "whole", settings)
    assert summary.remarks == (f"numpy is {np.__version__} now, was 1.0 when the run began",)


def test_folders_with_other_files_are_left_alone(tmp_path, engine, catalogue, settings):
    (tmp_path / "thesis.tex").write_text("precious")
    with pytest.raises(RunFolderError, match=r"is not empty and holds no run \(found thesis\.tex\)"):
        run_fit(catalogue("A"), tmp_path, settings)
    assert [p.name for p in tmp_path.iterdir()] == ["thesis.tex"]


def test_a_file_in_the_place_of_the_folder_is_an_error(tmp_path, engine, catalogue, settings):
    (tmp_path / "run").write_text("a file")
    with pytest.raises(RunFolderError, match="cannot make"):
        run_fit(catalogue("A"), tmp_path / "run", settings)


def test_two_runs_in_one_folder(tmp_path, engine, catalogue, settings):
    with run_lock(tmp_path), pytest.raises(RunFolderError, match="another run is at work"):
        run_fit(catalogue("A"), tmp_path, settings)


def test_bad_arguments(tmp_path, engine, catalogue, settings):
    with pytest.raises(InputError, match="jobs must be at least 1"):
        run_fit(catalogue("A"), tmp_path / "run", settings, jobs=0)
    with pytest.raises(InputError, match="no row that can be fitted"):
        run_fit(replace(catalogue("A"), pulsars=()), tmp_path / "run", settings)
    with pytest.raises(UnknownNameError, match="no channel 'hal'"):
        run_fit(catalogue("A"), tmp_path / "run", replace(settings, channels=("hal",)))
    with pytest.raises(UnknownNameError, match="no cooling scenario 'tepid'"):
        run_fit(catalogue("A"), tmp_path / "run", replace(settings, cooling=("tepid",)))
    assert not (tmp_path / "run").exists()


def test_settings_name_every_channel_once(settings):
    settings = replace(settings, cooling=())
    assert resolve_settings(replace(settings, channels=("hall", "hall"))).channels == ("hall",)
    assert "impurity+phonon+hall" in resolve_settings(replace(settings, channels=())).channels


def test_a_full_disk_ends_the_run_and_the_next_goes_on(
    tmp_path, engine, catalogue, settings, whole, monkeypatch
):
    fsync, left = os.fsync, [9]

    def run_out(handle):
        left[0] -= 1
        if left[0] < 0:
            raise OSError(errno.ENOSPC, "No space left on device")
        fsync(handle)

    monkeypatch.setattr(os, "fsync", run_out)
    with pytest.raises(RunFolderError, match="disk is full"):
        run_fit(catalogue("A", "B"), tmp_path / "run", settings)
    monkeypatch.setattr(os, "fsync", fsync)
    assert not list((tmp_path / "run").rglob("*.partial"))
    assert 0 < files_in(tmp_path / "run") < 12
    run_fit(catalogue("A", "B"), tmp_path / "run", settings)
    assert table_bytes(tmp_path / "run") == whole


def test_a_stop_between_tables_is_mended(tmp_path, engine, catalogue, settings, whole, monkeypatch):
    write, count = tables.write_whole, []

    def stop_at_second(path, content):
        count.append(path)
        if len(count) == 2:
            raise KeyboardInterrupt
        write(path, content)

    monkeypatch.setattr(tables, "write_whole", stop_at_second)
    with pytest.raises(KeyboardInterrupt):
        run_fit(catalogue("A", "B"), tmp_path / "run", settings)
    with pytest.raises(RunFolderError, match="has not finished"):
        read_run(tmp_path / "run")
    monkeypatch.setattr(tables, "write_whole", write)
    run_fit(catalogue("A", "B"), tmp_path / "run", settings)
    assert table_bytes(tmp_path / "run") == whole


def test_progress_counts_to_the_total(tmp_path, engine, catalogue, settings):
    seen = []
    run_fit(catalogue("A", "B"), tmp_path / "run", settings, progress=seen.append)
    assert [state.done for state in seen] == sorted(state.done for state in seen)
    assert (seen[0].done, seen[-1].done, seen[-1].total) == (0, 12, 12)
    assert seen[1].running == ("A cool phonon",)


# The tests below start processes of their own.


def wait_for(condition, process, seconds=60.0):
    end = time.monotonic() + seconds
    while not condition():
        assert process.poll() is None, process.communicate()[1]
        assert time.monotonic() < end
        time.sleep(0.01)


@pytest.mark.parametrize(("jobs", "kills"), [(1, (1, 5)), (2, (3,))])
def test_kill_and_resume_give_the_same_bytes(
    tmp_path, engine, catalogue, settings, start_run, whole, jobs, kills
):
    out = tmp_path / "run"
    for after in kills:
        process = start_run(out, "A", "B", jobs=jobs, delay=0.1)
        wait_for(lambda after=after: files_in(out) >= after, process)
        os.kill(process.pid, signal.SIGKILL)
        process.communicate()
    assert not (out / "objects.ecsv").exists()
    found = files_in(out)
    assert found < 12
    run_fit(catalogue("A", "B"), out, settings)
    assert len(engine.calls) <= 12 - found
    assert table_bytes(out) == whole


def test_parallel_processes_give_the_same_bytes_and_end(tmp_path, start_run, whole):
    process = start_run(tmp_path / "run", "A", "B", jobs=2)
    _, said = process.communicate(timeout=120)
    assert process.returncode == 0, said
    assert table_bytes(tmp_path / "run") == whole


def test_processes_do_not_outlive_a_killed_parent(tmp_path, start_run):
    out = tmp_path / "run"
    process = start_run(out, "A", "B", "C", "D", jobs=2, delay=0.3)
    wait_for(lambda: files_in(out) >= 1, process)
    os.kill(process.pid, signal.SIGKILL)
    process.wait()
    time.sleep(1.0)
    count = files_in(out)
    time.sleep(1.0)
    assert files_in(out) == count < 24


def test_an_interruption_ends_parallel_processes_soon(tmp_path, start_run):
    out = tmp_path / "run"
    process = start_run(out, "A", "B", jobs=2, delay=0.5)
    wait_for(lambda: files_in(out) >= 1, process)
    os.kill(process.pid, signal.SIGINT)
    _, said = process.communicate(timeout=20)
    assert "KeyboardInterrupt" in said
    assert files_in(out) < 12
    with run_lock(out):  # free again
        pass


def test_an_object_that_kills_its_process_is_marked_and_the_rest_goes_on(tmp_path, start_run, whole):
    out = tmp_path / "run"
    process = start_run(out, "A", "killer", "B", jobs=2)
    _, said = process.communicate(timeout=120)
    assert process.returncode == 0, said
    frame = read_run(out).channels
    assert set(frame[frame.object == "killer"].status) == {"failed"}
    assert frame[frame.object == "killer"].reason.str.contains("process at work was lost twice").all()
    assert set(frame[frame.object != "killer"].status) == {"unreachable", "ok"}


def test_processes_are_renewed_and_the_order_of_rows_stays(
    tmp_path, engine, catalogue, settings, monkeypatch
):
    """Objects that are finished need no engine, so the fake of this process is enough for the others too."""
    names = ("A", "B", "C", "D", "E")
    run_fit(catalogue(*names), tmp_path / "run", settings)
    first = table_bytes(tmp_path / "run")
    started = []
    pool = module_of_pool.ProcessPoolExecutor
    monkeypatch.setattr(module_of_pool, "_OBJECTS_PER_PROCESS", 1)
    monkeypatch.setattr(
        module_of_pool, "ProcessPoolExecutor", lambda *args, **kw: started.append(args) or pool(*args, **kw)
    )
    run_fit(catalogue(*names), tmp_path / "run", settings, jobs=2)
    assert len(started) == 3
    assert table_bytes(tmp_path / "run") == first


def test_processes_that_cannot_start_are_explained(tmp_path, engine, catalogue, settings, monkeypatch):
    monkeypatch.setattr("decayinfer.results.pool._start", len)  # does not take what it is given
    with pytest.raises(SamplingError, match="if __name__ == '__main__':"):
        run_fit(catalogue("A", "B"), tmp_path / "run", settings, jobs=2)


def test_fit_sample_reads_fits_and_returns_the_run(tmp_path, engine, catalogue, settings):
    table = catalogue("A").table
    table.rename_column("period", "P0")
    run = module.fit_sample(table, out=tmp_path / "run", settings=settings, columns={"period": "P0"})
    assert list(run.objects.object) == ["A"]
    assert run.record["input"]["columns"]["period"] == "P0"
