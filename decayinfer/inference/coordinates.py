r"""From sampled coordinates to physical parameters, and the prior density of the coordinates.

P and Pdot are known exactly for every purpose here, so the birth field and the age are not sampled: they follow from
the coordinates, P and Pdot. The prior lives on the physical parameters; the change of variables
(M, ln tau_ph, ln Q, ln h, ln k, ln B_0, ln P_0, t) -> (coordinates, ln P, ln Pdot) has the Jacobian

.. math::

    \ln|J| = -J(0) - \ln w(0) + \ln\tau_c - \ln(dF/dt) + \ln(1 - P_0/P)

and nothing else, because the map of amplitudes is triangular with unit diagonal in logarithms. (A test compares it with
a determinant by finite differences.) The same lines serve NumPy arrays of draws and the PyTensor model.
"""

from typing import Any, NamedTuple

import numpy as np

from decayinfer.cooling.form import MASS_RANGE, chebyshev
from decayinfer.inference.ages import ln_age_density
from decayinfer.inference.problem import Problem
from decayinfer.physics import structure, torque
from decayinfer.physics.conduction import density_from_phonon_time, impurity_time
from decayinfer.physics.hall import attractor_switch, hall_time
from decayinfer.physics.namespace import namespace, softplus

__all__ = ["Physical", "history_inputs", "ln_index_excess", "ln_prior", "physical"]

_LN_2PI = float(np.log(2.0 * np.pi))


class Physical(NamedTuple):
    """Physical parameters of a history; times in yr, fields in 1e12 G, periods in s, temperatures in 1e8 K."""

    mass: Any
    ln_phonon_time: Any
    ln_impurity_parameter: Any
    ln_hall_factor: Any
    ln_attractor_times: Any
    ln_birth_field: Any
    ln_birth_period: Any
    ln_umklapp: Any
    ln_age: Any
    ln_field: Any
    ln_hall_time: Any
    index: Any
    share_phonon: Any
    share_impurity: Any
    share_hall: Any


def _mass(xp: Any, logit: Any) -> Any:
    return MASS_RANGE[0] + (MASS_RANGE[1] - MASS_RANGE[0]) / (1.0 + xp.exp(-logit))


def ln_index_excess(z: Any, problem: Problem) -> Any:
    """Return ln(n - 3), unwarped."""
    xp = namespace(z[0], problem.spin)
    centre, width, tail = problem.warp[0], problem.warp[1], problem.warp[2]
    # ln S(t) = -softplus(-4 ln(t_a/t)), see `decayinfer.physics.hall.attractor_switch`
    return centre + width * xp.sinh(tail * z[1]) / tail - problem.shear * softplus(xp, -4.0 * z[5])


def history_inputs(z: Any, problem: Problem) -> tuple[Any, ...]:
    """Return what the history kernel takes (`decayinfer.inference.kernel.INPUTS`) for eight coordinates.

    Parameters
    ----------
    z : sequence of 8 floats, arrays or PyTensor scalars
        The coordinates named in `decayinfer.inference.problem.COORDINATES`.
    problem : Problem
        The numbers of the problem.
    """
    xp = namespace(z[0], problem.spin)
    period_ratio = 1.0 / (1.0 + xp.exp(-z[4]))
    ln_tau = problem.spin[2] - softplus(xp, z[4]) + xp.log1p(period_ratio)
    ln_rate = ln_index_excess(z, problem) - np.log(4.0) - problem.spin[2]
    ln_umklapp = _chosen(problem.active[6], z[6], problem.normals[0][6])
    return ln_tau, ln_rate, z[2], z[3], z[5], _mass(xp, z[0]), ln_umklapp


