"""The measurement of n: quoted errors, symmetric or not, or an upper limit, with excess scatter.

The quoted error is multiplied by a factor of at least one whose logarithm has a half-normal prior: quoted errors omit
the scatter that spin noise adds to n. The factor is integrated out by quadrature, so it costs no coordinate; beyond
about eight quoted errors, where nothing fits, the quadrature falls short of the far tail. A limit is a censored
measurement: the probability that the measured value fell below it.
"""

from typing import Any

import numpy as np

from decayinfer.physics.namespace import namespace

__all__ = ["SCATTER_NODES", "ln_index_likelihood", "sample_index", "total_error"]

_LN_2PI = float(np.log(2.0 * np.pi))
_NODES, _WEIGHTS = np.polynomial.legendre.leggauss(16)
#: Nodes of the half-normal |N(0, 1)|, cut at five standard deviations.
SCATTER_NODES = 2.5 * (_NODES + 1.0)
_RAW = _WEIGHTS * np.exp(-0.5 * SCATTER_NODES**2)
_LN_SCATTER_WEIGHTS = np.log(_RAW / _RAW.sum())


def ln_index_likelihood(
    observed: Any, index: Any, err_minus: Any, err_plus: Any, limit: Any, scatter: Any
) -> Any:
    """Return ln p(observed n | secular n), the scatter factor integrated out.

    Parameters
    ----------
    observed : float
        Measured index, or its upper limit.
    index : float, array or PyTensor variable
        Secular index of the model.
    err_minus, err_plus : float
        Quoted one-sigma errors; an index above the observed value is judged by ``err_plus``.
    limit : float
        1 if ``observed`` is an upper limit, else 0.
    scatter : float
        Scale of the half-normal prior on the logarithm of the factor.
    """
    xp = namespace(observed, index, scatter)
    gap = index - observed
    error = xp.where(gap > 0.0, err_plus, err_minus)
    terms = []
    for node, ln_weight in zip(SCATTER_NODES, _LN_SCATTER_WEIGHTS, strict=True):
        ln_factor = scatter * node
        z = gap / error * xp.exp(-ln_factor)
        ln_width = xp.log(0.5 * (err_minus + err_plus)) + ln_factor
        measured = -0.5 * z**2 - ln_width - 0.5 * _LN_2PI
        terms.append(ln_weight + (1.0 - limit) * measured + limit * _ln_normal_cdf(xp, -z))
    top = terms[0]
    for term in terms[1:]:
        top = xp.maximum(top, term)
    return top + xp.log(sum(xp.exp(term - top) for term in terms))


def total_error(err_minus: float, err_plus: float, scatter: float) -> float:
    """Return the quoted error times the factor that the prior exceeds one time in twenty."""
    return 0.5 * (err_minus + err_plus) * float(np.exp(1.96 * scatter))


def sample_index(
    index: Any, err_minus: float, err_plus: float, scatter: float, rng: np.random.Generator
) -> Any:
    """Draw observed indices around secular ones, (n,) to (n,)."""
    factor = np.exp(scatter * np.abs(rng.standard_normal(np.shape(index))))
    # the observed value lies below the truth with the weight of the upper error
    below = rng.random(np.shape(index)) < err_plus / (err_minus + err_plus)
    step = np.abs(rng.standard_normal(np.shape(index))) * factor
    return index + np.where(below, -err_plus, err_minus) * step


def _ln_normal_cdf(xp: Any, z: Any) -> Any:
    """Logarithm of Phi(z), accurate in the lower tail: Abramowitz & Stegun 1964, 26.2.12 beyond z = -6."""
    near = xp.maximum(z, -6.0)
    far = xp.minimum(z, -6.0)
    s = 1.0 / far**2
    series = 1.0 - s * (1.0 - 3.0 * s * (1.0 - 5.0 * s * (1.0 - 7.0 * s * (1.0 - 9.0 * s))))
    tail = -0.5 * far**2 - 0.5 * _LN_2PI - xp.log(-far) + xp.log(series)
    body = xp.log(0.5 * _erfc(xp, -near / np.sqrt(2.0)))
    return xp.where(z < -6.0, tail, body)


def _erfc(xp: Any, x: Any) -> Any:
    if xp is np:
        from scipy.special import erfc

        return erfc(x)
    return xp.erfc(x)
