"""The layout is the architecture: imports point one way, doors are explicit, modules stay small."""

import ast
import importlib
import re
from pathlib import Path

import pytest

import decayinfer

PACKAGE = Path(decayinfer.__file__).parent
ROOT = PACKAGE.parent
MODULES = sorted(path for path in PACKAGE.rglob("*.py"))
#: Lower first; nothing imports what stands after it.
LAYERS = (
    "measurements",
    "catalog",
    "physics",
    "cooling",
    "channels",
    "inference",
    "results",
    "report",
    "cli",
)
#: Modules at the top level that everything may use.
COMMON = {"errors"}
#: What stands beside the command line.
SHELL = {"__init__", "__main__", "cli", "demo", "terminal"}
SAMPLERS = {"pymc", "pytensor", "nutpie", "numba"}


def name_of(path):
    parts = path.relative_to(ROOT).with_suffix("").parts
    return ".".join(parts[:-1] if parts[-1] == "__init__" else parts)


def tree_of(path):
    return ast.parse(path.read_text(encoding="utf-8"))


def imported(tree, *, everywhere=True):
    """Names of the modules that a tree imports; without `everywhere`, only when it is itself imported."""
    nodes = ast.walk(tree) if everywhere else at_once(tree.body)
    for node in nodes:
        if isinstance(node, ast.Import):
            yield from (alias.name for alias in node.names)
        elif isinstance(node, ast.ImportFrom):
            yield node.module
            yield from (f"{node.module}.{alias.name}" for alias in node.names)


def at_once(body):
    """Statements that run on import: not those in functions, nor those for type checkers."""
    for node in body:
        if isinstance(node, ast.If) and "TYPE_CHECKING" in ast.dump(node.test):
            continue
        if isinstance(node, ast.FunctionDef | ast.AsyncFunctionDef):
            continue
        yield node
        for field in ("body", "orelse", "finalbody", "handlers"):
            yield from at_once(getattr(node, field, []))


def layer(module):
    parts = module.split(".")
    return parts[1] if len(parts) > 1 and parts[0] == "decayinfer" else None


@pytest.mark.parametrize("path", MODULES, ids=name_of)
def test_imports_point_one_way(path):
    """measurements < catalog < physics < cooling < channels < inference < results < report < command line.

    The first two may use physics.
    """
    own = layer(name_of(path))
    if own is None or (path.stem in SHELL and path.parent == PACKAGE):
        return
    assert own in LAYERS or own in COMMON, f"{own} has no place among the layers"
    allowed = COMMON | {own} | (set() if own in COMMON else set(LAYERS[: LAYERS.index(own)]))
    if own in {"measurements", "catalog"}:
        allowed |= {"physics"}
    used = {layer(module) for module in imported(tree_of(path))} - {None}
    used &= {p.stem for p in PACKAGE.iterdir()}  # names such as `__version__` are no modules
    assert used <= allowed


@pytest.mark.parametrize("path", MODULES, ids=name_of)
def test_only_the_inference_imports_samplers(path):
    used = {module.split(".")[0] for module in imported(tree_of(path))} & SAMPLERS
    own = layer(name_of(path))
    if own == "inference":
        return
    # the compiled twin of the cooling form, and the lazy choice between NumPy and PyTensor
    exceptions = {"decayinfer.cooling.kernel": {"numba"}, "decayinfer.physics.namespace": {"pytensor"}}
    assert used <= exceptions.get(name_of(path), set())


@pytest.mark.parametrize("path", MODULES, ids=name_of)
def test_the_door_is_explicit(path):
    """A module with public names lists them, sorted, and every one is there and its own."""
    tree = tree_of(path)
    defined = {
        node.name
        for node in tree.body
        if isinstance(node, ast.FunctionDef | ast.ClassDef) and not node.name.startswith("_")
    }
    listed = [
        node.value
        for node in tree.body
        if isinstance(node, ast.Assign) and any(getattr(t, "id", "") == "__all__" for t in node.targets)
    ]
    if not listed:
        assert not defined, f"{sorted(defined)} are public but there is no __all__"
        return
    names = [element.value for element in listed[0].elts]
    assert names == sorted(names, key=rank)
    assert len(names) == len(set(names))
    if path.stem == "__main__":
        return
    module = importlib.import_module(name_of(path))
    for name in names:
        assert hasattr(module, name)
    if path.stem not in SHELL:  # commands are public through the command line
        assert defined <= set(names), f"{sorted(defined - set(names))} are public but not listed"


