r"""Compiled field history: the age that fits the spin, and everything the density needs, with exact derivatives.

With b = B/B_now, the conditioned history at fixed total rate R obeys (s is age since birth, t the age now)

.. math::

    -\dot b/b = A\,[\varphi(s) + q] + \kappa\,S(s)\,b, \qquad \varphi = f(T_b(s))/f(T_b(t)),
    \quad A = R/(1 + q + \eta S(t)), \quad \kappa = A \eta

and w = 1/b is w(s) = e^{-J(s)} [1 - kappa E(s)] with J the integral of the Ohmic rate and E that of S e^J, both from s
to now. The age is the root of ln G(t) = ln tau, where G is the integral of b^2 over the life and
tau = tau_c (1 - P_0^2/P^2). Integrating back from now instead of forward from birth keeps every term positive.

Quantities are carried as *jets* in k variables: rows hold the value, k first derivatives and k mixed derivatives with
y = ln t. The variables are y, M, ln T_U, ln R, ln q, ln eta, ln(t_a/t), in this order; the root search needs
only the first, so the same code runs with k = 1 there and with k = 7 once at the root.
"""

from typing import Any

import numpy as np
from numba import njit
from numpy.typing import NDArray

from decayinfer.cooling.kernel import branch_values, clock, temperature_jet
from decayinfer.inference.nodes import quadrature

__all__ = ["INPUTS", "OUTPUTS", "history", "history_many"]

#: What `history` takes: tau in yr, R in 1/yr, t_a in units of the age, M in M_sun, T_U in 1e8 K.
INPUTS = ("ln_tau", "ln_rate", "ln_q", "ln_eta", "ln_attractor_ratio", "mass", "ln_umklapp")
#: What it returns: y = ln t, J(0), ln w(0), ln dF/dt, ln f(T_b(t)), ln A.
OUTPUTS = ("ln_age", "ohmic_depth", "ln_birth_ratio", "ln_age_slope", "ln_phonon_now", "ln_amplitude")

_VARIABLES = 7  # jet variables: y, M, ln T_U, ln R, ln q, ln eta, ln(t_a/t)
_THERMAL = 3  # the first three are all that the temperature depends on
_Q, _ETA, _ATTRACTOR, _RATE = 4, 5, 6, 3
_TO_INPUT = np.array([5, 6, 1, 2, 3, 4])  # column of `INPUTS` for jet variables 1 to 6
_TOO_DEEP = 300.0  # a J beyond this has an infinite birth field for every purpose
_STEPS = 80
_TOLERANCE = 3e-6
_NARROW = 1e-14

_SIGMA, _WEIGHTS, _TO_NOW = quadrature()
_LN_SIGMA = np.log(np.maximum(_SIGMA, 1e-300))
_NOW_FROM = np.ascontiguousarray(_TO_NOW.T)
_COMPILE: dict[str, Any] = {"cache": True, "error_model": "numpy"}


@njit(**_COMPILE)
def _phonon_rows(
    y: float, k: int, mass: float, ln_umklapp: float, values: Any, scalars: Any, freeze: Any
) -> tuple[Any, Any]:
    """Jets of ln f at every node and, in the last column, now."""
    n = _SIGMA.size
    rows = np.zeros((1 + 2 * k, n + 1))
    strength, power = freeze[0], freeze[1]
    age = np.exp(y)
    for i in range(n + 1):
        x, lam = clock(age * _SIGMA[i] if i < n else age, scalars[9])
        v, v_x, v_xx, v_m, v_xm = temperature_jet(x, mass, values, scalars)
        v_y, v_yy, v_ym = v_x * lam, v_xx * lam**2 + v_x * lam * (1.0 - lam), v_xm * lam
        e = strength * np.exp(power * (ln_umklapp - v))
        f1, f2 = 2.0 + power * e, power**2 * e
        rows[0, i] = 2.0 * v - e
        rows[1, i] = f1 * v_y
        rows[1 + k, i] = f1 * v_yy - f2 * v_y**2
        if k > 1:
            rows[2, i] = f1 * v_m
            rows[3, i] = -power * e
            rows[2 + k, i] = f1 * v_ym - f2 * v_y * v_m
            rows[3 + k, i] = f2 * v_y
    return rows[:, :n].copy(), rows[:, n].copy()


