"""One posterior problem as numbers: an object, a channel, a cooling scenario and priors."""

from typing import Any, NamedTuple

import numpy as np
from numpy.typing import NDArray

from decayinfer.catalog.pulsar import Pulsar
from decayinfer.channels.base import Channel
from decayinfer.cooling.scenario import Scenario
from decayinfer.inference.priors import Priors

__all__ = ["COORDINATES", "Problem", "make_problem", "with_priors"]

#: The sampled coordinates; one that a channel does not use keeps a standard normal prior.
COORDINATES = (
    "logit_mass",  # logit of the mass within its range
    "warped_index",  # ln(n - 3), centred, scaled and with its tails drawn in; see Problem.warp
    "ln_q",  # impurity over phonon rate now
    "ln_eta",  # Hall rate over the reference rate now, before the attractor
    "logit_birth_period",  # logit(P_0 / P)
    "ln_attractor_ratio",  # ln of the attractor age over the age
    "ln_umklapp",  # ln(T_U / 1e8 K)
    "ln_phonon_time",  # depth, where phonon scattering does not fix it
)


class Problem(NamedTuple):
    """The data of the one compiled model; every field is an array, or a PyTensor variable inside the model.

    Attributes
    ----------
    spin : (3,)
        ln P [s], ln Pdot, ln tau_c [yr].
    index : (4,)
        Observed n or its upper limit, error below, error above, and 1 for a limit.
    use_index : ()
        1 with the likelihood of n, 0 without.
    flags : (3,)
        Switches of phonon scattering, impurity scattering and Hall drift.
    active : (8,)
        1 for each coordinate that the channel uses.
    freeze : (2,)
        Strength and power of the Umklapp freeze-out.
    table : (2, 16, 4)
        Cooling coefficients.
    scalars : (10,)
        Cooling scalars.
    structure : (2, 4)
        Chebyshev coefficients in mass of ln R [km] and ln I [1e45 g cm^2].
    normals : (2, 7)
        Means and standard deviations of the lognormal priors.
    warp : (3,)
        Centre c, width w and tail a of ln(n - 3) = c + (w/a) sinh(a z): the scatter factor gives n tails far
        wider than its core, which one step size cannot serve; drawn in, they mix well.
    shear : ()
        How much of ln S(t) goes into ln(n - 3), 1 or 0. With Hall drift alone and n free, ln(n - 3) falls as the switch
        closes, along a bent ridge of many e-folds; sheared, the coordinate follows the drift before the switch.
    limits : (5,)
        Mass prior mean, sd and ln norm; ln of the largest age [yr]; scale of the ln scatter factor.
    """

    spin: Any
    index: Any
    use_index: Any
    flags: Any
    active: Any
    freeze: Any
    table: Any
    scalars: Any
    structure: Any
    normals: Any
    warp: Any
    shear: Any
    limits: Any

    def without_index(self) -> "Problem":
        """Return the same problem with the likelihood of n switched off."""
        return self._replace(use_index=np.array(0.0), warp=_BROAD_WARP, shear=_hall_alone(self.flags))


_NO_TAIL = 0.01  # sinh(a z)/a is z to a part in 1e4
_BROAD_WARP = np.array([2.0, 1.2, _NO_TAIL])
_FREE_WIDTH = 0.5  # an index known worse than this in ln(n - 3) counts as free


def make_problem(pulsar: Pulsar, channel: Channel, scenario: Scenario, priors: Priors) -> Problem:
    """Collect the numbers of one posterior problem.

    Parameters
    ----------
    pulsar : Pulsar
        With a period, a period derivative, and an index or a limit on it.
    channel, scenario, priors
        The explanation, the cooling scenario and the priors.
    """
    phonon, impurity, hall = channel.flags
    ohmic = max(phonon, impurity)
    frozen = phonon * float(priors.freeze[0] > 0.0)
    active = [1.0, max(ohmic, hall), phonon * impurity, hall * ohmic, 1.0, hall, frozen]
    active.append((1.0 - phonon) * max(impurity, hall))
    limit = not np.isfinite(pulsar.braking_index)
    observed = pulsar.braking_index_limit if limit else pulsar.braking_index
    warp = _BROAD_WARP if limit or not channel.decays else _warp(pulsar, priors)
    free = warp[1] > _FREE_WIDTH
    return Problem(
        spin=np.log([pulsar.period, pulsar.period_derivative, pulsar.characteristic_age]),
        index=np.array([observed, *_errors(pulsar, limit), float(limit)]),
        use_index=np.array(1.0),
        flags=np.array(channel.flags),
        active=np.array(active),
        freeze=np.array(priors.freeze),
        table=scenario.table,
        scalars=scenario.scalars,
        structure=np.array([scenario.ln_radius, scenario.ln_inertia]),
        normals=priors.normals(),
        warp=warp,
        shear=_hall_alone(channel.flags) if free else np.array(0.0),
        limits=_limits(priors),
    )


def with_priors(problem: Problem, priors: Priors) -> Problem:
    """Return the same problem, in the same coordinates, under other priors of the physical parameters."""
    return problem._replace(normals=priors.normals(), limits=_limits(priors))


def _limits(priors: Priors) -> NDArray[np.float64]:
    return np.array(
        [priors.mass_mean, priors.mass_sd, priors.mass_ln_norm, np.log(priors.max_age), priors.scatter_sd]
    )


def _warp(pulsar: Pulsar, priors: Priors) -> NDArray[np.float64]:
    error = 0.5 * (pulsar.braking_index_err_minus + pulsar.braking_index_err_plus)
    excess = max(pulsar.braking_index - 3.0, error)
    # matched to the quantiles of a Gaussian whose scale has the scatter prior, out to four sigma
    width = min((1.0 + 0.9 * priors.scatter_sd) * error / excess, 1.2)
    tail = max(0.85 * priors.scatter_sd * (1.0 - width / 1.2), _NO_TAIL)
    return np.array([np.log(excess), width, tail])


def _hall_alone(flags: Any) -> NDArray[np.float64]:
    return np.array(float(flags[2] > 0.0 and flags[0] == flags[1] == 0.0))


def _errors(pulsar: Pulsar, limit: bool) -> tuple[float, float]:
    minus, plus = pulsar.braking_index_err_minus, pulsar.braking_index_err_plus
    if np.isfinite(minus) and np.isfinite(plus):
        return minus, plus
    if not limit:
        raise ValueError(f"{pulsar.name}: an index needs its error")
    # a limit quoted without an error is softened by 5 % of its distance from 3, at least 0.1
    width = max(0.1, 0.05 * abs(pulsar.braking_index_limit - 3.0))
    return width, width
