"""Fixtures shared by the tests of several folders."""

import importlib.util
import sys
from pathlib import Path

import pytest

HERE = Path(__file__).parent


def load(path):
    """A module that is no test, by its path below tests/."""
    name = f"tests_{Path(path).stem}"
    spec = importlib.util.spec_from_file_location(name, HERE / path)
    module = importlib.util.module_from_spec(spec)
    sys.modules[spec.name] = module  # dataclasses look their module up
    spec.loader.exec_module(module)
    return module


@pytest.fixture(scope="session")
def forward():
    """The independent forward simulator, tests/inference/forward.py."""
    return load("inference/forward.py")


@pytest.fixture(scope="session")
def tools():
    """Objects, problems and scenarios of the tests' own, tests/inference/tools.py."""
    return load("inference/tools.py")


@pytest.fixture(scope="session")
def reference():
    """The symbolic field history, tests/inference/reference.py."""
    return load("inference/reference.py")


@pytest.fixture(scope="session")
def study():
    """A study in tests/studies, by name."""
    return lambda name: load(f"studies/{name}.py")


@pytest.fixture(scope="module")
def own_scenarios(tools):
    """The tests' own scenarios, known by name as long as a module of tests runs."""
    forget = tools.register_scenarios()
    yield
    forget()