@njit(**_COMPILE)
def _exponential(rows: Any, k: int) -> None:
    """Turn jets of a logarithm into jets of its exponential, in place."""
    for i in range(rows.shape[1]):
        value = np.exp(rows[0, i])
        first = rows[1, i]
        rows[0, i] = value
        for j in range(k - 1, -1, -1):
            rows[1 + k + j, i] = value * (rows[1 + k + j, i] + first * rows[1 + j, i])
            rows[1 + j, i] *= value


@njit(**_COMPILE)
def _scale(rows: Any, k: int, log_factor: Any) -> None:
    """Multiply jets by a scalar given by the jet of its logarithm, in place."""
    factor = np.exp(log_factor[0])
    p_y = log_factor[1]
    n = rows.shape[1]
    for j in range(k - 1, -1, -1):
        p_j = log_factor[1 + j]
        p_yj = log_factor[1 + k + j] + p_y * p_j
        for i in range(n):
            rows[1 + k + j, i] = factor * (
                rows[1 + k + j, i] + p_y * rows[1 + j, i] + p_j * rows[1, i] + p_yj * rows[0, i]
            )
    for j in range(k):
        for i in range(n):
            rows[1 + j, i] = factor * (rows[1 + j, i] + log_factor[1 + j] * rows[0, i])
    for i in range(n):
        rows[0, i] *= factor


@njit(**_COMPILE)
def _switch(ln_ratio: float, ln_sigma: float) -> Any:
    """S at the age sigma t, for ln_ratio = ln(t_a/t)."""
    return 1.0 / (1.0 + np.exp(4.0 * (ln_sigma - ln_ratio)))


@njit(**_COMPILE)
def _amplitude(k: int, theta: Any, phonon: float, q: float, eta: float, free: Any) -> Any:
    """Jet of ln A = ln R - ln(phonon + q + eta S(t)); it does not depend on y."""
    a = np.zeros(1 + 2 * k)
    s = _switch(theta[4], 0.0) if eta > 0.0 else 0.0
    d = phonon + q + eta * s
    a[0] = theta[1] - np.log(d)
    if k > 1:
        a[1 + _RATE] = 1.0
        a[1 + _Q] = -free[0] * q / d
        a[1 + _ETA] = -free[1] * eta * s / d
        a[1 + _ATTRACTOR] = -4.0 * eta * s * (1.0 - s) / d
    return a


