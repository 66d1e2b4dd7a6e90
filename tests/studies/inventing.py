"""Invented objects for studies: drawn forward from the priors, measured, and selected by data alone.

The error of n is drawn without looking at n, since an error that grew with the true index would itself be a
measurement. Selection by P, tau_c and the measured n leaves ranks uniform and probabilities calibrated: those are data.
"""

from typing import NamedTuple

import numpy as np

from decayinfer.catalog.pulsar import Pulsar
from decayinfer.channels.rival import Rival
from decayinfer.inference.forward import draw_prior, evolve
from decayinfer.inference.measurement import sample_index
from decayinfer.inference.priors import Priors
from decayinfer.inference.rival_forward import evolve_rival
from decayinfer.physics.torque import characteristic_age


class Selection(NamedTuple):
    """What is measured: periods [s], characteristic ages [yr], measured indices; and the log-uniform errors of n."""

    periods: tuple[float, float]
    ages: tuple[float, float]
    indices: tuple[float, float]
    errors: tuple[float, float]


def invent(channel, scenario, count, rng, selection, *, batch=2000):
    """Objects, what `evolve` or `evolve_rival` said of each (draws, today, row), and the share that was selected."""
    priors, found, drawn = Priors(), [], 0
    while len(found) < count:
        draws = draw_prior(batch, priors, rng)
        if isinstance(channel, Rival):
            today = evolve_rival(draws, channel, scenario, priors, rng)
        else:
            today = evolve(draws, channel, scenario, priors)
        error = np.exp(rng.uniform(*np.log(selection.errors), size=batch))
        with np.errstate(all="ignore"):  # fields that have died, Pdot that acceleration has made negative
            measured = sample_index(today.braking_index, error, error, priors.scatter_sd, rng)
            age = characteristic_age(today.period, today.period_derivative)
            kept = inside(today.period, selection.periods) & inside(age, selection.ages)
            kept &= inside(measured, selection.indices)
        for i in np.flatnonzero(kept):
            star = Pulsar(
                name=f"object {len(found)}", period=float(today.period[i]),
                period_derivative=float(today.period_derivative[i]), braking_index=float(measured[i]),
                braking_index_err_minus=float(error[i]), braking_index_err_plus=float(error[i]),
            )  # fmt: skip
            found.append((star, (draws, today, i)))
        drawn += batch
    return found[:count], len(found) / drawn


def inside(values, limits):
    return (values > limits[0]) & (values < limits[1])
