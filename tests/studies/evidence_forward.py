r"""Evidence against forward Monte Carlo: prior, field equation, spin equation, and a bin around the object.

    python tests/studies/evidence_forward.py [--draws 2000000] [--seed 1]

Averaged over a bin of width w in ln P and ln Pdot around the object, the joint density of channel and data is

.. math::

    \bar p = \frac{1}{w^2} \int_\mathrm{bin} p(n, \ln P, \ln\dot P)\, d\ln P\, d\ln\dot P
           = \frac{1}{w^2}\, E_\mathrm{prior}[\, 1_\mathrm{bin}(P, \dot P)\, L(n \mid n_\mathrm{star})\,]

whose right-hand side needs nothing but stars drawn from the prior and followed forward by the equations
(tests/inference/forward.py). The inference gives p at the centre; its ratio to the average is the same integral by
3 x 3 Gauss-Legendre nodes, evaluated at one set of importance-weighted points. So no bias of the bin is left, and
the bin may be wide enough to catch many stars. The evidence of the spin alone, p(ln P, ln Pdot), is the same
with L = 1.

Stars that cannot end in the bin are not followed, which changes nothing. Field decays and period grows, hence: the
age is at most the characteristic age; the birth field is at least that of today; the birth period is at most that of
today; and P^2 - P_0^2 <= 2 C B_0^2 t.
"""

import argparse
import sys
from pathlib import Path

import numpy as np
from scipy import stats

sys.path[:0] = [str(Path(__file__).parent), str(Path(__file__).parents[1] / "inference")]

import forward  # noqa: E402
import recording  # noqa: E402
import tools  # noqa: E402

from decayinfer.catalog.pulsar import Pulsar  # noqa: E402
from decayinfer.channels.registry import channel_names, load_channel  # noqa: E402
from decayinfer.cooling.registry import load_scenario  # noqa: E402
from decayinfer.inference.density import evaluate  # noqa: E402
from decayinfer.inference.fit import fit_channel  # noqa: E402
from decayinfer.inference.importance import importance_sample  # noqa: E402
from decayinfer.inference.measurement import ln_index_likelihood  # noqa: E402
from decayinfer.inference.priors import Priors  # noqa: E402
from decayinfer.inference.problem import make_problem  # noqa: E402
from decayinfer.inference.settings import FitSettings  # noqa: E402
from decayinfer.physics import torque  # noqa: E402
from decayinfer.physics.constants import YEAR_S  # noqa: E402
from decayinfer.physics.lattice import FREEZE_OUT  # noqa: E402

#: Invented; a broad index, so that a good part of the stars in the bin count.
OBJECT = Pulsar(
    name="Wren", period=0.3, period_derivative=4e-14, braking_index=12.0,
    braking_index_err_minus=3.0, braking_index_err_plus=3.0,
)  # fmt: skip
WIDTH = 0.3  # of the bin in ln P and in ln Pdot
BATCH = 500_000


def stars(count, priors, largest_age, rng):
    """Draws of the prior but for the age, which is uniform up to `largest_age`; and the factor that corrects it."""
    edges = [(edge - priors.mass_mean) / priors.mass_sd for edge in (1.0, 2.0)]

    def lognormal(median, sd):
        return np.exp(stats.norm.rvs(np.log(median), sd, count, random_state=rng))

    def decimal(mean, sd):
        return 10.0 ** stats.norm.rvs(mean, sd, count, random_state=rng)

    age = largest_age * rng.random(count)
    draws = forward.Draws(
        mass=stats.truncnorm.rvs(*edges, priors.mass_mean, priors.mass_sd, count, random_state=rng),
        phonon_time=lognormal(priors.phonon_time_median, priors.phonon_time_sd),
        impurity_parameter=lognormal(priors.impurity_parameter_median, priors.impurity_parameter_sd),
        hall_factor=lognormal(priors.hall_factor_median, priors.hall_factor_sd),
        hall_times=lognormal(priors.attractor_times_median, priors.attractor_times_sd),
        birth_field=decimal(priors.birth_field_log10_mean - 12.0, priors.birth_field_log10_sd),
        birth_period=decimal(priors.birth_period_log10_mean, priors.birth_period_log10_sd),
        age=age,
        umklapp_temperature=lognormal(priors.umklapp_median / 1e8, priors.umklapp_sd),
    )
    # the birth rate is constant up to max_age, tapered as 1/(1 + (t/max_age)^8)
    taper = np.pi / 8.0 / np.sin(np.pi / 8.0)
    return draws, largest_age / (priors.max_age * taper) / (1.0 + (age / priors.max_age) ** 8)


def may_end_in_bin(draws, scenario, star, width):
    """Stars that the inequalities of the module's docstring do not rule out."""
    constant = torque.spin_down_constant(
        radius_km=scenario.radius_km(draws.mass), inertia_45=scenario.inertia_45(draws.mass)
    )
    low, high = star.period * np.exp(-width / 2), star.period * np.exp(width / 2)
    field_squared = low * star.period_derivative * np.exp(-width / 2) / constant
    spun_down = 2.0 * constant * draws.birth_field**2 * draws.age * YEAR_S
    return (
        (draws.birth_field**2 >= field_squared)
        & (draws.birth_period <= high)
        & (draws.birth_period**2 + spun_down >= low**2)
    )