@njit(**_COMPILE)
def _growth(
    y: float, k: int, theta: Any, flags: Any, freeze: Any, values: Any, scalars: Any
) -> tuple[bool, Any]:
    """Jets of ln G, J(0), ln b(0)^2, ln f now and ln A; False when the field at birth is infinite."""
    n = _SIGMA.size
    out = np.zeros((5, 1 + 2 * k))
    phonon, hall = flags[0], flags[2]
    free = np.array([flags[0] * flags[1], hall if flags[0] + flags[1] > 0.0 else 0.0])
    q = flags[1] * (np.exp(theta[2]) if free[0] > 0.0 else 1.0)
    eta = hall * (np.exp(theta[3]) if free[1] > 0.0 else 1.0)

    thermal = _THERMAL if k > 1 else 1
    ln_phonon, now = _phonon_rows(y, thermal, theta[5], theta[6], values, scalars, freeze)
    for j in range(thermal):
        out[3, 1 + j], out[3, 1 + k + j] = now[1 + j], now[1 + thermal + j]
    out[3, 0] = now[0]
    a = _amplitude(k, theta, phonon, q, eta, free)
    out[4] = a
    per_life = a.copy()  # ln(t A)
    per_life[0] += y
    per_life[1] += 1.0

    depth = np.zeros((1 + 2 * k, n))  # J
    if phonon > 0.0:
        for i in range(n):
            ln_phonon[:, i] -= now
        _exponential(ln_phonon, thermal)
        total = np.dot(ln_phonon, _NOW_FROM)
        depth[0] = total[0]
        for j in range(thermal):
            depth[1 + j], depth[1 + k + j] = total[1 + j], total[1 + thermal + j]
    if q > 0.0:
        depth[0] += q * (1.0 - _SIGMA)
        if k > 1:
            depth[1 + _Q] += free[0] * q * (1.0 - _SIGMA)
    _scale(depth, k, per_life)
    if not depth[0, 0] < _TOO_DEEP:
        return False, out
    out[1] = depth[:, 0]

    ln_b2 = 2.0 * depth
    if hall > 0.0:
        source = depth  # S e^J, on the way to E
        for i in range(n):
            s = _switch(theta[4], _LN_SIGMA[i])
            source[0, i] += np.log(s) if s > 0.0 else -np.inf
            if k > 1:
                source[1 + _ATTRACTOR, i] += 4.0 * (1.0 - s)
        _exponential(source, k)
        drift = np.dot(source, _NOW_FROM)
        per_life[0] += np.log(eta)
        if k > 1:
            per_life[1 + _ETA] += free[1]
        _scale(drift, k, per_life)
        for i in range(n):
            left = 1.0 - drift[0, i]
            if not left > 0.0:
                return False, out
            ln_b2[0, i] -= 2.0 * np.log(left)
            h_y = drift[1, i] / left
            for j in range(k):
                h_j = drift[1 + j, i] / left
                ln_b2[1 + k + j, i] += 2.0 * (drift[1 + k + j, i] / left + h_y * h_j)
                ln_b2[1 + j, i] += 2.0 * h_j
    out[2] = ln_b2[:, 0]
    _exponential(ln_b2, k)
    total_b2 = np.dot(ln_b2, _WEIGHTS)
    g = total_b2[0]
    if not g < np.inf:
        return False, out
    out[0, 0] = y + np.log(g)
    for j in range(k):
        out[0, 1 + j] = total_b2[1 + j] / g
        out[0, 1 + k + j] = total_b2[1 + k + j] / g - total_b2[1] * total_b2[1 + j] / g**2
    out[0, 1] += 1.0
    return True, out


@njit(**_COMPILE)
def _age(theta: Any, flags: Any, freeze: Any, values: Any, scalars: Any) -> Any:
    """Root of G(t) = tau by Halley's method inside a bracket. G >= t, so ln tau bounds y from above.

    Ohmic decay alone makes ln G nearly linear in ln t. Hall drift makes 1/G nearly linear in 1/t, down to the wall
    where the field at birth is infinite; from the early side that iteration never crosses the wall.
    """
    ln_tau = theta[0]
    low, high = -np.inf, ln_tau
    rate = 2.0 * np.exp(theta[1])
    y = min(np.log(np.log1p(rate * np.exp(ln_tau)) / rate), ln_tau)  # exact for a constant rate
    walled = flags[2] > 0.0
    if walled:
        y -= 1.0
    for _ in range(_STEPS):
        reached, out = _growth(y, 1, theta, flags, freeze, values, scalars)
        step = np.nan
        if reached:
            miss, slope, curve = out[0, 0] - ln_tau, out[0, 1], out[0, 2]
            if miss > 0.0:
                high = y
            else:
                low = y
            if walled:
                step = _halley(-(1.0 - np.exp(miss)) / slope, slope - 1.0 - curve / slope)
                step = -np.log1p(step) if step > -1.0 else np.nan
            else:
                step = _halley(-miss / slope, curve / slope)
            if abs(step) < _TOLERANCE:
                return y + step  # the step is exact to its cube
        else:
            high = y
        following = y + step
        if not (low < following < high):
            following = 0.5 * (low + high) if low > -np.inf else high - 1.0
            if high - low < _NARROW:
                return following
        y = following
    return np.nan


@njit(**_COMPILE)
def _halley(newton: float, bend: float) -> Any:
    """Improve a Newton step by the ratio of second to first derivative, where the parabola allows."""
    correction = 1.0 + 0.5 * newton * bend
    return newton / correction if correction > 0.4 else newton


