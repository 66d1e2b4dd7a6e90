from decimal import Decimal
from functools import partial

import numpy as np
import pytest

from decayinfer.catalog import FLAGS, read_table
from decayinfer.catalog.spin import Spin, swap

close = partial(pytest.approx, abs=0)  # the default allows 1e-12, more than most values here

MISSING = [np.nan, "", "nan", "--", "n/a", np.ma.masked]


def only(catalog, severity="error"):
    (problem,) = catalog.problems
    assert problem.severity == severity
    assert len(catalog) == (severity == "warning")
    assert problem.row == 1
    return problem


@pytest.mark.parametrize("column", ["period", "period_derivative"])
@pytest.mark.parametrize(
    ("value", "rule"),
    [(v, "must be given") for v in MISSING]
    + [(v, "must be positive") for v in (0.0, -0.1, -1e300, "-1")]
    + [
        (v, "must be a finite number")
        for v in (np.inf, -np.inf, "abc", "1;2", "inf", True, 1j, 10**400, np.datetime64(5, "ns"))
    ],
)
def test_values_that_cannot_be_used(one, column, value, rule):
    problem = only(one(**{column: value}))
    assert problem.column == column
    assert problem.rule == rule


@pytest.mark.parametrize("cell", [True, np.timedelta64(1, "ns"), Decimal("nan")])
def test_cells_of_any_type(sample, cell):
    sample["period"] = np.array([cell, Decimal("0.25"), "0.5"], dtype=object)
    catalog = read_table(sample)
    assert [p.period for p in catalog.pulsars] == [0.25, 0.5]
    assert [p.row for p in catalog.problems] == [1]


@pytest.mark.parametrize(
    ("column", "value", "rule"),
    [
        ("frequency", 0.0, "must be positive"),
        ("frequency", -10.0, "must be positive"),
        ("frequency_derivative", 1e-12, "must be negative"),
        ("frequency_derivative", 0.0, "must be negative"),
        ("frequency_derivative", np.nan, "must be given"),
        ("frequency", "x", "must be a finite number"),
    ],
)
def test_frequencies_that_cannot_be_used(one, column, value, rule):
    cells = {"period": None, "period_derivative": None, "frequency": 10.0, "frequency_derivative": -1e-12}
    problem = only(one(**cells | {column: value}))
    assert problem.column == column
    assert problem.rule.startswith(rule)


def test_frequency_pair_gives_the_period(one):
    cells = {"frequency_err": 1e-8, "frequency_derivative_err": 1e-16}
    catalog = one(period=None, period_derivative=None, frequency=8.0, frequency_derivative=-2e-12, **cells)
    (pulsar,) = catalog.pulsars
    assert pulsar.period == 0.125
    assert pulsar.period_derivative == close(2e-12 / 64)
    assert pulsar.period_err == close(1e-8 / 64)


def test_errors_of_the_period_against_monte_carlo():
    """First-order propagation against draws; from the definitions P = 1/nu, Pdot = -nudot/nu^2."""
    rng = np.random.default_rng(20)
    nu, nudot, nu_err, nudot_err = 8.0, -2e-12, 0.04, 3e-14
    draws = nu + nu_err * rng.standard_normal(400_000), nudot + nudot_err * rng.standard_normal(400_000)
    period = swap(Spin(*(np.array([x]) for x in (nu, nudot, nu_err, nudot_err))))
    assert period.value_err[0] == close(np.std(1 / draws[0]), rel=0.01)
    assert period.derivative_err[0] == close(np.std(-draws[1] / draws[0] ** 2), rel=0.01)


def test_swapping_twice_gives_the_values_back():
    spin = Spin(*(np.array([x]) for x in (8.0, -2e-12, np.nan, np.nan)))
    np.testing.assert_allclose(swap(swap(spin))[:2], spin[:2], rtol=1e-15)


def test_both_pairs_that_agree(one):
    catalog = one(frequency=10.0, frequency_derivative=-1e-12)
    assert catalog.problems == ()
    assert catalog.pulsars[0].period == 0.1


@pytest.mark.parametrize(
    ("frequency", "derivative", "columns"),
    [
        (10.02, -1e-12 * 1.002**2, ["period"]),
        (10.0, -1.002e-12, ["period_derivative"]),
        (10.005, -1e-12 * 1.0005**2, []),
    ],
)
def test_both_pairs_to_one_part_in_a_thousand(one, frequency, derivative, columns):
    catalog = one(frequency=frequency, frequency_derivative=derivative)
    assert [p.column for p in catalog.problems] == columns
    assert len(catalog) == (not columns)
    assert all("must agree with column frequency" in p.rule for p in catalog.problems)


def test_either_pair_will_do_row_by_row(one):
    cells = {"period": "", "period_derivative": "", "frequency": 10.0, "frequency_derivative": -1e-12}
    assert one(**cells).pulsars[0].period_derivative == close(1e-14)
    assert one(**cells | {"period": 0.1}).pulsars[0].period == close(0.1)
    assert [p.column for p in one(**cells | {"frequency": ""}).problems] == ["period", "period_derivative"]


@pytest.mark.parametrize("value", [0.0, -1.0, np.inf, "x"])
def test_a_useless_error_of_the_spin_is_dropped(one, value):
    catalog = one(period_err=value)
    assert only(catalog, "warning").column == "period_err"
    assert np.isnan(catalog.pulsars[0].period_err)
    assert catalog.pulsars[0].flags == ("value-ignored",)


@pytest.mark.parametrize(("period", "derivative"), [(1e300, 1e-300), (1e-200, 1e-200), (1e-320, 1e-14)])
def test_values_beyond_floating_point_are_set_aside(one, period, derivative):
    assert "finite age" in only(one(period=period, period_derivative=derivative)).rule
    frequency = {"frequency": period, "frequency_derivative": -derivative}
    assert len(one(period=None, period_derivative=None, **frequency)) == 0


@pytest.mark.parametrize(
    ("period", "derivative", "flags"),
    [
        (0.1, 1.0001e-14, ()),
        (0.1, 1e-16, ("old",)),
        (0.0005, 1e-14, ("period-range",)),
        (200.0, 1e-10, ("period-range",)),
        (200.0, 1e-16, ("period-range", "old")),
    ],
)
def test_remarks_about_the_spin(one, period, derivative, flags):
    catalog = one(period=period, period_derivative=derivative)
    assert catalog.pulsars[0].flags == flags
    assert {p.severity for p in catalog.problems} <= {"warning"}
    assert len(catalog.problems) == len(flags)
    assert set(flags) <= set(FLAGS)


def test_old_begins_at_ten_million_years(one):
    ten_myr = 0.1 / (2 * 1e7 * 3.15576e7)
    assert one(period_derivative=ten_myr * 1.001).pulsars[0].flags == ()
    assert one(period_derivative=ten_myr * 0.999).pulsars[0].flags == ("old",)
