"""From the posterior runs of one object to its rows in the tables."""

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from decayinfer.catalog.pulsar import Pulsar
from decayinfer.inference.outcome import PARAMETERS, ChannelFit, ObjectFit, Parameter, Status
from decayinfer.results.average import Probabilities, channel_probabilities, mix_draws
from decayinfer.results.flags import join_flags, warns
from decayinfer.results.preference import Preference, best_scenario, mass_of, preferences, scenario_rows
from decayinfer.results.sensitivity import Trial, sensitivity_rows, trials
from decayinfer.results.trust import information, predictive_tail
from decayinfer.results.verdict import Constraint, Interval, constraint, verdict

if TYPE_CHECKING:
    from decayinfer.inference.settings import FitSettings

__all__ = ["AVERAGED", "ObjectRows", "summarise"]

#: Name that stands in the columns channel and scenario for an average over them.
AVERAGED = "averaged"

#: Runs less probable than this do not lend their flags to the object.
_MATTERS = 0.01

_QUANTILES = {"q05": 0.05, "q16": 0.16, "q50": 0.50, "q84": 0.84, "q95": 0.95}

type Row = dict[str, Any]
type _Floats = NDArray[np.float64]


@dataclass(frozen=True)
class ObjectRows:
    """The rows of one object in the tables, column name to value."""

    objects: Row
    channels: tuple[Row, ...]
    parameters: tuple[Row, ...]
    sensitivity: tuple[Row, ...] = ()
    scenarios: tuple[Row, ...] = ()


@dataclass(frozen=True)
class _Mixing:
    """Effective sample size and R-hat of one parameter in one run; nan where they mean nothing."""

    ess_bulk: float = np.nan
    r_hat: float = np.nan


type _MixingOf = Mapping[str, _Mixing]


def summarise(
    pulsar: Pulsar,
    fit: ObjectFit,
    settings: "FitSettings",
    *,
    prior_odds: Mapping[str, float] | None = None,
) -> ObjectRows:
    """Return the rows of one object in the tables of a run.

    Parameters
    ----------
    pulsar : Pulsar
        The measurements.
    fit : ObjectFit
        The posterior runs.
    settings : FitSettings
        Settings of the fit; the seed decides which draws the averages take.
    prior_odds : mapping of str to float, optional
        Prior odds of the channels. Default: equal.
    """
    probabilities = channel_probabilities(fit, prior_odds)
    mixing = [_mixing(run) for run in fit.fits]
    rows = [row for run, mixed in zip(fit.fits, mixing, strict=True) for row in _run_rows(run, mixed)]
    scenarios = list(dict.fromkeys(run.scenario for run in fit.fits))
    for scenario in scenarios:
        chosen = [m for run, m in zip(fit.fits, mixing, strict=True) if run.scenario == scenario]
        rows += _averaged_rows(fit.name, scenario, probabilities.within(scenario), chosen, settings.seed)
    overall = _averaged_rows(fit.name, AVERAGED, probabilities, mixing, settings.seed)
    made = trials(fit, prior_odds)
    averaged = {row["parameter"]: row for row in overall}
    mass = mass_of(probabilities, seed=settings.seed, name=fit.name)
    preferred = preferences(fit, probabilities, mass, seed=settings.seed)
    said = verdict(
        probabilities,
        _interval(averaged.get("mass"), ""),
        _interval(averaged.get("mass"), "prior_"),
        made,
        preferred=preferred,
        prior_shift=mass.prior_shift,
    )
    tail = _tail(pulsar, probabilities, settings)
    return ObjectRows(
        objects=_object_row(pulsar, probabilities, averaged, made[0], tail, best_scenario(preferred), said),
        channels=tuple(_channel_row(probabilities, k) for k in range(len(fit.fits))),
        parameters=(*rows, *overall),
        sensitivity=sensitivity_rows(fit, made),
        scenarios=scenario_rows(fit.name, preferred),
    )


