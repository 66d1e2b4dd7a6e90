"""Least-squares fits of the closed form to solved cooling histories, and the error of a fit.

Levenberg-Marquardt from many random starts on a coarse grid; the best few are polished on the full grid with
weights that grow where the error is largest, so that the largest error falls (iterative reweighting towards
the minimax fit; Lawson 1961, PhD thesis, University of California).
"""

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from decayinfer.cooling import form
from decayinfer.cooling.gradients import Grid, Layout, evaluate

__all__ = ["Fit", "FitError", "Target", "fit_direct_urca", "fit_error", "fit_form", "layout_of"]

type Array = NDArray[np.float64]
type Tolerance = tuple[float | Array, float | Array]
type Problem = Callable[[Array], tuple[Array, Array]]

LN_FLOOR = float(np.log(1.5e6 / 1e8))  #: coldest temperature the form can take [ln 1e8 K]
RELAXATION_TIME = 100.0  #: crust relaxation, which rounds the form off at birth [yr]
LN_MEASURED = float(np.log(3e6 / 1e8))  #: errors count where T_b is at least this
LN_SLOPE_MEASURED = float(np.log(1e7 / 1e8))  #: errors of the slope count where T_b is at least this
URCA_WIDTH = (
    0.01  #: width of the direct-Urca threshold in the form [M_sun], wide enough for a sampler to cross
)
FAST_DEGREE = 1  #: degree in mass of the direct-Urca branch
YOUNGEST = 1e3  #: errors count from this age [yr]; the fit itself starts earlier
NARROWEST = float(np.log(0.1))  #: least width of a feature in the clock x [ln]
_STIFF = 3.0  # residual per e-fold below the least width
_POLISHED = 5  # starts that are refined on the full grid
_RIDGE = 3e-3  # holds coefficients that the data leave free near their start


@dataclass(frozen=True, eq=False)
class Target:
    """What is fitted.

    Parameters
    ----------
    grid : Grid
        Masses [M_sun] and ages [yr].
    ln_t_b : (n_mass, n_age) array [ln 1e8 K]
        NaN once colder than the solver follows.
    slope : (n_mass, n_age) array
        d ln T_b / d ln t.
    """

    grid: Grid
    ln_t_b: Array
    slope: Array

    def thinned(self, masses: int, ages: int) -> "Target":
        """Every n-th mass and age."""
        pick = np.ix_(range(0, self.grid.mass.size, masses), range(0, self.grid.age.size, ages))
        grid = Grid(self.grid.mass[::masses], self.grid.age[::ages])
        return Target(grid, self.ln_t_b[pick], self.slope[pick])


@dataclass(frozen=True, eq=False)
class Fit:
    """Coefficients of a fit: table and scalars of `form.ln_temperature`."""

    table: Array
    scalars: Array


@dataclass(frozen=True)
class FitError:
    """Largest errors: of T_b as a fraction, and of d ln T_b / d ln t."""

    temperature: float
    slope: float


def fit_error(fit: Fit, target: Target, *, slope_from: float = YOUNGEST) -> FitError:
    """Largest errors of a fit against a target.

    Parameters
    ----------
    fit : Fit
        Coefficients.
    target : Target
        Solved histories, best at masses and ages left out of the fit.
    slope_from : float [yr]
        Youngest age at which the slope counts.
    """
    temperature, slope = _errors(fit, target, slope_from)
    return FitError(float(temperature.max()), float(slope.max()))


def _errors(fit: Fit, target: Target, slope_from: float = YOUNGEST) -> tuple[Array, Array]:
    """Errors of temperature and slope on the grid, zero where they do not count."""
    value, slope, *_ = evaluate(target.grid, fit.table, fit.scalars, Layout(()))
    age, warm = target.grid.age, np.nan_to_num(target.ln_t_b, nan=-99.0)
    counted = (warm >= LN_MEASURED) & (age >= YOUNGEST)
    steady = (warm >= LN_SLOPE_MEASURED) & (age >= slope_from)
    return (
        np.abs(np.expm1(np.where(counted, value - warm, 0.0))),
        np.where(steady, np.abs(slope - np.nan_to_num(target.slope)), 0.0),
    )


def layout_of(scalars: Array, *, branch: int = 0) -> tuple[tuple[int, str], ...]:
    """Rows of one branch that the term counts in the scalars switch on."""
    named = dict(zip(form.SCALARS, scalars, strict=True))
    rows = ["a0", "s0"]
    rows += [f"{p}{k}" for k in range(1, int(named["softplus_terms"]) + 1) for p in "slw"]
    rows += [f"{p}{j}" for j in range(1, int(named["sigmoid_terms"]) + 1) for p in "bcv"]
    rows += ["beta", "q"] if named["exponential_term"] else []
    return tuple((branch, name) for name in rows)


