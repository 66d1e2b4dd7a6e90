"""The scripts that make the pages of docs/cooling."""

import importlib
import sys
from pathlib import Path

import pytest

DOCS = Path(__file__).parents[2] / "docs" / "cooling"


@pytest.fixture(scope="session")
def docs():
    """Folder of the pages."""
    return DOCS


@pytest.fixture(scope="session")
def script():
    """Import a script of docs/cooling by name."""
    sys.path.insert(0, str(DOCS))
    yield importlib.import_module
    sys.path.remove(str(DOCS))
