"""Spin noise: a second frequency derivative of either sign on top of a constant dipole.

The scale of nuddot is lognormal, about the object's own estimate where it has one and about the scaling of
`decayinfer.physics.spin_noise` where it has none; given the scale, nuddot is Gaussian about zero.
"""

import numpy as np
from numpy.typing import NDArray

from decayinfer.channels.rival import Birth, Born, Response, Rival, Spin, constant_born, constant_response
from decayinfer.physics.spin_noise import known_scale

__all__ = ["CHANNELS"]

type Array = NDArray[np.float64]

_LN10 = float(np.log(10.0))


def _ln_scale(coordinates: Array, spin: Spin) -> tuple[Array, Array]:
    """Log of the standard deviation of nuddot, and of the index."""
    nu = 1.0 / spin.period
    nudot = -spin.period_derivative / spin.period**2
    own, own_sd = (spin.fact(f"spin_noise_log10_scale{end}") for end in ("", "_err"))
    scale = known_scale(nu, nudot, own, own_sd, spin.priors.spin_noise_own_log10_sd)
    ln_nuddot = _LN10 * (scale.log10 + scale.sd * coordinates[1])
    return ln_nuddot, ln_nuddot + np.log(nu / nudot**2)


def _respond(coordinates: Array, spin: Spin) -> Response:
    ln_nuddot, ln_index = _ln_scale(coordinates, spin)
    excess = np.exp(ln_index) * coordinates[0]
    return constant_response(
        spin, 3.0 + excess, {"index_excess": excess, "spin_noise_scale": np.exp(ln_nuddot)}
    )


def _pin(excess: Array, coordinates: Array, spin: Spin) -> tuple[Array, Array]:
    ln_index = _ln_scale(coordinates, spin)[1]
    return excess * np.exp(-ln_index), -ln_index


def _born(birth: Birth, rng: np.random.Generator) -> Born:
    return constant_born(birth, rng, size=2)


CHANNELS = (
    Rival(
        name="spin-noise",
        title="constant dipole with spin noise of either sign",
        own=("index_excess", "spin_noise_scale"),
        coordinates=("noise", "noise_scale"),
        secular=False,
        low=-np.inf,
        high=np.inf,
        noisy=True,
        respond=_respond,
        born=_born,
        pin=_pin,
    ),
)
