"""A wide companion whose pull changes the derivatives of the spin of a constant dipole.

Lognormal companion mass; orbital period log-uniform (Oepik's law, from memory) up to the widest, from the shortest
whose turn at its present rate takes longer than the data span, since a faster one would have been seen as an orbit;
thermal eccentricities, f(e) = 2e (Jeans 1919, MNRAS 79, 408, from memory), for orbits that encounters or a kick have
shaken; any moment, argument of periastron and direction alike. An argument of periastron half a turn further changes
the sign of the pull and nothing else, so the sign of the first coordinate chooses between the two and its size is the
period: the index is then nearly a monotone function of it.

The prior odds of the channel are apart from all this, and equal to those of the others unless told otherwise, although
few young pulsars have such a companion: multiply its probability by the odds you give it.
"""

import numpy as np
from numpy.typing import NDArray
from scipy.special import ndtr, ndtri

from decayinfer.channels.rival import Birth, Born, Response, Rival, Spin, constant_born, constant_response
from decayinfer.physics.companion import Orbit, Pull, contaminated_index, pull, pull_scale, turning

__all__ = ["CHANNELS"]

type Array = NDArray[np.float64]

_HIGHEST = 1.0 - 1e-12  # eccentricity; a parabola has no period
_LN_SQRT_2PI = 0.5 * float(np.log(2.0 * np.pi))


def _ln_range(orbit: Orbit, spin: Spin) -> tuple[Array, Array]:
    """Logs of the shortest and the longest orbital period [yr] of orbits of a shape."""
    span = spin.fact("data_span")
    least = span if np.isfinite(span) else spin.priors.companion_period_min
    low = np.log(least) + np.maximum(0.0, np.log(turning(orbit)))
    return low, np.maximum(np.log(spin.priors.companion_period_max), low + np.log(10.0))


def _orbit(coordinates: Array) -> tuple[Orbit, Array]:
    """Orbit up to half a turn, and ln of prior over normal density: the moment is uniform in time, not in E."""
    _, _, eccentric, moment, argument, cosine = coordinates
    e = np.minimum(np.sqrt(ndtr(eccentric)), _HIGHEST)
    anomaly = np.pi * (2.0 * ndtr(moment) - 1.0)
    tilt = 2.0 * ndtr(cosine) - 1.0
    orbit = Orbit(e, anomaly, np.pi * ndtr(argument), np.sqrt(1.0 - tilt**2))
    return orbit, np.log1p(-e * np.cos(anomaly))


def _companion_mass(coordinates: Array, spin: Spin) -> Array:
    return np.asarray(
        spin.priors.companion_mass_median * np.exp(spin.priors.companion_mass_sd * coordinates[1])
    )


def _seen(coordinates: Array, spin: Spin) -> tuple[Pull, dict[str, Array], Array]:
    """Acceleration and jerk over c, the reported orbit, and the log density of its moment."""
    orbit, ln_moment = _orbit(coordinates)
    low, high = _ln_range(orbit, spin)
    short = ndtr(-np.abs(coordinates[0])) * 2.0  # 1 for the widest orbit, 0 for the closest
    period = np.exp(low + (high - low) * short)
    companion = _companion_mass(coordinates, spin)
    scale, shape = pull_scale(spin.mass, companion, period), pull(orbit)
    # the excess is minus the jerk times (P/Pdot)^2: a positive coordinate wants a negative jerk
    turn = -np.sign(coordinates[0]) * np.sign(shape.jerk)
    own = {
        "companion_mass": companion,
        "orbital_period": period,
        "eccentricity": orbit.eccentricity,
        "inclination": np.degrees(np.arcsin(orbit.sine_inclination)),
    }
    return (
        Pull(turn * scale.acceleration * shape.acceleration, turn * scale.jerk * shape.jerk),
        own,
        ln_moment,
    )


def _respond(coordinates: Array, spin: Spin) -> Response:
    seen, own, ln_moment = _seen(coordinates, spin)
    ratio = 1.0 - spin.timescale * seen.acceleration
    index = contaminated_index(ratio, seen.jerk, timescale=spin.timescale)
    own |= {"index_excess": index - 3.0, "acceleration_share": 1.0 - ratio}
    response = constant_response(spin, index, own, derivative_ratio=ratio)
    return response._replace(ln_jacobian=ln_moment)


