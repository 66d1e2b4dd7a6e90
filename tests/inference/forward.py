"""Field and spin followed forward from birth, with nothing taken from the inference.

Two solvers of one set of equations, in the time of a distant clock, z being the redshift factor of the star:

    -dB/ds / B = z [f(T_b)/tau_ph + Q/tau_1 + S(s)/tau_H(B)],   P dP/ds = C B^2

f is T_8^2 times the Umklapp factor; tau_ph names a depth, and tau_1 and tau_H belong to that depth. `evolve`
steps many stars at once; `evolve_one` is scipy's adaptive solver, in plain time and with other variables.
"""

from collections.abc import Callable
from dataclasses import dataclass, fields
from typing import Protocol

import numpy as np
from scipy.integrate import solve_ivp

from decayinfer.physics.conduction import density_from_phonon_time, impurity_time
from decayinfer.physics.constants import YEAR_S
from decayinfer.physics.hall import attractor_switch, hall_time
from decayinfer.physics.lattice import FREEZE_OUT, freeze_out
from decayinfer.physics.torque import spin_down_constant

CRUST_RELAXATION = 100.0  # yr, the time before which temperatures hardly change
CHUNK = 8192  # stars stepped together: small enough for the cache


class Star(Protocol):
    """What must be known of a star; a cooling scenario has it all."""

    def ln_temperature(self, ln_age, mass): ...

    def radius_km(self, mass): ...

    def inertia_45(self, mass): ...

    def redshift_factor(self, mass): ...

    def gravity_14(self, mass): ...


@dataclass(frozen=True, kw_only=True)
class Draws:
    """Physical parameters, (n,) arrays or floats."""

    mass: np.ndarray  # M_sun
    phonon_time: np.ndarray  # yr, at 1e8 K on the star's own clock; names the depth, also with phonons off
    impurity_parameter: np.ndarray
    hall_factor: np.ndarray  # on the Hall time of that depth
    hall_times: np.ndarray  # Hall times of the birth field until the attractor; inf for none
    birth_field: np.ndarray  # 1e12 G
    birth_period: np.ndarray  # s
    age: np.ndarray  # yr
    umklapp_temperature: np.ndarray  # 1e8 K

    def __getitem__(self, index):
        return Draws(**{f.name: np.asarray(getattr(self, f.name))[index] for f in fields(self)})


@dataclass(frozen=True)
class Observables:
    """Today's field [1e12 G], period [s], its derivative [s/s] and braking index; nan for a dead field."""

    field: np.ndarray
    period: np.ndarray
    period_derivative: np.ndarray
    braking_index: np.ndarray


@dataclass(frozen=True)
class Equations:
    """The right-hand sides of one chunk of stars."""

    rate: Callable  # (age, field) -> -dlnB/ds [1/yr]
    constant: np.ndarray  # C in s^2 per yr per (1e12 G)^2


def equations(draws, star, channel, law):
    """Prepare the right-hand sides for a channel such as "impurity+phonon" and a freeze-out law."""
    on = {name: float(name in channel.split("+")) for name in ("impurity", "phonon", "hall")}
    mass, gravity, redshift = draws.mass, star.gravity_14(draws.mass), star.redshift_factor(draws.mass)
    density = density_from_phonon_time(draws.phonon_time, gravity)
    impurity = on["impurity"] / impurity_time(density, draws.impurity_parameter, gravity_14=gravity)
    phonon = on["phonon"] / draws.phonon_time
    unit_hall = draws.hall_factor * hall_time(density, 1.0, gravity_14=gravity)
    attractor_age = draws.hall_times * unit_hall / draws.birth_field / redshift

    def rate(age, field):
        total = impurity + on["hall"] * attractor_switch(age, attractor_age) * field / unit_hall
        if on["phonon"]:
            temperature = np.exp(star.ln_temperature(np.log(np.maximum(age, 1e-300)), mass))
            frozen = freeze_out(
                temperature, draws.umklapp_temperature, strength=law.strength, power=law.power
            )
            total = total + phonon * temperature**2 * frozen
        return redshift * total

    radius, inertia = star.radius_km(mass), star.inertia_45(mass)
    return Equations(rate, spin_down_constant(radius_km=radius, inertia_45=inertia) * YEAR_S)


def evolve(draws, star, *, channel, law=FREEZE_OUT["exponential"], steps=64):
    """Follow many stars by fourth-order Runge-Kutta steps, even in the logarithm of age but for the youth.

    Age is s = s_0 (e^u - 1), with s_0 a tenth of the shortest of the age, the decay time at birth and the
    century in which a crust relaxes.
    """
    size = np.size(draws.age)
    chunks = [
        _step_chunk(draws[slice(i, i + CHUNK)], star, channel, law, steps) for i in range(0, size, CHUNK)
    ]
    return Observables(*(np.concatenate(parts) for parts in zip(*chunks, strict=True)))


def _step_chunk(draws, star, channel, law, steps):
    system = equations(draws, star, channel, law)
    start = 0.1 / (system.rate(0.0 * draws.age, draws.birth_field) + 1.0 / draws.age + 1.0 / CRUST_RELAXATION)
    h = np.log1p(draws.age / start) / steps

    def slopes(u, ln_ratio):
        stretch = start * np.exp(u)
        field = draws.birth_field * np.exp(ln_ratio)
        return -stretch * system.rate(stretch - start, field), stretch * field**2

    ln_ratio, squares = 0.0 * draws.age, 0.0 * draws.age  # ln(B/B_0) and the integral of B^2
    for i in range(steps):
        u = i * h
        a, p = slopes(u, ln_ratio)
        b, q = slopes(u + h / 2, ln_ratio + h / 2 * a)
        c, r = slopes(u + h / 2, ln_ratio + h / 2 * b)
        d, s = slopes(u + h, ln_ratio + h * c)
        ln_ratio = ln_ratio + h / 6 * (a + 2 * b + 2 * c + d)
        squares = squares + h / 6 * (p + 2 * q + 2 * r + s)
    period = np.sqrt(draws.birth_period**2 + 2 * system.constant * squares)
    return _today(system, draws.age, draws.birth_field * np.exp(ln_ratio), period)


def _today(system, age, field, period):
    """Derivatives of the period by differentiating P P' = C B^2 once more."""
    first = system.constant * field**2 / period
    field_slope = -field * system.rate(age, field)
    second = (2 * system.constant * field * field_slope - first**2) / period
    with np.errstate(divide="ignore", invalid="ignore"):
        return field, period, first / YEAR_S, 2 - period * second / first**2


def evolve_one(draws, star, *, channel, law=FREEZE_OUT["exponential"], rtol=1e-12, stencil=3e-4):
    """Follow one star with DOP853 in plain time; the second derivative of P is a five-point difference."""
    system = equations(draws, star, channel, law)

    def slopes(age, state):
        field, period = np.exp(state[0]), state[1]
        return [-float(system.rate(age, field)), float(system.constant) * field**2 / period]

    state, now = np.array([np.log(draws.birth_field), draws.birth_period], dtype=float), 0.0
    rows = []
    for later in float(draws.age) * (1 + stencil * np.arange(-2, 3)):
        run = solve_ivp(slopes, (now, later), state, "DOP853", rtol=rtol, atol=1e-14)
        state, now = run.y[:, -1], later
        rows.append((*state, slopes(now, state)[1]))
    ln_field, period, first = np.array(rows).T
    second = first @ np.array([1, -8, 0, 8, -1]) / (12 * stencil * float(draws.age))
    index = 2 - period[2] * second / first[2] ** 2
    return Observables(np.exp(ln_field[2]), period[2], first[2] / YEAR_S, index)