def rank(name):
    """Constants, then classes, then the rest, as the linter sorts them."""
    return (0 if name.isupper() else 1 if name[0].isupper() else 2), name


@pytest.mark.parametrize("path", MODULES, ids=name_of)
def test_no_bare_number_meets_pytensor(path):
    """xp.log(2.0) with xp = pytensor.tensor computes in single precision; NumPy must take the constant."""
    number = ast.Constant
    for node in ast.walk(tree_of(path)):
        if not isinstance(node, ast.Call) or not isinstance(node.func, ast.Attribute):
            continue
        owner = getattr(node.func.value, "id", "")
        called = (
            isinstance(node.func.value, ast.Call) and getattr(node.func.value.func, "id", "") == "namespace"
        )
        if owner not in {"xp", "pt"} and not called:
            continue
        if node.func.attr in {"log", "exp", "sqrt", "log1p", "expm1", "sinh", "cosh", "sin", "cos", "erfc"}:
            argument = node.args[0].operand if isinstance(node.args[0], ast.UnaryOp) else node.args[0]
            assert not isinstance(argument, number), f"line {node.lineno}: {ast.unparse(node)}"


def test_that_trap_is_real():
    """The reason for the rule above: PyTensor stores a bare literal in the smallest type that holds it."""
    import numpy as np
    import pytensor.tensor as pt
    from pytensor.compile.mode import Mode

    single = float(pt.log(10.0).eval(mode=Mode("py", None)))
    assert abs(single - np.log(10.0)) > 1e-9


@pytest.mark.parametrize("path", MODULES, ids=name_of)
def test_modules_are_small(path):
    assert len(path.read_text(encoding="utf-8").splitlines()) <= 500


def test_nothing_prints_outside_the_command_line():
    for path in MODULES:
        calls = [
            n
            for n in ast.walk(tree_of(path))
            if isinstance(n, ast.Call) and getattr(n.func, "id", "") == "print"
        ]
        if path.parent != PACKAGE or path.stem not in SHELL:
            assert not calls, path


def test_the_top_level_holds_nothing_else():
    import subprocess

    listed = subprocess.run(["git", "ls-files"], cwd=ROOT, capture_output=True, text=True, check=False).stdout
    top = {line.split("/")[0] for line in listed.splitlines() if line}
    allowed = {"README.md", "DEVELOPERS.md", "pyproject.toml", "decayinfer", "tests", "examples", "docs"}
    assert {name for name in top if not name.startswith(".")} <= allowed


def test_no_machine_path_in_the_repository():
    pattern = re.compile(r"(?<![\w./])/(?:" + "|".join(("work", "root", "home")) + r")/\w")
    for path in [
        *MODULES,
        *(ROOT / "tests").rglob("*.py"),
        *(ROOT / "docs").rglob("*.md"),
        ROOT / "README.md",
    ]:
        assert not pattern.search(path.read_text(encoding="utf-8")), path


def test_importing_the_inference_does_not_load_samplers():
    """Only a fit does: building problems and reading settings stay quick."""
    import subprocess
    import sys

    code = (
        "import sys, decayinfer.inference.settings, decayinfer.inference.outcome, decayinfer.inference.priors;"
        f"print(sorted({SAMPLERS | {'arviz'}!r} & set(sys.modules)))"
    )
    done = subprocess.run([sys.executable, "-c", code], cwd=ROOT, capture_output=True, text=True, check=False)
    assert done.stdout.strip() == "[]", done.stderr
