"""Closed-form field histories for constant decay times, with which numerical histories are checked."""

from decayinfer.physics.namespace import Value, namespace

__all__ = ["exponential_field", "hall_field", "lumped_field", "lumped_rate"]


def exponential_field(age: Value, birth_field: Value, *, decay_time: Value) -> Value:
    """Return B_0 exp(-t/tau) in the unit of the birth field; ages and times in one unit."""
    return birth_field * namespace(age, birth_field, decay_time).exp(-age / decay_time)


def hall_field(age: Value, birth_field: Value, *, hall_time: Value) -> Value:
    """Return B_0/(1 + t/tau_H), drift alone with tau_H taken at the birth field."""
    return birth_field / (1.0 + age / hall_time)


def lumped_field(age: Value, birth_field: Value, *, ohmic_time: Value, hall_time: Value) -> Value:
    """Return the field under Ohmic decay and Hall drift with constant times.

    Solves dB/dt = -B/tau_O - (B/B_0) B/tau_H (Aguilera, Pons & Miralles 2008, A&A 486, 255, from memory;
    a test integrates the equation).

    Parameters
    ----------
    age : float, array or PyTensor variable
        Time since birth [yr].
    birth_field : float, array or PyTensor variable
        B_0, in any unit.
    ohmic_time, hall_time : float, array or PyTensor variable
        Ohmic time and Hall time at the birth field [yr].

    Returns
    -------
    float, array or PyTensor variable
        Field, in the unit of ``birth_field``.
    """
    xp = namespace(age, birth_field, ohmic_time, hall_time)
    decayed = -xp.expm1(-age / ohmic_time)
    return birth_field * xp.exp(-age / ohmic_time) / (1.0 + ohmic_time / hall_time * decayed)


def lumped_rate(field: Value, birth_field: Value, *, ohmic_time: Value, hall_time: Value) -> Value:
    """Return -Bdot/B = 1/tau_O + (B/B_0)/tau_H of the law in `lumped_field`."""
    return 1.0 / ohmic_time + field / birth_field / hall_time
