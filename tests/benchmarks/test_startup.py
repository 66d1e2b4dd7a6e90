"""How soon a process reaches its first posterior: the first on a machine, and the next."""

import json
import os
import subprocess
import sys
import time
from pathlib import Path

import pytest

ROOT = Path(__file__).parents[2]
FIRST_POSTERIOR = """
import json, time
begun = time.perf_counter()
import numpy as np
import decayinfer as di
from decayinfer.inference.compiled import template
from decayinfer.inference.density import evaluate
from decayinfer.inference.engine import engine
from decayinfer.inference.fit import fit_channel
imported = time.perf_counter()
parts = dict(engine().seconds)
parts["import"] += imported - begun
loaded = time.perf_counter()
evaluate(np.zeros((1, 8)), template())
warmed = time.perf_counter()
parts["compilation"] += warmed - loaded
star = di.Pulsar(
    name="Sedge", period=0.31, period_derivative=4e-14, braking_index=21.0, braking_index_err_minus=1.05,
    braking_index_err_plus=1.05,
)
fit = fit_channel(star, "phonon", di.scenario_names()[0], di.FitSettings())
parts["sampling"] = time.perf_counter() - warmed
print(json.dumps(parts | {"ln_evidence": fit.ln_evidence, "ess": fit.ess_bulk_min}))
"""


def first_posterior(folder):
    environment = os.environ | {
        "PYTHONPATH": str(ROOT),
        "PYTENSOR_FLAGS": f"base_compiledir={folder / 'pytensor'}",
        "NUMBA_CACHE_DIR": str(folder / "numba"),
    }
    begun = time.perf_counter()
    done = subprocess.run(
        [sys.executable, "-c", FIRST_POSTERIOR], env=environment, capture_output=True, text=True, check=True
    )
    return time.perf_counter() - begun, json.loads(done.stdout.splitlines()[-1])


@pytest.mark.benchmark
def test_a_second_process_starts_in_half_the_time_of_the_first(tmp_path, say):
    first, first_parts = first_posterior(tmp_path)
    second, second_parts = first_posterior(tmp_path)
    for label, seconds, parts in (("first", first, first_parts), ("second", second, second_parts)):
        named = ", ".join(
            f"{name} {parts[name]:.2f}" for name in ("import", "graph", "compilation", "sampling")
        )
        say(f"{label} process {seconds:.1f} s: {named}")
    say(f"second/first {second / first:.2f}")
    assert second <= 0.5 * first
    # the two processes ran the same machine code
    assert first_parts["ln_evidence"] == second_parts["ln_evidence"]
    assert first_parts["ess"] == second_parts["ess"]
