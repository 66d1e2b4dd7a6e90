"""What a rival is: an explanation of n beside decay, with a field that is constant.

A rival shares mass, birth period, birth field and age with the decay channels, and adds coordinates of its own, each
standard normal a priori. From those it says what it makes of the star: see `Response`.
"""

from collections.abc import Callable, Mapping
from dataclasses import dataclass
from typing import Any, NamedTuple

import numpy as np
from numpy.typing import NDArray

from decayinfer.catalog.pulsar import Pulsar
from decayinfer.channels.base import Channel
from decayinfer.physics.constants import YEAR_S

__all__ = ["Birth", "Born", "Response", "Rival", "Spin", "constant_born", "constant_response"]

type Array = NDArray[np.float64]


class Spin(NamedTuple):
    """A star as observed, with trial values of what is not.

    Attributes
    ----------
    period, period_derivative : float or (n,) array
        As observed [s], [s/s].
    mass : (n,) array
        Mass [M_sun].
    period_ratio : (n,) array
        Birth period over period.
    pulsar : Pulsar or None
        Further facts of the object, where there are any.
    priors : Priors
        `decayinfer.inference.priors.Priors`, which stands above this folder.
    """

    period: Any
    period_derivative: Any
    mass: Array
    period_ratio: Array
    pulsar: Pulsar | None
    priors: Any

    @property
    def timescale(self) -> Any:
        """P/Pdot [s]."""
        return self.period / self.period_derivative

    @property
    def timescale_yr(self) -> Any:
        """P/Pdot [yr]."""
        return self.timescale / YEAR_S

    def fact(self, name: str) -> float:
        """Return a further measurement of the object, nan where there is none."""
        return float(getattr(self.pulsar, name, np.nan))


class Response(NamedTuple):
    """What a rival makes of a star, arrays of shape (n,).

    Attributes
    ----------
    braking_index : array
        The braking index an observer finds.
    derivative_ratio : array
        Intrinsic over observed Pdot; not positive where no spin-down could be behind it.
    torque : array
        k0 + k1 sin^2 a of today.
    age_ratio : array
        Age over the characteristic age of the intrinsic Pdot.
    ln_jacobian : array
        Log of prior over standard normal density of the coordinates, for those drawn otherwise than given.
    parameters : mapping of str to array
        The rival's own reported parameters.
    """

    braking_index: Array
    derivative_ratio: Array
    torque: Array
    age_ratio: Array
    ln_jacobian: Array
    parameters: Mapping[str, Array]


class Birth(NamedTuple):
    """Stars at birth and their ages, arrays of shape (n,): M_sun, s, s^2/yr for P Pdot at unit torque, yr."""

    mass: Array
    period: Array
    strength: Array
    age: Array
    priors: Any


class Born(NamedTuple):
    """The same stars as observed today: period [s], derivative [s/s], coordinates (n, k)."""

    period: Array
    period_derivative: Array
    coordinates: Array


@dataclass(frozen=True, kw_only=True)
class Rival(Channel):
    """An explanation of n other than decay of the field: a channel in which no process of decay acts.

    Attributes
    ----------
    own : tuple of str
        Names of the parameters it reports beside those of every channel.
    coordinates : tuple of str
        Names of its own coordinates, each standard normal a priori.
    low, high : float
        The indices that it can reach.
    noisy : bool
        Whether spin noise is in it already, so that no reading of n adds more.
    respond : callable
        ``respond(coordinates, spin)`` with coordinates (k, n) gives the `Response`.
    born : callable
        ``born(birth, rng)`` gives the stars today, `Born`.
    pin : callable or None
        ``pin(excess, coordinates, spin)`` gives the first coordinate that adds an excess to an index of 3, the others
        being as given, and ln of the size of its derivative; minus infinity where none does. Needed where the index
        hangs on several coordinates at once: a well-measured one is then a thin bent sheet that no mixture follows.
    pin_ratio : callable or None
        The same for ln of the intrinsic over the observed Pdot, where the rival changes that.
    """

    own: tuple[str, ...]
    coordinates: tuple[str, ...]
    low: float
    high: float
    noisy: bool = False
    respond: Callable[[Array, Spin], Response]
    born: Callable[[Birth, np.random.Generator], Born]
    pin: Callable[[Array, Array, Spin], tuple[Array, Array]] | None = None
    pin_ratio: Callable[[Array, Array, Spin], tuple[Array, Array]] | None = None

    @property
    def parameters(self) -> tuple[str, ...]:
        """Names of the parameters that a posterior under this channel reports."""
        return (*super().parameters, *self.own)


def constant_response(
    spin: Spin, index: Array, parameters: Mapping[str, Array], *, derivative_ratio: Array | None = None
) -> Response:
    """Return the response of an orthogonal dipole whose index something else has changed."""
    one = np.ones_like(spin.mass)
    return Response(
        braking_index=index,
        derivative_ratio=one if derivative_ratio is None else derivative_ratio,
        torque=2.0 / 3.0 * one,  # `decayinfer.physics.torque.ORTHOGONAL_VACUUM`
        age_ratio=1.0 - spin.period_ratio**2,
        ln_jacobian=np.zeros_like(one),
        parameters=parameters,
    )


def constant_born(birth: Birth, rng: np.random.Generator, *, size: int) -> Born:
    """Return stars that spin down as orthogonal dipoles, with coordinates from their prior."""
    product = 2.0 / 3.0 * birth.strength
    period = np.sqrt(birth.period**2 + 2.0 * product * birth.age)
    return Born(period, product / period / YEAR_S, rng.standard_normal((birth.mass.size, size)))
