"""The answer for one object in plain words."""

from collections.abc import Sequence
from dataclasses import dataclass
from enum import StrEnum

import numpy as np

from decayinfer.channels.registry import load_channel
from decayinfer.inference.outcome import ChannelFit, Status
from decayinfer.results.average import Probabilities
from decayinfer.results.preference import Preference
from decayinfer.results.sensitivity import Trial

__all__ = ["Constraint", "Interval", "constraint", "verdict"]

#: A posterior this wide or wider, relative to its prior, counts as the prior's width.
AS_WIDE = 0.9

#: A posterior at most this wide, relative to its prior, counts as a measurement.
NARROW = 0.5

#: Shift of the median, in widths of the prior interval, from which a posterior counts as moved. For a normal
#: prior it is 0.33 standard deviations.
MOVED = 0.1

#: Odds below which no channel is called ahead (the lowest step of the scale in Kass & Raftery 1995,
#: J. Am. Stat. Assoc. 90, 773; from memory).
CLOSE_ODDS = 3.0

#: Shift of the median mass, in standard deviations, from which a verdict names it.
NOTABLE = 0.5

#: Scenarios less probable than this do not count when a verdict says how far the mass moves between them.
MATTERS = 0.01


@dataclass(frozen=True)
class Interval:
    """The 5, 50 and 95 per cent quantiles of a posterior or a prior; nan where there is none."""

    q05: float = np.nan
    q50: float = np.nan
    q95: float = np.nan

    @property
    def width(self) -> float:
        """Width of the 90 per cent interval."""
        return self.q95 - self.q05


class Constraint(StrEnum):
    """What the data did to a parameter."""

    NONE = "none"
    MOVED = "moved"
    WEAK = "weak"
    STRONG = "strong"
    UNKNOWN = "unknown"


def constraint(posterior: Interval, prior: Interval) -> Constraint:
    """Judge by width and place of the 90 per cent intervals what the data did to a parameter."""
    if not (np.isfinite(posterior.width) and prior.width > 0):
        return Constraint.UNKNOWN
    ratio = posterior.width / prior.width
    if ratio <= NARROW:
        return Constraint.STRONG
    if ratio < AS_WIDE:
        return Constraint.WEAK
    moved = abs(posterior.q50 - prior.q50) >= MOVED * prior.width
    return Constraint.MOVED if moved else Constraint.NONE


def verdict(
    probabilities: Probabilities,
    mass: Interval,
    mass_prior: Interval,
    made: Sequence[Trial] = (),
    *,
    preferred: Sequence[Preference] = (),
    prior_shift: float = np.nan,
) -> str:
    """Say in plain words which channel leads, by what odds, whether decay holds however n is read, what is learnt of
    the mass, and how far that hangs on the cooling scenario.

    Parameters
    ----------
    probabilities : Probabilities
        Probabilities over the object's posterior runs.
    mass, mass_prior : Interval
        Averaged posterior of the mass, and its prior given P and Pdot [Msun].
    made : sequence of Trial
        The same under other readings of n, priors and scenarios, the default first.
    preferred : sequence of Preference
        The cooling scenarios.
    prior_shift : float
        How far the median mass left that of its prior, in prior standard deviations.

    Returns
    -------
    str
        Clauses separated by semicolons.
    """
    if not probabilities.known:
        return _no_channel(probabilities.fits)
    clauses = [
        _channel_clause(probabilities),
        _secular_clause(probabilities.fits),
        _rival_clause(probabilities),
        _reading_clause(made),
        _assumption_clause(made),
        _failed_clause(probabilities.fits),
        _mass_clause(mass, mass_prior),
        _prior_clause(prior_shift),
        _scenario_clause(preferred),
        _moving_clause(preferred),
    ]
    return "; ".join(clause for clause in clauses if clause)


def _no_channel(fits: tuple[ChannelFit, ...]) -> str:
    unreachable = [fit for fit in fits if fit.status is Status.UNREACHABLE]
    if not unreachable:
        return "no posterior run succeeded; see the reasons in channels.ecsv and log.txt"
    start = (
        "no channel reaches this index"
        if len(unreachable) == len(fits)
        else "no channel that ran reaches this index"
    )
    reasons = {fit.reason for fit in unreachable if fit.reason}
    return f"{start}: {reasons.pop()}" if len(reasons) == 1 else start


def _channel_clause(probabilities: Probabilities) -> str:
    channels = list(dict.fromkeys(fit.channel for fit in probabilities.fits))
    chances = [(probabilities.of_channel(channel)[0], channel) for channel in channels]
    ranked = sorted(((p, channel) for p, channel in chances if p > 0), key=lambda item: -item[0])
    (p, best), *others = ranked
    if len(channels) == 1:
        return f"{best} is the only channel fitted"
    if not others:
        return f"{best} is the only channel that reaches the index"
    ratio = p / others[0][0]
    close = ", too close to call" if ratio < CLOSE_ODDS else ""
    return f"{best} most probable ({p:.2f}), odds {_odds(ratio)} over {others[0][1]}{close}"


def _secular_clause(fits: tuple[ChannelFit, ...]) -> str:
    """Say when what reaches the index is laid over the spin-down, and no spin-down itself does."""
    secular = [fit for fit in fits if load_channel(fit.channel).secular]
    alone = secular and all(fit.status is Status.UNREACHABLE for fit in secular)
    return "no secular channel reaches this index" if alone and len(secular) < len(fits) else ""


