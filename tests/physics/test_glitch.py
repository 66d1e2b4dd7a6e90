"""Glitch recovery against a differentiated glitch phase."""

import numpy as np
import pytest

from decayinfer.physics.constants import YEAR_S
from decayinfer.physics.glitch import recovery_excess


def test_exponential_recovery_is_that_of_the_usual_glitch_phase():
    """Lower et al. 2021 (arXiv:2109.07612) and timing practice: phase (1 - e^(-t/tau)) dnu_d tau, differentiated."""
    nu, nudot, step, tau, elapsed = 8.0, -4e-13, 0.01, 80.0 * 86400.0, 50.0 * 86400.0
    decaying = step * abs(nudot) * tau  # dnu_d, whose decay makes the step in nudot
    assert -decaying / tau == pytest.approx(step * nudot)
    h = 0.02 * tau
    t = elapsed + h * np.arange(-3, 4)
    phase = (1.0 - np.exp(-t / tau)) * decaying * tau
    nuddot = (phase[0] - 8 * phase[1] + 13 * phase[2] - 13 * phase[4] + 8 * phase[5] - phase[6]) / (8 * h**3)
    excess = recovery_excess(
        step, timescale=nu / abs(nudot), interval=1e12, elapsed=elapsed, share=1.0, decay_time=tau
    )
    assert excess == pytest.approx(nu * nuddot / nudot**2, rel=1e-4)


def test_linear_recovery_is_step_over_interval():
    """Johnston & Galloway 1999 (from memory), and Lower et al. 2021: n_ig = nu |step|/(nudot^2 T_ig)."""
    nu, nudot, change, interval = 11.2, -1.56e-11, 1.1e-13, 2.5
    excess = recovery_excess(
        change / abs(nudot), timescale=nu / abs(nudot) / YEAR_S, interval=interval, elapsed=1.0, share=0.0,
        decay_time=0.1,
    )  # fmt: skip
    assert excess == pytest.approx(nu * change / (nudot**2 * interval * YEAR_S), rel=1e-12)


def test_recovery_only_adds():
    rng = np.random.default_rng(2)
    step, interval, decay = np.exp(rng.standard_normal((3, 500)))
    share, phase = rng.random((2, 500))
    excess = recovery_excess(
        step, timescale=1e5, interval=interval, elapsed=phase * interval, share=share, decay_time=decay
    )
    assert np.all(excess > 0.0)
    late = recovery_excess(
        step, timescale=1e5, interval=interval, elapsed=interval, share=share, decay_time=decay
    )
    assert np.all(late <= excess)
    assert np.mean(late < excess) > 0.8
