r"""Posteriors under the analytic fit of a cooling scenario against those under the solver that it was fitted to.

    python tests/studies/fit_against_solver.py [--jobs N]

Draws of a posterior under the fit, as the package makes them, are reweighted by the ratio of two densities: that of the
solver over that of the fit. The solver's density is evaluated here from the equations of the field history

.. math::

    w(s) = e^{-J(s)} [1 - A\eta E(s)], \qquad \ln G(t) = \ln \int_0^t w^{-2}\, ds = \ln\tau

with J the integral of the Ohmic rate and E that of S e^J, both from s to now; with ln T_b, radius and moment of inertia
by splines through solved stars, 240 nodes instead of 36, and an age that is searched for anew. The same draws serve
both sides, so that the difference of the two posteriors is known far better than either.

With triplet pairing the 36 nodes themselves are in question: there the fit is also put against itself at 240 nodes.
"""

import argparse
import sys
from concurrent.futures import ProcessPoolExecutor
from multiprocessing import get_context
from pathlib import Path

import numpy as np
from scipy.interpolate import CubicSpline, RectBivariateSpline

from decayinfer.catalog.pulsar import Pulsar
from decayinfer.channels.registry import load_channel
from decayinfer.cooling import build, form
from decayinfer.cooling.eos import get_eos
from decayinfer.cooling.fitting import LN_FLOOR, LN_MEASURED, RELAXATION_TIME
from decayinfer.cooling.gradients import Grid
from decayinfer.cooling.recipes import RECIPES
from decayinfer.cooling.registry import load_scenario
from decayinfer.cooling.stars import stars_of_mass
from decayinfer.inference.coordinates import history_inputs, ln_index_excess, ln_prior, physical
from decayinfer.inference.density import Evaluation, evaluate
from decayinfer.inference.explore import explore
from decayinfer.inference.measurement import ln_index_likelihood
from decayinfer.inference.nodes import quadrature
from decayinfer.inference.priors import Priors
from decayinfer.inference.problem import make_problem
from decayinfer.inference.report import parameters
from decayinfer.inference.seeds import named_seeds
from decayinfer.inference.settings import FitSettings
from decayinfer.physics.constants import T_UNIT_K

#: Invented: young, middle-aged and old, so that the neutrino era, the turn and the photon era all count.
OBJECTS = tuple(
    Pulsar(name=name, period=period, period_derivative=derivative, braking_index=index,
           braking_index_err_minus=error, braking_index_err_plus=error)
    for name, period, derivative, index, error in (
        ("Curlew", 0.12, 9e-14, 6.1, 0.3), ("Dunlin", 0.31, 4e-14, 21.0, 1.05), ("Knot", 0.65, 9e-15, 24.0, 1.5),
    )
)  # fmt: skip
CHANNELS = ("phonon", "impurity+phonon+hall")
SCENARIOS = tuple(RECIPES)
COARSE, FINE = quadrature(), quadrature(240, 8.0)
BLOCKS = 10


# --- the solver ---------------------------------------------------------------------------------------------


