from functools import partial

import numpy as np
import pytest

from decayinfer.catalog.index import index_and_error
from decayinfer.catalog.spin import Spin

close = partial(pytest.approx, abs=0)  # the default allows 1e-12, more than most values here

NU, NUDOT = 10.0, -1e-12
SECOND = {"frequency_second_derivative": 1.2e-24, "frequency_second_derivative_err": 1e-25}  # n = 12 +- 1
NO_INDEX = {"braking_index": None, "braking_index_err": None}


def refused(catalog, column):
    assert len(catalog) == 0
    (problem,) = catalog.problems
    assert (problem.severity, problem.column) == ("error", column)
    return problem


@pytest.mark.parametrize("value", [0.0, -0.5, np.inf, "x", "", np.nan, np.ma.masked])
def test_an_index_needs_a_positive_error(one, value):
    problem = refused(one(braking_index_err=value), "braking_index_err")
    assert "positive" in problem.rule or "must be given" in problem.rule


@pytest.mark.parametrize("value", [np.inf, -np.inf, "x", 10**400])
def test_an_index_must_be_a_number(one, value):
    assert refused(one(braking_index=value), "braking_index").rule == "must be a finite number"


def test_nothing_to_fit(one):
    problem = refused(one(braking_index=np.nan), "braking_index")
    assert problem.got == "nothing to fit"
    assert refused(one(**NO_INDEX, braking_index_limit=""), "braking_index_limit").got == "nothing to fit"


def test_asymmetric_errors(one):
    pulsar = one(braking_index_err_minus=1.0, braking_index_err_plus=3.0).pulsars[0]
    assert (pulsar.braking_index_err_minus, pulsar.braking_index_err_plus) == (1.0, 3.0)
    assert pulsar.braking_index_err == 2.0


def test_one_side_falls_back_on_the_symmetric_error(one):
    pulsar = one(braking_index_err_minus=1.0, braking_index_err_plus="").pulsars[0]
    assert (pulsar.braking_index_err_minus, pulsar.braking_index_err_plus) == (1.0, 0.5)
    sides = {"braking_index_err_minus": 1.0, "braking_index_err_plus": ""}
    refused(one(braking_index_err=None, **sides), "braking_index_err_plus")


@pytest.mark.parametrize("value", [0.0, -3.0, "x"])
def test_each_side_must_be_positive(one, value):
    sides = {"braking_index_err_minus": value, "braking_index_err_plus": 1.0}
    refused(one(braking_index_err=None, **sides), "braking_index_err_minus")


def test_a_symmetric_error_that_is_not_used_may_be_wrong(one):
    sides = {"braking_index_err_minus": 1.0, "braking_index_err_plus": 1.0}
    assert len(one(braking_index_err=0.0, **sides)) == 1


def test_an_upper_limit(one):
    pulsar = one(**NO_INDEX, braking_index_limit=9.0).pulsars[0]
    assert pulsar.braking_index_limit == 9.0
    assert np.isnan(pulsar.braking_index)
    assert np.isnan(pulsar.decay_time)
    refused(one(**NO_INDEX, braking_index_limit=np.inf), "braking_index_limit")


@pytest.mark.parametrize("limit", [9.0, np.inf, "x"])
def test_a_measured_index_comes_before_a_limit(one, limit):
    catalog = one(braking_index_limit=limit)
    (pulsar,) = catalog.pulsars
    assert np.isnan(pulsar.braking_index_limit)
    assert pulsar.flags == ("value-ignored",)
    assert catalog.problems[0].column == "braking_index_limit"


def test_index_from_the_second_derivative(one):
    """n = nu nuddot/nudot^2, the definition (Manchester & Taylor 1977, Pulsars; from memory)."""
    pulsar = one(**NO_INDEX, **SECOND).pulsars[0]
    assert pulsar.braking_index == close(12.0, rel=1e-12)
    assert pulsar.braking_index_err_minus == pulsar.braking_index_err_plus == close(1.0, rel=1e-12)
    frequencies = {"period": None, "period_derivative": None, "frequency": NU, "frequency_derivative": NUDOT}
    assert one(**NO_INDEX, **SECOND, **frequencies).pulsars[0].braking_index == close(12.0, rel=1e-12)


