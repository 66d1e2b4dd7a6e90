"""Recovery from the last glitch on top of a constant dipole.

The steps in nudot, intervals and decay times are lognormal over the ranges that surveys of glitches find, or about the
object's own values: `glitch_nudot_step` and `glitch_time_since`. Without the latter the star is seen at a random moment
of the interval; with it the interval is longer.
"""

import numpy as np
from numpy.typing import NDArray
from scipy.special import ndtr, ndtri

from decayinfer.channels.rival import Birth, Born, Response, Rival, Spin, constant_born, constant_response
from decayinfer.physics.glitch import recovery_excess

__all__ = ["CHANNELS"]

type Array = NDArray[np.float64]


def _ln_step(spin: Spin) -> tuple[float, float]:
    """Mean and standard deviation of ln |Delta nudot/nudot|."""
    priors, own = spin.priors, spin.fact("glitch_nudot_step")
    if np.isfinite(own):
        return float(np.log(own)), priors.glitch_own_step_sd
    return float(np.log(priors.glitch_step_median)), priors.glitch_step_sd


def _recovery(coordinates: Array, spin: Spin) -> dict[str, Array]:
    _, ln_interval, phase, share, ln_decay = coordinates
    priors, since = spin.priors, spin.fact("glitch_time_since")
    mean, sd = float(np.log(priors.glitch_interval_median)), priors.glitch_interval_sd
    if np.isfinite(since):
        # the interval is lognormal beyond the time since; from the upper tail, which stays exact there
        beyond = ndtr(-(np.log(since) - mean) / sd)
        interval = np.exp(mean - sd * ndtri(beyond * ndtr(-ln_interval)))
        elapsed = since + np.zeros_like(interval)
    else:
        interval = np.exp(mean + sd * ln_interval)
        elapsed = interval * ndtr(phase)
    return {
        "glitch_interval": interval,
        "glitch_time_since": elapsed,
        "recovery_share": ndtr(share),
        "recovery_time": priors.recovery_time_median * np.exp(priors.recovery_time_sd * ln_decay),
    }


def _per_step(own: dict[str, Array], spin: Spin) -> Array:
    excess: Array = recovery_excess(
        1.0,
        timescale=spin.timescale_yr,
        interval=own["glitch_interval"],
        elapsed=own["glitch_time_since"],
        share=own["recovery_share"],
        decay_time=own["recovery_time"],
    )
    return excess


def _respond(coordinates: Array, spin: Spin) -> Response:
    own = _recovery(coordinates, spin)
    mean, sd = _ln_step(spin)
    step = np.exp(mean + sd * coordinates[0])
    excess = step * _per_step(own, spin)
    return constant_response(spin, 3.0 + excess, {"index_excess": excess, "glitch_nudot_step": step, **own})


def _pin(excess: Array, coordinates: Array, spin: Spin) -> tuple[Array, Array]:
    mean, sd = _ln_step(spin)
    ln_excess = np.log(np.where(excess > 0.0, excess, np.nan))
    step = (ln_excess - np.log(_per_step(_recovery(coordinates, spin), spin)) - mean) / sd
    return np.nan_to_num(step), np.where(excess > 0.0, -ln_excess - np.log(sd), -np.inf)


def _born(birth: Birth, rng: np.random.Generator) -> Born:
    return constant_born(birth, rng, size=5)


CHANNELS = (
    Rival(
        name="glitch",
        title="constant dipole that recovers from a glitch",
        own=(
            "index_excess", "glitch_nudot_step", "glitch_interval", "glitch_time_since", "recovery_share",
            "recovery_time",
        ),
        coordinates=("step", "interval", "phase", "share", "decay_time"),
        secular=False,
        low=3.0,
        high=np.inf,
        respond=_respond,
        born=_born,
        pin=_pin,
    ),
)  # fmt: skip
