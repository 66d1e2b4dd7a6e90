"""Every test of the channels may use the tests' own scenarios by name."""

import numpy as np
import pytest


@pytest.fixture(scope="module", autouse=True)
def _scenarios(own_scenarios):
    return own_scenarios


@pytest.fixture
def rng():
    return np.random.default_rng(20261)


_ODD = {
    "typical": {},
    "index of three": {"braking_index": 3.0},
    "barely above three": {"braking_index": 3.0 + 1e-9},
    "huge error": {"braking_index_err_minus": 1e6, "braking_index_err_plus": 1e6},
    "tiny error": {"braking_index_err_minus": 1e-6, "braking_index_err_plus": 1e-6},
    "one-sided": {"braking_index_err_minus": 0.01, "braking_index_err_plus": 30.0},
    "limit": {"braking_index": np.nan, "braking_index_limit": 15.0},
    "limit of three": {"braking_index": np.nan, "braking_index_limit": 3.0},
    "limit without error": {
        "braking_index": np.nan, "braking_index_limit": 50.0,
        "braking_index_err_minus": np.nan, "braking_index_err_plus": np.nan,
    },
    "huge index": {"braking_index": 1e5, "braking_index_err_minus": 1e4, "braking_index_err_plus": 1e4},
    "newborn": {"period": 0.03, "period_derivative": 4e-13},
    "older than the scenarios": {"period": 2.0, "period_derivative": 1e-16},
    "millisecond": {"period": 0.005, "period_derivative": 1e-20},
    "magnetar": {"period": 8.0, "period_derivative": 1e-10},
}  # fmt: skip


@pytest.fixture(params=_ODD)
def odd(request):
    """Changes that make an object odd, one kind after the other."""
    return _ODD[request.param]
