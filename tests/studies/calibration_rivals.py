"""Simulation-based calibration of the rivals of decay (Talts et al. 2018, arXiv:1804.06788).

    python tests/studies/calibration_rivals.py --channel companion --simulations 200

As in calibration.py: stars are drawn from the full prior of a rival, evolved forward and measured; the rank of each
true parameter among draws of its posterior must be uniform. The negative control fits objects with a wrong prior
(heavier stars, and what the rival adds stronger) and must fail the same test.
"""

import sys
from pathlib import Path

import numpy as np

from decayinfer.channels.registry import channel_names, load_channel
from decayinfer.cooling.registry import load_scenario, scenario_names
from decayinfer.inference.annealing import sound
from decayinfer.inference.priors import Priors
from decayinfer.inference.rival import integrate_posterior, integrate_prior, make_rival_problem
from decayinfer.inference.rival_density import evaluate_rival, rival_parameters
from decayinfer.inference.seeds import named_seeds
from decayinfer.inference.settings import FitSettings

sys.path.insert(0, str(Path(__file__).parent))
import calibration
from calibration import RANKS
from inventing import invent

SELECTION = calibration.SELECTION._replace(indices=(-300.0, 300.0))
#: What differs in the negative control: the mass, and for an object's index what makes it.
WRONG = Priors(
    mass_mean=1.55, companion_mass_median=3.0, glitch_step_median=3e-2, birth_period_log10_mean=-1.6
)
#: Not ranked: the field of a constant dipole is its birth field, an excess is the index again, and the temperature of
#: cold stars ties at the floor of the cooling fits.
REPEATED = {"field", "index_excess", "crust_temperature"}


def calibrate(channel_name, count, seed, *, priors=None):
    """Ranks of the truths, coverage of the central half and nine tenths by parameter, and how many fits were sound."""
    rival, scenario = load_channel(channel_name), load_scenario(scenario_names()[0])
    settings = FitSettings(priors=priors or Priors())
    ranks, converged = {}, 0
    found, _ = invent(rival, scenario, count, np.random.default_rng(seed), SELECTION)
    for star, (_, today, i) in found:
        problem = make_rival_problem(star, rival, scenario, settings)
        rng = np.random.default_rng(named_seeds(seed, star.name, channel_name))
        prior = integrate_prior(problem, rng)
        posterior = integrate_posterior(problem, prior, rng)
        converged += sound(prior) and sound(posterior)
        chosen = posterior.points[rng.choice(posterior.weights.size, RANKS - 1, p=posterior.weights)]
        e = evaluate_rival(chosen, problem)
        drawn = rival_parameters(e.spin, e.response, rival, scenario)
        for name, values in today.truths.items():
            if name not in REPEATED:
                ranks.setdefault(name, []).append(int(np.sum(drawn[name] < values[i])))
    places = {name: np.abs((np.array(values) + 0.5) / RANKS - 0.5) for name, values in ranks.items()}
    coverage = {name: [float(np.mean(p < half)) for half in (0.25, 0.45)] for name, p in places.items()}
    return ranks, coverage, int(converged)


def main():
    asked = calibration.arguments(__doc__.splitlines()[0], choices=channel_names(rivals=True))
    channels = asked.channel or channel_names(rivals=True)
    calibration.run(
        calibrate, channels, WRONG, simulations=asked.simulations, seed=asked.seed, ages=SELECTION.ages
    )


if __name__ == "__main__":
    main()