class Solver:
    """ln T_b, radius and moment of inertia of a recipe, by cubic splines through solved stars.

    Two conventions are those of the fit, because no computation stands behind either: the clock ln(t + 100 yr), along
    which the youngest solved temperatures are carried on straight to birth, and the floor of 1.5e6 K.
    """

    def __init__(self, recipe, *, masses=41, ages=600):
        self.recipe = recipe
        self.mass = np.linspace(*form.MASS_RANGE, masses)
        if recipe.direct_urca:
            onset = build._threshold(recipe)
            self.mass = np.union1d(self.mass, np.linspace(onset - 0.03, onset + 0.1, masses))
        self.age = np.geomspace(300.0, 3e7, ages)
        self._clock = np.log(self.age + RELAXATION_TIME)
        solved = self._solve(self.mass, self.age)
        self._spline = RectBivariateSpline(self.mass, self._clock, _floored(_carried_on(solved, self._clock)))
        stars = stars_of_mass(get_eos(recipe.eos), self.mass)
        self._ln_radius = CubicSpline(self.mass, np.log([star.radius for star in stars]))
        self._ln_inertia = CubicSpline(self.mass, np.log([star.moment_of_inertia for star in stars]))

    def ln_temperature(self, ln_age, mass):
        clock = np.log(np.exp(ln_age) + RELAXATION_TIME)
        inside = np.clip(clock, self._clock[0], self._clock[-1])
        early = np.minimum(clock - inside, 0.0)
        mass = np.broadcast_to(mass, clock.shape)
        start = self._spline.ev(mass[..., :1], np.full_like(mass[..., :1], self._clock[0]), dy=1)
        return self._spline.ev(mass, inside) + start * early

    def structure(self, mass):
        """What a Problem takes as Chebyshev coefficients: constants, one for each point."""
        zero = np.zeros_like(mass)
        return np.array([[law(mass), zero, zero, zero] for law in (self._ln_radius, self._ln_inertia)])

    def left_out_error(self):
        """Largest error of the spline of ln T_b at every fourth mass and every age midway between those of the grid."""
        mass, age = 0.5 * (self.mass[1::4] + self.mass[:-1:4]), np.sqrt(self.age[1:] * self.age[:-1])
        age = age[age <= 1e7]
        solved = np.nan_to_num(self._solve(mass, age), nan=-99.0)
        found = self.ln_temperature(np.broadcast_to(np.log(age), solved.shape), mass[:, None])
        return float(np.abs(found - _floored(solved))[solved >= LN_MEASURED].max())

    def _solve(self, mass, age):
        recipe = self.recipe
        grid = Grid(mass, age)
        return build.solve_histories(
            get_eos(recipe.eos), recipe.physics, grid, envelope=recipe.envelope
        ).ln_t_b


class AsFitted:
    """The fit itself in the place of the solver: the control that must change nothing."""

    def __init__(self, scenario):
        self.ln_temperature, self._scenario = scenario.ln_temperature, scenario

    def structure(self, mass):
        return np.array([self._scenario.ln_radius, self._scenario.ln_inertia])


def _carried_on(solved, clock):
    """Straight on from where the solver stops, far below the floor."""
    out = solved.copy()
    for row in out:
        cold = np.flatnonzero(np.isnan(row))
        if cold.size:
            last = cold[0] - 1
            slope = (row[last] - row[last - 1]) / (clock[last] - clock[last - 1])
            row[cold] = row[last] + slope * (clock[cold] - clock[last])
    return out


def _floored(ln_t):
    k = form.FLOOR_SHARPNESS
    return LN_FLOOR + np.logaddexp(0.0, k * (ln_t - LN_FLOOR)) / k


# --- the density, from the equations ------------------------------------------------------------------------


def growth(ln_age, theta, problem, star, nodes):
    """ln G, J(0), ln w(0), ln f now and ln A of stars of given age; infinite beyond the wall of the birth field."""
    _, ln_rate, ln_q, ln_eta, ln_ratio, mass, ln_umklapp = theta.T[..., None]
    phonon, impurity, hall = problem.flags
    strength, power = problem.freeze
    sigma, weights, to_now = nodes

    def ln_f(age):
        ln_t = star.ln_temperature(np.log(np.maximum(age, 1e-300)), np.broadcast_to(mass, age.shape))
        return 2.0 * ln_t - strength * np.exp(power * (ln_umklapp - ln_t))

    q = impurity * (np.exp(ln_q) if phonon else np.ones_like(ln_q))
    eta = hall * (np.exp(ln_eta) if phonon + impurity else np.ones_like(ln_eta))
    age = np.exp(ln_age)[:, None]
    now = ln_f(age)
    switch = 1.0 / (1.0 + (sigma / np.exp(ln_ratio)) ** 4)
    ln_amplitude = ln_rate - np.log(phonon + q + eta / (1.0 + np.exp(-4.0 * ln_ratio)))
    per_life = age * np.exp(ln_amplitude)
    depth = per_life * ((phonon * np.exp(ln_f(age * sigma) - now) + q) @ to_now.T)
    left = 1.0 - per_life * eta * ((switch * np.exp(depth)) @ to_now.T)
    with np.errstate(invalid="ignore", divide="ignore"):
        ln_w = np.where(left > 0.0, np.log(left), -np.inf) - depth
        ln_g = ln_age + np.log(np.exp(-2.0 * ln_w) @ weights)
    wall = ~np.all(np.isfinite(ln_w), axis=1)
    return np.where(wall, np.inf, ln_g), depth[:, 0], ln_w[:, 0], now[:, 0], ln_amplitude[:, 0]


