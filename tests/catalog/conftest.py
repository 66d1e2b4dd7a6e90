from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest
from astropy.table import Table

from decayinfer.catalog import Catalog, read_table

DATA = Path(__file__).parents[1] / "data"


@pytest.fixture
def data() -> Path:
    return DATA


@pytest.fixture
def sample() -> Table:
    """Three invented objects without fault."""
    return Table(
        {
            "name": ["X1", "X2", "X3"],
            "period": [0.1, 0.25, 0.5],
            "period_derivative": [1e-14, 2e-14, 4e-14],
            "braking_index": [12.0, 30.5, 4.25],
            "braking_index_err": [0.5, 2.0, 0.125],
            "distance_note": ["near", "far", "far"],
        }
    )


@pytest.fixture
def one() -> Callable[..., Catalog]:
    """Read a table of one row: sound values, replaced or (with None) dropped by keyword."""

    def read(**cells: Any) -> Catalog:
        row = {
            "name": "X",
            "period": 0.1,
            "period_derivative": 1e-14,
            "braking_index": 12.0,
            "braking_index_err": 0.5,
        } | cells
        return read_table(Table({key: [value] for key, value in row.items() if value is not None}))

    return read
