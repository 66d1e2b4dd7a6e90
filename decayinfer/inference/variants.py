r"""The evidence read otherwise: other measurement models of n, and narrower and wider priors.

Every variant reweights the points behind the default evidence; none samples anew. Three readings of n stand side by
side:

``quoted``
    the error as quoted;
``scattered``
    the quoted error times a factor of at least one, the default (`decayinfer.inference.measurement`);
``with-noise``
    the quoted error, and spin noise of the object's own scale or the published scaling
    (`decayinfer.physics.spin_noise`): noise of that scale can make an index of 30 on its own.

Prior settings multiply the standard deviation of every prior: ``tight`` by 2/3 and ``wide`` by 3/2.
"""

from dataclasses import fields, replace

import numpy as np
from numpy.typing import NDArray
from scipy.special import log_ndtr, logsumexp

from decayinfer.catalog.pulsar import Pulsar
from decayinfer.inference.importance import Weighted
from decayinfer.inference.measurement import ln_index_likelihood
from decayinfer.inference.priors import Priors
from decayinfer.physics.spin_noise import known_scale

__all__ = [
    "PRIOR_SETTINGS",
    "READINGS",
    "Variant",
    "ln_reading",
    "read_otherwise",
    "read_with_noise",
    "reweighed",
    "stretched",
]

type Array = NDArray[np.float64]
type Index = tuple[float, float, float, float]
#: ln p(n | P, Pdot) and its standard error, the latter nan where too few points carry the weight.
type Variant = tuple[float, float]

READINGS = ("quoted", "scattered", "with-noise")  #: the measurement models of n, the second the default
PRIOR_SETTINGS = {"tight": 2.0 / 3.0, "wide": 1.5}  #: factor on the standard deviation of every prior

_LEAST = 50.0  # effective points below which a variant is not quoted
_LN10 = float(np.log(10.0))
_LN_2PI = float(np.log(2.0 * np.pi))
_NODES = np.linspace(-6.0, 6.0, 97)  # trapezium rule: the scale spans decades, too many for Hermite nodes
_LN_WEIGHTS = -0.5 * _NODES**2 - logsumexp(-0.5 * _NODES**2)


def stretched(priors: Priors, factor: float) -> Priors:
    """Return the priors with every standard deviation of a physical parameter multiplied."""
    names = [f.name for f in fields(priors) if f.name.endswith("_sd") and f.name != "scatter_sd"]
    return replace(priors, **{name: factor * getattr(priors, name) for name in names})


def ln_reading(reading: str, index: Array, measured: Index, pulsar: Pulsar, priors: Priors) -> Array:
    """Return ln p(observed n | secular n) under a reading.

    Parameters
    ----------
    reading : str
        One of `READINGS`.
    index : (n,) array
        Secular indices.
    measured : tuple of float
        Observed n or its upper limit, error below, error above, and 1 for a limit.
    pulsar : Pulsar
        Gives the scale of its spin noise.
    priors : Priors
        Give the scale of the excess scatter.
    """
    with np.errstate(all="ignore"):  # far points overflow, and weigh nothing
        return _ln_reading(reading, index, measured, pulsar, priors)


def _ln_reading(reading: str, index: Array, measured: Index, pulsar: Pulsar, priors: Priors) -> Array:
    observed, minus, plus, limit = measured
    if reading != "with-noise":
        scatter = priors.scatter_sd if reading == "scattered" else 0.0
        return np.asarray(ln_index_likelihood(observed, index, minus, plus, limit, scatter))
    nu, nudot = 1.0 / pulsar.period, -pulsar.period_derivative / pulsar.period**2
    own, own_sd = pulsar.spin_noise_log10_scale, pulsar.spin_noise_log10_scale_err
    scale = known_scale(nu, nudot, own, own_sd, priors.spin_noise_own_log10_sd)
    noise = nu / nudot**2 * np.exp(_LN10 * (scale.log10 + scale.sd * _NODES))
    gap = (index - observed)[:, None]
    total = np.hypot(np.where(gap > 0.0, plus, minus), noise)
    z = gap / total
    if limit:
        terms = log_ndtr(-z)
    else:
        norm = 0.5 * (np.hypot(plus, noise) + np.hypot(minus, noise))
        terms = -0.5 * z**2 - np.log(norm) - 0.5 * _LN_2PI
    out: Array = logsumexp(terms + _LN_WEIGHTS, axis=1)
    return out


def read_otherwise(
    prior: tuple[Weighted, Array],
    posterior: tuple[Weighted, Array],
    measured: Index,
    pulsar: Pulsar,
    priors: Priors,
) -> dict[str, Variant]:
    """Return the conditional evidence under the readings that are not the default.

    Parameters
    ----------
    prior, posterior : tuple of Weighted and (n,) array
        Points behind the evidence without and with n, and the secular index of each.
    measured : tuple of float
        As in `ln_reading`.
    pulsar, priors
        As in `ln_reading`.
    """
    (before, index_before), (after, index_after) = prior, posterior
    default = ln_reading("scattered", index_after, measured, pulsar, priors)
    found = {}
    for reading in ("quoted", "with-noise"):
        broad = Weighted(
            before.points, before.ln_weights + ln_reading(reading, index_before, measured, pulsar, priors)
        )
        with np.errstate(invalid="ignore"):  # minus infinity less minus infinity, taken out below
            change = ln_reading(reading, index_after, measured, pulsar, priors) - default
        narrow = Weighted(after.points, after.ln_weights + np.where(np.isfinite(default), change, -np.inf))
        # a reading as wide as the prior is met by points of the prior, a narrow one by those of the posterior
        found[reading] = _conditional(max((broad, narrow), key=_size), before)
    return found


def read_with_noise(
    prior: tuple[Weighted, Array], measured: Index, pulsar: Pulsar, priors: Priors
) -> Variant:
    """Return the conditional evidence with spin noise from points without n alone, as in `read_otherwise`."""
    before, index = prior
    change = ln_reading("with-noise", index, measured, pulsar, priors)
    return _conditional(Weighted(before.points, before.ln_weights + change), before)


def reweighed(prior: Weighted, posterior: Weighted, change_prior: Array, change_posterior: Array) -> Variant:
    """Return the conditional evidence when the log prior density changes by so much at the points of each."""
    before = Weighted(prior.points, prior.ln_weights + change_prior)
    after = Weighted(posterior.points, posterior.ln_weights + change_posterior)
    return _conditional(after, before)


def _size(weighted: Weighted) -> float:
    return weighted.effective_size if np.isfinite(weighted.ln_weights).any() else 0.0


def _conditional(joint: Weighted, before: Weighted) -> Variant:
    if not np.isfinite(joint.ln_weights).any():
        return -np.inf, 0.0
    err = float(np.hypot(joint.ln_evidence_err, before.ln_evidence_err))
    enough = min(_size(joint), _size(before)) >= _LEAST
    return joint.ln_evidence - before.ln_evidence, err if enough else np.nan
