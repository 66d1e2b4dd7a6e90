r"""Forward from birth: draws of the prior, and the spin and index they have today.

With u = B/B_0 the field equation -du/ds = r_Ohm u + (kappa_0) S u^2 is solved by

.. math::

    u(s) = e^{-I(s)} / [1 + \kappa_0 K(s)], \qquad K(s) = \int_0^s S e^{-I}

(Bernoulli's equation), and P^2 = P_0^2 + 2 C B_0^2 times the integral of u^2. The inference runs the same physics
backwards from P and Pdot; here nothing is conditioned, which is what simulations need.
"""

from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from decayinfer.channels.base import Channel
from decayinfer.cooling.form import MASS_RANGE
from decayinfer.cooling.scenario import Scenario
from decayinfer.inference.ages import AGE_TAPER
from decayinfer.inference.nodes import quadrature
from decayinfer.inference.priors import Priors
from decayinfer.physics import torque
from decayinfer.physics.conduction import density_from_phonon_time, impurity_time
from decayinfer.physics.constants import YEAR_S
from decayinfer.physics.hall import attractor_switch, hall_time

__all__ = ["PriorDraws", "Today", "draw_prior", "evolve"]

type Array = NDArray[np.float64]

_QUADRATURE = quadrature(160, 9.0)  # 1e-5 for stars of 10 Myr under the sharpest freeze-out
_FROM_BIRTH = _QUADRATURE.weights - _QUADRATURE.to_now


class PriorDraws(NamedTuple):
    """Physical parameters drawn from the prior, each (n,); yr, 1e12 G, s, 1e8 K."""

    mass: Array
    phonon_time: Array
    impurity_parameter: Array
    hall_factor: Array
    attractor_times: Array
    birth_field: Array
    birth_period: Array
    umklapp: Array
    age: Array


class Today(NamedTuple):
    """What an observer finds now, each (n,); s, s/s, 1e12 G, 1/yr, yr, 1e8 K."""

    period: Array
    period_derivative: Array
    braking_index: Array
    field: Array
    rate_phonon: Array
    rate_impurity: Array
    rate_hall: Array
    hall_time: Array
    temperature: Array


def draw_prior(n: int, priors: Priors, rng: np.random.Generator) -> PriorDraws:
    """Draw physical parameters from their priors.

    Parameters
    ----------
    n : int
        Number of draws.
    priors : Priors
        The priors.
    rng : numpy.random.Generator
        Source of randomness.
    """
    from scipy.stats import truncnorm

    low, high = ((edge - priors.mass_mean) / priors.mass_sd for edge in MASS_RANGE)
    mass = truncnorm.rvs(low, high, loc=priors.mass_mean, scale=priors.mass_sd, size=n, random_state=rng)
    means, sds = priors.normals()
    logs = means + sds * rng.standard_normal((n, means.size))
    return PriorDraws(mass, *np.exp(logs.T), _draw_age(n, priors, rng))  # type: ignore[call-arg]  # seven columns


def evolve(draws: PriorDraws, channel: Channel, scenario: Scenario, priors: Priors) -> Today:
    """Evolve field and spin from birth to now.

    Parameters
    ----------
    draws : PriorDraws
        Parameters of n stars.
    channel, scenario : Channel, Scenario
        What makes the field decay, and the star.
    priors : Priors
        For the law of the Umklapp freeze-out.
    """
    with np.errstate(divide="ignore", over="ignore"):  # a field that has died has no index; its row says so
        return _evolve(draws, channel, scenario, priors)


def _evolve(draws: PriorDraws, channel: Channel, scenario: Scenario, priors: Priors) -> Today:
    phonon, impurity, hall = channel.flags
    redshift, gravity = scenario.redshift_factor(draws.mass), scenario.gravity_14(draws.mass)
    radius, inertia = scenario.radius_km(draws.mass), scenario.inertia_45(draws.mass)
    density = density_from_phonon_time(draws.phonon_time, gravity)
    ages = draws.age[:, None] * np.append(_QUADRATURE.sigma, 1.0)
    temperature = np.exp(scenario.ln_temperature(np.log(ages), draws.mass[:, None]))
    strength, power = priors.freeze
    freeze = np.exp(-strength * (draws.umklapp[:, None] / temperature) ** power)
    rate_phonon = phonon * (redshift / draws.phonon_time)[:, None] * temperature**2 * freeze
    rate_impurity = impurity * redshift / impurity_time(density, draws.impurity_parameter, gravity_14=gravity)
    birth_hall_time = draws.hall_factor * hall_time(density, draws.birth_field, gravity_14=gravity)
    birth_drift = hall * redshift / birth_hall_time
    attractor_age = draws.attractor_times * birth_hall_time / redshift

    ohmic = rate_phonon + rate_impurity[:, None]
    depth = draws.age[:, None] * np.column_stack(
        [ohmic[:, :-1] @ _FROM_BIRTH.T, ohmic[:, :-1] @ _QUADRATURE.weights]
    )
    switch = attractor_switch(ages, attractor_age[:, None])
    source = (switch * np.exp(-depth))[:, :-1]
    drifted = draws.age[:, None] * np.column_stack([source @ _FROM_BIRTH.T, source @ _QUADRATURE.weights])
    ratio = np.exp(-depth) / (1.0 + birth_drift[:, None] * drifted)

    constant = torque.spin_down_constant(radius_km=radius, inertia_45=inertia)
    braking = draws.age * YEAR_S * (ratio[:, :-1] ** 2 @ _QUADRATURE.weights)
    period = np.sqrt(draws.birth_period**2 + 2.0 * constant * draws.birth_field**2 * braking)
    field = draws.birth_field * ratio[:, -1]
    derivative = constant * field**2 / period
    rate_hall = birth_drift * ratio[:, -1] * switch[:, -1]
    total = rate_phonon[:, -1] + rate_impurity + rate_hall
    index = torque.braking_index(total, torque.characteristic_age(period, derivative))
    return Today(
        period, derivative, index, field, rate_phonon[:, -1], rate_impurity, rate_hall,
        birth_hall_time * draws.birth_field / field, temperature[:, -1],
    )  # fmt: skip


def _draw_age(n: int, priors: Priors, rng: np.random.Generator) -> Array:
    """Uniform up to the largest age, with the taper that the density has there."""
    accepted = np.empty(0)
    while accepted.size < n:
        age = priors.max_age * 5.0 * rng.random(6 * n + 10)
        keep = rng.random(age.size) < 1.0 / (1.0 + (age / priors.max_age) ** AGE_TAPER)
        accepted = np.concatenate([accepted, age[keep]])
    return accepted[:n]
