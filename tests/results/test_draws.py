"""A posterior run reads back as it was."""

import math
from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from decayinfer.catalog.pulsar import Pulsar
from decayinfer.errors import RunFolderError
from decayinfer.inference.outcome import ChannelFit, Status
from decayinfer.inference.settings import FitSettings
from decayinfer.results import draws as module
from decayinfer.results.draws import (
    draws_path,
    fingerprint,
    load_channel_fit,
    load_reported,
    read_header,
    safe_name,
    save_channel_fit,
)

PULSAR = Pulsar(name="A", period=0.2, period_derivative=5e-14, braking_index=20.0)


def test_round_trip_of_numbers_and_draws(tmp_path, engine, settings):
    fit = engine.fit_channel(PULSAR, "phonon+hall", "cool", settings)
    path = tmp_path / "sub" / "x.nc"
    save_channel_fit(path, fit, fingerprint="abc")
    back = load_channel_fit(path)
    assert back == fit  # compares every field but the draws
    assert isinstance(back.status, Status)
    assert set(back.draws.children) == set(fit.draws.children)
    for name, values in fit.draws["posterior"].data_vars.items():
        np.testing.assert_array_equal(back.draws["posterior"][name].values, values.values)
    assert read_header(path)["fingerprint"] == "abc"
    assert "decayinfer" not in fit.draws.attrs


def test_the_quick_reading_is_the_full_one_in_part(tmp_path, engine, settings):
    fit = engine.fit_channel(PULSAR, "phonon+hall", "cool", settings)
    fit.draws["posterior"] = fit.draws["posterior"].dataset.assign(
        coordinates=(("chain", "draw", "k"), np.ones((2, 100, 8)))
    )
    save_channel_fit(tmp_path / "x.nc", fit)
    quick, full = load_reported(tmp_path / "x.nc"), load_channel_fit(tmp_path / "x.nc")
    assert quick == full
    assert set(quick.draws.children) == {"posterior", "prior"}
    for group in quick.draws.children:
        reported = full.draws[group].dataset.drop_vars("coordinates", errors="ignore")
        assert quick.draws[group].dataset.equals(reported)


def test_round_trip_without_draws(tmp_path):
    fit = ChannelFit(
        "A", "cool", "hall", Status.UNREACHABLE, reason="far: ±∞", ln_evidence=-math.inf, flags=("old",)
    )
    save_channel_fit(tmp_path / "x.nc", fit)
    back = load_channel_fit(tmp_path / "x.nc")
    assert back.draws is None
    assert back.ln_evidence == -math.inf
    assert math.isnan(back.ln_evidence_joint)
    assert (back.reason, back.flags, back.status) == ("far: ±∞", ("old",), Status.UNREACHABLE)


def test_the_same_run_gives_the_same_bytes(tmp_path, engine, settings):
    for name in ("a.nc", "b.nc"):
        save_channel_fit(tmp_path / name, engine.fit_channel(PULSAR, "hall", "cool", settings))
    assert (tmp_path / "a.nc").read_bytes() == (tmp_path / "b.nc").read_bytes()


@pytest.mark.parametrize("keep", [0, 100, -1])
def test_damaged_files_are_refused_with_a_remedy(tmp_path, engine, settings, keep):
    path = tmp_path / "x.nc"
    save_channel_fit(path, engine.fit_channel(PULSAR, "hall", "cool", settings))
    path.write_bytes(path.read_bytes()[:keep])
    with pytest.raises(RunFolderError, match=r"cannot read .*x\.nc.*run the same command again"):
        load_channel_fit(path)


def test_another_layout_is_refused(tmp_path, monkeypatch):
    save_channel_fit(tmp_path / "x.nc", ChannelFit("A", "cool", "hall", Status.FAILED))
    monkeypatch.setattr(module, "LAYOUT", 3)
    with pytest.raises(RunFolderError, match="has layout 2, this decayinfer reads layout 3"):
        read_header(tmp_path / "x.nc")


names = st.text(st.characters(exclude_categories=["Cs"]), min_size=1)


@given(names | names.map(lambda name: name * 60))
def test_safe_names_suit_every_file_system(name):
    safe = safe_name(name)
    assert 0 < len(safe) <= 100
    assert all(c.isascii() and (c.isalnum() or c in "+-_.%~") for c in safe)
    assert not safe.startswith(".")
    assert not safe.endswith(".")


@given(names, names)
def test_safe_names_differ_when_names_do(one, other):
    assert (safe_name(one) == safe_name(other)) == (one == other)


def test_long_names_with_one_beginning_differ():
    assert safe_name("x" * 300) != safe_name("x" * 301)


def test_objects_cannot_leave_the_run_folder(tmp_path):
    path = draws_path(tmp_path, "../../etc", "cool", "phonon+hall")
    assert path.parent.parent == tmp_path / "draws"
    assert path.name == "cool__phonon+hall.nc"


def test_the_fingerprint_knows_what_decides_the_numbers(engine):
    settings, cool = FitSettings(), engine.scenarios()[0]
    first = fingerprint(PULSAR, settings, cool)
    assert first == fingerprint(replace(PULSAR), FitSettings(channels=("hall",)), cool)
    changed = [
        fingerprint(replace(PULSAR, braking_index=21.0), settings, cool),
        fingerprint(PULSAR, replace(settings, seed=2), cool),
        fingerprint(PULSAR, replace(settings, priors=replace(settings.priors, mass_mean=1.4)), cool),
        fingerprint(PULSAR, settings, replace(cool, scalars=cool.scalars + 1e-9)),
    ]
    assert len({first, *changed}) == 5
