"""Fixtures shared by the tests of several folders."""

import importlib.util
import sys
from pathlib import Path

import pytest


@pytest.fixture(scope="session")
def forward():
    """The independent forward simulator, tests/inference/forward.py, as a module."""
    path = Path(__file__).parent / "inference" / "forward.py"
    spec = importlib.util.spec_from_file_location("forward_simulator", path)
    module = importlib.util.module_from_spec(spec)
    sys.modules[spec.name] = module  # dataclasses look their module up
    spec.loader.exec_module(module)
    return module