@pytest.mark.parametrize("second", [1.2e-24, -1.2e-24, 1e-27])
def test_error_of_the_index_against_monte_carlo(second):
    rng = np.random.default_rng(21)
    errors = np.array([0.02, 1.5e-14, 5e-26])
    centre = np.array([NU, NUDOT, second])
    nu, nudot, nuddot = (centre + errors * rng.standard_normal((400_000, 3))).T
    frequency = Spin(*(np.array([x]) for x in (NU, NUDOT, errors[0], errors[1])))
    n, err = index_and_error(frequency, np.array([second]), errors[2:])
    assert n[0] == close(NU * second / NUDOT**2, rel=1e-14)
    assert err[0] == close(np.std(nu * nuddot / nudot**2), rel=0.01)


def test_the_second_derivative_dominates_the_error(one):
    """Catalogue digits leave nu and nudot a share below 1e-3."""
    errors = {"frequency_err": 1e-10, "frequency_derivative_err": 1e-17}
    frequencies = {"period": None, "period_derivative": None, "frequency": NU, "frequency_derivative": NUDOT}
    pulsar = one(**NO_INDEX, **SECOND, **frequencies, **errors).pulsars[0]
    assert pulsar.braking_index_err_plus == close(1.0, rel=1e-6)


@pytest.mark.parametrize("value", [0.0, -1e-25, np.inf, "x", "", np.nan])
def test_a_second_derivative_needs_a_positive_error(one, value):
    cells = NO_INDEX | SECOND | {"frequency_second_derivative_err": value}
    refused(one(**cells), "frequency_second_derivative_err")


@pytest.mark.parametrize(("value", "flags"), [("x", ("value-ignored",)), (0.0, ("value-ignored",)), ("", ())])
def test_with_an_index_given_a_broken_second_derivative_does_no_harm(one, value, flags):
    catalog = one(**SECOND | {"frequency_second_derivative_err": value})
    assert catalog.pulsars[0].braking_index == 12.0
    assert catalog.pulsars[0].flags == flags
    catalog = one(**SECOND | {"frequency_second_derivative": "x"})
    assert catalog.pulsars[0].flags == ("value-ignored",)


@pytest.mark.parametrize(("second", "err"), [(1e300, 1e299), (1.2e-24, 1e300)])
def test_a_second_derivative_beyond_floating_point(one, second, err):
    cells = {"frequency_second_derivative": second, "frequency_second_derivative_err": err}
    assert "finite braking index" in refused(one(**NO_INDEX, **cells), "frequency_second_derivative").rule


@pytest.mark.parametrize(
    ("n", "errors", "flags"),
    [
        (12.0, {"braking_index_err": 0.5}, ()),
        (14.9, {"braking_index_err": 0.1}, ()),
        (15.1, {"braking_index_err": 0.1}, ("index-mismatch",)),
        (8.0, {"braking_index_err_minus": 0.1, "braking_index_err_plus": 2.0}, ()),
        (8.0, {"braking_index_err_minus": 2.0, "braking_index_err_plus": 0.1}, ("index-mismatch",)),
    ],
)
def test_index_and_second_derivative_are_compared(one, n, errors, flags):
    catalog = one(**SECOND, braking_index=n, **errors)
    assert catalog.pulsars[0].flags == flags
    assert catalog.pulsars[0].braking_index == n
    assert [p.severity for p in catalog.problems] == ["warning"] * len(flags)


@pytest.mark.parametrize(
    ("n", "err", "flags"),
    [
        (3.0, 9.9, ()),
        (3.0, 10.1, ("large-index-error",)),
        (-2887.0, 127.0, ()),
        (50.0, 51.0, ("large-index-error",)),
    ],
)
def test_an_error_that_says_nothing(one, n, err, flags):
    assert one(braking_index=n, braking_index_err=err).pulsars[0].flags == flags