def simulated(channel, scenario_name, star, draws, rng, *, width=WIDTH, priors=None):
    """ln of the bin-averaged p(n, ln P, ln Pdot) and p(ln P, ln Pdot) by Monte Carlo, each with its error."""
    priors, scenario = priors or Priors(), load_scenario(scenario_name)
    law = FREEZE_OUT[priors.freeze_out]
    largest = min(star.characteristic_age * np.exp(width), 1.3 * priors.max_age)
    joint, spin = [], []
    for _ in range(draws // BATCH or 1):
        sample, factor = stars(min(draws, BATCH), priors, largest, rng)
        kept = may_end_in_bin(sample, scenario, star, width)
        today = forward.evolve(sample[kept], scenario, channel=channel, law=law)
        with np.errstate(divide="ignore"):
            inside = (np.abs(np.log(today.period / star.period)) < width / 2) & (
                np.abs(np.log(today.period_derivative / star.period_derivative)) < width / 2
            )
        likelihood = np.exp(
            ln_index_likelihood(
                star.braking_index, today.braking_index[inside], star.braking_index_err_minus,
                star.braking_index_err_plus, 0.0, priors.scatter_sd,
            )
        )  # fmt: skip
        spin.append(factor[kept][inside])
        joint.append(factor[kept][inside] * likelihood)
    total = max(draws // BATCH, 1) * min(draws, BATCH)
    return {
        "joint": _mean(np.concatenate(joint), total, width),
        "spin": _mean(np.concatenate(spin), total, width),
    }


def _mean(weights, total, width):
    """ln of the mean over `total` draws, most of them zero, per bin area; and its standard error."""
    mean = weights.sum() / total
    error = np.sqrt((np.sum(weights**2) / total - mean**2) / total)
    return float(np.log(mean / width**2)), float(error / mean), int(weights.size)


def inferred(channel, scenario_name, star, *, width=WIDTH, priors=None, seed=1):
    """The same by the package: what a fit reports, carried from the centre of the bin to its average."""
    priors = priors or Priors()
    settings = FitSettings(seed=seed, priors=priors)
    fit = fit_channel(star, channel, scenario_name, settings)
    numbers = make_problem(star, load_channel(channel), load_scenario(scenario_name), priors)
    rng = np.random.default_rng(seed)
    coordinates = {
        "joint": (numbers, fit.draws["posterior"]["coordinates"]),
        "spin": (numbers.without_index(), fit.draws["prior"]["coordinates"]),
    }
    reported = {
        "joint": (fit.ln_evidence_joint, fit.ln_evidence_joint_err),
        "spin": (
            fit.ln_evidence_joint - fit.ln_evidence,
            float(np.hypot(fit.ln_evidence_err, fit.ln_evidence_joint_err)),
        ),
    }
    out = {}
    for kind, (problem, points) in coordinates.items():
        shift = bin_shift(problem, points.values.reshape(-1, 8), width, rng)
        out[kind] = (reported[kind][0] + shift, reported[kind][1], shift)
    return out, fit.status.value


def bin_shift(problem, points, width, rng):
    """ln of the density's average over the bin over its value at the centre."""
    weighted = importance_sample(problem, points, 2000, rng)
    centre = evaluate(weighted.points, problem).ln_density(problem)
    nodes, weights = np.polynomial.legendre.leggauss(3)
    average = 0.0
    for x, a in zip(nodes * width / 2, weights / 2, strict=True):
        for y, b in zip(nodes * width / 2, weights / 2, strict=True):
            moved = problem._replace(spin=problem.spin + np.array([x, y, x - y]))
            with np.errstate(invalid="ignore"):
                ratio = np.exp(evaluate(weighted.points, moved).ln_density(moved) - centre)
            average += a * b * np.sum(weighted.weights * np.nan_to_num(ratio))
    return float(np.log(average))


def compare(channel, scenario, draws, seed, star=OBJECT):
    """One row: both evidences both ways, and their differences in combined standard errors."""
    theirs = simulated(channel, scenario, star, draws, np.random.default_rng([seed, 7]))
    ours, status = inferred(channel, scenario, star, seed=seed)
    row = {"channel": channel, "scenario": scenario, "status": status, "draws": draws}
    for kind in ("joint", "spin"):
        (value, error, stars_in_bin), (fitted, fit_error, shift) = theirs[kind], ours[kind]
        row |= {
            f"{kind}_simulated": value, f"{kind}_simulated_err": error, f"{kind}_inferred": fitted,
            f"{kind}_inferred_err": fit_error, f"{kind}_bin_shift": shift,
            f"{kind}_pull": (fitted - value) / float(np.hypot(error, fit_error)), "stars_in_bin": stars_in_bin,
        }  # fmt: skip
    return row


def main():
    parser = argparse.ArgumentParser(
        description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter
    )
    parser.add_argument("--draws", type=int, default=2_000_000)
    parser.add_argument("--seed", type=int, default=1)
    chosen = parser.parse_args()
    tools.register_scenarios()
    rows = []
    for scenario in ("candle", "slow-candle"):
        for channel in channel_names(rivals=False)[1:]:
            row = compare(channel, scenario, chosen.draws, chosen.seed)
            rows.append(row)
            print(
                f"{scenario:12} {channel:22} joint {row['joint_simulated']:.3f}({row['joint_simulated_err']:.3f}) "
                f"{row['joint_inferred']:.3f}({row['joint_inferred_err']:.3f}) pull {row['joint_pull']:+.2f}   "
                f"spin {row['spin_simulated']:.3f}({row['spin_simulated_err']:.3f}) "
                f"{row['spin_inferred']:.3f}({row['spin_inferred_err']:.3f}) pull {row['spin_pull']:+.2f}",
                flush=True,
            )
    star = {k: v for k, v in vars(OBJECT).items() if isinstance(v, float) and np.isfinite(v)}
    print(
        recording.write(
            "evidence_forward", rows, draws=chosen.draws, seed=chosen.seed, bin_width=WIDTH, star=star
        )
    )
    worst = max(max(abs(row["joint_pull"]), abs(row["spin_pull"])) for row in rows)
    return 0 if worst < 3.5 else 1


if __name__ == "__main__":
    raise SystemExit(main())
