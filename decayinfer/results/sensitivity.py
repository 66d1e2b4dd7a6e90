"""How far the channel probabilities of an object hang on how n is read, on the priors and on the cooling scenarios."""

from collections.abc import Iterator, Mapping
from dataclasses import dataclass, replace
from typing import Any

import numpy as np

from decayinfer.channels.registry import load_channel
from decayinfer.inference.outcome import ChannelFit, ObjectFit, Status
from decayinfer.inference.variants import PRIOR_SETTINGS
from decayinfer.results.average import Probabilities, channel_probabilities, mean_evidence

__all__ = ["ANY_DECAY", "DEFAULT", "Trial", "average_evidence", "sensitivity_rows", "trials"]

ANY_DECAY = "any decay"  #: stands in the column channel for all decay channels together
DEFAULT = "scattered"  #: the reading of n behind the other tables

type Row = dict[str, Any]


@dataclass(frozen=True)
class Trial:
    """Channel probabilities under one set of assumptions.

    Attributes
    ----------
    kind, name : str
        What is varied (``reading``, ``priors`` or ``scenarios``), and to what.
    probabilities : Probabilities
        Over the object's runs.
    """

    kind: str
    name: str
    probabilities: Probabilities

    def decay(self) -> tuple[float, float]:
        """Return the probability of all decay channels together, and its standard error."""
        return self.probabilities.of(lambda fit: load_channel(fit.channel).decays)


def trials(fit: ObjectFit, prior_odds: Mapping[str, float] | None = None) -> tuple[Trial, ...]:
    """Return the default, each other reading of n, each prior setting, and each scenario left out in turn."""
    made = [Trial("reading", DEFAULT, channel_probabilities(fit, prior_odds))]
    for kind, names in (("reading", ("quoted", "with-noise")), ("priors", tuple(PRIOR_SETTINGS))):
        made += [Trial(kind, name, channel_probabilities(_varied(fit, name), prior_odds)) for name in names]
    scenarios = list(dict.fromkeys(run.scenario for run in fit.fits))
    for left_out in scenarios if len(scenarios) > 1 else ():
        rest = replace(fit, fits=tuple(run for run in fit.fits if run.scenario != left_out))
        made.append(Trial("scenarios", f"without {left_out}", channel_probabilities(rest, prior_odds)))
    return tuple(made)


def sensitivity_rows(fit: ObjectFit, made: tuple[Trial, ...]) -> tuple[Row, ...]:
    """Return the rows of an object in sensitivity.ecsv."""
    return tuple(row for trial in made for row in _trial_rows(fit, trial))


def _trial_rows(fit: ObjectFit, trial: Trial) -> Iterator[Row]:
    channels = list(dict.fromkeys(run.channel for run in fit.fits))
    for channel in channels:
        yield _row(
            fit, trial, channel, trial.probabilities.of_channel(channel), _evidence(fit, trial, channel)
        )
    if any(load_channel(channel).decays for channel in channels):
        yield _row(fit, trial, ANY_DECAY, trial.decay(), (np.nan, np.nan))


def _row(
    fit: ObjectFit, trial: Trial, channel: str, chance: tuple[float, float], evidence: tuple[float, float]
) -> Row:
    return {
        "object": fit.name,
        "varied": trial.kind,
        "setting": trial.name,
        "channel": channel,
        "probability": chance[0],
        "probability_err": chance[1],
        "ln_evidence": evidence[0],
        "ln_evidence_err": evidence[1],
    }


def _evidence(fit: ObjectFit, trial: Trial, channel: str) -> tuple[float, float]:
    """Evidence of a channel averaged over scenarios by their weights, and its standard error."""
    return average_evidence([run for run in trial.probabilities.fits if run.channel == channel], fit.weights)


def average_evidence(runs: list[ChannelFit], weights: Mapping[str, float]) -> tuple[float, float]:
    """Return ln of the weighted mean evidence of runs that differ in scenario, and its standard error.

    Failed runs are left out; nan when nothing is left.
    """
    usable = [run for run in runs if run.status is not Status.FAILED and not np.isnan(run.ln_evidence)]
    return mean_evidence(
        np.array([run.ln_evidence for run in usable]),
        np.array([run.ln_evidence_err for run in usable]),
        np.array([weights[run.scenario] for run in usable]),
    )


def _varied(fit: ObjectFit, name: str) -> ObjectFit:
    """Return the runs with their evidence under a variant; an index out of reach may come within it."""
    return replace(fit, fits=tuple(_with_variant(run, name) for run in fit.fits))


def _with_variant(run: ChannelFit, name: str) -> ChannelFit:
    if run.status is Status.FAILED:
        return run
    if name not in run.variants:
        unreachable = run.status is Status.UNREACHABLE
        return run if unreachable else replace(run, status=Status.FAILED)
    value, err = run.variants[name]
    status = Status.OK if np.isfinite(value) else Status.UNREACHABLE
    return replace(run, ln_evidence=value, ln_evidence_err=err, status=status)
