"""What several tests of the inference share: objects, problems, typical points, and physical parameters."""

from dataclasses import fields, replace
from functools import cache
from pathlib import Path

import numpy as np

from decayinfer.catalog.pulsar import Pulsar
from decayinfer.channels.registry import channel_names, load_channel
from decayinfer.cooling import form, registry
from decayinfer.cooling.scenario import read_scenario
from decayinfer.inference.density import evaluate
from decayinfer.inference.priors import Priors
from decayinfer.inference.problem import make_problem
from decayinfer.physics.conduction import density_from_phonon_time
from decayinfer.physics.hall import attractor_switch, hall_time

CHANNELS = channel_names(rivals=False)
DECAYING = CHANNELS[1:]
SCENARIOS = ("candle", "slow-candle")
LAWS = ("none", "exponential", "cut")

#: An invented object of middle age with a typical index.
WREN = Pulsar(
    name="Wren", period=0.3, period_derivative=4e-14, braking_index=20.0,
    braking_index_err_minus=2.0, braking_index_err_plus=2.0,
)  # fmt: skip


@cache
def scenario(name):
    """A scenario of the tests' own: candle and slow-candle from tests/data, urca from below."""
    if name == "urca":
        return urca_scenario()
    return read_scenario(Path(__file__).parents[1] / "data" / f"{name}.toml")


def register_scenarios():
    """Make the tests' scenarios known by name, for fits, until the function that is returned has been called."""
    known = dict(registry._REGISTERED)
    for name in (*SCENARIOS, "urca"):
        registry.register_scenario(scenario(name))

    def forget():
        registry._REGISTERED.clear()
        registry._REGISTERED.update(known)

    return forget


def problem(channel, cooling="candle", star=WREN, priors=None, **changes):
    """The numbers of one posterior problem."""
    return make_problem(
        replace(star, **changes), load_channel(channel), scenario(cooling), priors or Priors()
    )


def urca_scenario():
    """A scenario made up here that uses every term of the closed form, with direct Urca from 1.5 M_sun on."""
    table = np.zeros((2, len(form.PARAMETERS), form.DEGREE + 1))
    rows = {
        "a0": (0.5, -0.1, 0.02), "s0": (np.log(0.12), 0.1), "s1": (np.log(2.0), -0.2, 0.05), "l1": (2.2, -0.3),
        "w1": (np.log(0.6), 0.1), "s2": (np.log(0.2), 0.3), "l2": (-1.5, 0.4, -0.1), "w2": (np.log(0.8),),
        "b1": (np.log(0.4), 0.2), "c1": (0.3, -0.5), "v1": (np.log(0.5), 0.1), "b2": (np.log(0.1),),
        "c2": (-2.0, 0.2), "v2": (np.log(0.9), -0.1), "beta": (np.log(0.7), 0.05), "q": (3.0, -0.4, 0.1, 0.02),
    }  # fmt: skip
    for name, values in rows.items():
        row = form.PARAMETERS.index(name)
        table[0, row, : len(values)] = values
        table[1, row, : len(values)] = values
    table[1, 0, 0] -= 0.5  # the fast branch is colder still
    scalars = np.array([2.0, 2.0, 1.0, 1.0, 2.0, 0.25, 1.5, 0.05, np.log(0.02), 100.0])
    return replace(scenario("candle"), name="urca", table=table, scalars=scalars)


def typical_points(numbers, count, rng):
    """Coordinates as a posterior has them, (count, 8): a wide cloud, thinned by its density."""
    umklapp, phonon = numbers.normals[0, 6], numbers.normals[0, 0]
    centre = np.array([-1.0, 0.0, -0.7, -0.7, -0.7, 0.3, umklapp, phonon])
    spread = np.array([1.0, 1.0, 1.5, 1.2, 1.5, 0.7, 0.4, 1.0])
    scaled = rng.standard_normal((2000, 8))
    cloud = np.where(numbers.active > 0.0, centre + spread * scaled, scaled)
    ln_cloud = -0.5 * np.sum(scaled**2, axis=1)
    ln_weights = evaluate(cloud, numbers).ln_density(numbers) - ln_cloud
    keys = ln_weights + rng.gumbel(size=len(cloud))  # the largest are draws without repeats
    return cloud[np.argsort(-keys)[:count]]


def draws_of(forward, physical):
    """The forward simulator's parameters for what the inference calls physical."""
    values = np.broadcast_arrays(
        physical.mass,
        *np.exp(
            np.broadcast_arrays(
                physical.ln_phonon_time,
                physical.ln_impurity_parameter,
                physical.ln_hall_factor,
                physical.ln_attractor_times,
                physical.ln_birth_field,
                physical.ln_birth_period,
                physical.ln_age,
                physical.ln_umklapp,
            )
        ),
    )
    names = [f.name for f in fields(forward.Draws)]
    return forward.Draws(**dict(zip(names, values, strict=True)))


def observe(forward, draws, star, *, channel, law, steps=1500):
    """Today's spin and index, and the coordinates that go with them, by the forward equations alone.

    Returns a dict of arrays (n,): ln_period, ln_period_derivative, and by the names of COORDINATES (the index as
    ln(n - 3), the mass itself).
    """
    today = forward.evolve(draws, star, channel=channel, law=law, steps=steps)
    acting = channel.split("+")
    rates = {part: forward.equations(draws, star, part, law).rate(draws.age, today.field) for part in acting}
    gravity, redshift = star.gravity_14(draws.mass), star.redshift_factor(draws.mass)
    density = density_from_phonon_time(draws.phonon_time, gravity)
    birth_time = draws.hall_factor * hall_time(density, draws.birth_field, gravity_14=gravity) / redshift
    ratio = draws.hall_times * birth_time / draws.age
    out = {
        "ln_period": np.log(today.period),
        "ln_period_derivative": np.log(today.period_derivative),
        "logit_mass": draws.mass,
        "logit_birth_period": -np.log(today.period / draws.birth_period - 1.0),
        "ln_umklapp": np.log(draws.umklapp_temperature),
        "ln_phonon_time": np.log(draws.phonon_time),
    }
    if channel != "constant":
        out["warped_index"] = np.log(today.braking_index - 3.0)
    if "phonon" in acting and "impurity" in acting:
        out["ln_q"] = np.log(rates["impurity"] / rates["phonon"])
    if "hall" in acting:
        out["ln_attractor_ratio"] = np.log(ratio)
        if len(acting) > 1:
            reference = rates["phonon" if "phonon" in acting else "impurity"]
            out["ln_eta"] = np.log(rates["hall"] / attractor_switch(1.0, ratio) / reference)
    return out
