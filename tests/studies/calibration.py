"""Simulation-based calibration of the posteriors (Talts et al. 2018, arXiv:1804.06788).

    python tests/studies/calibration.py --channel phonon --simulations 200

Parameters are drawn from the full prior, evolved forward to P, Pdot and n, and measured; the posterior of each
invented object (inventing.py) is sampled, and the rank of each true value among its draws must be uniform.

The negative control fits some of the same objects with a wrong prior (heavier stars), and must fail the same test.
"""

import argparse
import sys
from pathlib import Path

import numpy as np
from scipy import stats

from decayinfer.channels.registry import load_channel
from decayinfer.cooling.registry import load_scenario, scenario_names
from decayinfer.inference.coordinates import ln_index_excess
from decayinfer.inference.density import evaluate
from decayinfer.inference.explore import explore
from decayinfer.inference.priors import Priors
from decayinfer.inference.problem import make_problem
from decayinfer.inference.seeds import named_seeds
from decayinfer.inference.settings import FitSettings
from decayinfer.physics.torque import characteristic_age

sys.path.insert(0, str(Path(__file__).parent))
import recording
from inventing import Selection, invent

#: In stars older than this the phonon rate is frozen out over many e-folds: fits take ten times as long and one in
#: twenty does not converge, which its status says.
SELECTION = Selection(periods=(0.01, 10.0), ages=(1e3, 3e6), indices=(-20.0, 300.0), errors=(0.1, 3.0))
RANKS = 50  # possible ranks: 49 thinned draws
TAIL = 1e-3  # tail probability at which a rank test fails
WRONG = Priors(mass_mean=1.55)
CONTROLS = 60  # simulations of the negative control


def sample_objects(channel, scenario, count, seed):
    """Invented objects and their truths: logs of the physical parameters, by name."""
    found, _ = invent(channel, scenario, count, np.random.default_rng(seed), SELECTION)
    return [(star, truths(draws, today, channel, i)) for star, (draws, today, i) in found]


def truths(draws, today, channel, i):
    age = characteristic_age(today.period[i], today.period_derivative[i])
    out = {
        "mass": draws.mass[i], "ln_phonon_time": np.log(draws.phonon_time[i]), "ln_age": np.log(draws.age[i]),
        "ln_birth_field": np.log(draws.birth_field[i]), "ln_birth_period": np.log(draws.birth_period[i]),
        # n itself would tie at 3.0 for cold stars, whose phonon rate is below rounding
        "ln_index_excess": np.log(4.0 * age * (today.rate_phonon + today.rate_impurity + today.rate_hall)[i]),
    }  # fmt: skip
    if channel.phonon:
        out["ln_umklapp"] = np.log(draws.umklapp[i])
    if channel.impurity:
        out["ln_impurity_parameter"] = np.log(draws.impurity_parameter[i])
    if channel.hall:
        out["ln_hall_factor"] = np.log(draws.hall_factor[i])
        out["ln_attractor_times"] = np.log(draws.attractor_times[i])
    return out


def calibrate(channel_name, count, seed, *, priors=None, settings=None, scenario_name=None, progress=None):
    """Ranks of the truths, by parameter, and how many fits converged."""
    channel = load_channel(channel_name)
    scenario = load_scenario(scenario_name or scenario_names()[0])
    settings = settings or FitSettings(draws=400, tune=250)
    ranks, coverage, converged = {}, {}, 0
    for star, truth in sample_objects(channel, scenario, count, seed):
        problem = make_problem(star, channel, scenario, priors or Priors())
        found = explore(problem, settings, named_seeds(seed, star.name, channel_name))
        converged += found.converged
        flat = found.points.reshape(-1, found.points.shape[-1])
        thinned = flat[np.linspace(0, len(flat) - 1, RANKS - 1).astype(int)]
        drawn_values = evaluate(thinned, problem).physical._asdict()
        drawn_values["ln_index_excess"] = ln_index_excess(list(thinned.T), problem)
        for name, value in truth.items():
            drawn = drawn_values[name] + np.zeros(RANKS - 1)
            ranks.setdefault(name, []).append(int(np.sum(drawn < value)))
        if progress:
            progress(star, found)
    for name, values in ranks.items():
        place = (np.array(values) + 0.5) / RANKS
        coverage[name] = [float(np.mean(np.abs(place - 0.5) < half)) for half in (0.25, 0.45)]
    return ranks, coverage, converged


def rank_tests(ranks):
    """Tail probabilities of the chi-square test on ten bins and of the Kolmogorov-Smirnov test, by parameter."""
    out = {}
    for name, values in ranks.items():
        place = (np.array(values) + np.random.default_rng(len(values)).random(len(values))) / RANKS
        counts = np.histogram(place, bins=10, range=(0.0, 1.0))[0]
        out[name] = {
            "chi_square": float(stats.chisquare(counts).pvalue),
            "ks": float(stats.kstest(place, "uniform").pvalue),
        }
    return out


def smallest(tests):
    return min(p for pair in tests.values() for p in pair.values())


def run(calibrate, channels, wrong, *, simulations, seed, ages):
    """Calibrate channels under the right and the wrong prior, print what came out and record it."""
    for channel in channels:
        rows = []
        for label, priors, count in (("right prior", None, simulations), ("wrong prior", wrong, CONTROLS)):
            ranks, coverage, converged = calibrate(channel, count, seed, priors=priors)
            tests = rank_tests(ranks)
            rows += [
                {"prior": label, "parameter": name, **tests[name], "coverage_50": coverage[name][0],
                 "coverage_90": coverage[name][1], "converged": converged, "ranks": ranks[name]}
                for name in ranks
            ]  # fmt: skip
            print(
                f"{channel} {label}: smallest tail probability {smallest(tests):.2g}, converged {converged}",
                {name: round(min(pair.values()), 4) for name, pair in tests.items()},
                flush=True,
            )
        recording.write(
            f"calibration-{channel}",
            rows,
            simulations=simulations,
            seed=seed,
            ranks=RANKS,
            tail=TAIL,
            ages=ages,
        )


def hold(record):
    """Assert what a recorded run must show: uniform ranks and coverage, and a negative control that fails."""
    count = record["settings"]["simulations"]
    assert count >= 200
    ranks = {
        label: {row["parameter"]: row["ranks"] for row in record["rows"] if row["prior"] == label}
        for label in ("right prior", "wrong prior")
    }
    assert smallest(rank_tests(ranks["right prior"])) > TAIL
    assert smallest(rank_tests(ranks["wrong prior"])) < TAIL
    for row in record["rows"]:
        if row["prior"] == "right prior":
            assert row["converged"] >= 0.95 * count
            assert abs(row["coverage_90"] - 0.9) < 3.3 * (0.9 * 0.1 / count) ** 0.5 + 0.02


def arguments(description, **channel):
    """Read the command line of a calibration."""
    parser = argparse.ArgumentParser(description=description)
    parser.add_argument("--channel", action="append", **channel)
    parser.add_argument("--simulations", type=int, default=200)
    parser.add_argument("--seed", type=int, default=2026)
    return parser.parse_args()


def main():
    asked = arguments(__doc__.splitlines()[0], required=True)
    run(calibrate, asked.channel, WRONG, simulations=asked.simulations, seed=asked.seed, ages=SELECTION.ages)


if __name__ == "__main__":
    main()
