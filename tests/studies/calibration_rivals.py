"""Simulation-based calibration of the rivals of decay (Talts et al. 2018, arXiv:1804.06788).

    python tests/studies/calibration_rivals.py --channel companion --simulations 200

As in calibration.py: stars are drawn from the full prior of a rival, evolved forward and measured; the rank of each
true parameter among draws of its posterior must be uniform. Selection uses data alone, and the error of n is drawn
without looking at n. The negative control fits objects with a wrong prior (heavier stars, and what the rival adds
stronger) and must fail the same test.
"""

import argparse
import sys
from pathlib import Path

import numpy as np

from decayinfer.catalog.pulsar import Pulsar
from decayinfer.channels.registry import channel_names, load_channel
from decayinfer.cooling.registry import load_scenario, scenario_names
from decayinfer.inference.annealing import sound
from decayinfer.inference.forward import draw_prior
from decayinfer.inference.measurement import sample_index
from decayinfer.inference.priors import Priors
from decayinfer.inference.rival import integrate_posterior, integrate_prior, make_rival_problem
from decayinfer.inference.rival_density import evaluate_rival, rival_parameters
from decayinfer.inference.rival_forward import evolve_rival
from decayinfer.inference.seeds import named_seeds
from decayinfer.inference.settings import FitSettings
from decayinfer.physics.torque import characteristic_age

sys.path.insert(0, str(Path(__file__).parent))
from calibration import AGES, CONTROLS, ERRORS, PERIODS, RANKS, TAIL, inside, rank_tests, smallest

INDICES = (-300.0, 300.0)  # selection on the measured index
#: What differs in the negative control: the mass, and for an object's index what makes it.
WRONG = Priors(
    mass_mean=1.55, companion_mass_median=3.0, glitch_step_median=3e-2, birth_period_log10_mean=-1.6
)
#: Not ranked: the field of a constant dipole is its birth field, an excess is the index again, and the temperature of
#: cold stars ties at the floor of the cooling fits.
REPEATED = {"field", "index_excess", "crust_temperature"}


def sample_objects(rival, scenario, count, seed):
    """Invented objects and their truths by name."""
    rng = np.random.default_rng(seed)
    priors, found = Priors(), []
    while len(found) < count:
        today = evolve_rival(draw_prior(2000, priors, rng), rival, scenario, priors, rng)
        error = np.exp(rng.uniform(*np.log(ERRORS), size=2000))
        with np.errstate(all="ignore"):
            measured = sample_index(today.braking_index, error, error, priors.scatter_sd, rng)
            age = characteristic_age(today.period, today.period_derivative)
        kept = inside(today.period, PERIODS) & inside(age, AGES) & inside(measured, INDICES)
        for i in np.flatnonzero(kept):
            star = Pulsar(
                name=f"object {len(found)}", period=today.period[i], period_derivative=today.period_derivative[i],
                braking_index=measured[i], braking_index_err_minus=error[i], braking_index_err_plus=error[i],
            )  # fmt: skip
            found.append((star, {name: values[i] for name, values in today.truths.items()}))
    return found[:count]


def calibrate(channel_name, count, seed, *, priors=None):
    """Ranks of the truths, coverage of the central half and nine tenths by parameter, and how many fits were sound."""
    rival, scenario = load_channel(channel_name), load_scenario(scenario_names()[0])
    settings = FitSettings(priors=priors or Priors())
    ranks, converged = {}, 0
    for star, truth in sample_objects(rival, scenario, count, seed):
        problem = make_rival_problem(star, rival, scenario, settings)
        rng = np.random.default_rng(named_seeds(seed, star.name, channel_name))
        prior = integrate_prior(problem, rng)
        posterior = integrate_posterior(problem, prior, rng)
        converged += sound(prior) and sound(posterior)
        chosen = posterior.points[rng.choice(posterior.weights.size, RANKS - 1, p=posterior.weights)]
        e = evaluate_rival(chosen, problem)
        drawn = rival_parameters(e.spin, e.response, rival, scenario)
        for name, value in truth.items():
            if name not in REPEATED:
                ranks.setdefault(name, []).append(int(np.sum(drawn[name] < value)))
    places = {name: np.abs((np.array(values) + 0.5) / RANKS - 0.5) for name, values in ranks.items()}
    coverage = {name: [float(np.mean(p < half)) for half in (0.25, 0.45)] for name, p in places.items()}
    return ranks, coverage, int(converged)


def main():
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    parser.add_argument("--channel", action="append", choices=channel_names(rivals=True))
    parser.add_argument("--simulations", type=int, default=200)
    parser.add_argument("--seed", type=int, default=2026)
    asked = parser.parse_args()
    import recording

    for channel in asked.channel or channel_names(rivals=True):
        rows = []
        for label, priors, count in (
            ("right prior", None, asked.simulations),
            ("wrong prior", WRONG, CONTROLS),
        ):
            ranks, coverage, converged = calibrate(channel, count, asked.seed, priors=priors)
            tests = rank_tests(ranks)
            rows += [
                {"prior": label, "parameter": name, **tests[name], "coverage_50": coverage[name][0],
                 "coverage_90": coverage[name][1], "converged": converged, "ranks": ranks[name]}
                for name in ranks
            ]  # fmt: skip
            print(
                channel,
                label,
                "smallest tail probability",
                smallest(tests),
                "converged",
                converged,
                flush=True,
            )
            print("   ", {name: round(min(pair.values()), 4) for name, pair in tests.items()}, flush=True)
        recording.write(
            f"calibration-{channel}",
            rows,
            simulations=asked.simulations,
            seed=asked.seed,
            ranks=RANKS,
            tail=TAIL,
        )


if __name__ == "__main__":
    main()