def fit_form(
    target: Target,
    *,
    softplus_terms: int = 2,
    sigmoid_terms: int = 1,
    exponential_term: bool = True,
    tolerance: Tolerance = (0.01, 0.05),
    starts: int = 20,
    seed: int = 1,
) -> Fit:
    """Fit the slow branch of the closed form.

    Parameters
    ----------
    target : Target
        Solved histories.
    softplus_terms, sigmoid_terms, exponential_term : int, int, bool
        Terms of the form.
    tolerance : (float or (n_mass,) array, float or (n_mass,) array)
        Errors of temperature and slope that weigh alike.
    starts : int
        Random starts.
    seed : int
        Seed of the starts.
    """
    counts = [softplus_terms, sigmoid_terms, exponential_term, 0]
    scalars = np.array([*counts, 1.0, 0.0, 0.0, 1.0, LN_FLOOR, RELAXATION_TIME], dtype=float)
    layout = Layout(layout_of(scalars))
    rng = np.random.default_rng(seed)
    table = np.zeros((2, len(form.PARAMETERS), form.DEGREE + 1))
    random = [_random_start(rng, target, layout, table, scalars) for _ in range(starts)]
    return _best(random, target, table, scalars, layout, layout, tolerance)


def fit_direct_urca(
    target: Target,
    slow: Fit,
    threshold: float,
    *,
    tolerance: Tolerance = (0.03, 0.05),
    starts: int = 20,
    seed: int = 1,
) -> Fit:
    """Fit histories with direct Urca: first the fast branch beside a given slow one, then both.

    Parameters
    ----------
    target : Target
        Solved histories with direct Urca.
    slow : Fit
        Fit of the same stars without it.
    threshold : float [M_sun]
        Mass at which direct Urca opens in the centre.
    tolerance, starts, seed
        As in `fit_form`.
    """
    scalars = slow.scalars.copy()
    urca = {
        "direct_urca": 1.0,
        "sharpness": 5.0,
        "urca_slope": 0.9,
        "urca_mass": threshold,
        "urca_width": URCA_WIDTH,
    }
    for name, number in urca.items():
        scalars[form.SCALARS.index(name)] = number
    rows = layout_of(scalars, branch=1)
    moving = ("sharpness", "urca_slope", "urca_mass")
    degrees = (form.DEGREE, FAST_DEGREE)
    fast, both = Layout(rows, moving, degrees), Layout(layout_of(scalars) + rows, moving, degrees)
    heavy = target.grid.mass > threshold + 0.1
    heated = Target(Grid(target.grid.mass[heavy], target.grid.age), target.ln_t_b[heavy], target.slope[heavy])
    rng = np.random.default_rng(seed)
    random = [_random_start(rng, heated, fast, slow.table, scalars) for _ in range(starts)]
    return _best(random, target, slow.table, scalars, fast, both, tolerance)


def _best(
    random: list[Array],
    target: Target,
    table: Array,
    scalars: Array,
    first: Layout,
    then: Layout,
    tolerance: Tolerance,
) -> Fit:
    """Minimise from every start on a coarse grid, then polish the best few on the full one."""
    n_mass = target.grid.mass.size
    thin = [np.broadcast_to(np.asarray(t), n_mass)[::2] for t in tolerance]
    coarse = _problem(target.thinned(2, 2), table, scalars, first, (thin[0], thin[1]))
    tried = sorted((_minimise(coarse, start, 60) for start in random), key=lambda pair: pair[0])
    promising = [then.pack(*first.unpack(vector, table, scalars)) for _, vector in tried[:_POLISHED]]
    return _polish(promising, target, table, scalars, then, tolerance)


def _random_start(
    rng: np.random.Generator, target: Target, layout: Layout, table: Array, scalars: Array
) -> Array:
    """Parameters constant in mass, drawn over the range of the clock."""
    draw = {
        "a0": np.nanmean(target.ln_t_b[:, target.grid.age < 1e6]) + rng.normal(0, 0.3),
        "s0": rng.normal(np.log(0.14), 0.3),
        "beta": rng.normal(0, 0.4),
        "q": rng.uniform(1, 5),
    }
    for name, low, high in (("l", -5, 4), ("c", -6, 2)):
        draw |= {f"{name}{k}": v for k, v in zip((1, 2), np.sort(rng.uniform(low, high, 2)), strict=True)}
    for name, centre in (("s", 0.3), ("w", 1.0), ("b", 0.4), ("v", 0.4)):
        draw |= {f"{name}{k}": rng.normal(np.log(centre), 0.7) for k in (1, 2)}
    start = table.copy()
    for branch, name in layout.rows:
        start[branch, form.PARAMETERS.index(name), 0] = draw[name]
    return layout.pack(start, scalars)


def _column(tolerance: float | Array) -> Array:
    return np.atleast_1d(np.asarray(tolerance, dtype=float))[:, None]


