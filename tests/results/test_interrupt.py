"""Interruptions that are not lost."""

import os
import signal
from contextlib import suppress

import pytest

from decayinfer.results.interrupt import kept_interrupts
from decayinfer.results.run import run_fit


def interrupt():
    os.kill(os.getpid(), signal.SIGINT)


def test_an_interruption_is_raised_at_once_and_again_on_check():
    with kept_interrupts() as check:
        check()
        with pytest.raises(KeyboardInterrupt):
            interrupt()
        with pytest.raises(KeyboardInterrupt):
            check()
    assert signal.getsignal(signal.SIGINT) is signal.default_int_handler


def test_a_fit_that_swallows_the_interruption_still_stops_the_run(
    tmp_path, engine, catalogue, settings, monkeypatch
):
    fit = engine.fit_channel

    def swallow(*arguments):
        with suppress(BaseException):  # as some libraries do around imports
            interrupt()
        return fit(*arguments)

    monkeypatch.setattr("decayinfer.inference.fit.fit_channel", swallow)
    with pytest.raises(KeyboardInterrupt):
        run_fit(catalogue("A"), tmp_path / "run", settings)
    assert len(engine.calls) == 1