def find_age(theta, start, ln_growth):
    """Root of 1 - tau/G, which is finite beyond the wall too: secants inside a bracket, from G >= t."""
    low, high = theta[:, 0] - 30.0, theta[:, 0] + 1e-12
    y, old, old_miss = start.copy(), start - 1e-3, None
    open_ = np.arange(len(y))  # draws whose age is not found yet
    for _ in range(120):
        miss = -np.expm1(theta[open_, 0] - ln_growth(y[open_], theta[open_]))
        high[open_] = np.where(miss > 0.0, y[open_], high[open_])
        low[open_] = np.where(miss > 0.0, low[open_], y[open_])
        with np.errstate(invalid="ignore", divide="ignore"):
            slope = 1.0 if old_miss is None else (miss - old_miss[open_]) / (y[open_] - old[open_])
            new = y[open_] - miss / slope
        middle = 0.5 * (low[open_] + high[open_])
        new = np.where((new > low[open_]) & (new < high[open_]), new, middle)
        old_miss = np.zeros(len(y)) if old_miss is None else old_miss
        old[open_], old_miss[open_] = y[open_], miss
        found = (np.abs(miss) < 1e-12) | (high[open_] - low[open_] < 1e-13)  # d ln G/d ln t is 1 or more
        y[open_[~found]] = new[~found]
        open_ = open_[~found]
        if not open_.size:
            return y
    raise AssertionError(f"no age for {open_.size} of {len(y)} draws")


def evaluate_plainly(points, problem, star, nodes, start):
    """What `decayinfer.inference.density.evaluate` returns, by the plain equations; ages searched from `start`."""
    z = list(np.ascontiguousarray(points.T))
    theta = np.column_stack(np.broadcast_arrays(*history_inputs(z, problem)))
    with np.errstate(over="ignore", invalid="ignore"):
        ln_age = find_age(theta, start, lambda y, rows: growth(y, rows, problem, star, nodes)[0])
        step = 2e-5
        early, late = (growth(ln_age + h, theta, problem, star, nodes)[0] for h in (-step, step))
        _, depth, ln_w, ln_f, ln_amplitude = growth(ln_age, theta, problem, star, nodes)
    slope = (late - early) / (2.0 * step)
    history = np.array([ln_age, depth, ln_w, theta[:, 0] + np.log(slope) - ln_age, ln_f, ln_amplitude])
    own = problem._replace(structure=star.structure(theta[:, 5]))
    index = 3.0 + np.exp(ln_index_excess(z, problem))
    observed, minus, plus, limit = problem.index
    likelihood = ln_index_likelihood(observed, index, minus, plus, limit, problem.limits[4])
    return Evaluation(ln_prior(z, history, own), likelihood, physical(z, history, own), history)


# --- the comparison -----------------------------------------------------------------------------------------


def reweigh(points, problem, channel, star, nodes):
    """Parameters of the draws under the package and under `star`, and ln of the ratio of their densities."""
    ours = evaluate(points, problem)
    theirs = evaluate_plainly(points, problem, star, nodes, ours.history[0])
    before, after = (dict(parameters(e, problem, channel)) for e in (ours, theirs))
    after["crust_temperature"] = T_UNIT_K * np.exp(
        star.ln_temperature(theirs.physical.ln_age[:, None], theirs.physical.mass[:, None])[:, 0]
    )
    for found in (before, after):
        found["decay_rate"] = 1.0 / found.pop("decay_time")
    return before, after, theirs.ln_density(problem) - ours.ln_density(problem)


