"""Run folders, tables, averages and verdicts: what a fit leaves behind, and how to read it."""

from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from decayinfer.results.read import Run, read_run
    from decayinfer.results.run import Progress, RunSummary, fit_sample, run_fit

__all__ = ["Progress", "Run", "RunSummary", "fit_sample", "read_run", "run_fit"]

_HOME = {"Run": "read", "read_run": "read"}


def __getattr__(name: str) -> Any:
    """Load public names when they are first used."""
    if name not in __all__:
        raise AttributeError(f"module {__name__!r} has no attribute {name!r}")
    from importlib import import_module

    return getattr(import_module(f"{__name__}.{_HOME.get(name, 'run')}"), name)