def _pin(excess: Array, coordinates: Array, spin: Spin) -> tuple[Array, Array]:
    """Invert excess = D P_b^(-7/3) - 3 timescale A P_b^(-4/3), jerk and acceleration, where the jerk prevails."""
    orbit, _ = _orbit(coordinates)
    low, high = _ln_range(orbit, spin)
    scale, shape = pull_scale(spin.mass, _companion_mass(coordinates, spin), np.exp(low)), pull(orbit)
    largest = spin.timescale**2 * scale.jerk * np.abs(shape.jerk)
    # what the acceleration adds, relative to a jerk part of largest size, with its sign relative to the jerk's
    added = 3.0 * spin.timescale * scale.acceleration * shape.acceleration * np.sign(shape.jerk) / largest
    size = np.abs(excess) / largest
    part = size
    for _ in range(8):
        part = np.maximum(size - added * part ** (4.0 / 7.0), 0.01 * size)
    slope = 1.0 + 4.0 / 7.0 * added * part ** (-3.0 / 7.0)
    coordinate, ln_slope = _from_period(-3.0 / 7.0 * np.log(part), high - low)
    ln_slope += np.log(3.0 / 7.0 / (part * largest) / np.where(slope > 0.5, slope, np.nan))
    return np.sign(excess) * coordinate, ln_slope


def _pin_ratio(ln_ratio: Array, coordinates: Array, spin: Spin) -> tuple[Array, Array]:
    """Invert ratio = 1 - timescale A P_b^(-4/3)."""
    orbit, _ = _orbit(coordinates)
    low, high = _ln_range(orbit, spin)
    scale, shape = pull_scale(spin.mass, _companion_mass(coordinates, spin), np.exp(low)), pull(orbit)
    lost = -np.expm1(ln_ratio)
    wanted = np.abs(lost) / (spin.timescale * scale.acceleration * np.abs(shape.acceleration))
    coordinate, ln_slope = _from_period(-3.0 / 4.0 * np.log(wanted), high - low)
    ln_slope += np.log(3.0 / 4.0 / np.abs(lost)) + ln_ratio
    return -np.sign(lost * shape.acceleration * shape.jerk) * coordinate, ln_slope


def _from_period(ln_stretch: Array, ln_range: Array) -> tuple[Array, Array]:
    """Size of the first coordinate for ln of the period over the shortest, and ln of its derivative by that."""
    short = ln_stretch / ln_range
    reached = (short > 0.0) & (short < 1.0)
    size = -ndtri(0.5 * np.where(reached, short, 0.5))
    ln_slope = 0.5 * size**2 + _LN_SQRT_2PI - np.log(2.0 * ln_range)  # d(short)/d(size) = -2 phi(size)
    return size, np.where(reached, ln_slope, -np.inf)


def _born(birth: Birth, rng: np.random.Generator) -> Born:
    alone = constant_born(birth, rng, size=6)
    coordinates = alone.coordinates
    coordinates[:, 3] = _moments(coordinates[:, 2], rng)
    spin = Spin(
        alone.period, alone.period_derivative, birth.mass, birth.period / alone.period, None, birth.priors
    )
    seen, _, _ = _seen(coordinates.T, spin)
    return Born(alone.period, alone.period_derivative + alone.period * seen.acceleration, coordinates)


def _moments(eccentric: Array, rng: np.random.Generator) -> Array:
    """Draw the coordinate of the eccentric anomaly so that the moment is uniform in time, by Kepler's equation."""
    e = np.minimum(np.sqrt(ndtr(eccentric)), _HIGHEST)
    mean = np.pi * (2.0 * rng.random(e.size) - 1.0)
    low, high = np.full_like(e, -np.pi), np.full_like(e, np.pi)
    for _ in range(60):  # E - e sin E is monotone
        middle = 0.5 * (low + high)
        late = middle - e * np.sin(middle) > mean
        low, high = np.where(late, low, middle), np.where(late, middle, high)
    moment: Array = ndtri(0.5 * (low + high) / (2.0 * np.pi) + 0.5)
    return moment


CHANNELS = (
    Rival(
        name="companion",
        title="constant dipole pulled by a wide companion",
        own=(
            "index_excess", "acceleration_share", "companion_mass", "orbital_period", "eccentricity", "inclination",
        ),
        coordinates=("orbital_period", "companion_mass", "eccentricity", "moment", "argument", "cosine"),
        secular=False,
        low=-np.inf,
        high=np.inf,
        respond=_respond,
        born=_born,
        pin=_pin,
        pin_ratio=_pin_ratio,
    ),
)  # fmt: skip
