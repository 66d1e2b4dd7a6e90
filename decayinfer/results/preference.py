"""Which cooling scenario an object prefers, and how far the inferred mass hangs on it.

With w_s the stated weight of a scenario and o_c the prior odds of a channel, normalised over those that ran,

    Z_s = sum_c o_c p(n | P, Pdot, c, s),    P(s | n, P, Pdot)  ~  w_s Z_s

(Bayesian model averaging: Hoeting et al. 1999, Stat. Sci. 14, 382).
"""

from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from decayinfer.inference.outcome import ObjectFit, Status
from decayinfer.results.average import Probabilities, mean_evidence, mix_draws

__all__ = ["MassOf", "Preference", "best_scenario", "mass_of", "preferences", "scenario_rows"]

_LEVELS = {"q05": 0.05, "q50": 0.50, "q95": 0.95}

type Row = dict[str, Any]


@dataclass(frozen=True)
class MassOf:
    """Draws of the mass averaged over runs [Msun], empty where no run has any.

    Attributes
    ----------
    posterior, prior : (n_draws,) ndarray
        Given n, and given P and Pdot only.
    """

    posterior: NDArray[np.float64]
    prior: NDArray[np.float64]

    @property
    def median(self) -> float:
        """Posterior median."""
        return float(np.median(self.posterior)) if self.posterior.size else np.nan

    @property
    def prior_shift(self) -> float:
        """Posterior less prior median, in prior standard deviations."""
        if not (self.posterior.size and self.prior.size):
            return np.nan
        return _ratio(self.median - float(np.median(self.prior)), self.prior)

    def shift_from(self, other: "MassOf") -> float:
        """Median less that of another posterior, in standard deviations of the other."""
        return _ratio(self.median - other.median, other.posterior)


@dataclass(frozen=True)
class Preference:
    """What one cooling scenario comes to for one object.

    Attributes
    ----------
    scenario : str
        Its name.
    weight : float
        Stated prior weight; those of the run's scenarios sum to one.
    ln_evidence, ln_evidence_err : float
        ln Z_s, averaged over channels, and its standard error; minus infinity when no channel reaches the
        index, nan when every channel failed.
    probability, probability_err : float
        Posterior probability, channels summed, and its Monte Carlo standard error. A failed run counts for
        nothing.
    mass : MassOf
        Averaged over channels under this scenario.
    mass_shift : float
        Median mass under this scenario less that averaged over all, in standard deviations of the average.
    failed : int
        Channels that failed under this scenario.
    """

    scenario: str
    weight: float
    ln_evidence: float
    ln_evidence_err: float
    probability: float
    probability_err: float
    mass: MassOf
    mass_shift: float
    failed: int


def mass_of(probabilities: Probabilities, *, seed: int, name: str) -> MassOf:
    """Return the mass averaged over runs, by the very draws that the averages in parameters.ecsv take."""
    fits = probabilities.fits
    return MassOf(
        mix_draws([fit.posterior("mass") for fit in fits], probabilities.values, seed=seed, name=name),
        mix_draws([fit.prior("mass") for fit in fits], probabilities.prior, seed=seed, name=name),
    )


def preferences(
    fit: ObjectFit, probabilities: Probabilities, overall: MassOf, *, seed: int
) -> tuple[Preference, ...]:
    """Return the scenarios of an object, in the order of the run.

    Parameters
    ----------
    fit : ObjectFit
        The posterior runs and the weights of the scenarios.
    probabilities : Probabilities
        Over those runs.
    overall : MassOf
        The mass averaged over all of them.
    seed : int
        Seed of the fit.
    """
    made = []
    for scenario in dict.fromkeys(run.scenario for run in fit.fits):
        within = probabilities.within(scenario)
        mass = mass_of(within, seed=seed, name=fit.name)
        made.append(
            Preference(
                scenario,
                fit.weights[scenario],
                *_evidence(within),
                *probabilities.of(lambda run, scenario=scenario: run.scenario == scenario),  # type: ignore[misc]
                mass,
                mass.shift_from(overall),
                sum(run.status is Status.FAILED for run in within.fits),
            )
        )
    return tuple(made)


def best_scenario(made: tuple[Preference, ...]) -> Preference | None:
    """Return the most probable scenario; None when nothing is known."""
    known = [each for each in made if each.probability > 0.0]
    return max(known, key=lambda each: each.probability) if known else None


def scenario_rows(name: str, made: tuple[Preference, ...]) -> tuple[Row, ...]:
    """Return the rows of an object in scenarios.ecsv."""
    return tuple(_row(name, each) for each in made)


def _row(name: str, each: Preference) -> Row:
    return {
        "object": name,
        "scenario": each.scenario,
        "weight": each.weight,
        "ln_evidence": each.ln_evidence,
        "ln_evidence_err": each.ln_evidence_err,
        "probability": each.probability,
        **_quantiles("mass", each.mass.posterior),
        **_quantiles("mass_prior", each.mass.prior if each.mass.posterior.size else np.empty(0)),
        "mass_shift": each.mass_shift,
        "prior_shift": each.mass.prior_shift,
        "probability_err": each.probability_err,
        "failed": each.failed,
    }


def _quantiles(label: str, draws: NDArray[np.float64]) -> Row:
    return {
        f"{label}_{k}": float(np.quantile(draws, q)) if draws.size else np.nan for k, q in _LEVELS.items()
    }


def _evidence(within: Probabilities) -> tuple[float, float]:
    """Return ln of the mean evidence over the channels of one scenario, by their prior odds, and its error."""
    used = within.prior > 0.0
    ln_evidence = np.array([fit.ln_evidence for fit in within.fits])
    return mean_evidence(ln_evidence[used], within.ln_evidence_err[used], within.prior[used])


def _ratio(difference: float, draws: NDArray[np.float64]) -> float:
    """Return a difference in standard deviations of draws; nan where they have none."""
    sd = float(np.std(draws, ddof=1)) if draws.size > 1 else 0.0
    return difference / sd if sd > 0.0 else np.nan
