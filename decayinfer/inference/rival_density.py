r"""The density of a rival's coordinates given P and Pdot, and what its points mean.

Coordinates are standard normal images of the priors: mass, birth period (cut at P) and the rival's own. The prior of
(ln B, t) at birth becomes one of (ln P, ln Pdot) today: along the spin-down at fixed P_0 and K = P Pdot/torque,
K dt = P dP/torque, so d ln B dt = (1/2) d ln K dt = tau_c d ln P d ln Pdot whatever the torque. The density is then

.. math::

    p(\ln B) \, p(t) \, \tau_c \, J, \qquad t = \tau_c \, (t/\tau_c),

where tau_c and B belong to the intrinsic Pdot, which brings d ln Pdot/d ln Pdot_obs = Pdot_obs/Pdot, and J is the
rival's own derivative of birth by today's coordinates. Integrated over the coordinates it is p(ln P, ln Pdot | rival).
"""

from dataclasses import dataclass, replace
from enum import Enum
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray
from scipy.special import log_ndtr, ndtr, ndtri

from decayinfer.catalog.pulsar import Pulsar
from decayinfer.channels.rival import Response, Rival, Spin
from decayinfer.cooling.form import MASS_RANGE
from decayinfer.cooling.scenario import Scenario
from decayinfer.inference.ages import ln_age_density
from decayinfer.inference.measurement import ln_index_likelihood
from decayinfer.inference.priors import Priors
from decayinfer.physics import torque
from decayinfer.physics.constants import B_UNIT_G, T_UNIT_K

__all__ = ["SHARED", "Evaluated", "Pinned", "RivalProblem", "evaluate_rival", "pinnable", "rival_parameters"]

type Array = NDArray[np.float64]

SHARED = ("mass", "birth_period")  #: coordinates that every rival has, before its own
_LEAST_LN_RATIO = 0.2
_LN_2PI = float(np.log(2.0 * np.pi))


class Pinned(Enum):
    """What stands in for a rival's first coordinate."""

    NOTHING = "nothing"
    INDEX = "index"  # the excess of n over 3
    RATIO = "ratio"  # ln of intrinsic over observed Pdot


@dataclass(frozen=True)
class RivalProblem:
    """One posterior problem of a rival.

    Attributes
    ----------
    pulsar, rival, scenario, priors
        The object, the explanation, the cooling scenario (for radius, inertia and temperature) and the priors.
    index : tuple of float
        Observed n or its limit, error below, error above, and 1 for a limit.
    pinned : Pinned
        What the rival's first coordinate is replaced by.
    least_excess : float
        Size of n - 3 below which an index is not pinned. A rival that mostly adds next to nothing crowds the index at
        3, where the slope of the pinned coordinate grows without bound and the likelihood is flat.
    """

    pulsar: Pulsar
    rival: Rival
    scenario: Scenario
    priors: Priors
    index: tuple[float, float, float, float]
    pinned: Pinned = Pinned.NOTHING
    least_excess: float = 0.0

    @property
    def size(self) -> int:
        """Number of coordinates."""
        return len(SHARED) + len(self.rival.coordinates)

    def pin(self, what: Pinned) -> "RivalProblem":
        """Return the same problem with another third coordinate."""
        return replace(self, pinned=what)


class Evaluated(NamedTuple):
    """Densities and meaning of n points.

    Attributes
    ----------
    coordinates : (n, d) array
        Standard normal coordinates, unpinned.
    ln_prior : (n,) array
        Log prior density of those at the object's ln P and ln Pdot.
    ln_pinned : (n,) array
        Log of the derivative of those by the pinned ones, zero when not pinned.
    ln_likelihood : (n,) array
        Log likelihood of n.
    spin : Spin
    response : Response
    """

    coordinates: Array
    ln_prior: Array
    ln_pinned: Array
    ln_likelihood: Array
    spin: Spin
    response: Response


def evaluate_rival(points: Array, problem: RivalProblem) -> Evaluated:
    """Evaluate the density of a rival at points, (n, d), pinned as the problem says."""
    with np.errstate(all="ignore"):  # far points overflow to -inf, which is what they are worth
        return _evaluate(points, problem)


def pinnable(e: Evaluated, problem: RivalProblem, what: Pinned) -> NDArray[np.bool_]:
    """Tell which points a pinned coordinate reaches: those that pinning their own value leads back to, (n,).

    Values too near zero are left out, see `RivalProblem.least_excess`; so are ratios near one.
    """
    own = e.coordinates[:, len(SHARED) :].T
    with np.errstate(all="ignore"):
        if what is Pinned.INDEX:
            value, least = e.response.braking_index - 3.0, problem.least_excess
        else:
            value, least = np.log(e.response.derivative_ratio), _LEAST_LN_RATIO
        back, ln_slope = _pin(value, own, e.spin, problem.rival, what)
        same = np.abs(back - own[0]) < 1e-6 * (1.0 + np.abs(own[0]))
    reached: NDArray[np.bool_] = same & np.isfinite(ln_slope) & (np.abs(value) > least)
    return reached


