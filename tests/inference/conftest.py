"""Modules beside the tests of the inference, and what takes long to make."""

import importlib.util
import sys
from pathlib import Path

import numpy as np
import pytest

HERE = Path(__file__).parent


def load(path, name):
    spec = importlib.util.spec_from_file_location(name, path)
    module = importlib.util.module_from_spec(spec)
    sys.modules[name] = module
    spec.loader.exec_module(module)
    return module


@pytest.fixture(scope="session")
def tools():
    return load(HERE / "tools.py", "inference_tools")


@pytest.fixture(scope="module", autouse=True)
def scenarios(tools):
    """The tests' own scenarios, by name as long as a module of tests runs."""
    forget = tools.register_scenarios()
    yield
    forget()


@pytest.fixture(scope="session")
def reference():
    """The symbolic field history, tests/inference/reference.py, as a module."""
    return load(HERE / "reference.py", "reference_history")


@pytest.fixture
def rng():
    return np.random.default_rng(20261)


@pytest.fixture(scope="session")
def study():
    """The module of a study in tests/studies, by name."""
    return lambda name: load(HERE.parent / "studies" / f"{name}.py", name)
