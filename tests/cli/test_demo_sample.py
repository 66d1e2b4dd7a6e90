"""The sample that ships is what its comment says."""

import re
from importlib.resources import as_file, files

import numpy as np
from astropy.table import Table

from decayinfer.cli import _DEMO_COOLING
from decayinfer.inference.settings import FitSettings
from decayinfer.inference.simulate import simulate_table


def test_the_command_in_the_comment_makes_the_sample():
    with as_file(files("decayinfer") / "data" / "demo.ecsv") as path:
        shipped = Table.read(path)
    said = re.search(
        r"--objects (\d+) --seed (\d+) --cooling ([a-z0-9,-]+)`", " ".join(shipped.meta["comments"])
    )
    number, seed, cooling = int(said[1]), int(said[2]), tuple(said[3].split(","))
    assert cooling == _DEMO_COOLING
    assert set(shipped["truth_cooling"]) == set(cooling)
    made = simulate_table(number, seed, FitSettings(cooling=cooling))
    assert made.colnames == shipped.colnames
    for name in made.colnames:
        if made[name].dtype.kind == "f":
            # roots of the field history end within 1e-12 or so, wherever they are found
            np.testing.assert_allclose(np.asarray(made[name]), np.asarray(shipped[name]), rtol=1e-8)
        else:
            assert list(made[name]) == list(shipped[name])