def _weights(target: Target, tolerance: Tolerance) -> tuple[Array, Array]:
    """Weights of value and slope: full where errors are measured and a little beyond, low elsewhere."""
    warm = np.nan_to_num(target.ln_t_b, nan=-99.0)
    young = np.where(target.grid.age < 1e3, 0.3, 1.0)
    value = np.where(warm > LN_MEASURED - 0.3, young, 0.1) / _column(tolerance[0])
    slope = np.where(warm > LN_SLOPE_MEASURED - 0.2, young, 0.0) / _column(tolerance[1])
    return value, slope


def _problem(target: Target, table: Array, scalars: Array, layout: Layout, tolerance: Tolerance) -> Problem:
    """Weighted residuals and their Jacobian as a function of the coefficient vector."""
    w_value, w_slope = _weights(target, tolerance)
    above = form.FLOOR_SHARPNESS * (np.nan_to_num(target.ln_t_b, nan=-99.0) - LN_FLOOR)
    wanted = LN_FLOOR + np.logaddexp(0, above) / form.FLOOR_SHARPNESS
    wanted_slope = np.nan_to_num(target.slope, nan=0.0)
    steady = w_slope > 0

    def residuals(vector: Array) -> tuple[Array, Array]:
        value, slope, d, d_slope = evaluate(target.grid, *layout.unpack(vector, table, scalars), layout)
        r = [((value - wanted) * w_value).ravel(), ((slope - wanted_slope) * w_slope)[steady]]
        jac = [(d * w_value[..., None]).reshape(-1, vector.size), d_slope[steady] * w_slope[steady][:, None]]
        narrow, by_width = _too_narrow(vector, target.grid, layout)
        return np.concatenate([*r, narrow]), np.concatenate([*jac, by_width])

    return residuals


def _too_narrow(vector: Array, grid: Grid, layout: Layout) -> tuple[Array, Array]:
    """Penalty on features narrower than `NARROWEST`, which could hide between the ages of the fit."""
    residual, jac, at = [], [], 0
    for branch, name in layout.rows:
        basis = grid.basis[:, : layout.degrees[branch] + 1]
        if name[0] in "wv":
            lack = NARROWEST - basis @ vector[at : at + basis.shape[1]]
            rows = np.zeros((lack.size, vector.size))
            rows[:, at : at + basis.shape[1]] = -_STIFF * basis * (lack > 0)[:, None]
            residual.append(_STIFF * np.maximum(lack, 0))
            jac.append(rows)
        at += basis.shape[1]
    return np.concatenate(residual), np.concatenate(jac)


def _minimise(
    problem: Problem, start: Array, iterations: int, weight: Array | None = None
) -> tuple[float, Array]:
    """Levenberg-Marquardt with a weak pull towards the start (Marquardt 1963, J. SIAM 11, 431)."""
    x, damping = start, 1e-2
    scale = 1.0 if weight is None else weight
    r, jac = problem(x)
    cost = float(np.sum((r * scale) ** 2))
    for _ in range(iterations):
        weighted = jac * np.reshape(scale, (-1, 1)) if weight is not None else jac
        normal = weighted.T @ weighted
        gradient = weighted.T @ (r * scale) + _RIDGE**2 * (x - start)
        for _ in range(8):
            matrix = normal + np.diag(damping * np.diag(normal) + _RIDGE**2 + 1e-9)
            step = np.clip(np.linalg.solve(matrix, -gradient), -1.0, 1.0)
            r_new, jac_new = problem(x + step)
            new = float(np.sum((r_new * scale) ** 2))
            if np.isfinite(new) and new < cost:
                break
            damping *= 5
        else:
            break
        gain, x, r, jac, cost = cost - new, x + step, r_new, jac_new, new
        damping = max(damping / 4, 1e-9)
        if gain < 1e-5 * cost:
            break
    return cost, x


def _polish(
    starts: list[Array],
    target: Target,
    table: Array,
    scalars: Array,
    layout: Layout,
    tolerance: Tolerance,
    *,
    rounds: int = 12,
) -> Fit:
    """Refine on the full grid, pushing weight to the largest errors, and keep the best fit seen."""
    problem = _problem(target, table, scalars, layout, tolerance)
    best, best_score = None, np.inf
    for start in starts:
        _, x = _minimise(problem, start, 100)
        weight = np.ones(problem(x)[0].size)
        for _ in range(rounds):
            fit = Fit(*layout.unpack(x, table, scalars))
            temperature, slope = _errors(fit, target)
            score = max((temperature / _column(tolerance[0])).max(), (slope / _column(tolerance[1])).max())
            if score < best_score:
                best, best_score = fit, score
            residual = np.abs(problem(x)[0])
            weight *= np.sqrt(0.1 + residual / residual.max())
            weight /= np.sqrt(np.mean(weight**2))
            _, x = _minimise(problem, x, 15, weight)
    assert best is not None
    return best
