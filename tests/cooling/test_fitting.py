import numpy as np
import pytest

from decayinfer.cooling import form
from decayinfer.cooling.fitting import (
    LN_FLOOR,
    RELAXATION_TIME,
    Fit,
    Target,
    fit_direct_urca,
    fit_error,
    fit_form,
    layout_of,
)
from decayinfer.cooling.gradients import Grid, Layout, evaluate

GRID = Grid(np.linspace(1.0, 2.0, 9), np.geomspace(300, 1e7, 61))


def history(age, mass, threshold=None):
    """An invented history: ln T_b8 falls as -x/6, bends over to -1.5 x, and drops above a threshold mass."""
    x = np.log((age + RELAXATION_TIME) / 1e5)
    y = 0.4 - 0.3 * (mass - 1.5) - x / 6 - 1.3 * np.logaddexp(0, x - 1 + 0.2 * mass)
    if threshold is not None:
        opened = np.maximum(mass - threshold, 1e-9)
        fast = y - 1.0 - 0.4 * np.log(opened)
        y = -np.logaddexp(-6 * y, -6 * fast) / 6
    return y


def target(grid=GRID, threshold=None):
    law = lambda ln_t: history(np.exp(ln_t), grid.mass[:, None], threshold)  # noqa: E731
    ln_t = np.log(grid.age)
    return Target(grid, law(ln_t), (law(ln_t + 1e-5) - law(ln_t - 1e-5)) / 2e-5)


LEFT_OUT = Grid(np.linspace(1.05, 1.95, 8), np.geomspace(1100, 9e6, 50))


@pytest.fixture(scope="module")
def fit():
    return fit_form(target(), softplus_terms=1, sigmoid_terms=0, exponential_term=False, starts=4)


def test_a_history_of_the_form_is_found_again(fit):
    error = fit_error(fit, target(LEFT_OUT))
    assert error.temperature < 2e-3
    assert error.slope < 5e-3


def test_errors_are_what_they_say(fit):
    off = target(LEFT_OUT)
    moved = Target(off.grid, off.ln_t_b + np.log(1.1), off.slope - 0.2)
    error = fit_error(fit, moved)
    assert error.temperature == pytest.approx(1 - 1 / 1.1, abs=3e-3)
    assert error.slope == pytest.approx(0.2, abs=6e-3)


def test_errors_do_not_count_where_the_star_is_cold_or_young(fit):
    cold = target(LEFT_OUT)
    nowhere = Target(cold.grid, np.where(cold.ln_t_b > np.log(0.03), np.nan, cold.ln_t_b - 5), cold.slope)
    assert fit_error(fit, nowhere).temperature == 0
    young = Grid(LEFT_OUT.mass, np.array([400.0, 900.0]))
    assert fit_error(fit, Target(young, target(young).ln_t_b + 1, target(young).slope)).temperature == 0


def test_same_seed_same_fit():
    one, two = (
        fit_form(target(), softplus_terms=1, sigmoid_terms=0, exponential_term=False, starts=2, seed=5)
        for _ in range(2)
    )
    assert np.array_equal(one.table, two.table)


def test_fits_fall_with_age_everywhere(fit):
    dense = Grid(np.linspace(1, 2, 41), np.geomspace(1, 1e7, 800))
    value, slope, *_ = evaluate(dense, fit.table, fit.scalars, Layout(()))
    assert np.all(slope < 0)
    assert value.min() > LN_FLOOR - 1e-9


def test_direct_urca_branch_opens_at_its_threshold(fit):
    grid = Grid(np.union1d(np.linspace(1, 2, 11), np.linspace(1.5, 1.8, 13)), GRID.age)
    urca = fit_direct_urca(target(grid, 1.6), fit, 1.6, tolerance=(0.02, 0.1), starts=3)
    assert isinstance(urca, Fit)
    between = Grid(np.array([1.03, 1.33, 1.72, 1.95]), LEFT_OUT.age)
    assert fit_error(urca, target(between, 1.6)).temperature < 0.05
    drop = [
        form.ln_temperature(np.log(1e4), m, fit.table, fit.scalars)
        - form.ln_temperature(np.log(1e4), m, urca.table, urca.scalars)
        for m in (1.4, 1.9)
    ]
    assert abs(drop[0]) < 0.02
    assert drop[1] > 0.5


def test_layout_follows_the_term_counts():
    scalars = np.array([1, 2, 1, 0, 1, 0, 0, 1, LN_FLOOR, RELAXATION_TIME], dtype=float)
    names = [name for _, name in layout_of(scalars)]
    assert names == ["a0", "s0", "s1", "l1", "w1", "b1", "c1", "v1", "b2", "c2", "v2", "beta", "q"]
