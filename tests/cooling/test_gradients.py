import numpy as np
import pytest

from decayinfer.cooling import form
from decayinfer.cooling.gradients import Grid, Layout, evaluate

ALL_ROWS = tuple((b, name) for b in (0, 1) for name in form.PARAMETERS)
URCA = ("sharpness", "urca_slope", "urca_mass", "urca_width")
GRID = Grid(np.linspace(1.0, 2.0, 5), np.logspace(2.5, 7, 9))


def coefficients(direct_urca):
    rng = np.random.default_rng(3)
    table = 0.2 * rng.standard_normal((2, len(form.PARAMETERS), form.DEGREE + 1))
    scalars = np.array([2, 2, 1, direct_urca, 4.0, 0.9, 1.6, 0.02, np.log(0.015), 100.0])
    return table, scalars


@pytest.mark.parametrize("direct_urca", [0.0, 1.0])
def test_value_is_the_form(direct_urca):
    table, scalars = coefficients(direct_urca)
    value, *_ = evaluate(GRID, table, scalars, Layout(ALL_ROWS))
    expected = form.ln_temperature(np.log(GRID.age), GRID.mass[:, None], table, scalars)
    assert value == pytest.approx(expected, rel=1e-12, abs=1e-12)


@pytest.mark.parametrize("direct_urca", [0.0, 1.0])
def test_slope_is_the_derivative_of_the_form(direct_urca):
    table, scalars = coefficients(direct_urca)
    value, slope, *_ = evaluate(GRID, table, scalars, Layout(ALL_ROWS))
    step = 1e-5
    up, down = (
        form.ln_temperature(np.log(GRID.age) + h, GRID.mass[:, None], table, scalars) for h in (step, -step)
    )
    assert slope == pytest.approx((up - down) / (2 * step), rel=1e-6, abs=1e-8)
    assert np.all(slope <= 0)
    assert np.all(slope[value > scalars[8] + 1e-9] < 0)


@pytest.mark.parametrize("direct_urca", [0.0, 1.0])
def test_derivatives_by_every_coefficient_match_finite_differences(direct_urca):
    table, scalars = coefficients(direct_urca)
    rows = ALL_ROWS if direct_urca else ALL_ROWS[: len(form.PARAMETERS)]
    layout = Layout(rows, URCA if direct_urca else ())
    vector = layout.pack(table, scalars)
    _, _, d_value, d_slope = evaluate(GRID, table, scalars, layout)
    for i in range(vector.size):
        moved = []
        for h in (1e-5, -1e-5):
            shifted = vector + h * (np.arange(vector.size) == i)
            moved.append(evaluate(GRID, *layout.unpack(shifted, table, scalars), layout)[:2])
        assert d_value[..., i] == pytest.approx((moved[0][0] - moved[1][0]) / 2e-5, rel=2e-6, abs=2e-7)
        assert d_slope[..., i] == pytest.approx((moved[0][1] - moved[1][1]) / 2e-5, rel=2e-6, abs=2e-7)


def test_pack_and_unpack_return_what_they_were_given():
    table, scalars = coefficients(1.0)
    layout = Layout(ALL_ROWS, URCA)
    back, same = layout.unpack(layout.pack(table, scalars), np.zeros_like(table), scalars)
    assert np.array_equal(back, table)
    assert same == pytest.approx(scalars)