def _rival_clause(probabilities: Probabilities) -> str:
    """Set decay as a whole against the best of what is not decay."""
    decay, _ = probabilities.of(lambda fit: load_channel(fit.channel).decays)
    others = {fit.channel for fit in probabilities.fits if not load_channel(fit.channel).decays}
    chances = sorted(((probabilities.of_channel(name)[0], name) for name in others), reverse=True)
    chances = [(p, name) for p, name in chances if p > 0.0]
    if not decay > 0.0 or not chances:
        return ""
    p, rival = chances[0]
    ratio = decay / p
    if max(ratio, 1.0 / ratio) < CLOSE_ODDS:
        order = f"odds {_odds(ratio)}" if ratio >= 1.0 else f"odds 1:{1.0 / ratio:.1f}"
        return f"decay and {rival} cannot be told apart ({order})"
    return f"decay as a whole has {decay:.2f}"


def _reading_clause(made: Sequence[Trial]) -> str:
    """Say whether the readings of n agree on decay."""
    chances = {trial.name: trial.decay()[0] for trial in made if trial.kind == "reading"}
    if len(chances) < 3 or not all(np.isfinite(p) for p in chances.values()) or max(chances.values()) == 0.0:
        return ""
    quoted, scattered, noisy = (chances[name] for name in ("quoted", "scattered", "with-noise"))
    values = f"{quoted:.2f} with the quoted error, {scattered:.2f} with excess scatter, {noisy:.2f} with spin noise"
    sides = {p >= 0.5 for p in chances.values()}
    return (
        f"all readings of n agree on decay ({values})"
        if len(sides) == 1
        else f"readings differ on decay: {values}"
    )


def _assumption_clause(made: Sequence[Trial]) -> str:
    """Name the priors or the scenario whose change turns the majority for or against decay."""
    if not made or not np.isfinite(base := made[0].decay()[0]):
        return ""
    turning = [
        f"{trial.name}{' priors' if trial.kind == 'priors' else ''}: {p:.2f}"
        for trial in made
        if trial.kind != "reading" and np.isfinite(p := trial.decay()[0]) and (p >= 0.5) != (base >= 0.5)
    ]
    return f"which side of one half decay is on changes ({', '.join(turning)})" if turning else ""


def _odds(ratio: float) -> str:
    if ratio >= 1000:
        return "above 1000:1"
    return f"{ratio:.1f}:1" if ratio < 10 else f"{ratio:.0f}:1"


def _failed_clause(fits: tuple[ChannelFit, ...]) -> str:
    failed = sum(fit.status is Status.FAILED for fit in fits)
    return f"{failed} of {len(fits)} posterior runs failed and are left out" if failed else ""


def _mass_clause(mass: Interval, prior: Interval) -> str:
    kind = constraint(mass, prior)
    if kind is Constraint.UNKNOWN:
        return ""
    if kind is Constraint.NONE:
        return "the index does not constrain the mass (posterior as wide as its prior)"
    if kind is Constraint.MOVED:
        direction = "up" if mass.q50 > prior.q50 else "down"
        return (
            f"the index moves the mass {direction} without narrowing it "
            f"(median {mass.q50:.2f}, prior {prior.q50:.2f} Msun)"
        )
    verb = "constrains the mass to" if kind is Constraint.STRONG else "narrows the mass a little, to"
    share = 100 * mass.width / prior.width
    return f"the index {verb} {mass.q05:.2f}-{mass.q95:.2f} Msun ({share:.0f} % of the prior's width)"


def _prior_clause(shift: float) -> str:
    if not abs(shift) >= NOTABLE:
        return ""
    side = "above" if shift > 0 else "below"
    return f"the median mass lies {abs(shift):.1f} prior standard deviations {side} that of its prior"


def _scenario_clause(preferred: Sequence[Preference]) -> str:
    """Name the cooling scenario that leads, unless it is too close to call."""
    ranked = sorted(
        (each for each in preferred if each.probability > 0.0), key=lambda each: -each.probability
    )
    uneven = len({each.failed for each in ranked}) > 1  # a failed run counts against its scenario
    if len(ranked) < 2 or uneven or ranked[0].probability < CLOSE_ODDS * ranked[1].probability:
        return ""
    best, other = ranked[:2]
    odds = _odds(best.probability / other.probability)
    return f"cooling scenario {best.scenario} preferred ({best.probability:.2f}), odds {odds} over {other.scenario}"


def _moving_clause(preferred: Sequence[Preference]) -> str:
    """Say how far the mass moves between cooling scenarios, where that is notable."""
    moved = [each for each in preferred if each.probability >= MATTERS and np.isfinite(each.mass_shift)]
    if len(moved) < 2:
        return ""
    low, high = (f(moved, key=lambda each: each.mass_shift) for f in (min, max))
    if not high.mass_shift - low.mass_shift >= NOTABLE:
        return ""
    return (
        f"the mass moves by {high.mass_shift - low.mass_shift:.1f} standard deviations between cooling scenarios "
        f"(median {low.mass.median:.2f} Msun under {low.scenario}, {high.mass.median:.2f} under {high.scenario})"
    )
