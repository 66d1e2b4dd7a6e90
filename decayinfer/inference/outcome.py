"""What a fit hands back: one record per object, scenario and channel, and one per object."""

from collections.abc import Mapping
from dataclasses import dataclass, field
from enum import StrEnum

import numpy as np
from numpy.typing import NDArray
from xarray import DataTree

__all__ = ["PARAMETERS", "ChannelFit", "ObjectFit", "Parameter", "Status"]


class Status(StrEnum):
    """How a posterior run ended."""

    OK = "ok"
    UNREACHABLE = "unreachable"
    FAILED = "failed"


@dataclass(frozen=True)
class Parameter:
    """A reported parameter.

    Attributes
    ----------
    name : str
        Column or variable name.
    unit : str
        Astropy unit string; empty when dimensionless.
    label : str
        Plain-text label for tables and figures.
    """

    name: str
    unit: str
    label: str


#: Every parameter that a posterior may report, in the order of the tables. Internal units are those given.
PARAMETERS = (
    Parameter("mass", "Msun", "mass"),
    Parameter("impurity_parameter", "", "impurity parameter Q"),
    Parameter("phonon_time", "yr", "phonon time at 1e8 K"),
    Parameter("hall_time", "yr", "Hall time of today's field"),
    Parameter("age", "yr", "age"),
    Parameter("birth_field", "G", "birth field"),
    Parameter("birth_period", "s", "birth period"),
    Parameter("field", "G", "field"),
    Parameter("braking_index", "", "braking index"),
    Parameter("decay_time", "yr", "decay time of the field"),
    Parameter("crust_temperature", "K", "crust temperature"),
    Parameter("share_impurity", "", "impurity share of today's decay"),
    Parameter("share_phonon", "", "phonon share of today's decay"),
    Parameter("share_hall", "", "Hall share of today's decay"),
    Parameter("obliquity", "deg", "obliquity"),
    Parameter("birth_obliquity", "deg", "birth obliquity"),
    Parameter("index_excess", "", "contamination of the braking index"),
    Parameter("acceleration_share", "", "share of Pdot from acceleration"),
    Parameter("companion_mass", "Msun", "companion mass"),
    Parameter("orbital_period", "yr", "orbital period"),
    Parameter("eccentricity", "", "eccentricity"),
    Parameter("inclination", "deg", "inclination of the orbit"),
    Parameter("spin_noise_scale", "1 / s3", "scale of the second frequency derivative of spin noise"),
    Parameter("glitch_nudot_step", "", "relative step of the glitch in the frequency derivative"),
    Parameter("glitch_interval", "yr", "time between glitches"),
    Parameter("glitch_time_since", "yr", "time since the glitch"),
    Parameter("recovery_share", "", "share of the step that recovers exponentially"),
    Parameter("recovery_time", "yr", "time of the exponential recovery"),
)


@dataclass(frozen=True)
class ChannelFit:
    """One posterior run: an object under one channel and one cooling scenario.

    Attributes
    ----------
    name, scenario, channel : str
        Object, cooling scenario and channel.
    status : Status
        ``ok``, ``unreachable`` (the channel cannot give this index) or ``failed``.
    reason : str
        Why the status is not ``ok``, in plain words; empty otherwise.
    ln_evidence, ln_evidence_err : float
        ln p(n | P, Pdot, channel) and its standard error; minus infinity when unreachable, nan when failed.
    ln_evidence_joint, ln_evidence_joint_err : float
        ln p(n, ln P, ln Pdot | channel) and its standard error.
    ess_bulk_min, ess_tail_min, r_hat_max : float
        Worst values over the sampled coordinates; nan where nothing was sampled.
    divergences, gradients : int
        Divergent transitions among the kept draws; gradient evaluations spent.
    flags : tuple of str
        Short flag names, from `decayinfer.results.flags`.
    variants : mapping of str to (float, float)
        ln p(n | P, Pdot, channel) and its standard error under other readings of n and other prior settings, by the
        names in `decayinfer.inference.variants`; the error is nan where too few points carry the weight.
    draws : DataTree or None
        ArviZ groups ``posterior`` and ``prior`` (given P and Pdot but not n), with the variables of
        `PARAMETERS` that the channel defines and the ``coordinates`` vector, plus ``sample_stats``,
        ``observed_data``, ``log_likelihood``, ``log_prior``; attributes carry versions and seed.
    """

    name: str
    scenario: str
    channel: str
    status: Status
    reason: str = ""
    ln_evidence: float = np.nan
    ln_evidence_err: float = np.nan
    ln_evidence_joint: float = np.nan
    ln_evidence_joint_err: float = np.nan
    ess_bulk_min: float = np.nan
    ess_tail_min: float = np.nan
    r_hat_max: float = np.nan
    divergences: int = 0
    gradients: int = 0
    flags: tuple[str, ...] = ()
    variants: Mapping[str, tuple[float, float]] = field(default_factory=dict)
    draws: DataTree | None = field(default=None, repr=False, compare=False)

    def posterior(self, parameter: str) -> NDArray[np.float64]:
        """Return the posterior draws of one parameter, flattened over chains, in the unit of `PARAMETERS`."""
        return self._flat("posterior", parameter)

    def prior(self, parameter: str) -> NDArray[np.float64]:
        """Return draws of one parameter given P and Pdot but not n, flattened over chains."""
        return self._flat("prior", parameter)

    def _flat(self, group: str, parameter: str) -> NDArray[np.float64]:
        if self.draws is None or group not in self.draws or parameter not in self.draws[group].data_vars:
            return np.empty(0)
        return np.asarray(self.draws[group][parameter].values, dtype=float).ravel()


@dataclass(frozen=True)
class ObjectFit:
    """Every posterior run of one object.

    Attributes
    ----------
    name : str
        The object.
    fits : tuple of ChannelFit
        One for each scenario and channel, in the order of the settings.
    weights : mapping of str to float
        Stated prior weight of each cooling scenario; they sum to one.
    """

    name: str
    fits: tuple[ChannelFit, ...]
    weights: Mapping[str, float]
