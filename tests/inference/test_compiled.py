"""The disk cache of the compiled density: its key names everything the density is made from."""

import ast
from pathlib import Path

import numpy as np
import pytest

import decayinfer
from decayinfer.inference import compiled
from decayinfer.inference.engine import Engine, engine

ROOT = Path(decayinfer.__file__).parent
#: Modules that the model imports but that only make numbers, which the callback is given.
NUMBERS = {
    "catalog/pulsar.py", "channels/base.py", "cooling/scenario.py", "errors.py", "inference/priors.py",
    "inference/settings.py",
}  # fmt: skip


def imported_by(source, seen):
    """Files of the package that a file imports, directly or not."""
    seen.add(source)
    for node in ast.walk(ast.parse((ROOT / source).read_text(encoding="utf-8"))):
        if isinstance(node, ast.ImportFrom) and (node.module or "").startswith("decayinfer"):
            names = [node.module, *(f"{node.module}.{alias.name}" for alias in node.names)]
            files = ["/".join(name.split(".")[1:]) + ".py" for name in names]
            for file in files:
                if (ROOT / file).is_file() and file not in seen and file not in NUMBERS:
                    imported_by(file, seen)
    return seen


def test_the_key_covers_every_source_of_the_density():
    assert imported_by("inference/model.py", set()) <= set(compiled.SOURCES)
    assert all((ROOT / source).is_file() for source in compiled.SOURCES)


def test_a_changed_source_or_version_changes_the_key(monkeypatch):
    before = compiled._digest()
    assert compiled._digest() == before
    with monkeypatch.context() as patch:
        patch.setattr(compiled, "SOURCES", compiled.SOURCES[1:])
        assert compiled._digest() != before
    with monkeypatch.context() as patch:
        patch.setattr(compiled, "version", lambda tool: "0")
        assert compiled._digest() != before


def test_numbers_are_laid_out_as_the_fields():
    problem = compiled.template()
    numbers = compiled.flat_numbers(problem)
    assert numbers.size == sum(np.size(value) for value in problem)
    np.testing.assert_array_equal(numbers[:3], problem.spin)
    np.testing.assert_array_equal(numbers[-5:], problem.limits)


@pytest.mark.slow  # derives the density when the disk cache does not have it
def test_one_engine_and_at_most_one_derivation_in_a_process():
    assert engine() is engine()
    assert Engine.compilations == 1
    assert len(compiled.derivations()) <= 1
    # a second callback is loaded from the disk
    assert compiled.density_callback().cache_hits == 1


@pytest.mark.slow  # derives the density in this process
def test_interpreted_and_compiled_density_agree(tools, own_scenarios):
    """The function behind the callback, called from Python, is the density that is sampled."""
    from decayinfer.inference.density import evaluate

    problem = tools.problem("impurity+phonon+hall")
    point = tools.typical_points(problem, 1, np.random.default_rng(2))[0]
    value, gradient = compiled._log_density(point, compiled.flat_numbers(problem))
    assert value == pytest.approx(evaluate(point[None], problem).ln_density(problem)[0], rel=1e-9)
    assert np.shape(gradient) == point.shape
