"""How large a second frequency derivative spin noise makes, symmetric about zero.

The scale is our own regression on a public catalogue (Manchester et al. 2005, AJ 129, 1993, version 1.67): 148 isolated
pulsars with P > 30 ms, tau_c > 1 Myr and |n| above three of its errors, where no secular cause reaches, give

    log10 |nuddot / Hz s^-2| = -26.35(11) + 0.97(13) log10(|nudot|/1e-15 Hz s^-1) + 0.38(28) log10(nu/Hz)

with 0.83 dex scatter and as many negative as positive signs (76 and 72). Spans and methods of the entries are mixed and
weak noise is not in it, so it serves as a prior only; young pulsars are an extrapolation.
"""

from typing import NamedTuple

import numpy as np

from decayinfer.physics.namespace import Value

__all__ = ["NoiseScale", "known_scale", "noise_scale"]

_INTERCEPT, _INTERCEPT_ERR = -26.35, 0.11
_SLOPE, _SLOPE_ERR = 0.97, 0.13
_NU_SLOPE, _NU_SLOPE_ERR = 0.38, 0.28
_SCATTER = 0.83
_EULER_GAMMA = float(np.euler_gamma)
#: Mean and standard deviation of log10 |z| for a standard normal z; the scatter of |nuddot| contains both.
_NORMAL_MEAN = -0.5 * (_EULER_GAMMA + float(np.log(2.0))) / float(np.log(10.0))
_NORMAL_SD = np.pi / np.sqrt(8.0) / float(np.log(10.0))


class NoiseScale(NamedTuple):
    """Mean and standard deviation of log10 of the standard deviation of nuddot [Hz/s^2]."""

    log10: Value
    sd: Value


def noise_scale(nu: Value, nudot: Value) -> NoiseScale:
    """Return the scale of the second derivative from noise, nuddot = scale times a standard normal number.

    The scale is what makes mean and scatter of log10 |nuddot| those of the regression. The errors of its coefficients
    add to the scatter as if independent (their correlations are not at hand).

    Parameters
    ----------
    nu, nudot : float or array
        Spin frequency [Hz] and its derivative [Hz/s].
    """
    x, y = np.log10(np.abs(nudot) / 1e-15), np.log10(nu)
    mean = _INTERCEPT - _NORMAL_MEAN + _SLOPE * x + _NU_SLOPE * y
    variance = (
        _SCATTER**2 - _NORMAL_SD**2 + _INTERCEPT_ERR**2 + (_SLOPE_ERR * x) ** 2 + (_NU_SLOPE_ERR * y) ** 2
    )
    return NoiseScale(mean, np.sqrt(variance))


def known_scale(nu: Value, nudot: Value, own: float, own_sd: float, usual_sd: float) -> NoiseScale:
    """Return an object's own estimate of the scale where it has one, and that of `noise_scale` where it has none.

    Parameters
    ----------
    nu, nudot : float or array
        As in `noise_scale`.
    own, own_sd : float
        log10 of the object's own scale [Hz/s^2] and its error; nan where unknown.
    usual_sd : float
        Error of an own estimate that comes without one.
    """
    if not np.isfinite(own):
        return noise_scale(nu, nudot)
    return NoiseScale(own, own_sd if np.isfinite(own_sd) else usual_sd)