def _tail(pulsar: Pulsar, probabilities: Probabilities, settings: "FitSettings") -> float:
    """Tail probability of the observed n among those that the averaged posterior predicts."""
    draws = [fit.posterior("braking_index") for fit in probabilities.fits]
    indices = mix_draws(draws, probabilities.values, seed=settings.seed, name=pulsar.name)
    errors = pulsar.braking_index_err_minus, pulsar.braking_index_err_plus
    return predictive_tail(indices, pulsar.braking_index, *errors, settings.priors.scatter_sd)


def _object_row(
    pulsar: Pulsar,
    probabilities: Probabilities,
    averaged: Mapping[str, Row],
    default: Trial,
    tail: float,
    preferred: Preference | None,
    said: str,
) -> Row:
    channels = list(dict.fromkeys(fit.channel for fit in probabilities.fits))
    chances = {channel: probabilities.of_channel(channel) for channel in channels}
    best = max(channels, key=lambda c: np.nan_to_num(chances[c][0], nan=-1.0)) if probabilities.known else ""
    mass, mass_prior = _interval(averaged.get("mass"), ""), _interval(averaged.get("mass"), "prior_")
    phonon_time = _interval(averaged.get("phonon_time"), "")
    return {
        "object": pulsar.name,
        "characteristic_age": pulsar.characteristic_age,
        "braking_index": pulsar.braking_index,
        "err_minus": pulsar.braking_index_err_minus,
        "err_plus": pulsar.braking_index_err_plus,
        "limit": pulsar.braking_index_limit,
        "best_channel": best,
        "best_probability": chances[best][0] if best else np.nan,
        "best_probability_err": chances[best][1] if best else np.nan,
        **{f"probability_{channel}": chances[channel][0] for channel in channels},
        "probability_any_decay": default.decay()[0],
        "predictive_p": tail,
        "best_scenario": preferred.scenario if preferred else "",
        "best_scenario_probability": preferred.probability if preferred else np.nan,
        **_named(mass, "mass_"),
        **_named(mass_prior, "mass_prior_"),
        **_named(phonon_time, "phonon_time_"),
        "verdict": said,
        "flags": join_flags(_object_flags(pulsar, probabilities, constraint(mass, mass_prior))),
    }


def _object_flags(pulsar: Pulsar, probabilities: Probabilities, mass: Constraint) -> set[str]:
    flags = set(pulsar.flags)
    for fit, p in zip(probabilities.fits, probabilities.values, strict=True):
        flags |= {flag for flag in fit.flags if warns(flag)} if p >= _MATTERS else set()
    statuses = [fit.status for fit in probabilities.fits]
    if Status.FAILED in statuses:
        flags.add("failed")
    if all(status is Status.UNREACHABLE for status in statuses):
        flags.add("no-channel")
    if not np.isfinite(pulsar.braking_index) and np.isfinite(pulsar.braking_index_limit):
        flags.add("limit-only")
    if mass is Constraint.NONE:
        flags.add("prior-dominated")
    return flags


def _channel_row(probabilities: Probabilities, k: int) -> Row:
    fit = probabilities.fits[k]
    flags = set(fit.flags) | ({str(fit.status)} if fit.status is not Status.OK else set())
    return {
        "object": fit.name,
        "scenario": fit.scenario,
        "channel": fit.channel,
        "ln_evidence": fit.ln_evidence,
        "ln_evidence_err": fit.ln_evidence_err,
        "ln_evidence_joint": fit.ln_evidence_joint,
        "probability": probabilities.values[k],
        "ess_bulk_min": fit.ess_bulk_min,
        "r_hat_max": fit.r_hat_max,
        "divergences": fit.divergences,
        "status": str(fit.status),
        "ln_evidence_joint_err": fit.ln_evidence_joint_err,
        "probability_err": probabilities.of(lambda other: other is fit)[1],
        "ess_tail_min": fit.ess_tail_min,
        "flags": join_flags(flags),
        "reason": fit.reason,
    }


def _run_rows(fit: ChannelFit, mixing: _MixingOf) -> list[Row]:
    if fit.status is not Status.OK:
        return []
    return [
        _parameter_row(
            (fit.name, fit.scenario, fit.channel),
            parameter,
            fit.posterior(parameter.name),
            fit.prior(parameter.name),
            mixing[parameter.name],
            1.0,
        )
        for parameter in PARAMETERS
        if parameter.name in mixing
    ]