def rival_parameters(spin: Spin, response: Response, rival: Rival, scenario: Scenario) -> dict[str, Array]:
    """Return the parameters that a rival reports, in the units of `decayinfer.inference.outcome.PARAMETERS`."""
    ln_field, ln_age = _field_and_age(spin, response, scenario)
    field = np.exp(ln_field) * B_UNIT_G
    every = {
        "mass": spin.mass,
        "age": np.exp(ln_age),
        "birth_field": field,
        "birth_period": spin.period_ratio * spin.period,
        "field": field,
        "braking_index": response.braking_index,
        "crust_temperature": np.exp(scenario.ln_temperature(ln_age, spin.mass)) * T_UNIT_K,
        **response.parameters,
    }
    return {name: every[name] for name in rival.parameters}


def _evaluate(points: Array, problem: RivalProblem) -> Evaluated:
    coordinates = np.array(points, dtype=float)
    star, priors = problem.pulsar, problem.priors
    mass = _mass(coordinates[:, 0], priors)
    ratio, ln_cut = _period_ratio(coordinates[:, 1], star.period, priors)
    spin = Spin(star.period, star.period_derivative, mass, ratio, star, priors)
    own = coordinates[:, len(SHARED) :].T  # a view: pinning writes through
    ln_pinned = np.zeros(mass.size)
    if problem.pinned is not Pinned.NOTHING:
        unfold = _excess if problem.pinned is Pinned.INDEX else _ln_ratio
        value, ln_stretch = unfold(own[0].copy(), problem)
        own[0], ln_slope = _pin(value, own, spin, problem.rival, problem.pinned)
        ln_pinned = _finite(ln_slope + ln_stretch)
    response = problem.rival.respond(own, spin)
    ln_field, ln_age = _field_and_age(spin, response, problem.scenario)
    ln_ratio = np.log(response.derivative_ratio)  # nan, hence no density, where not positive
    ln_tau = np.log(star.characteristic_age) - ln_ratio
    mean, sd = priors.normals()[:, 4]
    ln_prior = -0.5 * np.sum(coordinates**2, axis=1) - 0.5 * problem.size * _LN_2PI + ln_cut
    ln_prior += -0.5 * ((ln_field - mean) / sd) ** 2 - np.log(sd) - 0.5 * _LN_2PI
    ln_prior += ln_tau + ln_age_density(ln_age, np.log(priors.max_age)) + response.ln_jacobian - ln_ratio
    observed, minus, plus, limit = problem.index
    likelihood = ln_index_likelihood(observed, response.braking_index, minus, plus, limit, priors.scatter_sd)
    return Evaluated(coordinates, _finite(ln_prior), ln_pinned, _finite(likelihood), spin, response)


def _mass(u: Array, priors: Priors) -> Array:
    low, high = ((edge - priors.mass_mean) / priors.mass_sd for edge in MASS_RANGE)
    mass: Array = priors.mass_mean + priors.mass_sd * ndtri(ndtr(low) + (ndtr(high) - ndtr(low)) * ndtr(u))
    return mass


def _period_ratio(u: Array, period: float, priors: Priors) -> tuple[Array, float]:
    """P_0/P below one, and ln of the prior probability of that."""
    mean, sd = priors.normals()[:, 5]
    edge = (np.log(period) - mean) / sd
    ln_birth = mean + sd * ndtri(ndtr(edge) * ndtr(u))
    return np.exp(ln_birth - np.log(period)), float(log_ndtr(edge))


def _field_and_age(spin: Spin, response: Response, scenario: Scenario) -> tuple[Array, Array]:
    """Logs of the field [1e12 G] and of the age [yr]."""
    constant = torque.spin_down_constant(
        radius_km=scenario.radius_km(spin.mass),
        inertia_45=scenario.inertia_45(spin.mass),
        torque=response.torque,
    )
    with np.errstate(all="ignore"):
        derivative = spin.period_derivative * response.derivative_ratio
        ln_field = 0.5 * np.log(spin.period * derivative / constant)
        ln_age = np.log(torque.characteristic_age(spin.period, derivative) * response.age_ratio)
    return ln_field, ln_age


def _excess(y: Array, problem: RivalProblem) -> tuple[Array, Array]:
    """Excess over 3 from a coordinate in whose units the likelihood is nearly normal, and ln of the derivative."""
    observed, minus, plus, _ = problem.index
    scatter = problem.priors.scatter_sd
    width = (1.0 + 0.9 * scatter) * 0.5 * (minus + plus)
    tail = max(0.85 * scatter, 0.01)  # the same that `decayinfer.inference.problem` gives to decay
    return observed - 3.0 + width * np.sinh(tail * y) / tail, np.log(width) + np.log(np.cosh(tail * y))


def _ln_ratio(y: Array, problem: RivalProblem) -> tuple[Array, float]:
    """Ln of the intrinsic over the observed Pdot: enough of it to make the star young, or less and an older star."""
    edge = float(np.log(problem.pulsar.characteristic_age / problem.priors.max_age))
    centre, width = 0.5 * edge if edge < 0.0 else edge + 0.7, max(1.0, 0.4 * abs(edge))
    return centre + width * y, float(np.log(width))


def _pin(value: Array, own: Array, spin: Spin, rival: Rival, what: Pinned) -> tuple[Array, Array]:
    pin = rival.pin if what is Pinned.INDEX else rival.pin_ratio
    if pin is None:
        raise ValueError(f"{rival.name} has no coordinate for the {what.value}")
    return pin(value, own, spin)


def _finite(values: Array) -> Array:
    return np.where(np.isfinite(values), values, -np.inf)
