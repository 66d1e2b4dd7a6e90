r"""The closed form shared by every cooling scenario: ln T_b as a smooth, falling function of age and mass.

With the logarithmic clock x = ln[(t + t_r) / 1e5 yr] and the mass variable m = (M - 1.5 M_sun) / 0.5 M_sun,

.. math::

    Y = a_0 - s_0 x - \sum_K s_k w_k\,\mathrm{softplus}\frac{x - l_k}{w_k}
        - \sum_J b_j\,\mathrm{sigmoid}\frac{x - c_j}{v_j} - e^{\beta x - q}

every term of which falls with age because s, w, b, v and beta are positive: they are exponentials of Chebyshev
polynomials in m, the others are plain Chebyshev polynomials. A scenario with direct Urca joins a slow and a
fast branch by the soft minimum -(1/p) ln(e^{-p Y_slow} + e^{-p Y_fast}), the fast branch being lowered by
g ln softplus((M - M_D)/w_D) so that it rules only above the threshold mass M_D.

Two departures keep the field history regular: t_r, the time the crust takes to relax, makes the temperature finite
at birth; and a floor T_f, below which the phonon rate is negligible, keeps ln T from running away once an iron
envelope radiates faster than ln T can follow. The form is our own device; the physics is in its coefficients.
"""

from typing import Any

import numpy as np
from numpy.typing import NDArray

from decayinfer.physics.namespace import namespace

__all__ = [
    "DEGREE",
    "FLOOR_SHARPNESS",
    "MASS_RANGE",
    "PARAMETERS",
    "POSITIVE",
    "REFERENCE_AGE",
    "SCALARS",
    "chebyshev",
    "ln_temperature",
]

#: Parameters of one branch, in the order of the coefficient table.
PARAMETERS = (
    "a0", "s0", "s1", "l1", "w1", "s2", "l2", "w2",
    "b1", "c1", "v1", "b2", "c2", "v2", "beta", "q",
)  # fmt: skip
#: The parameters whose logarithm is the polynomial.
POSITIVE = frozenset({"s0", "s1", "w1", "s2", "w2", "b1", "v1", "b2", "v2", "beta"})
#: Scalars of a scenario, in the order of the scalar vector.
SCALARS = (
    "softplus_terms", "sigmoid_terms", "exponential_term", "direct_urca",
    "sharpness", "urca_slope", "urca_mass", "urca_width", "ln_floor", "relaxation_time",
)  # fmt: skip
DEGREE = 3  #: degree of the Chebyshev polynomials in mass
REFERENCE_AGE = 1e5  #: age at which the clock x is zero [yr]
MASS_RANGE = (1.0, 2.0)  #: masses covered by every scenario [M_sun]
FLOOR_SHARPNESS = 8.0  #: exponent joining the cooling curve to its floor

_INDEX = {name: i for i, name in enumerate(PARAMETERS)}


def chebyshev(coefficients: NDArray[np.float64], mass: Any) -> Any:
    """Evaluate a Chebyshev polynomial in m = (M - 1.5)/0.5 by the recurrence T_{k+1} = 2 m T_k - T_{k-1}.

    Parameters
    ----------
    coefficients : (DEGREE + 1,) array
        Coefficients, lowest degree first.
    mass : float, array or PyTensor variable
        Mass [M_sun].
    """
    m = (mass - 1.5) / 0.5
    previous, current = 1.0, m
    total = coefficients[0] + coefficients[1] * m
    for k in range(2, DEGREE + 1):
        previous, current = current, 2.0 * m * current - previous
        total = total + coefficients[k] * current
    return total


def ln_temperature(ln_age: Any, mass: Any, table: Any, scalars: Any) -> Any:
    """Return ln(T_b / 1e8 K), the local temperature at the base of the envelope.

    Parameters
    ----------
    ln_age : float, array or PyTensor variable
        Logarithm of the age in years.
    mass : float, array or PyTensor variable
        Gravitational mass [M_sun], within `MASS_RANGE`.
    table : (2, 16, 4) array
        Chebyshev coefficients of the slow and the fast branch, rows as in `PARAMETERS`.
    scalars : (10,) array
        The scalars named in `SCALARS`.
    """
    xp = namespace(ln_age, mass)
    named = dict(zip(SCALARS, scalars, strict=True))
    x = xp.log(xp.exp(ln_age) + named["relaxation_time"]) - np.log(REFERENCE_AGE)
    cold = _branch(xp, x, mass, table[0], named)
    if named["direct_urca"]:
        p = named["sharpness"]
        opening = _softplus(xp, (mass - named["urca_mass"]) / named["urca_width"])
        fast = _branch(xp, x, mass, table[1], named) - named["urca_slope"] * xp.log(opening)
        cold = -xp.logaddexp(-p * cold, -p * fast) / p
    return (
        named["ln_floor"] + xp.logaddexp(0.0, FLOOR_SHARPNESS * (cold - named["ln_floor"])) / FLOOR_SHARPNESS
    )


def _branch(xp: Any, x: Any, mass: Any, rows: Any, named: dict[str, float]) -> Any:
    def value(name: str) -> Any:
        polynomial = chebyshev(rows[_INDEX[name]], mass)
        return xp.exp(polynomial) if name in POSITIVE else polynomial

    y = value("a0") - value("s0") * x
    for k in range(1, int(named["softplus_terms"]) + 1):
        width = value(f"w{k}")
        y = y - value(f"s{k}") * width * _softplus(xp, (x - value(f"l{k}")) / width)
    for j in range(1, int(named["sigmoid_terms"]) + 1):
        z = (x - value(f"c{j}")) / value(f"v{j}")
        y = y - value(f"b{j}") * xp.exp(-_softplus(xp, -z))  # a sigmoid that cannot overflow
    if named["exponential_term"]:
        y = y - xp.exp(value("beta") * x - value("q"))
    return y


def _softplus(xp: Any, z: Any) -> Any:
    return xp.logaddexp(0.0, z)