def shift(before, after, ln_ratio):
    """Largest moves, in standard deviations, of x and of ln x: of the mean, and of the 16, 50 and 84 % points."""
    weights = np.exp(ln_ratio - ln_ratio.max())
    means, levels = [0.0], [0.0]
    for scale in (np.asarray, np.log):
        with np.errstate(divide="ignore"):
            x, y = scale(before), scale(after)
        finite = np.isfinite(x) & np.isfinite(y)
        if scale is np.log:  # a rate may round to zero, where n does to 3
            x, y, w = x[finite], y[finite], weights[finite]
        else:
            assert np.all(finite)
            w = weights
        if np.ptp(x) > 1e-9 * np.abs(x).max():  # a share that is always 1 does not move
            means.append((np.average(y, weights=w) - x.mean()) / x.std())
            levels += list((_quantiles(y, w) - _quantiles(x, np.ones_like(x))) / x.std())
    return float(max(means, key=abs)), float(max(levels, key=abs))


def _quantiles(x, weights):
    order = np.argsort(x)
    cumulative = np.cumsum(weights[order])
    return np.interp([0.16, 0.5, 0.84], (cumulative - 0.5 * weights[order]) / cumulative[-1], x[order])


def compare(star, scenario, channel, sides, *, settings=None):
    """One row for each side, a mapping of names to stand-ins for the fit: how far every reported parameter moves."""
    numbers = make_problem(star, load_channel(channel), load_scenario(scenario), Priors())
    settings = settings or FitSettings()
    found = explore(numbers, settings, named_seeds(settings.seed, star.name, scenario, channel))
    points = found.points.reshape(-1, numbers.active.size)
    run = {"object": star.name, "scenario": scenario, "channel": channel, "converged": found.converged}
    return [
        {"against": against} | run | moves(*reweigh(points, numbers, load_channel(channel), side, FINE))
        for against, side in sides.items()
    ]


def moves(before, after, ln_ratio):
    """Moves of mean and quantiles by parameter, and the noise of the largest move of a mean from blocks of draws."""
    found = {name: shift(before[name], after[name], ln_ratio) for name in before}
    means, levels = ({name: round(pair[i], 5) for name, pair in found.items()} for i in (0, 1))
    worst = max(means, key=lambda name: abs(means[name]))
    blocks = np.array_split(np.arange(ln_ratio.size), BLOCKS)
    each = [shift(before[worst][b], after[worst][b], ln_ratio[b])[0] for b in blocks]
    weights = np.exp(ln_ratio - ln_ratio.max())
    share = float(np.sum(weights) ** 2 / np.sum(weights**2)) / ln_ratio.size
    return {
        "draws": ln_ratio.size, "effective_share": round(share, 5),
        "worst": worst, "worst_shift": means[worst], "noise": round(float(np.std(each) / np.sqrt(BLOCKS)), 5),
        "worst_quantile": max(levels.values(), key=abs), "shifts": means, "quantile_shifts": levels,
    }  # fmt: skip


def rows_of(scenario):
    """Every row of one scenario."""
    solved = Solver(RECIPES[scenario])
    sides = {"solver": solved}
    if RECIPES[scenario].superfluidity == "triplet":
        sides["nodes"] = AsFitted(load_scenario(scenario))
    error, rows = solved.left_out_error(), []
    for star in OBJECTS:
        for channel in CHANNELS:
            for row in compare(star, scenario, channel, sides):
                rows.append(row | ({"spline_error": error} if row["against"] == "solver" else {}))
                print({k: v for k, v in row.items() if "shifts" not in k}, flush=True)
    return rows


def main():
    sys.path.insert(0, str(Path(__file__).parent))
    import recording

    parser = argparse.ArgumentParser(
        description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter
    )
    parser.add_argument("--jobs", type=int, default=1)
    jobs = parser.parse_args().jobs
    with ProcessPoolExecutor(jobs, mp_context=get_context("spawn")) as pool:
        rows = [row for part in pool.map(rows_of, SCENARIOS) for row in part]
    settings = {key: value for key, value in vars(FitSettings()).items() if isinstance(value, int)}
    print(recording.write("fit_against_solver", rows, nodes=len(FINE.sigma), **settings))
    smooth = [row for row in rows if "triplet" not in row["scenario"]]
    return 0 if max(abs(row["worst_shift"]) for row in smooth) < 0.1 else 1


if __name__ == "__main__":
    raise SystemExit(main())
