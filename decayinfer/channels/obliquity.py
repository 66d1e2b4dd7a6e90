"""A constant field whose axis aligns with the spin: in vacuum, and with a plasma-filled magnetosphere.

The axis is isotropic at birth. The coordinate is the cosine of today's angle, for which every P_0 < P has a past; the
prior of the birth cosine is flat, so its derivative by today's is the density that the coordinate gains.
"""

from collections.abc import Callable
from functools import partial

import numpy as np
from numpy.typing import NDArray
from scipy.special import ndtr, ndtri

from decayinfer.channels.rival import Birth, Born, Response, Rival, Spin
from decayinfer.physics.constants import YEAR_S
from decayinfer.physics.obliquity import Past, Present, plasma_past, plasma_today, vacuum_past, vacuum_today
from decayinfer.physics.torque import PLASMA, VACUUM, Torque

__all__ = ["CHANNELS"]

type Array = NDArray[np.float64]

_PLASMA_HIGHEST = 3.25  # of 3 + 2 s^2 c^2/(1 + s^2)^2, at sin^2 a = 1/3


def _respond(
    coordinates: Array, spin: Spin, *, torque: Torque, past: Callable[[Array, Array, Array], Past]
) -> Response:
    cosine = ndtr(coordinates[0])
    s2 = ndtr(-coordinates[0]) * (1.0 + cosine)
    history = past(cosine, s2, spin.period_ratio)
    factor = torque.k0 + torque.k1 * s2
    own = {
        "obliquity": np.degrees(np.arctan2(np.sqrt(s2), cosine)),
        "birth_obliquity": np.degrees(np.arccos(np.minimum(history.birth_cosine, 1.0))),
    }
    return Response(
        braking_index=3.0 + 2.0 * torque.k1 * torque.k2 * s2 * cosine**2 / factor**2,
        derivative_ratio=np.ones_like(cosine),
        torque=factor,
        age_ratio=history.age_ratio,
        ln_jacobian=np.log(history.slope),
        parameters=own,
    )


def _born(
    birth: Birth,
    rng: np.random.Generator,
    *,
    torque: Torque,
    today: Callable[[Array, Array], Present],
) -> Born:
    scale = torque.k1 * birth.strength  # P Pdot at sin^2 a = 1 in vacuum, half of it in plasma
    now = today(rng.random(birth.mass.size), 2.0 * scale * birth.age / birth.period**2)
    period = birth.period * now.period_growth
    derivative = birth.strength * (torque.k0 + torque.k1 * now.sine_squared) / period / YEAR_S
    # from the sine, which stays exact near alignment: 1 - c = s^2/(1 + c)
    cosine = np.sqrt(now.cosine_squared)
    return Born(period, derivative, -ndtri(now.sine_squared / (1.0 + cosine))[:, None])


CHANNELS = (
    Rival(
        name="obliquity-vacuum",
        title="constant dipole that aligns in vacuum",
        own=("obliquity", "birth_obliquity"),
        coordinates=("cosine",),
        low=3.0,
        high=np.inf,
        respond=partial(_respond, torque=VACUUM, past=vacuum_past),
        born=partial(_born, torque=VACUUM, today=vacuum_today),
    ),
    Rival(
        name="obliquity-plasma",
        title="constant dipole that aligns with a plasma-filled magnetosphere",
        own=("obliquity", "birth_obliquity"),
        coordinates=("cosine",),
        low=3.0,
        high=_PLASMA_HIGHEST,
        respond=partial(_respond, torque=PLASMA, past=plasma_past),
        born=partial(_born, torque=PLASMA, today=plasma_today),
    ),
)