def physical(z: Any, history: Any, problem: Problem) -> Physical:
    """Return the physical parameters of coordinates and their history.

    Parameters
    ----------
    z : sequence of 8
        The coordinates.
    history : sequence of 6
        The kernel's outputs (`decayinfer.inference.kernel.OUTPUTS`) at these coordinates.
    problem : Problem
        The numbers of the problem.
    """
    xp = namespace(z[0], problem.spin)
    ln_age, _, ln_birth_ratio, _, ln_phonon_now, ln_amplitude = history
    phonon, impurity, hall = problem.flags[0], problem.flags[1], problem.flags[2]
    mass = _mass(xp, z[0])
    ln_radius = chebyshev(problem.structure[0], mass)
    ln_inertia = chebyshev(problem.structure[1], mass)
    radius = xp.exp(ln_radius)
    gravity = structure.surface_gravity_14(mass, radius)
    ln_redshift = xp.log(structure.redshift_factor(mass, radius))
    field = torque.dipole_field(
        xp.exp(problem.spin[0]), xp.exp(problem.spin[1]), radius_km=radius, inertia_45=xp.exp(ln_inertia)
    )
    ln_field = xp.log(field)

    ln_q = problem.active[2] * z[2]
    ln_eta = problem.active[3] * z[3]
    # rates are those of a distant clock: timescales at the star are shorter by the redshift factor
    ln_phonon_time = _chosen(phonon, ln_redshift + ln_phonon_now - ln_amplitude, z[7])
    density = density_from_phonon_time(xp.exp(ln_phonon_time), gravity)
    ln_pure_time = xp.log(impurity_time(density, 1.0, gravity_14=gravity))
    ln_hall_time = ln_redshift - ln_amplitude - ln_eta
    ln_standard_hall = xp.log(hall_time(density, field, gravity_14=gravity))

    switch = attractor_switch(1.0, xp.exp(hall * z[5]))
    parts = phonon, impurity * xp.exp(ln_q), hall * xp.exp(ln_eta) * switch
    total = parts[0] + parts[1] + parts[2] + (1.0 - problem.active[1])
    return Physical(
        mass=mass,
        ln_phonon_time=ln_phonon_time,
        ln_impurity_parameter=ln_amplitude + ln_q + ln_pure_time - ln_redshift,
        ln_hall_factor=ln_hall_time - ln_standard_hall,
        ln_attractor_times=z[5] + ln_age + ln_amplitude + ln_eta - ln_birth_ratio,
        ln_birth_field=ln_field - ln_birth_ratio,
        ln_birth_period=problem.spin[0] - softplus(xp, -z[4]),
        ln_umklapp=_chosen(problem.active[6], z[6], problem.normals[0][6]),
        ln_age=ln_age,
        ln_field=ln_field,
        ln_hall_time=ln_hall_time,
        index=3.0 + problem.active[1] * xp.exp(ln_index_excess(z, problem)),
        share_phonon=parts[0] / total,
        share_impurity=parts[1] / total,
        share_hall=parts[2] / total,
    )


def ln_prior(z: Any, history: Any, problem: Problem) -> Any:
    """Return the log prior density of the coordinates at the given ln P and ln Pdot.

    Integrated over the coordinates it is p(ln P, ln Pdot | channel); unused coordinates are standard normal.
    """
    xp = namespace(z[0], problem.spin)
    p = physical(z, history, problem)
    means, sds = problem.normals[0], problem.normals[1]
    flags, active, limits = problem.flags, problem.active, problem.limits

    def normal(value: Any, i: int) -> Any:
        return -0.5 * ((value - means[i]) / sds[i]) ** 2 - xp.log(sds[i]) - 0.5 * _LN_2PI

    logp = -0.5 * ((p.mass - limits[0]) / limits[1]) ** 2 - xp.log(limits[1]) - 0.5 * _LN_2PI - limits[2]
    logp += np.log(MASS_RANGE[1] - MASS_RANGE[0]) - softplus(xp, z[0]) - softplus(xp, -z[0])
    logp += active[1] * normal(p.ln_phonon_time, 0)
    logp += flags[1] * normal(p.ln_impurity_parameter, 1)
    logp += flags[2] * (normal(p.ln_hall_factor, 2) + normal(p.ln_attractor_times, 3))
    logp += normal(p.ln_birth_field, 4) + normal(p.ln_birth_period, 5)
    logp += active[6] * normal(p.ln_umklapp, 6)
    logp += ln_age_density(p.ln_age, limits[3])
    logp += -history[1] - history[2] + problem.spin[2] - history[3] - softplus(xp, z[4])
    logp += active[1] * (xp.log(problem.warp[1]) + xp.log(xp.cosh(problem.warp[2] * z[1])))
    for i in range(1, len(z)):
        logp += (1.0 - active[i]) * (-0.5 * z[i] ** 2 - 0.5 * _LN_2PI)
    return logp


def _chosen(switch: Any, on: Any, off: Any) -> Any:
    """Blend by a 0/1 switch; both sides are finite, so this is cheaper than a branch and as exact."""
    return switch * on + (1.0 - switch) * off
