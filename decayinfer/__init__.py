"""Magnetic-field decay in neutron stars, inferred from pulsar braking indices.

From period, period derivative and braking index of each pulsar to posteriors of mass, impurity parameter and
phonon time, and to the probability of every channel that could make the index.
"""

# The check below must run on Pythons too old for the rest of the package: plain syntax only in this file.
import sys

if sys.version_info < (3, 12):  # noqa: UP036
    _sentence = "decayinfer needs Python 3.12 or newer and this is Python {}.{}; use a newer Python"
    _sentence = _sentence.format(*sys.version_info[:2])
    if sys.argv[:1] == ["-m"]:  # started as python -m decayinfer: the sentence alone, without a traceback
        sys.exit(_sentence)
    raise ImportError(_sentence)

from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from decayinfer.catalog import Pulsar, read_table
    from decayinfer.channels.registry import channel_names
    from decayinfer.cooling.registry import scenario_names
    from decayinfer.inference.fit import fit_object
    from decayinfer.inference.priors import Priors
    from decayinfer.inference.settings import FitSettings
    from decayinfer.inference.simulate import simulate_table
    from decayinfer.results.read import read_run
    from decayinfer.results.run import fit_sample

__all__ = [
    "FitSettings",
    "Priors",
    "Pulsar",
    "__version__",
    "channel_names",
    "fit_object",
    "fit_sample",
    "read_run",
    "read_table",
    "scenario_names",
    "simulate_table",
]

__version__ = "0.1.0"

_HOMES = {
    "FitSettings": "decayinfer.inference.settings",
    "Priors": "decayinfer.inference.priors",
    "Pulsar": "decayinfer.catalog",
    "channel_names": "decayinfer.channels.registry",
    "fit_object": "decayinfer.inference.fit",
    "fit_sample": "decayinfer.results.run",
    "read_run": "decayinfer.results.read",
    "read_table": "decayinfer.catalog",
    "scenario_names": "decayinfer.cooling.registry",
    "simulate_table": "decayinfer.inference.simulate",
}


def __getattr__(name: str) -> object:
    """Load a public name when it is first used, so that importing the package stays quick."""
    if name not in _HOMES:
        raise AttributeError("module {!r} has no attribute {!r}".format(__name__, name))  # noqa: UP032
    from importlib import import_module

    return getattr(import_module(_HOMES[name]), name)


def __dir__() -> "list[str]":
    """List the public names."""
    return sorted(__all__)