def _averaged_rows(
    name: str, scenario: str, probabilities: Probabilities, mixing: Sequence[_MixingOf], seed: int
) -> list[Row]:
    """Return a row for each parameter that any run with probability defines."""
    if not probabilities.known:
        return []
    rows = []
    for parameter in PARAMETERS:
        posteriors = [fit.posterior(parameter.name) for fit in probabilities.fits]
        priors = [fit.prior(parameter.name) for fit in probabilities.fits]
        weights = np.where([d.size > 0 for d in posteriors], np.nan_to_num(probabilities.values), 0.0)
        posterior = mix_draws(posteriors, weights, seed=seed, name=name)
        if posterior.size:
            prior = mix_draws(priors, probabilities.prior, seed=seed, name=name)
            mixed = _mixed([m.get(parameter.name, _Mixing()) for m in mixing], weights)
            labels = (name, scenario, AVERAGED)
            rows.append(_parameter_row(labels, parameter, posterior, prior, mixed, float(weights.sum())))
    return rows


def _parameter_row(
    labels: tuple[str, str, str],
    parameter: Parameter,
    posterior: _Floats,
    prior: _Floats,
    mixing: _Mixing,
    share: float,
) -> Row:
    quantiles = _quantiles(posterior)
    return {
        **dict(zip(("object", "scenario", "channel"), labels, strict=True)),
        "parameter": parameter.name,
        "unit": parameter.unit,
        **{f"prior_{key}": value for key, value in _quantiles(prior).items() if key in ("q05", "q50", "q95")},
        "mean": float(np.mean(posterior)),
        "sd": float(np.std(posterior, ddof=1)),
        **quantiles,
        "ess_bulk": mixing.ess_bulk,
        "r_hat": mixing.r_hat,
        "share": share,
        "information": information(posterior, prior),
    }


def _quantiles(draws: _Floats) -> dict[str, float]:
    if not draws.size:
        return dict.fromkeys(_QUANTILES, np.nan)
    return dict(zip(_QUANTILES, map(float, np.quantile(draws, list(_QUANTILES.values()))), strict=True))


def _mixing(fit: ChannelFit) -> _MixingOf:
    """Return the mixing of every parameter that a run reports; a constant has none."""
    if fit.draws is None or "posterior" not in fit.draws:
        return {}
    import arviz as az

    posterior = fit.draws["posterior"].dataset
    names = [p.name for p in PARAMETERS if p.name in posterior.data_vars]
    varying = [name for name in names if np.ptp(posterior[name].values) > 0]
    if not varying:
        return {name: _Mixing() for name in names}
    ess, r_hat = az.ess(posterior[varying], method="bulk"), az.rhat(posterior[varying])
    # Draws resampled from importance weights repeat, and are worth no more than the weights.
    cap = fit.ess_bulk_min if {"topped-up", "weighted"} & set(fit.flags) else np.inf
    return {
        name: _Mixing(min(float(ess[name]), cap), float(r_hat[name])) if name in varying else _Mixing()
        for name in names
    }


def _mixed(mixing: Sequence[_Mixing], weights: _Floats) -> _Mixing:
    """Return the mixing of an average: variances add with squared weights, and the worst R-hat counts."""
    used = [(m, w) for m, w in zip(mixing, weights / weights.sum(), strict=True) if w > 0]
    variance = sum(w**2 / m.ess_bulk for m, w in used)
    worst = [m.r_hat for m, w in used if w >= _MATTERS and np.isfinite(m.r_hat)]
    return _Mixing(1.0 / variance, max(worst, default=np.nan))


def _interval(row: Row | None, prefix: str) -> Interval:
    return Interval(*(row[f"{prefix}{key}"] for key in ("q05", "q50", "q95"))) if row else Interval()


def _named(interval: Interval, prefix: str) -> dict[str, float]:
    return {f"{prefix}{key}": getattr(interval, key) for key in ("q05", "q50", "q95")}
