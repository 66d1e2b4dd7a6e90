"""What a star of given parameters is like today, as far as further measurements see it."""

from collections.abc import Mapping, Sequence

import numpy as np
from numpy.typing import NDArray

from decayinfer.cooling.envelope import ENVELOPES, photon_luminosity, surface_temperature
from decayinfer.cooling.scenario import Scenario
from decayinfer.measurements import Measurement, State

__all__ = ["envelope_of", "ln_measured", "state_of"]

type Array = NDArray[np.float64]

_DEFAULT = "iron"


def envelope_of(scenario: Scenario) -> str:
    """Return the envelope of a scenario; iron where it names none that is known, as a user's table does."""
    envelope = scenario.properties.get("envelope", _DEFAULT)
    return envelope if envelope in ENVELOPES else _DEFAULT


def state_of(parameters: Mapping[str, Array], scenario: Scenario) -> State:
    """Return the state of stars.

    The surface is taken as one temperature behind the scenario's envelope without a magnetic field; to the distant
    observer temperature falls by the redshift factor and luminosity by its square (Thorne 1977, ApJ 212, 825).

    Parameters
    ----------
    parameters : mapping of str to (n,) array
        Reported parameters, in the units of `decayinfer.inference.outcome.PARAMETERS`: mass, age, braking_index,
        crust_temperature, and obliquity where the channel has one.
    scenario : Scenario
        Gives radius, gravity and envelope.
    """
    mass, t_b = parameters["mass"], parameters["crust_temperature"]
    redshift = scenario.redshift_factor(mass)
    with np.errstate(all="ignore"):  # a point without a history has no temperature either
        t_s = surface_temperature(t_b, scenario.gravity_14(mass), envelope=envelope_of(scenario))
        luminosity = photon_luminosity(t_s, scenario.radius_km(mass)) * redshift**2
    return State(
        age=parameters["age"],
        mass=mass,
        crust_temperature=t_b,
        surface_temperature=np.asarray(t_s * redshift),
        luminosity=np.asarray(luminosity),
        obliquity=parameters.get("obliquity"),
        braking_index=parameters["braking_index"],
    )


def ln_measured(state: State, measurements: Sequence[Measurement]) -> Array:
    """Return ln p(measurements | state), (n,); zero without measurements."""
    total = np.zeros_like(state.age)
    for measurement in measurements:
        total = total + measurement.ln_likelihood(state)
    return total
