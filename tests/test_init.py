"""The front door: version, public names, quick import, a sentence for old Pythons."""

import ast
import importlib
import subprocess
import sys
import tomllib
from pathlib import Path

import pytest

import decayinfer

ROOT = Path(__file__).parents[1]
INIT = ROOT / "decayinfer" / "__init__.py"
SAMPLING = ["numpy", "pandas", "astropy", "pymc", "pytensor", "numba", "arviz", "xarray", "scipy"]


def python(code, *arguments):
    return subprocess.run(
        [sys.executable, *arguments, "-c", code], cwd=ROOT, capture_output=True, text=True, check=False
    )


def test_the_version_is_the_project_s():
    project = tomllib.loads((ROOT / "pyproject.toml").read_text())["project"]
    assert decayinfer.__version__ == project["version"]


def test_public_names_are_sorted_and_there():
    assert decayinfer.__all__ == sorted(decayinfer.__all__)
    assert dir(decayinfer) == decayinfer.__all__
    for name in decayinfer.__all__:
        assert getattr(decayinfer, name) is not None


def test_an_unknown_name_is_an_attribute_error():
    with pytest.raises(AttributeError, match="no attribute 'nonsense'"):
        _ = decayinfer.nonsense


def test_public_names_come_from_where_they_are_defined():
    for name, home in decayinfer._HOMES.items():
        assert name in importlib.import_module(home).__all__


def test_import_is_light():
    done = python(
        f"import sys, decayinfer; print([m for m in {[*SAMPLING, 'rich', 'typer']} if m in sys.modules])"
    )
    assert done.stdout == "[]\n"


def test_the_command_line_starts_light():
    done = python(f"import sys, decayinfer.cli; print([m for m in {SAMPLING} if m in sys.modules])")
    assert done.stdout == "[]\n"


@pytest.mark.parametrize("version", [(3, 8), (3, 11)])
def test_the_file_parses_on_old_pythons(version):
    ast.parse(INIT.read_text(), feature_version=version)


OLD = "import sys; sys.version_info = (3, 9, 1, 'final', 0); {}"
SENTENCE = "decayinfer needs Python 3.12 or newer and this is Python 3.9; use a newer Python"


def test_old_pythons_get_a_sentence_on_import():
    done = python(OLD.format("import decayinfer"))
    assert done.stderr.splitlines()[-1] == f"ImportError: {SENTENCE}"


def test_old_pythons_get_the_sentence_alone_from_the_command():
    done = python(OLD.format("sys.argv = ['-m']; import decayinfer"))
    assert (done.returncode, done.stdout, done.stderr) == (1, "", f"{SENTENCE}\n")
