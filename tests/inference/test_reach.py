"""When an index lies beyond a channel."""

import numpy as np
import pytest

from decayinfer.inference.measurement import total_error
from decayinfer.inference.reach import REACH, out_of_reach

MARGIN = REACH * total_error(1.0, 1.0, 0.5)


@pytest.mark.parametrize(("offset", "beyond"), [(-0.01, False), (0.01, True)])
def test_the_edge_is_five_total_errors_away(offset, beyond):
    above = out_of_reach((10.0 + MARGIN + offset, 1.0, 1.0, 0.0), 3.0, 10.0, 0.5, where=" here")
    below = out_of_reach((3.0 - MARGIN - offset, 1.0, 1.0, 0.0), 3.0, 10.0, 0.5)
    assert bool(above) == bool(below) == beyond
    if beyond:
        assert "above 10, the most this channel gives here" in above
        assert "below 3, the least this channel gives" in below


def test_an_upper_limit_is_only_beyond_from_below():
    assert not out_of_reach((1e6, 1.0, 1.0, 1.0), 3.0, 10.0, 0.5)
    assert out_of_reach((-1e6, 1.0, 1.0, 1.0), 3.0, 10.0, 0.5).startswith("limit")


def test_a_channel_without_bounds_reaches_everything():
    for index in (-1e9, 3.0, 1e9):
        assert not out_of_reach((index, 1.0, 1.0, 0.0), -np.inf, np.inf, 0.5)
