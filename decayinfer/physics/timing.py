"""How well timing measures the second frequency derivative and the braking index, with white noise only.

Least squares over N equal arrival times spread evenly over a span T, no red noise and the position known:
real errors are larger. Red noise: Liu, Keith, Bassa & Stappers 2019 (arXiv:1907.03183).
"""

import numpy as np

from decayinfer.physics.constants import YEAR_S
from decayinfer.physics.namespace import Value, namespace

__all__ = [
    "CUBIC_FACTOR",
    "baseline",
    "index_error",
    "nuddot_error",
    "span_exponent",
]

CUBIC_FACTOR = 120.0 * np.sqrt(7.0)  #: least squares of a cubic phase over an even span (a test solves it)


def nuddot_error(nu: Value, residual: Value, *, count: Value, span: Value) -> Value:
    """Return the standard error of the second frequency derivative.

    Parameters
    ----------
    nu : float, array or PyTensor variable
        Spin frequency [Hz].
    residual : float, array or PyTensor variable
        Error of one arrival time [s].
    count : float, array or PyTensor variable
        Number of arrival times.
    span : float, array or PyTensor variable
        Time from first to last [yr].

    Returns
    -------
    float, array or PyTensor variable
        120 sqrt(7) nu sigma/(sqrt(N) T^3) [Hz/s^2]. At a fixed cadence it falls as T^(-7/2) (Liu, Bassa &
        Stappers 2018, MNRAS 478, 2359).
    """
    return CUBIC_FACTOR * nu * residual / (count**0.5 * (span * YEAR_S) ** 3)


def index_error(nu: Value, nudot: Value, nuddot_error: Value) -> Value:
    """Return the error nu sigma(nuddot)/nudot^2 of the braking index, the others being exact."""
    return nu * nuddot_error / nudot**2


def baseline(nu: Value, nudot: Value, *, index_error: Value, residual: Value, cadence: Value) -> Value:
    """Return the span [yr] after which the braking index has a given error.

    Parameters
    ----------
    nu, nudot : float, array or PyTensor variable
        Spin frequency [Hz] and its derivative [Hz/s].
    index_error : float, array or PyTensor variable
        Standard error wanted.
    residual : float, array or PyTensor variable
        Error of one arrival time [s].
    cadence : float, array or PyTensor variable
        Time between arrival times [yr].
    """
    cadence_s = cadence * YEAR_S
    target = CUBIC_FACTOR * nu**2 * residual * cadence_s**0.5 / (index_error * nudot**2)
    return target ** (2.0 / 7.0) / YEAR_S


def span_exponent(spectral_index: Value) -> Value:
    """Return g of sigma(nuddot) ~ T^g for residuals with power spectrum f^-alpha at a fixed cadence.

    g = -7/2 + alpha/2 for 0 <= alpha < 4 and -1/2 above 8 (Liu, Keith, Bassa & Stappers 2019,
    arXiv:1907.03183); nan between, where the paper's abstract gives no law.
    """
    xp = namespace(spectral_index)
    shallow, steep = spectral_index < 4.0, spectral_index > 8.0
    return xp.where(shallow, -3.5 + 0.5 * spectral_index, xp.where(steep, -0.5, np.nan))
