"""Every test of the channels may use the tests' own scenarios by name."""

import numpy as np
import pytest


@pytest.fixture(scope="module", autouse=True)
def _scenarios(own_scenarios):
    return own_scenarios


@pytest.fixture
def rng():
    return np.random.default_rng(20261)
