"""A stand-in for the sampler: instant, deterministic, and able to misbehave on demand.

The name of an object says how its runs end: ``unreachable``, ``stuck`` (did not
converge), ``broken`` (an exception), ``panic`` (an
exception that is no Exception), ``killer`` (the process dies), anything else ok.
"""

import hashlib
import os
import time
from dataclasses import replace

import numpy as np
from xarray import Dataset, DataTree

from decayinfer.channels.registry import load_channel
from decayinfer.cooling.registry import load_scenario, scenario_names
from decayinfer.inference.outcome import ChannelFit, Status

#: Seconds that each posterior run takes.
delay = 0.0

#: Every call, as (object, scenario, channel).
calls = []


def scenarios():
    """Return two cooling scenarios that the package does not ship."""
    shipped = load_scenario(scenario_names()[0])
    return [replace(shipped, name=name) for name in ("cool", "warm")]


class PanicError(BaseException):
    """What a compiled sampler may raise."""


def fit_channel(pulsar, channel, scenario, settings):
    """Make a posterior run out of random numbers that depend on the names and the seed alone."""
    calls.append((pulsar.name, scenario, channel))
    time.sleep(delay)
    labels = (pulsar.name, scenario, channel)
    if pulsar.name.startswith("killer"):
        os._exit(9)
    if pulsar.name.startswith("broken"):
        raise ValueError("the sampler\nlost its way")
    if pulsar.name.startswith("panic"):
        raise PanicError("deep trouble")
    if pulsar.name.startswith("unreachable") or channel == "constant":
        reason = "n lies 12 standard deviations from what the channel can give"
        prior = DataTree.from_dict({"prior": _made_up(labels, settings).draws["prior"].dataset})
        evidence = {"ln_evidence": -np.inf, "ln_evidence_err": 0.0}
        return ChannelFit(*labels, Status.UNREACHABLE, reason=reason, **evidence, draws=prior)
    if pulsar.name.startswith("stuck"):
        return replace(_made_up(labels, settings), status=Status.FAILED, reason="did not converge")
    return _made_up(labels, settings)


def _made_up(labels, settings):
    digest = hashlib.sha256(repr((*labels, settings.seed)).encode()).digest()
    random = np.random.default_rng(int.from_bytes(digest[:8], "big"))
    shape = (settings.chains, settings.draws)
    names = load_channel(labels[2]).parameters
    posterior, prior = ({name: _values(name, random, shape) for name in names} for _ in range(2))
    tree = {
        "posterior": posterior,
        "prior": prior,
        "sample_stats": {"diverging": random.random(shape) < 0.001},
    }
    groups = {
        group: Dataset({name: (("chain", "draw"), values) for name, values in content.items()})
        for group, content in tree.items()
    }
    return ChannelFit(
        *labels,
        Status.OK,
        ln_evidence=random.normal(-4.0, 1.0),
        ln_evidence_err=0.02,
        ln_evidence_joint=-11.0,
        ln_evidence_joint_err=np.float64(0.03),
        ess_bulk_min=800.0,
        ess_tail_min=700.0,
        r_hat_max=1.002,
        divergences=np.int64(1),
        gradients=12000,
        flags=("poor-mixing",) if labels[0].startswith("slow-mixer") else (),
        draws=DataTree.from_dict(groups),
    )


def _values(name, random, shape):
    if name == "mass":
        return random.normal(1.3, 0.1, shape)
    return 10.0 ** random.normal(5.0, 0.3, shape)