@njit(**_COMPILE)
def _summary(theta: Any, k: int, flags: Any, freeze: Any, values: Any, scalars: Any) -> tuple[Any, Any, bool]:
    """Outputs, their jets at fixed age, and whether the field decays at all."""
    result = np.full(6, np.nan)
    if flags[0] + flags[1] + flags[2] == 0.0:  # constant field: the age is tau itself
        out = np.zeros((5, 1 + 2 * _VARIABLES))
        _, now = _phonon_rows(theta[0], _THERMAL, theta[5], theta[6], values, scalars, freeze)
        out[3, : 1 + 2 * _THERMAL] = now
        result[:] = theta[0], 0.0, 0.0, 0.0, now[0], theta[1]
        return result, out, False
    y = _age(theta, flags, freeze, values, scalars)
    reached, out = _growth(y, k, theta, flags, freeze, values, scalars)
    if reached:
        result[0], result[1], result[2] = y, out[1, 0], -0.5 * out[2, 0]
        result[3] = theta[0] + np.log(out[0, 1]) - y
        result[4], result[5] = out[3, 0], out[4, 0]
    return result, out, True


@njit(**_COMPILE)
def history(
    theta: NDArray[np.float64],
    flags: NDArray[np.float64],
    freeze: NDArray[np.float64],
    table: NDArray[np.float64],
    scalars: NDArray[np.float64],
) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Solve for the age and return the history's summary with its Jacobian.

    Parameters
    ----------
    theta : (7,) array
        The inputs named in `INPUTS`.
    flags : (3,) array
        One where phonon scattering, impurity scattering and Hall drift act, zero elsewhere.
    freeze : (2,) array
        Strength c and power p of the Umklapp freeze-out exp[-c (T_U/T)^p].
    table : (2, 16, 4) array
        Cooling coefficients.
    scalars : (10,) array
        Cooling scalars.

    Returns
    -------
    values : (6,) array
        The outputs named in `OUTPUTS`; nan when no age can be found.
    jacobian : (6, 7) array
        Total derivatives of the outputs with respect to the inputs.
    """
    k = _VARIABLES
    jacobian = np.zeros((6, 7))
    values = branch_values(table, theta[5])
    result, out, decays = _summary(theta, k, flags, freeze, values, scalars)
    if not decays:
        jacobian[0, 0] = jacobian[5, 1] = 1.0
        jacobian[4, 0], jacobian[4, 5], jacobian[4, 6] = out[3, 1], out[3, 2], out[3, 3]
        return result, jacobian
    if np.isnan(result[0]):
        return result, np.full((6, 7), np.nan)
    slope = out[0, 1]
    partial = np.zeros((6, k))
    partial[0, 0] = 1.0
    partial[1] = out[1, 1 : 1 + k]
    partial[2] = -0.5 * out[2, 1 : 1 + k]
    partial[3] = out[0, 1 + k :] / slope
    partial[3, 0] -= 1.0
    partial[4] = out[3, 1 : 1 + k]
    partial[5] = out[4, 1 : 1 + k]
    for i in range(6):
        jacobian[i, 0] = partial[i, 0] / slope
        for j in range(1, k):
            jacobian[i, _TO_INPUT[j - 1]] = partial[i, j] - partial[i, 0] * out[0, 1 + j] / slope
    jacobian[3, 0] += 1.0
    return result, jacobian


@njit(**_COMPILE)
def history_many(
    theta: NDArray[np.float64],
    flags: NDArray[np.float64],
    freeze: NDArray[np.float64],
    table: NDArray[np.float64],
    scalars: NDArray[np.float64],
) -> NDArray[np.float64]:
    """Return `history` values for many inputs, (n, 7) to (n, 6), without their Jacobians."""
    out = np.empty((theta.shape[0], 6))
    for i in range(theta.shape[0]):
        values = branch_values(table, theta[i, 5])
        out[i], _, _ = _summary(theta[i], 1, flags, freeze, values, scalars)
    return out
