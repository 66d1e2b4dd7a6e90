"""What a fit costs next to its gradients, and the evidences next to a fit."""

import time

import numpy as np
import pytest

from decayinfer.inference import explore
from decayinfer.inference.fit import fit_channel
from decayinfer.inference.outcome import Status
from decayinfer.inference.settings import FitSettings

SETTINGS = FitSettings()


class Clocks:
    """Processor time spent in parts of a fit, and the sampler runs it made."""

    def __init__(self, monkeypatch):
        self.evidence, self.runs = 0.0, []
        self._wrap(monkeypatch, explore, "importance_sample", self._integrated)
        self._wrap(monkeypatch, type(explore.engine()), "sample", self._sampled)

    def _wrap(self, monkeypatch, owner, name, note):
        inner = getattr(owner, name)

        def timed(*args, **options):
            begun = time.process_time()
            result = inner(*args, **options)
            note(time.process_time() - begun, args, result)
            return result

        monkeypatch.setattr(owner, name, timed)

    def _integrated(self, seconds, args, result):
        self.evidence += seconds

    def _sampled(self, seconds, args, result):
        self.runs.append((seconds, args[1], result))


@pytest.mark.benchmark
@pytest.mark.parametrize("i", range(3))
def test_a_fit_costs_its_gradients_and_evidence_comes_cheap(bench, say, monkeypatch, i):
    """Sampler runs within 1.5 times their gradients; evidences at most double the fit, to 0.05 in ln Z.

    A fit is the two sampler runs whose draws every table shows side by side, without n (the prior at this P and Pdot)
    and with n (the posterior); evidence is all that is done besides with importance weights. The last column counts
    the run without n to the evidence instead.
    """
    star = bench.stars[i]
    fit_channel(star, "phonon", bench.scenario, SETTINGS)  # loads what is loaded once
    say(f"{star.name}: fit/gradients, whole/gradients, whole/fit, whole/(run with n), errors of ln Z")
    over, doubled, errors = [], [], []
    for channel in bench.channels:
        clocks = Clocks(monkeypatch)
        begun = time.process_time()
        fit = fit_channel(star, channel, bench.scenario, SETTINGS)
        whole = time.process_time() - begun
        monkeypatch.undo()
        assert fit.status is Status.OK
        sampled = sum(seconds for seconds, _, _ in clocks.runs)
        gradients = sum(
            run.gradients * bench.density(problem).seconds(run.points.reshape(-1, 8))
            for _, problem, run in clocks.runs
        )
        over.append(sampled / gradients)
        doubled.append(whole / (whole - clocks.evidence))
        errors.append(max(fit.ln_evidence_err, fit.ln_evidence_joint_err))
        say(
            f"  {channel:22} {over[-1]:.2f}  {whole / gradients:.2f}  {doubled[-1]:.2f}"
            f"  {whole / clocks.runs[-1][0]:.2f}"
            f"  {fit.ln_evidence_err:.3f} {fit.ln_evidence_joint_err:.3f}  ({whole:.2f} s)"
        )
    assert np.median(over) <= 1.5
    assert max(doubled) <= 2.0
    assert max(errors) <= 0.05
