"""Forward from birth under a rival of decay: what an observer finds today."""

from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from decayinfer.channels.rival import Birth, Rival, Spin
from decayinfer.cooling.scenario import Scenario
from decayinfer.inference.forward import PriorDraws
from decayinfer.inference.priors import Priors
from decayinfer.inference.rival_density import rival_parameters
from decayinfer.physics import torque
from decayinfer.physics.constants import YEAR_S

__all__ = ["RivalToday", "evolve_rival"]

type Array = NDArray[np.float64]


class RivalToday(NamedTuple):
    """What an observer finds: period [s], its derivative [s/s], index, and the truths behind them, each (n,)."""

    period: Array
    period_derivative: Array
    braking_index: Array
    truths: dict[str, Array]


def evolve_rival(
    draws: PriorDraws, rival: Rival, scenario: Scenario, priors: Priors, rng: np.random.Generator
) -> RivalToday:
    """Evolve stars from birth to now, and draw what is the rival's own.

    Parameters
    ----------
    draws : PriorDraws
        Mass, birth field, birth period and age of n stars.
    rival, scenario, priors
        The explanation, the star and the priors of what is the rival's own.
    rng : numpy.random.Generator
        Source of randomness.
    """
    constant = torque.spin_down_constant(
        radius_km=scenario.radius_km(draws.mass), inertia_45=scenario.inertia_45(draws.mass), torque=1.0
    )
    strength = constant * draws.birth_field**2 * YEAR_S
    with np.errstate(all="ignore"):  # a companion may make Pdot vanish or negative: no index then
        born = rival.born(Birth(draws.mass, draws.birth_period, strength, draws.age, priors), rng)
        ratio = draws.birth_period / born.period
        spin = Spin(born.period, born.period_derivative, draws.mass, ratio, None, priors)
        response = rival.respond(born.coordinates.T, spin)
        truths = rival_parameters(spin, response, rival, scenario)
    return RivalToday(born.period, born.period_derivative, response.braking_index, truths)
